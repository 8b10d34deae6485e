"""The draws of `design.draws` where nothing is asked but in how many of them a link holds: the same ones, many times quicker.

Sums come out in another order, so that a draw that only just holds may fall on the other side: one in 10,000 at times.
"""

import numpy as np
from numpy.typing import NDArray

from fellspan.design.draws import DRAWS, SEED, Parts, links_of
from fellspan.design.error_model import GRADIENT_UNIT, ErrorModel
from fellspan.design.normals import normals
from fellspan.links import clearance

Floats = NDArray[np.float64]


def share_that_holds(parts: Parts, distance_m: Floats, spare_m: Floats, model: ErrorModel) -> float:
    """Share of the draws in which no sample lacks height: `Draws.holds`.

    Parameters
    ----------
    parts
        Of a case, with m samples.
    distance_m
        Of the samples from A, (m,).
    spare_m
        What the ray has to spare at them on the heights in the data, less what thinning left out, (m,).
    """
    from fellspan.design import draws_kernel as kernel

    points, half = parts.points.size, DRAWS // 2
    sizes = np.zeros((points, kernel.COLUMNS), dtype=np.float32)
    sizes[1:, kernel.KEEP], sizes[1:, kernel.FRESH] = links_of(distance_m, model.ground_reach_m)
    sizes[:, kernel.GROUND] = parts.ground_m
    rows = np.full((points, 2), -1, dtype=np.int64)
    row = points
    columns = (
        (kernel.KEEP_COVER, kernel.FRESH_COVER, kernel.COVER),
        (kernel.KEEP_SHIFT, kernel.FRESH_SHIFT, kernel.SHIFT),
    )
    for number, ((some, own, reach_m), (keep, fresh, size)) in enumerate(zip(parts.fields, columns, strict=True)):
        if some.size == 0:
            continue
        rows[some, number] = row + np.arange(some.size)
        row += some.size
        sizes[some, size] = own[some]
        sizes[some[0], fresh] = 1.0
        sizes[some[1:], keep], sizes[some[1:], fresh] = links_of(distance_m[some], reach_m)
    sizes[:, kernel.AT_A : kernel.CURVE + 1] = parts.common
    sizes[:, kernel.ALONG] *= np.float32(model.position_error_m)
    sizes[:, kernel.CURVE] *= np.float32(model.gradient_error * GRADIENT_UNIT)
    sizes[:, kernel.SPARE] = spare_m
    numbers = normals(SEED, parts.rows * half)
    fails, _ = kernel.failing(numbers, half, 0, half, sizes, rows, row, clearance.TOLERANCE_M)
    return (2 * half - fails) / (2 * half)
