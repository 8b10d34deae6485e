"""Where along a path the ray comes nearest to what it needs: the stretches worth a closer look.

Reads levels only; knows nothing of terrain or verdicts.
"""

from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.links import clearance
from fellspan.links.levels import PathLevels

MINIMA: Final = 6
"""How many local minima of each margin are looked at again."""


def worst_windows(levels: PathLevels) -> tuple[tuple[float, float], ...]:
    """Stretches round the least margins and normalised clearances of every criterion, sorted and merged."""
    distance = levels.distance_m
    margin = levels.available_m - levels.need_m
    clear = levels.available_m - levels.surface_m - levels.bulge_m
    rows = np.concatenate((margin, clearance.normalised_clearance(clear, levels.fresnel_radius_m)))
    wanted = np.flatnonzero(lowest_minima(rows).any(axis=0))
    merged: list[tuple[float, float]] = []
    for index in wanted.tolist():
        from_m, to_m = float(distance[max(index - 1, 0)]), float(distance[min(index + 1, distance.size - 1)])
        if merged and from_m <= merged[-1][1]:
            merged[-1] = (merged[-1][0], to_m)
        else:
            merged.append((from_m, to_m))
    return tuple(merged)


def lowest_minima(values: NDArray[np.float64]) -> NDArray[np.bool_]:
    """The lowest interior local minima of each row, at most `MINIMA`, of equals the first; the lowest sample if there is none.

    `values` has shape (..., n), n > 2; the answer has the same, True at the minima.
    """
    found = np.zeros(values.shape, dtype=np.bool_)
    inner = values[..., 1:-1]
    low = (inner <= values[..., :-2]) & (inner <= values[..., 2:]) & np.isfinite(inner)
    for row in np.ndindex(values.shape[:-1]):
        at = np.flatnonzero(low[row])
        if at.size == 0:
            at = np.argmin(inner[row], keepdims=True)
        order = np.argsort(inner[row][at], kind="stable")[:MINIMA]
        found[row][at[order] + 1] = True
    return found
