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
class _Passed:
    obstacle: Obstacle
    shift: float
    along_m: float
    across_m: float
    offset_m: float
    share: float
    """Offset against the radius of a zone: small is deep inside."""


def beside(
    near: Sequence[NearShape],
    crossings: Sequence[Crossing],
    path: GeodesicPath,
    *,
    ground_at: GroundAt,
    growth_years: float,
) -> tuple[BesidePath, ...]:
    """The obstacles within `BESIDE_M` of a path and not within that of a crossing of their own, by distance from A."""
    crossed: dict[int, list[tuple[float, float]]] = {}
    for crossing in crossings:
        crossed.setdefault(id(crossing.obstacle), []).append((crossing.from_m - BESIDE_M, crossing.to_m + BESIDE_M))
    passed = [
        found for one in near if (found := _passed(one, crossed.get(id(one.obstacle), ()), path.length_m)) is not None
    ]
    passed = sorted(passed, key=lambda one: (one.share, one.along_m, one.obstacle.name))[:MOST_BESIDE]
    return tuple(
        sorted(
            (
                BesidePath(
                    name=one.obstacle.name,
                    kind=one.obstacle.kind,
                    at_m=one.along_m,
                    offset_m=one.offset_m,
                    top_amsl_m=_top(one, path, ground_at, growth_years),
                    source=one.obstacle.source,
                )
                for one in passed
            ),
            key=lambda one: (one.at_m, one.offset_m, one.name),
        )
    )


def _passed(near: NearShape, crossed: Sequence[tuple[float, float]], length_m: float) -> _Passed | None:
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
    return _Passed(
        obstacle=near.obstacle,
        shift=near.shift,
        along_m=float(points[i, 0]),
        across_m=float(points[i, 1]),
        offset_m=float(offset[i]),
        share=float(share[i]),
    )


def _top(one: _Passed, path: GeodesicPath, ground_at: GroundAt, growth_years: float) -> float:
    """Its top at that place, m above sea level."""
    obstacle = one.obstacle
    growth = obstacle.growth_m_per_year * growth_years
    if obstacle.rule == "sea" and obstacle.top_amsl_m is not None:
        return obstacle.top_amsl_m + growth
    latitude, longitude = _position(path, one.along_m, one.across_m)
    height = obstacle.height_m if obstacle.height_m is not None else max(obstacle.heights_m or (0.0,))
    if obstacle.rule == "span":
        top = _hung(one, path, ground_at)
        if np.isfinite(top):
            return top + growth
    latitudes, longitudes = np.array([latitude]), np.array([longitude])
    if obstacle.rule == "level" and obstacle.shape.geom_type == "Polygon":
        corners = shapely.get_coordinates(obstacle.shape)
        corners = corners[np.unique(np.linspace(0, len(corners) - 1, _MOST_CORNERS).astype(np.int64))]
        latitudes, longitudes = np.append(latitudes, corners[:, 1]), np.append(longitudes, corners[:, 0])
    ground = ground_at(latitudes, longitudes)
    if not np.isfinite(ground).any():
        # The ground of the path at that place is the next best.
        ground = ground_at(*(np.atleast_1d(value) for value in path.positions(np.array([one.along_m]))))
    return float(np.nanmax(ground)) + height + growth if np.isfinite(ground).any() else float("nan")


def _hung(one: _Passed, path: GeodesicPath, ground_at: GroundAt) -> float:
    """Height of a line hung between its supports, at its place nearest the path."""
    obstacle = one.obstacle
    line = shapely.get_coordinates(obstacle.shape)
    along, across = along_across(path, line[:, 1], line[:, 0] + one.shift)
    start, ray = np.column_stack((along, across))[:-1], np.column_stack((np.diff(along), np.diff(across)))
    square = np.maximum(np.sum(ray**2, axis=1), 1e-12)
    fraction = np.clip(
        ((one.along_m - start[:, 0]) * ray[:, 0] + (one.across_m - start[:, 1]) * ray[:, 1]) / square, 0, 1
    )
    foot = start + fraction[:, None] * ray
    span = int(np.argmin(np.hypot(foot[:, 0] - one.along_m, foot[:, 1] - one.across_m)))
    if obstacle.tops_amsl_m is not None:
        first, second = obstacle.tops_amsl_m[span : span + 2]
    else:
        heights = obstacle.heights_m or (obstacle.height_m or 0.0,) * len(line)
        ground = ground_at(line[span : span + 2, 1], line[span : span + 2, 0])
        first, second = float(ground[0]) + heights[span], float(ground[1]) + heights[span + 1]
    share = float(fraction[span])
    return first + (second - first) * share - 4.0 * obstacle.sag_m * share * (1.0 - share)


def _position(path: GeodesicPath, along_m: float, across_m: float) -> tuple[float, float]:
    """Latitude and longitude of a place beside the path."""
    longitude, latitude, back = WGS84_GEOD.fwd(
        path.a.longitude_deg, path.a.latitude_deg, path.bearing_ab_deg, max(along_m, 1e-3)
    )
    longitude, latitude, _ = WGS84_GEOD.fwd(longitude, latitude, back + 180.0 + 90.0, across_m)
    return float(latitude), float(longitude)
