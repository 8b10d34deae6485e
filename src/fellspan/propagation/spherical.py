"""Diffraction over a smooth spherical Earth; knows nothing of profiles.

Self-consistent units (metres throughout) instead of the rounded practical constants: the frequency enters only through the
wavelength.
"""

from functools import partial

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.propagation._arrays import (
    FloatArray,
    Result,
    as_floats,
    as_result,
    is_vertical,
    not_negative,
    positive,
    quiet,
)
from fellspan.propagation.constants import (
    EARTH_RADIUS_M,
    LAND_CONDUCTIVITY_S_M,
    LAND_PERMITTIVITY,
    SEA_CONDUCTIVITY_S_M,
    SEA_PERMITTIVITY,
    STANDARD_K,
)
from fellspan.propagation.free_space import wavelength_m
from fellspan.propagation.refraction import inverse_k


def _height_gain_db(normalised_height: FloatArray, beta: FloatArray, admittance: FloatArray) -> FloatArray:
    b = beta * normalised_height
    high = 17.6 * np.sqrt(b - 1.1) - 5.0 * np.log10(b - 1.1) - 8.0  # (18)
    low = 20.0 * np.log10(b + 0.1 * b**3)  # (18a)
    return np.asarray(np.maximum(np.where(b > 2.0, high, low), 2.0 + 20.0 * np.log10(admittance)))


def _first_residue_db(
    *,
    distance: FloatArray,
    height_a: FloatArray,
    height_b: FloatArray,
    radius: FloatArray,
    wavelength: FloatArray,
    vertical: NDArray[np.bool_],
    permittivity: FloatArray,
    conductivity: FloatArray,
) -> FloatArray:
    loss_term = 60.0 * wavelength * conductivity
    horizontal_k = (2.0 * np.pi * radius / wavelength) ** (-1.0 / 3.0) * (
        (permittivity - 1.0) ** 2 + loss_term**2
    ) ** -0.25  # (11)
    vertical_k = horizontal_k * np.sqrt(permittivity**2 + loss_term**2)  # (12)
    k2 = np.where(vertical, vertical_k, horizontal_k) ** 2
    beta = (1.0 + 1.6 * k2 + 0.67 * k2**2) / (1.0 + 4.5 * k2 + 1.53 * k2**2)  # (16)
    x = beta * np.cbrt(np.pi / (wavelength * radius**2)) * distance  # (14)
    per_metre = 2.0 * beta * np.cbrt(np.pi**2 / (wavelength**2 * radius))  # (15)
    far = 11.0 + 10.0 * np.log10(x) - 17.6 * x  # (17a)
    near = -20.0 * np.log10(x) - 5.6488 * x**1.425  # (17b)
    admittance = np.sqrt(k2)
    return np.asarray(
        -np.where(x >= 1.6, far, near)
        - _height_gain_db(per_metre * height_a, beta, admittance)
        - _height_gain_db(per_metre * height_b, beta, admittance)
    )


def first_residue_loss_db(
    distance_m: ArrayLike,
    *,
    a_height_m: ArrayLike,
    b_height_m: ArrayLike,
    effective_radius_m: ArrayLike,
    frequency_hz: ArrayLike,
    polarization: ArrayLike = "horizontal",
    relative_permittivity: ArrayLike = LAND_PERMITTIVITY,
    conductivity_s_m: ArrayLike = LAND_CONDUCTIVITY_S_M,
) -> Result:
    """Diffraction loss beyond the horizon of a smooth Earth, first term of the residue series.

    Parameters
    ----------
    distance_m
        Path length, m.
    a_height_m, b_height_m
        Antenna heights above the smooth Earth, m, zero or more.
    effective_radius_m
        Effective Earth radius, m, above zero.
    frequency_hz
        Frequency, Hz.
    polarization
        "horizontal" or "vertical".
    relative_permittivity, conductivity_s_m
        Electrical constants of the ground; land by default.

    Returns
    -------
    loss_db
        Loss relative to free space, dB, broadcast shape; may be negative well inside the horizon.

    Notes
    -----
    Rec. ITU-R P.526-16, section 3.1.1, equations (11) to (18a), 10 MHz and up. Source key: p526-16-first-residue.
    """
    with quiet():
        return as_result(
            _first_residue_db(
                distance=positive(distance_m),
                height_a=not_negative(a_height_m),
                height_b=not_negative(b_height_m),
                radius=positive(effective_radius_m),
                wavelength=as_floats(wavelength_m(frequency_hz)),
                vertical=is_vertical(polarization),
                permittivity=as_floats(relative_permittivity),
                conductivity=as_floats(conductivity_s_m),
            )
        )


def spherical_earth_loss_db(
    distance_m: ArrayLike,
    *,
    a_height_m: ArrayLike,
    b_height_m: ArrayLike,
    frequency_hz: ArrayLike,
    k: ArrayLike = STANDARD_K,
    polarization: ArrayLike = "horizontal",
    sea_fraction: ArrayLike = 0.0,
) -> Result:
    """Diffraction loss over a smooth Earth at any distance, this side of the horizon and beyond.

    Parameters
    ----------
    distance_m
        Path length, m.
    a_height_m, b_height_m
        Antenna heights above the smooth Earth, m, zero or more.
    frequency_hz
        Frequency, Hz.
    k
        Effective Earth radius factor, above zero; infinite is a flat Earth, taken as the limit.
    polarization
        "horizontal" or "vertical".
    sea_fraction
        Fraction of the path over sea, 0 to 1: land and sea losses are mixed in that ratio.

    Returns
    -------
    loss_db
        Loss relative to free space, dB, broadcast shape. NaN where k <= 0: the method knows no Earth
        that is hollow to the ray.

    Notes
    -----
    Rec. ITU-R P.526-16, section 3.2, equations (21) to (25); ground constants of P.452-18, section 4.2. Source keys:
    p526-16-spherical, p452-18-ground.
    """
    distance, wavelength = positive(distance_m), as_floats(wavelength_m(frequency_hz))
    h1, h2 = not_negative(a_height_m), not_negative(b_height_m)
    vertical, sea = is_vertical(polarization), as_floats(sea_fraction)
    inverse_radius = not_negative(inverse_k(k)) / EARTH_RADIUS_M
    with quiet():
        radius = 1.0 / inverse_radius
        horizon = np.sqrt(2.0 * radius) * (np.sqrt(h1) + np.sqrt(h2))  # (21)
        beyond = distance >= horizon

        c = (h1 - h2) / (h1 + h2)
        m = distance**2 * inverse_radius / (4.0 * (h1 + h2))
        # (22b) with cos(pi/3 + arccos(x)/3) written as sin(arcsin(x)/3), the same thing that does not cancel as m goes to 0
        x = np.clip(1.5 * c * np.sqrt(3.0 * m / (m + 1.0) ** 3), -1.0, 1.0)
        b = np.where(m == 0.0, c, 2.0 * np.sqrt((m + 1.0) / (3.0 * m)) * np.sin(np.arcsin(x) / 3.0))
        d1 = distance * (1.0 + b) / 2.0
        d2 = distance - d1
        clearance = (  # (22)
            (h1 - d1**2 * inverse_radius / 2.0) * d2 + (h2 - d2**2 * inverse_radius / 2.0) * d1
        ) / distance
        required = 0.552 * np.sqrt(d1 * d2 * wavelength / distance)  # (23)
        # An antenna on the ground makes both 0. Their ratio goes to 0: clearance falls as the height, required as its root.
        # Below a nanometre rounding would decide it.
        ratio = np.where(np.minimum(h1, h2) < 1e-9, 0.0, clearance / required)
        modified_radius = 0.5 * (distance / (np.sqrt(h1) + np.sqrt(h2))) ** 2  # (24)

        # Within the horizon a ratio of 1 or more costs nothing: what lies there needs no residues.
        asked = beyond | ~(ratio >= 1.0)
        if not asked.any():
            return as_result(np.zeros(asked.shape))
        given = np.broadcast_arrays(
            distance, h1, h2, np.where(beyond, radius, modified_radius), wavelength, vertical, sea, ratio, beyond
        )
        shape = given[0].shape
        asked = np.broadcast_to(asked, shape)
        loss = np.zeros(shape)
        loss[asked] = _mixed_db(*(array[asked] for array in given))
        return as_result(loss)


def _mixed_db(
    distance: FloatArray,
    height_a: FloatArray,
    height_b: FloatArray,
    radius: FloatArray,
    wavelength: FloatArray,
    vertical: NDArray[np.bool_],
    sea: FloatArray,
    ratio: FloatArray,
    beyond: NDArray[np.bool_],
) -> FloatArray:
    """Loss over land and sea in their ratio: the residues beyond the horizon, their share by the clearance this side of it."""
    over = partial(
        _first_residue_db,
        distance=distance,
        height_a=height_a,
        height_b=height_b,
        radius=radius,
        wavelength=wavelength,
        vertical=vertical,
    )
    residue = over(permittivity=as_floats(LAND_PERMITTIVITY), conductivity=as_floats(LAND_CONDUCTIVITY_S_M))
    if not np.all(sea == 0.0):
        water = over(permittivity=as_floats(SEA_PERMITTIVITY), conductivity=as_floats(SEA_CONDUCTIVITY_S_M))
        residue = sea * water + (1.0 - sea) * residue
    within = np.maximum(1.0 - ratio, 0.0) * np.maximum(residue, 0.0)  # (25)
    return np.where(beyond, residue, within)
