"""Plates: the part of a raster around a place, read once into memory as heights in metres.

A part too large for memory is read in strips, and each square of cells keeps its highest. Knows no rays and no radio.
"""

import math
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray
from rasterio.windows import Window

from fellspan.terrain import blocks
from fellspan.terrain.handles import HandlePool, gdal, gdal_errors
from fellspan.terrain.raster_file import RasterFile

MOST_CELLS: Final = 40_000_000
"""Cells of one plate; 4 bytes each."""
_STRIP_CELLS: Final = 2_000_000
THREADS: Final = 2

Plane = NDArray[np.float32]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Plate:
    """Heights of a window of a raster, m, NaN where there is none.

    `left`, `top` are the raster's cells at its corner, `width`, `height` the raster's size, all counted in squares of `factor`
    by `factor` of its cells; above 1, a square's height is its highest.
    """

    file: RasterFile
    heights: Plane
    left: int
    top: int
    width: float
    height: float
    factor: int


def read_plate(
    file: RasterFile,
    handles: HandlePool,
    *,
    columns: tuple[float, float],
    rows: tuple[float, float],
    most_cells: int = MOST_CELLS,
) -> Plate | None:
    """The cells of `file` that lie between places `columns` and `rows`, from and to, with one beside; None if there are none.

    Raises
    ------
    RasterError
        A block cannot be read.
    """
    left, right = max(math.floor(columns[0]) - 1, 0), min(math.ceil(columns[1]) + 1, file.width)
    top, bottom = max(math.floor(rows[0]) - 1, 0), min(math.ceil(rows[1]) + 1, file.height)
    if left >= right or top >= bottom:
        return None
    factor = max(1, math.ceil(math.sqrt((right - left) * (bottom - top) / most_cells)))
    left, top = left // factor * factor, top // factor * factor
    wide, high = -(-(right - left) // factor), -(-(bottom - top) // factor)
    heights = np.empty((high, wide), dtype=np.float32)
    strip = max(1, _STRIP_CELLS // ((right - left) * factor))
    block = max(1, file.block_height // factor)
    strip = max(block, strip // block * block) if block <= 4 * strip else strip

    def read(first: int) -> None:
        last = min(first + strip, high)
        window = Window(left, top + first * factor, right - left, min(last * factor, bottom - top) - first * factor)
        with gdal():
            if factor == 1:
                _read(file, handles, window, heights[first:last])
            else:
                cells = np.empty((int(window.height), int(window.width)), dtype=np.float32)
                _read(file, handles, window, cells)
                heights[first:last] = _highest(cells, factor, last - first, wide)

    in_threads(read, range(0, high, strip))
    return Plate(
        file=file,
        heights=heights,
        left=left // factor,
        top=top // factor,
        width=file.width / factor,
        height=file.height / factor,
        factor=factor,
    )


def in_threads(work: Callable[[int], None], firsts: Sequence[int]) -> None:
    """Do `work` for each number, in a few threads; the first error is raised."""
    if len(firsts) == 1:
        work(firsts[0])
        return
    with ThreadPoolExecutor(THREADS) as pool:
        for _ in pool.map(work, firsts):
            pass


def _read(file: RasterFile, handles: HandlePool, window: Window, out: Plane) -> None:
    """Heights of a window, put into `out`; GDAL turns cells of any type into its own."""
    from fellspan.terrain.rays_kernel import clean

    dataset = handles.dataset(file.path, file.name)
    with gdal_errors(file.name, "read"):
        dataset.read(file.band, window=window, out=out)
        empty = None
        if file.has_mask:
            empty = dataset.read_masks(file.band, window=window) == 0
        elif file.nodata is None and file.driver == "GTiff" and not out.all():
            empty = out == 0.0
            rows, columns = np.nonzero(empty)
            empty[rows, columns] = ~blocks.written(
                dataset, file, rows + int(window.row_off), columns + int(window.col_off)
            )
    nodata, habits = blocks.no_heights(file)
    clean(out, nodata, habits, file.scale, file.offset, file.unit_m, blocks.LOWEST_M, blocks.HIGHEST_M)
    if empty is not None:
        out[empty] = np.nan


def _highest(cells: Plane, factor: int, high: int, wide: int) -> Plane:
    """The highest of each square of cells, NaN only where none has a height; squares at the edge may be cut."""
    whole = np.full((high * factor, wide * factor), np.nan, dtype=np.float32)
    whole[: cells.shape[0], : cells.shape[1]] = cells
    return np.asarray(np.fmax.reduce(whole.reshape(high, factor, wide, factor), axis=(1, 3)))
