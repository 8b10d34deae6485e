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
def _height(cells: Floats, u: float, v: float) -> float:
    """Bilinear between the centres of cells, `u` and `v` counted from the first one's; held on the sheet."""
    down, across = cells.shape
    x = min(u, across - 1.0) if u > 0.0 else 0.0  # not a number: anywhere on the sheet, never off it
    y = min(v, down - 1.0) if v > 0.0 else 0.0
    left, above = min(int(x), across - 2), min(int(y), down - 2)
    x -= left
    y -= above
    first, below = cells[above, left], cells[above + 1, left]
    upper = first + (cells[above, left + 1] - first) * x
    lower = below + (cells[above + 1, left + 1] - below) * x
    return float(upper + (lower - upper) * y)


@compiled
def along(  # noqa: PLR0912  # one loop: terms are loaded once for all that follow of a path
    cells: Floats, column: Floats, row: Floats, which: Index, t: Floats, heights: Floats
) -> int:
    """Heights at places along paths, as `Sheet.heights` has them where all four cells hold something; else NaN.

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
    degrees, count = column.shape[0], t.shape[1]
    u, v = np.empty(count), np.empty(count)
    x, y = np.empty(degrees), np.empty(degrees)
    path, top, hollow = -1, 1, 0
    for row_of in range(which.size):
        if which[row_of] != path:
            path = which[row_of]
            top = 1
            for degree in range(degrees):
                x[degree], y[degree] = column[degree, path], row[degree, path]
                if degree > 1 and (x[degree] != 0.0 or y[degree] != 0.0):
                    top = degree
        if count == 1:
            at = t[row_of, 0]
            across, down = x[top], y[top]
            for degree in range(top - 1, -1, -1):
                across = across * at + x[degree]
                down = down * at + y[degree]
            heights[row_of, 0] = _height(cells, across - 0.5, down - 0.5)
        else:
            for terms, places in ((x, u), (y, v)):
                for place in range(count):
                    places[place] = terms[top] * t[row_of, place] + terms[top - 1]
                for degree in range(top - 2, -1, -1):
                    for place in range(count):
                        places[place] = places[place] * t[row_of, place] + terms[degree]
            for place in range(count):
                heights[row_of, place] = _height(cells, u[place] - 0.5, v[place] - 0.5)
        for place in range(count):
            hollow += math.isnan(heights[row_of, place])
    return hollow


@compiled
def spread_inside(
    column: Floats, row: Floats, which: Index, t: Floats, width: float, height: float, edge: float, found: Index
) -> None:
    """The first, the middle and the last of places along paths that lie on a raster.

    Parameters
    ----------
    column, row
        (d, p), as for `along`.
    which, t
        (q,) and (n,): the paths, and the places, rising.
    width, height, edge
        Of the raster, in cells, and how far off it still counts as on it.
    found
        (q, 3), written: indices into `t`; -1 where a path has no place on the raster.
    """
    degrees = column.shape[0]
    on = np.empty(t.size, dtype=np.int64)
    for number in range(which.size):
        path, count = which[number], 0
        for place in range(t.size):
            across, down = column[degrees - 1, path] * t[place], row[degrees - 1, path] * t[place]
            for degree in range(degrees - 2, 0, -1):
                across = (across + column[degree, path]) * t[place]
                down = (down + row[degree, path]) * t[place]
            across += column[0, path]
            down += row[0, path]
            if -edge <= across <= width + edge and -edge <= down <= height + edge:
                on[count] = place
                count += 1
        found[number, 0] = on[0] if count else -1
        found[number, 1] = on[(count - 1) // 2] if count else -1
        found[number, 2] = on[count - 1] if count else -1
