"""Antenna heights against reflections: level over height, and heights at which no null comes near whatever k and tide do.

Knows the mirrored ray and the clearance already worked out; says nothing in words.
"""

import math
from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.design.reflection_rays import Rays, Traced
from fellspan.design.reflection_result import (
    MATTERS_FROM_DB,
    End,
    HeightRange,
    KName,
    Lobing,
    LobingCurve,
    NullFreeHeights,
)
from fellspan.design.reflection_surfaces import Surface
from fellspan.links.levels import PathLevels
from fellspan.links.result import EndResult, LinkResult

Floats = NDArray[np.float64]

LOWEST_AGL_M: Final = 0.5
CURVE_POINTS: Final = 121
PITCHES_SHOWN: Final = 3.0
NARROWEST_M, WIDEST_M = 1.0, 60.0
"""How much height a curve shows: three pitches of the minima, within these bounds."""
SEARCH_STEP_M: Final = 0.1
SEARCH_UP_M: Final = 15.0
MOST_SEARCHED: Final = 600
K_STEPS: Final = 5


def lobing_at(
    end: End,
    rays: Rays,
    result: LinkResult,
    surfaces: Sequence[tuple[KName, float, Surface | None]],
    *,
    pitch_m: float | None,
) -> Lobing:
    """Level against height at one end, for each k over its own surface; None where nothing arrives at that k."""
    planned = _end(result, end).antenna_agl_m
    span = min(max(PITCHES_SHOWN * (pitch_m or WIDEST_M), NARROWEST_M), WIDEST_M)
    low = max(LOWEST_AGL_M, planned - 0.5 * span)
    heights = np.round(np.linspace(low, low + span, CURVE_POINTS), 3)
    curves = []
    for name, k, surface in surfaces:
        level: tuple[float | None, ...] = (None,) * CURVE_POINTS
        if surface is not None:
            found = _trace(rays, surface, end, heights - planned, k=k).level_db
            level = tuple(round(value, 3) if math.isfinite(value) else None for value in found.tolist())
        curves.append(LobingCurve(name=name, k=k if math.isfinite(k) else None, level_db=level))
    return Lobing(end=end, height_m=tuple(heights.tolist()), planned_m=planned, curves=tuple(curves))


def span_wavelengths(
    rays: Rays, surface: Surface, *, inverse_k: Sequence[float], rises_m: Sequence[float]
) -> float | None:
    """How far the path difference moves over the k and the water levels at the planned heights; None where it is undefined."""
    grid_k, grid_rise = _grid(inverse_k, rises_m)
    turns = rays.trace(surface, k=grid_k, rise_m=grid_rise).wavelengths
    return float(np.ptp(turns)) if np.isfinite(turns).all() else None


def null_free_heights(
    end: End,
    rays: Rays,
    result: LinkResult,
    levels: PathLevels,
    surface: Surface,
    *,
    inverse_k: Sequence[float],
    rises_m: Sequence[float],
) -> NullFreeHeights:
    """Heights at one end at which the mirrored ray fades the link by 3 dB at most, at every 1/k and water level between."""
    planned = _end(result, end).antenna_agl_m
    lowest = planned - spare_height_m(levels, end)
    bottom = max(LOWEST_AGL_M, lowest)
    top = max(planned, bottom) + max(SEARCH_UP_M, planned)
    count = min(round((top - bottom) / SEARCH_STEP_M) + 1, MOST_SEARCHED)
    # The planned height is one of those tried, so that a height that does already is told.
    change = np.unique(np.append(np.linspace(bottom, top, count), planned) - planned)
    change = change[change >= bottom - planned - 1e-9]
    grid_k, grid_rise = _grid(inverse_k, rises_m)
    traced = _trace(rays, surface, end, change, k=grid_k[:, None], rise_m=grid_rise[:, None])
    free = _free_of_nulls(traced)
    best = None
    if free.any():
        best = float(change[free][int(np.argmin(np.abs(change[free])))])
        best = 0.0 if abs(best) < 1e-9 else best
    return NullFreeHeights(
        end=end,
        planned_m=planned,
        change_m=best,
        ranges=_ranges(change + planned, free),
        searched=HeightRange(from_m=bottom, to_m=top),
        lowest_m=lowest,
    )


def spare_height_m(levels: PathLevels, end: End) -> float:
    """How much lower the antenna at one end may hang before a criterion fails, m; negative where it must go up."""
    share = levels.distance_m / levels.distance_m[-1]
    lever = 1.0 - share if end == "a" else share
    inner = (share > 0.0) & (share < 1.0)
    spare = (levels.available_m - levels.need_m)[:, inner] / lever[inner]
    return float(spare.min())


def _free_of_nulls(traced: Traced) -> NDArray[np.bool_]:
    """Over the first axis: no null comes nearer than where the fade is 3 dB, at any value between those given.

    The path difference grows steadily with 1/k and with the water, so between its least and its greatest value lies all
    that can happen.
    """
    turns = np.where(np.isfinite(traced.wavelengths), traced.wavelengths, 0.0)
    strength = np.where(np.isfinite(traced.amplitude), traced.amplitude, 1.0)
    deep = 10.0 ** (-MATTERS_FROM_DB / 10.0)
    # A null is widest, at this depth, for an amplitude of sqrt(1 - deep): of those that occur, the one nearest to it.
    strength = np.clip(math.sqrt(1.0 - deep), strength.min(axis=0), strength.max(axis=0))
    with np.errstate(divide="ignore", invalid="ignore"):
        cosine = (1.0 + strength**2 - deep) / (2.0 * strength)
    beside = np.arccos(np.clip(cosine, -1.0, 1.0)) / (2.0 * np.pi)
    least, most = turns.min(axis=0) - beside, turns.max(axis=0) + beside
    return np.asarray((np.floor(most) < least) | ~(cosine < 1.0))


def _ranges(heights: Floats, free: NDArray[np.bool_]) -> tuple[HeightRange, ...]:
    change = np.flatnonzero(np.diff(np.concatenate(([False], free, [False])).astype(np.int8)))
    return tuple(
        HeightRange(from_m=float(heights[first]), to_m=float(heights[after - 1]))
        for first, after in zip(change[::2].tolist(), change[1::2].tolist(), strict=True)
    )


def _grid(inverse_k: Sequence[float], rises_m: Sequence[float]) -> tuple[Floats, Floats]:
    steps = np.unique(np.concatenate((np.linspace(min(inverse_k), max(inverse_k), K_STEPS), inverse_k)))
    with np.errstate(divide="ignore"):
        k = np.where(steps == 0.0, np.inf, 1.0 / steps)
    grid_k, grid_rise = np.meshgrid(k, np.asarray(rises_m, dtype=np.float64))
    return grid_k.ravel(), grid_rise.ravel()


def _trace(rays: Rays, surface: Surface, end: End, change_m: Floats, **more: object) -> Traced:
    if end == "a":
        return rays.trace(surface, a_amsl_m=rays.planned_a_m + change_m, **more)  # type: ignore[arg-type]
    return rays.trace(surface, b_amsl_m=rays.planned_b_m + change_m, **more)  # type: ignore[arg-type]


def _end(result: LinkResult, end: End) -> EndResult:
    return result.ends.a if end == "a" else result.ends.b
