"""Loops over rays of many paths: where each comes nearest to what it needs, and what is to be said of it.

`links.clearance`, `links.criteria`, `links.minima`, `links.evaluate` and `links.uncertainty` in one pass over each path, in the
same arithmetic; tests hold the two together. This module imports numba; import it where it is called. Columns of a path are as
`paths_kernel` has them: 0 to `last` - 1, and the very last one.
"""

import math

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.compiling import compiled_for_numbers

Floats = NDArray[np.float64]
Index = NDArray[np.int64]
Flags = NDArray[np.bool_]


@compiled_for_numbers
def _levels(
    distance: Floats,
    surface: Floats,
    end: int,
    a: float,
    b: float,
    curve: Floats,
    wavelength: float,
    at: Floats,
    above: Floats,
    radius: Floats,
    clear: Floats,
    normalised: Floats,
) -> None:
    """Of one path, samples 0 to `end` side by side: distances, ray above the surface, zone; a row for each criterion."""
    length = distance[-1]
    per_length = wavelength / length
    for i in range(end):
        d = distance[i]
        share = d / length
        at[i] = d
        above[i] = a * (1.0 - share) + b * share - surface[i]
        radius[i] = math.sqrt(per_length * d * (length - d))
    at[end], above[end], radius[end] = length, b - surface[-1], 0.0
    for rule in range(curve.size):
        bend = curve[rule]
        for i in range(end + 1):
            clear[rule, i] = above[i] - at[i] * (length - at[i]) * bend
        for i in range(1, end):
            normalised[rule, i] = clear[rule, i] / radius[i]
        normalised[rule, 0] = normalised[rule, end] = math.inf


@compiled_for_numbers
def _is_extended(at: Floats, normalised: Floats, end: int, band: float, share: float) -> bool:
    """As `links.criteria.are_extended`."""
    least = math.inf
    for i in range(end + 1):
        least = min(least, normalised[i])
    first, last, near = -1, -1, 0
    for i in range(end + 1):
        if normalised[i] <= least + band:
            first = i if first < 0 else first
            last = i
            near += 1
    if math.isinf(least) or last - first + 1 != near:
        return True
    return bool(at[min(last + 1, end)] - at[max(first - 1, 0)] >= share * (at[end] - at[0]))


@compiled_for_numbers
def _asked(
    at: Floats, normalised: Floats, end: int, band: float, share: float, extended: float, isolated: float
) -> float:
    """The fraction that the second criterion asks for; an infinite `isolated` says that it asks alike of all obstructions."""
    if math.isinf(isolated) or _is_extended(at, normalised, end, band, share):
        return extended
    return isolated


@compiled_for_numbers
def _mark_lowest(values: Floats, end: int, most: int, lowest: Floats, where: Index, wanted: Flags) -> None:
    """As `links.minima.lowest_minima`: the lowest `most` interior minima, of equals the first."""
    held = 0
    for i in range(1, end):
        value = values[i]
        if value > values[i - 1] or value > values[i + 1] or (held == most and value >= lowest[held - 1]):
            continue
        place = held if held < most else most - 1
        while place > 0 and lowest[place - 1] > value:
            lowest[place] = lowest[place - 1]
            where[place] = where[place - 1]
            place -= 1
        lowest[place] = value
        where[place] = i
        held = min(held + 1, most)
    if held == 0:
        best = 1
        for i in range(2, end):
            best = i if values[i] < values[best] else best
        wanted[best] = True
    for place in range(held):
        wanted[where[place]] = True


@compiled_for_numbers
def look(
    distance: Floats,
    surface: Floats,
    last: Index,
    a: Floats,
    b: Floats,
    curve: Floats,
    fraction: Floats,
    isolated: Floats,
    wavelength: float,
    band: float,
    share: float,
    most: int,
    step: Floats,
    same_m: float,
    more: NDArray[np.int32],
    total: Index,
) -> None:
    """How many samples a closer look puts after each of a path.

    Parameters
    ----------
    distance, surface
        (q, n), m.
    last, a, b
        (q,): index of the last sample, levels of the antennas.
    curve, fraction
        (q, c), of each criterion: 1 / (2 k a), and the fraction of the zone; `fraction` of the second becomes `isolated`, (q,),
        where that is finite and what comes nearest is not extended.
    wavelength, band, share, most
        m; the two figures by which obstructions are isolated; how many minima count.
    step, same_m
        (q,), what divides the new distances; what stands so near to a sample is left out.
    more, total
        (q, n) and (q,), written: new samples after each sample, and how many the path then has.
    """
    count, rules = distance.shape[1], curve.shape[1]
    at, above, radius = np.empty(count), np.empty(count), np.empty(count)
    clear, normalised = np.empty((rules, count)), np.empty((rules, count))
    wanted = np.zeros(count, dtype=np.bool_)
    lowest, where = np.empty(most), np.empty(most, dtype=np.int64)
    for path in range(distance.shape[0]):
        end = last[path]
        _levels(
            distance[path],
            surface[path],
            end,
            a[path],
            b[path],
            curve[path],
            wavelength,
            at,
            above,
            radius,
            clear,
            normalised,
        )
        wanted[: end + 1] = False
        for rule in range(rules):
            asked = fraction[path, rule]
            if rule == 1:
                asked = _asked(at, normalised[rule], end, band, share, asked, isolated[path])
            _mark_lowest(normalised[rule], end, most, lowest, where, wanted)
            for i in range(end + 1):
                clear[rule, i] -= asked * radius[i]
            _mark_lowest(clear[rule], end, most, lowest, where, wanted)
        found = end + 1
        gap = step[path]
        for i in range(end):
            more[path, i] = 0
            if wanted[i] or wanted[i + 1]:
                new = math.ceil((at[i + 1] - same_m) / gap) - (math.floor((at[i] + same_m) / gap) + 1.0)
                more[path, i] = max(int(new), 0)
                found += more[path, i]
        total[path] = found


@compiled_for_numbers
def _worst(at: Floats, normalised: Floats, end: int, same: float) -> int:
    """As `links.clearance.worst_index`."""
    lowest = math.inf
    for i in range(end + 1):
        lowest = min(lowest, normalised[i])
    best, away, middle = 0, math.inf, 0.5 * at[end]
    for i in range(end + 1):
        if normalised[i] <= lowest + same and abs(at[i] - middle) < away:
            best, away = i, abs(at[i] - middle)
    return best


@compiled_for_numbers
def _variance(
    d: float, length: float, error: float, a: float, b: float, cell: float, like_a: bool, like_b: bool, both: float
) -> float:
    """As `links.uncertainty.clearance_variance_m2`."""
    share = d / length
    variance = error * error + ((1.0 - share) * a) ** 2 + (share * b) ** 2
    if like_a and d < cell:
        variance -= 2.0 * (1.0 - d / length) * (1.0 - d / cell) * min(error, a) ** 2
    if like_b and length - d < cell:
        variance -= 2.0 * (1.0 - (length - d) / length) * (1.0 - (length - d) / cell) * min(error, b) ** 2
    return max(variance + 2.0 * share * (1.0 - share) * both, 0.0)


@compiled_for_numbers
def judge(  # noqa: PLR0912, PLR0915  # one pass: a call for each part of it would cost more than the part
    distance: Floats,
    surface: Floats,
    last: Index,
    a: Floats,
    b: Floats,
    curve: Floats,
    fraction: Floats,
    isolated: Floats,
    median_curve: float,
    wavelength: float,
    band: float,
    share: float,
    tolerance: float,
    same: float,
    error: Floats,
    source: NDArray[np.int16],
    a_error: Floats,
    b_error: Floats,
    cell: Floats,
    left_out: Floats,
    trees: Flags,
    z_asked: float,
    spare: Floats,
    numbers: Floats,
    answers: NDArray[np.int64],
) -> None:
    """What is to be said of paths.

    Parameters
    ----------
    distance to isolated, wavelength, band, share
        As for `look`; the surface without gaps.
    median_curve
        1 / (2 k a) of the median k, at which sight is judged.
    tolerance, same
        A height missing by less is not missing; values that differ by less are equal.
    error, source
        (q, n) or (q, 1): standard error of what must be cleared, and where it comes from.
    a_error, b_error, cell
        (q,): errors of the antennas' levels, the finest cell.
    left_out, trees
        (q, n), or (q, 0) where there is none: level of cover that was left out, -inf elsewhere; where the surface is trees.
    z_asked
        Standard errors that the confidence asked stands for.
    spare
        (q, n), written: the least over criteria of what is left of the clearance, own cover counted in.
    numbers
        (q, 6), written: least normalised clearance under the governing criterion, where, height to add at B alone, the same for
        the confidence asked and over own cover, least margin in standard errors, share of the path at its sample nearest
        mid-path.
    answers
        (q, 4), written: governing criterion; 1 all met or 0; 1 cut; 1 trees in the zone, 2 own cover in the way, or their sum.
    """
    count, rules = distance.shape[1], curve.shape[1]
    at, above, radius = np.empty(count), np.empty(count), np.empty(count)
    clear, normalised = np.empty((rules, count)), np.empty((rules, count))
    least = np.empty(count)
    worst, missing, at_worst = np.empty(rules, dtype=np.int64), np.empty(rules), np.empty(rules)
    wide_error, wide_source = error.shape[1] > 1, source.shape[1] > 1
    for path in range(distance.shape[0]):
        end = last[path]
        _levels(
            distance[path],
            surface[path],
            end,
            a[path],
            b[path],
            curve[path],
            wavelength,
            at,
            above,
            radius,
            clear,
            normalised,
        )
        length = at[end]
        least[: end + 1] = math.inf
        met = True
        for rule in range(rules):
            asked = fraction[path, rule]
            if rule == 1:
                asked = _asked(at, normalised[rule], end, band, share, asked, isolated[path])
            lowest = math.inf
            for i in range(end + 1):
                clear[rule, i] -= asked * radius[i]
                lowest = min(lowest, clear[rule, i])
                least[i] = min(least[i], clear[rule, i])
            worst[rule] = _worst(at, normalised[rule], end, same)
            at_worst[rule] = clear[rule, worst[rule]]
            missing[rule] = -lowest if -lowest > tolerance else 0.0
            met = met and missing[rule] == 0.0
        governing = np.argmin(at_worst) if met else np.argmax(missing)

        ends_a, ends_b = a_error[path], b_error[path]
        first = source[path, 0]
        final = source[path, source.shape[1] - 1]
        size = max(cell[path], 1e-9)
        both = 0.0
        if first == final and length < size:
            both = (1.0 - length / size) * min(ends_a, ends_b) ** 2
        # No error is greater than this one: most samples are too far from the ray to matter.
        greatest = error[path, 0]
        if wide_error:
            for i in range(count):
                greatest = max(greatest, error[path, i])
        greatest = math.sqrt(greatest**2 + max(ends_a, ends_b) ** 2 + 0.5 * both) * (1.0 + 1e-9) + 1e-12
        nearest = 0
        for i in range(end + 1):
            nearest = i if least[i] < least[nearest] else nearest
        sure, extra_sure = math.inf, 0.0
        for number in range(-1, end + 1):
            # The one nearest to its need goes first.
            i = nearest if number < 0 else number
            if least[i] >= sure * greatest and z_asked * greatest - least[i] <= tolerance:
                continue
            column = i if i < end else count - 1
            here = source[path, column] if wide_source else first
            wrong = error[path, column] if wide_error else error[path, 0]
            sigma = math.sqrt(_variance(at[i], length, wrong, ends_a, ends_b, size, here == first, here == final, both))
            if sigma > 0.0:
                sure = min(sure, least[i] / sigma)
            elif least[i] < -tolerance:
                sure = -math.inf
            lacking = z_asked * sigma - least[i]
            if lacking > tolerance:
                extra_sure = max(extra_sure, lacking * length / at[i] if i > 0 else math.inf)
        extra = 0.0
        for i in range(end + 1 if not met else 0):
            if -least[i] > tolerance:
                extra = max(extra, -least[i] * length / at[i] if i > 0 else math.inf)
        lowest = math.inf
        for i in range(end + 1):
            lowest = min(lowest, above[i] - at[i] * (length - at[i]) * median_curve)
        cut = -lowest > tolerance
        in_trees, over = False, False
        if trees.shape[1] > 0:
            for i in range(end + 1):
                in_trees = in_trees or (least[i] < 0.0 and trees[path, i if i < end else count - 1])
        for i in range(end + 1):
            spare[path, i if i < end else count - 1] = least[i]
        if left_out.shape[1] > 0:
            for i in range(end + 1):
                column = i if i < end else count - 1
                room = (
                    above[i] + surface[path, column] - left_out[path, column] - at[i] * (length - at[i]) * median_curve
                )
                if -room > tolerance:
                    over = True
                    extra_sure = max(extra_sure, -room * length / at[i] if i > 0 else math.inf)
                spare[path, column] = min(least[i], room)
        for column in range(end, count - 1):
            spare[path, column] = spare[path, end - 1]
        middle = 0
        while at[middle] < 0.5 * length:
            middle += 1
        middle -= 0.5 * length - at[middle - 1] <= at[middle] - 0.5 * length
        numbers[path, 0] = normalised[governing, worst[governing]]
        numbers[path, 1] = at[worst[governing]]
        numbers[path, 2] = extra
        numbers[path, 3] = extra_sure
        numbers[path, 4] = sure
        numbers[path, 5] = at[middle] / length
        answers[path, 0] = governing
        answers[path, 1] = met
        answers[path, 2] = cut
        answers[path, 3] = (1 if in_trees else 0) + (2 if over else 0)
