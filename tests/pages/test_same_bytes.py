"""The same study makes the same pages, byte for byte, in two processes that hash in different orders."""

import os
import subprocess
import sys
from pathlib import Path

STUDY = Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml"
# Two links that are each other's neighbours, one with a street of buildings, one over water.
SCRIPT = """
import dataclasses, hashlib, sys
from pathlib import Path
from fellspan.planning.planner import plan_study
from fellspan.report.pages import render_pages
from fellspan.study.reading import load_study
study = load_study(Path(sys.argv[1]))
links = tuple(one for one in study.links if one.name in ("Harbour Office - Southdown Farm", "Harbour Office - Cape Light"))
for name, text in render_pages(plan_study(dataclasses.replace(study, links=links))).items():
    print(name, len(text), hashlib.sha256(text.encode("utf-8")).hexdigest())
"""


def _pages(seed: str) -> str:
    done = subprocess.run(
        [sys.executable, "-c", SCRIPT, str(STUDY)],
        env={**os.environ, "PYTHONHASHSEED": seed},
        capture_output=True,
        text=True,
        check=True,
    )
    return done.stdout


def test_hash_order_leaves_no_trace_on_a_page() -> None:
    first, second = _pages("1"), _pages("2")
    assert len(first.splitlines()) == 7
    assert first == second
