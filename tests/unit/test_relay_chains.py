"""Chains of two relays: against all pairs of cells judged by themselves, and, on coarser blocks, against all pairs of those."""

from pathlib import Path

import numpy as np
import pytest
from made_hills import clear_of_one, columns_at, hills, study_over

from fellspan.geodesy.geodesic import inverse, inverse_many
from fellspan.planning import relay_chains
from fellspan.planning.inputs import Study
from fellspan.planning.planner import open_terrain, plan_study, settings_of
from fellspan.planning.relay_chains import ChainSearch, chains_of_two
from fellspan.planning.relay_hops import chosen_places, screen_between
from fellspan.planning.relay_result import RelayRequest
from fellspan.planning.relays import find_relay
from fellspan.screening.pairs import SiteColumns
from fellspan.terrain.terrain import Terrain

SIDE, CELL_M, MAST_M, HOP_M = 26, 60.0, 4.0, 610.0
A, B = (2.4, 12.3), (23.3, 13.6)


def search_over(study: Study, terrain: Terrain) -> ChainSearch:
    return ChainSearch(
        study=study,
        link=study.links[0],
        terrain=terrain,
        mast_m=MAST_M,
        hop_m=HOP_M,
        area=None,
        margin_db=0.0,
        apart_m=100.0,
        tell=lambda done, total, what: None,
    )


def brute(study: Study, terrain: Terrain) -> int:
    """How many pairs of cells make a chain: every cell with every cell."""
    link = study.links[0]
    rows, columns = (index.ravel() for index in np.mgrid[0:SIDE, 0:SIDE])
    places = columns_at(rows, columns, cell_m=CELL_M, mast_m=MAST_M)
    sides = []
    for end, site in (("a", link.a), ("b", link.b)):
        at = site.position
        away = inverse_many(at.latitude_deg, at.longitude_deg, places.latitude_deg, places.longitude_deg).distance_m
        sides.append(np.flatnonzero(clear_of_one(study, terrain, places, end) & (away <= HOP_M)))  # type: ignore[arg-type]
    return serving_pairs(study, terrain, chosen_places(places, sides[0]), chosen_places(places, sides[1]))


def serving_pairs(study: Study, terrain: Terrain, near: SiteColumns, far: SiteColumns) -> int:
    one, two = (index.ravel() for index in np.mgrid[0 : len(near.name), 0 : len(far.name)])
    away = inverse_many(
        near.latitude_deg[one], near.longitude_deg[one], far.latitude_deg[two], far.longitude_deg[two]
    ).distance_m
    within = (away <= HOP_M) & (away > 1.0)
    found = screen_between(
        study.links[0],
        near=near,
        far=far,
        pairs=(one[within], two[within]),
        terrain=terrain,
        settings=settings_of(study),
        margin_db=0.0,
    )
    return int(found.serves.sum())


@pytest.mark.parametrize("seed", range(4))
def test_chains_are_those_of_all_pairs_of_cells(tmp_path: Path, seed: int) -> None:
    study = study_over(tmp_path, hills(SIDE, seed=seed, height_m=120.0), A, B, cell_m=CELL_M)
    with open_terrain(study) as terrain:
        tried, chains = chains_of_two(search_over(study, terrain))
        assert tried.every_cell
        assert tried.block == (1, 1)
        assert tried.chains == brute(study, terrain)
        assert bool(list(chains)) == bool(tried.chains)


@pytest.mark.parametrize("seed", range(2))
def test_on_blocks_of_cells_no_pair_of_blocks_is_left_out(
    tmp_path: Path, seed: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(relay_chains, "PAIRS", 100)
    monkeypatch.setattr(relay_chains, "_PLACES", (3000, 100, 40, 20))
    study = study_over(tmp_path, hills(SIDE, seed=seed, height_m=120.0), A, B, cell_m=CELL_M)
    with open_terrain(study) as terrain:
        tried, _ = chains_of_two(search_over(study, terrain))
        assert 0 < tried.pairs <= 100
        assert not tried.every_cell
        assert min(tried.block) > 1
        sides = [relay_chains._side(search_over(study, terrain), end) for end in ("a", "b")]  # type: ignore[arg-type]
        thinned = [[side.thinned(most).cells for side in sides] for most in relay_chains._PLACES]
        near, far = next(two for two in thinned if (two[0].row.size, two[1].row.size) == tried.places)
        assert tried.chains == serving_pairs(study, terrain, near.columns(MAST_M), far.columns(MAST_M))
        # one of each block
        for cells, block in ((near, tried.block[0]), (far, tried.block[1])):
            blocks = {(row // block, column // block) for row, column in zip(cells.row, cells.column, strict=True)}
            assert len(blocks) == cells.row.size


def test_a_link_that_needs_two_gets_two_and_each_hop_passes_plan(tmp_path: Path) -> None:
    # two walls: from one valley to the next but one
    heights = hills(SIDE, seed=1, height_m=20.0)
    heights[:, 8:10] += 60.0
    heights[:, 17:19] += 60.0
    heights[:, 12:15] += 45.0
    study = study_over(tmp_path, heights, A, B, cell_m=CELL_M)
    with open_terrain(study) as terrain:
        assert brute(study, terrain)
    result = find_relay(study, "West - East", RelayRequest(mast_m=MAST_M, hop_m=HOP_M, apart_m=100.0))
    assert result.chains is not None
    assert result.chains.chains > 0
    assert result.routes
    for route in result.routes:
        assert len(route.relays) == 2
        assert len(route.hops) == 3
        for hop in route.hops:
            assert inverse(hop.link.a.position, hop.link.b.position).distance_m <= HOP_M + 1.0
            alone = Study(
                title="Alone",
                links=(hop.link,),
                terrain=study.terrain,
                date=study.date,
                criteria=study.criteria,
                path=study.path,
            )
            assert plan_study(alone).links[0].result.verdict == "clear"
