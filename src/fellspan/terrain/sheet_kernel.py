"""The loop that gathers heights from a sheet of cells along many paths given as polynomials.

This module imports numba; import it where it is called. Knows no files and no CRS.
"""

import math

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.compiling import compiled

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


@compiled
def along(cells: Floats, column: Floats, row: Floats, which: Index, t: Floats, heights: Floats) -> int:
    """Bilinear heights at places along paths, as `Sheet.heights` has them where all four cells hold something; else NaN.

    Parameters
    ----------
    cells
        (rows, columns), at least two of each.
    column, row
        (d, p), coefficients of powers of t: where each path runs, in cells, the first cell's centre at 0.5.
    which, t
        (q,) and (q, n): of which path each row is, and places from -1 to 1 along it.
    heights
        (q, n), written.

    Returns
    -------
    hollow
        How many of them are NaN.
    """
    down, across = cells.shape
    degrees, hollow = column.shape[0], 0
    x, y = np.empty(degrees), np.empty(degrees)
    for path in range(which.size):
        top = 1
        for degree in range(degrees):
            x[degree], y[degree] = column[degree, which[path]], row[degree, which[path]]
            if x[degree] != 0.0 or y[degree] != 0.0:
                top = max(degree, 1)
        for place in range(t.shape[1]):
            at = t[path, place]
            u, v = x[top] * at, y[top] * at
            for degree in range(top - 1, 0, -1):
                u = (u + x[degree]) * at
                v = (v + y[degree]) * at
            u, v = u + x[0] - 0.5, v + y[0] - 0.5
            u = min(u, across - 1.0) if u > 0.0 else 0.0  # not a number: anywhere on the sheet, never off it
            v = min(v, down - 1.0) if v > 0.0 else 0.0
            left, above = min(int(u), across - 2), min(int(v), down - 2)
            u -= left
            v -= above
            first, below = cells[above, left], cells[above + 1, left]
            upper = first + (cells[above, left + 1] - first) * u
            lower = below + (cells[above + 1, left + 1] - below) * u
            height = upper + (lower - upper) * v
            heights[path, place] = height
            hollow += math.isnan(height)
    return hollow
