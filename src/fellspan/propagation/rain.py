"""Specific attenuation by rain, and the loss it causes over a path for a share of the year; knows nothing of places.

Two choices are open and are named by the caller: the edition of P.530 (how short and long paths are treated), and the reading
of one bracket in its law for other percentages.
"""

from typing import Final, Literal

import numpy as np
from numpy.typing import ArrayLike

from fellspan.errors import QuantityError
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

RainEdition = Literal["19", "17"]
"""Edition of Rec. ITU-R P.530 for the path factor."""

RainReading = Literal["A", "B"]
"""Reading of the bracket of equation (36): A takes the exponent 0.8 inside the logarithm, as printed; B outside it."""

_K_H: Final = ((-5.33980, -0.10008, 1.13098), (-0.35351, 1.26970, 0.45400), (-0.23789, 0.86036, 0.15354),
               (-0.94158, 0.64552, 0.16817))  # fmt: skip
_K_V: Final = ((-3.80595, 0.56934, 0.81061), (-3.44965, -0.22911, 0.51059), (-0.39902, 0.73042, 0.11899),
               (0.50167, 1.07319, 0.27195))  # fmt: skip
_ALPHA_H: Final = ((-0.14318, 1.82442, -0.55187), (0.29591, 0.77564, 0.19822), (0.32177, 0.63773, 0.13164),
                   (-5.37610, -0.96230, 1.47828), (16.1721, -3.29980, 3.43990))  # fmt: skip
_ALPHA_V: Final = ((-0.07771, 2.33840, -0.76284), (0.56727, 0.95545, 0.54039), (-0.20238, 1.14520, 0.26809),
                   (-48.2991, 0.791669, 0.116226), (48.5833, 0.791459, 0.116479))  # fmt: skip
"""Rec. ITU-R P.838-3, tables 1 to 4: a, b, c of each Gaussian term."""

_LEAST_FREQUENCY_GHZ: Final = 6.0
_GREATEST_DISTANCE_KM: Final = 30.0
_LEAST_RAIN_MM_H: Final = 3.0
"""Bounds of the arguments of the path factor in edition 19 of P.530, section 2.4.1."""

_CAP_17: Final = 2.5


def rain_coefficients(
    frequency_hz: ArrayLike,
    *,
    polarization: ArrayLike | None = None,
    tilt_deg: ArrayLike | None = None,
    elevation_deg: ArrayLike = 0.0,
) -> tuple[Result, Result]:
    """Coefficients k and alpha of rain attenuation, gamma = k R^alpha.

    Parameters
    ----------
    frequency_hz
        Frequency, Hz.
    polarization
        "horizontal" or "vertical", or an array of these words.
    tilt_deg
        In place of `polarization`: angle of the electric field from horizontal, degrees; 45 for slant or circular.
    elevation_deg
        Elevation of the path, degrees.

    Returns
    -------
    k, alpha
        Dimensionless for R in mm/h and gamma in dB/km, broadcast shape; NaN where the frequency is not above zero.

    Raises
    ------
    QuantityError
        Neither or both of `polarization` and `tilt_deg`, or another word.

    Notes
    -----
    Rec. ITU-R P.838-3, equations (2) to (5), 1 to 1000 GHz. Equals its printed table 5 to the digits there. Source
    key: p838-3-rain.
    """
    tilt = np.radians(_tilt_deg(polarization, tilt_deg))
    with quiet():
        log_f = np.log10(positive(frequency_hz) / 1e9)
        k_h = 10.0 ** _fit(log_f, _K_H, slope=-0.18961, constant=0.71147)  # (2)
        k_v = 10.0 ** _fit(log_f, _K_V, slope=-0.16398, constant=0.63297)
        alpha_h = _fit(log_f, _ALPHA_H, slope=0.67849, constant=-1.95537)  # (3)
        alpha_v = _fit(log_f, _ALPHA_V, slope=-0.053739, constant=0.83433)
        turn = np.cos(np.radians(as_floats(elevation_deg))) ** 2 * np.cos(2.0 * tilt)
        k = (k_h + k_v + (k_h - k_v) * turn) / 2.0  # (4)
        alpha = (k_h * alpha_h + k_v * alpha_v + (k_h * alpha_h - k_v * alpha_v) * turn) / (2.0 * k)  # (5)
    return as_result(k), as_result(alpha)


def rain_attenuation_db_per_km(
    rain_rate_mm_h: ArrayLike,
    *,
    frequency_hz: ArrayLike,
    polarization: ArrayLike | None = None,
    tilt_deg: ArrayLike | None = None,
    elevation_deg: ArrayLike = 0.0,
) -> Result:
    """Specific attenuation by rain.

    Parameters
    ----------
    rain_rate_mm_h
        Rain rate, mm/h.
    frequency_hz, polarization, tilt_deg, elevation_deg
        As `rain_coefficients` takes them.

    Returns
    -------
    attenuation_db_per_km
        dB/km, broadcast shape; 0 without rain, NaN where the rate is negative.

    Notes
    -----
    Rec. ITU-R P.838-3, equation (1). Source key: p838-3-rain.
    """
    k, alpha = rain_coefficients(
        frequency_hz, polarization=polarization, tilt_deg=tilt_deg, elevation_deg=elevation_deg
    )
    with quiet():
        return as_result(as_floats(k) * not_negative(rain_rate_mm_h) ** as_floats(alpha))  # (1)


def rain_path_factor(
    distance_m: ArrayLike,
    *,
    rain_rate_001_mm_h: ArrayLike,
    alpha: ArrayLike,
    frequency_hz: ArrayLike,
    edition: RainEdition = "19",
) -> Result:
    """Factor r by which the length of a path is multiplied, since heavy rain fills only a part of it.

    Parameters
    ----------
    distance_m
        Path length, m.
    rain_rate_001_mm_h
        Rain rate exceeded for 0.01 % of the year, mm/h, one-minute integration.
    alpha
        Exponent of `rain_coefficients`.
    frequency_hz
        Frequency, Hz.
    edition
        "19": arguments bounded to 6 GHz and up, 30 km and less, 3 mm/h and more; no cap on r. "17": no bounds; r at most 2.5.

    Returns
    -------
    factor
        Broadcast shape; above 1 on short paths. Infinite at zero distance in edition 19.

    Notes
    -----
    Rec. ITU-R P.530-19, equation (32). In edition 17 the denominator turns negative for some long paths with little rain; we
    keep the cap there, its limit from the other side. Source keys: p530-19-rain, p530-17-rain.
    """
    distance_km = not_negative(distance_m) / 1000.0
    frequency_ghz = positive(frequency_hz) / 1e9
    rain = not_negative(rain_rate_001_mm_h)
    if _edition(edition) == "19":
        distance_km = np.minimum(distance_km, _GREATEST_DISTANCE_KM)
        frequency_ghz = np.maximum(frequency_ghz, _LEAST_FREQUENCY_GHZ)
        rain = np.maximum(rain, _LEAST_RAIN_MM_H)
    with quiet():
        denominator = 0.477 * distance_km**0.633 * rain ** (0.073 * as_floats(alpha)) * frequency_ghz**0.123
        denominator = denominator - 10.579 * (1.0 - np.exp(-0.024 * distance_km))
        if edition == "19":
            return as_result(1.0 / denominator)  # (32)
        return as_result(np.where(denominator < 1.0 / _CAP_17, _CAP_17, 1.0 / denominator))


def rain_loss_001_db(
    distance_m: ArrayLike,
    *,
    rain_rate_001_mm_h: ArrayLike,
    frequency_hz: ArrayLike,
    polarization: ArrayLike | None = None,
    tilt_deg: ArrayLike | None = None,
    elevation_deg: ArrayLike = 0.0,
    edition: RainEdition = "19",
) -> Result:
    """Loss by rain that is exceeded for 0.01 % of an average year.

    Parameters
    ----------
    distance_m
        Path length, m.
    rain_rate_001_mm_h
        Rain rate exceeded for 0.01 % of the year, mm/h, one-minute integration: local statistics first, else P.837.
    frequency_hz, polarization, tilt_deg, elevation_deg
        As `rain_coefficients` takes them.
    edition
        Edition of P.530, "19" or "17"; see `rain_path_factor`.

    Returns
    -------
    loss_db
        dB, broadcast shape; 0 without rain or distance; NaN where either is negative.

    Notes
    -----
    Rec. ITU-R P.530-19, equations (32) and (33): up to 60 km and 175 GHz. The editions agree from 6 GHz and 3 mm/h
    on, up to 30 km, where r is at most 2.5. Source keys: p530-19-rain, p530-17-rain, p838-3-rain.
    """
    k, alpha = rain_coefficients(
        frequency_hz, polarization=polarization, tilt_deg=tilt_deg, elevation_deg=elevation_deg
    )
    rain, distance = not_negative(rain_rate_001_mm_h), not_negative(distance_m)
    factor = rain_path_factor(
        distance, rain_rate_001_mm_h=rain, alpha=alpha, frequency_hz=frequency_hz, edition=edition
    )
    with quiet():
        loss = as_floats(k) * rain ** as_floats(alpha) * distance / 1000.0 * as_floats(factor)  # (33)
    return as_result(np.where(distance == 0.0, 0.0 * as_floats(k) * rain, loss))


def _fit(
    log_f: FloatArray, terms: tuple[tuple[float, float, float], ...], *, slope: float, constant: float
) -> FloatArray:
    total = slope * log_f + constant
    for a, b, c in terms:
        total = total + a * np.exp(-(((log_f - b) / c) ** 2))
    return as_floats(total)


def _tilt_deg(polarization: ArrayLike | None, tilt_deg: ArrayLike | None) -> FloatArray:
    if polarization is not None and tilt_deg is not None:
        raise QuantityError(
            f"polarization {polarization} and a tilt of {tilt_deg} degrees are both given", "give one of them"
        )
    if tilt_deg is not None:
        return as_floats(tilt_deg)
    if polarization is None:
        raise QuantityError(
            "rain needs a polarization", "give 'horizontal', 'vertical', or the tilt in degrees (45 for slant)"
        )
    return np.where(is_vertical(polarization), 90.0, 0.0)


def _edition(edition: str) -> str:
    if edition not in ("19", "17"):
        raise QuantityError(f"edition {edition!r} of P.530 is not built in for rain", "there are '19' and '17'")
    return edition
