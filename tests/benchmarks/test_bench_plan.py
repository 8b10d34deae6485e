"""Where the time of `fellspan plan` goes on the sample, and a long path over a large raster planned by the command itself."""

import json
import subprocess
import sys
import tempfile
from pathlib import Path

import pytest

pytestmark = pytest.mark.bench

ROOT = Path(__file__).resolve().parents[2]

STAGES = """
import json, sys, time
marks = [("start", time.perf_counter())]
def mark(name):
    marks.append((name, time.perf_counter()))
from fellspan.study.reading import load_study
from fellspan.planning.planner import plan_study
mark("imports")
study = load_study(sys.argv[1])
mark("read the study, build antennas")
plan = plan_study(study)
mark("open terrain, assess links, hash files")
from fellspan.report.pages import render_pages
pages = render_pages(plan)
mark("render pages")
from fellspan.exports.results_json import results_text
results_text(plan)
mark("results.json")
print(json.dumps([(name, at - before) for (_, before), (name, at) in zip(marks, marks[1:])]))
"""

WATCHED = """
import json, resource, subprocess, sys, time
begun = time.perf_counter()
done = subprocess.run(sys.argv[1:], capture_output=True, text=True)
usage = resource.getrusage(resource.RUSAGE_CHILDREN)
print(json.dumps({"seconds": time.perf_counter() - begun, "peak_mb": usage.ru_maxrss / 1024, "code": done.returncode,
                  "shown": done.stdout[:400] + done.stderr[:400]}))
"""


def test_where_the_time_of_a_plan_goes() -> None:
    """Assessing is no more than the drawing: the engine must not become the slow part of its own report."""
    done = subprocess.run(
        [sys.executable, "-c", STAGES, str(ROOT / "sample_terrain" / "tolmera.toml")],
        check=True,
        capture_output=True,
        text=True,
    )
    stages = dict(json.loads(done.stdout))
    total = sum(stages.values())
    for name, seconds in stages.items():
        print(f"{seconds:7.2f} s  {100 * seconds / total:5.1f} %  {name}")
    assert stages["open terrain, assess links, hash files"] < 1.5 * stages["render pages"]


def test_a_57_km_path_over_a_raster_of_40_000_cells_a_side() -> None:
    """`fellspan sight` against importing its libraries alone, in one run; memory as the system counts it."""
    sys.path.insert(0, str(Path(__file__).parent))
    try:
        from test_bench_big_raster import A, B, make_raster
    finally:
        sys.path.pop(0)
    with tempfile.TemporaryDirectory() as folder:
        raster = Path(folder) / "big.tif"
        make_raster(raster)
        ends = [f"{point.latitude_deg},{point.longitude_deg}" for point in (A, B)]
        command = [sys.executable, "-m", "fellspan", "sight", *ends, "--ground", str(raster), "--frequency", "6 GHz"]
        command += ["--height-a", "400 m above ground", "--height-b", "400 m above ground", "--no-save"]
        answer = watched(command)
        bare = watched(
            [sys.executable, "-c", "import numpy, scipy.special, rasterio, pyproj, shapely, pydantic, typer"]
        )
    print(f"sight {answer['seconds']:.2f} s, {answer['peak_mb']:.0f} MB; imports alone {bare['seconds']:.2f} s")
    assert answer["code"] == 0, answer["shown"]
    assert answer["peak_mb"] < 250.0
    assert answer["seconds"] < 4.0 * bare["seconds"]


def watched(command: list[str]) -> dict[str, float | str]:
    """Run a command in a process of its own that is measured."""
    done = subprocess.run([sys.executable, "-c", WATCHED, *command], check=True, capture_output=True, text=True)
    answer: dict[str, float | str] = json.loads(done.stdout)
    return answer
