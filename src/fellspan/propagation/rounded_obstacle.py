"""Diffraction over a rounded hilltop, and the radius to use for one; knows nothing of profiles."""

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import Result, as_floats, as_result, not_negative, positive, quiet
from fellspan.propagation.free_space import wavelength_m
from fellspan.propagation.knife_edge import knife_edge_loss_db, knife_edge_nu


def rounded_obstacle_extra_db(m: ArrayLike, n: ArrayLike) -> Result:
    """What roundness adds to the knife-edge loss, dB, from the two dimensionless numbers of the method.

    Notes
    -----
    Rec. ITU-R P.526-16, section 4.2. The two branches do not meet at m n = 4: a jump there is in the published text. Source
    key: p526-16-rounded.
    """
    m_, n_ = not_negative(m), as_floats(n)
    mn = m_ * n_
    common = 7.2 * np.sqrt(m_) + 3.6 * m_**1.5 - 0.8 * m_**2
    with quiet():
        beyond = -6.0 - 20.0 * np.log10(mn) + common - (2.0 - 17.0 * n_) * m_
    return as_result(np.where(mn > 4.0, beyond, common - (2.0 - 12.5 * n_) * m_))


def rounded_obstacle_loss_db(
    vertex_above_ray_m: ArrayLike,
    *,
    from_a_m: ArrayLike,
    from_b_m: ArrayLike,
    radius_m: ArrayLike,
    frequency_hz: ArrayLike,
) -> Result:
    """Diffraction loss over one rounded obstacle.

    Parameters
    ----------
    vertex_above_ray_m
        Height above the straight ray of the point where the tangents from both ends meet above the obstacle, m.
    from_a_m, from_b_m
        Distances of that point from the two ends, m.
    radius_m
        Radius of the hilltop, m, zero or more; see `hilltop_radius_m`.
    frequency_hz
        Frequency, Hz.

    Returns
    -------
    loss_db
        Loss relative to free space, dB, broadcast shape; the knife edge for radius 0.

    Notes
    -----
    Rec. ITU-R P.526-16, section 4.2, equations (32) to (37), with the knife edge by (31). For hilltops smooth to
    `smooth_enough_m`. Source key: p526-16-rounded.
    """
    radius, height = not_negative(radius_m), as_floats(vertex_above_ray_m)
    a, b = positive(from_a_m), positive(from_b_m)
    edge = as_floats(knife_edge_loss_db(knife_edge_nu(height, from_a_m=a, from_b_m=b, frequency_hz=frequency_hz)))
    with quiet():
        size = np.pi * radius / as_floats(wavelength_m(frequency_hz))
        m = radius * (a + b) / (a * b) / np.cbrt(size)
        n = height * np.cbrt(size) ** 2 / radius
    return as_result(np.where(radius == 0.0, edge, edge + as_floats(rounded_obstacle_extra_db(m, n))))


def hilltop_radius_m(from_apex_m: ArrayLike, below_apex_m: ArrayLike) -> Result:
    """Radius of a hilltop from samples of its profile.

    Parameters
    ----------
    from_apex_m
        Horizontal distance of each sample from the apex, m, shape (..., n).
    below_apex_m
        How far each sample lies below the apex, m, shape (..., n). Give those within about one F1 of the apex.

    Returns
    -------
    radius_m
        m, shape (...): the mean of x^2/(2 y) over samples that lie below the apex; NaN where none does.

    Notes
    -----
    Rec. ITU-R P.526-16, section 4.2, equation (38). Source key: p526-16-rounded.
    """
    x, y = np.broadcast_arrays(as_floats(from_apex_m), as_floats(below_apex_m))
    use = ~(y <= 0.0)  # a NaN stays in, and so comes out
    with quiet():
        each = np.where(use, x * x / (2.0 * y), 0.0)
        return as_result(each.sum(axis=-1) / use.sum(axis=-1))


def smooth_enough_m(radius_m: ArrayLike, *, frequency_hz: ArrayLike) -> Result:
    """Largest irregularity, m, up to which a hilltop counts as smooth: 0.04 (R wavelength^2)^(1/3).

    Notes
    -----
    Rec. ITU-R P.526-16, equation (5). Source key: p526-16-rounded.
    """
    return as_result(0.04 * np.cbrt(not_negative(radius_m) * as_floats(wavelength_m(frequency_hz)) ** 2))
