"""Shaded relief of the study's own rasters, on the grid of a web map, as a picture inside the page.

Reads rasters decimated (overviews where there are any), one after the other, the coarsest first; memory is bounded by the
picture and not by the raster. Knows nothing of links. A raster that cannot be drawn leaves its part of the map blank.
"""

import base64
import math
import warnings
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from affine import Affine
from numpy.typing import NDArray
from rasterio._err import CPLE_BaseError
from rasterio.crs import CRS
from rasterio.enums import MaskFlags, Resampling
from rasterio.errors import NotGeoreferencedWarning, RasterioError
from rasterio.io import MemoryFile
from rasterio.warp import reproject
from rasterio.warp import transform as warp_points
from rasterio.windows import Window

from fellspan.errors import FellspanError
from fellspan.terrain.handles import gdal, open_dataset
from fellspan.terrain.raster_file import RasterFile
from fellspan.terrain.sources import RasterSource
from fellspan.terrain.tiles import open_source

SPHERE_M = 6_378_137.0
"""Radius of the web map's sphere, m (EPSG:3857)."""
SEA_COLOUR = (220, 229, 230)
UNKNOWN_COLOUR = (236, 234, 230)
_RAMP = ((0.0, (216, 222, 200)), (0.35, (230, 221, 190)), (0.7, (226, 205, 171)), (1.0, (242, 236, 226)))
"""Light tints, so that lines and names stay readable on them."""
_TINTS = np.array(
    [
        np.interp(np.linspace(0.0, 1.0, 256), [stop for stop, _ in _RAMP], [colour[channel] for _, colour in _RAMP])
        for channel in range(3)
    ],
    dtype=np.float32,
)
_QUALITIES = (82, 70, 58, 46)

MOST_CELLS = 150_000_000
"""Cells that are read for one map, seconds of work; overviews bring a raster of any size below it."""

Array = NDArray[np.float32]


class _TooLarge(Exception):
    """A raster would need more cells than are left."""


@dataclass(frozen=True, slots=True, kw_only=True)
class MapWindow:
    """A part of the web map, degrees; longitudes run on beyond 180 where it crosses the antimeridian."""

    west_deg: float
    south_deg: float
    east_deg: float
    north_deg: float

    @property
    def middle_deg(self) -> float:
        """Longitude of the middle."""
        return (self.west_deg + self.east_deg) / 2.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Relief:
    """A picture as a data URI ('' where there is nothing to show), the window it fills, the rasters that it shows, and
    those left out because they are too large to read without overviews."""

    url: str
    window: MapWindow
    rasters: tuple[str, ...]
    left_out: tuple[str, ...] = ()


def mercator_y(latitude_deg: float) -> float:
    """Northing on the web map, m."""
    return SPHERE_M * math.asinh(math.tan(math.radians(max(-85.0, min(85.0, latitude_deg)))))


def open_rasters(sources: Sequence[RasterSource]) -> list[RasterFile]:
    """Headers of all rasters to draw, the coarsest first; those that do not open are left out."""
    found: list[RasterFile] = []
    for source in sources:
        try:
            found += open_source(source, role=source.role)
        except FellspanError:
            continue
    return sorted(found, key=lambda raster: (-raster.cell_m, raster.path))


def shaded_relief(
    rasters: Sequence[RasterFile],
    window: MapWindow,
    *,
    pixels: int = 1200,
    most_bytes: int = 300_000,
    gaps_are_sea: bool = False,
) -> Relief | None:
    """The relief of a window, its longer side at most `pixels`; None where no raster is there."""
    half = math.radians(window.east_deg - window.middle_deg) * SPHERE_M
    south, north = mercator_y(window.south_deg), mercator_y(window.north_deg)
    if half <= 0.0 or north <= south:
        return None
    size = max(2.0 * half, north - south) / pixels
    width, height = max(2, round(2.0 * half / size)), max(2, round((north - south) / size))
    transform = Affine(2.0 * half / width, 0.0, -half, 0.0, -(north - south) / height, north)
    heights = np.full((height, width), np.nan, dtype=np.float32)
    shrink = math.cos(math.radians((window.south_deg + window.north_deg) / 2.0))
    shown: list[str] = []
    left_out: list[str] = []
    budget = _Budget(MOST_CELLS)
    with gdal():
        for raster in rasters:
            try:
                if _paint(
                    raster, heights, transform, middle_deg=window.middle_deg, cell_m=size * shrink, budget=budget
                ):
                    shown.append(raster.name)
            except _TooLarge:
                left_out.append(raster.name)
            except (FellspanError, RasterioError, CPLE_BaseError, OSError, ValueError):
                # GDAL's own errors too: a window may reach farther than the projection of a raster does.
                continue
    drawn = bool(np.isfinite(heights).any())
    if not drawn and not left_out:
        return None
    return Relief(
        url=_encode(_colour(heights, size * shrink, gaps_are_sea=gaps_are_sea), most_bytes) if drawn else "",
        window=window,
        rasters=tuple(dict.fromkeys(shown)),
        left_out=tuple(dict.fromkeys(left_out)),
    )


class _Budget:
    """Cells that may still be read for a map."""

    def __init__(self, cells: int) -> None:
        self.left = float(cells)

    def take(self, cells: float) -> None:
        """Count a reading, or refuse it."""
        if cells > self.left:
            raise _TooLarge
        self.left -= cells


def _mercator(middle_deg: float) -> CRS:
    return CRS.from_string(
        f"+proj=merc +a={SPHERE_M} +b={SPHERE_M} +lat_ts=0 +lon_0={middle_deg!r} +x_0=0 +y_0=0 +k=1 +units=m "
        "+nadgrids=@null +wktext +no_defs"
    )


def _paint(
    raster: RasterFile, heights: Array, grid: Affine, *, middle_deg: float, cell_m: float, budget: _Budget
) -> bool:
    """Put one raster over what is there already; a geographic one is turned to the middle, with its copies a turn away."""
    crs = CRS.from_user_input(raster.crs_text)
    if raster.period is None:
        return _paint_placed(raster, heights, grid, crs, raster.transform, _mercator(middle_deg), cell_m, budget)
    turn = -middle_deg * raster.period / 360.0
    places = [_after(Affine.translation(turn + copy * raster.period, 0.0), raster.transform) for copy in (-1, 0, 1)]
    painted = [_paint_placed(raster, heights, grid, crs, place, _mercator(0.0), cell_m, budget) for place in places]
    return any(painted)


def _paint_placed(
    raster: RasterFile,
    heights: Array,
    grid: Affine,
    crs: CRS,
    placed: Affine,
    mercator: CRS,
    cell_m: float,
    budget: _Budget,
) -> bool:
    window = _source_window(raster, heights.shape, grid, crs, placed, mercator)
    if window is None:
        return False
    coarser = max(1.0, cell_m / raster.cell_m)
    shape = (max(1, math.ceil(window.height / coarser)), max(1, math.ceil(window.width / coarser)))
    limit = 3 * max(heights.shape)
    shape = (min(shape[0], limit), min(shape[1], limit))
    with open_dataset(raster.path, raster.name) as dataset:
        overview = max((factor for factor in dataset.overviews(raster.band) if factor <= coarser), default=1)
        budget.take(window.width * window.height / overview**2)
        resampling = Resampling.average if coarser > 1.0 else Resampling.nearest
        # Where the file marks what is missing by a number, the number is enough; a mask would be a second reading.
        marked = dataset.mask_flag_enums[raster.band - 1] in ([MaskFlags.nodata], [MaskFlags.all_valid])
        cells = dataset.read(raster.band, window=window, out_shape=shape, masked=not marked, resampling=resampling)
        missing = dataset.nodatavals[raster.band - 1] if marked else None
    values = np.ma.filled(cells.astype(np.float32), np.nan) if not marked else cells.astype(np.float32)
    if missing is not None:
        values[cells == missing] = np.nan
    values = (values * raster.scale + raster.offset) * raster.unit_m
    if not np.isfinite(values).any():
        return False
    cell = Affine(window.width / shape[1], 0.0, window.col_off, 0.0, window.height / shape[0], window.row_off)
    source_grid = _after(placed, cell)
    drawn = np.full(heights.shape, np.nan, dtype=np.float32)
    reproject(
        values, drawn, src_transform=source_grid, src_crs=crs, src_nodata=np.nan, dst_transform=grid, dst_crs=mercator,
        dst_nodata=np.nan, resampling=Resampling.bilinear, num_threads=1,
    )  # fmt: skip
    known = np.isfinite(drawn)
    heights[known] = drawn[known]
    return bool(known.any())


def _after(outer: Affine, inner: Affine) -> Affine:
    """`inner` first, then `outer`; written out, because releases of affine disagree on the operator."""
    return Affine(
        outer.a * inner.a + outer.b * inner.d,
        outer.a * inner.b + outer.b * inner.e,
        outer.a * inner.c + outer.b * inner.f + outer.c,
        outer.d * inner.a + outer.e * inner.d,
        outer.d * inner.b + outer.e * inner.e,
        outer.d * inner.c + outer.e * inner.f + outer.f,
    )


def _source_window(
    raster: RasterFile, shape: tuple[int, ...], grid: Affine, crs: CRS, placed: Affine, mercator: CRS
) -> Window | None:
    """The part of the raster that lies under the picture, two cells wider; None where there is none."""
    rows, columns = np.meshgrid(np.linspace(0, shape[0], 25), np.linspace(0, shape[1], 25), indexing="ij")
    xs, ys = grid.a * columns.ravel() + grid.c, grid.e * rows.ravel() + grid.f
    over = [np.asarray(axis) for axis in warp_points(mercator, crs, xs.tolist(), ys.tolist())]
    back = ~placed
    column = back.a * over[0] + back.b * over[1] + back.c
    row = back.d * over[0] + back.e * over[1] + back.f
    usable = np.isfinite(column) & np.isfinite(row)
    if not usable.any():
        return None
    # Between the 25 lines a raster's grid bends by less than a few cells of the picture.
    edge_x, edge_y = 2.0 + 0.02 * np.ptp(column[usable]), 2.0 + 0.02 * np.ptp(row[usable])
    left = max(0, math.floor(column[usable].min() - edge_x))
    right = min(raster.width, math.ceil(column[usable].max() + edge_x))
    top = max(0, math.floor(row[usable].min() - edge_y))
    bottom = min(raster.height, math.ceil(row[usable].max() + edge_y))
    return Window(left, top, right - left, bottom - top) if right > left and bottom > top else None


def _colour(heights: Array, cell_m: float, *, gaps_are_sea: bool) -> NDArray[np.uint8]:
    """Tint by height, shade by light from the north-west; what is flat at sea level is sea, and
    what is unknown is neither sea nor land unless the study says so."""
    known = np.isfinite(heights)
    filled = np.where(known, heights, 0.0).astype(np.float32)
    down, right = np.gradient(filled, cell_m)
    rise = np.hypot(down, right)
    steep = float(np.percentile(rise[known], 95)) if known.any() else 0.0
    # A gentle land is shaded as clearly as a steep one: what is usually steepest gets a slope of about 40 degrees.
    boost = min(6.0, max(0.4, 0.85 / max(steep, 1e-6)))
    light = (0.5 * (-right - down) * -boost + 0.7071) / np.sqrt(1.0 + (boost * rise) ** 2)
    shade = np.clip(0.62 + 0.55 * light, 0.55, 1.08)
    sea = ~known | ((np.abs(filled) < 0.5) & (rise < 0.002))
    top = float(np.percentile(filled[~sea], 99.5)) if (~sea).any() else 1.0
    bottom = (
        min(0.0, top) if not sea.all() and float(filled[~sea].min()) < 30.0 else float(filled[~sea].min(initial=0.0))
    )
    share = np.clip((filled - bottom) / max(top - bottom, 1.0), 0.0, 1.0)
    # 256 tints are as many as the picture can tell apart, and looking them up is ten times as quick as working them out.
    step = np.rint(share * (_TINTS.shape[1] - 1)).astype(np.uint8)
    bands = np.empty((3, *heights.shape), dtype=np.uint8)
    for channel in range(3):
        tint = np.rint(np.clip(_TINTS[channel][step] * shade, 0.0, 255.0)).astype(np.uint8)
        tint[sea] = SEA_COLOUR[channel]
        if not gaps_are_sea:
            tint[~known] = UNKNOWN_COLOUR[channel]
        bands[channel] = tint
    return bands


def _encode(picture: NDArray[np.uint8], most_bytes: int) -> str:
    """A JPEG data URI, of lower quality and then of half the size where it would be too heavy."""
    while True:
        for quality in _QUALITIES:
            data = _jpeg(picture, quality)
            if len(data) * 4 / 3 <= most_bytes:
                return "data:image/jpeg;base64," + base64.b64encode(data).decode("ascii")
        if max(picture.shape[1:]) < 64:
            return "data:image/jpeg;base64," + base64.b64encode(data).decode("ascii")
        picture = np.ascontiguousarray(picture[:, ::2, ::2])


def _jpeg(picture: NDArray[np.uint8], quality: int) -> bytes:
    _, height, width = picture.shape
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", NotGeoreferencedWarning)
        with MemoryFile() as memory:
            with memory.open(
                driver="JPEG", width=width, height=height, count=3, dtype="uint8", quality=quality
            ) as file:
                file.write(picture)
            return bytes(memory.read())
