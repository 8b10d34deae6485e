"""Heights at places given in cells, read block by block: memory stays that of a few blocks however large the raster.

Pixel centres are at half numbers. Knows nothing of CRS or paths.
"""

import numpy as np
from numpy.typing import NDArray
from rasterio.io import DatasetReader
from rasterio.windows import Window

from fellspan.terrain.handles import gdal_errors
from fellspan.terrain.raster_file import RasterFile

_GROUP_CELLS = 512
_LARGEST_GROUP = 2048
_STRIP_BYTES = 24_000_000
"""Strips that one group may touch; under half of GDAL's cache, so that its neighbours find them decoded."""

_UNDECLARED = (-9999.0, -32767.0, -32768.0)
"""Numbers that stand for 'no data' by habit; where a file declares none, they are taken for gaps, not for heights."""
LOWEST_M, HIGHEST_M = -12_000.0, 9_500.0
"""Nothing on Earth is lower or higher (deepest sea floor some -10 935 m, highest summit 8 849 m; from memory)."""

Index = NDArray[np.int64]


def bilinear(
    dataset: DatasetReader, file: RasterFile, column: NDArray[np.float64], row: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Heights in metres at places in cells, NaN where the nearest cell holds none.

    Parameters
    ----------
    dataset
        An open handle on `file`, of the calling thread.
    column, row
        Shape (n,), in 0 <= column <= width and 0 <= row <= height; the first cell's centre is 0.5, 0.5. In the outer half
        cell the edge cell's height holds.

    Raises
    ------
    RasterError
        A block cannot be read.

    Notes
    -----
    Bilinear between the four nearest centres. Where some of them hold nothing, their weights go to the others.
    """
    u = np.clip(column - 0.5, 0.0, file.width - 1.0)
    v = np.clip(row - 0.5, 0.0, file.height - 1.0)
    left, top = np.floor(u).astype(np.int64), np.floor(v).astype(np.int64)
    across, down = u - left, v - top
    # where a point lies on a centre line its neighbour has no weight and is not read
    right, bottom = left + (across > 0.0), top + (down > 0.0)
    corners = ((top, left), (top, right), (bottom, left), (bottom, right))
    heights = np.empty((4, u.size))
    rows_apart, columns_apart = group_shape(file)
    group = (top // rows_apart) * (file.width // columns_apart + 1) + left // columns_apart
    order = np.argsort(group, kind="stable")
    for members in np.split(order, np.flatnonzero(np.diff(group[order])) + 1):
        heights[:, members] = _read_group(dataset, file, [(r[members], c[members]) for r, c in corners])
    return blended(heights, across, down)


def blended(
    heights: NDArray[np.float64], across: NDArray[np.float64], down: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Bilinear between four corners, shape (4, n): top left, top right, bottom left, bottom right.

    `across` and `down` are the shares of a cell from the top left one, 0 to 1, shape (n,). Where some of the corners hold
    nothing (NaN), their weights go to the others; NaN where the nearest one does.
    """
    weights = np.stack(((1 - down) * (1 - across), (1 - down) * across, down * (1 - across), down * across))
    valid = np.isfinite(heights)
    weights *= valid
    nearest = 2 * (down >= 0.5) + (across >= 0.5)
    total = weights.sum(axis=0)
    usable = np.take_along_axis(valid, nearest[np.newaxis], axis=0)[0] & (total > 0.0)
    summed = (np.where(valid, heights, 0.0) * weights).sum(axis=0)
    return np.asarray(np.divide(summed, total, out=np.full(across.size, np.nan), where=usable))


def group_shape(file: RasterFile) -> tuple[int, int]:
    """Rows and columns of the grid by which samples are grouped into reads: whole blocks where these are small."""
    if file.block_width >= file.width and file.width > _GROUP_CELLS:
        # strips: a row of groups touches whole strips, so it must be low enough to stay in GDAL's cache
        strip_bytes = file.width * file.block_height * np.dtype(file.dtype).itemsize
        strips = max(1, min(_GROUP_CELLS // file.block_height, _STRIP_BYTES // strip_bytes))
        return min(strips * file.block_height, _LARGEST_GROUP), 2 * _GROUP_CELLS
    return _whole_blocks(file.block_height), _whole_blocks(file.block_width)


def _whole_blocks(side: int) -> int:
    return _GROUP_CELLS if side > _LARGEST_GROUP else side * max(1, _GROUP_CELLS // side)


def _read_group(dataset: DatasetReader, file: RasterFile, corners: list[tuple[Index, Index]]) -> NDArray[np.float64]:
    """Heights at the four corners of each member, shape (4, m), from one read of the window around them."""
    first_row, first_column = int(corners[0][0].min()), int(corners[0][1].min())
    window = Window(
        first_column,
        first_row,
        int(corners[3][1].max()) - first_column + 1,
        int(corners[3][0].max()) - first_row + 1,
    )
    rows = np.stack([r for r, _ in corners]) - first_row
    columns = np.stack([c for _, c in corners]) - first_column
    return _heights(dataset, file, window, rows, columns)


def window_heights(
    dataset: DatasetReader, file: RasterFile, *, column: int, row: int, width: int, height: int
) -> NDArray[np.float64]:
    """Heights of a window of cells in metres, shape (height, width), NaN where there is none."""
    rows, columns = np.indices((height, width))
    return _heights(dataset, file, Window(column, row, width, height), rows, columns)


def _heights(
    dataset: DatasetReader, file: RasterFile, window: Window, rows: Index, columns: Index
) -> NDArray[np.float64]:
    """Heights at cells counted from the window's corner."""
    with gdal_errors(file.name, "read"):
        raw = dataset.read(file.band, window=window)[rows, columns]
        valid = _valid(raw, file)
        if file.has_mask:
            valid &= dataset.read_masks(file.band, window=window)[rows, columns] != 0
        elif file.nodata is None and file.driver == "GTiff" and not raw.all():
            zero = raw == 0
            valid[zero] &= written(dataset, file, rows[zero] + int(window.row_off), columns[zero] + int(window.col_off))
    heights = (raw.astype(np.float64) * file.scale + file.offset) * file.unit_m
    valid &= (heights > LOWEST_M) & (heights < HIGHEST_M)
    return np.where(valid, heights, np.nan)


def _valid(raw: NDArray[np.generic], file: RasterFile) -> NDArray[np.bool_]:
    valid = np.ones(raw.shape, dtype=np.bool_)
    if raw.dtype.kind == "f":
        valid &= np.isfinite(raw)
    if file.nodata is not None:
        if np.isfinite(file.nodata):
            # a nodata value is stored with the digits of float cells: compare as these
            with np.errstate(over="ignore"):
                stored = float(np.float32(file.nodata)) if raw.dtype == np.float32 else file.nodata
            valid &= raw.astype(np.float64) != stored
    elif not file.has_mask and raw.dtype.kind != "u":
        valid &= ~np.isin(raw.astype(np.float64), _UNDECLARED)
    return valid


def no_heights(file: RasterFile) -> tuple[float, NDArray[np.float64]]:
    """What float32 copies of cells hold where there is no height: the file's own number (NaN if none), and numbers by habit."""
    if file.nodata is not None:
        with np.errstate(over="ignore"):
            stored = float(np.float32(file.nodata))
        return (stored if np.isfinite(stored) else np.nan), np.zeros(0)
    by_habit = not file.has_mask and np.dtype(file.dtype).kind != "u"
    return np.nan, np.array(_UNDECLARED if by_habit else (), dtype=np.float64)


def written(dataset: DatasetReader, file: RasterFile, rows: Index, columns: Index) -> NDArray[np.bool_]:
    """False in blocks that a sparse GeoTIFF never stored: GDAL reads them as 0, but nobody measured that."""
    blocks_across = file.width // file.block_width + 1
    blocks, which = np.unique(
        rows // file.block_height * blocks_across + columns // file.block_width, return_inverse=True
    )
    stored = [
        dataset.get_tag_item(f"BLOCK_OFFSET_{b % blocks_across}_{b // blocks_across}", "TIFF", bidx=file.band)
        is not None
        for b in blocks.tolist()
    ]
    return np.array(stored, dtype=np.bool_)[which]
