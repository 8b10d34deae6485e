"""Diffraction over a real profile: the Bullington construction and the complete delta-Bullington method.

Works on bare arrays and 1/k, batched over leading axes; knows nothing of rasters or links. A batch is one call, never a loop.
"""

from collections.abc import Callable
from copy import copy

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, quiet
from fellspan.propagation._blocks import in_blocks
from fellspan.propagation.constants import EARTH_RADIUS_M, STANDARD_K
from fellspan.propagation.free_space import wavelength_m
from fellspan.propagation.knife_edge import knife_edge_loss_db
from fellspan.propagation.refraction import inverse_k
from fellspan.propagation.spherical import spherical_earth_loss_db


class _Path:
    """The distances of a batch of paths and what follows from them alone; reused for the real and the smooth profile."""

    def __init__(self, distance_m: ArrayLike, k: ArrayLike, frequency_hz: ArrayLike) -> None:
        self.all = as_floats(distance_m)
        self.length = self.all[..., -1]
        self.wavelength = as_floats(wavelength_m(frequency_hz))
        self.curve = as_floats(inverse_k(k)) / (2.0 * EARTH_RADIUS_M)

    def of_rows(self, rows: NDArray[np.intp], shape: tuple[int, ...]) -> "_Path":
        """Those rows of the first axis of a batch of that shape."""
        part = copy(self)
        part.all = _rows_of(self.all, rows, (*shape, self.all.shape[-1]))
        part.length = part.all[..., -1]
        part.wavelength, part.curve = (_rows_of(value, rows, shape) for value in (self.wavelength, self.curve))
        return part

    def bullington_db(self, height_m: FloatArray, a: FloatArray, b: FloatArray) -> FloatArray:
        """Loss over heights `height_m` (..., n), or (..., 1) for a level, between antenna levels `a` and `b` (...).

        The printed equations with the ray taken off every height first. A horizon of slope S against the ray leaves sight free
        where S < 0, and the two horizon rays cross at nu = sqrt(2 d Sa Sb / wavelength), which rounding cannot lead out of the
        path.
        """
        return _over_horizons_db(self._maxima(height_m, a, b), self.length, self.wavelength)

    def _maxima(self, height_m: FloatArray, a: FloatArray, b: FloatArray) -> FloatArray:
        """Slopes of both horizons against the ray, and the greatest height above it over sqrt(d1 d2); shape (3, ...).

        Whatever is not asked for is left at minus infinity: the second where sight is free, the third where it is not.
        """
        shape = np.broadcast_shapes(self.length.shape, height_m.shape[:-1], a.shape, b.shape, self.curve.shape)
        found = np.full((3, *shape), -np.inf)
        for piece, (path, height), (a_, b_, curve) in in_blocks(shape, (self.all, height_m), (a, b, self.curve)):
            out = found[:, piece] if shape else found
            from_a, length = path[..., 1:-1], path[..., -1:]
            from_b = length - from_a
            above = height[..., 1:-1] if height.shape[-1] > 1 else height
            above = above - _ray(a_, b_, from_a, length)
            bent = curve[..., np.newaxis]
            out[0] = _highest(_with(above / from_a, bent, from_b))
            free = out[0] < 0.0
            if free.any():
                root = np.sqrt(from_a * from_b)
                out[2] = _highest(_with(above / root, bent, root))
            if not free.all():
                out[1] = _highest(_with(above / from_b, bent, from_a))
        return found


def _over_horizons_db(horizons: FloatArray, length: FloatArray, wavelength: FloatArray) -> FloatArray:
    slope_a, slope_b, above = horizons
    nu = np.sqrt(2.0 * length / wavelength) * np.where(
        slope_a < 0.0,  # (50), (51)
        above,  # line of sight: the profile point with the largest nu. (52), (53)
        np.sqrt(slope_a * np.maximum(slope_b, 0.0)),  # beyond the horizon. (54) to (56)
    )
    edge = as_floats(knife_edge_loss_db(nu))
    return np.asarray(edge + (1.0 - np.exp(-edge / 6.0)) * (10.0 + 0.02 * length / 1000.0))  # (57)


def _rows_of(array: FloatArray, rows: NDArray[np.intp], shape: tuple[int, ...]) -> FloatArray:
    """Rows of the first axis of an array that broadcasts to `shape`; the array itself where it is the same in all."""
    return array[rows] if array.ndim == len(shape) and array.shape[0] > 1 else array


def _ray(a: FloatArray, b: FloatArray, from_a: FloatArray, length: FloatArray) -> FloatArray:
    """Level of the straight line between the antennas, m above sea level."""
    start = a[..., np.newaxis]
    level = from_a * ((b[..., np.newaxis] - start) / length)
    level += start
    return level


def _with(value: FloatArray, factor: FloatArray, times: FloatArray) -> FloatArray:
    """value + factor * times, with one temporary less where shapes allow."""
    product = factor * times
    return (
        np.add(product, value, out=product)
        if product.ndim == value.ndim and product.size >= value.size
        else product + value
    )


def _highest(values: FloatArray) -> FloatArray:
    """Largest along the path; minus infinity where a profile has no interior point; NaN wherever one is in it."""
    return np.asarray(np.max(values, axis=-1, initial=-np.inf))


def bullington_loss_db(
    distance_m: ArrayLike,
    height_m: ArrayLike,
    *,
    a_amsl_m: ArrayLike,
    b_amsl_m: ArrayLike,
    frequency_hz: ArrayLike,
    k: ArrayLike = STANDARD_K,
) -> Result:
    """Diffraction loss by the Bullington construction: the profile becomes one edge.

    Parameters
    ----------
    distance_m
        Distances from A, m, rising from 0 to the path length; shape (n,), shared, or (..., n).
    height_m
        Heights of the profile above sea level, m, without bulge; shape (..., n). The first and last are not used.
    a_amsl_m, b_amsl_m
        Antenna heights above sea level, m, shape (...).
    frequency_hz, k
        Frequency, Hz, and effective Earth radius factor (infinite and negative are legal), shape (...).

    Returns
    -------
    loss_db
        Loss relative to free space, dB, shape (...). NaN where k = 0 or an interior height is NaN.

    Notes
    -----
    Rec. ITU-R P.526-16, section 4.5.1, equations (49) to (57), above 30 MHz. Sees profile points only: sample flat ground and
    water as closely as the rest. Source key: p526-16-bullington.
    """
    with quiet():
        path = _Path(distance_m, k, frequency_hz)
        return as_result(path.bullington_db(as_floats(height_m), as_floats(a_amsl_m), as_floats(b_amsl_m)))


def effective_heights_m(
    distance_m: ArrayLike, ground_m: ArrayLike, *, a_amsl_m: ArrayLike, b_amsl_m: ArrayLike
) -> tuple[Result, Result]:
    """Antenna heights above the smooth surface that stands in for the terrain.

    Parameters
    ----------
    distance_m, ground_m, a_amsl_m, b_amsl_m
        As for `delta_bullington_loss_db`.

    Returns
    -------
    a_height_m, b_height_m
        m, each of shape (...).

    Notes
    -----
    Rec. ITU-R P.526-16, section 4.5.2, equations (58) to (64): a straight line through the ground with the same area and
    moment, lowered where terrain stands in the way and never above the ground at the ends. Source key:
    p526-16-delta-bullington.
    """
    d, h = as_floats(distance_m), as_floats(ground_m)
    a, b = as_floats(a_amsl_m), as_floats(b_amsl_m)
    shape = np.broadcast_shapes(d.shape[:-1], h.shape[:-1], a.shape, b.shape)
    found = np.empty((2, *shape))
    with quiet():
        for piece, (path, ground), (a_, b_) in in_blocks(shape, (d, h), (a, b)):
            out = found[:, piece] if shape else found
            out[0], out[1] = _smooth_ends_m(path, ground, a_, b_)
        return (
            as_result(a - np.minimum(found[0], h[..., 0])),  # (64)
            as_result(b - np.minimum(found[1], h[..., -1])),
        )


def _smooth_ends_m(d: FloatArray, h: FloatArray, a: FloatArray, b: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Levels of the smooth surface at both ends, before it is held below the ground there."""
    # (58), (59) summed by samples instead of by stretches: every height enters with the stretches on both sides of it.
    length, from_a, inner = d[..., -1], d[..., 1:-1], h[..., 1:-1]
    before, after = d[..., :-2], d[..., 2:]
    first, last = d[..., 1] * h[..., 0], (length - d[..., -2]) * h[..., -1]
    weighed = (after - before) * inner
    v1 = np.sum(weighed, axis=-1) + first + last  # (58)
    moment = after + before
    moment += from_a
    v2 = np.sum(np.multiply(moment, weighed, out=weighed), axis=-1)  # (59)
    v2 = v2 + first * d[..., 1] + last * (2.0 * length + d[..., -2])
    fit_a = (2.0 * v1 * length - v2) / length**2  # (60)
    fit_b = (v2 - v1 * length) / length**2  # (61)

    above = inner - _ray(a, b, from_a, d[..., -1:])  # no bulge here
    highest = _highest(above)
    if not np.any(highest > 0.0):
        return fit_a, fit_b
    toward_a, toward_b = _highest(above / from_a), _highest(above / (d[..., -1:] - from_a))
    share_a = toward_a / (toward_a + toward_b)
    clear = highest <= 0.0
    return (
        np.where(clear, fit_a, fit_a - highest * share_a),  # (63)
        np.where(clear, fit_b, fit_b - highest * (1.0 - share_a)),
    )


def delta_bullington_loss_db(
    distance_m: ArrayLike,
    ground_m: ArrayLike,
    *,
    a_amsl_m: ArrayLike,
    b_amsl_m: ArrayLike,
    frequency_hz: ArrayLike,
    k: ArrayLike = STANDARD_K,
    polarization: ArrayLike = "horizontal",
    sea_fraction: ArrayLike = 0.0,
    surface_m: ArrayLike | None = None,
) -> Result:
    """Diffraction loss over a general path, by the complete delta-Bullington method.

    Parameters
    ----------
    distance_m
        Distances from A, m, rising from 0 to the path length; shape (n,), shared, or (..., n).
    ground_m
        Bare ground above sea level, m, without bulge; shape (..., n).
    a_amsl_m, b_amsl_m
        Antenna heights above sea level, m, shape (...), not below the ground at their ends.
    frequency_hz
        Frequency, Hz, shape (...).
    k
        Effective Earth radius factor, shape (...); Earth radius k * 6371 km. Infinite and negative are legal.
    polarization
        "horizontal" or "vertical".
    sea_fraction
        Fraction of the path over sea, 0 to 1, shape (...).
    surface_m
        Ground with trees and buildings above sea level, m, shape (..., n). Where given, the Bullington part of the real
        profile uses it, while the smooth surface is still fitted to `ground_m`.

    Returns
    -------
    loss_db
        Loss relative to free space, dB, shape (...). NaN where k = 0, where a height is NaN, or where an antenna lies below
        the smooth surface. An antenna below its own ground is for the caller to refuse: most such cases have a value.

    Notes
    -----
    Rec. ITU-R P.526-16, section 4.5.2, equations (58) to (66), in self-consistent units. Where k is negative the spherical
    part is undefined and adds nothing; at infinite k it is the flat-Earth limit. The surface heights follow P.1812-8,
    equations (13) and (83) to (87). Source key: p526-16-delta-bullington.
    """
    a_height_m, b_height_m = effective_heights_m(distance_m, ground_m, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m)
    return fitted_delta_bullington_loss_db(
        distance_m,
        ground_m if surface_m is None else surface_m,
        a_amsl_m=a_amsl_m,
        b_amsl_m=b_amsl_m,
        a_height_m=a_height_m,
        b_height_m=b_height_m,
        frequency_hz=frequency_hz,
        k=k,
        polarization=polarization,
        sea_fraction=sea_fraction,
    )


def fitted_delta_bullington_loss_db(
    distance_m: ArrayLike,
    height_m: ArrayLike,
    *,
    a_amsl_m: ArrayLike,
    b_amsl_m: ArrayLike,
    a_height_m: ArrayLike,
    b_height_m: ArrayLike,
    frequency_hz: ArrayLike,
    k: ArrayLike,
    polarization: ArrayLike,
    sea_fraction: ArrayLike,
) -> Result:
    """`delta_bullington_loss_db` over heights (..., n) where the effective heights of the antennas, m, are known already."""
    a, b = as_floats(a_height_m), as_floats(b_height_m)
    with quiet():
        path = _Path(distance_m, k, frequency_hz)
        actual = path.bullington_db(as_floats(height_m), as_floats(a_amsl_m), as_floats(b_amsl_m))
        spherical = as_floats(
            spherical_earth_loss_db(
                path.length,
                a_height_m=a,
                b_height_m=b,
                frequency_hz=frequency_hz,
                k=k,
                polarization=polarization,
                sea_fraction=sea_fraction,
            )
        )
        added = _added_db(path, spherical, a, b)
        negative = (path.curve < 0.0) & (np.minimum(a, b) >= 0.0)
        return as_result(actual + np.where(negative, 0.0, added))  # (66)


def _added_db(path: _Path, spherical: FloatArray, a: FloatArray, b: FloatArray) -> FloatArray:
    """What the smooth Earth costs beyond its own Bullington loss; that is worked out only where it costs anything."""
    costs = ~(spherical <= 0.0)
    if not costs.any():
        return np.zeros(spherical.shape)
    rows = np.flatnonzero(costs.reshape((*costs.shape[:1], -1)).any(axis=-1)) if costs.ndim else None
    if rows is None or rows.size == costs.shape[0]:
        return np.asarray(np.maximum(spherical - path.bullington_db(np.zeros(1), a, b), 0.0))
    added = np.zeros(spherical.shape)
    part = path.of_rows(rows, costs.shape)
    a, b = (_rows_of(value, rows, costs.shape) for value in (a, b))
    added[rows] = np.maximum(spherical[rows] - part.bullington_db(np.zeros(1), a, b), 0.0)
    return added


def delta_bullington_over_horizons_db(
    horizons: FloatArray,
    smooth_horizons: Callable[[NDArray[np.intp]], FloatArray],
    *,
    length_m: FloatArray,
    a_height_m: FloatArray,
    b_height_m: FloatArray,
    frequency_hz: FloatArray,
    k: FloatArray,
    polarization: ArrayLike,
    sea_fraction: FloatArray,
) -> FloatArray:
    """`fitted_delta_bullington_loss_db` of many paths whose horizons are known already, dB, shape (p, ...).

    Parameters
    ----------
    horizons
        Shape (3, p, ...): slopes of the horizons of A and of B against the ray, and the greatest height above it over
        sqrt(d1 d2); the second counts where the first is not below 0, the third where it is.
    smooth_horizons
        Gives the same of the smooth Earth, a level of 0 seen from the effective heights, for some of the p paths.
    length_m, a_height_m, b_height_m, frequency_hz, k, sea_fraction
        Broadcast to (p, ...); `length_m` has as many axes.
    polarization
        "horizontal" or "vertical".
    """
    with quiet():
        wavelength = as_floats(wavelength_m(frequency_hz))
        actual = _over_horizons_db(horizons, length_m, wavelength)
        spherical = as_floats(
            spherical_earth_loss_db(
                length_m,
                a_height_m=a_height_m,
                b_height_m=b_height_m,
                frequency_hz=frequency_hz,
                k=k,
                polarization=polarization,
                sea_fraction=sea_fraction,
            )
        )
        negative = (as_floats(inverse_k(k)) < 0.0) & (np.minimum(a_height_m, b_height_m) >= 0.0)
        costs = np.broadcast_to(~(spherical <= 0.0) & ~negative, actual.shape)
        rows = np.flatnonzero(costs.reshape((costs.shape[0], -1)).any(axis=-1))
        if rows.size:
            smooth = _over_horizons_db(smooth_horizons(rows), length_m[rows], wavelength)
            added = np.maximum(np.broadcast_to(spherical, actual.shape)[rows] - smooth, 0.0)
            actual[rows] += np.where(np.broadcast_to(negative, actual.shape)[rows], 0.0, added)  # (66)
        return actual
