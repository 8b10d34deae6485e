"""Obstacles for many paths at once: which obstacles touch which paths, and the crossings, as `obstacles` has them for one path.

What a path gets does not depend on what other paths are asked beside it. Opens nothing; knows nothing of radio.
"""

import threading
from dataclasses import dataclass
from typing import Final

import numpy as np
import shapely
from numpy.typing import NDArray

from fellspan.geodesy.geodesic import WGS84_GEOD
from fellspan.terrain.alongpath import METRES_PER_DEGREE, Floats, along_across_many, reach_boxes
from fellspan.terrain.obstacles import (
    JOIN_M,
    Crossing,
    Obstacle,
    ObstacleIndex,
    are_large,
    common_of,
    divided,
    intervals_of,
)

Index = NDArray[np.int64]

_ROUND: Final = 1.03
"""Buffers are polygons inside the round ones, by 2 %, and degrees of latitude differ by 1 %."""
_SLACK_M: Final = 5.0
_BESIDE_POLES_DEG: Final = 88.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Starts:
    """Paths (p,) as geodesics: where they leave, at which true bearing, and how long they are."""

    latitude_deg: Floats
    longitude_deg: Floats
    bearing_deg: Floats
    length_m: Floats

    def line(self, path: int) -> "_Line":
        """One of them."""
        return _Line(
            latitude_deg=float(self.latitude_deg[path]),
            longitude_deg=float(self.longitude_deg[path]),
            bearing_deg=float(self.bearing_deg[path]),
            length_m=float(self.length_m[path]),
        )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Line:
    """A geodesic of which a few positions are asked."""

    latitude_deg: float
    longitude_deg: float
    bearing_deg: float
    length_m: float

    def positions(self, distance_m: Floats) -> tuple[Floats, Floats]:
        """Latitudes and longitudes, degrees, at distances from A, the longitudes running on from that of A."""
        count = distance_m.size
        longitude, latitude, _ = WGS84_GEOD.fwd(
            np.full(count, self.longitude_deg),
            np.full(count, self.latitude_deg),
            np.full(count, self.bearing_deg),
            distance_m,
        )
        turn = np.mod(np.asarray(longitude) - self.longitude_deg + 180.0, 360.0) - 180.0
        return np.asarray(latitude), self.longitude_deg + turn


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Touched:
    """Obstacles that paths touch or pass close by, columns (k,), paths rising; `plane` as in `NearShape`."""

    path: Index
    obstacle: Index
    shift_deg: Floats
    plane: NDArray[np.object_]

    def rows(self, rows: Index) -> "Touched":
        """Some of them."""
        return Touched(
            path=self.path[rows],
            obstacle=self.obstacle[rows],
            shift_deg=self.shift_deg[rows],
            plane=self.plane[rows],
        )


class ManyObstacles(ObstacleIndex):
    """An index that is asked for many paths at once."""

    def __init__(self, obstacles: tuple[Obstacle, ...] | list[Obstacle]) -> None:
        super().__init__(obstacles)
        self._trees: dict[float, shapely.STRtree] = {}
        self._cached: _Divided | None = None
        self._making = threading.Lock()

    def touching(self, longitude_deg: Floats, latitude_deg: Floats, *, within_m: float) -> tuple[Index, Index, Floats]:
        """Which paths, nodes in arrays (p, m) two kilometres apart at most, come within some metres of which obstacles.

        Returns
        -------
        path, obstacle, shift_deg
            Shape (k,), paths rising: what may be so close, and what to add to the obstacle's longitudes to join the path's.
        """
        if not self.obstacles:
            return np.zeros(0, dtype=np.int64), np.zeros(0, dtype=np.int64), np.zeros(0)
        tree, west, east = self._tree_within(within_m)
        found: list[tuple[Index, Index, Floats]] = []
        for turn in (-360.0, 0.0, 360.0):
            moved = longitude_deg - turn
            some = np.flatnonzero((moved.max(axis=1) >= west) & (moved.min(axis=1) <= east))
            if some.size == 0:
                continue
            points = np.stack((moved[some], latitude_deg[some]), axis=-1)
            # Piece by piece: the box round a long oblique line holds half a town.
            pieces = shapely.linestrings(np.stack((points[:, :-1], points[:, 1:]), axis=2).reshape(-1, 2, 2))
            piece, obstacle = tree.query(pieces, predicate="intersects")
            path = some[piece // (points.shape[1] - 1)]
            found.append((path, obstacle.astype(np.int64), np.full(path.size, turn)))
        if not found:
            return np.zeros(0, dtype=np.int64), np.zeros(0, dtype=np.int64), np.zeros(0)
        path, obstacle, shift = (np.concatenate([one[column] for one in found]) for column in range(3))
        order = np.lexsort((shift, obstacle, path))
        path, obstacle, shift = path[order], obstacle[order], shift[order]
        first = np.ones(path.size, dtype=np.bool_)
        first[1:] = (np.diff(path) != 0) | (np.diff(obstacle) != 0)
        return path[first], obstacle[first], shift[first]

    def laid(self, starts: Starts, path: Index, obstacle: Index, shift_deg: Floats) -> Touched:
        """Obstacles (k,) in (along, across) of their paths, as `near` lays those of one path, projected in one go."""
        whole = self._divided
        shapes = whole.shapes[obstacle]
        for k in np.flatnonzero(whole.large[obstacle]).tolist():
            which = obstacle[k : k + 1]
            line = starts.line(int(path[k]))
            shapes[k] = self.cut(self._shapes[which], shift_deg[k : k + 1], self._reach[which], line)[0]
        points, of = shapely.get_coordinates(shapes, return_index=True)
        moved = points[:, 0] + np.where(whole.large[obstacle], 0.0, shift_deg)[of]
        owner = path[of]
        along, across = along_across_many(
            starts.latitude_deg[owner], starts.longitude_deg[owner], starts.bearing_deg[owner], points[:, 1], moved
        )
        plane: NDArray[np.object_] = shapely.set_coordinates(shapes, np.column_stack((along, across)))
        return Touched(path=path, obstacle=obstacle, shift_deg=shift_deg, plane=plane)

    def crossed(self, touched: Touched, starts: Starts) -> dict[int, list[Crossing]]:
        """The crossings of each path that has any, sorted as `crossings_of` sorts them."""
        bounds = shapely.bounds(touched.plane).reshape(-1, 4)
        reach = self._reach[touched.obstacle]
        with np.errstate(invalid="ignore"):  # NaN: nothing is left of a shape that was cut
            may = np.flatnonzero((bounds[:, 1] <= reach + JOIN_M) & (bounds[:, 3] >= -reach - JOIN_M))
        plane, length = touched.plane[may], starts.length_m[touched.path[may]]
        is_point, is_line = self._divided.is_point[touched.obstacle[may]], self._divided.is_line[touched.obstacle[may]]
        axis = np.zeros((may.size, 2, 2))
        axis[:, 1, 0] = length
        axes: NDArray[np.object_] = np.asarray(shapely.linestrings(axis), dtype=object)
        widths = np.array([0.5 * self.obstacles[one].width_m for one in touched.obstacle[may[is_line]].tolist()])
        plane[is_line] = shapely.buffer(plane[is_line], widths)
        whole = np.flatnonzero(~is_point)
        part, start, stop = _parts(_common(plane[whole], axes[whole]))
        points = np.flatnonzero(is_point)
        of_point, from_point, to_point = self._discs(points, plane, touched.obstacle[may])
        part = np.concatenate((whole[part], of_point))
        start, stop = np.concatenate((start, from_point)), np.concatenate((stop, to_point))
        supports = self._supports(touched, starts, np.unique(may[part[is_line[part]]]))
        found: dict[int, list[Crossing]] = {}
        for i, begin, end in zip(part.tolist(), start.tolist(), stop.tolist(), strict=True):
            k = int(may[i])
            obstacle, path = self.obstacles[int(touched.obstacle[k])], int(touched.path[k])
            crossing = Crossing.between(obstacle, begin, end, length_m=float(length[i]), supports=supports.get(k))
            if crossing is not None:
                found.setdefault(path, []).append(crossing)
        for crossings in found.values():
            crossings.sort(key=lambda one: (one.from_m, one.to_m, one.obstacle.name))
        return found

    def _supports(self, touched: Touched, starts: Starts, lines: Index) -> dict[int, Floats]:
        """Vertices of those of some lines that hang between supports, as (along, across) of their paths."""
        spans = np.array(
            [k for k in lines.tolist() if self.obstacles[int(touched.obstacle[k])].rule == "span"], dtype=int
        )
        points, of = shapely.get_coordinates(self._shapes[touched.obstacle[spans]], return_index=True)
        path = touched.path[spans][of]
        along, across = along_across_many(
            starts.latitude_deg[path],
            starts.longitude_deg[path],
            starts.bearing_deg[path],
            points[:, 1],
            points[:, 0] + touched.shift_deg[spans][of],
        )
        plane, ends = np.column_stack((along, across)), np.cumsum(np.bincount(of, minlength=spans.size))
        return dict(zip(spans.tolist(), np.split(plane, ends[:-1]), strict=True)) if spans.size else {}

    def _discs(self, points: Index, plane: NDArray[np.object_], obstacle: Index) -> tuple[Index, Floats, Floats]:
        """Which discs of some lie on the axis of their path, from where and to where."""
        radius = np.array([self.obstacles[one].radius_m for one in obstacle[points].tolist()])
        half = radius**2 - shapely.get_y(plane[points]) ** 2
        hit = np.flatnonzero(half >= 0.0)
        along, half = shapely.get_x(plane[points[hit]]), half[hit] ** 0.5
        return points[hit], along - half, along + half

    @property
    def _divided(self) -> "_Divided":
        with self._making:
            if self._cached is None:
                self._cached = _Divided.of(self._shapes)
            return self._cached

    def _tree_within(self, within_m: float) -> tuple[shapely.STRtree, float, float]:
        """A tree of the shapes so much wider all round, kept, and the least and greatest longitude in it."""
        with self._making:
            if within_m not in self._trees:
                wide = _widened(self._shapes, self._reach + within_m)
                self._trees[within_m] = shapely.STRtree(wide)
            tree = self._trees[within_m]
        west, _, east, _ = shapely.total_bounds(tree.geometries)
        return tree, float(west), float(east)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Divided:
    """Shapes with long edges divided, and what kinds they are; those that `cut` has to cut to a path, (n,), are `large`."""

    shapes: NDArray[np.object_]
    large: NDArray[np.bool_]
    is_point: NDArray[np.bool_]
    is_line: NDArray[np.bool_]

    @classmethod
    def of(cls, shapes: NDArray[np.object_]) -> "_Divided":
        kind = shapely.get_type_id(shapes)
        return cls(
            shapes=divided(shapes),
            large=are_large(shapes),
            is_point=kind == shapely.GeometryType.POINT,
            is_line=kind == shapely.GeometryType.LINESTRING,
        )


def _widened(shapes: NDArray[np.object_], by_m: Floats) -> NDArray[np.object_]:
    """Shapes in degrees, at least so much wider all round; all the way round the Earth beside a pole."""
    bounds = shapely.bounds(shapes).reshape(-1, 4)
    boxes = reach_boxes(bounds, by_m)
    frames = shapely.bounds(boxes).reshape(-1, 4)
    poleward = np.maximum(np.abs(frames[:, 1]), np.abs(frames[:, 3]))
    narrow = np.cos(np.radians(np.minimum(poleward, _BESIDE_POLES_DEG)))
    # Longitudes as long as latitudes are at the shape's own most poleward place: farther from the pole it is wider than asked.
    moved = _stretched(shapes, narrow)
    wide = _stretched(shapely.buffer(moved, (_ROUND * by_m + _SLACK_M) / METRES_PER_DEGREE, quad_segs=4), 1.0 / narrow)
    whole: NDArray[np.object_] = np.where(poleward < _BESIDE_POLES_DEG, wide, boxes)
    return whole


def _stretched(shapes: NDArray[np.object_], factor: Floats) -> NDArray[np.object_]:
    points, of = shapely.get_coordinates(shapes, return_index=True)
    points[:, 0] *= factor[of]
    stretched: NDArray[np.object_] = shapely.set_coordinates(np.array(shapes, dtype=object), points)
    return stretched


def _common(areas: NDArray[np.object_], axes: NDArray[np.object_]) -> NDArray[np.object_]:
    """What areas have in common with lines."""
    try:
        common: NDArray[np.object_] = shapely.intersection(areas, axes)
        return common
    except shapely.errors.GEOSException:
        return np.array([common_of(area, axis) for area, axis in zip(areas, axes, strict=True)], dtype=object)


def _parts(common: NDArray[np.object_]) -> tuple[Index, Floats, Floats]:
    """The parts of axes as intervals, touching ones joined: of which each is, its start and its stop, (i,)."""
    bounds = shapely.bounds(common).reshape(-1, 4)
    known = np.isfinite(bounds[:, 0])
    whole = np.isin(shapely.get_type_id(common), (shapely.GeometryType.POINT, shapely.GeometryType.LINESTRING))
    alone, several = np.flatnonzero(known & whole), np.flatnonzero(known & ~whole)
    joined = [(int(one), *span) for one in several for span in intervals_of(common[one])]
    more = np.array(joined, dtype=np.float64).reshape(-1, 3)
    return (
        np.concatenate((alone, more[:, 0].astype(np.int64))),
        np.concatenate((bounds[alone, 0], more[:, 1])),
        np.concatenate((bounds[alone, 2], more[:, 2])),
    )
