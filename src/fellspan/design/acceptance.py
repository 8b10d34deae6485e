"""Which causes explain the levels of a link as built, and how far each can be trusted.

Each cause predicts what the levels would do, with a spread; its likelihood is that of what was read, with the doubt of the
reading and of the plan. Several causes may predict the same: then they are named together, and none of them as the answer.
"""

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Final

from fellspan.design.acceptance_aim import aim_causes
from fellspan.design.acceptance_directions import Judged
from fellspan.design.acceptance_gear import gear_causes
from fellspan.design.acceptance_hypotheses import Check, Hypothesis, Numbers, joined
from fellspan.design.acceptance_path import path_causes
from fellspan.design.acceptance_result import Cause, Fit
from fellspan.design.acceptance_swing import swing_factors

PLAN_DB: Final = 1.5
"""Standard error of a level that a plan gives, common to both directions: gains, lines, air (common practice, no source)."""
OF_LOSS: Final = 0.12
"""Share of the loss by terrain and trees that is added to it (our own figure)."""
WRONG_WAY: Final = 1e-3
"""Factor on a cause that lowers a level which is high, or the reverse."""
LEAST_READ_DB: Final = 1.0
MOST_CAUSES: Final = 5
FITS_SHARE: Final = 0.85
ALIKE_OF_TOP: Final = 0.2
LEAST_SHARE: Final = 0.04
TOO_FAR: Final = 7.0
"""Squared distance, in standard deviations, beyond which a cause does not fit: 3 % of readings of two directions."""
UNKNOWN: Final = "unknown"


@dataclass(frozen=True, slots=True, kw_only=True)
class _Scored:
    hypothesis: Hypothesis
    likelihood: float
    distance: float
    decided: bool
    """Whether something but the levels themselves speaks for it strongly."""


def all_hypotheses(numbers: Numbers) -> list[Hypothesis]:
    """Every cause that the numbers of the link allow for."""
    unknown = Hypothesis(
        key=UNKNOWN,
        title="something that is not listed here",
        a_db=-8.0,
        b_db=-8.0,
        spread_db=(20.0, 6.0, 6.0),
        weight=0.03,
        why="",
        settled_by="",
        checks=(),
        sharp=False,
    )
    return [*aim_causes(numbers), *gear_causes(numbers), *path_causes(numbers), unknown]


def rank_causes(
    numbers: Numbers, *, at_a: Judged, at_b: Judged, shift_a_db: float = 0.0, shift_b_db: float = 0.0
) -> tuple[tuple[Cause, ...], tuple[Check, ...]]:
    """Likely causes of the levels read, the likeliest first, and the checks of those named.

    `at_a` and `at_b` are the directions received there; `shift_a_db` and `shift_b_db` what is explained already.
    """
    off_a, off_b = at_a.difference_db, at_b.difference_db
    offs = (None if off_a is None else off_a - shift_a_db, None if off_b is None else off_b - shift_b_db)
    if offs == (None, None):
        return (), ()
    losses = numbers.result.losses_db
    plan_db = math.hypot(PLAN_DB, OF_LOSS * (losses.diffraction + (losses.vegetation or 0.0)))
    swings = swing_factors(numbers)
    scored = [
        _score(one, offs, plan_db=plan_db, judged=(at_a, at_b), error_db=numbers.built.error_db, swings=swings)
        for one in all_hypotheses(numbers)
    ]
    whole = sum(one.likelihood for one in scored)
    if whole <= 0.0:
        return (), ()
    groups: dict[str, list[_Scored]] = {}
    for one in sorted(scored, key=lambda one: -one.likelihood):
        groups.setdefault(one.hypothesis.key, []).append(one)
    shares = {key: sum(one.likelihood for one in members) / whole for key, members in groups.items()}
    known = sorted((key for key in groups if key != UNKNOWN), key=lambda key: -shares[key])
    top = known[0]
    fits_nothing = shares[UNKNOWN] > shares[top] or groups[top][0].distance > TOO_FAR
    named = [key for key in known if shares[key] >= LEAST_SHARE][:MOST_CAUSES]
    if not named or (fits_nothing and shares[top] < 0.5 * shares[UNKNOWN]):
        return (), ()
    causes = tuple(
        _cause(groups[key], shares[key], named=named, groups=groups, shares=shares, lost=fits_nothing) for key in named
    )
    return causes, tuple(check for key in named for check in groups[key][0].hypothesis.checks)


def in_ladder_order(checks: Iterable[Check]) -> tuple[str, ...]:
    """Checks once each: at the desk, from the ground, then up the mast; within a rung those of the likelier cause first."""
    listed = list(dict.fromkeys(checks))
    return tuple(dict.fromkeys(check.text for rung in (0, 1, 2) for check in listed if check.rung == rung))


def titled(near: Sequence[Hypothesis]) -> str:
    """The title of the likeliest, with the ends that it and what is as likely would stand at."""
    best = near[0]
    places = dict.fromkeys(joined(one.where) for one in near if one.title == best.title and one.where)
    return f"{best.title}, at {' or at '.join(places)}" if places else best.title


def _score(
    one: Hypothesis,
    offs: tuple[float | None, float | None],
    *,
    plan_db: float,
    judged: tuple[Judged, Judged],
    error_db: float,
    swings: dict[str, float],
) -> _Scored:
    common = math.hypot(plan_db, one.spread_db[0])
    reads = [
        LEAST_READ_DB if at.read is None else max(LEAST_READ_DB, error_db / math.sqrt(at.read.count)) for at in judged
    ]
    each = (math.hypot(reads[0], one.spread_db[1]), math.hypot(reads[1], one.spread_db[2]))
    left = tuple(None if off is None else off - change for off, change in zip(offs, (one.a_db, one.b_db), strict=True))
    density, distance = _normal(left, common=common, each=each)
    chains = _chain_factor(one, judged)
    likelihood = one.weight * density * chains * swings.get(one.varies, 1.0)
    if _wrong_way(one, offs, judged):
        likelihood *= WRONG_WAY
    return _Scored(
        hypothesis=one,
        likelihood=likelihood,
        distance=distance,
        decided=(bool(one.chain_at) and chains > 30.0)
        or (one.varies != "steady" and swings.get(one.varies, 1.0) > 30.0),
    )


def _wrong_way(one: Hypothesis, offs: tuple[float | None, float | None], judged: tuple[Judged, Judged]) -> bool:
    """Whether a level outside its band stands on the other side of the plan than this cause would bring it to."""
    return any(
        off is not None and abs(off) > at.check.band_db and off * change < 0.0
        for off, change, at in zip(offs, (one.a_db, one.b_db), judged, strict=True)
    )


def _normal(left: Sequence[float | None], *, common: float, each: tuple[float, float]) -> tuple[float, float]:
    """Density of what is left at both ends, or at the one known, with a part common to both; and its squared distance."""
    known = [(value, spread) for value, spread in zip(left, each, strict=True) if value is not None]
    if len(known) == 1:
        value, spread = known[0]
        variance = common**2 + spread**2
        distance = value**2 / variance
        return math.exp(-0.5 * distance) / math.sqrt(2.0 * math.pi * variance), distance
    (a, spread_a), (b, spread_b) = known
    var_a, var_b, both = common**2 + spread_a**2, common**2 + spread_b**2, common**2
    determinant = var_a * var_b - both**2
    distance = (var_b * a * a - 2.0 * both * a * b + var_a * b * b) / determinant
    return math.exp(-0.5 * distance) / (2.0 * math.pi * math.sqrt(determinant)), distance


def _chain_factor(one: Hypothesis, judged: tuple[Judged, Judged]) -> float:
    """How much better what was read of single chains goes with this cause than with none, times itself at each end."""
    factor = 1.0
    for end, at in zip(("a", "b"), judged, strict=True):
        if at.read is None or len(at.read.chains) < 2:
            continue
        gap = at.read.imbalance_db
        alike = max(_bell(gap, 0.0, 2.1), 1e-7)
        low = max(_bell(gap, 14.0, 8.0), 0.004 if gap > 4.0 else 1e-4)
        # Twins: alike is the usual case, so it counts one and a chain that is low counts what it is better by.
        factor *= low / alike if end in one.chain_at else 1.0
    return min(factor, 1e6)


def _bell(value: float, middle: float, spread: float) -> float:
    return math.exp(-0.5 * ((value - middle) / spread) ** 2) / (spread * math.sqrt(2.0 * math.pi))


def _cause(
    members: list[_Scored],
    share: float,
    *,
    named: list[str],
    groups: dict[str, list[_Scored]],
    shares: dict[str, float],
    lost: bool,
) -> Cause:
    best = members[0].hypothesis
    key, top = best.key, named[0]
    alike = [
        other
        for other in named
        if other != key and ALIKE_OF_TOP <= shares[other] / max(share, 1e-12) <= 1.0 / ALIKE_OF_TOP
    ]
    fit: Fit = "possible"
    if alike:
        fit = "cannot be told apart"
    elif key == top and not lost and share >= FITS_SHARE and (best.sharp or members[0].decided):
        fit = "fits well"
    near = [one.hypothesis for one in members if one.likelihood > 0.3 * members[0].likelihood]
    why = best.why
    also = next((one.title for one in near[1:] if one.title != best.title), None)
    if also is not None:
        why += f"; as likely: {also}"
    settled = [best.settled_by, *(groups[other][0].hypothesis.settled_by for other in alike[:1])]
    return Cause(
        key=key,
        title=titled(near),
        fit=fit,
        share=share,
        change_a_db=best.a_db,
        change_b_db=best.b_db,
        why=why,
        alike=tuple(titled([groups[other][0].hypothesis]) for other in alike),
        tells_apart="; or ".join(dict.fromkeys(text for text in settled if text)),
        checks=tuple(check.text for check in best.checks),
    )
