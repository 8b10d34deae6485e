"""Obstacles that a path passes without crossing them: where they come nearest, how far off, how high.

Works on shapes in the plane of the path; opens nothing and knows no frequency.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final, Protocol

import numpy as np
import shapely
from numpy.typing import ArrayLike

from fellspan.geodesy.geodesic import WGS84_GEOD, GeodesicPath
from fellspan.terrain.alongpath import Floats, along_across
from fellspan.terrain.obstacles import BESIDE_M, Crossing, NearShape, Obstacle
from fellspan.terrain.profile import BesidePath

MOST_BESIDE: Final = 200
"""Most obstacles that are listed beside one path."""
_FINEST_M, _PARTS = 2.0, 500
_MOST_CORNERS = 64


class GroundAt(Protocol):
    """Ground above sea level at positions, m, (n,) -> (n,); NaN where it is not known."""

    def __call__(self, latitude_deg: ArrayLike, longitude_deg: ArrayLike) -> Floats:
        """As the class says."""
        ...


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Passed:
    """Where an obstacle's edge lies deepest in the zones of a path that passes it."""

    obstacle: Obstacle
    shift: float
    along_m: float
    across_m: float
    offset_m: float
    share: float
    """Offset against the radius of a zone: small is deep inside."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Probe:
    """Places (n, 2), latitude and longitude, whose ground tells the top: beside the path, on it, then corners or supports."""

    places: Floats
    span: int = 0
    share: float = 0.0


def beside(
    near: Sequence[NearShape],
    crossings: Sequence[Crossing],
    path: GeodesicPath,
    *,
    ground_at: GroundAt,
    growth_years: float,
) -> tuple[BesidePath, ...]:
    """The obstacles within `BESIDE_M` of a path and not within that of a crossing of their own, by distance from A."""
    passed = passed_by(near, crossings, path.length_m)
    tops = tops_m([(one, path) for one in passed], ground_at=ground_at, growth_years=growth_years)
    listed = [
        BesidePath(
            name=one.obstacle.name,
            kind=one.obstacle.kind,
            at_m=one.along_m,
            offset_m=one.offset_m,
            top_amsl_m=top,
            source=one.obstacle.source,
        )
        for one, top in zip(passed, tops, strict=True)
    ]
    return tuple(sorted(listed, key=lambda one: (one.at_m, one.offset_m, one.name)))


def passed_by(near: Sequence[NearShape], crossings: Sequence[Crossing], length_m: float) -> list[Passed]:
    """The obstacles that `beside` lists, the deepest in the zones first."""
    crossed: dict[int, list[tuple[float, float]]] = {}
    for crossing in crossings:
        crossed.setdefault(id(crossing.obstacle), []).append((crossing.from_m - BESIDE_M, crossing.to_m + BESIDE_M))
    passed = [found for one in near if (found := _passed(one, crossed.get(id(one.obstacle), ()), length_m)) is not None]
    return sorted(passed, key=lambda one: (one.share, one.along_m, one.obstacle.name))[:MOST_BESIDE]


def tops_m(passed: Sequence[tuple[Passed, GeodesicPath]], *, ground_at: GroundAt, growth_years: float) -> list[float]:
    """Tops of obstacles beside paths, m above sea level, with growth; ground is asked for once, for all of them."""
    probes = [_probes(one, path) for one, path in passed]
    places = np.concatenate([probe.places for probe in probes]) if probes else np.zeros((0, 2))
    ground = ground_at(places[:, 0], places[:, 1])
    tops: list[float] = []
    at = 0
    for (one, _), probe in zip(passed, probes, strict=True):
        under = ground[at : at + len(probe.places)]
        at += len(probe.places)
        tops.append(_top(one.obstacle, probe, under) + one.obstacle.growth_m_per_year * growth_years)
    return tops


def _passed(near: NearShape, crossed: Sequence[tuple[float, float]], length_m: float) -> Passed | None:
    """Where the edge of a shape lies deepest in the zones of the path; None where it stays off or beyond the ends.

    Stretches where it is crossed are left out: there it counts as crossed.
    """
    shape = near.plane
    if shape.is_empty:
        return None
    reach = near.obstacle.reach_m
    if not isinstance(shape, shapely.Point):
        shape = shapely.segmentize(shape, max(_FINEST_M, length_m / _PARTS))
    points = shapely.get_coordinates(shape)
    points = points[(points[:, 0] > 0.0) & (points[:, 0] < length_m)]
    for start, stop in crossed:
        points = points[(points[:, 0] < start) | (points[:, 0] > stop)]
    offset = np.maximum(np.abs(points[:, 1]) - reach, 0.0)
    within = offset <= BESIDE_M
    if not within.any():
        return None
    points, offset = points[within], offset[within]
    share = offset / np.sqrt(points[:, 0] * (length_m - points[:, 0]) / length_m)
    i = int(np.argmin(share))
    return Passed(
        obstacle=near.obstacle,
        shift=near.shift,
        along_m=float(points[i, 0]),
        across_m=float(points[i, 1]),
        offset_m=float(offset[i]),
        share=float(share[i]),
    )


def _probes(one: Passed, path: GeodesicPath) -> _Probe:
    """Where the ground must be known for the top: beside the path, on it, and at corners or supports."""
    obstacle = one.obstacle
    foot = path.positions(np.array([one.along_m]))
    places = [_position(path, one.along_m, one.across_m), (float(foot[0][0]), float(foot[1][0]))]
    if obstacle.rule == "span":
        line = shapely.get_coordinates(obstacle.shape)
        span, share = _span(one, line, path)
        return _Probe(places=np.array([*places, *line[span : span + 2, ::-1]]), span=span, share=share)
    if obstacle.rule == "level" and obstacle.shape.geom_type == "Polygon":
        corners = shapely.get_coordinates(obstacle.shape)
        corners = corners[np.unique(np.linspace(0, len(corners) - 1, _MOST_CORNERS).astype(np.int64))]
        return _Probe(places=np.array([*places, *corners[:, ::-1]]))
    return _Probe(places=np.array(places))


def _top(obstacle: Obstacle, probe: _Probe, ground_m: Floats) -> float:
    """Its top, m above sea level, without growth, over the ground at its probes."""
    if obstacle.rule == "sea" and obstacle.top_amsl_m is not None:
        return obstacle.top_amsl_m
    if obstacle.rule == "span":
        if obstacle.tops_amsl_m is not None:
            first, second = obstacle.tops_amsl_m[probe.span : probe.span + 2]
        else:
            supports = len(shapely.get_coordinates(obstacle.shape))
            heights = obstacle.heights_m or (obstacle.height_m or 0.0,) * supports
            first, second = ground_m[2] + heights[probe.span], ground_m[3] + heights[probe.span + 1]
        hung = first + (second - first) * probe.share - 4.0 * obstacle.sag_m * probe.share * (1.0 - probe.share)
        if np.isfinite(hung):
            return float(hung)
    own = np.concatenate((ground_m[:1], ground_m[2:]))
    if not np.isfinite(own).any():
        own = ground_m[1:2]  # the ground of the path there is the next best
    height = obstacle.height_m if obstacle.height_m is not None else max(obstacle.heights_m or (0.0,))
    return float(np.nanmax(own)) + height if np.isfinite(own).any() else float("nan")


def _span(one: Passed, line: Floats, path: GeodesicPath) -> tuple[int, float]:
    """Which span of a line is the one beside the path, and how far along it (0 to 1)."""
    along, across = along_across(path, line[:, 1], line[:, 0] + one.shift)
    start, ray = np.column_stack((along, across))[:-1], np.column_stack((np.diff(along), np.diff(across)))
    square = np.maximum(np.sum(ray**2, axis=1), 1e-12)
    share = ((one.along_m - start[:, 0]) * ray[:, 0] + (one.across_m - start[:, 1]) * ray[:, 1]) / square
    share = np.clip(share, 0.0, 1.0)
    foot = start + share[:, None] * ray
    span = int(np.argmin(np.hypot(foot[:, 0] - one.along_m, foot[:, 1] - one.across_m)))
    return span, float(share[span])


def _position(path: GeodesicPath, along_m: float, across_m: float) -> tuple[float, float]:
    """Latitude and longitude of a place beside the path."""
    longitude, latitude, back = WGS84_GEOD.fwd(
        path.a.longitude_deg, path.a.latitude_deg, path.bearing_ab_deg, max(along_m, 1e-3)
    )
    longitude, latitude, _ = WGS84_GEOD.fwd(longitude, latitude, back + 180.0 + 90.0, across_m)
    return float(latitude), float(longitude)
