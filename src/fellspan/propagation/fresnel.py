"""Fresnel zone radius and Earth bulge along a path; knows nothing of profiles or criteria."""

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import Result, as_floats, as_result, not_negative, positive, quiet
from fellspan.propagation.constants import EARTH_RADIUS_M
from fellspan.propagation.free_space import wavelength_m
from fellspan.propagation.refraction import inverse_k


def fresnel_radius_m(
    from_a_m: ArrayLike, from_b_m: ArrayLike, *, frequency_hz: ArrayLike, zone: ArrayLike = 1
) -> Result:
    """Radius of a Fresnel zone where a plane cuts the ray at right angles.

    Parameters
    ----------
    from_a_m, from_b_m
        Distances from the two ends, m, zero or more.
    frequency_hz
        Frequency, Hz. All arguments broadcast: for paths (..., n), give (..., 1).
    zone
        Number of the zone, from 1.

    Returns
    -------
    radius_m
        m, broadcast shape; 0 at either end; NaN where a distance is negative or both are 0, or frequency or zone is not
        above zero.

    Notes
    -----
    Rec. ITU-R P.526-16, equation (2), in self-consistent units: sqrt(n wavelength d1 d2 / (d1 + d2)). Source key:
    p526-16-fresnel.
    """
    a, b = not_negative(from_a_m), not_negative(from_b_m)
    with quiet():
        return as_result(np.sqrt(positive(zone) * as_floats(wavelength_m(frequency_hz)) * a * b / (a + b)))


def earth_bulge_m(from_a_m: ArrayLike, from_b_m: ArrayLike, *, k: ArrayLike) -> Result:
    """How far the Earth stands above the chord between the two ends, once the ray is drawn straight.

    Parameters
    ----------
    from_a_m, from_b_m
        Distances from the two ends, m.
    k
        Effective Earth radius factor; may be infinite (no bulge) or negative (a hollow).

    Returns
    -------
    bulge_m
        m, broadcast shape; NaN where k = 0.

    Notes
    -----
    d1 d2 / (2 k 6371 km), the parabola that Rec. ITU-R P.526-16 uses in equation (49); with kilometres, d1 d2 / (12.742 k).
    Source key: earth-bulge.
    """
    return as_result(as_floats(from_a_m) * as_floats(from_b_m) * (as_floats(inverse_k(k)) / (2.0 * EARTH_RADIUS_M)))
