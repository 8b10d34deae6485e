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
    count = values.shape[-1]
    rows = values.reshape(-1, count)
    inner = rows[:, 1:-1]
    low = inner <= rows[:, :-2]
    low &= inner <= rows[:, 2:]
    if last is not None:
        low &= np.arange(1, count - 1) < last.reshape(-1, 1)
    found = np.zeros(rows.shape, dtype=np.bool_)
    path, at = np.nonzero(low)
    level = inner[path, at]
    if not np.isfinite(level).all():
        known = np.isfinite(level)
        path, at, level = path[known], at[known], level[known]
    many = np.bincount(path, minlength=rows.shape[0])
    # The minima of each path side by side, so that few numbers are sorted.
    rank = np.arange(path.size) - (np.cumsum(many) - many)[path]
    lowest = np.full((rows.shape[0], max(int(many.max(initial=0)), MINIMA + 1)), np.inf)
    lowest[path, rank] = level
    bound = np.partition(lowest, MINIMA - 1, axis=1)[:, MINIMA - 1]
    chosen = level <= bound[path]
    crowded = np.flatnonzero(np.bincount(path[chosen], minlength=rows.shape[0]) > MINIMA)
    if crowded.size:
        # Where others equal the sixth lowest, the first ones count.
        order = np.argsort(lowest[crowded], axis=1, kind="stable")[:, :MINIMA]
        few = np.zeros(lowest.shape, dtype=np.bool_)
        few[crowded[:, np.newaxis], order] = True
        within = np.isin(path, crowded)
        chosen[within] = few[path[within], rank[within]]
    found[path[chosen], at[chosen] + 1] = True
    for row in np.flatnonzero(many == 0).tolist():
        own = inner[row] if last is None else inner[row, : int(last.reshape(-1)[row]) - 1]
        found[row, 1 + int(np.argmin(own))] = True
    return found.reshape(values.shape)
