"""`fellspan plan --equip`: each link gets what `fellspan equip` says of it, in JSON and on the terminal, only when asked."""

import json
import re
from pathlib import Path

import pytest
from made_studies import STUDY, write_study

from fellspan.cli import main

SAMPLE = Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml"
NAME = "Beacon - West Point"


def printed(capsys: pytest.CaptureFixture[str], *arguments: str) -> str:
    assert main.run(arguments) in (None, 0)
    return capsys.readouterr().out


def test_json_holds_exactly_what_equip_says_of_the_link(capsys: pytest.CaptureFixture[str]) -> None:
    (planned,) = json.loads(printed(capsys, "plan", str(SAMPLE), "--link", NAME, "--equip", "--json"))["links"]
    alone = json.loads(printed(capsys, "equip", str(SAMPLE), "--link", NAME, "--json"))["equipment"]
    assert len(alone["rows"]) > 3
    assert planned["equipment"] == alone


def test_the_terminal_page_gives_the_decision(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    told = printed(capsys, "plan", str(write_study(tmp_path)), "--equip")
    assert re.search(r"^  Equipment +The [^\n]+: the smallest that meets", told, re.MULTILINE)
    assert max(map(len, told.splitlines())) <= 80


@pytest.mark.parametrize(
    ("text", "options"),
    [(STUDY, ()), (STUDY.replace('power = "20 dBm"\n', ""), ("--equip",))],
    ids=["not asked", "no power"],
)
def test_a_link_without_the_comparison_has_no_such_key(
    tmp_path: Path, text: str, options: tuple[str, ...], capsys: pytest.CaptureFixture[str]
) -> None:
    study = write_study(tmp_path, text)
    (planned,) = json.loads(printed(capsys, "plan", str(study), "--json", *options))["links"]
    assert "equipment" not in planned
    assert planned["verdict"] is not None


def test_docs_name_the_key_and_the_option() -> None:
    docs = Path(__file__).parents[2] / "docs"
    assert "| `equipment` |" in (docs / "results.md").read_text(encoding="utf-8")
    for page in ("getting-started.md", "equip.md"):
        assert "--equip" in (docs / page).read_text(encoding="utf-8")
