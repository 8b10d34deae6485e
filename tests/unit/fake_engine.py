"""An engine that needs no terrain: results follow from positions alone, so that a run can be checked and is quick.

`python -c "import fake_engine; fake_engine.install()"` puts it in the place of the real one in a process of its own.
"""

import os
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fellspan.geodesy import geodesic
from fellspan.screening.pairs import Candidates, PairResults

SLOW = "FELLSPAN_TEST_SECONDS_A_BATCH"
BEGUN = "FELLSPAN_TEST_FILE_OF_THE_FIRST_BATCH"


def screen_pairs(
    candidates: Candidates,
    *,
    hub: NDArray[np.int64],
    place: NDArray[np.int64],
    terrain: object,
    threads: int = 2,
    stopped: Callable[[], bool] | None = None,
) -> PairResults:
    """Every kind of answer: verdicts, gaps, refusals, numbers that are none and infinite ones."""
    assert terrain is not None
    assert threads == 1
    if BEGUN in os.environ:
        Path(os.environ[BEGUN]).touch()
    time.sleep(float(os.environ.get(SLOW, "0")))
    hubs, places = candidates.hubs, candidates.places
    way = geodesic.inverse_many(
        hubs.latitude_deg[hub], hubs.longitude_deg[hub], places.latitude_deg[place], places.longitude_deg[place]
    )
    luck = np.modf(np.abs(np.sin(way.distance_m) * 1e4))[0]
    turn = np.modf(np.abs(np.cos(way.bearing_ab_deg) * 1e4))[0]
    status = np.where(luck < 0.05, 1, np.where(luck < 0.1, 3, 0)).astype(np.int8)
    done = status == 0
    sectors = {number: sector.hub for number, sector in enumerate(candidates.sectors)}
    first = np.array([next(n for n, of in sectors.items() if of == one) for one in hub.tolist()], dtype=np.int64)
    several = np.array([list(sectors.values()).count(one) for one in hub.tolist()], dtype=np.int64)
    nan = np.full(hub.size, np.nan)

    def of_done(values: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.where(done, values, np.nan)

    def codes(values: NDArray[np.float64]) -> NDArray[np.int8]:
        return np.where(done, values, -1).astype(np.int8)

    return PairResults(
        hub=hub,
        place=place,
        sector=np.where(done, first + (turn * several).astype(np.int64), -1),
        status=status,
        distance_m=way.distance_m,
        bearing_deg=way.bearing_ab_deg,
        verdict=codes(np.floor(turn * 3.0)),
        signal_verdict=codes(np.floor(luck * 3.0)),
        basis=codes(np.floor(np.modf(turn * 7.0)[0] * 3.0)),
        confidence=of_done(turn),
        governing=codes(np.round(luck)),
        worst_fraction=of_done(1.0 - turn),
        worst_at_m=of_done(luck * way.distance_m),
        extra_at_place_m=of_done(np.where(turn > 0.9, np.inf, turn * 30.0)),
        extra_for_confidence_m=of_done(np.where(turn > 0.8, np.inf, turn * 31.0)),
        diffraction_db=of_done(turn * 20.0),
        received_at_hub_dbm=of_done(-60.0 - 30.0 * luck),
        received_at_place_dbm=of_done(-61.0 - 30.0 * luck),
        margin_at_hub_db=of_done(20.0 - 30.0 * luck),
        margin_at_place_db=of_done(19.0 - 30.0 * luck),
        availability_percent=of_done(100.0 - turn),
        gap_from_m=np.where(status == 1, 10.0, nan),
        gap_to_m=np.where(status == 1, 20.0, nan),
        reason=tuple("=cmd|'/c calc'!A1 is no roof" if code == 3 else "" for code in status.tolist()),
    )


def install() -> None:
    """Put this engine in the place of the real one."""
    from fellspan.runs import work

    work.screen_pairs = screen_pairs


def dask_setup(worker: object) -> None:
    """Called by `dask worker --preload`."""
    assert worker is not None
    install()
