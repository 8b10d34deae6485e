"""Cells of one raster kept decoded in memory, for batches of paths that come back to them: gathered by index, tile by tile.

Reads only the tiles that paths come near, and reads them as `blocks` does. Knows nothing of CRS or paths.
"""

import mmap
import sys
import threading
from collections.abc import Callable
from typing import Final, Protocol

import numpy as np
from numpy.typing import NDArray
from rasterio.io import DatasetReader

from fellspan.terrain.blocks import blended, window_heights
from fellspan.terrain.handles import gdal
from fellspan.terrain.raster_file import RasterFile

TILE: Final = 256
"""Side of the tiles in which cells are read."""
MOST_CELLS: Final = 4_000_000_000
"""Rasters with more cells are not kept as a sheet: even addresses have an end."""

_NORESERVE: Final = getattr(mmap, "MAP_NORESERVE", 0x4000 if sys.platform == "linux" else 0)
"""Before 3.13, Python has no name for it."""

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


class Curves(Protocol):
    """Where paths run on one raster: coefficients of powers of t, -1 at A to 1 at B, each (d, p)."""

    @property
    def column(self) -> Floats:
        """Of columns, (0, 0) the outer corner of the first cell."""
        ...

    @property
    def row(self) -> Floats:
        """Of rows."""
        ...

    @property
    def is_close(self) -> NDArray[np.bool_]:
        """Whether they are known closely enough, (p,)."""
        ...

    def at(self, t: Floats, which: Index) -> tuple[Floats, Floats]:
        """Columns and rows at t, shape (q, n), of the paths `which`, shape (q,)."""
        ...

    def range_of(self) -> tuple[Floats, Floats, Floats, Floats]:
        """Least and greatest column, least and greatest row, each (p,)."""
        ...


class Sheet:
    """One raster as a sheet of cells in memory; untouched tiles cost none. Safe to use from several threads."""

    def __init__(self, file: RasterFile, dataset: Callable[[], DatasetReader]) -> None:
        """`dataset` gives the calling thread's handle on `file`."""
        self.file = file
        self._dataset = dataset
        self._memory = _Memory(8 * file.height * file.width)
        self._flat: Floats = np.frombuffer(self._memory.buffer, dtype=np.float64, count=file.height * file.width)
        self._cells = self._flat.reshape(file.height, file.width)
        self._tiles = -(-file.height // TILE), -(-file.width // TILE)
        self._loaded = np.zeros(self._tiles, dtype=np.bool_)
        self._complete = False
        self._lock = threading.Lock()

    @staticmethod
    def fits(file: RasterFile) -> bool:
        """Whether a raster is small enough to be kept so, and large enough to be interpolated."""
        return file.width * file.height <= MOST_CELLS and min(file.width, file.height) > 1

    @property
    def held_bytes(self) -> int:
        """What the tiles in memory take, at most twice as much by whole pages."""
        return 8 * TILE * TILE * self.tiles_read

    def forget(self) -> None:
        """Give the memory of all tiles back; nobody may be gathering meanwhile."""
        with self._lock:
            if self._memory.give_back():
                self._loaded[:] = False
                self._complete = False

    @property
    def is_complete(self) -> bool:
        """Whether all of the raster is in memory."""
        return self._complete

    @property
    def tiles_read(self) -> int:
        """How many tiles are in memory."""
        return int(np.count_nonzero(self._loaded))

    def read_near(self, column: Floats, row: Floats, *, reach: float) -> None:
        """Read the tiles within `reach` cells of places in cells; where they are NaN or off the raster nothing is read."""
        if self._complete:
            return
        wanted = np.zeros(self._tiles, dtype=np.bool_)
        known = np.isfinite(column) & np.isfinite(row)
        column, row = column[known], row[known]
        near = (
            (column > -reach) & (column < self.file.width + reach) & (row > -reach) & (row < self.file.height + reach)
        )
        column, row = column[near], row[near]
        # A corner of the square round a place for every tile that the square can touch.
        parts = np.linspace(-1.0, 1.0, 2 + int(2.0 * (reach + 1.0) / TILE)) * (reach + 1.0)
        for down in parts:
            tile_row = np.clip((row + down) // TILE, 0, self._tiles[0] - 1).astype(np.intp)
            for across in parts:
                tile_column = np.clip((column + across) // TILE, 0, self._tiles[1] - 1).astype(np.intp)
                wanted[tile_row, tile_column] = True
        if (wanted & ~self._loaded).any():
            self._read(wanted)

    def _read(self, wanted: NDArray[np.bool_]) -> None:
        with self._lock, gdal():
            for tile_row, tile_column in np.argwhere(wanted & ~self._loaded).tolist():
                top, left = tile_row * TILE, tile_column * TILE
                height, width = min(TILE, self.file.height - top), min(TILE, self.file.width - left)
                self._cells[top : top + height, left : left + width] = window_heights(
                    self._dataset(), self.file, column=left, row=top, width=width, height=height
                )
                self._loaded[tile_row, tile_column] = True
            self._complete = bool(self._loaded.all())

    def heights_along(self, curves: "Curves", t: Floats, which: Index) -> tuple[Floats, bool]:
        """As `heights`, at t (q, n) along the paths `which`, (q,), all of which lie on the raster; and whether none is NaN."""
        from fellspan.terrain import sheet_kernel

        found = np.empty(t.shape)
        if not sheet_kernel.along(self._cells, curves.column, curves.row, which, t, found):
            return found, True
        hollow = np.nonzero(np.isnan(found))
        column, row = curves.at(t[hollow][:, np.newaxis], which[hollow[0]])
        found[hollow] = self.heights(column, row)[:, 0]
        return found, not np.isnan(found[hollow]).any()

    def heights(self, column: Floats, row: Floats) -> Floats:
        """As `blocks.bilinear`, of tiles that `read_near` has read, for places on the raster in arrays of any one shape."""
        u, v = column - 0.5, row - 0.5
        width, height = self.file.width, self.file.height
        np.clip(u, 0.0, width - 1.0, out=u)
        np.clip(v, 0.0, height - 1.0, out=v)
        left, top = u.astype(np.int64), v.astype(np.int64)
        np.minimum(left, width - 2, out=left)
        np.minimum(top, height - 2, out=top)
        u -= left
        v -= top
        top *= width
        top += left
        flat = self._flat
        first = flat.take(top, mode="clip")
        top += 1
        right = flat.take(top, mode="clip")
        top += width
        opposite = flat.take(top, mode="clip")
        top -= 1
        below = flat.take(top, mode="clip")
        upper = right - first
        upper *= u
        upper += first
        lower = opposite - below
        lower *= u
        lower += below
        lower -= upper
        lower *= v
        lower += upper
        hollow = np.isnan(lower)
        if hollow.any():
            corners = np.stack([one[hollow] for one in (first, right, below, opposite)])
            lower[hollow] = blended(corners, u[hollow], v[hollow])
        return lower


class _Memory:
    """Addresses for all cells of a raster, of which only those written to take memory, and which can be given back."""

    def __init__(self, size: int) -> None:
        self._mapped: mmap.mmap | None = None
        if hasattr(mmap, "MADV_DONTNEED"):
            flags = mmap.MAP_PRIVATE | mmap.MAP_ANONYMOUS | _NORESERVE
            self._mapped = mmap.mmap(-1, size, flags=flags)
            if hasattr(mmap, "MADV_NOHUGEPAGE"):
                # A tile touches a little of many large pages: each would be taken whole.
                self._mapped.madvise(mmap.MADV_NOHUGEPAGE)
        self.buffer: mmap.mmap | bytearray | memoryview = (
            np.empty(size, dtype=np.uint8).data if self._mapped is None else self._mapped
        )

    def give_back(self) -> bool:
        """Whether the system took it back; what is read again then starts as 0."""
        if self._mapped is None:
            return False
        self._mapped.madvise(mmap.MADV_DONTNEED)
        return True
