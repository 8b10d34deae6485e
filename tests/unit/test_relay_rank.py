"""The order of relay places: scarce margins by margin, ample ones by the height to spare; the height is that of the plan."""

import dataclasses

import numpy as np
import pytest
from made_pass import study_with_pass
from made_terrain import at

from fellspan.links.site import Site
from fellspan.planning.planner import open_terrain, plan_study, settings_of
from fellspan.planning.relay_hops import AMPLE_DB, AMPLE_M, HopColumns, columns_of, hop_link, screen_hop


def hops(margin_db: list[float], spare_m: list[float]) -> HopColumns:
    yes = np.ones(len(margin_db), dtype=np.bool_)
    return HopColumns(
        clear=yes,
        serves=yes,
        margin_db=np.array(margin_db),
        free_share=np.full(yes.size, 0.9),
        spare_m=np.array(spare_m),
    )


def order(hop: HopColumns, wanted_db: float) -> list[int]:
    ranked: list[int] = np.argsort(-hop.worth(wanted_db), kind="stable").tolist()
    return ranked


def test_seven_tenths_of_a_decibel_do_not_beat_metres_of_clearance() -> None:
    assert order(hops([36.7, 36.4, 36.0], [2.0, 4.0, 6.5]), 10.0) == [2, 1, 0]


def test_a_scarce_margin_comes_after_an_ample_one_and_is_ranked_by_itself() -> None:
    assert order(hops([12.0, 19.9, 20.0, 30.0], [50.0, 40.0, 0.1, 0.2]), 10.0) == [3, 2, 1, 0]
    assert AMPLE_DB == 10.0


def test_the_highest_hill_does_not_win_by_its_height_alone() -> None:
    """Beyond ten metres to spare the margin tells places apart again."""
    assert order(hops([33.0, 35.7, 36.7], [19.2, 11.6, 9.0]), 10.0) == [1, 0, 2]


def test_without_levels_the_height_to_spare_decides() -> None:
    assert order(hops([np.nan, np.nan], [1.0, 3.0]), 10.0) == [1, 0]


def test_the_worth_of_a_chain_is_that_of_its_weakest_hop() -> None:
    """The least over hops of what each is worth ranks as the least margin where scarce, the least height, the least margin."""
    rng = np.random.default_rng(6)
    there, back = (hops(rng.uniform(10.0, 40.0, 200).tolist(), rng.uniform(0.0, 20.0, 200).tolist()) for _ in range(2))
    least_db = np.minimum(there.margin_db, back.margin_db)
    least_m = np.minimum(there.spare_m, back.spare_m)
    scarce = least_db < 20.0
    wanted = np.lexsort((-least_db, np.where(scarce, 0.0, -np.minimum(least_m, AMPLE_M)), scarce)).tolist()
    assert (~scarce & (least_m > AMPLE_M)).sum() > 10
    assert np.argsort(-np.minimum(there.worth(10.0), back.worth(10.0)), kind="stable").tolist() == wanted


def test_the_height_to_spare_is_that_of_the_plan(tmp_path) -> None:  # type: ignore[no-untyped-def]
    study = study_with_pass(tmp_path)
    link = study.links[0]
    sites = tuple(Site(name=f"{n}", position=at(90.0 + 17.0 * n, 230.0 + 11.0 * n), height_m=12.0) for n in range(12))
    with open_terrain(study) as terrain:
        hop = screen_hop(
            link, end="a", places=columns_of(sites), terrain=terrain, settings=settings_of(study), margin_db=0.0
        )
    seen = np.flatnonzero(hop.clear).tolist()
    assert len(seen) >= 3
    links = tuple(hop_link(link, name=f"hop {n}", a=link.a, b=sites[n]) for n in seen)
    for n, planned in zip(seen, plan_study(dataclasses.replace(study, links=links)).links, strict=True):
        rule = planned.result.clearance[planned.result.governing]
        assert hop.spare_m[n] == pytest.approx(rule.clearance_m - rule.required_m, abs=0.01)
