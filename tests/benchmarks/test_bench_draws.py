"""What drawn errors cost many pairs, against planning's draws of the same pairs.

Rough bare ground, antennas 25 and 10 m up, where about every fifth clear pair lies between the bounds: draws decide on it,
and planning's own 10,000 on every tenth of those. Printed: shares and costs (pytest -s).
"""

import time
from collections.abc import Callable
from pathlib import Path

import pytest
from made_screening import candidates, every_pair, hills, sites
from made_terrain import raster

import fellspan.screening.batch as batch
import fellspan.screening.screen as screen
from fellspan.links.assess import AssessSettings
from fellspan.screening.columns import Columns
from fellspan.screening.screen import screen_pairs
from fellspan.screening.single import screen_single
from fellspan.screening.sure import Likely, likely
from fellspan.terrain.terrain import Terrain

pytestmark = [pytest.mark.bench, pytest.mark.slow]

MOST_OF_PLANNING = 1.0 / 6.0
PLANNED = 60


def test_an_undecided_pair_costs_a_sixth_of_planning_it_at_most(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    ground = raster(tmp_path / "rough.tif", hills((600, 600), seed=2), size=(600, 600))
    extent = (6000.0, 6000.0)
    made = candidates(
        sites("H", 10, seed=1, height_m=25.0, extent_m=extent),
        sites("P", 1000, seed=2, height_m=10.0, extent_m=extent),
        settings=AssessSettings(),
        target_availability_percent=None,
    )
    hub, place = every_pair(made)
    spent = {"bounds and draws": 0.0, "own draws": 0.0, "planning": 0.0}
    counts = {"clear": 0, "drawn": 0, "own": 0, "planned": 0}
    drawn_rows: list[int] = []

    def timed(what: str, work: Callable[[], object]) -> object:
        begun = time.thread_time()
        found = work()
        spent[what] += time.thread_time() - begun
        return found

    def watched(*args: object, **options: object) -> Likely:
        found = timed("bounds and draws", lambda: likely(*args, **options))  # type: ignore[arg-type]
        assert isinstance(found, Likely)
        counts["clear"] += found.made.size
        counts["drawn"] += int((found.made > 0).sum())
        drawn_rows.extend(args[1].which[args[4][found.made > 0]].tolist())  # type: ignore[attr-defined,index]
        return found

    own, alone = batch.own_share, screen.draw_single

    def own_share(*args: object, **options: object) -> object:
        counts["own"] += 1
        return timed("own draws", lambda: own(*args, **options))  # type: ignore[arg-type]

    def draw_single(*args: object, **options: object) -> object:
        counts["planned"] += 1
        return timed("planning", lambda: alone(*args, **options))  # type: ignore[arg-type]

    monkeypatch.setattr(batch, "likely", watched)
    monkeypatch.setattr(batch, "own_share", own_share)
    monkeypatch.setattr(screen, "draw_single", draw_single)
    with Terrain.open(ground=ground) as terrain:
        screen_pairs(made, hub=hub[:2000], place=place[:2000], terrain=terrain, threads=1)
        ratios = []
        for _ in range(2):
            spent.update(dict.fromkeys(spent, 0.0))
            counts.update(dict.fromkeys(counts, 0))
            drawn_rows.clear()
            screen_pairs(made, hub=hub, place=place, terrain=terrain, threads=1)
            rows = sorted(drawn_rows)[:: max(1, len(drawn_rows) // PLANNED)]
            columns = Columns(hub.copy(), place.copy())
            begun = time.thread_time()
            for row in rows:
                screen_single(made, columns, row, terrain=terrain)
            single = (time.thread_time() - begun) / len(rows)
            each = sum(spent.values()) / counts["drawn"]
            ratios.append(each / single)
            print(
                f"{hub.size} pairs: {counts}; {', '.join(f'{1e3 * value:.0f} ms {what}' for what, value in spent.items())}; "
                f"an undecided pair {1e3 * each:.2f} ms, planned alone {1e3 * single:.1f} ms: 1/{1.0 / ratios[-1]:.0f}"
            )
    assert min(ratios) < MOST_OF_PLANNING
