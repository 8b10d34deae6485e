"""How high the obstacles on a path stand: from a height above ground or above sea to a top at each sample.

Works on crossings and ground levels handed in; knows nothing of files and rasters.
"""

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.alongpath import Floats
from fellspan.terrain.obstacles import DEFAULT_ERROR_M, JOIN_M, Crossing
from fellspan.terrain.profile import PathObstacle

_MOST_NODES = 257
EDGE_M = 0.01
"""How far outside an obstacle or survey stretch the extra sample stands that makes its step show, m."""

GroundAlong = Callable[[Floats], Floats]
"""Ground above sea level at distances along the path, m, (n,) -> (n,)."""
GroundAtSupports = Callable[[Crossing, NDArray[np.int64]], Floats]
"""Ground at the ends of spans of a crossing's line, m: spans (k,) -> (k, 2)."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Standing:
    """An obstacle on a path with its top settled: `base_m` is its level top, or the height above ground if it follows it."""

    crossing: Crossing
    shown: PathObstacle
    follows: bool
    base_m: float
    span_tops_m: Floats | None = None
    """Tops of the supports of the spans crossed, shape (v, 2), NaN for spans that are not crossed."""
    sag_m: float = 0.0

    @property
    def is_absolute(self) -> bool:
        """True where the top is stated above sea level, so that the error of the ground does not enter."""
        obstacle = self.crossing.obstacle
        return obstacle.top_amsl_m is not None or (obstacle.tops_amsl_m is not None and self.span_tops_m is not None)

    def covers(self, distance_m: Floats) -> slice:
        """The samples that lie in it, among rising distances."""
        start = np.searchsorted(distance_m, self.crossing.from_m - JOIN_M, side="left")
        stop = np.searchsorted(distance_m, self.crossing.to_m + JOIN_M, side="right")
        return slice(int(start), int(stop))

    def top_m(self, distance_m: Floats, ground_m: Floats) -> Floats:
        """Its top above sea level at distances inside it, m; NaN where the ground it stands on is unknown."""
        if self.span_tops_m is not None and self.crossing.supports is not None:
            return _hung(self.crossing.supports, self.span_tops_m, self.sag_m, distance_m)
        return ground_m + self.base_m if self.follows else np.full(distance_m.shape, self.base_m)


def nodes(crossing: Crossing, step_m: float) -> Floats:
    """Distances inside a crossing at which it is looked at: its ends, its nearest point and a regular division."""
    length = crossing.to_m - crossing.from_m
    if not length > 0.0:
        return np.array([crossing.from_m])
    count = min(_MOST_NODES, 2 + math.ceil(length / step_m))
    inside: Floats = crossing.from_m + np.arange(count, dtype=np.float64) * (length / (count - 1))
    inside[-1] = crossing.to_m
    nearest = int(inside.searchsorted(crossing.nearest_m))
    if inside[nearest] == crossing.nearest_m:
        return inside
    return np.concatenate((inside[:nearest], [crossing.nearest_m], inside[nearest:]))


def stand(
    crossings: Sequence[Crossing],
    *,
    ground_along: GroundAlong,
    ground_at_supports: GroundAtSupports,
    step_m: float,
    growth_years: float,
) -> tuple[Standing, ...]:
    """Settle the tops of all crossings of one path; ground is asked for once, at all nodes."""
    if not crossings:
        return ()
    places = [nodes(crossing, step_m) for crossing in crossings]
    distances, back = np.unique(np.concatenate(places), return_inverse=True)
    ground = ground_along(distances)[back]
    standing = []
    at = 0
    for crossing, place in zip(crossings, places, strict=True):
        under = ground[at : at + place.size]
        at += place.size
        standing.append(settled_on(crossing, place, under, ground_at_supports, growth_years))
    return tuple(standing)


def settled_on(
    crossing: Crossing, place_m: Floats, ground_m: Floats, ground_at_supports: GroundAtSupports, growth_years: float
) -> Standing:
    """Settle the top of one crossing, with the ground at its `nodes`, m."""
    obstacle = crossing.obstacle
    growth = obstacle.growth_m_per_year * growth_years
    highest = _highest(ground_m, math.nan)
    height = (obstacle.height_m if obstacle.height_m is not None else max(obstacle.heights_m or (0.0,))) + growth
    follows, base, span_tops = False, highest + height, None
    if obstacle.rule == "sea" and obstacle.top_amsl_m is not None:
        base = obstacle.top_amsl_m + growth
    elif obstacle.rule == "follow":
        follows, base = True, height
    elif obstacle.rule == "span" and crossing.supports is not None:
        span_tops = _support_tops(crossing, ground_at_supports, growth)
        tops = _hung(crossing.supports, span_tops, obstacle.sag_m, place_m)
        if not np.isfinite(tops).all():
            # No ground at a support: hang the line level from the highest ground under the crossing.
            span_tops = None
    if span_tops is not None:
        top, most = _highest(tops, math.nan), _highest(tops - ground_m, height)
    elif follows:
        top, most = highest + base, base
    else:
        top, most = base, height if math.isnan(base) else base + _highest(-ground_m, height - base)
    return Standing(
        crossing=crossing,
        shown=PathObstacle(
            name=obstacle.name,
            kind=obstacle.kind,
            from_m=crossing.from_m,
            to_m=crossing.to_m,
            top_amsl_m=top,
            height_m=most,
            source=obstacle.source,
            growth_m_per_year=obstacle.growth_m_per_year,
            sigma_m=obstacle.error_m if obstacle.error_m is not None else DEFAULT_ERROR_M[obstacle.kind],
        ),
        follows=follows,
        base_m=base,
        span_tops_m=span_tops,
        sag_m=obstacle.sag_m,
    )


def _highest(levels_m: Floats, unknown_m: float) -> float:
    """The highest of the levels that are known; else what is given."""
    highest = float(levels_m.max())
    if math.isnan(highest):
        known = levels_m[np.isfinite(levels_m)]
        return float(known.max()) if known.size else unknown_m
    return highest


def _support_tops(crossing: Crossing, ground_at_supports: GroundAtSupports, growth_m: float) -> Floats:
    """Tops of both supports of each span near the crossing, shape (v - 1, 2), NaN elsewhere."""
    obstacle, supports = crossing.obstacle, crossing.supports
    assert supports is not None
    count = supports.shape[0] - 1
    tops = np.full((count, 2), np.nan)
    if obstacle.tops_amsl_m is not None:
        levels = np.array(obstacle.tops_amsl_m) + growth_m
        return np.column_stack((levels[:-1], levels[1:]))
    heights = np.array(
        obstacle.heights_m if obstacle.heights_m is not None else (obstacle.height_m or 0.0,) * (count + 1)
    )
    samples = np.linspace(crossing.from_m, crossing.to_m, 33)
    near = np.unique(_nearest_span(supports, samples)[0])
    tops[near] = ground_at_supports(crossing, near) + np.column_stack((heights[near], heights[near + 1])) + growth_m
    return tops


def _nearest_span(supports: Floats, distance_m: Floats) -> tuple[NDArray[np.int64], Floats]:
    """The span nearest each point of the path, and how far along that span (0 to 1) the nearest point of it is."""
    start = supports[:-1]
    ray = supports[1:] - start
    square = np.maximum(np.sum(ray**2, axis=1), 1e-12)
    spans = np.empty(distance_m.size, dtype=np.int64)
    fractions = np.empty(distance_m.size)
    chunk = max(1, 200_000 // start.shape[0])  # bounds the memory of samples by spans
    for at in range(0, distance_m.size, chunk):
        along = distance_m[at : at + chunk, None] - start[None, :, 0]
        fraction = np.clip((along * ray[:, 0] - start[:, 1] * ray[:, 1]) / square, 0.0, 1.0)
        away = np.hypot(along - fraction * ray[:, 0], start[:, 1] + fraction * ray[:, 1])
        span = np.argmin(away, axis=1)
        spans[at : at + chunk] = span
        fractions[at : at + chunk] = fraction[np.arange(span.size), span]
    return spans, fractions


def _hung(supports: Floats, tops_m: Floats, sag_m: float, distance_m: Floats) -> Floats:
    """Height of a line hung between supports: a chord less a parabola of the given sag at mid-span."""
    span, fraction = _nearest_span(supports, distance_m)
    chord = tops_m[span, 0] + (tops_m[span, 1] - tops_m[span, 0]) * fraction
    hung: Floats = chord - 4.0 * sag_m * fraction * (1.0 - fraction)
    return hung
