"""Pairs near obstacles and surveyed points: the arrays against planning each pair alone, over a made town."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from made_near import outline, survey_file, town_file
from made_screening import (
    assert_as_planned,
    candidates,
    every_pair,
    ground_file,
    hills,
    one_by_one,
    same_bytes,
    sites,
)
from made_terrain import NORTH, TO_GRID, WEST, lonlat, raster

import fellspan.screening.near as near
import fellspan.screening.screen as screen
from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.position import Position
from fellspan.links.assess import AssessSettings
from fellspan.links.criteria import Criterion
from fellspan.screening.pairs import BASES, PATH_VERDICTS, Candidates, PairResults
from fellspan.screening.screen import screen_pairs
from fellspan.terrain.sources import CoverSource, ObstacleSource, RasterSource
from fellspan.terrain.terrain import Terrain


def compared(made: Candidates, terrain: Terrain, monkeypatch: pytest.MonkeyPatch, *, alone: int = 0) -> PairResults:
    """All pairs as planned, and at most so many of them taken one by one on the way."""
    taken: list[int] = []
    real = screen.screen_single

    def single(made: Candidates, columns: object, row: int, *, terrain: Terrain) -> None:
        taken.append(row)
        real(made, columns, row, terrain=terrain)  # type: ignore[arg-type]

    monkeypatch.setattr(screen, "screen_single", single)
    hub, place = every_pair(made)
    found = screen_pairs(made, hub=hub, place=place, terrain=terrain)
    assert_as_planned(found, one_by_one(made, hub, place, terrain), confidence=made.settings.confidence)
    assert len(taken) <= alone
    return found


def trees(folder: Path) -> CoverSource:
    heights = np.clip(hills((600, 1200), seed=7, height_m=8.0) - 96.0, 0.0, 25.0)
    file = raster(folder / "trees.tif", heights, cell_m=5.0, crs="EPSG:32623")
    return CoverSource(path=file, kind="tree", growth_m_per_year=0.3, error_m=1.5)


def in_town(hubs: int, places: int, *, seed: int, hub_m: float = 60.0, place_m: float = 20.0) -> Candidates:
    return candidates(sites("H", hubs, seed=seed, height_m=hub_m), sites("P", places, seed=seed + 1, height_m=place_m))


def test_a_town_on_bare_ground(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = in_town(2, 30, seed=1)
    with Terrain.open(ground=ground_file(tmp_path), obstacles=town_file(tmp_path, seed=3)) as terrain:
        found = compared(made, terrain, monkeypatch)
    assert set(found.verdict.tolist()) == {0, 1, 2}


@pytest.mark.parametrize("typed", [np.nan, 9.0, 40.0])
def test_antennas_on_the_roofs_of_outlines(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, typed: float) -> None:
    made = candidates(
        sites("H", 1, seed=5, height_m=40.0),
        sites("P", 40, seed=6, height_m=2.0, reference="roof", roof_m=typed, extent_m=(1800.0, 900.0)),
    )
    town = town_file(tmp_path, seed=7, houses=350, extent_m=(1800.0, 900.0))
    with Terrain.open(ground=ground_file(tmp_path), obstacles=town) as terrain:
        found = compared(made, terrain, monkeypatch)
    # Some stand in an outline, some where none is.
    assert (found.status == 0).sum() > 4
    if np.isnan(typed):
        assert (found.status == 3).any()


@pytest.mark.parametrize("typed", [np.nan, 11.0])
def test_roofs_under_trees_and_beside_masts(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, typed: float) -> None:
    """What stands highest at an antenna's spot is not always the roof that it stands on."""
    spots = sites("P", 24, seed=51, height_m=2.0, reference="roof", roof_m=typed, extent_m=(1800.0, 900.0))
    rows = ["name,kind,wkt,height_m,radius_m"]
    for number, (latitude, longitude) in enumerate(zip(spots.latitude_deg, spots.longitude_deg, strict=True)):
        east, south = TO_GRID.transform(longitude, latitude)
        ring = outline(east - WEST, NORTH - south, (30.0, 20.0), 0.1 * number)
        rows.append(f'house {number},building,"POLYGON (({ring}))",{number % 7},')
        if number % 3 == 0:
            rows.append(f"lime {number},tree,POINT ({longitude} {latitude}),{15 + number % 4},6")
        if number % 4 == 0:
            rows.append(f"crane {number},other,POINT ({longitude} {latitude}),{30 + number % 4},4")
    town = tmp_path / "roofs.csv"
    town.write_text("\n".join(rows) + "\n")
    made = candidates(sites("H", 1, seed=52, height_m=90.0, extent_m=(1800.0, 900.0)), spots)
    flat = raster(tmp_path / "ground.tif", hills(height_m=1.0))
    with Terrain.open(ground=flat, cover=trees(tmp_path) if np.isnan(typed) else None, obstacles=town) as terrain:
        found = compared(made, terrain, monkeypatch)
    assert (found.status == 0).all()


def test_a_typed_roof_is_held_against_the_outline_not_against_the_raster_in_it(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    spots = sites("P", 24, seed=57, height_m=2.0, reference="roof", extent_m=(1800.0, 900.0))
    spots.roof_m[:] = np.linspace(6.5, 13.0, 24)
    rows = ["name,kind,wkt,height_m"]
    for number, (latitude, longitude) in enumerate(zip(spots.latitude_deg, spots.longitude_deg, strict=True)):
        east, south = TO_GRID.transform(longitude, latitude)
        rows.append(f'house {number},building,"POLYGON (({outline(east - WEST, NORTH - south, (30.0, 20.0), 0.0)}))",6')
    town = tmp_path / "roofs.csv"
    town.write_text("\n".join(rows) + "\n")
    houses = CoverSource(path=raster(tmp_path / "houses.tif", 7.5), kind="building", error_m=1.0)
    made = candidates(sites("H", 1, seed=58, height_m=90.0, extent_m=(1800.0, 900.0)), spots)
    with Terrain.open(ground=raster(tmp_path / "ground.tif", 50.0), cover=houses, obstacles=town) as terrain:
        found = compared(made, terrain, monkeypatch)
    assert {PATH_VERDICTS[code] for code in found.verdict} >= {"clear", "marginal"}


def test_a_top_measured_at_an_antennas_own_spot_stays(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    extent = (1800.0, 900.0)
    places, hubs = sites("P", 12, seed=59, height_m=1.0, extent_m=extent), sites("H", 1, seed=60, extent_m=extent)
    rows = ["latitude_deg,longitude_deg,ground_m,top_m,kind,radius_m"]
    for number, (latitude, longitude) in enumerate(zip(places.latitude_deg, places.longitude_deg, strict=True)):
        rows.append(f"{latitude},{longitude},100,{101 + number % 6},tree,8")
    walked = tmp_path / "walked.csv"
    walked.write_text("\n".join(rows) + "\n")
    with Terrain.open(ground=raster(tmp_path / "ground.tif", 99.0), survey=walked) as terrain:
        compared(candidates(hubs, places), terrain, monkeypatch)


def test_what_an_isolated_obstruction_spares_does_not_count_beside_the_path(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """50 km at 18 GHz: beside the path only 0.3 of the zone at the worst month's k would reach down to the mast."""
    ground = np.zeros((60, 600))
    ground[:, 300] = 10.0
    file = RasterSource(path=raster(tmp_path / "ground.tif", ground, cell_m=100.0), error_m=0.1)
    hubs, places = sites("H", 1, seed=1), sites("P", 1, seed=2)
    for columns, east in ((hubs, 5000.0), (places, 55_000.0)):
        columns.longitude_deg[0], columns.latitude_deg[0] = lonlat(east, 3000.0)
        columns.height_m[0] = 80.0
    middle = GeodesicPath.between(
        Position(latitude_deg=hubs.latitude_deg[0], longitude_deg=hubs.longitude_deg[0]),
        Position(latitude_deg=places.latitude_deg[0], longitude_deg=places.longitude_deg[0]),
    ).positions(np.array([15_000.0]))
    mast = tmp_path / "mast.csv"
    spot = f"{middle[0][0] + 2.5 / 111_000.0},{middle[1][0]}"
    mast.write_text(f"name,kind,latitude_deg,longitude_deg,height_m,radius_m\nmast,other,{spot},30,1\n")
    made = candidates(hubs, places, settings=AssessSettings(confidence=0.5))
    made = replace(made, radio=replace(made.radio, frequency_hz=18e9))
    with Terrain.open(ground=file, obstacles=mast) as terrain:
        found = compared(made, terrain, monkeypatch)
    assert PATH_VERDICTS[int(found.verdict[0])] == "clear"


def test_what_stands_in_the_sea_and_a_shore_that_was_surveyed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    ground = np.full((300, 600), 0.3)
    ground[:, 300:360] = -9999.0
    file = raster(tmp_path / "ground.tif", ground)
    made = in_town(1, 20, seed=62, hub_m=15.0, place_m=8.0)
    made.hubs.longitude_deg[0], made.hubs.latitude_deg[0] = lonlat(1200.0, 1400.0)
    longitude, _ = lonlat(3300.0, 1500.0)
    share = (longitude - made.hubs.longitude_deg[0]) / (made.places.longitude_deg - made.hubs.longitude_deg[0])
    latitude = made.hubs.latitude_deg[0] + share * (made.places.latitude_deg - made.hubs.latitude_deg[0])
    rows, walk = ["name,kind,wkt,height_m"], ["latitude_deg,longitude_deg,ground_m,radius_m"]
    for number, north in enumerate(latitude.tolist()):
        east, south = TO_GRID.transform(longitude, north)
        ring = outline(east - WEST, NORTH - south, (30.0, 20.0), 0.2 * number)
        rows.append(f'rig {number},building,"POLYGON (({ring}))",{12 + number % 8}')
        walk.append(f"{north},{longitude},{(0.5, 12.0)[number % 2]},30")
    town, walked = tmp_path / "rigs.csv", tmp_path / "walked.csv"
    town.write_text("\n".join(rows) + "\n")
    walked.write_text("\n".join(walk) + "\n")
    with Terrain.open(ground=file, obstacles=town, gaps="sea") as terrain:
        found = compared(made, terrain, monkeypatch)
    assert (found.status == 0).sum() > 10
    with Terrain.open(ground=file, survey=walked, gaps="sea") as terrain:
        found = compared(made, terrain, monkeypatch, alone=20)
    assert set(found.status.tolist()) == {0, 1}


def test_a_survey_of_the_spot_removes_what_an_outline_says_stands_there(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    places = sites("P", 20, seed=53, height_m=12.0, extent_m=(1800.0, 900.0))
    hubs = sites("H", 1, seed=54, height_m=12.0, extent_m=(1800.0, 900.0))
    rows = ["name,kind,wkt,height_m,envelope"]
    survey = ["latitude_deg,longitude_deg,ground_m,top_m,kind,radius_m"]
    for number, (latitude, longitude) in enumerate(zip(places.latitude_deg, places.longitude_deg, strict=True)):
        middle = 0.5 * (longitude + hubs.longitude_deg[0]), 0.5 * (latitude + hubs.latitude_deg[0])
        east, south = TO_GRID.transform(*middle)
        ring = outline(east - WEST, NORTH - south, (60.0, 40.0), 0.3 * number)
        kind, envelope = (("building", ""), ("tree", ""), ("other", "crane"))[number % 3]
        rows.append(f'thing {number},{kind},"POLYGON (({ring}))",30,{envelope}')
        survey.append(f"{middle[1]},{middle[0]},100,{103 + number % 3},,{15 + 10 * (number % 2)}")
    town, walked = tmp_path / "town.csv", tmp_path / "walked.csv"
    town.write_text("\n".join(rows) + "\n")
    walked.write_text("\n".join(survey) + "\n")
    flat = raster(tmp_path / "ground.tif", hills(height_m=1.0))
    with Terrain.open(ground=flat, obstacles=town, survey=walked) as terrain:
        compared(candidates(hubs, places), terrain, monkeypatch)


def test_tops_above_ground_all_the_way_tell_as_a_raster_does(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    extent = (600.0, 500.0)
    made = candidates(
        sites("H", 1, seed=55, height_m=25.0, extent_m=extent), sites("P", 4, seed=56, height_m=15.0, extent_m=extent)
    )
    rows = ["link,distance_m,top_above_ground_m,radius_m"]
    rows += [f"H0 - P{place},{distance},{distance % 7},45" for place in (1, 2) for distance in range(0, 900, 40)]
    walked = tmp_path / "walked.csv"
    walked.write_text("\n".join(rows) + "\n")
    with Terrain.open(ground=raster(tmp_path / "ground.tif", hills(height_m=1.0)), survey=walked) as terrain:
        found = compared(made, terrain, monkeypatch)
    assert [BASES[code] for code in found.basis] == [
        "bare ground only",
        "surface raster",
        "surface raster",
        "bare ground only",
    ]


def test_trees_that_grow_in_rasters_and_outlines(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = in_town(1, 30, seed=9)
    town = ObstacleSource(path=town_file(tmp_path, seed=11), complete=("building",))
    with Terrain.open(ground=ground_file(tmp_path), cover=trees(tmp_path), obstacles=town, growth_years=8.0) as terrain:
        found = compared(made, terrain, monkeypatch)
    assert (found.basis == BASES.index("surface raster")).all()


def test_a_surface_beside_ground_and_alone(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = in_town(1, 12, seed=13)
    top = hills() + np.clip(hills(seed=11, height_m=6.0) - 100.0, 0.0, 20.0)
    surface = RasterSource(path=raster(tmp_path / "surface.tif", top), role="surface", error_m=1.0)
    town, ground = town_file(tmp_path, seed=15), ground_file(tmp_path)
    with Terrain.open(ground=ground, surface=surface, obstacles=town) as terrain:
        compared(made, terrain, monkeypatch)
    on_roofs = replace(made, places=sites("P", 12, seed=14, reference="roof", roof_m=6.0))
    with Terrain.open(surface=surface, obstacles=town) as terrain:
        compared(on_roofs, terrain, monkeypatch)


def test_surveyed_points_within_and_beside_paths(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = in_town(2, 25, seed=17, hub_m=70.0)
    survey = survey_file(tmp_path, seed=19)
    with Terrain.open(ground=ground_file(tmp_path), survey=survey) as terrain:
        compared(made, terrain, monkeypatch)


def test_survey_among_obstacles_and_trees(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = in_town(1, 30, seed=21, hub_m=70.0)
    survey, town = survey_file(tmp_path, seed=23, points=300), town_file(tmp_path, seed=24)
    with Terrain.open(
        ground=ground_file(tmp_path), cover=trees(tmp_path), survey=survey, obstacles=town, growth_years=3.0
    ) as terrain:
        compared(made, terrain, monkeypatch)


def test_rows_that_go_by_the_name_of_a_pair(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = candidates(
        sites("H", 1, seed=25, height_m=25.0, extent_m=(500.0, 400.0)),
        sites("P", 6, seed=26, height_m=15.0, extent_m=(500.0, 400.0)),
    )
    survey = survey_file(tmp_path, seed=27, points=0, links=("H0 - P1", "h0 -  p3", "H0 - P4"))
    with Terrain.open(ground=raster(tmp_path / "ground.tif", hills(height_m=4.0)), survey=survey) as terrain:
        found = compared(made, terrain, monkeypatch)
    assert (found.basis == BASES.index("surveyed")).any()


def test_gaps_on_the_way_and_gaps_taken_as_sea(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    ground = np.maximum(hills() - 110.0, 0.3)
    ground[:, 250:330] = -9999.0
    ground[50:80, 100:120] = -9999.0
    ground[200:, 480:500] = np.where(hills()[200:, 480:500] > 100.0, -9999.0, 30.0)
    file, town = raster(tmp_path / "ground.tif", ground), town_file(tmp_path, seed=29)
    made = in_town(1, 30, seed=31)
    with Terrain.open(ground=file, obstacles=town, gaps="sea", sea_level_m=0.5) as terrain:
        found = compared(made, terrain, monkeypatch, alone=2)
    assert set(found.status.tolist()) == {0, 1}
    with Terrain.open(ground=file, obstacles=town) as terrain:
        found = compared(in_town(1, 12, seed=32), terrain, monkeypatch, alone=1)
    assert (found.status == 1).any()


def test_rules_of_the_study_its_own_step_and_a_low_band(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    rules = (
        Criterion(name="flat", k=float("inf"), fraction=1.4, source="made"),
        Criterion(name="bent up", k=-2.0, fraction=0.2, source="made"),
    )
    settings = AssessSettings(criteria=rules, step_m=13.0, confidence=0.6)
    made = in_town(1, 25, seed=33, hub_m=110.0, place_m=60.0)
    low = replace(made.radio, frequency_hz=0.9e9)
    with Terrain.open(ground=ground_file(tmp_path), obstacles=town_file(tmp_path, seed=35)) as terrain:
        compared(replace(made, settings=settings, radio=low), terrain, monkeypatch)


def test_what_stands_beside_a_path_keeps_it_from_being_clear(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    flat = raster(tmp_path / "ground.tif", 10.0)
    hubs, places = sites("H", 1, seed=1), sites("P", 1, seed=2)
    for columns, longitude in ((hubs, -45.28), (places, -45.24)):
        columns.latitude_deg[0], columns.longitude_deg[0] = 36.1, longitude
        columns.height_m[0] = 40.0
    made = candidates(hubs, places)
    verdicts = []
    for north_m in (9.0, 30.0):
        mast = tmp_path / f"mast{north_m:g}.csv"
        latitude = 36.1 + north_m / 111_000.0
        mast.write_text(f"name,kind,latitude_deg,longitude_deg,height_m,radius_m\nmast,other,{latitude},-45.26,80,3\n")
        with Terrain.open(ground=flat, obstacles=mast) as terrain:
            verdicts.append(PATH_VERDICTS[int(compared(made, terrain, monkeypatch).verdict[0])])
    assert verdicts == ["marginal", "clear"]


def test_neither_company_nor_threads_change_a_bit(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = in_town(2, 60, seed=37)
    hub, place = every_pair(made)
    survey, town = survey_file(tmp_path, seed=39, points=20), town_file(tmp_path, seed=40, houses=60)
    with Terrain.open(ground=ground_file(tmp_path), cover=trees(tmp_path), survey=survey, obstacles=town) as terrain:
        whole = screen_pairs(made, hub=hub, place=place, terrain=terrain)
        monkeypatch.setattr(screen, "BATCH", 17)
        monkeypatch.setattr(screen, "NEAR_BATCH", 5)
        assert same_bytes(whole, screen_pairs(made, hub=hub, place=place, terrain=terrain, threads=1))
        order = np.random.default_rng(41).permutation(hub.size)
        mixed = screen_pairs(made, hub=hub[order], place=place[order], terrain=terrain, threads=3)
    back = np.argsort(order)
    for name in ("worst_fraction", "diffraction_db", "availability_percent", "margin_at_hub_db", "confidence"):
        assert getattr(mixed, name)[back].tobytes() == getattr(whole, name).tobytes(), name
    assert near.NEAR_BATCH > 1000
