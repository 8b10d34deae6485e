"""Errors of heights along many paths, taken apart at every sample as `design.draws` does for one, and how likely they do harm.

A path's numbers depend on nothing but the path. Its own samples are columns 0 to `last` - 1 and the very last column.

This module imports numba; import it where it is called. Knows no rasters, no rules and no columns of answers.
"""

import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.propagation.constants import EARTH_RADIUS_M
from fellspan.terrain.compiling import compiled

Floats = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]
Codes = NDArray[np.int16]

(AT, HEIGHT, SPARE, GROUND, COVER, SLOPE, CURVE, FROM_A, FROM_B, SIGMA) = range(10)
PARTS: Final = 10
"""Rows of what is worked out of a path: distance, height of the ground and height to spare, m; errors of ground and cover, m;
slope; bulge at k = 1, m; what the errors at A and at B do here, m; standard error of the clearance, m."""
(REACH, COVER_REACH, POSITION, GRADIENT) = range(4)
"""Columns of an error model: reaches of ground and cover, m, position error, m, error of 1/k."""
BEYOND: Final = 7.0
"""Samples with so many standard errors to spare do not fail: one draw in 10^12."""


@compiled
def _height_at(parts: Floats, count: int, at: float, near: int) -> float:
    """Height of the ground between samples; `near` is one close by."""
    j = min(near, count - 2)
    while j > 0 and parts[AT, j] > at:
        j -= 1
    while j < count - 2 and parts[AT, j + 1] < at:
        j += 1
    before, after = parts[AT, j], parts[AT, j + 1]
    return float(parts[HEIGHT, j] + (parts[HEIGHT, j + 1] - parts[HEIGHT, j]) * (at - before) / (after - before))


@compiled
def _ground_errors(parts: Floats, count: int, sigma: Floats, bare: Flags, source: Codes, seen: Index) -> None:
    """Error of the ground as `design.draws` has it: of the nearest bare sample of the same source, the stated one at most."""
    for i in range(count):  # the last bare one at or before each
        seen[i] = i if bare[i] else -1
        j = i - 1
        while seen[i] < 0 <= j:
            if source[j] == source[i]:
                seen[i] = seen[j]
                break
            j -= 1
    after = np.empty(count, np.int64)
    for i in range(count - 1, -1, -1):
        after[i] = i if bare[i] else -1
        j = i + 1
        while after[i] < 0 and j < count:
            if source[j] == source[i]:
                after[i] = after[j]
                break
            j += 1
        best = seen[i] if seen[i] >= 0 else after[i]
        if seen[i] >= 0 and after[i] >= 0 and parts[AT, after[i]] - parts[AT, i] < parts[AT, i] - parts[AT, seen[i]]:
            best = after[i]
        parts[GROUND, i] = min(sigma[best], sigma[i]) if best >= 0 else sigma[i]


@compiled
def taken_apart(
    row: int,
    count: int,
    distance: Floats,
    ground: Floats,
    spare: Floats,
    cover: Floats,
    bared: Flags,
    sigma: Floats,
    source: Codes,
    cell: float,
    a: float,
    b: float,
    model: Floats,
    parts: Floats,
) -> None:
    """Write the parts of one path, (PARTS, n). Where much is to spare the standard error may come out too great."""
    width = distance.shape[1]
    error, bare, codes = np.empty(count), np.ones(count, np.bool_), np.zeros(count, np.int16)
    for i in range(count):
        column = width - 1 if i == count - 1 else i
        parts[AT, i], parts[HEIGHT, i] = distance[row, column], ground[row, column]
        parts[SPARE, i] = spare[row, column]
        error[i] = sigma[row, column if sigma.shape[1] > 1 else 0]
        codes[i] = source[row, column if source.shape[1] > 1 else 0]
        if cover.shape[1] > 0:
            bare[i] = cover[row, column] == 0.0
        parts[GROUND, i] = error[i]
    if cover.shape[1] > 0:
        _ground_errors(parts, count, error, bare, codes, np.empty(count, np.int64))
    length, half = parts[AT, count - 1], max(0.5 * cell, 1e-6)
    reach, position, gradient = model[REACH], model[POSITION], model[GRADIENT]
    ends = math.exp(-length / reach)
    for i in range(count):
        at, own = parts[AT, i], parts[GROUND, i]
        total = error[i]
        if bared.shape[1] > 0 and bared[row, width - 1 if i == count - 1 else i]:
            total = own
        parts[COVER, i] = math.sqrt(max(total * total - own * own, 0.0))
        low, high = max(at - half, 0.0), min(at + half, length)
        rise = _height_at(parts, count, high, i) - _height_at(parts, count, low, i)
        # What is known exactly does not move with a shift along the path.
        slope = rise / (high - low) if total > 0.0 else 0.0
        curve = at * (length - at) / (2.0 * EARTH_RADIUS_M)
        from_a, from_b = (1.0 - at / length) * a, at / length * b
        rest = parts[COVER, i] ** 2 + 2.0 * (slope * position) ** 2 + (curve * gradient) ** 2
        variance = (own + from_a + from_b) ** 2 + rest
        if parts[SPARE, i] < BEYOND * math.sqrt(variance):
            shared = from_a * math.exp(-at / reach) + from_b * math.exp(-(length - at) / reach)
            variance = own * own + from_a * from_a + from_b * from_b - 2.0 * own * shared
            variance += 2.0 * from_a * from_b * ends + rest
        parts[SLOPE, i], parts[CURVE, i] = slope, curve
        parts[FROM_A, i], parts[FROM_B, i] = from_a, from_b
        parts[SIGMA, i] = math.sqrt(max(variance, 0.0))


@compiled
def to_spare(parts: Floats, i: int, tolerance: float) -> float:
    """Standard errors to spare at a sample."""
    if parts[SIGMA, i] > 0.0:
        return float(parts[SPARE, i] / parts[SIGMA, i])
    return math.inf if parts[SPARE, i] >= -tolerance else -math.inf


@compiled
def bound(
    which: Index,
    last: Index,
    distance: Floats,
    ground: Floats,
    spare: Floats,
    cover: Floats,
    bared: Flags,
    sigma: Floats,
    source: Codes,
    cell: Floats,
    a: Floats,
    b: Floats,
    models: Floats,
    tolerance: float,
    worst: Floats,
    together: Floats,
) -> None:
    """Write the probability that the worst sample fails, and the sum of those of all samples, (m,), of the paths `which`.

    Parameters
    ----------
    last, cell, a, b, models
        (q,) and (q, 4): index of the last sample, finest cell, m, errors of the antennas' levels, m, and error models.
    distance, ground, spare, cover, bared, sigma, source
        (q, n); `sigma` and `source` (q, 1) where they are one all along, `cover` and `bared` (q, 0) where there is none.
    """
    parts = np.empty((PARTS, distance.shape[1]))
    for m in range(which.size):
        row = which[m]
        count = last[row] + 1
        taken_apart(
            row, count, distance, ground, spare, cover, bared, sigma, source, cell[row], a[row], b[row], models[row], parts
        )  # fmt: skip
        worst[m] = together[m] = 0.0
        for i in range(count):
            z = to_spare(parts, i, tolerance)
            if z < BEYOND:
                fails = 0.5 * math.erfc(z / math.sqrt(2.0))
                worst[m] = max(worst[m], fails)
                together[m] += fails
