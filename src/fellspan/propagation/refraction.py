"""Refractivity of air and the effective Earth radius factor k; knows nothing of maps, places or terrain.

1/k is what the formulas use: it is 0 where a ray follows the Earth and negative where it bends more than the Earth, so
gradients of any sign are legal.
"""

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import Result, as_floats, as_result, not_negative, positive, quiet
from fellspan.propagation.constants import EARTH_RADIUS_M, K_FORMULA_LOW_M, NEUTRAL_GRADIENT_N_PER_KM


def inverse_k(k: ArrayLike) -> Result:
    """1/k: 0 for infinite k, NaN for k = 0, where the effective Earth has no radius."""
    values = as_floats(k)
    with quiet():
        return as_result(np.where(values == 0.0, np.nan, 1.0 / values))


def refractivity(dry_pressure_hpa: ArrayLike, *, temperature_k: ArrayLike, vapour_pressure_hpa: ArrayLike) -> Result:
    """Radio refractivity N of air.

    Parameters
    ----------
    dry_pressure_hpa
        Pressure of the dry air alone, hPa (total pressure less vapour pressure).
    temperature_k
        Temperature, K.
    vapour_pressure_hpa
        Partial pressure of water vapour, hPa.

    Returns
    -------
    refractivity
        N-units, broadcast shape; NaN where the temperature is not above zero.

    Notes
    -----
    Rec. ITU-R P.453-13: N = 77.6 Pd/T + 72 e/T + 3.75e5 e/T^2. Source key: p453-13-refractivity.
    """
    kelvin = positive(temperature_k)
    vapour = as_floats(vapour_pressure_hpa)
    return as_result(77.6 * as_floats(dry_pressure_hpa) / kelvin + 72.0 * vapour / kelvin + 3.75e5 * vapour / kelvin**2)


def vapour_pressure_hpa(vapour_g_m3: ArrayLike, *, temperature_k: ArrayLike) -> Result:
    """Partial pressure of water vapour, hPa, from its density in g/m3 and the temperature in K.

    Notes
    -----
    Rec. ITU-R P.453-13: e = rho T / 216.7. Source key: p453-13-refractivity.
    """
    return as_result(as_floats(vapour_g_m3) * positive(temperature_k) / 216.7)


def saturation_vapour_pressure_hpa(temperature_c: ArrayLike, *, pressure_hpa: ArrayLike = 1013.25) -> Result:
    """Saturation vapour pressure over water.

    Parameters
    ----------
    temperature_c
        Temperature, degrees Celsius.
    pressure_hpa
        Total pressure, hPa.

    Returns
    -------
    pressure_hpa
        hPa, broadcast shape. Times relative humidity it gives the vapour pressure.

    Notes
    -----
    Rec. ITU-R P.453-13, the fit over liquid water with its enhancement factor. Source key: p453-13-saturation.
    """
    t = as_floats(temperature_c)
    enhancement = 1.0 + 1e-4 * (7.2 + as_floats(pressure_hpa) * (0.0320 + 5.9e-6 * t**2))
    with quiet():
        return as_result(enhancement * 6.1121 * np.exp((18.678 - t / 234.5) * t / (t + 257.14)))


def inverse_k_from_gradient(gradient_n_per_km: ArrayLike) -> Result:
    """1/k from the vertical gradient of refractivity.

    Parameters
    ----------
    gradient_n_per_km
        dN/dh, N-units per km, negative in normal air (about -39).

    Returns
    -------
    inverse_k
        Same shape; 0 at -157 N/km, negative below.

    Notes
    -----
    Rec. ITU-R P.452-18, equation (5), with the sign of the gradient written out. Source key: p452-18-k.
    """
    return as_result((NEUTRAL_GRADIENT_N_PER_KM + as_floats(gradient_n_per_km)) / NEUTRAL_GRADIENT_N_PER_KM)


def k_from_gradient(gradient_n_per_km: ArrayLike) -> Result:
    """Effective Earth radius factor k from dN/dh in N-units per km.

    Infinite at -157 N/km, negative below. Rec. ITU-R P.452-18, equation (5): k = 157 / (157 + dN/dh). Source key: p452-18-k.
    """
    with quiet():
        return as_result(NEUTRAL_GRADIENT_N_PER_KM / (NEUTRAL_GRADIENT_N_PER_KM + as_floats(gradient_n_per_km)))


def gradient_from_k_n_per_km(k: ArrayLike) -> Result:
    """Vertical gradient of refractivity that makes k; the inverse of `k_from_gradient`, NaN at k = 0."""
    return as_result(NEUTRAL_GRADIENT_N_PER_KM * (as_floats(inverse_k(k)) - 1.0))


def effective_earth_radius_m(k: ArrayLike) -> Result:
    """Effective Earth radius k * 6371 km, in m; infinite or negative with k, NaN at k = 0. Source key: p452-18-k."""
    with quiet():
        return as_result(EARTH_RADIUS_M / as_floats(inverse_k(k)))


def k_exceeded_99_9(distance_m: ArrayLike) -> Result:
    """k exceeded for 99.9 % of the worst month, for the length of the path, in a continental temperate climate.

    Parameters
    ----------
    distance_m
        Path length, m.

    Returns
    -------
    k
        Same shape; NaN where the distance is negative.

    Notes
    -----
    Rec. ITU-R P.530-19, section 2.2.2.1, equation (4), which fits Fig. 2: 157 / (144 + 2670/d), d in km. The curve of the
    figure runs from about 18 to 200 km. Beyond 200 km the formula is used as it stands. Below 18 km it would fall steeply
    (0.38 at 10 km) with nothing measured behind it: our own rule is to hold the 18 km value, 0.537. Source key: p530-19-k999.
    """
    distance_km = np.maximum(not_negative(distance_m), K_FORMULA_LOW_M) / 1000.0
    return as_result(157.0 / (144.0 + 2670.0 / distance_km))  # (4)
