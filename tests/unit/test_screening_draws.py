"""Pairs on which neither bounds nor the quick confidence can decide: the verdict is planning's, whoever draws."""

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from made_near import survey_file, town_file
from made_screening import candidates, every_pair, ground_file, hills, same_bytes, sites
from made_terrain import at, raster
from numpy.typing import NDArray
from scipy.stats import binom

import fellspan.screening.batch as batch
import fellspan.screening.own_draws as own_draws
import fellspan.screening.screen as screen
import fellspan.screening.sure as sure
from fellspan.links.assess import AssessSettings
from fellspan.screening.columns import Columns
from fellspan.screening.pairs import Candidates, PairResults
from fellspan.screening.screen import screen_pairs
from fellspan.screening.single import screen_single
from fellspan.screening.sure import UNSURE, Likely
from fellspan.terrain.sources import CoverSource
from fellspan.terrain.terrain import Terrain

Index = NDArray[np.int64]


class Watched:
    """What is said of the pairs that were drawn, by their place in the one batch of a run."""

    def __init__(self, patch: pytest.MonkeyPatch) -> None:
        self.made: dict[int, int] = {}
        self.unsure: set[int] = set()
        self.own: dict[tuple[int, int], float | None] = {}
        self.alone: list[int] = []
        said, own, alone = batch.likely, batch.own_share, screen.draw_single

        def likely(*args: object, **options: object) -> Likely:
            found = said(*args, **options)  # type: ignore[arg-type]
            pairs = args[1].which[args[4]]  # type: ignore[attr-defined]
            self.made |= {int(pair): int(made) for pair, made in zip(pairs, found.made, strict=True) if made}
            self.unsure |= set(pairs[found.verdict == UNSURE].tolist())
            return found

        def own_share(made: Candidates, hub: int, place: int, *args: object, **options: object) -> float | None:
            self.own[hub, place] = own(made, hub, place, *args, **options)  # type: ignore[arg-type]
            return self.own[hub, place]

        def draw_single(made: Candidates, columns: Columns, row: int, *, terrain: Terrain) -> None:
            self.alone.append(row)
            alone(made, columns, row, terrain=terrain)

        patch.setattr(batch, "likely", likely)
        patch.setattr(batch, "own_share", own_share)
        patch.setattr(screen, "draw_single", draw_single)


def trees(folder: Path) -> CoverSource:
    heights = np.clip(hills((600, 1200), seed=7, height_m=8.0) - 98.0, 0.0, 15.0)
    file = raster(folder / "trees.tif", heights, cell_m=5.0, nodata=-9999.0, crs="EPSG:32623")
    return CoverSource(path=file, kind="tree", growth_m_per_year=0.3, error_m=1.5)


def bare(folder: Path) -> Terrain:
    return Terrain.open(ground=ground_file(folder))


def wooded(folder: Path) -> Terrain:
    return Terrain.open(ground=ground_file(folder), cover=trees(folder), growth_years=5.0)


def side_by_side(folder: Path) -> Terrain:
    """Two rasters under trees that are told apart along the paths."""
    whole = hills()
    west = raster(folder / "west.tif", np.where(np.arange(600) < 320, whole, -9999.0))
    east = raster(folder / "east.tif", np.where(np.arange(600) >= 310, whole + 0.2, -9999.0))
    return Terrain.open(ground=[west, east], cover=trees(folder))


def by_the_sea(folder: Path) -> Terrain:
    ground = np.maximum(hills() - 85.0, 0.3)
    ground[:, 250:330] = -9999.0
    return Terrain.open(ground=raster(folder / "ground.tif", ground), gaps="sea", sea_level_m=0.5)


def many(count: int, seed: int, **changes: object) -> tuple[Candidates, Index, Index]:
    made = candidates(sites("H", 6, seed=seed, height_m=45.0), sites("P", count, seed=seed + 1), **changes)
    return made, *every_pair(made)


def planned(made: Candidates, hub: Index, place: Index, rows: list[int], terrain: Terrain) -> PairResults:
    columns = Columns(hub.copy(), place.copy())
    for row in rows:
        screen_single(made, columns, row, terrain=terrain)
    return columns.results()


def hard_ones(
    terrain: Terrain, *, patch: pytest.MonkeyPatch, seed: int, most: int, asked: float = 0.9, count: int = 200
) -> tuple[Watched, list[int]]:
    """Judge pairs, and hold those that were drawn against planning."""
    made, hub, place = many(count, seed, settings=AssessSettings(confidence=asked))
    watched = Watched(patch)
    found = screen_pairs(made, hub=hub, place=place, terrain=terrain)
    drawn = sorted(watched.made)
    # Those that were hardest first.
    rows = sorted(drawn, key=lambda row: -watched.made[row])[: most // 2]
    rows += [row for row in drawn if row not in rows][: most - len(rows)]
    wanted = planned(made, hub, place, rows, terrain)
    np.testing.assert_array_equal(found.verdict[rows], wanted.verdict[rows])
    assert set(found.verdict[rows].tolist()) == {0, 1} or asked > 0.9
    off = found.confidence[rows] - wanted.confidence[rows]
    # 512 draws scatter by 0.013 at most, planning's by 0.003; four times as much passes once in 10,000.
    assert np.abs(off).max() < 0.055
    own = np.array([row in watched.unsure for row in rows])
    assert own.any()
    assert np.abs(off[own]).max() <= 2e-4
    return watched, rows


KINDS: dict[str, Callable[[Path], Terrain]] = {
    "bare": bare,
    "wooded": wooded,
    "side by side": side_by_side,
    "sea": by_the_sea,
}


@pytest.mark.parametrize("kind", list(KINDS))
def test_verdicts_are_those_of_planning_where_draws_decide(
    tmp_path: Path, kind: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    with KINDS[kind](tmp_path) as terrain:
        watched, _ = hard_ones(terrain, patch=monkeypatch, seed=60, most=24)
    assert watched.own
    assert len(watched.alone) <= 0.2 * len(watched.own) + 1


@pytest.mark.slow
@pytest.mark.parametrize("asked", [0.5, 0.8, 0.9, 0.99, 0.999])
def test_hundreds_of_hard_pairs_have_the_verdict_of_planning(
    tmp_path: Path, asked: float, monkeypatch: pytest.MonkeyPatch
) -> None:
    with bare(tmp_path) as terrain:
        _, rows = hard_ones(terrain, patch=monkeypatch, seed=70, most=200, asked=asked, count=600)
    assert len(rows) > 50


def test_draws_do_not_depend_on_company_or_order(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made, hub, place = many(40, 80)
    with wooded(tmp_path) as terrain:
        with monkeypatch.context() as patch:
            watched = Watched(patch)
            whole = screen_pairs(made, hub=hub, place=place, terrain=terrain)
        assert watched.made
        assert watched.own
        monkeypatch.setattr(screen, "BATCH", 37)
        monkeypatch.setattr(batch, "NEAR_SAMPLES", 1500)
        assert same_bytes(whole, screen_pairs(made, hub=hub, place=place, terrain=terrain, threads=1))
        order = np.random.default_rng(81).permutation(hub.size)
        mixed = screen_pairs(made, hub=hub[order], place=place[order], terrain=terrain, threads=3)
    back = np.argsort(order)
    assert mixed.confidence[back].tobytes() == whole.confidence.tobytes()
    assert mixed.verdict[back].tobytes() == whole.verdict.tobytes()


def test_where_a_few_draws_would_decide_planning_itself_is_asked(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    made, hub, place = many(40, 80)
    with bare(tmp_path) as terrain:
        with monkeypatch.context() as patch:
            watched = Watched(patch)
            screen_pairs(made, hub=hub, place=place, terrain=terrain)
        assert len(watched.alone) < len(watched.own)
        monkeypatch.setattr(own_draws, "FEW", 10_000)
        none_own = Watched(monkeypatch)
        found = screen_pairs(made, hub=hub, place=place, terrain=terrain)
        assert set(none_own.own.values()) == {None}
        rows = sorted(none_own.alone)
        assert len(rows) == len(none_own.own)
        wanted = planned(made, hub, place, rows, terrain)
    np.testing.assert_array_equal(found.confidence[rows], wanted.confidence[rows])


def test_among_obstacles_and_surveyed_points_too(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    made, hub, place = many(60, 90)
    survey, town = survey_file(tmp_path, seed=19), town_file(tmp_path, seed=24)
    drawn: list[int] = []
    said = batch.likely

    def likely(*args: object, **options: object) -> Likely:
        found = said(*args, **options)  # type: ignore[arg-type]
        drawn.append(int((found.made > 0).sum()))
        return found

    monkeypatch.setattr(batch, "likely", likely)
    with Terrain.open(ground=ground_file(tmp_path), survey=survey, obstacles=town) as terrain:
        found = screen_pairs(made, hub=hub, place=place, terrain=terrain)
        rows = np.flatnonzero((found.verdict < 2) & (found.confidence > 0.7) & (found.confidence < 0.97)).tolist()[:60]
        wanted = planned(made, hub, place, rows, terrain)
    assert sum(drawn) > 5
    np.testing.assert_array_equal(found.verdict[rows], wanted.verdict[rows])
    assert set(found.verdict[rows].tolist()) == {0, 1}


def test_what_a_path_passes_in_its_zone_counts_in_draws(tmp_path: Path) -> None:
    """A tank 5 m beside the path, its top from well below the zone to just below it: clear on the heights in the data."""
    flat = raster(tmp_path / "flat.tif", 10.0)
    verdicts = []
    for top_m in (15.0, 20.0, 22.0, 23.5):
        tank = at(2500.0, 1495.0)
        obstacles = tmp_path / "tank.csv"
        obstacles.write_text(
            "name,kind,latitude_deg,longitude_deg,height_m,radius_m\n"
            f"tank,building,{tank.latitude_deg},{tank.longitude_deg},{top_m},1\n"
        )
        hub, place = (
            replace(sites(letter, 1, seed=1), **spot)
            for letter, spot in (("H", spot_of(500.0)), ("P", spot_of(4500.0)))
        )
        made = candidates(hub, place)
        with Terrain.open(ground=flat, obstacles=obstacles) as terrain:
            found = screen_pairs(made, hub=np.zeros(1, int), place=np.zeros(1, int), terrain=terrain)
            wanted = planned(made, np.zeros(1, int), np.zeros(1, int), [0], terrain)
        assert found.verdict[0] == wanted.verdict[0]
        assert found.confidence[0] == pytest.approx(wanted.confidence[0], abs=0.07)
        verdicts.append(int(found.verdict[0]))
    assert verdicts == [0, 0, 1, 1]


def test_shares_scatter_by_less_than_bounds_keep_off() -> None:
    """Pairs of draws that fail both or neither are the widest: 5,000 of them by the binomial law."""
    for fails in (0.0, 1e-5, 1e-4, 1e-3, 0.01, 0.1, 0.5, 0.9):
        off = float(sure._scatter(np.array([fails]))[0])
        assert binom.sf(5000.0 * (fails + off) - 1e-9, 5000, fails) < 1e-8
        assert binom.cdf(5000.0 * (fails - off), 5000, fails) < 1e-8
        assert off < 0.0025 + 6.01 * np.sqrt(fails * (1.0 - fails) / 5000.0)


def spot_of(east_m: float) -> dict[str, NDArray[np.float64]]:
    place = at(east_m, 1500.0)
    return {
        "latitude_deg": np.array([place.latitude_deg]),
        "longitude_deg": np.array([place.longitude_deg]),
        "height_m": np.array([30.0]),
    }
