"""Obstacles as data, and which of them a path crosses, where.

Knows nothing of files and rasters: `obstacle_files` reads them, `obstacle_tops` says how high they stand.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, Protocol

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely.geometry.base import BaseGeometry

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.terrain.alongpath import Floats, along_across, near_lines, near_path, reach_boxes
from fellspan.vocabulary import CoverKind

TopRule = Literal["level", "follow", "span", "sea"]
"""Level: one top, from the highest ground under it. Follow: a constant height above ground. Span: hung between supports.
Sea: a top stated above sea level."""

DEFAULT_ERROR_M: dict[CoverKind, float] = {"none": 1.0, "building": 1.0, "tree": 2.0, "other": 1.0}
"""Standard error of an obstacle's height where its row states none, m (common practice, no source)."""

_LONG_EDGE_DEG = (
    0.004  # edges are straight in longitude and latitude; cut so, they stay within 1 cm of that up to 60 degrees
)
_MANY_VERTICES = 64
JOIN_M = 1e-3
BESIDE_M = 60.0
"""How far from a path obstacles that it does not cross are still looked at, m (our own choice): the first zone is as wide in
the middle of 25 km at 0.5 GHz."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Obstacle:
    """One obstacle: a disc (Point and `radius_m`), an outline (Polygon) or a band (LineString and `width_m`).

    `shape` is in longitude and latitude, unwrapped where it crosses 180 degrees. One of `height_m` (above ground),
    `top_amsl_m`, `heights_m` (a support each, above ground) and `tops_amsl_m` is set.
    """

    name: str
    kind: CoverKind
    shape: BaseGeometry
    rule: TopRule
    source: str
    height_m: float | None = None
    top_amsl_m: float | None = None
    heights_m: tuple[float, ...] | None = None
    tops_amsl_m: tuple[float, ...] | None = None
    sag_m: float = 0.0
    radius_m: float = 0.0
    width_m: float = 0.0
    growth_m_per_year: float = 0.0
    error_m: float | None = None
    moves: bool = False
    """An envelope of what comes and goes (vehicles, ships, cranes): a survey of the spot does not remove it."""

    @property
    def reach_m(self) -> float:
        """How far it reaches beyond its shape, m."""
        return max(self.radius_m, 0.5 * self.width_m)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Crossing:
    """A stretch of a path that lies under, or in, an obstacle; `nearest_m` is where the path comes nearest its middle."""

    obstacle: Obstacle
    from_m: float
    to_m: float
    nearest_m: float
    supports: Floats | None = None
    """Vertices of a span as (along, across), shape (v, 2), m."""

    @classmethod
    def between(
        cls, obstacle: Obstacle, start_m: float, stop_m: float, *, length_m: float, supports: Floats | None
    ) -> "Crossing | None":
        """The part of a stretch that lies on a path of a length; None where none does."""
        if stop_m < 0.0 or start_m > length_m:
            return None
        begin, finish = max(start_m, 0.0), min(stop_m, length_m)
        nearest = min(max(0.5 * (start_m + stop_m), begin), finish)
        return cls(obstacle=obstacle, from_m=begin, to_m=finish, nearest_m=nearest, supports=supports)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class NearShape:
    """An obstacle near a path with its shape in (along, across) of that path, m.

    `shift` is what its longitudes were moved by, degrees; a large shape is cut to the path's surroundings.
    """

    obstacle: Obstacle
    plane: BaseGeometry
    shift: float
    crosses: bool
    """False where its bounds already keep off the path."""


class Line(Protocol):
    """A path that can say where it runs."""

    @property
    def length_m(self) -> float:
        """How long it is, m."""
        ...

    def positions(self, distance_m: Floats, /) -> tuple[Floats, Floats]:
        """Latitudes and longitudes, degrees, at distances from A, (n,), the longitudes running on beyond 180."""
        ...


class ObstacleIndex:
    """Finds the obstacles that a path crosses, among many."""

    def __init__(self, obstacles: Sequence[Obstacle]) -> None:
        self.obstacles = tuple(obstacles)
        self._shapes = np.array([obstacle.shape for obstacle in self.obstacles], dtype=object)
        self._reach = np.array([obstacle.reach_m for obstacle in self.obstacles], dtype=np.float64)
        boxes = reach_boxes(shapely.bounds(self._shapes).reshape(-1, 4), self._reach + BESIDE_M)
        self._tree = shapely.STRtree(boxes)

    def near(self, path: GeodesicPath) -> list[NearShape]:
        """The obstacles that the path crosses or may pass within `BESIDE_M`, in the order of their files."""
        if not self.obstacles:
            return []
        indices, shifts = near_path(self._tree, path)
        if indices.size == 0:
            return []
        shapes = self.cut(self._shapes[indices], shifts, self._reach[indices], path)
        plane = _to_plane(shapes, path)
        bounds = shapely.bounds(plane).reshape(-1, 4)
        with np.errstate(invalid="ignore"):  # NaN: nothing is left of a shape that was cut
            reach = self._reach[indices] + JOIN_M
            meets = (bounds[:, 1] <= reach) & (bounds[:, 3] >= -reach)
        return [
            NearShape(obstacle=self.obstacles[index], plane=shape, shift=float(shift), crosses=bool(may))
            for index, shape, shift, may in zip(indices, plane, shifts, meets, strict=True)
        ]

    def meets(self, longitude_deg: Floats, latitude_deg: Floats) -> NDArray[np.bool_]:
        """Which of many paths, nodes in arrays (p, m), come near any obstacle, (p,): `near` is empty for the others."""
        if not self.obstacles:
            return np.zeros(longitude_deg.shape[0], dtype=np.bool_)
        return near_lines(self._tree, longitude_deg, latitude_deg)

    def crossings(self, path: GeodesicPath) -> list[Crossing]:
        """Every crossing of the path, sorted by where it begins; exact to 0.1 m on paths of 50 km."""
        return crossings_of(self.near(path), path)

    def cut(self, shapes: NDArray[np.object_], shifts: Floats, reach_m: Floats, path: Line) -> NDArray[np.object_]:
        """The shapes moved to the path's longitudes, large ones cut to its surroundings, long edges divided."""
        moved = np.array(shapes, dtype=object)
        for i in np.flatnonzero(shifts):
            moved[i] = _shifted(moved[i], float(shifts[i]))
        latitude, longitude = path.positions(np.linspace(0.0, path.length_m, max(2, int(path.length_m / 2000.0) + 2)))
        bounds = np.array([[longitude.min(), latitude.min(), longitude.max(), latitude.max()]])
        if np.abs(bounds[0, [1, 3]]).max() < 88.0:
            large = are_large(moved)
            for i in np.flatnonzero(large):
                frame = shapely.bounds(reach_boxes(bounds, reach_m[i : i + 1] + 500.0)[0])
                moved[i] = _clipped(shapes[i], frame)
        return divided(moved)


def crossings_of(near: Sequence[NearShape], path: GeodesicPath) -> list[Crossing]:
    """The crossings of obstacles near a path, sorted by where they begin."""
    axis = shapely.LineString([(0.0, 0.0), (path.length_m, 0.0)])
    found: list[Crossing] = []
    for one in near:
        if one.crosses:
            found.extend(_cross(one.obstacle, one.plane, axis, path, one.shift))
    return sorted(found, key=lambda crossing: (crossing.from_m, crossing.to_m, crossing.obstacle.name))


def are_large(shapes: NDArray[np.object_]) -> NDArray[np.bool_]:
    """Shapes (n,) of which only the part beside a path is looked at."""
    return np.asarray((shapely.get_num_coordinates(shapes) > _MANY_VERTICES) | (_extent_deg(shapes) > 0.2))


def divided(shapes: NDArray[np.object_]) -> NDArray[np.object_]:
    """The same shapes with long edges divided, so that they stay straight in longitude and latitude."""
    short: NDArray[np.object_] = shapely.segmentize(shapes, _LONG_EDGE_DEG)
    return short


def _extent_deg(shapes: NDArray[np.object_]) -> Floats:
    bounds = shapely.bounds(shapes).reshape(-1, 4)
    extent: Floats = np.maximum(bounds[:, 2] - bounds[:, 0], bounds[:, 3] - bounds[:, 1])
    return extent


def _shifted(shape: BaseGeometry, degrees: float) -> BaseGeometry:
    return shapely.transform(shape, lambda points: points + np.array([degrees, 0.0]))


def _clipped(shape: BaseGeometry, frame: Floats) -> BaseGeometry:
    """The part of a large shape inside a frame, whichever way round the Earth the two meet."""
    part = shapely.clip_by_rect(shape, *frame)
    for degrees in (-360.0, 360.0):
        if not part.is_empty:
            break
        part = shapely.clip_by_rect(_shifted(shape, degrees), *frame)
    return part


def _to_plane(shapes: NDArray[np.object_], path: GeodesicPath) -> NDArray[np.object_]:
    """All shapes in (along, across), projected in one go."""
    points = shapely.get_coordinates(shapes)
    along, across = along_across(path, points[:, 1], points[:, 0])
    plane: NDArray[np.object_] = shapely.set_coordinates(
        np.array(shapes, dtype=object), np.column_stack((along, across))
    )
    return plane


def _cross(
    obstacle: Obstacle, shape: BaseGeometry, axis: shapely.LineString, path: GeodesicPath, shift: float
) -> list[Crossing]:
    if shape.is_empty:
        return []
    supports: Floats | None = None
    if isinstance(shape, shapely.Point):
        half = obstacle.radius_m**2 - shape.y**2
        if half < 0.0:
            return []
        ends = [(shape.x - half**0.5, shape.x + half**0.5)]
    elif obstacle.shape.geom_type == "LineString":
        ends = _intervals(shapely.buffer(shape, 0.5 * obstacle.width_m), axis)
        if obstacle.rule == "span" and ends:
            points = shapely.get_coordinates(obstacle.shape)
            supports = np.column_stack(along_across(path, points[:, 1], points[:, 0] + shift))
    else:
        ends = _intervals(shape, axis)
    found = (Crossing.between(obstacle, *one, length_m=path.length_m, supports=supports) for one in ends)
    return [crossing for crossing in found if crossing is not None]


def _intervals(area: BaseGeometry, axis: shapely.LineString) -> list[tuple[float, float]]:
    """Where an area covers the axis."""
    return intervals_of(common_of(area, axis))


def common_of(area: BaseGeometry, axis: BaseGeometry) -> BaseGeometry:
    """What an area has in common with the axis of a path."""
    try:
        return shapely.intersection(area, axis)
    except shapely.errors.GEOSException:
        return shapely.intersection(shapely.make_valid(area), axis)


def intervals_of(common: BaseGeometry) -> list[tuple[float, float]]:
    """Parts of an axis as intervals, sorted, touching ones joined."""
    if common.is_empty:
        return []
    parts = [shapely.bounds(part) for part in shapely.get_parts(np.array([common], dtype=object))]
    joined: list[tuple[float, float]] = []
    for start, stop in sorted((float(part[0]), float(part[2])) for part in parts):
        if joined and start <= joined[-1][1] + JOIN_M:
            joined[-1] = (joined[-1][0], max(joined[-1][1], stop))
        else:
            joined.append((start, stop))
    return joined
