"""Holes in the rasters under pairs of a batch: filled by a survey, taken as sea, or met by the closer look only."""

from dataclasses import replace
from pathlib import Path

import numpy as np
from made_screening import assert_as_planned, candidates, every_pair, hills, one_by_one, same_bytes, sites
from made_terrain import lonlat, raster

from fellspan.links.assess import AssessSettings
from fellspan.screening.pairs import STATUSES, Candidates, PairResults
from fellspan.screening.screen import screen_pairs
from fellspan.terrain.terrain import Terrain


def walk_file(folder: Path) -> Path:
    """A surveyed profile across the hole, every 20 m."""
    rows = ["latitude_deg,longitude_deg,ground_m,top_m,profile,error_m"]
    for number, east in enumerate(np.arange(2800.0, 3201.0, 20.0)):
        longitude, latitude = lonlat(east, 1500.0)
        rows.append(f"{latitude},{longitude},{12 + number % 3},{14 + number % 5},walk,0.1")
    file = folder / "walk.csv"
    file.write_text("\n".join(rows) + "\n")
    return file


def along_the_walk() -> Candidates:
    hubs, places = sites("H", 1, seed=1, height_m=30.0), sites("P", 6, seed=2, height_m=30.0)
    for made, east, south in (
        (hubs, [500.0], [1500.0]),
        (places, np.linspace(5000.0, 5900.0, 6), [1500.0] * 4 + [900, 2100]),
    ):
        spots = np.array([lonlat(*spot) for spot in zip(east, south, strict=True)])
        made.longitude_deg[:], made.latitude_deg[:] = spots[:, 0], spots[:, 1]
    return candidates(hubs, places)


def test_a_survey_fills_a_hole_of_the_rasters_as_in_planning(tmp_path: Path) -> None:
    ground = hills(height_m=2.0) - 90.0
    ground[100:200, 290:310] = -9999.0
    made = along_the_walk()
    hub, place = every_pair(made)
    with Terrain.open(ground=raster(tmp_path / "ground.tif", ground), survey=walk_file(tmp_path)) as terrain:
        found = screen_pairs(made, hub=hub, place=place, terrain=terrain)
        assert_as_planned(found, one_by_one(made, hub, place, terrain))
    assert [STATUSES[code] for code in found.status] == ["done"] * 4 + ["gap"] * 2


def test_what_the_closer_look_meets_in_a_hole_does_not_depend_on_company(tmp_path: Path) -> None:
    ground = np.maximum(hills(height_m=8.0) - 99.0, 0.3)
    ground[np.random.default_rng(3).random(ground.shape) < 0.02] = -9999.0
    made = candidates(
        sites("H", 1, seed=8, height_m=9.0), sites("P", 6, seed=9, height_m=9.0), settings=AssessSettings(step_m=70.0)
    )
    hub, place = every_pair(made)
    with Terrain.open(ground=raster(tmp_path / "ground.tif", ground), gaps="sea") as terrain:
        whole = screen_pairs(made, hub=hub, place=place, terrain=terrain)
        assert_as_planned(whole, one_by_one(made, hub, place, terrain))
        for row in range(hub.size):
            own = slice(row, row + 1)
            alone = screen_pairs(made, hub=hub[own], place=place[own], terrain=terrain)
            assert same_bytes(alone, row_of(whole, row)), row


def row_of(found: PairResults, row: int) -> PairResults:
    values = {name: getattr(found, name)[row : row + 1] for name in PairResults.__slots__}
    return replace(found, **values)


def test_paths_along_an_edge_of_a_raster_by_the_sea(tmp_path: Path) -> None:
    """Rounding puts what lies on the edge on the raster or off it, where the sea is then: planning itself must look."""
    file = raster(tmp_path / "ground.tif", np.full((100, 150), 3.0), cell_m=2.0)
    hubs, places = sites("H", 1, seed=10, height_m=6.0), sites("P", 8, seed=11, height_m=6.0)
    for made, east in ((hubs, [20.0]), (places, np.linspace(150.0, 290.0, 8))):
        spots = np.array([lonlat(float(one), 200.0) for one in east])
        made.longitude_deg[:], made.latitude_deg[:] = spots[:, 0], spots[:, 1]
    made = candidates(hubs, places)
    hub, place = every_pair(made)
    with Terrain.open(ground=file, gaps="sea") as terrain:
        found = screen_pairs(made, hub=hub, place=place, terrain=terrain)
        assert_as_planned(found, one_by_one(made, hub, place, terrain))
