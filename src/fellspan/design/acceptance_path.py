"""Causes that lie between the antennas: air of a low k, mirrored rays, heights that differ, what grew or was built, the plan.

From the link's own result and what the engine says of changes; knows no levels that were measured.
"""

from collections.abc import Iterator

from fellspan.design.acceptance_hypotheses import DESK, GROUND, LEAST_DB, MAST, Check, Hypothesis, Numbers, db
from fellspan.design.reflection_result import SpecularPoint

_LOG = Check(rung=DESK, text="log the level for a day and a night, with the water level where the path crosses water")
_WORST: dict[str, float] = {"bare ground only": 0.07, "surface raster": 0.04, "surveyed": 0.02}


def path_causes(numbers: Numbers) -> Iterator[Hypothesis]:
    """Everything that the path can do."""
    yield from _low_k(numbers)
    yield from _mirrored(numbers)
    yield from _heights(numbers)
    yield from _in_the_way(numbers)
    yield from _plan_too_dark(numbers)


def _low_k(numbers: Numbers) -> Iterator[Hypothesis]:
    low = numbers.low_k
    if low is None or low.a_db > -LEAST_DB:
        return
    yield Hypothesis(
        key="low k",
        title="diffraction in air of a low k",
        a_db=0.6 * low.a_db,
        b_db=0.6 * low.b_db,
        spread_db=(max(1.0, 0.35 * abs(low.a_db)), 0.0, 0.0),
        weight=0.06,
        why=f"the plan is for the median k of {numbers.result.median_k:.2f}; at {numbers.low_k_value:.2f}, exceeded 99.9 % of "
        f"the worst month, the terrain takes {db(-low.a_db)} more, for some hours",
        settled_by="readings over a day and a night: low for some hours, as expected at others",
        checks=(_LOG,),
        varies="with the hour",
        sharp=False,
    )


def _deepest(numbers: Numbers) -> SpecularPoint | None:
    found = numbers.reflections
    points = [] if found is None else [point for point in found.points if point.fade_db is not None]
    return max(points, key=lambda point: point.fade_db or 0.0) if points else None


def _mirrored(numbers: Numbers) -> Iterator[Hypothesis]:
    point, found = _deepest(numbers), numbers.reflections
    if point is None or found is None or point.fade_db is None or point.fade_db < LEAST_DB:
        return
    water = point.surface == "water"
    yield Hypothesis(
        key="mirrored ray",
        title=f"a ray mirrored by {point.surface}",
        a_db=-0.4 * point.fade_db,
        b_db=-0.4 * point.fade_db,
        spread_db=(max(1.5, 0.35 * point.fade_db), 0.5, 0.5),
        weight=0.06 if found.matters else 0.02,
        why=f"a ray mirrored {point.at_m / 1000.0:.1f} km from A can take {db(point.fade_db)} or add {db(point.gain_db)}, as "
        + ("the water rises and falls" if water else "the bending of the air changes"),
        settled_by="readings over a whole tide" if water else "readings over a day and a night",
        checks=(
            _LOG,
            Check(rung=MAST, text="only if it stays: change one antenna's height as the page of the link says"),
        ),
        varies="with the water" if water else "with the hour",
        sharp=False,
    )


def _heights(numbers: Numbers) -> Iterator[Hypothesis]:
    changed = [one for one in numbers.lower if one.a_db <= -LEAST_DB]
    for one in changed:
        yield Hypothesis(
            key="height",
            title="an antenna lower than planned",
            a_db=one.a_db,
            b_db=one.b_db,
            spread_db=(1.0 + 0.15 * abs(one.a_db), 0.0, 0.0),
            weight=0.10 / len(changed),
            why=f"{one.words}, the terrain takes {db(-one.a_db)} more in both directions",
            settled_by="the height of each antenna measured with a tape or a range finder, from the same reference as planned",
            checks=(
                Check(rung=DESK, text="see whether the height in the study was meant above ground, roof or sea level"),
                Check(rung=GROUND, text="measure the height of both antennas and put them into the measured file"),
            ),
        )


def _in_the_way(numbers: Numbers) -> Iterator[Hypothesis]:
    basis = numbers.result.basis
    yield Hypothesis(
        key="obstruction",
        title="something in the way that the data do not hold",
        a_db=-11.0,
        b_db=-11.0,
        spread_db=(6.0, 0.0, 0.0),
        weight=_WORST[basis],
        why=f"the plan rests on: {basis}; trees that grew or something built since costs both directions alike, by any amount",
        settled_by="the path looked along from the antenna, with a telescope or a drone",
        checks=(
            Check(
                rung=GROUND,
                text="look along the path from the places on the survey list, for trees, cranes and new roofs",
            ),
            Check(rung=MAST, text="look along the antenna toward the other end, and take a photograph"),
        ),
        sharp=False,
    )


def _plan_too_dark(numbers: Numbers) -> Iterator[Hypothesis]:
    losses = numbers.result.losses_db
    taken = losses.diffraction + (losses.vegetation or 0.0)
    if taken < 3.0:
        return
    yield Hypothesis(
        key="less in the way",
        title="less in the way than planned",
        a_db=0.4 * taken,
        b_db=0.4 * taken,
        spread_db=(0.35 * taken, 0.0, 0.0),
        weight=0.15,
        why=f"the plan counts {db(taken)} for terrain and trees; an edge that is rounder, lower or thinner takes less",
        settled_by="a survey of the obstacle, put into the study",
        checks=(Check(rung=GROUND, text="survey the top of the obstacle and plan again with it"),),
        sharp=False,
    )
