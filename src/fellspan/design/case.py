"""One link made ready for design: what the ray needs at every sample under each set of rules that its heights can lead to.

The arithmetic of `need` is that of links; here it is only arranged, so that heights can change. Holds no search and no draws.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.links import clearance
from fellspan.links.assess import Assessment, AssessSettings, stood
from fellspan.links.causes import cause_at
from fellspan.links.criteria import Criterion, criteria_for, is_extended, worst_month_k
from fellspan.links.ends import EndLevel, end_level
from fellspan.links.own_building import Standing, standing, with_nodes
from fellspan.links.result import EndResult
from fellspan.links.site import Link
from fellspan.links.uncertainty import clearance_errors_m
from fellspan.terrain.profile import PathProfile

Floats = NDArray[np.float64]

OWN_ROOF: Final = "sight line over what was left out at its own spot"
BESIDE: Final = "zone beside the path"


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Rules:
    """One set of criteria over the samples of a case: `need_m` has a row for each of `names`, shape (c, n).

    The last rows may stand for what holds a verdict at 'marginal' although every criterion is met: the sight line over the own
    building, and obstacles beside the path. They are -inf where they ask for nothing.
    """

    criteria: tuple[Criterion, ...]
    names: tuple[str, ...]
    k: tuple[float, ...]
    need_m: Floats
    most_m: Floats
    """Greatest need over the rows, shape (n,)."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Case:
    """A link, its terrain and the rules that can apply; arrays have shape (n,), levels m above sea level."""

    link: Link
    settings: AssessSettings
    profile: PathProfile
    stands: Standing
    end_a: EndResult | EndLevel
    end_b: EndResult | EndLevel
    a_error_m: float
    b_error_m: float
    share: Floats
    zone_m: Floats
    errors_m: Floats
    """Standard error of the clearance, as the verdict takes it."""
    rules: tuple[Rules, ...]
    """Mildest first. Two where the obstruction may be isolated or extended, which depends on the heights."""

    @classmethod
    def of(cls, link: Link, assessment: Assessment, settings: AssessSettings) -> "Case":
        """From an assessed link; `settings` are those it was assessed with."""
        profile = assessment.profile
        beside = [item.at_m for item in profile.beside if 0.0 < item.at_m < profile.length_m]
        profile = with_nodes(profile, tuple(beside)) if beside else profile
        a, b = end_level(link.a, profile, end="A"), end_level(link.b, profile, end="B")
        ends = assessment.result.ends
        return cls._made(link, profile, settings, stands=standing(profile), ends=(ends.a, ends.b), levels=(a, b))

    @classmethod
    def over(cls, link: Link, profile: PathProfile, settings: AssessSettings) -> "Case":
        """From a profile that passes nothing beside it, and no assessment: what the heights in the data say is not asked."""
        profile, stands, a, b = stood(link, profile)
        return cls._made(link, profile, settings, stands=stands, ends=(a, b), levels=(a, b))

    @classmethod
    def _made(
        cls,
        link: Link,
        profile: PathProfile,
        settings: AssessSettings,
        *,
        stands: Standing,
        ends: tuple[EndResult | EndLevel, EndResult | EndLevel],
        levels: tuple[EndLevel, EndLevel],
    ) -> "Case":
        (a, b), distance = levels, profile.distance_m
        case = cls(
            link=link,
            settings=settings,
            profile=profile,
            stands=stands,
            end_a=ends[0],
            end_b=ends[1],
            a_error_m=a.error_m,
            b_error_m=b.error_m,
            share=distance / distance[-1],
            zone_m=clearance.zone_radius_m(distance, frequency_hz=link.radio.frequency_hz),
            errors_m=clearance_errors_m(profile, stands, a_error_m=a.error_m, b_error_m=b.error_m),
            rules=(),
        )
        return replace(case, rules=tuple(case._rules_of(criteria) for criteria in case._criteria_sets()))

    @property
    def base_a_m(self) -> float:
        """What the mast at A stands on: ground or roof, m above sea level."""
        return self.end_a.ground_m + (self.end_a.roof_m or 0.0)

    @property
    def base_b_m(self) -> float:
        """What the mast at B stands on."""
        return self.end_b.ground_m + (self.end_b.roof_m or 0.0)

    @property
    def planned(self) -> tuple[float, float]:
        """Levels of the antennas as planned."""
        return self.end_a.antenna_amsl_m, self.end_b.antenna_amsl_m

    @cached_property
    def curve_m(self) -> Floats:
        """Bulge for 1/k = 1: what one unit of 1/k adds, shape (n,)."""
        return clearance.bulge_m(self.profile.distance_m, k=1.0)

    def ray_m(self, a_m: float, b_m: float) -> Floats:
        """The straight ray between two antenna levels, shape (n,)."""
        return np.asarray((1.0 - self.share) * a_m + self.share * b_m)

    def rules_at(self, a_m: float, b_m: float) -> Rules:
        """The rules that links applies at these levels: the isolated or the extended obstruction."""
        if len(self.rules) == 1:
            return self.rules[0]
        k = worst_month_k(self.profile.length_m)
        clear = self.ray_m(a_m, b_m) - self.stands.surface_m - self.curve_m / k
        return self.rules[is_extended(self.profile.distance_m, clearance.normalised_clearance(clear, self.zone_m))]

    def passes(self, a_m: float, b_m: float) -> bool:
        """Whether every rule that applies at these levels is met, on the heights in the data."""
        rules = self.rules_at(a_m, b_m)
        return bool((rules.most_m - self.ray_m(a_m, b_m)).max() <= clearance.TOLERANCE_M)

    def between_samples_m(self, a_m: float, b_m: float) -> float:
        """How far the ground between two samples may stand into what the rules ask for, m: the most along the path, 0 at least.

        Where the ground runs up to two samples from both sides it is prolonged to where the two lines meet; what hides between
        samples without a sign on either side is not in it.
        """
        x, ground = self.profile.distance_m, self.profile.ground_m
        slope = np.diff(ground) / np.diff(x)
        before, chord, after = slope[:-2], slope[1:-1], slope[2:]
        peak = (before > chord) & (chord > after)
        if not peak.any():
            return 0.0
        share = (chord - after)[peak] / (before - after)[peak]
        rise = (before - chord)[peak] * share * np.diff(x)[1:-1][peak]
        over = self.rules_at(a_m, b_m).most_m - self.ray_m(a_m, b_m)
        low, high = over[1:-2][peak], over[2:-1][peak]
        return max(float((low + share * (high - low) + rise).max()), 0.0)

    def quick_confidence(self, a_m: float, b_m: float) -> float:
        """Least probability over the criteria as the verdict has it: errors fully correlated along the path."""
        rules = self.rules_at(a_m, b_m)
        rows = rules.need_m[: len(rules.criteria)]
        return float(clearance.probability_met(self.ray_m(a_m, b_m) - rows, self.errors_m).min())

    def link_at(self, a_m: float, b_m: float) -> Link:
        """The link with its antennas at other levels, measured from what they were measured from."""
        a, b = self.link.a, self.link.b
        planned_a, planned_b = self.planned
        return replace(
            self.link,
            a=replace(a, height_m=_no_less(a.height_m + a_m - planned_a, a.height_reference)),
            b=replace(b, height_m=_no_less(b.height_m + b_m - planned_b, b.height_reference)),
        )

    def cause(self, rules: Rules, row: int, index: int, a_m: float, b_m: float) -> str:
        """What stands at a sample that governs in row `row`, by name."""
        if row >= len(rules.criteria):
            if rules.names[row] == OWN_ROOF:
                at_a = self.share[index] < 0.5
                whats = [item.what for item in self.stands.ignored if (item.end == "A") == at_a]
                return f"{whats[0]} at {'A' if at_a else 'B'}" if whats else "own building"
            near = min(self.profile.beside, key=lambda item: abs(item.at_m - self.profile.distance_m[index]))
            return f"{near.name}, {near.offset_m:.0f} m beside the path"
        return cause_at(
            self.profile,
            self.stands,
            index,
            # A point that just touches is named as if it were in the way: that is what one asks for.
            available_m=float(self.ray_m(a_m, b_m)[index]) - 0.01,
            bulge_m=float(self.curve_m[index] / rules.k[row]),
            need_m=float(rules.need_m[row, index]),
        )

    def _criteria_sets(self) -> Sequence[tuple[Criterion, ...]]:
        settings, length_m = self.settings, self.profile.length_m
        if settings.criteria:
            return (settings.criteria,)
        kinds = (False, True) if settings.preset == "p530-temperate" else (True,)
        return [
            criteria_for(settings.preset, distance_m=length_m, median_k=settings.median_k, extended=extended)
            for extended in kinds
        ]

    def _rules_of(self, criteria: tuple[Criterion, ...]) -> Rules:
        distance = self.profile.distance_m
        rows = list(
            clearance.need_m(
                self.stands.surface_m,
                distance,
                k=[criterion.k for criterion in criteria],
                fraction=[criterion.fraction for criterion in criteria],
                frequency_hz=self.link.radio.frequency_hz,
            )
        )
        names, ks = [criterion.name for criterion in criteria], [criterion.k for criterion in criteria]
        if np.isfinite(self.stands.left_out_m).any():
            rows.append(self.stands.left_out_m + self.curve_m / self.settings.median_k)
            names.append(OWN_ROOF)
            ks.append(self.settings.median_k)
        for criterion in criteria:
            beside = self._beside_m(criterion)
            if np.isfinite(beside).any():
                rows.append(beside)
                names.append(BESIDE)
                ks.append(criterion.k)
        need = np.asarray(rows)
        return Rules(criteria=criteria, names=tuple(names), k=tuple(ks), need_m=need, most_m=need.max(axis=0))

    def _beside_m(self, criterion: Criterion) -> Floats:
        """Level that the ray needs for what it passes: the required zone is round, so at an offset it begins higher."""
        distance = self.profile.distance_m
        need = np.full(distance.shape, -np.inf)
        for item in self.profile.beside:
            if not (0.0 < item.at_m < self.profile.length_m and math.isfinite(item.top_amsl_m)):
                continue
            index = int(np.argmin(np.abs(distance - item.at_m)))
            half = (criterion.fraction * float(self.zone_m[index])) ** 2 - item.offset_m**2
            if half > 0.0:
                level = item.top_amsl_m + float(self.curve_m[index]) / criterion.k + math.sqrt(half)
                need[index] = max(float(need[index]), level)
        return need


def _no_less(height_m: float, reference: str) -> float:
    """Rounding may leave a mast that stands on the ground a hair below it."""
    return height_m if reference == "sea" else max(height_m, 0.0)
