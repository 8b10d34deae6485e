"""How sure a link is: probability of each criterion and of all, clearance as a band, and heights for 50, 90 and 99 %.

Reads draws and arranges what they say; the verdict's quick probability (errors fully correlated along the path) stands beside.
"""

import math
from dataclasses import dataclass
from statistics import NormalDist
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.design.case import Case, Rules
from fellspan.design.draws import SEED, Draws, errors_of, marginal_m
from fellspan.design.error_model import ErrorModel, reach_source

Floats = NDArray[np.float64]

STATED: Final = (0.5, 0.9, 0.99)
BAND: Final = (0.05, 0.5, 0.95)
BAND_POINTS: Final = 121


@dataclass(frozen=True, slots=True, kw_only=True)
class CriterionConfidence:
    """Probability that one criterion holds along the whole path, 0 to 1, with its standard error from the number of draws."""

    criterion: str
    probability: float
    standard_error: float


@dataclass(frozen=True, slots=True, kw_only=True)
class HeightsAt:
    """Change of the antenna heights, m, with which all criteria hold with a confidence: at A alone, at B alone, both alike.

    Negative where the antennas can come down by so much; None where no height at that end is enough.
    """

    confidence: float
    a_m: float | None
    b_m: float | None
    both_m: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class ClearanceBand:
    """Clearance (ray - surface - bulge) along the path at one k, m: what 5, 50 and 95 % of the draws stay below."""

    k: float | None
    distance_m: tuple[float, ...]
    low_m: tuple[float, ...]
    middle_m: tuple[float, ...]
    high_m: tuple[float, ...]
    sigma_m: tuple[float, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class ConfidenceResult:
    """How sure a link is as planned. `all_hold` is the probability that every criterion holds at once; `quick` is the
    verdict's own, from errors taken as fully correlated along the path."""

    all_hold: float
    standard_error: float
    quick: float
    criteria: tuple[CriterionConfidence, ...]
    heights: tuple[HeightsAt, ...]
    band: ClearanceBand
    draws: int
    seed: int
    model: ErrorModel
    assumptions: tuple[str, ...]


def confidence_of(case: Case, draws: Draws, model: ErrorModel) -> ConfidenceResult:
    """What the draws say about the heights as planned."""
    a, b = case.planned
    rules = case.rules_at(a, b)
    count = draws.error_m.shape[1]
    each = [draws.holds(rules.need_m[row], a, b) for row in range(len(rules.criteria))]
    together = draws.holds(rules.most_m, a, b)
    return ConfidenceResult(
        all_hold=together,
        standard_error=_standard_error(together, count),
        quick=case.quick_confidence(a, b),
        criteria=tuple(
            CriterionConfidence(
                criterion=criterion.name, probability=probability, standard_error=_standard_error(probability, count)
            )
            for criterion, probability in zip(rules.criteria, each, strict=True)
        ),
        heights=tuple(_heights_at(case, draws, level) for level in STATED),
        band=_band(case, rules, model),
        draws=count,
        seed=SEED,
        model=model,
        assumptions=_assumptions(case, model),
    )


def quantile(values: Floats, level: float) -> float:
    """The least of the values that at least `level` of them do not exceed."""
    rank = min(max(math.ceil(level * values.size - 1e-9), 1), values.size) - 1
    return float(np.partition(values, rank)[rank])


def _heights_at(case: Case, draws: Draws, level: float) -> HeightsAt:
    a, b = case.planned

    def at_a(rules: Rules) -> tuple[float, float]:
        return quantile(draws.lowest_a(rules.most_m, b), level), b

    def at_b(rules: Rules) -> tuple[float, float]:
        return a, quantile(draws.lowest_b(rules.most_m, a), level)

    def alike(rules: Rules) -> tuple[float, float]:
        rise = quantile(-draws.spare_m(rules.most_m, a, b), level)
        return a + rise, b + rise

    found = []
    for way, end in ((at_a, 0), (at_b, 1), (alike, 0)):
        change: float | None = None
        for rules in case.rules:
            levels = way(rules)
            if not all(map(math.isfinite, levels)):
                break
            change = levels[end] - (a, b)[end]
            if case.rules_at(*levels) is rules:
                break
        found.append(change)
    return HeightsAt(confidence=level, a_m=found[0], b_m=found[1], both_m=found[2])


def _band(case: Case, rules: Rules, model: ErrorModel) -> ClearanceBand:
    """Exact, since every error is normal and enters in proportion; samples nearest to the ray are kept."""
    a, b = case.planned
    spare = case.ray_m(a, b) - rules.need_m[: len(rules.criteria)]
    row = int(np.argmin(spare.min(axis=1)))
    k = rules.k[row]
    clear = case.ray_m(a, b) - case.stands.surface_m - case.curve_m / k
    sigma = marginal_m(case, errors_of(case), model)
    wide = NormalDist().inv_cdf(BAND[2])
    bins = np.minimum((case.share * BAND_POINTS).astype(np.intp), BAND_POINTS - 1)
    order = np.lexsort((spare[row], bins))
    first = order[np.r_[True, np.diff(bins[order]) != 0]]
    kept = np.unique(np.concatenate((first, [0, case.share.size - 1])))

    def listed(values: Floats) -> tuple[float, ...]:
        return tuple(np.round(values[kept], 3).tolist())

    return ClearanceBand(
        k=k if math.isfinite(k) else None,
        distance_m=listed(case.profile.distance_m),
        low_m=listed(clear - wide * sigma),
        middle_m=listed(clear),
        high_m=listed(clear + wide * sigma),
        sigma_m=listed(sigma),
    )


def _standard_error(probability: float, count: int) -> float:
    return math.sqrt(max(probability * (1.0 - probability), 0.0) / count)


def _assumptions(case: Case, model: ErrorModel) -> tuple[str, ...]:
    reach = (
        f"Errors of the ground hang together over {model.ground_reach_m:.0f} m "
        f"({reach_source(case.profile.cell_m)}), those of cover over {model.cover_reach_m:.0f} m "
        "(common practice, no source)."
    )
    return (
        reach,
        f"Positions are known to {model.position_error_m:.1f} m (standard error along each axis).",
        f"The gradient behind each k is known to {model.gradient_error:g} N/km (our own rule).",
    )
