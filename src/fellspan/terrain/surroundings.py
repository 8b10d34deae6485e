"""What stands on rays around a place, and the ground of cells around it, from everything that a Terrain has opened.

Rasters are read once, as plates. Survey rows, hanging wires and what comes and goes are not looked at, as with skylines. Knows
no antenna, no frequency and no k.
"""

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Final

import numpy as np
from affine import Affine
from numpy.typing import NDArray

from fellspan.errors import TerrainGapError
from fellspan.geodesy.position import Position
from fellspan.terrain.cover import CoverLayer, combine
from fellspan.terrain.fan import Fan
from fellspan.terrain.handles import HandlePool
from fellspan.terrain.placing import to_crs
from fellspan.terrain.plates import MOST_CELLS, Plane, Plate, read_plate
from fellspan.terrain.raster_file import RasterFile, chained, on_plane
from fellspan.terrain.rays import CellGrid, Floats, Rays
from fellspan.terrain.stack import RasterStack
from fellspan.terrain.terrain import Terrain

_SEAM_RAYS, _SEAM_STEPS = 32, 12
_QUADRANTS: Final = 4
_MOST_OUTLINES: Final = 5_000
"""Obstacles of files looked at around one place; with more, none is, and that is said."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RaySamples:
    """Heights on some rays, (m, n), m above sea level, NaN in gaps; `surface_m` is `ground_m` itself without cover."""

    ground_m: Floats
    surface_m: Floats
    has_cover: bool


class Surroundings:
    """Rasters around a place in memory, sampled along rays and at cells. Safe to use from several threads."""

    def __init__(self, terrain: Terrain, rays: Rays, *, sample_seams: bool = True) -> None:
        self.rays = rays
        self._layers = terrain.layers
        layers = self._layers
        handles = HandlePool()
        try:
            self._ground = _plates(layers.ground, rays, handles)
            self._surface = None if layers.surface is None else _plates(layers.surface, rays, handles)
            self._cover = [(source, stack, _plates(stack, rays, handles)) for source, stack in layers.cover]
        finally:
            handles.close()
        self._fan = Fan(terrain, rays.at)
        self.notes: tuple[str, ...] = ()
        self._tops = self._obstacle_tops() if layers.obstacles.obstacles else None
        if sample_seams and len(layers.ground.files) > 1:
            _check_seams(layers.ground, rays)

    @property
    def stands_on_outline(self) -> bool:
        """Whether a building outline of the user's files holds the place."""
        return self._fan.stands_on_outline

    @property
    def factor(self) -> int:
        """How many cells of the ground raster make one of its plate's, along either side."""
        return max((plate.factor for plate, *_ in self._ground), default=1)

    def samples(self, first: int, last: int) -> RaySamples:
        """On rays `first` to `last` (not included) of those held."""
        layers = self._layers
        ground = _gathered(self._ground, self.rays, first, last)
        if layers.gaps == "sea":
            np.copyto(ground, layers.sea_level_m, where=np.isnan(ground))
        if not self._cover and self._surface is None and self._tops is None:
            return RaySamples(ground_m=ground, surface_m=ground, has_cover=False)
        surface = ground
        if self._cover or self._surface is not None:
            covers = []
            for source, stack, plates in self._cover:
                found = _gathered(plates, self.rays, first, last)
                growth = source.growth_m_per_year * layers.growth_years
                sigma = np.broadcast_to(np.float64(stack.files[0].sigma_m), found.shape)
                covers.append(CoverLayer(kind=source.kind, value_m=found, sigma_m=sigma, growth_m=growth))
            above = None if self._surface is None else _gathered(self._surface, self.rays, first, last)
            cover = combine(ground, covers, above, None if above is None else np.zeros(above.shape))
            height = cover.height_m
            if self._fan.stands_on_outline:
                bearing = np.broadcast_to(self.rays.bearing_deg[first:last, None], ground.shape)
                away = np.broadcast_to(self.rays.distance_m, ground.shape)
                own = self._fan.is_own(bearing.ravel(), away.ravel(), cover.kind.ravel()).reshape(ground.shape)
                height = np.where(own, 0.0, height)
            surface = ground + height
        if self._tops is not None:
            surface = surface.copy()
            at = slice(*np.searchsorted(self._tops.ray, (first, last)))
            tops = self._tops
            for ray, near, far, top in zip(
                tops.ray[at] - first, tops.near[at], tops.far[at], tops.top_m[at], strict=True
            ):
                part = surface[ray, near : far + 1]
                np.maximum(part, np.linspace(top[0], top[2], part.size) if part.size > 1 else top.max(), out=part)
        return RaySamples(ground_m=ground, surface_m=surface, has_cover=True)

    def ground_of(self, grid: CellGrid) -> Plane:
        """Ground at the centres of cells, (rows, columns), m above sea level, NaN where there is none or out of reach."""
        from fellspan.terrain.rays_kernel import gather_cells

        if len(self._ground) == 1 and self._layers.gaps != "sea":
            plate = self._ground[0][0]
            if (
                view := _view(plate, chained(~plate.file.transform, _shifted(grid.transform, plate.file, grid)), grid)
            ) is not None:
                return view
        out = np.full((grid.rows, grid.columns), np.nan, dtype=np.float32)
        abroad = []
        for plate, *_ in self._ground:
            file = plate.file
            if file.crs_text != grid.crs_text:
                abroad.append(plate)
                continue
            size = plate.width, plate.height, float(plate.left), float(plate.top)
            for turn in (0.0,) if file.period is None else (0.0, -file.period, file.period):
                placed = chained(Affine.translation(turn, 0.0), _shifted(grid.transform, file, grid))
                scaled = chained(Affine.scale(1.0 / plate.factor), chained(~file.transform, placed))
                if not _copied(plate, scaled, grid, out):
                    gather_cells(plate.heights, np.array(scaled[:6], dtype=np.float64), *size, out)
        if abroad:
            self._from_abroad(grid, out)
        if self._layers.gaps == "sea":
            np.copyto(out, np.float32(self._layers.sea_level_m), where=np.isnan(out))
        return out

    def _from_abroad(self, grid: CellGrid, out: Plane) -> None:
        """Fill from rasters in other coordinate systems, each cell by its position; slow, but seldom asked."""
        for row in range(0, grid.rows, 64):
            part = out[row : row + 64]
            rows, columns = np.nonzero(np.isnan(part))
            if rows.size:
                latitude, longitude = grid.positions(np.asarray(columns + 0.5), np.asarray(rows + row + 0.5))
                found = self._layers.ground.sample_positions(latitude, longitude)
                part[rows, columns] = found.value_m.astype(np.float32)

    def _obstacle_tops(self) -> "_Tops | None":
        if len(self._layers.obstacles.obstacles) > _MOST_OUTLINES:
            count = len(self._layers.obstacles.obstacles)
            self.notes += (
                f"the {count} obstacles of files were left out: more than {_MOST_OUTLINES} around one place",
            )
            return None
        rays, found = self.rays, []
        edges = np.linspace(0, rays.held, _QUADRANTS + 1).astype(int)
        for low, high in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
            if high == low:
                continue
            for obstacle in self._fan.obstacles(rays.bearing_deg[low:high], rays.reach_m):
                found.append((obstacle.ray + low, obstacle.distance_m, obstacle.top_m))
        if not found:
            return None
        ray = np.concatenate([item[0] for item in found])
        distance, top = (np.concatenate([item[i] for item in found]) for i in (1, 2))
        known = np.isfinite(top).all(axis=1)
        order = np.argsort(ray[known], kind="stable")
        ray, distance, top = ray[known][order], distance[known][order], top[known][order]
        # the samples inside, and for one too narrow for any the next one
        near = np.searchsorted(rays.distance_m, distance[:, 0], side="left")
        far = np.searchsorted(rays.distance_m, distance[:, 2], side="right") - 1
        return _Tops(ray=ray, near=near, far=np.maximum(near, far), top_m=top)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Tops:
    """Obstacles on rays, (r,), sorted by ray: samples from `near` to `far`, tops (r, 3)."""

    ray: NDArray[np.intp]
    near: NDArray[np.intp]
    far: NDArray[np.intp]
    top_m: Floats


_Placed = tuple[Plate, Floats, Floats]


def _plates(stack: RasterStack, rays: Rays, handles: HandlePool) -> list[_Placed]:
    """What rays meet of each raster of a stack, finest first."""
    found = []
    for file in stack.files:
        columns, rows = rays.in_cells(file)
        share = np.linspace(0.0, 1.0, 9)
        at_columns, at_rows = (np.stack([_along(p, t) for t in share]) for p in (columns, rows))
        for shift in _turns(file, float(at_columns.min()), float(at_columns.max())):
            plate = read_plate(
                file,
                handles,
                columns=(float(at_columns.min()) + shift - 1.0, float(at_columns.max()) + shift + 1.0),
                rows=(float(at_rows.min()) - 1.0, float(at_rows.max()) + 1.0),
                most_cells=MOST_CELLS,
            )
            if plate is not None:
                moved = columns.copy()
                moved[:, -1] += shift
                found.append((plate, moved / plate.factor, rows / plate.factor))
    return found


def _turns(file: RasterFile, low: float, high: float) -> Iterable[float]:
    """By how many columns rays may be shifted to meet a raster again, a whole turn east or west."""
    if file.period is None:
        return (0.0,)
    turn = file.period / abs(file.transform.a) if file.transform.a else 0.0
    return [shift for shift in (0.0, -turn, turn) if high + shift >= 0.0 and low + shift <= file.width]


def _along(polynomials: Floats, share: float) -> Floats:
    value = polynomials[:, 0]
    for power in range(1, polynomials.shape[1]):
        value = value * share + polynomials[:, power]
    return value


def _gathered(plates: list[_Placed], rays: Rays, first: int, last: int) -> Floats:
    from fellspan.terrain.rays_kernel import gather

    out = np.empty((last - first, rays.share.size))
    if not plates:
        out[:] = np.nan
    is_new = True
    for plate, columns, rows in plates:
        size = plate.width, plate.height, float(plate.left), float(plate.top)
        gather(plate.heights, rays.share, columns[first:last], rows[first:last], *size, out, is_new)
        is_new = False
    return out


def _view(plate: Plate, to_file: Affine, grid: CellGrid) -> Plane | None:
    """The plate's own cells, where they are the grid's and hold all of it."""
    if plate.file.crs_text != grid.crs_text or plate.factor != 1 or (at := _offset(to_file, grid)) is None:
        return None
    column, row = at[0] - plate.left, at[1] - plate.top
    high, wide = plate.heights.shape
    if column < 0 or row < 0 or column + grid.columns > wide or row + grid.rows > high:
        return None
    return plate.heights[row : row + grid.rows, column : column + grid.columns].view()


def _offset(to_cells: Affine, grid: CellGrid) -> tuple[int, int] | None:
    """Column and row of the grid's first cell, where its cells are those that `to_cells` leads to."""
    t = to_cells
    if max(abs(t.a - 1.0), abs(t.e - 1.0), abs(t.b), abs(t.d)) * max(grid.rows, grid.columns) > 1e-6:
        return None
    column, row = round(t.c), round(t.f)
    return (column, row) if max(abs(t.c - column), abs(t.f - row)) <= 1e-6 else None


def _copied(plate: Plate, to_plate: Affine, grid: CellGrid, out: Plane) -> bool:
    """Copy cells over where the grid's are the plate's own; False where they are not."""
    at = _offset(to_plate, grid)
    if at is None:
        return False
    column, row = at[0] - plate.left, at[1] - plate.top
    high, wide = plate.heights.shape
    top, bottom = max(0, -row), min(out.shape[0], high - row)
    left, right = max(0, -column), min(out.shape[1], wide - column)
    if top < bottom and left < right:
        part = out[top:bottom, left:right]
        np.copyto(part, plate.heights[top + row : bottom + row, left + column : right + column], where=np.isnan(part))
    return True


def _shifted(transform: Affine, file: RasterFile, grid: CellGrid) -> Affine:
    """The grid's transform, whole turns moved so that its middle lies nearest to the raster's."""
    if file.period is None:
        return transform
    x, _ = on_plane(transform, np.array(grid.columns / 2.0), np.array(grid.rows / 2.0))
    turns = round(((file.bounds[0] + file.bounds[2]) / 2.0 - float(x)) / file.period)
    return chained(Affine.translation(turns * file.period, 0.0), transform)


def _check_seams(stack: RasterStack, rays: Rays) -> None:
    """Sample a few places, so that rasters that disagree are refused as they are under a path."""
    from fellspan.geodesy.geodesic import WGS84_GEOD

    bearing, away = np.meshgrid(
        np.linspace(rays.bearing_deg[0], rays.bearing_deg[-1], _SEAM_RAYS), np.linspace(0.0, rays.reach_m, _SEAM_STEPS)
    )
    start = np.full(bearing.size, rays.at.longitude_deg), np.full(bearing.size, rays.at.latitude_deg)
    longitude, latitude, _ = WGS84_GEOD.fwd(*start, bearing.ravel(), away.ravel())
    stack.sample_positions(np.asarray(latitude), np.asarray(longitude))


def grid_around(
    terrain: Terrain,
    at: Position,
    *,
    reach_m: float,
    cell_m: float | None = None,
    bounds: tuple[float, float, float, float] | None = None,
) -> tuple[CellGrid, float]:
    """The ground raster's own cells within reach of a place, or squares of them at most `cell_m` wide; and a cell's side, m.

    `bounds` (west, south, east, north, degrees) leaves out what lies outside.

    Raises
    ------
    TerrainGapError
        No ground raster holds the place, or nothing within reach lies within the bounds.
    """
    file = _file_at(terrain.layers.ground, at)
    x, y = to_crs(file.crs_text, np.array([at.latitude_deg]), np.array([at.longitude_deg]))
    rays = Rays(at=at, whole=360, first=0, held=360, step_m=reach_m / 16.0, count=16)
    columns, rows = rays.in_cells(file)
    low_c, high_c, low_r, high_r = math.inf, -math.inf, math.inf, -math.inf
    for share in (0.0, 0.5, 1.0):
        c, r = _along(columns, share), _along(rows, share)
        low_c, high_c = min(low_c, float(c.min())), max(high_c, float(c.max()))
        low_r, high_r = min(low_r, float(r.min())), max(high_r, float(r.max()))
    if bounds is not None:
        west, south, east, north = bounds
        side = np.linspace(0.0, 1.0, 33)
        longitude = np.concatenate(
            (west + side * (east - west), west + side * (east - west), 0 * side + west, 0 * side + east)
        )
        latitude = np.concatenate(
            (0 * side + south, 0 * side + north, south + side * (north - south), south + side * (north - south))
        )
        edge_x, edge_y = to_crs(file.crs_text, latitude, longitude)
        if file.period is not None:
            edge_x = edge_x - file.period * np.round((edge_x - x) / file.period)
            columns_shift = file.period * np.round(((file.bounds[0] + file.bounds[2]) / 2.0 - x) / file.period)
            edge_x = edge_x + columns_shift
        c, r = on_plane(~file.transform, edge_x, edge_y)
        low_c, high_c = max(low_c, float(np.nanmin(c))), min(high_c, float(np.nanmax(c)))
        low_r, high_r = max(low_r, float(np.nanmin(r))), min(high_r, float(np.nanmax(r)))
    own_m = file.cell_at_m(float(x[0]), float(y[0]))
    factor = 1 if cell_m is None else max(1, math.floor(cell_m / max(own_m) + 0.02))
    left, top = math.floor(low_c / factor) * factor, math.floor(low_r / factor) * factor
    wide, high = math.ceil((high_c - left) / factor), math.ceil((high_r - top) / factor)
    if wide < 1 or high < 1:
        raise TerrainGapError(
            f"nothing within {reach_m / 1000:.3g} km of {at.latitude_deg:.5f}, {at.longitude_deg:.5f} lies in the area",
            "choose a larger radius or another area",
        )
    transform = chained(chained(file.transform, Affine.translation(left, top)), Affine.scale(factor))
    grid = CellGrid(transform=transform, crs_text=file.crs_text, rows=high, columns=wide)
    return grid, min(own_m) * factor


def _file_at(stack: RasterStack, at: Position) -> RasterFile:
    found = stack.sample_positions([at.latitude_deg], [at.longitude_deg])
    number = int(found.source[0])
    return stack.files[number if number >= 0 else 0]
