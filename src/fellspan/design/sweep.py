"""The sweep: for every cell around a site, how high the other antenna must stand so that everything asked is free.

Need is that of `links.clearance`; `sweep_kernel` answers it for whole rays, `terrain.surroundings` brings the rays, and cells
read their answers from them. Looks at rasters and obstacle files; survey rows, hanging wires and what moves are left to the
plan of a link, which decides. Knows no gains, no levels of signal and no pages.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Final

import numpy as np
from affine import Affine
from numpy.typing import NDArray

from fellspan.errors import LinkError, TerrainGapError
from fellspan.geodesy.geodesic import WGS84_GEOD, inverse_many
from fellspan.geodesy.position import Position
from fellspan.links.criteria import Criterion
from fellspan.links.ends import end_level
from fellspan.links.own_building import NEAR_M, NEAR_SHARE
from fellspan.links.site import Site
from fellspan.propagation.constants import EARTH_RADIUS_M, SPEED_OF_LIGHT_M_S
from fellspan.terrain.plates import Plane, in_threads
from fellspan.terrain.rays import CellGrid, Floats, Rays, rays_around
from fellspan.terrain.surroundings import Surroundings, grid_around

if TYPE_CHECKING:
    from fellspan.terrain.terrain import Terrain

_CHUNK_RAYS: Final = 48
_ROWS: Final = 64
MOST_SAMPLES: Final = 120_000_000
"""Of all rays together; 4 bytes each. More are avoided by coarser cells, with a note."""
QUICK_SAMPLES: Final = 30_000_000
"""Up to so many, samples and rays are closer together."""
_CLOSENESS: Final = ((0.25, 0.5), (0.5, 0.5), (0.5, 1.0), (1.0, 1.0))
"""Steps along rays and gaps between them, in cells, to choose from."""
Bounds = tuple[float, float, float, float]


@dataclass(frozen=True, kw_only=True, eq=False)
class HeightField:
    """Heights that the other antenna needs, on a grid of cells; arrays (rows, columns), read-only.

    `transform` takes column and row, from the outer corner of the first cell, to `crs`.
    """

    needed_m: Plane
    """Least height above ground at which every criterion holds, m, 0 or more; NaN where no data or out of reach."""
    ground_m: Plane
    """Ground at the cell's centre, m above sea level; NaN where there is none."""
    sight_needed_m: Plane | None
    """As `needed_m`, for the bare sight line at `sight_k`; None where not asked."""
    transform: Affine
    crs: str
    cell_m: float
    """Shorter side of a cell on the ground, m."""
    site: Site
    antenna_amsl_m: float
    criteria: tuple[Criterion, ...]
    frequency_hz: float
    radius_m: float
    notes: tuple[str, ...]
    """What a person must know: what was coarsened, what was left out."""

    @cached_property
    def distance_m(self) -> Plane:
        """From the site, m; worked out when asked for."""
        from fellspan.terrain.rays_kernel import cell_distances

        easts, norths, columns = self.grid.around(self.site.position, cell_m=self.cell_m)
        distance = np.empty(self.shape, dtype=np.float32)

        def work(first: int) -> None:
            part = slice(first, first + _ROWS)
            cell_distances(easts[part], norths[part], columns, distance[part])

        in_threads(work, range(0, self.shape[0], _ROWS))
        distance.flags.writeable = False
        return distance

    @property
    def shape(self) -> tuple[int, int]:
        """Rows and columns."""
        return self.needed_m.shape[0], self.needed_m.shape[1]

    @property
    def grid(self) -> CellGrid:
        """The grid as such."""
        rows, columns = self.shape
        return CellGrid(transform=self.transform, crs_text=self.crs, rows=rows, columns=columns)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PolarField:
    """The answer on the rays themselves: `level_m` (rays, targets) m above sea level, NaN beyond gaps.

    `ground_m`, `surface_m` (rays, samples) are what it was asked over.
    """

    rays: Rays
    level_m: Floats
    ground_m: Floats
    surface_m: Floats
    antenna_amsl_m: float


def height_field(
    terrain: "Terrain",
    *,
    site: Site,
    frequency_hz: float,
    criteria: Sequence[Criterion],
    radius_m: float,
    cell_m: float | None = None,
    window: Bounds | None = None,
    sight_k: float | None = None,
) -> HeightField:
    """The height that the other end needs at every cell around a site.

    Parameters
    ----------
    criteria
        All must hold; the same ones at every distance.
    radius_m
        How far to look, m, > 0.
    cell_m
        For a coarse answer, cells up to this wide; rays are then as far apart at the rim, but miss nothing along themselves.
        None for the ground raster's own cells.
    window
        West, south, east, north, degrees: only these cells, and only the rays that reach them.
    sight_k
        Ask for the bare sight line too, at this k.

    Raises
    ------
    LinkError
        Radius, frequency or criteria make no sense.
    TerrainGapError
        The ground at the site is not known, or nothing within the radius lies in the window.
    """
    _check(frequency_hz, criteria, radius_m)
    antenna = site_level_m(terrain, site)
    at = site.position
    finest = min(stack.cell_m for stack in terrain.layers.stacks)
    wanted = cell_m
    while True:
        grid, side_m = grid_around(terrain, at, reach_m=radius_m, cell_m=wanted, bounds=window)
        reach_m, sector = _reach(at, grid, radius_m) if window is not None else (radius_m, None)
        rays = _rays(at, reach_m=reach_m, sample_m=finest, cell_m=side_m, sector_deg=sector)
        if max(rays.held * rays.count, grid.rows * grid.columns) <= MOST_SAMPLES:
            break
        wanted, finest = 2.0 * side_m, max(finest, 0.5 * side_m)
    notes = []
    if wanted != cell_m:
        notes.append(f"cells of {side_m:.3g} m: finer ones would not fit into memory over so wide an area")
    around = Surroundings(terrain, rays)
    if around.factor > 1:
        notes.append(f"heights were joined {around.factor} by {around.factor} cells, the highest of each counts")
    rules = _rules(criteria, frequency_hz)
    asked = [rules] if sight_k is None else [rules, _rules_of([0.0], [sight_k], frequency_hz)]
    polars = _swept(around, antenna, asked)
    ground = around.ground_of(grid)
    needed = [_to_cells(polar, rays, grid, at, side_m, ground) for polar in polars]
    for array in (*needed, ground):
        array.flags.writeable = False
    return HeightField(
        needed_m=needed[0],
        ground_m=ground,
        sight_needed_m=needed[1] if sight_k is not None else None,
        transform=grid.transform,
        crs=grid.crs_text,
        cell_m=side_m,
        site=site,
        antenna_amsl_m=antenna,
        criteria=tuple(criteria),
        frequency_hz=frequency_hz,
        radius_m=radius_m,
        notes=(*notes, *around.notes),
    )


def _rays(
    at: Position, *, reach_m: float, sample_m: float, cell_m: float, sector_deg: tuple[float, float] | None
) -> Rays:
    """Samples as close as a quarter of the finest cell, and rays half a cell apart, while that is quick; else coarser."""
    for along, beside in _CLOSENESS:
        step_m, apart_m = along * sample_m, beside * cell_m
        rays = rays_around(at, reach_m=reach_m, step_m=step_m, apart_m=apart_m, sector_deg=sector_deg)
        if rays.held * rays.count <= QUICK_SAMPLES:
            break
    return rays


def polar_field(
    terrain: "Terrain",
    *,
    site: Site,
    frequency_hz: float,
    criteria: Sequence[Criterion],
    radius_m: float,
    step_m: float,
    rays: int,
) -> PolarField:
    """The answer on `rays` rays, samples every `step_m`: for these, what `links.clearance` says, within rounding."""
    _check(frequency_hz, criteria, radius_m)
    antenna = site_level_m(terrain, site)
    fan = rays_around(site.position, reach_m=radius_m, step_m=step_m, apart_m=2.0 * math.pi * radius_m / rays)
    around = Surroundings(terrain, fan)
    samples = around.samples(0, fan.held)
    level = np.empty((fan.held, fan.count))
    _sweep(
        around, samples.ground_m, samples.surface_m, samples.has_cover, antenna, _rules(criteria, frequency_hz), level
    )
    return PolarField(
        rays=fan, level_m=level, ground_m=samples.ground_m, surface_m=samples.surface_m, antenna_amsl_m=antenna
    )


def site_level_m(terrain: "Terrain", site: Site) -> float:
    """Level of a site's antenna, m above sea level, as for a link that leaves it.

    Raises
    ------
    TerrainGapError
        There is no ground at the site.
    LinkError, VerticalDatumError
        As `links.ends.end_level`.
    """
    at = site.position
    longitude, latitude, _ = WGS84_GEOD.fwd(at.longitude_deg, at.latitude_deg, 90.0, 150.0)
    beside = Position(latitude_deg=float(latitude), longitude_deg=float(longitude))
    profile = next(terrain.iter_profiles([(at, beside)]))
    if not math.isfinite(profile.ground_m[0]):
        raise TerrainGapError(
            f"the terrain has no data at '{site.name}', {at.latitude_deg:.5f}, {at.longitude_deg:.5f}",
            "latitude comes first; add a raster that covers the site",
        )
    return end_level(site, profile, end="A").antenna_amsl_m


def _check(frequency_hz: float, criteria: Sequence[Criterion], radius_m: float) -> None:
    if not (math.isfinite(radius_m) and radius_m > 0.0):
        raise LinkError(f"radius {radius_m:g} m is not a distance above 0", "10 km and 30 km are usual")
    if not (math.isfinite(frequency_hz) and frequency_hz > 0.0):
        raise LinkError(f"frequency {frequency_hz:g} Hz must be above 0", "as in 5.8 GHz")
    if not criteria:
        raise LinkError("no criterion is given", "at least one says what is to be free")


def _rules(criteria: Sequence[Criterion], frequency_hz: float) -> tuple[Floats, Floats]:
    return _rules_of([item.fraction for item in criteria], [item.k for item in criteria], frequency_hz)


def _rules_of(fractions: Sequence[float], ks: Sequence[float], frequency_hz: float) -> tuple[Floats, Floats]:
    """What the kernel asks for: fraction * sqrt(wavelength), and 1 / (2 k a)."""
    roots = np.array(fractions, dtype=np.float64) * math.sqrt(SPEED_OF_LIGHT_M_S / frequency_hz)
    flats = 1.0 / np.array(ks, dtype=np.float64) / (2.0 * EARTH_RADIUS_M)
    return roots, flats


def _sweep(
    around: Surroundings,
    ground: Floats,
    surface: Floats,
    has_cover: bool,
    antenna: float,
    rules: tuple[Floats, Floats],
    level: NDArray[np.float32] | Floats,
) -> None:
    from fellspan.design.sweep_kernel import sweep

    own_m = 0.0 if around.stands_on_outline else NEAR_M
    rays = around.rays
    sweep(rays.distance_m, rays.target, ground, surface, has_cover, antenna, *rules, own_m, NEAR_M, NEAR_SHARE, level)


def _swept(around: Surroundings, antenna: float, asked: Sequence[tuple[Floats, Floats]]) -> list[Plane]:
    rays = around.rays
    again = 1 if rays.is_whole else 0
    polars = [np.empty((rays.held + again, rays.count), dtype=np.float32) for _ in asked]

    def work(first: int) -> None:
        last = min(first + _CHUNK_RAYS, rays.held)
        samples = around.samples(first, last)
        for rules, polar in zip(asked, polars, strict=True):
            _sweep(around, samples.ground_m, samples.surface_m, samples.has_cover, antenna, rules, polar[first:last])

    in_threads(work, range(0, rays.held, _CHUNK_RAYS))
    for polar in polars if again else ():
        polar[-1] = polar[0]
    return polars


def _to_cells(polar: Plane, rays: Rays, grid: CellGrid, at: Position, cell_m: float, ground: Plane) -> Plane:
    from fellspan.terrain.rays_kernel import arctangent, cells_from_rays

    easts, norths, columns = grid.around(at, cell_m=cell_m)
    waves = arctangent(rays.whole)
    needed = np.empty(ground.shape, dtype=np.float32)

    def work(first: int) -> None:
        part = slice(first, first + _ROWS)
        cells_from_rays(
            polar,
            rays.first,
            rays.whole,
            rays.step_m,
            rays.reach_m,
            easts[part],
            norths[part],
            columns,
            waves,
            ground[part],
            needed[part],
        )

    in_threads(work, range(0, grid.rows, _ROWS))
    return needed


def _reach(at: Position, grid: CellGrid, radius_m: float) -> tuple[float, tuple[float, float] | None]:
    """How far, and between which bearings, rays must go to reach all cells of a grid."""
    down, across = np.linspace(0.0, grid.rows, 17), np.linspace(0.0, grid.columns, 17)
    columns = np.concatenate((across, across, 0.0 * down, 0.0 * down + grid.columns))
    rows = np.concatenate((0.0 * across, 0.0 * across + grid.rows, down, down))
    way = inverse_many(at.latitude_deg, at.longitude_deg, *grid.positions(columns, rows))
    middle = inverse_many(
        at.latitude_deg, at.longitude_deg, *grid.positions(np.array([grid.columns / 2.0]), np.array([grid.rows / 2.0]))
    )
    reach = min(radius_m, float(way.distance_m.max()) * 1.001)
    ahead = float(middle.bearing_ab_deg[0])
    offset = (way.bearing_ab_deg - ahead + 180.0) % 360.0 - 180.0
    if float(way.distance_m.min()) <= 0.02 * float(way.distance_m.max()) or np.ptp(offset) > 170.0:
        return reach, None
    return reach, (ahead + float(offset.min()) - 1.0, ahead + float(offset.max()) + 1.0)
