"""The named answers on a boundary: lowest at one end, equal, least total, least cost. Geometry and counting of mast steps only.

Heights here are levels above sea level; `Ground` says what the masts stand on and how far they may reach.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.design.boundary import Boundary
from fellspan.design.heights_result import HeightKind, HeightSettings

Floats = NDArray[np.float64]
Levels = tuple[float, float]
_TIE: Final = 1e-7
MOST_STEPS: Final = 4_000
HAIR_M: Final = 1e-6


@dataclass(frozen=True, slots=True, kw_only=True)
class Ground:
    """What the masts stand on, m above sea level, the levels that the antennas may have, and those planned."""

    base_a_m: float
    base_b_m: float
    a_from_m: float
    a_to_m: float
    b_from_m: float
    b_to_m: float
    planned: Levels

    def within(self, levels: Levels) -> bool:
        """Whether both levels are within their limits."""
        a, b = levels
        return (
            self.a_from_m - HAIR_M <= a <= self.a_to_m + HAIR_M and self.b_from_m - HAIR_M <= b <= self.b_to_m + HAIR_M
        )


def exact(
    kind: HeightKind, boundary: Boundary, share: Floats, need_m: Floats, ground: Ground, settings: HeightSettings
) -> Levels | None:
    """The answer before any rounding; None where nothing within the limits works."""
    planned_a, planned_b = ground.planned
    if kind == "a alone":
        return _fits((max(boundary.lowest_a(planned_b), ground.a_from_m), planned_b), ground)
    if kind == "b alone":
        return _fits((planned_a, max(boundary.lowest_b(planned_a), ground.b_from_m)), ground)
    if kind in ("equal", "alike"):
        foot_a, foot_b = (ground.base_a_m, ground.base_b_m) if kind == "equal" else ground.planned
        rise = boundary.lift(foot_a, foot_b, share=share, need_m=need_m)
        rise = max(rise, ground.a_from_m - foot_a, ground.b_from_m - foot_b)
        return _fits((foot_a + rise, foot_b + rise), ground)
    limits = (ground.a_from_m, ground.a_to_m, ground.b_from_m, ground.b_to_m)
    pairs = boundary.candidates(*limits)
    if kind == "least cost":
        # A begun section is paid whole: cost falls at its ends too.
        pairs = np.concatenate((pairs, boundary.pairs_at(_section_ends(ground, settings, boundary), *limits)))
    return _best(kind, pairs, ground, settings)


def rounded(
    kind: HeightKind, levels: Levels, boundary: Boundary, ground: Ground, settings: HeightSettings
) -> Levels | None:
    """The answer at whole mast steps, none below `levels` where one end alone or both alike were asked for."""
    a, b = levels
    planned_a, planned_b = ground.planned
    if kind == "a alone":
        return _fits((_up(a, ground.base_a_m, settings.step_m), planned_b), ground)
    if kind == "b alone":
        return _fits((planned_a, _up(b, ground.base_b_m, settings.step_m)), ground)
    if kind == "equal":
        height = max(a - ground.base_a_m, b - ground.base_b_m)
        height = _up(height, 0.0, settings.step_m)
        return _fits((ground.base_a_m + height, ground.base_b_m + height), ground)
    if kind == "alike":
        rise = _up(max(a - planned_a, b - planned_b), 0.0, settings.step_m)
        return _fits((planned_a + rise, planned_b + rise), ground)
    return _best(kind, _steps(boundary, ground, settings), ground, settings)


def cost_of(levels: Levels, ground: Ground, settings: HeightSettings) -> float:
    """What the two masts cost, in the user's currency."""
    heights = np.array([[levels[0] - ground.base_a_m, levels[1] - ground.base_b_m]])
    return float(_costs(heights, settings)[0])


def _costs(heights: Floats, settings: HeightSettings) -> Floats:
    """Of pairs of mast heights, shape (m, 2)."""
    rates = settings.cost_a_per_m or 0.0, settings.cost_b_per_m or 0.0
    sections = np.ceil(np.maximum(heights, 0.0) / settings.section_m - HAIR_M).sum(axis=1)
    return np.asarray(heights @ np.array(rates) + sections * settings.cost_per_section)


def whole_steps(levels: Levels, ground: Ground, settings: HeightSettings) -> bool:
    """Whether both masts are within their limits and a whole number of steps high; a planned height need not be."""
    steps = (levels[0] - ground.base_a_m) / settings.step_m, (levels[1] - ground.base_b_m) / settings.step_m
    return ground.within(levels) and all(abs(count - round(count)) < 1e-6 for count in steps)


def cheapest(kind: HeightKind, pairs: list[Levels], ground: Ground, settings: HeightSettings) -> Levels | None:
    """The pair that is the least of its kind; None where there is none."""
    return _best(kind, np.array(pairs, dtype=np.float64), ground, settings)


def _up(level: float, base: float, step: float) -> float:
    return base + math.ceil((level - base) / step - HAIR_M) * step


def _fits(levels: Levels, ground: Ground) -> Levels | None:
    return levels if all(math.isfinite(level) for level in levels) and ground.within(levels) else None


def _steps(boundary: Boundary, ground: Ground, settings: HeightSettings) -> Floats:
    """For every step of A the lowest step of B that works: all pairs that can be the least of anything, shape (m, 2)."""
    step = settings.step_m
    start = max(ground.a_from_m, float(boundary.a_m[0]))
    stop = min(ground.a_to_m, max(float(boundary.a_m[-1]), start) + step)
    first = math.ceil((start - ground.base_a_m) / step - HAIR_M)
    last = math.floor((stop - ground.base_a_m) / step + HAIR_M)
    stride = max(1, -(-(last - first + 1) // MOST_STEPS))
    a = ground.base_a_m + np.arange(first, last + 1, stride) * step
    # A first step that is on the boundary but for rounding counts as on it.
    b = np.interp(np.maximum(a, boundary.a_m[0]), boundary.a_m, boundary.b_m)
    height = np.maximum(b, ground.b_from_m) - ground.base_b_m
    b = ground.base_b_m + np.ceil(height / step - HAIR_M) * step
    fits = b <= ground.b_to_m + HAIR_M
    return np.column_stack((a[fits], b[fits]))


def _section_ends(ground: Ground, settings: HeightSettings, boundary: Boundary) -> Floats:
    """Levels of A at which a section of either mast is just full."""
    low_a, high_a = max(ground.a_from_m, float(boundary.a_m[0])), min(ground.a_to_m, float(boundary.a_m[-1]))
    low_b, high_b = max(ground.b_from_m, float(boundary.b_m[-1])), min(ground.b_to_m, float(boundary.b_m[0]))
    at_a = _multiples(low_a, high_a, ground.base_a_m, settings.section_m)
    at_b = _multiples(low_b, high_b, ground.base_b_m, settings.section_m)
    return np.concatenate((at_a, boundary.lowest_a_each(at_b)))


def _multiples(low: float, high: float, base: float, part: float) -> Floats:
    first, last = math.ceil((low - base) / part), math.floor((high - base) / part)
    return np.asarray(base + part * np.arange(first, min(last, first + MOST_STEPS) + 1, dtype=np.float64))


def _best(kind: HeightKind, pairs: Floats, ground: Ground, settings: HeightSettings) -> Levels | None:
    """The cheapest pair; of equally cheap ones the lower total, then the most even one."""
    if not pairs.size:
        return None
    heights = pairs - (ground.base_a_m, ground.base_b_m)
    total = heights.sum(axis=1)
    price = _costs(heights, settings) if kind == "least cost" else total
    cheap = price <= price.min() + _TIE
    cheap &= total <= total[cheap].min() + _TIE
    uneven = np.where(cheap, np.abs(heights[:, 0] - heights[:, 1]), np.inf)
    a, b = pairs[int(np.argmin(uneven))].tolist()
    return a, b
