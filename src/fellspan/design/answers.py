"""The exact answers to how high antennas must be, on the heights in the data, and the draws near them.

Shared by the design of heights and by those who ask how sure a link is as planned. Builds nothing and says nothing.
"""

import math
from collections.abc import Sequence
from typing import Final

from fellspan.design.boundary import Boundary
from fellspan.design.case import Case, Rules
from fellspan.design.draws import DRAWS, Draws, draw, parts_of
from fellspan.design.error_model import ErrorModel, default_error_model
from fellspan.design.heights_result import HeightKind, HeightSettings
from fellspan.design.options import Ground, Levels, exact
from fellspan.design.quick_draws import share_that_holds
from fellspan.links.assess import Assessment, AssessSettings
from fellspan.links.site import Link

LOWER_BY_M: Final = 0.05
"""A height counts as the lowest if this much less is not enough."""
FEW: Final = 5
"""Draws by which a share must be off the confidence asked to count without being made again."""
_MOST_LOWERINGS: Final = 400
_DEFAULTS: Final = HeightSettings()

Answers = dict[HeightKind, Levels | None]


def answers_of(case: Case, ground: Ground, heights: HeightSettings) -> Answers:
    """The exact answer of each kind, in the order in which they are shown; None where no height is enough."""
    kinds: tuple[HeightKind, ...] = ("a alone", "b alone", "equal", "alike", "least total")
    if heights.counts_cost:
        kinds = (*kinds, "least cost")
    boundaries = [Boundary.over(case.share, rules.most_m) for rules in case.rules]
    return {kind: exact_answer(case, kind, ground, heights, boundaries=boundaries) for kind in kinds}


def draws_near(case: Case, answers: Answers, model: ErrorModel) -> Draws:
    """Draws at the samples that can govern near what is planned and near the answers."""
    return draw(case, model, lines_of(case, answers))


def drawn_confidence(
    link: Link, assessment: Assessment, settings: AssessSettings, *, heights: HeightSettings = _DEFAULTS
) -> float:
    """How sure a link is as planned, by the very draws of `design_heights`: its `ConfidenceResult.all_hold`, and no heights."""
    return confidence_of_case(Case.of(link, assessment, settings), heights=heights)


def confidence_of_case(case: Case, *, heights: HeightSettings = _DEFAULTS) -> float:
    """The same of a case: the draws of `design_heights`, counted quickly.

    Sums come out in another order there, so that one draw in some hundred thousand may count otherwise. Where so few
    would decide, the draws are made as planning makes them.
    """
    lines = lines_of(case, answers_of(case, ground_of(case, heights), heights))
    model = default_error_model(case.profile)
    a, b = case.planned
    need_m = case.rules_at(a, b).most_m
    parts = parts_of(case, model, lines)
    points = parts.points
    spare_m = (case.ray_m(a, b) - need_m)[points] - parts.shift_m
    share = share_that_holds(parts, case.profile.distance_m[points], spare_m, model)
    if abs(share - case.settings.confidence) * DRAWS > FEW:
        return share
    return draw(case, model, lines).holds(need_m, a, b)


def ground_of(case: Case, heights: HeightSettings) -> Ground:
    """What the masts stand on, and how high they may be."""
    a, b = heights.limits_a, heights.limits_b
    return Ground(
        base_a_m=case.base_a_m,
        base_b_m=case.base_b_m,
        a_from_m=case.base_a_m + (a.low_m or 0.0),
        a_to_m=case.base_a_m + (math.inf if a.high_m is None else a.high_m),
        b_from_m=case.base_b_m + (b.low_m or 0.0),
        b_to_m=case.base_b_m + (math.inf if b.high_m is None else b.high_m),
        planned=case.planned,
    )


def exact_answer(
    case: Case, kind: HeightKind, ground: Ground, heights: HeightSettings, *, boundaries: Sequence[Boundary]
) -> Levels | None:
    """The exact answer under the rules that apply at it; lowered further where lower heights bring milder rules.

    `boundaries` are those of `case.rules`.
    """
    levels: Levels | None = None
    for rules, boundary in zip(case.rules, boundaries, strict=True):
        levels = exact(kind, boundary, case.share, rules.most_m, ground, heights)
        if levels is None or case.rules_at(*levels) is rules:
            return levels
    return None if levels is None else _lowered(case, kind, levels, ground)


def _lowered(case: Case, kind: HeightKind, levels: Levels, ground: Ground) -> Levels:
    """The rules that apply are milder than those solved for: come down while the clearance rules still hold."""
    a, b = levels
    ways = {"a alone": ((1.0, 0.0),), "b alone": ((0.0, 1.0),), "equal": ((1.0, 1.0),), "alike": ((1.0, 1.0),)}
    for down_a, down_b in ways.get(kind, ((1.0, 1.0), (1.0, 0.0), (0.0, 1.0))):
        for _ in range(_MOST_LOWERINGS):
            lower = a - down_a * LOWER_BY_M, b - down_b * LOWER_BY_M
            if not (ground.within(lower) or kind in ("a alone", "b alone")) or not case.passes(*lower):
                break
            a, b = lower
    return a, b


def lines_of(case: Case, answers: Answers) -> list[tuple[Rules, float, float]]:
    """Lines near which samples are drawn: as planned, and every answer, under all rules."""
    levels = {case.planned, *(pair for pair in answers.values() if pair is not None)}
    return [(rules, *pair) for pair in sorted(levels) for rules in case.rules]
