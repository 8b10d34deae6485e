"""A pair's result equals its plan result: the arrays of screening against planning each pair alone, over many terrains."""

from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
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
from made_terrain import raster

import fellspan.screening.batch as batch
import fellspan.screening.screen as screen
import fellspan.terrain.many as many
from fellspan.links.assess import AssessSettings
from fellspan.links.criteria import Criterion
from fellspan.screening.near import NearBatch
from fellspan.screening.pairs import PATH_VERDICTS, STATUSES, Candidates, PairResults
from fellspan.screening.screen import screen_pairs
from fellspan.terrain.sources import CoverSource, RasterSource
from fellspan.terrain.terrain import Terrain


def compared(made: Candidates, terrain: Terrain) -> PairResults:
    hub, place = every_pair(made)
    found = screen_pairs(made, hub=hub, place=place, terrain=terrain)
    assert_as_planned(found, one_by_one(made, hub, place, terrain), confidence=made.settings.confidence)
    return found


def only_arrays(monkeypatch: pytest.MonkeyPatch) -> list[int]:
    """Count the pairs that are taken one by one."""
    taken: list[int] = []

    def single(made: Candidates, columns: object, row: int, *, terrain: Terrain) -> None:
        taken.append(row)

    monkeypatch.setattr(screen, "screen_single", single)
    return taken


def test_bare_ground(tmp_path: Path) -> None:
    made = candidates(sites("H", 2, seed=1, height_m=30.0), sites("P", 14, seed=2))
    with Terrain.open(ground=ground_file(tmp_path)) as terrain:
        found = compared(made, terrain)
    assert set(found.verdict.tolist()) == {0, 1, 2}  # a test over one kind of path would say little


@pytest.mark.parametrize("preset", ["p530-tropical", "sixty-percent"])
def test_other_criteria(tmp_path: Path, preset: str) -> None:
    made = candidates(
        sites("H", 1, seed=3, height_m=30.0),
        sites("P", 10, seed=4),
        settings=AssessSettings(preset=preset),  # type: ignore[arg-type]
    )
    with Terrain.open(ground=ground_file(tmp_path)) as terrain:
        compared(made, terrain)


def test_rules_of_the_study_and_its_own_step_and_confidence(tmp_path: Path) -> None:
    rules = (
        Criterion(name="flat", k=float("inf"), fraction=0.6, source="made"),
        Criterion(name="bent up", k=-2.0, fraction=0.0, source="made"),
        Criterion(name="low", k=0.6, fraction=0.3, source="made"),
    )
    settings = AssessSettings(criteria=rules, step_m=13.0, confidence=0.99, median_k=1.2)
    made = candidates(sites("H", 1, seed=5, height_m=30.0), sites("P", 10, seed=6), settings=settings)
    with Terrain.open(ground=ground_file(tmp_path)) as terrain:
        compared(made, terrain)


def trees(folder: Path) -> CoverSource:
    heights = np.clip(hills((600, 1200), seed=7, height_m=8.0) - 96.0, 0.0, 25.0)
    file = raster(folder / "trees.tif", heights, cell_m=5.0, nodata=-9999.0, crs="EPSG:32623")
    return CoverSource(path=file, kind="tree", growth_m_per_year=0.3, error_m=1.5)


def test_trees_on_the_ground(tmp_path: Path) -> None:
    made = candidates(sites("H", 2, seed=8, height_m=35.0), sites("P", 12, seed=9))
    with Terrain.open(ground=ground_file(tmp_path), cover=trees(tmp_path), growth_years=5.0) as terrain:
        compared(made, terrain)


def test_surface_beside_ground(tmp_path: Path) -> None:
    ground = ground_file(tmp_path)
    top = hills() + np.clip(hills(seed=11, height_m=6.0) - 100.0, 0.0, 20.0)
    surface = RasterSource(path=raster(tmp_path / "surface.tif", top), role="surface", error_m=1.0)
    made = candidates(sites("H", 2, seed=12, height_m=35.0), sites("P", 12, seed=13))
    with Terrain.open(ground=ground, surface=surface, cover=trees(tmp_path)) as terrain:
        found = compared(made, terrain)
    assert 1 in found.basis


def test_a_surface_that_shows_nothing_and_one_alone(tmp_path: Path) -> None:
    ground = ground_file(tmp_path)
    made = candidates(sites("H", 1, seed=14, height_m=30.0), sites("P", 8, seed=15))
    with Terrain.open(ground=ground, surface=raster(tmp_path / "surface.tif", hills() + 0.1)) as terrain:
        found = compared(made, terrain)
    assert 2 in found.basis
    on_roofs = replace(made, places=sites("P", 8, seed=15, reference="roof", roof_m=6.0))
    with Terrain.open(surface=tmp_path / "surface.tif") as terrain:
        compared(on_roofs, terrain)


def test_a_surface_below_its_ground_is_refused_as_planning_refuses_it(tmp_path: Path) -> None:
    surface = raster(tmp_path / "surface.tif", np.where(np.arange(600) < 300, hills() - 40.0, hills() + 3.0))
    made = candidates(sites("H", 1, seed=16, height_m=30.0), sites("P", 10, seed=17))
    with Terrain.open(ground=ground_file(tmp_path), surface=surface) as terrain:
        found = compared(made, terrain)
    assert {STATUSES[code] for code in found.status} == {"done", "refused"}


@pytest.mark.parametrize("typed", [np.nan, 9.0, 40.0])
def test_antennas_on_roofs(tmp_path: Path, typed: float) -> None:
    random = np.random.default_rng(18)
    houses = np.where(np.kron(random.random((60, 120)), np.ones((10, 10))) < 0.6, 8.0, 0.0)
    cover = CoverSource(
        path=raster(tmp_path / "houses.tif", houses, cell_m=5.0, crs="EPSG:32623"), kind="building", error_m=1.0
    )
    made = candidates(
        sites("H", 2, seed=19, height_m=30.0), sites("P", 12, seed=20, height_m=3.0, reference="roof", roof_m=typed)
    )
    with Terrain.open(ground=ground_file(tmp_path), cover=cover) as terrain:
        found = compared(made, terrain)
    if np.isnan(typed):
        assert {STATUSES[code] for code in found.status} == {"done", "refused"}
    elif typed == 40.0:
        assert not (found.verdict == PATH_VERDICTS.index("clear")).all()


def test_antennas_above_sea_level_and_below_ground(tmp_path: Path) -> None:
    made = candidates(
        sites("H", 1, seed=21, height_m=230.0, reference="sea"),
        sites("P", 12, seed=22, height_m=110.0, reference="sea"),
    )
    with Terrain.open(ground=ground_file(tmp_path)) as terrain:
        found = compared(made, terrain)
    assert {STATUSES[code] for code in found.status} == {"done", "refused"}


def test_gaps_are_a_status(tmp_path: Path) -> None:
    ground = hills()
    ground[100:160, 200:330] = np.nan
    ground[:, 590:] = np.nan
    ground[40, 40] = np.nan
    file = raster(tmp_path / "ground.tif", np.where(np.isnan(ground), -9999.0, ground))
    made = candidates(
        sites("H", 2, seed=23, height_m=30.0), sites("P", 14, seed=24, inset_m=-200.0)
    )  # some beyond the raster
    with Terrain.open(ground=file) as terrain:
        found = compared(made, terrain)
    assert {STATUSES[code] for code in found.status} == {"done", "gap"}


def test_gaps_taken_as_sea(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    ground = np.maximum(hills() - 110.0, 0.3)
    ground[:, 250:330] = -9999.0
    ground[50:80, 100:120] = -9999.0
    ground[200:, 480:500] = np.where(hills()[200:, 480:500] > 100.0, -9999.0, 30.0)
    file = raster(tmp_path / "ground.tif", ground)
    made = candidates(sites("H", 2, seed=25, height_m=30.0), sites("P", 14, seed=26))
    hub, place = every_pair(made)
    with Terrain.open(ground=file, cover=trees(tmp_path), growth_years=2.0, gaps="sea", sea_level_m=0.5) as terrain:
        found = compared(made, terrain)
        taken = only_arrays(monkeypatch)
        screen_pairs(made, hub=hub, place=place, terrain=terrain)
    assert {STATUSES[code] for code in found.status} == {"done", "gap"}
    assert len(taken) <= 2


def test_rasters_side_by_side_and_one_over_another(tmp_path: Path) -> None:
    whole = hills()
    made = candidates(sites("H", 2, seed=27, height_m=30.0), sites("P", 12, seed=28))
    west = raster(tmp_path / "west.tif", np.where(np.arange(600) < 320, whole, -9999.0))
    east = raster(tmp_path / "east.tif", np.where(np.arange(600) >= 310, whole + 0.2, -9999.0))
    fine = raster(tmp_path / "fine.tif", np.repeat(np.repeat(whole[:120, :200], 4, 0), 4, 1) + 0.4, cell_m=2.5)
    with Terrain.open(ground=[fine, west, east]) as terrain:
        compared(made, terrain)


def test_rasters_that_disagree_are_refused_as_planning_refuses_them(tmp_path: Path) -> None:
    made = candidates(sites("H", 1, seed=29, height_m=30.0), sites("P", 10, seed=30))
    fine = raster(tmp_path / "fine.tif", hills()[:150, :300] + 30.0, cell_m=10.0)
    with Terrain.open(ground=[fine, ground_file(tmp_path)]) as terrain:
        found = compared(made, terrain)
    assert {STATUSES[code] for code in found.status} == {"done", "refused"}


def test_an_obstacle_and_a_surveyed_point_on_few_of_the_paths(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = candidates(sites("H", 2, seed=31, height_m=30.0), sites("P", 10, seed=32))
    obstacles, survey = tmp_path / "obstacles.csv", tmp_path / "survey.csv"
    mast = made.places.latitude_deg[3], made.places.longitude_deg[3]
    obstacles.write_text(
        f"name,kind,latitude_deg,longitude_deg,height_m,radius_m\ntank,building,{mast[0] + 0.001},{mast[1]},30,60\n"
    )
    survey.write_text(
        "latitude_deg,longitude_deg,ground_m\n" + f"{made.places.latitude_deg[5]},{made.places.longitude_deg[5]},120\n"
    )
    with Terrain.open(ground=ground_file(tmp_path), obstacles=obstacles, survey=survey) as terrain:
        compared(made, terrain)
        taken = only_arrays(monkeypatch)
        hub, place = every_pair(made)
        near = NearBatch.__init__
        rows: list[int] = []

        def counted(self: NearBatch, *given: Any) -> None:
            rows.extend(given[2].tolist())
            near(self, *given)

        monkeypatch.setattr(NearBatch, "__init__", counted)
        screen_pairs(made, hub=hub, place=place, terrain=terrain)
    assert not taken
    assert 0 < len(rows) < hub.size


def test_pairs_at_one_place_and_sites_that_cannot_be(tmp_path: Path) -> None:
    hubs, places = sites("H", 1, seed=33, height_m=30.0), sites("P", 5, seed=34)
    places.latitude_deg[0], places.longitude_deg[0] = hubs.latitude_deg[0], hubs.longitude_deg[0]
    places.latitude_deg[1] = 95.0
    places.height_m[2] = -3.0
    places.latitude_deg[3] = np.nan
    made = candidates(hubs, places)
    hub, place = every_pair(made)
    with Terrain.open(ground=ground_file(tmp_path)) as terrain:
        found = screen_pairs(made, hub=hub, place=place, terrain=terrain)
    assert [STATUSES[code] for code in found.status] == ["same place", "refused", "refused", "refused", "done"]
    assert "latitude 95" in found.reason[1]
    assert "-3 m" in found.reason[2]
    assert "nan" in found.reason[3]


def test_arrays_serve_whatever_is_common(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    taken = only_arrays(monkeypatch)
    made = candidates(sites("H", 2, seed=35, height_m=30.0), sites("P", 30, seed=36))
    hub, place = every_pair(made)
    with Terrain.open(ground=ground_file(tmp_path), cover=trees(tmp_path)) as terrain:
        screen_pairs(made, hub=hub, place=place, terrain=terrain)
    assert not taken


def test_neither_blocks_nor_threads_nor_company_change_a_bit(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = candidates(sites("H", 2, seed=37, height_m=30.0), sites("P", 40, seed=38))
    hub, place = every_pair(made)
    with Terrain.open(ground=ground_file(tmp_path), cover=trees(tmp_path)) as terrain:
        whole = screen_pairs(made, hub=hub, place=place, terrain=terrain)
        monkeypatch.setattr(screen, "BATCH", 7)
        monkeypatch.setattr(batch, "BLOCK_SAMPLES", 900)
        monkeypatch.setattr(batch, "NEAR_SAMPLES", 1500)
        assert same_bytes(whole, screen_pairs(made, hub=hub, place=place, terrain=terrain, threads=1))
        order = np.random.default_rng(39).permutation(hub.size)
        mixed = screen_pairs(made, hub=hub[order], place=place[order], terrain=terrain, threads=3)
    back = np.argsort(order)
    for name in ("worst_fraction", "diffraction_db", "availability_percent", "margin_at_hub_db", "confidence"):
        assert getattr(mixed, name)[back].tobytes() == getattr(whole, name).tobytes(), name


def test_both_ways_round_are_one_path(tmp_path: Path) -> None:
    one, other = sites("H", 3, seed=40, height_m=25.0), sites("P", 20, seed=41)
    there, back = candidates(one, other), candidates(other, one)
    hub, place = every_pair(there)
    with Terrain.open(ground=ground_file(tmp_path)) as terrain:
        forth = screen_pairs(there, hub=hub, place=place, terrain=terrain)
        again = screen_pairs(back, hub=place, place=hub, terrain=terrain)
    np.testing.assert_array_equal(forth.verdict, again.verdict)
    np.testing.assert_allclose(forth.worst_fraction, again.worst_fraction, atol=1e-6)
    np.testing.assert_allclose(forth.worst_at_m, forth.distance_m - again.worst_at_m, atol=1e-5)
    np.testing.assert_allclose(forth.diffraction_db, again.diffraction_db, atol=1e-6)


def test_only_tiles_that_paths_cross_are_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = candidates(sites("H", 1, seed=42, extent_m=(900.0, 900.0)), sites("P", 9, seed=43, extent_m=(900.0, 900.0)))
    hub, place = every_pair(made)
    with Terrain.open(ground=ground_file(tmp_path)) as terrain:
        screen_pairs(made, hub=hub, place=place, terrain=terrain)
        sheet = terrain.many.stacks[0].sheet(0)
        assert sheet is not None
        assert sheet.tiles_read == 1
    with rasterio.open(tmp_path / "ground.tif") as file:
        assert file.width * file.height > 2 * 256 * 256


def test_memory_given_back_between_parts_changes_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made = candidates(sites("H", 2, seed=44, height_m=30.0), sites("P", 40, seed=45))
    hub, place = every_pair(made)
    with Terrain.open(ground=ground_file(tmp_path), cover=trees(tmp_path)) as terrain:
        whole = screen_pairs(made, hub=hub, place=place, terrain=terrain)
        monkeypatch.setattr(many, "MOST_BYTES", 0)
        monkeypatch.setattr(batch, "NEAR_SAMPLES", 1500)
        assert same_bytes(whole, screen_pairs(made, hub=hub, place=place, terrain=terrain))


def test_a_raster_far_larger_than_memory_costs_what_paths_cross(tmp_path: Path) -> None:
    import rasterio
    from affine import Affine
    from made_terrain import NORTH, WEST

    path = tmp_path / "huge.tif"
    side = 40_000
    with rasterio.open(
        path, "w", driver="GTiff", width=side, height=side, count=1, dtype="float32", crs="EPSG:32623",
        transform=Affine(10.0, 0.0, WEST, 0.0, -10.0, NORTH), tiled=True, SPARSE_OK=True, nodata=-9999.0,
    ) as file:  # fmt: skip
        window = rasterio.windows.Window(0, 0, 600, 300)
        file.write(hills().astype(np.float32), 1, window=window)
    made = candidates(sites("H", 1, seed=46, height_m=30.0), sites("P", 8, seed=47))
    with Terrain.open(ground=path) as terrain:
        found = compared(made, terrain)
        assert terrain.many.held_bytes < 20e6
    assert (found.status == 0).all()


def test_runs_that_share_a_terrain_do_not_disturb_each_other(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(many, "MOST_BYTES", 0)
    monkeypatch.setattr(batch, "NEAR_SAMPLES", 3000)
    made = candidates(sites("H", 2, seed=48, height_m=30.0), sites("P", 30, seed=49))
    hub, place = every_pair(made)
    with Terrain.open(ground=ground_file(tmp_path), cover=trees(tmp_path)) as terrain, ThreadPoolExecutor(3) as pool:
        found = list(pool.map(lambda _: screen_pairs(made, hub=hub, place=place, terrain=terrain), range(3)))
    assert all(same_bytes(found[0], one) for one in found[1:])
