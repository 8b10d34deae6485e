"""Attenuation by oxygen and water vapour near the ground, line by line; knows nothing of places or climate maps."""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, not_negative, positive, quiet
from fellspan.propagation.gas_lines import OXYGEN_LINES, VAPOUR_LINES
from fellspan.propagation.refraction import vapour_pressure_hpa

_OXYGEN: Final = np.array(OXYGEN_LINES).T
_VAPOUR: Final = np.array(VAPOUR_LINES).T
_CHUNK: Final = 4096
"""Values worked at once: 44 lines of them stay within a few megabytes."""

STANDARD_PRESSURE_HPA: Final = 1013.25
STANDARD_TEMPERATURE_K: Final = 288.15
STANDARD_VAPOUR_G_M3: Final = 7.5
"""Mean annual reference air at sea level: Rec. ITU-R P.835-6. The pressure is the total one."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Air:
    """Air at a place, in the quantities that the gas formulas take; all of one shape."""

    total_pressure_hpa: Result
    dry_pressure_hpa: Result
    temperature_k: Result
    vapour_g_m3: Result


def gas_attenuation_parts_db_per_km(
    frequency_hz: ArrayLike, *, dry_pressure_hpa: ArrayLike, temperature_k: ArrayLike, vapour_g_m3: ArrayLike
) -> tuple[Result, Result]:
    """Specific attenuation by oxygen (with the dry continuum) and by water vapour.

    Parameters
    ----------
    frequency_hz
        Frequency, Hz.
    dry_pressure_hpa
        Pressure of the dry air alone, hPa: total pressure less vapour pressure (see `dry_pressure_hpa`). Taking 1013.25 as dry
        instead of total adds 0.8 % at 60 GHz.
    temperature_k
        Temperature, K.
    vapour_g_m3
        Density of water vapour, g/m3.

    Returns
    -------
    oxygen_db_per_km, vapour_db_per_km
        dB/km, broadcast shape; NaN where frequency or temperature is not above zero or pressure or vapour is negative.

    Notes
    -----
    Rec. ITU-R P.676-12, Annex 1, equations (1) to (9), line by line, 1 to 1000 GHz; equals the published validation rows at 12,
    20, 60 and 90 GHz to seven digits. Source key: p676-12-gases.
    """
    arrays = np.broadcast_arrays(
        positive(as_floats(frequency_hz) / 1e9),
        not_negative(dry_pressure_hpa),
        positive(temperature_k),
        not_negative(vapour_g_m3),
    )
    shape = arrays[0].shape
    flat = [array.reshape(-1) for array in arrays]
    oxygen, vapour = np.empty(flat[0].size), np.empty(flat[0].size)
    for start in range(0, flat[0].size, _CHUNK):
        piece = slice(start, start + _CHUNK)
        oxygen[piece], vapour[piece] = _parts(*(array[piece] for array in flat))
    return as_result(oxygen.reshape(shape)), as_result(vapour.reshape(shape))


def gas_attenuation_db_per_km(
    frequency_hz: ArrayLike, *, dry_pressure_hpa: ArrayLike, temperature_k: ArrayLike, vapour_g_m3: ArrayLike
) -> Result:
    """Specific attenuation by oxygen and water vapour together, dB/km.

    Parameters, validity and source are those of `gas_attenuation_parts_db_per_km`. Source key: p676-12-gases.
    """
    oxygen, vapour = gas_attenuation_parts_db_per_km(
        frequency_hz, dry_pressure_hpa=dry_pressure_hpa, temperature_k=temperature_k, vapour_g_m3=vapour_g_m3
    )
    return as_result(as_floats(oxygen) + as_floats(vapour))


def gas_loss_db(
    distance_m: ArrayLike,
    *,
    frequency_hz: ArrayLike,
    dry_pressure_hpa: ArrayLike,
    temperature_k: ArrayLike,
    vapour_g_m3: ArrayLike,
) -> Result:
    """Loss by gases over a terrestrial path, dB: specific attenuation times distance.

    NaN where the distance is negative. Rec. ITU-R P.530-19, equation (1), with the same air all along the path; it
    counts above about 10 GHz. Source keys: p530-19-gas-path, p676-12-gases.
    """
    specific = gas_attenuation_db_per_km(
        frequency_hz, dry_pressure_hpa=dry_pressure_hpa, temperature_k=temperature_k, vapour_g_m3=vapour_g_m3
    )
    return as_result(as_floats(specific) * not_negative(distance_m) / 1000.0)


def dry_pressure_hpa(total_pressure_hpa: ArrayLike, *, temperature_k: ArrayLike, vapour_g_m3: ArrayLike) -> Result:
    """Pressure of the dry air, hPa: the total (barometric) pressure at the place less that of the vapour.

    Not the pressure that weather reports reduce to sea level. Source key: p453-13-refractivity.
    """
    vapour = as_floats(vapour_pressure_hpa(vapour_g_m3, temperature_k=temperature_k))
    return as_result(as_floats(total_pressure_hpa) - vapour)


def standard_air(height_amsl_m: ArrayLike, *, vapour_sea_level_g_m3: ArrayLike = STANDARD_VAPOUR_G_M3) -> Air:
    """Mean annual reference air at a height above sea level.

    Parameters
    ----------
    height_amsl_m
        Height, m above sea level; 0 to 11 km. Below the sea (dry basins) the formula is used as it stands.
    vapour_sea_level_g_m3
        Density of water vapour at sea level, g/m3; it falls by e every 2 km.

    Returns
    -------
    air
        Total pressure from the height, and dry pressure as total less vapour pressure.

    Notes
    -----
    Rec. ITU-R P.835-6, first layer: 6.5 K per geopotential km from 288.15 K and 1013.25 hPa. Source key: p835-6-standard-air.
    """
    height_km = as_floats(height_amsl_m) / 1000.0
    geopotential_km = 6356.766 * height_km / (6356.766 + height_km)
    temperature_k = STANDARD_TEMPERATURE_K - 6.5 * geopotential_km
    total_hpa = STANDARD_PRESSURE_HPA * (STANDARD_TEMPERATURE_K / temperature_k) ** (-34.1632 / 6.5)
    vapour_g_m3 = not_negative(vapour_sea_level_g_m3) * np.exp(-height_km / 2.0)
    temperature_k, total_hpa, vapour_g_m3 = np.broadcast_arrays(temperature_k, total_hpa, vapour_g_m3)
    return Air(
        total_pressure_hpa=as_result(total_hpa),
        dry_pressure_hpa=dry_pressure_hpa(total_hpa, temperature_k=temperature_k, vapour_g_m3=vapour_g_m3),
        temperature_k=as_result(temperature_k),
        vapour_g_m3=as_result(vapour_g_m3),
    )


def _parts(
    f: FloatArray, dry_hpa: FloatArray, temperature_k: FloatArray, vapour_g_m3: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Oxygen and vapour for one-dimensional arrays, f in GHz, all of one length."""
    with quiet():
        theta = 300.0 / temperature_k
        e = as_floats(vapour_pressure_hpa(vapour_g_m3, temperature_k=temperature_k))
        oxygen = _oxygen_lines(f[:, None], dry_hpa[:, None], e[:, None], theta[:, None])
        continuum = _dry_continuum(f, dry_hpa, e, theta)
        vapour = _vapour_lines(f[:, None], dry_hpa[:, None], e[:, None], theta[:, None])
        return 0.1820 * f * (oxygen + continuum), 0.1820 * f * vapour  # (1)


def _oxygen_lines(f: FloatArray, p: FloatArray, e: FloatArray, theta: FloatArray) -> FloatArray:
    centre, a1, a2, a3, a4, a5, a6 = _OXYGEN
    strength = a1 * 1e-7 * p * theta**3 * np.exp(a2 * (1.0 - theta))  # (3)
    width = a3 * 1e-4 * (p * theta ** (0.8 - a4) + 1.1 * e * theta)  # (6a)
    width = np.sqrt(width**2 + 2.25e-6)  # (6b), Zeeman splitting
    interference = (a5 + a6 * theta) * 1e-4 * (p + e) * theta**0.8  # (7)
    return as_floats(np.sum(strength * _shape(f, centre, width, interference), axis=-1))


def _vapour_lines(f: FloatArray, p: FloatArray, e: FloatArray, theta: FloatArray) -> FloatArray:
    centre, b1, b2, b3, b4, b5, b6 = _VAPOUR
    strength = b1 * 1e-1 * e * theta**3.5 * np.exp(b2 * (1.0 - theta))  # (3)
    width = b3 * 1e-4 * (p * theta**b4 + b5 * e * theta**b6)  # (6a)
    width = 0.535 * width + np.sqrt(0.217 * width**2 + 2.1316e-12 * centre**2 / theta)  # (6b), Doppler broadening
    return as_floats(np.sum(strength * _shape(f, centre, width, 0.0), axis=-1))


def _shape(f: FloatArray, centre: FloatArray, width: FloatArray, interference: FloatArray | float) -> FloatArray:
    below, above = centre - f, centre + f
    return as_floats(
        f
        / centre
        * (
            (width - interference * below) / (below**2 + width**2)
            + (width - interference * above) / (above**2 + width**2)
        )
    )  # (5)


def _dry_continuum(f: FloatArray, p: FloatArray, e: FloatArray, theta: FloatArray) -> FloatArray:
    """Debye part of oxygen and pressure-induced nitrogen, (8) and (9); written so that a vacuum gives 0, not 0/0."""
    d = 5.6e-4 * (p + e) * theta**0.8
    return as_floats(
        f * p * theta**2 * (6.14e-5 * d / (d**2 + f**2) + 1.4e-12 * p * theta**1.5 / (1.0 + 1.9e-5 * f**1.5))
    )
