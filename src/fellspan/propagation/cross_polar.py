"""Outage of links that carry both polarizations on one channel: when air or rain turns one into the other.

Clear-air outage is a percentage of the average worst month, rain outage of the average year. Knows no antennas or radios.
"""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import Result, as_floats, as_result, not_negative, positive, quiet
from fellspan.propagation.multipath_selective import multipath_activity

RAIN_U0_DB: Final = 15.0
"""Rec. ITU-R P.530-19, section 4.2: about 15 dB on average."""


def clear_air_cross_polar_outage_percent(
    occurrence_percent: ArrayLike,
    *,
    antenna_discrimination_db: ArrayLike,
    required_ratio_db: ArrayLike,
    canceller_db: ArrayLike = 0.0,
    transmit_spacing_wavelengths: ArrayLike = 0.0,
) -> Result:
    """Outage by loss of cross-polar discrimination in clear air.

    Parameters
    ----------
    occurrence_percent
        Occurrence factor p0, % of the worst month.
    antenna_discrimination_db
        Least cross-polar discrimination on boresight of the two antennas, dB.
    required_ratio_db
        Carrier-to-interference ratio that the radio needs, C0/I, dB.
    canceller_db
        Improvement by a cross-polar interference canceller (XPIF), dB; 0 without one.
    transmit_spacing_wavelengths
        Vertical distance of two transmitting antennas over the wavelength; 0 where there is one.

    Returns
    -------
    outage_percent
        % of the average worst month, at most 100; 0 where there is no multipath.

    Notes
    -----
    Rec. ITU-R P.530-19, section 4.1, with P0 a fraction, not a percentage. Source key: p530-19-cross-polar-clear-air.
    """
    occurrence = not_negative(occurrence_percent)
    share = occurrence / 100.0
    antenna = as_floats(antenna_discrimination_db)
    ceiling = np.where(antenna <= 35.0, antenna + 5.0, 40.0)
    spacing_factor = 1.0 - 0.3 * np.exp(-4e-6 * not_negative(transmit_spacing_wavelengths) ** 2)
    with quiet():
        gained = -10.0 * np.log10(spacing_factor * as_floats(multipath_activity(occurrence)) / share)
        margin = ceiling + gained - as_floats(required_ratio_db) + as_floats(canceller_db)
        outage = np.minimum(occurrence * 10.0 ** (-margin / 10.0), 100.0)
    return as_result(np.where(occurrence == 0.0, 0.0, outage))


def rain_discrimination_db(fade_db: ArrayLike, *, frequency_hz: ArrayLike, u0_db: ArrayLike = RAIN_U0_DB) -> Result:
    """Cross-polar discrimination left in rain that attenuates the wanted polarization by so much, dB: U - V log CPA.

    8 to 35 GHz. Rec. ITU-R P.530-19, section 4.2. Source key: p530-19-cross-polar-rain.
    """
    constant, slope = _rain_law(frequency_hz, u0_db)
    with quiet():
        return as_result(constant - slope * np.log10(positive(fade_db)))


def rain_cross_polar_outage_percent(
    fade_001_db: ArrayLike,
    *,
    frequency_hz: ArrayLike,
    required_ratio_db: ArrayLike,
    canceller_db: ArrayLike = 0.0,
    u0_db: ArrayLike = RAIN_U0_DB,
) -> Result:
    """Outage by loss of cross-polar discrimination in rain.

    Parameters
    ----------
    fade_001_db
        Rain attenuation of the path exceeded for 0.01 % of the average year, dB.
    frequency_hz
        Hz; 8 to 35 GHz.
    required_ratio_db, canceller_db
        As in `clear_air_cross_polar_outage_percent`.
    u0_db
        15 dB unless measured.

    Returns
    -------
    outage_percent
        % of the average year; 0 where no rain attenuates.

    Notes
    -----
    Rec. ITU-R P.530-19, section 4.2. Where the parameter m runs into its ceiling of 40 the outage is below 2e-6 %.
    Source key: p530-19-cross-polar-rain.
    """
    fade = not_negative(fade_001_db)
    constant, slope = _rain_law(frequency_hz, u0_db)
    with quiet():
        equivalent = 10.0 ** ((constant - as_floats(required_ratio_db) + as_floats(canceller_db)) / slope)
        m = np.minimum(23.26 * np.log10(equivalent / (0.12 * fade)), 40.0)
        n = (-12.7 + np.sqrt(161.23 - 4.0 * m)) / 2.0
        outage = np.minimum(10.0**n, 100.0)  # the printed 10^(n - 2) is a fraction
    return as_result(np.where(fade == 0.0, 0.0, outage))


def _rain_law(frequency_hz: ArrayLike, u0_db: ArrayLike) -> tuple[Result, Result]:
    frequency_ghz = positive(frequency_hz) / 1e9
    constant = as_floats(u0_db) + 30.0 * np.log10(frequency_ghz)
    slope = np.where(frequency_ghz < 20.0, 12.8 * frequency_ghz**0.19, 22.6)
    return constant, np.where(np.isnan(frequency_ghz), np.nan, slope)
