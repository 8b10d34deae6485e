"""Relays on rasters too large for one sweep: what coarse and fine sweeps let through holds every cell that serves."""

from pathlib import Path

import numpy as np
import pytest
from made_hills import clear_of_both, columns_at, hills, study_over

from fellspan.planning import relay_cells
from fellspan.planning.planner import open_terrain, plan_study
from fellspan.planning.relay_cells import Ground, cells_between
from fellspan.planning.relay_result import RelayRequest
from fellspan.planning.relays import find_relay

SIDE, CELL_M, MAST_M = 160, 25.0, 12.0
A, B = (20.4, 82.3), (138.7, 76.6)


@pytest.fixture
def coarse(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(relay_cells, "FINE_CELLS", 1000)
    monkeypatch.setattr(relay_cells, "_COARSE_CELLS", 1500)
    monkeypatch.setattr(relay_cells, "_PART", 40)


@pytest.mark.usefixtures("coarse")
@pytest.mark.parametrize("seed", [2, *(pytest.param(seed, marks=pytest.mark.slow) for seed in (1, 3, 4, 5))])
def test_no_cell_that_serves_is_lost_between_coarse_and_fine(tmp_path: Path, seed: int) -> None:
    study = study_over(tmp_path, hills(SIDE, seed=seed), A, B, cell_m=CELL_M)
    link = study.links[0]
    with open_terrain(study) as terrain:
        ground = Ground(
            study=study, link=link, ends=(link.a, link.b), hop_m=3500.0, mast_m=MAST_M, area=None, terrain=terrain
        )
        cells = cells_between(ground)
        assert not cells.whole
        assert max(cells.shape) < SIDE / 3
        rows, columns = (index.ravel() for index in np.mgrid[1 : SIDE - 1, 1 : SIDE - 1])
        x, y = (columns + 0.5 - np.array(A)[0]) * CELL_M, (rows + 0.5 - A[1]) * CELL_M
        u, v = (columns + 0.5 - B[0]) * CELL_M, (rows + 0.5 - B[1]) * CELL_M
        within = (np.hypot(x, y) < 3490.0) & (np.hypot(u, v) < 3490.0)
        rows, columns = rows[within], columns[within]
        places = columns_at(rows, columns, cell_m=CELL_M, mast_m=MAST_M)
        clear = clear_of_both(study, terrain, places)
    assert clear.sum() > 20
    passed = {
        (round(latitude, 6), round(longitude, 6))
        for latitude, longitude in zip(cells.latitude_deg.tolist(), cells.longitude_deg.tolist(), strict=True)
    }
    lost = [
        (round(float(places.latitude_deg[index]), 6), round(float(places.longitude_deg[index]), 6)) not in passed
        for index in np.flatnonzero(clear)
    ]
    assert sum(lost) == 0, f"{sum(lost)} of {clear.sum()}"
    assert len(passed) == cells.row.size
    # the area counts fine cells, kept or not, and is not far from those that serve
    assert cells.seen is not None
    passing = cells.chosen(cells.spare_m >= 0.0)
    marked = np.zeros_like(cells.seen)
    marked[passing.row, passing.column] = True
    assert np.array_equal(cells.seen, marked)
    assert cells.seen_cells == int((cells.spare_m >= 0.0).sum())
    assert cells.seen_cells == pytest.approx(int(clear.sum()), rel=0.2)
    assert cells.cell_area_m2 == pytest.approx(CELL_M**2, rel=0.01)


@pytest.mark.usefixtures("coarse")
def test_thinned_parts_leave_the_area_whole_and_every_relay_passes_plan(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    study = study_over(tmp_path, hills(SIDE, seed=2), A, B, cell_m=CELL_M)
    request = RelayRequest(mast_m=MAST_M, hop_m=3500.0, count=2)
    whole = find_relay(study, "West - East", request)
    monkeypatch.setattr(relay_cells, "_KEPT", 10)
    monkeypatch.setattr(relay_cells, "_LEAST", 5)
    thinned = find_relay(study, "West - East", request)
    assert whole.area is not None
    assert thinned.area is not None
    assert (thinned.area.cells, thinned.area.exact) == (whole.area.cells, False)
    assert thinned.area.clear.any()
    assert np.array_equal(thinned.area.clear, whole.area.clear)
    assert whole.routes
    assert thinned.routes
    for route in thinned.routes:
        for hop in route.hops:
            assert plan_study(study_of(study, hop.link)).links[0].result.verdict == "clear"


def study_of(study, link):  # type: ignore[no-untyped-def]
    import dataclasses

    return dataclasses.replace(study, links=(link,))
