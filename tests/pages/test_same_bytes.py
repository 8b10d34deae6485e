"""The same study makes the same pages, byte for byte, in two processes that hash in different orders."""

import dataclasses
import json
import os
import shutil
import subprocess
import sys
from pathlib import Path

from fellspan.exports.folder import write_folder
from fellspan.planning.planner import plan_study
from fellspan.report.pages import render_pages
from fellspan.study.reading import load_study

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


def test_copies_of_a_study_with_other_dates_of_files_give_the_same_bytes(tmp_path: Path) -> None:
    """As in two fresh clones: other folders, other times of last change; only results.json tells those times."""
    reports = []
    for number, name in enumerate(("one", "another place")):
        folder = shutil.copytree(STUDY.parent, tmp_path / name)
        for file in folder.rglob("*"):
            os.utime(file, (1.6e9 + 7e6 * number, 1.6e9 + 7e6 * number + len(file.name)))
        study = load_study(folder / STUDY.name)
        links = tuple(
            one for one in study.links if one.name in ("Harbour Office - Cape Light", "East Terrace - West Terrace")
        )
        write_folder(plan_study(dataclasses.replace(study, links=links)), tmp_path / f"report {number}")
        reports.append(
            {file.name: file.read_bytes() for file in (tmp_path / f"report {number}").iterdir() if file.is_file()}
        )
    first, second = reports
    assert set(first) == set(second)
    assert {name for name in first if first[name] != second[name]} == {"results.json"}
    told = [json.loads(report["results.json"]) for report in reports]
    dates = [[file.pop("modified") for file in each["files"]] for each in told]
    assert told[0] == told[1]
    assert all(one != other for one, other in zip(*dates, strict=True))
    assert not any(date in text.decode() for name, text in first.items() if name.endswith(".html") for date in dates[0])


def test_pages_name_each_file_with_size_and_hash(tmp_path: Path) -> None:
    study = load_study(STUDY)
    plan = plan_study(dataclasses.replace(study, links=study.links[3:4]))
    pages = render_pages(plan)
    for file in plan.files:
        assert file.sha256[:12] in pages["index.html"]
        assert file.sha256 in pages["index.html"]
