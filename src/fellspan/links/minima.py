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
    wanted: set[int] = set()
    for row in (*margin, *clearance.normalised_clearance(clear, levels.fresnel_radius_m)):
        wanted.update(_local_minima(row))
    merged: list[tuple[float, float]] = []
    for index in sorted(wanted):
        from_m, to_m = float(distance[max(index - 1, 0)]), float(distance[min(index + 1, distance.size - 1)])
        if merged and from_m <= merged[-1][1]:
            merged[-1] = (merged[-1][0], to_m)
        else:
            merged.append((from_m, to_m))
    return tuple(merged)


def _local_minima(values: NDArray[np.float64]) -> list[int]:
    """The lowest interior local minima, at most `MINIMA`."""
    inner = values[1:-1]
    low = 1 + np.flatnonzero((inner <= values[:-2]) & (inner <= values[2:]) & np.isfinite(inner))
    if not low.size:
        low = np.asarray([1 + int(np.argmin(inner))])
    return [int(index) for index in low[np.argsort(values[low], kind="stable")][:MINIMA]]
