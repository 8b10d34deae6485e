"""How high must the antennas be? Exact on the heights in the data, then with the confidence asked and in whole mast steps.

Puts boundary, options, draws and the clearance engine together; holds no formula of need and draws no chart.
"""

import math
from dataclasses import dataclass, replace
from statistics import NormalDist
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.design import heights_words as words
from fellspan.design.answers import LOWER_BY_M, answers_of, draws_near, ground_of
from fellspan.design.boundary import Boundary
from fellspan.design.case import Case, Rules
from fellspan.design.confidence import ConfidenceResult, confidence_of, quantile
from fellspan.design.draws import Draws, errors_of, marginal_m
from fellspan.design.error_model import ErrorModel, default_error_model
from fellspan.design.heights_result import (
    HeightKind,
    HeightOption,
    HeightSettings,
    HeightsResult,
    MetreMore,
    Pair,
    Touch,
)
from fellspan.design.options import HAIR_M, Ground, Levels, cheapest, cost_of, exact, rounded, whole_steps
from fellspan.links import clearance
from fellspan.links.assess import Assessment, AssessSettings, path_verdict_of
from fellspan.links.site import Link

Floats = NDArray[np.float64]

_MOST_RAISINGS: Final = 40
_BEYOND_M: Final = 1_000.0
CURVE_POINTS: Final = 15
CURVE_DRAWS: Final = 2_000
_DEFAULTS: Final = HeightSettings()


def design_heights(
    link: Link,
    assessment: Assessment,
    settings: AssessSettings,
    *,
    heights: HeightSettings = _DEFAULTS,
    model: ErrorModel | None = None,
    growth_years: float = 0.0,
) -> tuple[HeightsResult, ConfidenceResult]:
    """Heights and confidence of an assessed link.

    Parameters
    ----------
    link, assessment, settings
        As given to and returned by `links.assess_in_full`.
    heights
        Mast step, limits and costs.
    model
        How the errors hang together; None for the defaults of the finest raster.
    growth_years
        How far ahead the trees of the profile were grown already; it is said, not applied.
    """
    case = Case.of(link, assessment, settings)
    ground = ground_of(case, heights)
    raw = answers_of(case, ground, heights)
    kinds = tuple(raw)
    model = model or default_error_model(case.profile)
    draws = draws_near(case, raw, model)
    search = _Search(
        case=case,
        draws=draws,
        ground=ground,
        heights=heights,
        sigma_m=marginal_m(case, errors_of(case), model),
        assessment=assessment,
    )
    builds = {kind: None if raw[kind] is None else search.build(kind) for kind in kinds}
    fit = [pair for pair in builds.values() if pair is not None and whole_steps(pair, ground, heights)]
    for kind in kinds:
        # What answers another question can be the least of all: steps are whole.
        if kind in ("least total", "least cost") and fit:
            builds[kind] = cheapest(kind, fit, ground, heights)
    options = tuple(_option(search, kind, raw[kind], builds[kind]) for kind in kinds)
    confidence = confidence_of(case, draws, model)
    rules = _rules_shown(case, raw)
    planned = _pair(case.planned, ground)
    holds = search.holds(case.planned)
    return (
        HeightsResult(
            decision=words.decision(
                planned, options, holds=holds, confidence=settings.confidence, likely=confidence.all_hold
            ),
            planned=planned,
            planned_holds=holds,
            base_a=words.base(case.end_a),
            base_b=words.base(case.end_b),
            confidence=settings.confidence,
            step_m=heights.step_m,
            growth_years=growth_years,
            options=options,
            boundary=_corners(case, rules, ground),
            boundary_confident=search.curve(rules, raw),
            checked=words.checked(options, settings.confidence),
            cautions=words.cautions(planned, options, growth_years=growth_years),
        ),
        confidence,
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Search:
    """Heights with a confidence: exact in the draws where one number is sought, verified where two are."""

    case: Case
    draws: Draws
    ground: Ground
    heights: HeightSettings
    sigma_m: Floats
    assessment: Assessment

    @property
    def asked(self) -> float:
        return self.case.settings.confidence

    def likely(self, levels: Levels) -> float:
        """Probability that all rules hold, by the draws."""
        return self.draws.holds(self.case.rules_at(*levels).most_m, *levels)

    def holds(self, levels: Levels) -> bool:
        """Whether the draws and the verdict's own probability both give the confidence asked, and the data's heights pass."""
        case = self.case
        if not case.passes(*levels) or case.quick_confidence(*levels) < self.asked:
            return False
        return self.likely(levels) >= self.asked

    def build(self, kind: HeightKind) -> Levels | None:
        """The answer to build to, in whole mast steps."""
        for rules in self.case.rules:
            levels = self._rounded(kind, rules)
            if levels is None:
                return None
            if self.case.rules_at(*levels) is rules or rules is self.case.rules[-1]:
                found = self._raised(kind, levels)
                return self._settled(found) if found and kind in ("least total", "least cost") else found
        return None

    def _settled(self, levels: Levels) -> Levels:
        """Lowered by mast steps at either end while it still holds: the lift that found two heights at once is an estimate."""
        step, (a, b) = self.heights.step_m, levels
        for _ in range(_MOST_RAISINGS):
            for lower in ((a - step, b), (a, b - step)):
                if self.ground.within(lower) and self.holds(lower) and self.verdict_is_clear(lower):
                    a, b = lower
                    break
            else:
                break
        return a, b

    def _rounded(self, kind: HeightKind, rules: Rules) -> Levels | None:
        """Least heights for the confidence under one set of rules, by draws and by the verdict's errors, rounded up."""
        case, need, level = self.case, rules.most_m, self.asked
        sigmas = NormalDist().inv_cdf(level)
        # Only criteria ask for a confidence: the own roof is cleared or it is not, for roof and antenna move together.
        criteria = rules.need_m[: len(rules.criteria)].max(axis=0)
        engine_need = np.maximum(need, criteria + sigmas * case.errors_m)
        boundary = Boundary.over(case.share, engine_need)
        if kind in ("least total", "least cost"):
            return self._rounded_pair(kind, rules, engine_need, sigmas)
        levels = exact(
            kind,
            boundary,
            case.share,
            engine_need,
            replace(self.ground, a_to_m=math.inf, b_to_m=math.inf),
            self.heights,
        )
        if levels is None:
            return None
        a, b = levels
        if kind == "a alone":
            levels = (max(a, quantile(self.draws.lowest_a(need, b), level)), b)
        elif kind == "b alone":
            levels = (a, max(b, quantile(self.draws.lowest_b(need, a), level)))
        else:
            rise = max(quantile(-self.draws.spare_m(need, a, b), level), 0.0)
            levels = (a + rise, b + rise)
        if not all(map(math.isfinite, levels)):
            return None
        return rounded(kind, levels, boundary, self.ground, self.heights)

    def _rounded_pair(self, kind: HeightKind, rules: Rules, engine_need: Floats, sigmas: float) -> Levels | None:
        """Two heights at once: a need lifted by so many standard errors that the draws hold with the confidence."""
        case, found = self.case, None
        lift = max(sigmas, 0.0)
        for _ in range(4):
            criteria = rules.need_m[: len(rules.criteria)].max(axis=0)
            need = np.maximum(engine_need, criteria + lift * self.sigma_m)
            boundary = Boundary.over(case.share, need)
            levels = exact(kind, boundary, case.share, need, self.ground, self.heights)
            if levels is None:
                return None
            found = rounded(kind, levels, boundary, self.ground, self.heights)
            likely = min(max(self.draws.holds(rules.most_m, *levels), 1e-4), 1.0 - 1e-4)
            off = sigmas - NormalDist().inv_cdf(likely)
            if abs(off) < 0.02 or lift + off < 0.0:
                break
            lift += off
        return found

    def _raised(self, kind: HeightKind, levels: Levels) -> Levels | None:
        """Raised by mast steps until the clearance engine calls it clear and the draws agree; None beyond the limits."""
        step, (a, b) = self.heights.step_m, levels
        for turn in range(_MOST_RAISINGS):
            if self.holds((a, b)) and self.verdict_is_clear((a, b)):
                return (a, b)
            one_end = kind in ("a alone", "b alone")
            if kind == "a alone" or (not one_end and (kind in ("equal", "alike") or turn % 2 == 0)):
                a += step
            if kind == "b alone" or (not one_end and (kind in ("equal", "alike") or turn % 2 == 1)):
                b += step
            if not self.ground.within((a, b)):
                return None
        return None

    def verdict_is_clear(self, levels: Levels) -> bool:
        """What `links` itself says of the path at these levels."""
        return path_verdict_of(self.case.link_at(*levels), self.assessment.profile, self.case.settings) == "clear"

    def curve(self, rules: Rules, raw: dict[HeightKind, Levels | None]) -> tuple[tuple[float, float], ...]:
        """Lowest pairs that hold with the confidence, for the chart: mast heights, from some of the draws."""
        case, ground = self.case, self.ground
        boundary = Boundary.over(
            case.share, np.maximum(rules.most_m, rules.most_m + NormalDist().inv_cdf(self.asked) * case.errors_m)
        )
        fewer = replace(self.draws, error_m=self.draws.error_m[:, : min(CURVE_DRAWS, self.draws.error_m.shape[1])])
        a_from, a_to = _span(case, ground, raw)
        # Lower than this no mast at B helps: A's own spot stands too high.
        high_b = ground.base_b_m + _BEYOND_M
        least = quantile(fewer.lowest_a(rules.most_m, high_b), self.asked)
        a_from = min(max(a_from, boundary.lowest_a(high_b), least), a_to)
        found = []
        for a in np.linspace(a_from, a_to, CURVE_POINTS).tolist():
            b = max(boundary.lowest_b(a), quantile(fewer.lowest_b(rules.most_m, a), self.asked), ground.base_b_m)
            if math.isfinite(b):
                found.append((round(a - ground.base_a_m, 3), round(b - ground.base_b_m, 3)))
        return tuple(found)


def _option(search: _Search, kind: HeightKind, raw: Levels | None, build: Levels | None) -> HeightOption:
    case, ground = search.case, search.ground
    governs = None if raw is None else _touch(case, raw)
    return HeightOption(
        kind=kind,
        raw=None if raw is None else _pair(raw, ground),
        build=None if build is None else _tidy(_pair(build, ground)),
        governs=governs,
        more=() if raw is None else tuple(_metre_more(case, raw, end) for end in "AB"),
        probability=None if build is None else search.likely(build),
        cost=None if build is None or not search.heights.counts_cost else cost_of(build, ground, search.heights),
        note=_note(search, kind, raw, build),
    )


def _note(search: _Search, kind: HeightKind, raw: Levels | None, build: Levels | None) -> str:
    case, ground = search.case, search.ground
    if raw is None:
        return "no height within the limits is enough, on the heights in the data"
    if build is None:
        return f"no height within the limits gives {100.0 * search.asked:g} % confidence"
    spare = float((case.ray_m(*raw) - case.rules_at(*raw).most_m).min())
    said = []
    if spare > LOWER_BY_M:
        said.append(f"the lowest mast allowed leaves {spare:.1f} m to spare")
    if len(case.rules) > 1 and case.rules_at(*raw) is not case.rules_at(*ground.planned):
        said.append("other heights, another rule: " + case.rules_at(*raw).criteria[-1].name)
    return "; ".join(said)


def _touch(case: Case, levels: Levels) -> Touch:
    rules = case.rules_at(*levels)
    spare = case.ray_m(*levels) - rules.most_m
    index = clearance.worst_index(spare, case.profile.distance_m)
    row = int(np.argmax(rules.need_m[:, index]))
    k = rules.k[row]
    return Touch(
        cause=case.cause(rules, row, index, *levels),
        at_m=float(case.profile.distance_m[index]),
        criterion=rules.names[row],
        k=k if math.isfinite(k) else None,
        fresnel_radius_m=float(case.zone_m[index]),
        sigma_m=float(case.errors_m[index]),
        sampling_m=case.between_samples_m(*levels),
    )


def _metre_more(case: Case, levels: Levels, end: str) -> MetreMore:
    higher = (levels[0] + 1.0, levels[1]) if end == "A" else (levels[0], levels[1] + 1.0)
    touch = _touch(case, higher)
    rules = case.rules_at(*levels)
    spare = float((case.ray_m(*higher) - rules.most_m).min())
    zone = touch.fresnel_radius_m
    return MetreMore(
        end=end,
        spare_m=max(spare, 0.0),
        fraction=max(spare, 0.0) / zone if zone > HAIR_M else None,
        next_cause=touch.cause,
        next_at_m=touch.at_m,
    )


def _pair(levels: Levels, ground: Ground) -> Pair:
    a, b = levels
    return Pair(a_m=a - ground.base_a_m, b_m=b - ground.base_b_m, a_amsl_m=a, b_amsl_m=b)


def _tidy(pair: Pair) -> Pair:
    """Steps of a mast without the dust of arithmetic."""
    return replace(pair, a_m=round(pair.a_m, 6), b_m=round(pair.b_m, 6))


def _rules_shown(case: Case, raw: dict[HeightKind, Levels | None]) -> Rules:
    level = raw["alike"] or raw["equal"] or case.planned
    return case.rules_at(*level)


def _span(case: Case, ground: Ground, raw: dict[HeightKind, Levels | None]) -> Levels:
    """Range of levels of A that a chart shows."""
    levels = [case.planned, *(pair for pair in raw.values() if pair is not None)]
    low = max(min(pair[0] for pair in levels) - 2.0, ground.base_a_m)
    high = max(pair[0] for pair in levels)
    return low, high + max(0.25 * (high - ground.base_a_m), 5.0)


def _corners(case: Case, rules: Rules, ground: Ground) -> tuple[tuple[float, float], ...]:
    boundary = Boundary.over(case.share, rules.most_m)
    return tuple(
        (round(a - ground.base_a_m, 4), round(b - ground.base_b_m, 4))
        for a, b in zip(boundary.a_m.tolist(), boundary.b_m.tolist(), strict=True)
    )
