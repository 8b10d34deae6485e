"""Pairs through a town of outlines, masts and lines: against planning each of them alone, and against the same without a town.

Draws of the confidence are left out on both sides: how many of them it takes is measured elsewhere.
"""

import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from made_near import town_file
from made_screening import candidates, every_pair, ground_file, sites

import fellspan.screening.screen as screen
import fellspan.screening.single as single
from fellspan.screening.batch import Batch
from fellspan.screening.columns import Columns
from fellspan.screening.screen import screen_pairs
from fellspan.screening.single import screen_single
from fellspan.terrain.terrain import Terrain

pytestmark = [pytest.mark.bench, pytest.mark.slow]

PLANNED = 40
LEAST_SINGLES, MOST_BARE = 12.0, 25.0


@pytest.fixture(autouse=True)
def no_draws(monkeypatch: pytest.MonkeyPatch) -> None:
    def none(*_: object, **__: object) -> np.ndarray:
        return np.zeros(0, dtype=np.int64)

    monkeypatch.setattr(Batch, "_after_draws", none)
    monkeypatch.setattr(single, "with_draws", none)


def seconds_each(work: Callable[[], int], times: int) -> float:
    """The least processor time of a pair."""
    best = np.inf
    for _ in range(times):
        start = time.process_time()
        pairs = work()
        best = min(best, (time.process_time() - start) / pairs)
    return float(best)


def test_near_pairs_against_planning_and_against_bare_ground(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    made = candidates(sites("H", 4, seed=1, height_m=60.0), sites("P", 400, seed=2, height_m=20.0))
    hub, place = every_pair(made)
    alone: list[int] = []
    monkeypatch.setattr(screen, "screen_single", lambda made, columns, row, *, terrain: alone.append(row))
    ground, town = ground_file(tmp_path), town_file(tmp_path, seed=3)

    def screened(terrain: Terrain) -> float:
        def work() -> int:
            screen_pairs(made, hub=hub, place=place, terrain=terrain, threads=1)
            return hub.size

        work()
        return seconds_each(work, 3)

    with Terrain.open(ground=ground) as terrain:
        bare = screened(terrain)
    with Terrain.open(ground=ground, obstacles=town) as terrain:
        near = screened(terrain)
        few = np.random.default_rng(4).choice(hub.size, PLANNED, replace=False)

        def planned() -> int:
            columns = Columns(hub[few], place[few])
            for row in range(PLANNED):
                screen_single(made, columns, row, terrain=terrain)
            return PLANNED

        one = seconds_each(planned, 2)
    with capsys.disabled():
        print(f"\nnear pair {1e3 * near:.2f} ms, alone {1e3 * one:.1f} ms, bare {1e3 * bare:.2f} ms")
    assert not alone
    assert one / near >= LEAST_SINGLES
    assert near / bare <= MOST_BARE
