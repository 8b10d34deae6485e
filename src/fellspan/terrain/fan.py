"""What stands all around a place: terrain, cover and obstacles on rays that leave it, for skylines.

Rays are polar: a true bearing and a distance. Survey rows, hanging wires and what comes and goes (ships, cranes) are not looked
at. Knows no antenna and no k.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely.geometry.base import BaseGeometry

from fellspan.geodesy.geodesic import WGS84_GEOD, inverse_many
from fellspan.geodesy.position import Position
from fellspan.terrain.alongpath import Floats
from fellspan.terrain.assemble import Layers
from fellspan.terrain.cover import CoverLayer, combine
from fellspan.terrain.obstacles import Obstacle
from fellspan.terrain.terrain import Terrain
from fellspan.vocabulary import COVER_KINDS

_TREE: Final = COVER_KINDS.index("tree")
_NEAR_M: Final = 10.0
"""As on paths: without an outline, cover this near to the antenna counts as what it stands on."""
_TOUCH_M: Final = 0.01
_ROUND: Final = 8


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FanSample:
    """Heights at points of a fan, m above sea level, NaN where no raster reaches; arrays of the shape asked for."""

    surface_m: Floats
    ground_m: Floats
    is_tree: NDArray[np.bool_]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class FanObstacle:
    """An obstacle on rays of indices `ray` (r,); `distance_m` and `top_m` (r, 3) are its near edge, middle and far edge."""

    name: str
    ray: NDArray[np.intp]
    distance_m: Floats
    top_m: Floats


class Fan:
    """Rays from one place over opened terrain; what the place itself stands on does not stand on them."""

    def __init__(self, terrain: Terrain, at: Position) -> None:
        self._layers: Layers = terrain.layers
        self.at = at
        self.cell_m = min(stack.cell_m for stack in self._layers.stacks)
        self._near: list[tuple[Obstacle, BaseGeometry]] = []
        here = shapely.Point(0.0, 0.0)
        own = []
        for obstacle in self._layers.obstacles.obstacles:
            shape = self._plane(obstacle)
            if obstacle.kind == "building" and obstacle.rule != "span" and shape.distance(here) <= _TOUCH_M:
                own.append(shape)
            elif obstacle.rule != "span" and not obstacle.moves:
                self._near.append((obstacle, shape))
        self._own: BaseGeometry | None = shapely.union_all(own) if own else None

    def sample(self, bearing_deg: Floats, distance_m: Floats) -> FanSample:
        """Rasters at points, arrays of one shape. Gaps that are to be sea are sea, without a look at the shore."""
        bearing, distance = np.broadcast_arrays(bearing_deg, distance_m)
        flat_b, flat_d = np.array(bearing, dtype=np.float64).ravel(), np.array(distance, dtype=np.float64).ravel()
        start_lon, start_lat = np.full(flat_d.shape, self.at.longitude_deg), np.full(flat_d.shape, self.at.latitude_deg)
        longitude, latitude, _ = WGS84_GEOD.fwd(start_lon, start_lat, flat_b, flat_d)
        longitude, latitude = np.asarray(longitude), np.asarray(latitude)
        layers = self._layers
        ground: Floats = layers.ground.sample_positions(latitude, longitude).value_m
        if layers.gaps == "sea":
            ground = np.where(np.isfinite(ground), ground, layers.sea_level_m)
        covers = []
        for source, stack in layers.cover:
            found = stack.sample_positions(latitude, longitude)
            growth = source.growth_m_per_year * layers.growth_years
            covers.append(CoverLayer(kind=source.kind, value_m=found.value_m, sigma_m=found.sigma_m, growth_m=growth))
        above = layers.surface.sample_positions(latitude, longitude) if layers.surface is not None else None
        cover = combine(
            ground, covers, None if above is None else above.value_m, None if above is None else above.sigma_m
        )
        height = np.where(self.is_own(flat_b, flat_d, cover.kind), 0.0, cover.height_m)
        shape = bearing.shape
        return FanSample(
            surface_m=(ground + height).reshape(shape),
            ground_m=ground.reshape(shape),
            is_tree=((cover.kind == _TREE) & (height > 0.0)).reshape(shape),
        )

    def obstacles(self, bearing_deg: Floats, reach_m: float) -> list[FanObstacle]:
        """The obstacles of the user's files that rays of rising bearings, (m,), less than half a turn in all, meet.

        One that is too narrow for any ray is met on the ray nearest to it.
        """
        middle = float(bearing_deg[bearing_deg.size // 2])
        angle = bearing_deg - middle
        found = []
        for obstacle, shape in self._near:
            points = shapely.get_coordinates(shape)
            if points.size == 0 or float(np.hypot(points[:, 0], points[:, 1]).min()) > reach_m:
                continue
            seen = np.degrees(np.arctan2(points[:, 0], points[:, 1])) - middle
            seen = (seen + 180.0) % 360.0 - 180.0
            low, high = float(seen.min()), float(seen.max())
            around = high - low > 180.0  # it lies astride the far side, or around the place
            rays = np.flatnonzero((angle >= low) & (angle <= high) | around)
            along = bearing_deg[rays]
            if rays.size == 0 and angle[0] <= low and high <= angle[-1]:
                rays = np.array([np.argmin(np.abs(angle - 0.5 * (low + high)))])
                along = np.array([middle + 0.5 * (low + high)])
            if rays.size and (met := self._met(obstacle, shape, rays, along, reach_m)) is not None:
                found.append(met)
        return found

    def _met(
        self, obstacle: Obstacle, shape: BaseGeometry, rays: NDArray[np.intp], along_deg: Floats, reach_m: float
    ) -> FanObstacle | None:
        angle = np.radians(along_deg)
        ends = reach_m * np.column_stack((np.sin(angle), np.cos(angle)))
        lines = shapely.linestrings(np.stack((np.zeros_like(ends), ends), axis=1))
        points, which = shapely.get_coordinates(shapely.intersection(lines, shape), return_index=True)
        if which.size == 0:
            return None
        away = np.maximum(np.hypot(points[:, 0], points[:, 1]), 0.1)
        near, far = np.full(rays.size, np.inf), np.full(rays.size, -np.inf)
        np.minimum.at(near, which, away)
        np.maximum.at(far, which, away)
        hit = np.isfinite(near)
        rays, along_deg, near, far = rays[hit], along_deg[hit], near[hit], far[hit]
        distance = np.column_stack((near, 0.5 * (near + far), far))
        ground = self.sample(along_deg[:, None], distance).ground_m
        growth = obstacle.growth_m_per_year * self._layers.growth_years
        height = (obstacle.height_m if obstacle.height_m is not None else max(obstacle.heights_m or (0.0,))) + growth
        if obstacle.rule == "sea" and obstacle.top_amsl_m is not None:
            top = np.full(distance.shape, obstacle.top_amsl_m + growth)
        elif obstacle.rule == "follow":
            top = ground + height
        else:
            top = np.broadcast_to(np.fmax.reduce(ground, axis=1)[:, None] + height, distance.shape)
        return FanObstacle(name=obstacle.name, ray=rays, distance_m=distance, top_m=top)

    def _plane(self, obstacle: Obstacle) -> BaseGeometry:
        """Its shape in metres east and north, true in distance and bearing from the place."""
        points = shapely.get_coordinates(obstacle.shape)
        way = inverse_many(self.at.latitude_deg, self.at.longitude_deg, points[:, 1], points[:, 0])
        bearing = np.radians(way.bearing_ab_deg)
        east_north = np.column_stack((way.distance_m * np.sin(bearing), way.distance_m * np.cos(bearing)))
        shape: BaseGeometry = shapely.set_coordinates(shapely.transform(obstacle.shape, lambda xy: xy), east_north)
        return shape.buffer(obstacle.reach_m, quad_segs=_ROUND) if obstacle.reach_m > 0.0 else shape

    @property
    def stands_on_outline(self) -> bool:
        """Whether a building outline of the user's files holds the place."""
        return self._own is not None

    def is_own(self, bearing_deg: Floats, distance_m: Floats, kind: NDArray[np.int8]) -> NDArray[np.bool_]:
        """Whether cover at points, (n,), belongs to what the antenna stands on."""
        if self._own is None:
            return np.asarray(distance_m <= _NEAR_M)
        west, south, east, north = self._own.bounds
        near = distance_m <= max(abs(west), abs(south), abs(east), abs(north)) * 1.5
        own = near & (kind != _TREE)
        at = np.flatnonzero(own)
        angle = np.radians(bearing_deg[at])
        own[at] = shapely.contains_xy(self._own, distance_m[at] * np.sin(angle), distance_m[at] * np.cos(angle))
        return np.asarray(own)
