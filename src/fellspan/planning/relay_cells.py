"""Where a relay could stand, cell by cell: the sweeps of both ends met, water and forbidden ground taken out.

Rasters of any size: where the ground between the ends holds more cells than fit at once, a coarse sweep says which parts
are worth a fine one, and those are swept in the raster's own cells. Judges nothing: what it lets through is judged by the
functions of `plan`. Knows nothing of reports.
"""

import dataclasses
import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import shapely
from affine import Affine
from numpy.typing import NDArray
from scipy.ndimage import binary_dilation, maximum_filter
from shapely.geometry.base import BaseGeometry

from fellspan.design.relay_picks import thinned
from fellspan.design.sweep import Bounds, HeightField, height_field
from fellspan.errors import TerrainGapError
from fellspan.geodesy.geodesic import destination, inverse_many
from fellspan.geodesy.transforms import WGS84, crs_of, transformer
from fellspan.links.criteria import Criterion, criteria_for
from fellspan.links.site import Link, Site
from fellspan.planning.inputs import Study
from fellspan.planning.water import water_of
from fellspan.screening.pairs import HEIGHT_REFERENCES, Floats, SiteColumns
from fellspan.terrain.raster_file import on_plane
from fellspan.terrain.terrain import Terrain

SLACK_M: Final = 2.0
"""Cells take their height from the rays beside them; what the sweeps miss by less than this is judged all the same."""
COARSE_SLACK_M: Final = 5.0
"""The same for a coarse sweep, on top of what the ground rises within a coarse cell and its neighbours."""
FINE_CELLS: Final = 16_000_000
"""Most cells of one fine sweep; ground with more is swept coarsely first."""
_COARSE_CELLS: Final = 4_000_000
_PART: Final = 2048
"""Side of a part that is swept finely, in fine cells: large, since every part is swept from the ends on."""
_KEPT: Final = 200_000
"""Cells kept of all parts of a big raster, the best of each block."""
_LEAST: Final = 200
"""Cells kept of a part at least."""
_GROUND: Final = HEIGHT_REFERENCES.index("ground")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Cells:
    """Cells that the sweeps let through, shape (n,), and the grid that `row` and `column` count in."""

    row: NDArray[np.int64]
    column: NDArray[np.int64]
    latitude_deg: Floats
    longitude_deg: Floats
    x_m: Floats
    y_m: Floats
    """On a plane at the middle of the link, m: good for distances between places."""
    ground_m: Floats
    spare_m: Floats
    """Mast height less what the sweeps ask, m."""
    transform: Affine
    crs: str
    shape: tuple[int, int]
    cell_area_m2: float
    looked_at: int
    whole: bool = True
    """Whether these are all that the sweeps let through."""
    seen: NDArray[np.bool_] | None = None
    """Where not `whole`: cells of the grid in which something passes the sweeps, kept or not."""
    seen_cells: int = 0
    """How many fine cells that is."""

    def chosen(self, which: NDArray[np.int64] | NDArray[np.bool_]) -> "Cells":
        """Some of them."""
        arrays = ("row", "column", "latitude_deg", "longitude_deg", "x_m", "y_m", "ground_m", "spare_m")
        return dataclasses.replace(self, **{name: getattr(self, name)[which] for name in arrays})

    def columns(self, mast_m: float) -> SiteColumns:
        """The cells as places with a mast of this height above ground."""
        count = self.row.size
        return SiteColumns(
            name=tuple(f"{row}/{column}" for row, column in zip(self.row.tolist(), self.column.tolist(), strict=True)),
            latitude_deg=self.latitude_deg,
            longitude_deg=self.longitude_deg,
            height_m=np.full(count, mast_m),
            height_reference=np.full(count, _GROUND, dtype=np.int8),
            roof_m=np.full(count, np.nan),
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class Ground:
    """Where to look: from which ends, how far, with how much mast, and where a relay may stand."""

    study: Study
    link: Link
    ends: tuple[Site, ...]
    hop_m: float
    mast_m: float
    area: BaseGeometry | None
    terrain: Terrain

    def sweep(self, site: Site, window: Bounds, *, cell_m: float | None = None) -> HeightField:
        """What height the other end of a hop from this site would need."""
        return height_field(
            self.terrain,
            site=site,
            frequency_hz=min(self.link.radio.transmit_hz),
            criteria=first_criteria(self.study),
            radius_m=self.hop_m,
            cell_m=cell_m,
            window=window,
        )


def first_criteria(study: Study) -> tuple[Criterion, ...]:
    """The criteria that ask the same of every path, whatever its length: no cell that fails them can be clear."""
    if study.criteria:
        return study.criteria
    return criteria_for(study.preset, distance_m=1.0, median_k=study.median_k)[:1]


def cells_between(ground: Ground) -> Cells:
    """Cells at which the mast satisfies the sweep of every end, water and what lies outside the area taken out.

    Raises
    ------
    TerrainGapError
        The ground at an end is not known, or no raster holds anything within reach of all ends.
    """
    window = _window(ground)
    finest_m = min(stack.cell_m for stack in ground.terrain.layers.stacks)
    count = _window_cells(window, finest_m)
    if count <= FINE_CELLS:
        return _through(ground, [ground.sweep(site, window) for site in ground.ends])
    return _coarse_to_fine(ground, window, cell_m=finest_m * math.ceil(math.sqrt(count / _COARSE_CELLS)))


def _coarse_to_fine(ground: Ground, window: Bounds, *, cell_m: float) -> Cells:
    fields = [ground.sweep(site, window, cell_m=cell_m) for site in ground.ends]
    first = fields[0]
    needed = _most_needed(fields)
    heights = np.nan_to_num(np.asarray(first.ground_m, dtype=np.float64), nan=-1e9)
    rise = maximum_filter(heights, size=3) - heights
    # and their neighbours: the rays of a coarse sweep pass between narrow gaps, and a cell's middle may lie out of reach
    worth = binary_dilation(needed - rise <= ground.mast_m + SLACK_M + COARSE_SLACK_M, np.ones((3, 3), dtype=np.bool_))
    parts: list[Cells] = []
    wide = max(1, round(first.cell_m / min(stack.cell_m for stack in ground.terrain.layers.stacks)))
    side = max(1, _PART // wide)
    tops, lefts = range(0, worth.shape[0], side), range(0, worth.shape[1], side)
    keep = max(_LEAST, _KEPT // (len(tops) * len(lefts)))
    seen, seen_cells = np.zeros(worth.shape, dtype=np.bool_), 0
    for top in tops:
        for left in lefts:
            tile = worth[top : top + side, left : left + side]
            rows, columns = np.nonzero(tile)
            if not rows.size:
                continue
            corners_c = left + np.array([columns.min(), columns.max() + 1.0])
            corners_r = top + np.array([rows.min(), rows.max() + 1.0])
            swept = _swept_in_turn(ground, _box(first, corners_c, corners_r))
            if not swept:
                continue
            found = _through(ground, swept)
            row, column = _in_grid(first, found.latitude_deg, found.longitude_deg)
            # bounds in degrees reach over into other parts
            inside = (row >= top) & (row < top + side) & (column >= left) & (column < left + side)
            found, row, column = found.chosen(inside), row[inside], column[inside]
            passing = found.spare_m >= 0.0
            seen[row[passing], column[passing]] = True
            seen_cells += int(passing.sum())
            parts.append(found.chosen(thinned(found.spare_m, found.row, found.column, most=keep)))
    joined = _joined(parts, _through(ground, fields), looked_at=int(np.isfinite(needed).sum()) * wide**2)
    area = joined.cell_area_m2 / wide**2
    return dataclasses.replace(joined, seen=seen, seen_cells=seen_cells, cell_area_m2=area)


def _swept_in_turn(ground: Ground, part: Bounds) -> list[HeightField]:
    """The sweeps of all ends over a part, each over what the one before let through; empty where nothing is left."""
    swept: list[HeightField] = []
    try:
        for site in ground.ends:
            swept.append(ground.sweep(site, part))
            row, column = np.nonzero(_most_needed(swept) <= ground.mast_m + SLACK_M)
            if not row.size:
                return []
            corners = [np.array([at.min(), at.max() + 1.0]) for at in (column, row)]
            part = _box(swept[0], *corners)
    except TerrainGapError:
        return []
    return swept


def _through(ground: Ground, fields: Sequence[HeightField]) -> Cells:
    """The cells of one window that all fields let through."""
    first = fields[0]
    needed = _most_needed(fields)
    row, column = np.nonzero(needed <= ground.mast_m + SLACK_M)
    heights = np.asarray(first.ground_m[row, column], dtype=np.float64)
    latitude, longitude = first.grid.positions(column.astype(np.float64) + 0.5, row.astype(np.float64) + 0.5)
    start = ground.link.a.position
    middle_deg = 0.5 * (start.latitude_deg + ground.link.b.position.latitude_deg)
    east = np.remainder(longitude - start.longitude_deg + 180.0, 360.0) - 180.0
    cells = Cells(
        row=row.astype(np.int64),
        column=column.astype(np.int64),
        latitude_deg=latitude,
        longitude_deg=longitude,
        x_m=np.asarray(east * 111_320.0 * math.cos(math.radians(middle_deg))),
        y_m=np.asarray((latitude - start.latitude_deg) * 111_132.0),
        ground_m=heights,
        spare_m=np.asarray(ground.mast_m - needed[row, column], dtype=np.float64),
        transform=first.transform,
        crs=first.crs,
        shape=needed.shape,
        cell_area_m2=_cell_area_m2(first.transform, first.crs, middle_deg),
        looked_at=int(np.isfinite(needed).sum()),
    )
    cells = cells.chosen(_stands_on_land(ground, heights, latitude, longitude))
    return cells.chosen(_within_hops(ground, cells.latitude_deg, cells.longitude_deg))


def _within_hops(ground: Ground, latitude: Floats, longitude: Floats) -> NDArray[np.bool_]:
    """Rays reach a cell whose middle lies a little beyond the longest hop; such a cell is taken out."""
    within = np.ones(latitude.shape, dtype=np.bool_)
    for site in ground.ends:
        at = site.position
        east = np.remainder(longitude - at.longitude_deg + 180.0, 360.0) - 180.0
        rough = np.hypot(east * np.cos(np.radians(latitude)), latitude - at.latitude_deg) * 111_000.0
        rim = np.flatnonzero(rough > 0.97 * ground.hop_m)
        if rim.size:
            way = inverse_many(at.latitude_deg, at.longitude_deg, latitude[rim], longitude[rim])
            within[rim] &= way.distance_m <= ground.hop_m
    return within


def _most_needed(fields: Sequence[HeightField]) -> Floats:
    """The most that any end asks, on the grid of the first; NaN where one of them has no answer."""
    first = fields[0]
    needed = np.asarray(first.needed_m, dtype=np.float64)
    for other in fields[1:]:
        needed = np.maximum(needed, _on_grid(first, other))  # NaN wins
    return needed


def _on_grid(first: HeightField, other: HeightField) -> Floats:
    """Another field's heights on the grid of the first: as they are where the grids are one, else the nearest cell's."""
    rows, columns = first.needed_m.shape
    same = first.crs == other.crs and first.transform.almost_equals(other.transform, 1e-9 * first.cell_m)
    if same and other.needed_m.shape == (rows, columns):
        return np.asarray(other.needed_m, dtype=np.float64)
    across, down = np.meshgrid(np.arange(columns) + 0.5, np.arange(rows) + 0.5)
    x, y = on_plane(first.transform, across, down)
    if first.crs != other.crs:
        x, y = transformer(first.crs, other.crs).transform(x, y)
    column, row = on_plane(~other.transform, np.asarray(x), np.asarray(y))
    column, row = np.floor(column + 1e-6).astype(np.int64), np.floor(row + 1e-6).astype(np.int64)
    inside = (row >= 0) & (row < other.needed_m.shape[0]) & (column >= 0) & (column < other.needed_m.shape[1])
    found = np.full((rows, columns), np.nan)
    found[inside] = other.needed_m[row[inside], column[inside]]
    return found


def _stands_on_land(ground: Ground, heights: Floats, latitude: Floats, longitude: Floats) -> NDArray[np.bool_]:
    """Nobody builds a mast on water: where gaps are sea, ground at its level is; and what the study's outlines hold."""
    study = ground.study
    land = np.ones(heights.shape, dtype=np.bool_)
    if study.terrain.gaps == "sea":
        land &= heights > study.terrain.sea_level_m
    outlines = water_of(study).outlines
    if outlines is not None and land.any():
        land &= ~outlines.inside(latitude, longitude)
    if ground.area is not None and land.any():
        land &= shapely.contains_xy(ground.area, longitude, latitude)
    return land


def _window(ground: Ground) -> Bounds:
    """West, south, east and north of what all ends reach, degrees."""
    boxes = []
    for site in ground.ends:
        north, east, south, west = (destination(site.position, bearing, ground.hop_m) for bearing in (0, 90, 180, 270))
        boxes.append((west.longitude_deg, south.latitude_deg, east.longitude_deg, north.latitude_deg))
    box = [max(sides) if at < 2 else min(sides) for at, sides in enumerate(zip(*boxes, strict=True))]
    if ground.area is not None:
        limits = ground.area.bounds
        box = [max(box[0], limits[0]), max(box[1], limits[1]), min(box[2], limits[2]), min(box[3], limits[3])]
    if box[0] >= box[2] or box[1] >= box[3]:
        raise TerrainGapError(
            "no place lies within reach of both ends and in the area",
            f"hops of {ground.hop_m / 1000.0:.3g} km, or the area, leave nothing between the ends",
        )
    return box[0], box[1], box[2], box[3]


def _window_cells(window: Bounds, cell_m: float) -> int:
    west, south, east, north = window
    wide_m = (east - west) * 111_320.0 * math.cos(math.radians(0.5 * (south + north)))
    return round(wide_m * (north - south) * 111_132.0 / cell_m**2)


def _box(field: HeightField, columns: Floats, rows: Floats) -> Bounds:
    """Bounds in degrees of a rectangle of cells."""
    share = np.linspace(0.0, 1.0, 5)
    across, down = np.meshgrid(columns[0] + share * (columns[1] - columns[0]), rows[0] + share * (rows[1] - rows[0]))
    latitude, longitude = field.grid.positions(across.ravel(), down.ravel())
    return float(longitude.min()), float(latitude.min()), float(longitude.max()), float(latitude.max())


def _joined(parts: Sequence[Cells], coarse: Cells, *, looked_at: int) -> Cells:
    """Cells of many windows as one, counted in the coarse grid, which is what the area is shown on."""
    if not parts:
        return dataclasses.replace(coarse.chosen(np.zeros(0, dtype=np.int64)), whole=False)
    latitude = np.concatenate([part.latitude_deg for part in parts])
    longitude = np.concatenate([part.longitude_deg for part in parts])
    row, column = _in_grid(coarse, latitude, longitude)
    return dataclasses.replace(
        coarse,
        latitude_deg=latitude,
        longitude_deg=longitude,
        x_m=np.concatenate([part.x_m for part in parts]),
        y_m=np.concatenate([part.y_m for part in parts]),
        ground_m=np.concatenate([part.ground_m for part in parts]),
        spare_m=np.concatenate([part.spare_m for part in parts]),
        row=row,
        column=column,
        looked_at=looked_at,
        whole=False,
    )


def _in_grid(
    grid: "HeightField | Cells", latitude: Floats, longitude: Floats
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Row and column of places in a grid that holds them."""
    x, y = transformer(WGS84, grid.crs).transform(longitude, latitude)
    column, row = on_plane(~grid.transform, np.asarray(x), np.asarray(y))
    return (
        np.clip(np.floor(row), 0, grid.shape[0] - 1).astype(np.int64),
        np.clip(np.floor(column), 0, grid.shape[1] - 1).astype(np.int64),
    )


def _cell_area_m2(transform: Affine, crs: str, latitude_deg: float) -> float:
    area = abs(float(transform.determinant))
    if crs_of(crs).is_geographic:
        return area * 111_320.0 * 111_132.0 * math.cos(math.radians(latitude_deg))
    return area
