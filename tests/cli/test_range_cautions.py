"""A link outside the range of a model: the caution stands on terminal, page and in the JSON, and there is still a result."""

import html
import json
import re
from pathlib import Path

import pytest
from made_studies import STUDY, write_study

from fellspan.cli import main

CLIMATE = """
[climate]
rain_rate = "42 mm/h"
log_k = -5
dn75 = 60
gradient_median = -45
gradient_tail = 5
"""
# P.530-19, section 2.3.1: dN75 up to 54 N-units, 7.5 to 300 km.
SAID = ("Multipath: dN75 60 N-units is outside the range of", "Multipath: path length 5.6")


def _flat(text: str) -> str:
    return " ".join(text.split())


def test_a_range_left_is_said_everywhere_and_there_is_a_result(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    text = STUDY.replace("45.28000 W", "45.28750 W").replace("45.25000 W", "45.22460 W") + CLIMATE
    study, out = write_study(tmp_path, text), tmp_path / "out"
    assert main.run(["plan", str(study), "--full", "--out", str(out)]) == 0
    terminal = _flat(capsys.readouterr().out)
    held = json.loads((out / "results.json").read_text(encoding="utf-8"))["links"][0]
    page = next(path for path in out.glob("link-*.html") if "West" in path.read_text("utf-8"))
    shown = _flat(html.unescape(re.sub(r"<[^>]+>", " ", page.read_text(encoding="utf-8"))))
    for words in SAID:
        assert words in terminal
        assert any(caution.startswith(words) for caution in held["cautions"])
        assert words in shown
    assert held["availability_percent"]["year"] is not None
    assert held["margin_db"]["at_a"] is not None
    assert held["signal"]["verdict_reason"]
