"""Obstacles that paths pass without crossing them: where they come nearest, how far off, how high.

Works on shapes in the planes of many paths, or of one; opens nothing and knows no frequency.
"""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Final, Protocol

import numpy as np
import shapely
from numpy.typing import ArrayLike, NDArray

from fellspan.geodesy.geodesic import WGS84_GEOD, GeodesicPath
from fellspan.terrain.alongpath import Floats, along_across_many
from fellspan.terrain.many_obstacles import Starts, Touched
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

    path: int
    obstacle: Obstacle
    shift: float
    along_m: float
    across_m: float
    offset_m: float
    share: float
    """Offset against the radius of a zone of wavelength 1 m: small is deep inside."""


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
    if not near:
        return ()
    starts = Starts(
        latitude_deg=np.array([path.a.latitude_deg]),
        longitude_deg=np.array([path.a.longitude_deg]),
        bearing_deg=np.array([path.bearing_ab_deg]),
        length_m=np.array([path.length_m]),
    )
    plane = np.full(len(near), None, dtype=object)
    plane[:] = [one.plane for one in near]
    touched = Touched(
        path=np.zeros(len(near), dtype=np.int64),
        obstacle=np.arange(len(near)),
        shift_deg=np.array([one.shift for one in near]),
        plane=plane,
    )
    passed = passed_by(touched, [one.obstacle for one in near], {0: crossings}, starts.length_m)
    tops = tops_m(passed, starts, ground_at=ground_at, growth_years=growth_years)
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


def passed_by(
    touched: Touched,
    obstacles: Sequence[Obstacle],
    crossings: Mapping[int, Sequence[Crossing]],
    length_m: Floats,
    *,
    most_share: float = math.inf,
) -> list[Passed]:
    """The obstacles that `beside` lists, for each path the deepest in the zones first; those of a lesser share only, if asked.

    Parameters
    ----------
    touched
        Obstacles near paths, columns (k,), `obstacle` an index into `obstacles`.
    crossings
        Of each path; stretches where an obstacle is crossed are left out: there it counts as crossed.
    length_m
        Of each path, (p,).
    """
    length = length_m[touched.path]
    reach = np.array([obstacles[one].reach_m for one in touched.obstacle.tolist()])
    widest = np.minimum(BESIDE_M, 0.5 * most_share * np.sqrt(length))
    bounds = shapely.bounds(touched.plane).reshape(-1, 4)
    with np.errstate(invalid="ignore"):  # NaN: nothing is left of a shape that was cut
        may = np.flatnonzero((bounds[:, 1] - reach <= widest) & (bounds[:, 3] + reach >= -widest))
    if may.size < length.size:
        touched = touched.rows(may)
        length, reach, widest = length[may], reach[may], widest[may]
    points, of = shapely.get_coordinates(_divided(touched.plane, length), return_index=True)
    few = np.flatnonzero(np.abs(points[:, 1]) <= (reach + widest)[of])
    of, along, across = of[few], points[few, 0], points[few, 1]
    inside = (along > 0.0) & (along < length[of])
    for start, stop in _crossed(touched, obstacles, crossings):
        inside &= (along < start[of]) | (along > stop[of])
    kept = np.flatnonzero(inside)
    of, along, across = of[kept], along[kept], across[kept]
    offset = np.maximum(np.abs(across) - reach[of], 0.0)
    share = offset / np.sqrt(along * (length[of] - along) / length[of])
    if math.isfinite(most_share):
        deep = np.flatnonzero(share < most_share)
        of, along, across, offset, share = of[deep], along[deep], across[deep], offset[deep], share[deep]
    order = np.lexsort((share, of))
    first = order[np.flatnonzero(np.diff(of[order], prepend=-1))]
    passed = [
        Passed(
            path=int(touched.path[of[i]]),
            obstacle=obstacles[int(touched.obstacle[of[i]])],
            shift=float(touched.shift_deg[of[i]]),
            along_m=float(along[i]),
            across_m=float(across[i]),
            offset_m=float(offset[i]),
            share=float(share[i]),
        )
        for i in first.tolist()
    ]
    passed.sort(key=lambda one: (one.path, one.share, one.along_m, one.obstacle.name))
    listed: dict[int, int] = {}
    kept_of_path: list[Passed] = []
    for one in passed:
        listed[one.path] = listed.get(one.path, 0) + 1
        if listed[one.path] <= MOST_BESIDE:
            kept_of_path.append(one)
    return kept_of_path


def _divided(plane: NDArray[np.object_], length_m: Floats) -> NDArray[np.object_]:
    """Shapes (k,) with points fine enough to tell where they are nearest to a path of length (k,)."""
    areas = np.flatnonzero((shapely.get_type_id(plane) != shapely.GeometryType.POINT) & ~shapely.is_empty(plane))
    divided = plane.copy()
    divided[areas] = shapely.segmentize(plane[areas], np.maximum(_FINEST_M, length_m[areas] / _PARTS))
    return divided


def _crossed(
    touched: Touched, obstacles: Sequence[Obstacle], crossings: Mapping[int, Sequence[Crossing]]
) -> list[tuple[Floats, Floats]]:
    """Where obstacles near paths are crossed: the first stretch of each, (k,) and (k,), the second, and so on; else inf."""
    rounds: list[tuple[Floats, Floats]] = []
    count = touched.path.size
    for k, (path, obstacle) in enumerate(zip(touched.path.tolist(), touched.obstacle.tolist(), strict=True)):
        own = [one for one in crossings.get(path, ()) if one.obstacle is obstacles[obstacle]]
        for number, one in enumerate(own):
            if number == len(rounds):
                rounds.append((np.full(count, np.inf), np.full(count, np.inf)))
            rounds[number][0][k], rounds[number][1][k] = one.from_m - BESIDE_M, one.to_m + BESIDE_M
    return rounds


def tops_m(passed: Sequence[Passed], starts: Starts, *, ground_at: GroundAt, growth_years: float) -> list[float]:
    """Tops of obstacles beside paths, m above sea level, with growth; ground is asked for once, for all of them."""
    if not passed:
        return []
    path = np.array([one.path for one in passed])
    along = np.array([one.along_m for one in passed])
    across = np.array([one.across_m for one in passed])
    longitude, latitude, back = (
        np.asarray(one)
        for one in WGS84_GEOD.fwd(
            starts.longitude_deg[path], starts.latitude_deg[path], starts.bearing_deg[path], np.maximum(along, 1e-3)
        )
    )
    off_longitude, off_latitude, _ = WGS84_GEOD.fwd(longitude, latitude, back + 180.0 + 90.0, across)
    feet = np.column_stack((latitude, longitude))
    edges = np.column_stack((off_latitude, off_longitude))
    probes = [_probes(one, starts, edge, foot) for one, edge, foot in zip(passed, edges, feet, strict=True)]
    places = np.concatenate([probe.places for probe in probes])
    ground = ground_at(places[:, 0], places[:, 1])
    tops: list[float] = []
    at = 0
    for one, probe in zip(passed, probes, strict=True):
        under = ground[at : at + len(probe.places)]
        at += len(probe.places)
        tops.append(_top(one.obstacle, probe, under) + one.obstacle.growth_m_per_year * growth_years)
    return tops


def _probes(one: Passed, starts: Starts, edge: Floats, foot: Floats) -> _Probe:
    """Where the ground must be known for the top: beside the path, on it, and at corners or supports."""
    obstacle = one.obstacle
    if obstacle.rule == "span":
        line = shapely.get_coordinates(obstacle.shape)
        span, share = _span(one, line, starts)
        return _Probe(places=np.array([edge, foot, *line[span : span + 2, ::-1]]), span=span, share=share)
    if obstacle.rule == "level" and obstacle.shape.geom_type == "Polygon":
        corners = shapely.get_coordinates(obstacle.shape)
        corners = corners[np.unique(np.linspace(0, len(corners) - 1, _MOST_CORNERS).astype(np.int64))]
        return _Probe(places=np.array([edge, foot, *corners[:, ::-1]]))
    return _Probe(places=np.array([edge, foot]))


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


def _span(one: Passed, line: Floats, starts: Starts) -> tuple[int, float]:
    """Which span of a line is the one beside the path, and how far along it (0 to 1)."""
    latitude, longitude, bearing = (
        np.full(len(line), float(column[one.path]))
        for column in (starts.latitude_deg, starts.longitude_deg, starts.bearing_deg)
    )
    along, across = along_across_many(latitude, longitude, bearing, line[:, 1], line[:, 0] + one.shift)
    start, ray = np.column_stack((along, across))[:-1], np.column_stack((np.diff(along), np.diff(across)))
    square = np.maximum(np.sum(ray**2, axis=1), 1e-12)
    share = ((one.along_m - start[:, 0]) * ray[:, 0] + (one.across_m - start[:, 1]) * ray[:, 1]) / square
    share = np.clip(share, 0.0, 1.0)
    foot = start + share[:, None] * ray
    span = int(np.argmin(np.hypot(foot[:, 0] - one.along_m, foot[:, 1] - one.across_m)))
    return span, float(share[span])
