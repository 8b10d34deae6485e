"""Diffraction over one or two sharp edges; knows nothing of profiles. SciPy loads only when the exact form is asked for."""

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import Result, as_floats, as_result, positive, quiet
from fellspan.propagation.constants import KNIFE_EDGE_FLOOR_NU
from fellspan.propagation.free_space import wavelength_m


def knife_edge_nu(
    above_ray_m: ArrayLike, *, from_a_m: ArrayLike, from_b_m: ArrayLike, frequency_hz: ArrayLike
) -> Result:
    """Fresnel-Kirchhoff diffraction parameter of an edge.

    Parameters
    ----------
    above_ray_m
        Height of the edge above the straight ray, m, bulge included; negative where the ray passes above.
    from_a_m, from_b_m
        Distances from the two ends, m.
    frequency_hz
        Frequency, Hz.

    Returns
    -------
    nu
        Dimensionless, broadcast shape; -sqrt(2) times clearance over F1. NaN where a distance is not above zero.

    Notes
    -----
    Rec. ITU-R P.526-16, section 4.1, equation (26): h sqrt((2 / wavelength) (1/d1 + 1/d2)), for diffraction angles below
    about 0.2 rad. Source key: p526-16-knife-edge.
    """
    with quiet():
        inverse_m = 1.0 / positive(from_a_m) + 1.0 / positive(from_b_m)
        return as_result(as_floats(above_ray_m) * np.sqrt(2.0 / as_floats(wavelength_m(frequency_hz)) * inverse_m))


def knife_edge_loss_db(nu: ArrayLike) -> Result:
    """Diffraction loss over one knife edge, by the approximation that the path methods use.

    Parameters
    ----------
    nu
        Fresnel-Kirchhoff diffraction parameter, dimensionless; positive where the edge stands above the ray.

    Returns
    -------
    loss_db
        Loss relative to free space, dB, same shape as `nu`; 0 where nu <= -0.78.

    Notes
    -----
    Rec. ITU-R P.526-16, section 4.1, equation (31). Departs from the Fresnel integrals of equation (30) by at most 0.123 dB
    (at nu = 4.57) for -0.7 < nu < 30. Source key: p526-16-knife-edge.
    """
    values = as_floats(nu)
    # Below the floor the bracket cancels to nothing; lifting nu first keeps the logarithm finite.
    x = np.maximum(values, KNIFE_EDGE_FLOOR_NU) - 0.1
    with quiet():
        loss = 6.9 + 20.0 * np.log10(np.sqrt(x * x + 1.0) + x)  # (31)
    return as_result(np.where(values <= KNIFE_EDGE_FLOOR_NU, 0.0, loss))


def knife_edge_loss_exact_db(nu: ArrayLike) -> Result:
    """Diffraction loss over one knife edge by the Fresnel integrals.

    Parameters
    ----------
    nu
        Fresnel-Kirchhoff diffraction parameter, dimensionless.

    Returns
    -------
    loss_db
        Loss relative to free space, dB, same shape; a gain (negative) of up to 1.37 dB where the edge is just clear.

    Notes
    -----
    Rec. ITU-R P.526-16, section 4.1, equation (30). Beyond nu of about 10^6 the two brackets cancel in double precision.
    Source key: p526-16-knife-edge-exact.
    """
    from scipy.special import fresnel

    s, c = fresnel(as_floats(nu))  # in this order
    with quiet():
        return as_result(-20.0 * np.log10(np.sqrt((1.0 - c - s) ** 2 + (c - s) ** 2) / 2.0))  # (30)


def double_edge_loss_db(
    first_above_ray_m: ArrayLike,
    second_above_ray_m: ArrayLike,
    *,
    a_to_first_m: ArrayLike,
    first_to_second_m: ArrayLike,
    second_to_b_m: ArrayLike,
    frequency_hz: ArrayLike,
) -> Result:
    """Diffraction loss over two knife edges of similar importance.

    Parameters
    ----------
    first_above_ray_m, second_above_ray_m
        Heights of the edges above the straight line from A to B, m, bulge included.
    a_to_first_m, first_to_second_m, second_to_b_m
        The three stretches of the path, m.
    frequency_hz
        Frequency, Hz.

    Returns
    -------
    loss_db
        Loss relative to free space, dB, broadcast shape; NaN where a stretch is not above zero.

    Notes
    -----
    Rec. ITU-R P.526-16, section 4.3: each edge is taken between its neighbours (A and the second edge; the first edge and B)
    and a term for their spacing is added. Valid where each edge costs more than about 15 dB. Each edge by equation (31).
    Source key: p526-16-double-edge.
    """
    a, b, c = positive(a_to_first_m), positive(first_to_second_m), positive(second_to_b_m)
    first, second = as_floats(first_above_ray_m), as_floats(second_above_ray_m)
    first_edge = knife_edge_loss_db(
        knife_edge_nu(first - second * a / (a + b), from_a_m=a, from_b_m=b, frequency_hz=frequency_hz)
    )
    second_edge = knife_edge_loss_db(
        knife_edge_nu(second - first * c / (b + c), from_a_m=b, from_b_m=c, frequency_hz=frequency_hz)
    )
    spacing = 10.0 * np.log10((a + b) * (b + c) / (b * (a + b + c)))
    return as_result(first_edge + second_edge + spacing)
