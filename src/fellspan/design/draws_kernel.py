"""Draws of height errors along one path, and in how many of them any sample fails: the arithmetic of `design.draws`, compiled.

Works draw by draw in blocks that stay near the processor, so that draws can be made a few at a time and stopped at any number.
This module imports numba; import it where it is called. Knows no rules, links or files.
"""

from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.compiling import compiled

Singles = NDArray[np.float32]

BLOCK: Final = 256
"""Draws, and as many mirrored ones, that are worked on at once."""
(
    KEEP,
    FRESH,
    GROUND,
    KEEP_COVER,
    FRESH_COVER,
    COVER,
    KEEP_SHIFT,
    FRESH_SHIFT,
    SHIFT,
    AT_A,
    AT_B,
    ALONG,
    CURVE,
    SPARE,
) = range(14)
COLUMNS: Final = 14
"""What `failing` takes of each sample. Of three fields: what is kept of the sample before, what is new, and the size in m.
Then in m: the errors at A and at B, of the shift along the path and of the gradient; and the height to spare."""


@compiled
def _carry(field: Singles, keep: np.float32, fresh: np.float32, numbers: Singles) -> None:
    """Carry a field on by one sample."""
    for j in range(numbers.size):
        field[j] = keep * field[j] + fresh * numbers[j]


@compiled
def _carry_and_add(
    field: Singles, keep: np.float32, fresh: np.float32, numbers: Singles, part: np.float32, error: Singles
) -> None:
    """Carry a field on by one sample, and let it count."""
    for j in range(numbers.size):
        field[j] = keep * field[j] + fresh * numbers[j]
        error[j] += part * field[j]


@compiled
def failing(
    normals: Singles,
    stride: int,
    first: int,
    stop: int,
    sizes: Singles,
    rows: NDArray[np.int64],
    common: int,
    least: float,
) -> tuple[int, int]:
    """In how many of the draws `first` to `stop` and their mirror images any sample fails, and in how many pairs both do.

    Parameters
    ----------
    normals
        Unit normals, float32; number j of row r at r * stride + j. Rows 0 to m - 1 are those of the ground.
    first, stop
        Draws, `stop` at most `stride`.
    sizes
        (m, COLUMNS), the first sample at A, the last at B.
    rows
        (m, 2): rows of the fields of cover and of the shift; -1 where the sample has none.
    common
        Row of the shift along the path; that of the gradient is the next.
    least
        What a sample may miss and still hold, m.
    """
    count = sizes.shape[0]
    field, cover, shift = np.empty(BLOCK, np.float32), np.empty(BLOCK, np.float32), np.empty(BLOCK, np.float32)
    up, down, error = np.empty(BLOCK, np.float32), np.empty(BLOCK, np.float32), np.empty(BLOCK, np.float32)
    at_a, at_b = np.empty(BLOCK, np.float32), np.empty(BLOCK, np.float32)
    fails, twice = 0, 0
    for low in range(first, stop, BLOCK):
        size = min(BLOCK, stop - low)
        for j in range(size):
            at_a[j] = at_b[j] = field[j] = normals[low + j]
            cover[j] = shift[j] = 0.0
            up[j] = down[j] = -np.inf
        for i in range(1, count):
            at = i * stride + low
            _carry(at_b, sizes[i, KEEP], sizes[i, FRESH], normals[at : at + size])
        at = common * stride + low
        along, bent = normals[at : at + size], normals[at + stride : at + stride + size]
        for i in range(count):
            if i > 0:
                at = i * stride + low
                _carry(field, sizes[i, KEEP], sizes[i, FRESH], normals[at : at + size])
            ground, a, b = sizes[i, GROUND], sizes[i, AT_A], sizes[i, AT_B]
            on, curve, spare = sizes[i, ALONG], sizes[i, CURVE], sizes[i, SPARE]
            for j in range(size):
                error[j] = ground * field[j] + a * at_a[j] + b * at_b[j] + on * along[j] + curve * bent[j]
            if rows[i, 0] >= 0:
                new, at = sizes[i, KEEP_COVER : COVER + 1], rows[i, 0] * stride + low
                _carry_and_add(cover, new[0], new[1], normals[at : at + size], new[2], error)
            if rows[i, 1] >= 0:
                new, at = sizes[i, KEEP_SHIFT : SHIFT + 1], rows[i, 1] * stride + low
                _carry_and_add(shift, new[0], new[1], normals[at : at + size], new[2], error)
            for j in range(size):
                up[j] = max(up[j], error[j] - spare)
                down[j] = max(down[j], -error[j] - spare)
        for j in range(size):
            over, under = up[j] > least, down[j] > least
            fails += int(over) + int(under)
            twice += int(over and under)
    return fails, twice
