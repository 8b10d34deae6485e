"""How often low k lifts the Earth into the ray: outage by diffraction fading, from the spread of the refractivity gradient.

Knows no terrain: what a k costs comes in as arrays of 1/k and loss.
"""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, positive, quiet
from fellspan.propagation.refraction import inverse_k_from_gradient

TAIL_PERCENT: Final = 99.9


def gradient_spread_n_per_km(
    *, median_n_per_km: ArrayLike, tail_n_per_km: ArrayLike, tail_percent: ArrayLike = TAIL_PERCENT
) -> Result:
    """Standard deviation of a normal law through the median gradient and one point of its tail, N-units per km.

    NaN where the tail does not lie above the median. Source key: gradient-normal-law.
    """
    from scipy.special import ndtri  # heavy to load, and most callers never come here

    with quiet():
        deviations = ndtri(as_floats(tail_percent) / 100.0)
        spread = (as_floats(tail_n_per_km) - as_floats(median_n_per_km)) / positive(deviations)
        return as_result(positive(spread))


def diffraction_outage_percent(
    margin_db: ArrayLike,
    *,
    inverse_k: ArrayLike,
    loss_db: ArrayLike,
    median_n_per_km: ArrayLike,
    tail_n_per_km: ArrayLike,
    tail_percent: ArrayLike = TAIL_PERCENT,
) -> Result:
    """Percentage of time for which diffraction costs more than a margin.

    Parameters
    ----------
    margin_db
        Margin left for diffraction, dB, shape (...): that of a budget less whatever diffraction loss the budget counts already,
        if `loss_db` counts it too.
    inverse_k
        Rising values of 1/k at which the loss is known, shape (n,) or (..., n), at least two; they should reach past the tail.
    loss_db
        Diffraction loss at those, dB, shape (n,) or (..., n). Straight lines between them; held beyond the ends.
    median_n_per_km, tail_n_per_km, tail_percent
        Gradient dN/dh not exceeded for 50 % and for `tail_percent` of the time, N-units per km, shape (...). The period of the
        result is that of the tail: a map of the average year gives the year; the worst month takes the gradient of
        `k_exceeded_99_9`, by `gradient_from_k_n_per_km`.

    Returns
    -------
    outage_percent
        Shape (...); NaN where the tail does not lie above the median, or where a loss needed is NaN.

    Notes
    -----
    Our own rule: the gradient follows a normal law through those two points. Real tails are longer on one side, and the point
    gradient of a map is no average over a path, so that on paths beyond some 20 km the result is pessimistic.
    Source keys: gradient-normal-law, p452-18-k.
    """
    nodes = as_floats(inverse_k)
    if nodes.ndim < 1 or nodes.shape[-1] < 2 or not np.all(np.diff(nodes, axis=-1) > 0.0):
        raise ValueError("inverse_k must be rising rows of at least two values")
    median = as_floats(inverse_k_from_gradient(median_n_per_km))
    spread = as_floats(
        gradient_spread_n_per_km(
            median_n_per_km=median_n_per_km, tail_n_per_km=tail_n_per_km, tail_percent=tail_percent
        )
    ) * float(as_floats(inverse_k_from_gradient(1.0)) - as_floats(inverse_k_from_gradient(0.0)))
    over = as_floats(loss_db) - as_floats(margin_db)[..., np.newaxis]
    shape = np.broadcast_shapes(nodes.shape[:-1], over.shape[:-1], median.shape, spread.shape)
    # Where no loss is above the margin, or not a number, there is no outage: what is left is worked out row by row.
    asked = np.broadcast_to(~(over <= 0.0).all(axis=-1) | np.isnan(spread), shape)
    if not asked.any():
        return as_result(np.zeros(shape))
    share = np.zeros(shape)
    share[asked] = _share(
        np.broadcast_to(nodes, (*shape, nodes.shape[-1]))[asked],
        np.broadcast_to(over, (*shape, over.shape[-1]))[asked],
        np.broadcast_to(median, shape)[asked],
        np.broadcast_to(spread, shape)[asked],
    )
    return as_result(100.0 * share)


def _share(nodes: FloatArray, over: FloatArray, median: FloatArray, spread: FloatArray) -> FloatArray:
    """Share of time, 0 to 1, for which rows of `over` (r, n), known at `nodes` (r, n), are above 0."""
    left, right = over[..., :-1], over[..., 1:]
    before, after = nodes[..., :-1], nodes[..., 1:]
    with quiet():
        crossing = before + (after - before) * np.where(np.isinf(left), 1.0, np.clip(left / (left - right), 0.0, 1.0))
    # The part of each stretch that costs more than the margin: from its left end, to its right end, all of it, or none.
    start = np.where(left > 0.0, before, np.where(right > 0.0, crossing, after))
    end = np.where(right > 0.0, after, np.where(left > 0.0, crossing, after))
    inside = _between(start, end, median[..., np.newaxis], spread[..., np.newaxis]).sum(axis=-1)
    below = np.where(over[..., 0] > 0.0, _normal((nodes[..., 0] - median) / spread), 0.0)
    above = np.where(over[..., -1] > 0.0, _normal((median - nodes[..., -1]) / spread), 0.0)
    share = np.where(np.isnan(over).any(axis=-1), np.nan, below + inside + above)
    return np.asarray(np.clip(share, 0.0, 1.0))


def _between(start: FloatArray, end: FloatArray, median: FloatArray, spread: FloatArray) -> FloatArray:
    """Share of time between two values of 1/k; the upper tail is used so that small shares keep their digits."""
    return _normal((median - start) / spread) - _normal((median - end) / spread)


def _normal(deviations: FloatArray) -> FloatArray:
    from scipy.special import ndtr

    return np.asarray(ndtr(deviations), dtype=np.float64)
