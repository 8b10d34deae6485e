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


def lowest_minima(values: NDArray[np.float64], *, last: NDArray[np.int64] | None = None) -> NDArray[np.bool_]:
    """The lowest interior local minima of each path, at most `MINIMA`; the lowest interior sample where there is none.

    Parameters
    ----------
    values
        Shape (..., n), n > 2.
    last
        Index of the last sample of each path, shape (...), where a path has fewer than n; what follows is left out.

    Returns
    -------
    minima
        Shape (..., n), True at the minima.
    """
    inner = values[..., 1:-1]
    low = (inner <= values[..., :-2]) & (inner <= values[..., 2:]) & np.isfinite(inner)
    if last is not None:
        inside = np.arange(1, values.shape[-1] - 1) < last[..., np.newaxis]
        low &= inside
        inner = np.where(inside, inner, np.inf)
    lowest = np.where(low, inner, np.inf)
    if inner.shape[-1] > MINIMA:
        # The sixth lowest bounds the rest; where others equal it, the first ones count.
        bound = np.partition(lowest, MINIMA - 1, axis=-1)[..., MINIMA - 1 : MINIMA]
        low &= inner <= bound
        crowded = low.sum(axis=-1) > MINIMA
        if crowded.any():
            order = np.argsort(lowest[crowded], axis=-1, kind="stable")[..., :MINIMA]
            few = np.zeros(lowest[crowded].shape, dtype=np.bool_)
            np.put_along_axis(few, order, True, axis=-1)
            low[crowded] = few
    none = ~low.any(axis=-1)
    if none.any():
        only = np.zeros(inner[none].shape, dtype=np.bool_)
        np.put_along_axis(only, np.argmin(inner[none], axis=-1)[..., np.newaxis], True, axis=-1)
        low[none] = only
    found = np.zeros(values.shape, dtype=np.bool_)
    found[..., 1:-1] = low
    return found
