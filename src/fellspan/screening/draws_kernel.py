"""Draws of the errors along many paths, until their share tells on which side of what is asked planning's own share lies.

The samples are chosen as `design.draws` chooses them, near the heights as planned alone; the draws are `design.draws_kernel`'s.
A path's numbers depend on nothing but the path.

This module imports numba; import it where it is called. Knows no rasters, no rules and no columns of answers.
"""

import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.design import draws_kernel as drawing
from fellspan.design.draws import LEAST_M, MOST_POINTS, NEAR, OVERSHOOT
from fellspan.screening.errors_kernel import (
    AT,
    COVER,
    COVER_REACH,
    CURVE,
    FROM_A,
    FROM_B,
    GRADIENT,
    GROUND,
    PARTS,
    POSITION,
    REACH,
    SIGMA,
    SLOPE,
    SPARE,
    Codes,
    Flags,
    Floats,
    Index,
    taken_apart,
    to_spare,
)
from fellspan.screening.sure import FALLS, HOLDS, UNSURE
from fellspan.terrain.compiling import compiled

FIRST: Final = 256
"""Draws, and as many mirrored ones, that are made at a time."""


@compiled
def _gap(parts: Floats, points: Index, count: int, i: int) -> float:
    """How far point `i` stands for: half of what lies between its neighbours."""
    low, high = max(i - 1, 0), min(i + 1, count - 1)
    return float((parts[AT, points[high]] - parts[AT, points[low]]) / max(high - low, 1))


@compiled
def _thinned(parts: Floats, kept: Index, nearness: Floats, width: float, chosen: Index) -> int:
    """Write the nearest of the `kept` samples in each bin, wider where farther from governing, rising; give how many."""
    best = np.full(int(parts[AT, kept[-1]] / width) + 2, -1)
    for k in range(kept.size):
        i = kept[k]
        wide = 1.0 if nearness[i] < 1.0 else 2.0 if nearness[i] < 2.0 else 4.0
        own = math.floor(parts[AT, i] / (width * wide))
        if best[own] < 0 or nearness[i] < nearness[best[own]]:
            best[own] = i
    found = 0
    for k in range(kept.size):
        i = kept[k]
        wide = 1.0 if nearness[i] < 1.0 else 2.0 if nearness[i] < 2.0 else 4.0
        if best[math.floor(parts[AT, i] / (width * wide))] == i:
            chosen[found] = i
            found += 1
    return found


@compiled
def _median(values: Floats) -> float:
    """The middle one; of an even number the mean of the two."""
    ordered = np.sort(values)
    half = ordered.size // 2
    return float(ordered[half] if ordered.size % 2 else 0.5 * (ordered[half - 1] + ordered[half]))


@compiled
def _chosen(parts: Floats, count: int, tolerance: float, points: Index, spare: Floats, reach: float) -> int:
    """Write the samples to draw, both ends among them, and what they have to spare; give how many.

    As `design.draws` chooses them, and makes up for those that it leaves out.
    """
    nearness = np.empty(count)
    for i in range(count):
        nearness[i] = to_spare(parts, i, tolerance)
    least, near = nearness.min(), 0
    kept, everyone, gaps = np.empty(count, np.int64), np.arange(count), np.empty(count)
    for i in range(count):
        gaps[i] = _gap(parts, everyone, count, i)
        nearness[i] = math.floor(1e6 * min(nearness[i] - least, 2.0 * NEAR) + 0.5) / 1e6
        if nearness[i] < NEAR:
            kept[near] = i
            near += 1
    kept = kept[:near]
    chosen, found, width = kept.copy(), near, _median(gaps)
    while kept.size > MOST_POINTS:
        found = _thinned(parts, kept, nearness, width, chosen)
        if found <= MOST_POINTS:
            break
        width *= 1.5
    total = 0
    for k in range(found + 2):
        i = 0 if k == 0 else count - 1 if k == found + 1 else chosen[k - 1]
        if total == 0 or i > points[total - 1]:
            points[total] = i
            total += 1
    for k in range(total):
        own = gaps[points[k]]
        spacing = max(min(_gap(parts, points, total, k), 4.0 * width), own) if found < kept.size else own
        spare[k] = parts[SPARE, points[k]]
        if spacing > 1.01 * own:
            missed = math.sqrt(2.0 * spacing / reach) - math.sqrt(2.0 * own / reach)
            spare[k] -= OVERSHOOT * parts[SIGMA, points[k]] * max(missed, 0.0)
    return total


@compiled
def _sized(
    parts: Floats, points: Index, spare: Floats, count: int, model: Floats, sizes: NDArray[np.float32], rows: Index
) -> int:
    """Write what `drawing.failing` takes of the samples, and give how many rows of numbers come before the common ones."""
    row = count
    for i in range(count):
        at = points[i]
        apart = parts[AT, at] - parts[AT, points[i - 1]] if i > 0 else math.inf
        keep = math.exp(-apart / model[REACH])
        sizes[i, drawing.KEEP], sizes[i, drawing.FRESH] = keep, math.sqrt(1.0 - keep * keep)
        sizes[i, drawing.GROUND] = parts[GROUND, at]
        sizes[i, drawing.AT_A], sizes[i, drawing.AT_B] = -parts[FROM_A, at], -parts[FROM_B, at]
        sizes[i, drawing.ALONG] = parts[SLOPE, at] * model[POSITION]
        sizes[i, drawing.CURVE] = parts[CURVE, at] * model[GRADIENT]
        sizes[i, drawing.SPARE] = spare[i]
    for field in range(2):
        kind, of, scale = (COVER, COVER_REACH, 1.0) if field == 0 else (SLOPE, REACH, model[POSITION])
        first = drawing.KEEP_COVER if field == 0 else drawing.KEEP_SHIFT
        before = -math.inf
        for i in range(count):
            at, rows[i, field] = points[i], -1
            size = parts[kind, at] * scale
            if abs(size) > LEAST_M:
                keep = math.exp(-(parts[AT, at] - before) / model[of])
                sizes[i, first], sizes[i, first + 1], sizes[i, first + 2] = keep, math.sqrt(1.0 - keep * keep), size
                rows[i, field], before = row, parts[AT, at]
                row += 1
    return row


@compiled
def _decided(fails: int, twice: int, made: int, allowed: float, allowance: float, draws: int, room: float) -> int:
    """Whether a share of failing draws tells on which side of what is `allowed` the share of planning's `draws` lies.

    UNSURE while it does not; -1 where so many draws more would not tell either.
    """
    share = fails / (2.0 * made)
    # Of a draw and its mirror image; where few fail both, the mean of the two scatters less than that of two draws alone.
    spread = max((fails + 2.0 * twice) / (4.0 * made) - share * share, 0.5 * allowed * (1.0 - allowed))
    theirs = spread / (0.5 * draws)
    off = abs(share - allowed) - room
    if off > allowance * math.sqrt(theirs + spread / made):
        return HOLDS if share < allowed else FALLS
    if made >= 8 * FIRST and off + 3.0 * math.sqrt(spread / made) < allowance * math.sqrt(theirs):
        return -1
    return UNSURE


@compiled
def draw(
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
    numbers: NDArray[np.float32],
    allowed: float,
    allowance: float,
    draws: int,
    rooms: Floats,
    verdict: NDArray[np.int8],
    share: Floats,
    made: Index,
    drawn: Index,
) -> None:
    """Draw until the share of failing draws tells on which side of what is `allowed` planning's own share lies.

    Parameters
    ----------
    which ... tolerance
        As for `bound`.
    numbers
        Unit normals, float32.
    allowed, allowance, draws, rooms
        Share of draws that may fail; standard errors by which to be off it; how many draws planning makes; room for each, (m,).
    verdict, share, made, drawn
        (m,), written: UNSURE, HOLDS or FALLS; the share that holds; draws made, and mirrored ones; samples drawn.
    """
    width = distance.shape[1]
    parts, points, left = np.empty((PARTS, width)), np.empty(width, np.int64), np.empty(width)
    sizes, rows = np.zeros((width, drawing.COLUMNS), np.float32), np.empty((width, 2), np.int64)
    for m in range(which.size):
        row = which[m]
        taken_apart(
            row, last[row] + 1, distance, ground, spare, cover, bared, sigma, source, cell[row], a[row], b[row],
            models[row], parts,
        )  # fmt: skip
        count = _chosen(parts, last[row] + 1, tolerance, points, left, models[row, REACH])
        common = _sized(parts, points, left, count, models[row], sizes, rows)
        block = (common + 2) * FIRST
        fails = twice = done = 0
        found = UNSURE
        while found == UNSURE and done // FIRST < numbers.size // block:
            own = numbers[done // FIRST * block :]
            more, both = drawing.failing(own, FIRST, 0, FIRST, sizes[:count], rows[:count], common, tolerance)
            fails, twice, done = fails + more, twice + both, done + FIRST
            found = _decided(fails, twice, done, allowed, allowance, draws, rooms[m])
        verdict[m] = max(found, UNSURE)
        share[m] = 1.0 - fails / (2.0 * done) if done > 0 else 0.0
        made[m], drawn[m] = done, count
