"""Which of many possible places to show: the best ones, spread apart, so that a refusal on the ground leaves another.

Pure functions of arrays. Knows nothing of terrain, links or studies.
"""

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]
Indices = NDArray[np.int64]


def spread_picks(score: ArrayLike, x_m: ArrayLike, y_m: ArrayLike, *, apart_m: float, count: int) -> Indices:
    """Indices of the best places, best first, no two nearer to each other than `apart_m`.

    Parameters
    ----------
    score
        Higher is better, shape (n,); places of equal score keep their order, NaN and -inf are never picked.
    x_m, y_m
        Where they stand on a plane, m, shape (n,).
    apart_m
        Least distance between two picks, m, >= 0.
    count
        How many at most, >= 0.

    Notes
    -----
    The greedy choice: the best of all, then the best of what lies far enough from it, and so on.
    """
    value = np.asarray(score, dtype=np.float64)
    x, y = np.asarray(x_m, dtype=np.float64), np.asarray(y_m, dtype=np.float64)
    order = np.argsort(-np.where(np.isnan(value), -np.inf, value), kind="stable")
    order = order[np.isfinite(value[order]) | (value[order] == np.inf)]
    picked: list[int] = []
    while order.size and len(picked) < count:
        best = int(order[0])
        picked.append(best)
        away = np.hypot(x[order] - x[best], y[order] - y[best]) >= apart_m
        away[0] = False  # also where apart_m is 0
        order = order[away]
    return np.asarray(picked, dtype=np.int64)


def thinned(score: ArrayLike, row: ArrayLike, column: ArrayLike, *, most: int) -> Indices:
    """Indices of at most `most` cells that stand for all of them, as `thinned_by`."""
    return thinned_by(score, row, column, most=most)[0]


def thinned_by(score: ArrayLike, row: ArrayLike, column: ArrayLike, *, most: int) -> tuple[Indices, int]:
    """Indices of at most `most` cells, the best of each square block of the raster, and the side of a block in cells.

    The block is the smallest (side a power of two, in cells) that leaves so few; indices rise. Where nothing has to go, all
    stay, and the side is 1. `score`, `row` and `column` have shape (n,); `most` is at least 1.
    """
    value = np.asarray(score, dtype=np.float64)
    rows, columns = np.asarray(row, dtype=np.int64), np.asarray(column, dtype=np.int64)
    if value.size <= most:
        return np.arange(value.size, dtype=np.int64), 1
    order = np.argsort(-value, kind="stable")
    width = int(columns.max()) + 1
    side = 2
    while True:
        block = (rows[order] // side) * (width // side + 1) + columns[order] // side
        kept = order[np.unique(block, return_index=True)[1]]
        if kept.size <= most or side > max(width, int(rows.max()) + 1):
            return np.sort(kept)[:most], side
        side *= 2
