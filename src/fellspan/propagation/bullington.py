"""Diffraction over a real profile: the Bullington construction and the complete delta-Bullington method.

Works on bare arrays and 1/k, batched over leading axes; knows nothing of rasters or links. A batch is one call, never a loop.
"""

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, quiet
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
        self.from_a = self.all[..., 1:-1]
        self.from_b = self.length[..., None] - self.from_a
        self.wavelength = as_floats(wavelength_m(frequency_hz))
        inverse_radius = as_floats(inverse_k(k)) / EARTH_RADIUS_M
        self.bulge = self.from_a * self.from_b * (inverse_radius / 2.0)[..., None]

    def bullington_db(self, inner_m: FloatArray | float, a: FloatArray, b: FloatArray) -> FloatArray:
        """Loss over interior heights `inner_m` (..., n - 2) between antenna levels `a` and `b` (...)."""
        length = self.length
        a_, b_, length_ = a[..., None], b[..., None], length[..., None]
        top = inner_m + self.bulge
        slope_a = _highest((top - a_) / self.from_a)  # (50)
        slope_ray = (b - a) / length  # (51)

        # Line of sight: the profile point with the largest nu. (52), (53)
        above_ray = top - (a_ * self.from_b + b_ * self.from_a) / length_
        nu_sight = _highest(
            above_ray * np.sqrt(2.0 * length_ / (self.wavelength[..., None] * self.from_a * self.from_b))
        )

        # Beyond the horizon: the point where the two horizon rays cross. (54) to (56)
        slope_b = _highest((top - b_) / self.from_b)
        cross = (b - a + slope_b * length) / (slope_a + slope_b)
        if self.from_a.shape[-1]:
            # The rays cross between the two horizons; at grazing, where differences cancel, rounding must not lead out.
            cross = np.clip(cross, self.from_a[..., 0], self.from_a[..., -1])
        cross = np.where(slope_a + slope_b == 0.0, length / 2.0, cross)
        above = a + slope_a * cross - (a * (length - cross) + b * cross) / length
        nu_cross = above * np.sqrt(2.0 * length / (self.wavelength * cross * (length - cross)))

        edge = as_floats(knife_edge_loss_db(np.where(slope_a < slope_ray, nu_sight, nu_cross)))
        return np.asarray(edge + (1.0 - np.exp(-edge / 6.0)) * (10.0 + 0.02 * length / 1000.0))  # (57)


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
        return as_result(path.bullington_db(as_floats(height_m)[..., 1:-1], as_floats(a_amsl_m), as_floats(b_amsl_m)))


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
    length = d[..., -1]
    step, d0, d1, h0, h1 = np.diff(d, axis=-1), d[..., :-1], d[..., 1:], h[..., :-1], h[..., 1:]
    from_a = d[..., 1:-1]
    from_b = length[..., None] - from_a
    with quiet():
        v1 = np.sum(step * (h1 + h0), axis=-1)  # (58)
        v2 = np.sum(step * (h1 * (2.0 * d1 + d0) + h0 * (d1 + 2.0 * d0)), axis=-1)  # (59)
        fit_a = (2.0 * v1 * length - v2) / length**2  # (60)
        fit_b = (v2 - v1 * length) / length**2  # (61)

        above = h[..., 1:-1] - (a[..., None] * from_b + b[..., None] * from_a) / length[..., None]  # no bulge here
        highest, toward_a, toward_b = _highest(above), _highest(above / from_a), _highest(above / from_b)
        share_a = toward_a / (toward_a + toward_b)
        clear = highest <= 0.0
        fit_a = np.where(clear, fit_a, fit_a - highest * share_a)  # (63)
        fit_b = np.where(clear, fit_b, fit_b - highest * (1.0 - share_a))
        return (
            as_result(a - np.minimum(fit_a, h[..., 0])),  # (64)
            as_result(b - np.minimum(fit_b, h[..., -1])),
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
    height_a, height_b = effective_heights_m(distance_m, ground_m, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m)
    a, b = as_floats(height_a), as_floats(height_b)
    with quiet():
        path = _Path(distance_m, k, frequency_hz)
        profile = as_floats(ground_m if surface_m is None else surface_m)[..., 1:-1]
        actual = path.bullington_db(profile, as_floats(a_amsl_m), as_floats(b_amsl_m))
        smooth = path.bullington_db(0.0, a, b)
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
        added = np.maximum(spherical - smooth, 0.0)
        negative = (as_floats(inverse_k(k)) < 0.0) & (np.minimum(a, b) >= 0.0)
        return as_result(actual + np.where(negative, 0.0, added))  # (66)
