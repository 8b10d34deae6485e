"""`fellspan candidates` with rows that a slip brought away from the terrain: told with their rows before the run."""

from pathlib import Path

import made_runs
import numpy as np
import pytest
from made_studies import unwrapped

from fellspan.cli.main import run
from fellspan.planning.planner import open_terrain
from fellspan.report.map_geometry import window_of
from fellspan.report.relief import open_rasters, shaded_relief
from fellspan.study.far_places import refuse_far_places
from fellspan.study.screening_study import load_screening


@pytest.fixture
def inputs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    made_runs.write_inputs(tmp_path, places=3)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def add(path: Path, *rows: str) -> None:
    path.write_text(path.read_text(encoding="utf-8") + "".join(f"{row}\n" for row in rows), encoding="utf-8")


SLIPS = {
    "House 3,-45.2600,36.0764,6 m agl": "36.0764 E is 12",
    "House 3,36.07640,45.26000,6 m agl": "lost before the longitude?",
    "House 3,-36.07640,-45.26000,6 m agl": "lost before the latitude?",
    "House 3,10.00000,-45.26000,6 m agl": "swapped, or a sign lost?",
}


@pytest.mark.parametrize(("row", "said"), SLIPS.items())
def test_a_row_far_from_the_terrain_is_told_before_the_run(
    inputs: Path, capsys: pytest.CaptureFixture[str], row: str, said: str
) -> None:
    add(inputs / "places.csv", row)
    assert run(made_runs.arguments("out", "--max-distance", "5 km")) == 2
    told = unwrapped(capsys.readouterr().err)
    assert "places.csv, row 5, 'House 3': " in told
    assert "km from the terrain: " in told
    assert said in told
    assert not (inputs / "out").exists()


def test_hubs_are_looked_at_too_and_all_are_counted(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    add(inputs / "hubs.csv", *(f"Hub {n},-45.26000,36.0{n}640,25 m agl,,14 dBi,90,7,25 dB,0" for n in range(5)))
    assert run(made_runs.arguments()) == 2
    lines = unwrapped(capsys.readouterr().err).splitlines()
    assert len(lines) == 4
    assert "hubs.csv, row 5, 'Hub 0'" in lines[0]
    assert "latitude and longitude swapped?" in lines[0]
    assert "row 7" in lines[2]
    assert lines[3].strip() == "and 2 more hubs far away"


def test_a_place_beyond_the_rasters_that_no_slip_explains_runs(inputs: Path) -> None:
    add(inputs / "places.csv", "Other Isle,37.50000,-45.26000,6 m agl")  # 155 km north
    screening = load_screening(inputs / "study.toml", hubs=inputs / "hubs.csv", places=inputs / "places.csv")
    with open_terrain(screening.study) as terrain:
        refuse_far_places(screening.candidates, screening.hub_rows, screening.place_rows, terrain)
    assert np.max(screening.candidates.places.latitude_deg) == 37.5


def test_a_map_beyond_the_projection_of_a_raster_has_no_relief_and_no_error(inputs: Path) -> None:
    screening = load_screening(inputs / "study.toml", hubs=inputs / "hubs.csv", places=inputs / "places.csv")
    window = window_of([(-45.2, -45.26), (36.1, 36.05)], margin=0.06)
    assert shaded_relief(open_rasters(screening.study.terrain.ground), window, pixels=100) is None
