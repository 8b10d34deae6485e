"""Loops over many paths for diffraction: horizons of the Bullington construction, and the smooth Earth fitted to the ground.

`propagation.bullington` in one pass over each path; tests hold the two together. This module imports numba; import it where it
is called. Knows no losses and no frequencies.
"""

import math

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.compiling import compiled_for_numbers

Floats = NDArray[np.float64]


@compiled_for_numbers
def horizons(distance: Floats, height: Floats, a: Floats, b: Floats, curve: Floats, found: Floats) -> None:
    """Slopes of both horizons against the ray, and the greatest height above it over sqrt(d1 d2).

    Parameters
    ----------
    distance
        (q, n), m, rising from 0; repeats do no harm.
    height
        (q, n), m above sea level, or (q, 0): a level Earth at 0.
    a, b
        (q,), levels of the antennas.
    curve
        (q, m), 1 / (2 k a).
    found
        (3, q, m), written; minus infinity for what is not asked for: the second where sight is free, the third where it is not.
    """
    count, level = distance.shape[1], height.shape[1] == 0
    above, slope, other = np.empty(count), np.empty(count), np.empty(count)
    for path in range(distance.shape[0]):
        length = distance[path, count - 1]
        rise = (b[path] - a[path]) / length
        for i in range(1, count - 1):
            d = distance[path, i]
            above[i] = (0.0 if level else height[path, i]) - (a[path] + d * rise)
            slope[i] = above[i] / d
        ready = 0  # what `other` holds: 1 heights over roots, 2 slopes seen from B
        for number in range(curve.shape[1]):
            bend = curve[path, number]
            most = -math.inf
            for i in range(1, count - 1):
                most = max(most, slope[i] + bend * (length - distance[path, i]))
            found[0, path, number] = most
            found[1, path, number] = found[2, path, number] = -math.inf
            next_most = -math.inf
            if most < 0.0:
                if ready != 1:
                    for i in range(1, count - 1):
                        other[i] = above[i] / math.sqrt(distance[path, i] * (length - distance[path, i]))
                    ready = 1
                for i in range(1, count - 1):
                    root = math.sqrt(distance[path, i] * (length - distance[path, i]))
                    next_most = max(next_most, other[i] + bend * root)
                found[2, path, number] = next_most
            else:
                if ready != 2:
                    for i in range(1, count - 1):
                        other[i] = above[i] / (length - distance[path, i])
                    ready = 2
                for i in range(1, count - 1):
                    next_most = max(next_most, other[i] + bend * distance[path, i])
                found[1, path, number] = next_most


@compiled_for_numbers
def smooth_ends(distance: Floats, ground: Floats, a: Floats, b: Floats, ends: Floats, mean: Floats) -> None:
    """Levels of the smooth surface at both ends, (2, q), held below the ground there; and the mean of the ground, (q,); m."""
    count = distance.shape[1]
    for path in range(distance.shape[0]):
        length = distance[path, count - 1]
        rise = (b[path] - a[path]) / length
        area, moment = 0.0, 0.0
        highest, toward_a, toward_b = -math.inf, -math.inf, -math.inf
        for i in range(count - 1):
            d, after = distance[path, i], distance[path, i + 1]
            here, there = ground[path, i], ground[path, i + 1]
            area += (after - d) * (here + there)
            moment += (after - d) * (here * (2.0 * d + after) + there * (d + 2.0 * after))
            above = here - (a[path] + d * rise)
            if i > 0:
                highest = max(highest, above)
                if above > 0.0:
                    toward_a = max(toward_a, above / d)
                    toward_b = max(toward_b, above / (length - d))
        fit_a = (2.0 * area * length - moment) / length**2
        fit_b = (moment - area * length) / length**2
        if highest > 0.0:
            share = toward_a / (toward_a + toward_b)
            fit_a -= highest * share
            fit_b -= highest * (1.0 - share)
        ends[0, path] = min(fit_a, ground[path, 0])
        ends[1, path] = min(fit_b, ground[path, count - 1])
        mean[path] = 0.5 * area / length
