"""The one quantity of the house: the height a ray needs, need = surface + bulge(k) + fraction * F1, and what follows from it.

Pure functions of arrays: path arrays have shape (..., n), per-path arguments (...). Knows nothing of rasters, sites, causes
or verdicts. Heights are m above sea level, distances m from A, and the ray is the straight line between the antennas; the
Earth's curve at the given k stands in `bulge`.
"""

import math
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.links.levels import PathLevels
from fellspan.propagation import earth_bulge_m, fresnel_radius_m

Floats = NDArray[np.float64]

TOLERANCE_M: Final = 1e-6
"""Rounding of the arithmetic, m: a height that is missing by less is not missing."""

SAME: Final = 1e-9
"""Values that differ by less are equal but for rounding."""


def _per_path(value: ArrayLike) -> Floats:
    """A per-path argument with the path axis added, so that it broadcasts against (..., n)."""
    return np.asarray(value, dtype=np.float64)[..., np.newaxis]


def available_m(distance_m: ArrayLike, *, a_amsl_m: ArrayLike, b_amsl_m: ArrayLike) -> Floats:
    """Level of the straight ray between antennas at `a_amsl_m` and `b_amsl_m`, shape (..., n)."""
    distance = np.asarray(distance_m, dtype=np.float64)
    share = distance / distance[..., -1:]
    return np.asarray(_per_path(a_amsl_m) * (1.0 - share) + _per_path(b_amsl_m) * share)


def bulge_m(distance_m: ArrayLike, *, k: ArrayLike) -> Floats:
    """Earth bulge above the chord, m, shape (..., n); 0 for infinite k, negative for negative k."""
    distance = np.asarray(distance_m, dtype=np.float64)
    return np.asarray(earth_bulge_m(distance, distance[..., -1:] - distance, k=_per_path(k)), dtype=np.float64)


def zone_radius_m(distance_m: ArrayLike, *, frequency_hz: ArrayLike) -> Floats:
    """Radius of the first Fresnel zone, m, shape (..., n); 0 at the ends."""
    distance = np.asarray(distance_m, dtype=np.float64)
    from_b = distance[..., -1:] - distance
    return np.asarray(fresnel_radius_m(distance, from_b, frequency_hz=_per_path(frequency_hz)), dtype=np.float64)


def need_m(
    surface_m: ArrayLike, distance_m: ArrayLike, *, k: ArrayLike, fraction: ArrayLike, frequency_hz: ArrayLike
) -> Floats:
    """Height that the ray must have: surface + bulge(k) + fraction * F1, m above sea level, shape (..., n).

    Parameters
    ----------
    surface_m
        What must be cleared, m above sea level, (..., n).
    distance_m
        From A, (..., n), rising, first 0, last the path length.
    k
        Effective Earth radius factor, (...); infinite and negative are legal.
    fraction
        Required fraction of the first Fresnel zone radius, (...).
    frequency_hz
        Hz, > 0, (...).
    """
    return (
        np.asarray(surface_m, dtype=np.float64)
        + bulge_m(distance_m, k=k)
        + _per_path(fraction) * zone_radius_m(distance_m, frequency_hz=frequency_hz)
    )


def path_levels(
    distance_m: Floats,
    surface_m: Floats,
    *,
    a_amsl_m: float,
    b_amsl_m: float,
    k: ArrayLike,
    fraction: ArrayLike,
    frequency_hz: float,
) -> PathLevels:
    """Levels of one path for several criteria: `k` and `fraction` have shape (c,)."""
    return PathLevels(
        distance_m=distance_m.copy(),
        surface_m=surface_m.copy(),
        available_m=available_m(distance_m, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m),
        fresnel_radius_m=zone_radius_m(distance_m, frequency_hz=frequency_hz),
        bulge_m=bulge_m(distance_m, k=k),
        need_m=need_m(surface_m, distance_m, k=k, fraction=fraction, frequency_hz=frequency_hz),
    )


def normalised_clearance(clearance_m: ArrayLike, fresnel_radius_m: ArrayLike) -> Floats:
    """Clearance / F1, shape (..., n); +inf where the zone has no width (the two ends)."""
    radius = np.asarray(fresnel_radius_m, dtype=np.float64)
    with np.errstate(divide="ignore", invalid="ignore"):
        result = np.asarray(np.asarray(clearance_m, dtype=np.float64) / radius)
    np.copyto(result, np.inf, where=~(radius > 0.0))
    return result


def worst_index(values: Floats, distance_m: Floats) -> int:
    """Index of the least value; of values equal but for rounding the one nearest mid-path, so that A-B equals B-A."""
    return int(worst_indices(values, distance_m))


def worst_indices(values: Floats, distance_m: Floats) -> NDArray[np.intp]:
    """As `worst_index`, for arrays of shape (..., n): indices of shape (...)."""
    found = np.asarray(np.argmin(values, axis=-1))
    least = np.take_along_axis(values, found[..., np.newaxis], axis=-1)
    ties = values <= least + SAME
    many = np.count_nonzero(ties, axis=-1) > 1
    if many.any():
        from_middle = np.abs(distance_m - 0.5 * distance_m[..., -1:])
        near = np.broadcast_to(from_middle, values.shape)[many]
        found[many] = np.argmin(np.where(ties[many], near, np.inf), axis=-1)
    return found


def extra_heights_m(shortfall_m: ArrayLike, distance_m: ArrayLike) -> tuple[Floats, Floats, Floats]:
    """Height to add at A alone, at B alone, at both alike so that no shortfall is left, each of shape (...).

    Raising A by h lifts the ray by h * (1 - x) at the share x of the path. Infinite where the shortfall stands at the other
    end; 0 where nothing is missing.
    """
    shortfall = np.asarray(shortfall_m, dtype=np.float64)
    share = _share(distance_m)
    missing = shortfall > TOLERANCE_M
    both = np.where(missing, shortfall, 0.0).max(axis=-1)
    return _at_one_end(shortfall, 1.0 - share), _at_one_end(shortfall, share), np.asarray(both)


def _share(distance_m: ArrayLike) -> Floats:
    distance = np.asarray(distance_m, dtype=np.float64)
    return np.asarray(distance / distance[..., -1:])


def _at_one_end(shortfall: Floats, lever: Floats) -> Floats:
    """Height to add where each metre lifts the ray by `lever`, (..., n); infinite where that is nothing."""
    missing = shortfall > TOLERANCE_M
    height = np.zeros(shortfall.shape)
    np.divide(shortfall, lever, out=height, where=missing & (lever > 0.0))
    height[missing & (lever <= 0.0)] = np.inf
    return np.asarray(height.max(axis=-1))


def probability_met(margin_m: ArrayLike, sigma_m: ArrayLike) -> Floats:
    """Probability that no height is missing anywhere, shape (...), from margins and standard errors of shape (..., n).

    Errors are taken as normal and fully correlated along the path (one raster too high or too low as a whole), so the
    probability is that of the single worst sample, Phi(min(margin / sigma)). A standard error of 0 makes it a step.
    """
    margin, sigma = np.asarray(margin_m, dtype=np.float64), np.asarray(sigma_m, dtype=np.float64)
    if bool((sigma > 0.0).all()):
        worst = np.asarray((margin / sigma).min(axis=-1))
    else:
        margin, sigma = np.broadcast_arrays(margin, sigma)
        z = np.where(margin >= -TOLERANCE_M, np.inf, -np.inf)
        np.divide(margin, sigma, out=z, where=sigma > 0.0)
        worst = z.min(axis=-1)
    return _normal(worst)


def _normal(z: Floats) -> Floats:
    """Probability that a standard normal number is below `z`; SciPy loads for batches (c, q) only."""
    if z.ndim < 2:
        few = [0.5 * (1.0 + math.erf(value / math.sqrt(2.0))) for value in np.ravel(z)]
        return np.asarray(few, dtype=np.float64).reshape(z.shape)
    from scipy.special import erf

    return np.asarray(0.5 * (1.0 + erf(z / math.sqrt(2.0))))


def stretches(shortfall_m: Floats, distance_m: Floats) -> list[tuple[int, int, float, float]]:
    """Contiguous stretches of shortfall on one path: (first index, last index, from_m, to_m), edges interpolated."""
    missing = np.concatenate(([False], shortfall_m > TOLERANCE_M, [False]))
    change = np.flatnonzero(missing[1:] != missing[:-1])
    found = []
    for first, after in zip(change[::2].tolist(), change[1::2].tolist(), strict=True):
        last = after - 1
        from_m = _edge(shortfall_m, distance_m, first, first - 1) if first > 0 else float(distance_m[0])
        to_m = _edge(shortfall_m, distance_m, last, after) if after < distance_m.size else float(distance_m[-1])
        found.append((first, last, from_m, to_m))
    return found


def _edge(shortfall: Floats, distance: Floats, inside: int, outside: int) -> float:
    """Where the shortfall passes 0 between a sample that lacks height and its neighbour that does not."""
    lacking, spare = float(shortfall[inside]), min(float(shortfall[outside]), 0.0)
    share = lacking / (lacking - spare)
    return float(distance[inside] + share * (distance[outside] - distance[inside]))
