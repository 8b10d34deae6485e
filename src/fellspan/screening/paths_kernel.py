"""Loops that lay samples along many paths: at equal steps, and with more of them round those worth a closer look.

This module imports numba; import it where it is called. Knows distances only, no heights and no rays. A path's own samples are
columns 0 to `last` - 1 and the very last column; what stands between fills the row up and is never read for an answer.
"""

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.compiling import compiled

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


@compiled
def equal_steps(length: Floats, last: Index, distance: Floats, t: Floats) -> None:
    """Distances (q, n), written, of paths (q,) in `last` equal steps, the end repeated; and t from -1 at A to 1 at B."""
    for path in range(length.size):
        end, steps = length[path], last[path]
        step = end / steps
        for column in range(distance.shape[1]):
            at = column * step if column < steps else end
            distance[path, column] = at
            t[path, column] = 2.0 * (at / end) - 1.0


@compiled
def with_more(
    rows: Index,
    distance: Floats,
    last: Index,
    length: Floats,
    more: NDArray[np.int32],
    step: Floats,
    same_m: float,
    begins: Index,
    fine_distance: Floats,
    come_from: Index,
    t: Floats,
    row_of: Index,
    start_of: Index,
) -> None:
    """Put `more` samples, at whole multiples of `step`, after each sample of some paths.

    Parameters
    ----------
    rows
        (g,), which of the paths.
    distance, last, length, more, step
        Of all paths: (q, n), (q,), (q,), (q, n), (q,).
    same_m
        What stands so near to a sample of before is left out.
    begins
        (g,), where the new samples of each path begin among all new ones.
    fine_distance, come_from
        (g, w), written. `come_from` is a flat index into the arrays of before, or q * n and more: one of the new ones.
    t, row_of, start_of
        (m,), written, of the new samples: t from -1 to 1, which of the g paths, flat index of the sample before it.
    """
    columns, width = distance.shape[1], fine_distance.shape[1]
    before = distance.shape[0] * columns
    for row in range(rows.size):
        path = rows[row]
        end, new, place, gap = last[path], begins[row], 0, step[path]
        for column in range(end):
            start = distance[path, column]
            fine_distance[row, place] = start
            come_from[row, place] = path * columns + column
            place += 1
            first = math.floor((start + same_m) / gap) + 1.0
            for number in range(more[path, column]):
                at = (first + number) * gap
                fine_distance[row, place] = at
                come_from[row, place] = before + new
                t[new] = 2.0 * (at / length[path]) - 1.0
                row_of[new] = row
                start_of[new] = path * columns + column
                place += 1
                new += 1
        for column in range(place, width - 1):
            fine_distance[row, column] = fine_distance[row, place - 1]
            come_from[row, column] = come_from[row, place - 1]
        fine_distance[row, width - 1] = length[path]
        come_from[row, width - 1] = path * columns + end


@compiled
def joined(before: NDArray[Any], more: NDArray[Any], come_from: Index, found: NDArray[Any]) -> None:
    """Values of before, flat, and new ones, put where `come_from` (g, w) says; `found` (g, w) is written."""
    size = before.size
    for row in range(come_from.shape[0]):
        for column in range(come_from.shape[1]):
            place = come_from[row, column]
            found[row, column] = before[place] if place < size else more[place - size]
