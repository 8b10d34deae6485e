"""A relay sought coarse to fine against every cell judged by itself: the same best places, in a part of the time."""

import time
from pathlib import Path

import numpy as np
import pytest
from made_hills import columns_at, hills, study_over

from fellspan.design.relay_picks import spread_picks
from fellspan.planning import relay_cells
from fellspan.planning.planner import open_terrain, settings_of
from fellspan.planning.relay_hops import screen_hop
from fellspan.planning.relay_result import RelayRequest
from fellspan.planning.relays import find_relay

pytestmark = [pytest.mark.bench, pytest.mark.slow]

SIDE, CELL_M, MAST_M, HOP_M, APART_M = 480, 25.0, 12.0, 9000.0, 400.0
A, B = (50.4, 246.3), (420.7, 230.6)
LEAST_RATIO = 8.0


@pytest.mark.timeout(600)
def test_coarse_to_fine_finds_what_judging_every_cell_finds(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(relay_cells, "FINE_CELLS", 10_000)
    monkeypatch.setattr(relay_cells, "_COARSE_CELLS", 14_000)
    monkeypatch.setattr(relay_cells, "_PART", 160)
    study = study_over(tmp_path, hills(SIDE, seed=6), A, B, cell_m=CELL_M)
    request = RelayRequest(mast_m=MAST_M, hop_m=HOP_M, apart_m=APART_M, count=3)
    find_relay(study, "West - East", request)  # compiled loops are compiled
    begun = time.process_time()
    result = find_relay(study, "West - East", request)
    searched_s = time.process_time() - begun
    assert result.area is not None

    begun = time.process_time()
    rows, columns = (index.ravel() for index in np.mgrid[0:SIDE, 0:SIDE])
    x, y = (columns + 0.5) * CELL_M, (rows + 0.5) * CELL_M
    within = np.ones(rows.size, dtype=np.bool_)
    for east, south in (A, B):
        within &= np.hypot(x - east * CELL_M, y - south * CELL_M) < HOP_M - 10.0
    rows, columns, x, y = rows[within], columns[within], x[within], y[within]
    places = columns_at(rows, columns, cell_m=CELL_M, mast_m=MAST_M)
    clear, share = np.ones(rows.size, dtype=np.bool_), np.full(rows.size, np.inf)
    with open_terrain(study) as terrain:
        for end in ("a", "b"):
            hop = screen_hop(
                study.links[0], end=end, places=places, terrain=terrain, settings=settings_of(study), margin_db=0.0
            )
            clear &= hop.clear
            share = np.minimum(share, hop.worth(study.links[0].wanted_margin_db))
    picks = spread_picks(np.where(clear, share, -np.inf), x, y, apart_m=APART_M, count=3)
    all_s = time.process_time() - begun

    found = [route.relays[0].position for route in result.routes]
    wanted = [(places.latitude_deg[index], places.longitude_deg[index]) for index in picks.tolist()]
    print(f"{rows.size} cells, {clear.sum()} serve; {all_s:.1f} s for all, {searched_s:.1f} s coarse to fine")
    assert len(found) == len(wanted) == 3
    for place, (latitude, longitude) in zip(found, wanted, strict=True):
        assert (place.latitude_deg, place.longitude_deg) == pytest.approx((latitude, longitude), abs=1e-6)
    assert all_s / searched_s > LEAST_RATIO
