"""Rain rate from monthly rain and temperature, or from a climate zone that the user names; knows no maps."""

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final, Literal, get_args

import numpy as np
from numpy.typing import ArrayLike

from fellspan.errors import QuantityError
from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, not_negative, positive, quiet

RainZone = Literal["A", "B", "C", "D", "E", "F", "G", "H", "J", "K", "L", "M", "N", "P", "Q"]
"""Rain climate zones of Rec. ITU-R P.837-1, superseded; there is no I and no O."""

ZONE_RAIN_RATE_001_MM_H: Final[Mapping[RainZone, float]] = MappingProxyType(
    dict(
        zip(get_args(RainZone), map(float, (8, 12, 15, 19, 22, 28, 30, 32, 35, 42, 60, 63, 95, 145, 115)), strict=True)
    )
)
"""Rain rate exceeded for 0.01 % of the year, mm/h, by zone."""

_DAYS: Final = np.array([31, 28.25, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31])
_YEAR_DAYS: Final = 365.25
_SPREAD: Final = 1.26
_SHIFT: Final = 0.7938
_GREATEST_SHARE: Final = 70.0
_HALVINGS: Final = 60


def rain_probability_percent(monthly_rain_mm: ArrayLike, *, monthly_temperature_c: ArrayLike) -> Result:
    """Percentage of an average year during which it rains.

    Parameters
    ----------
    monthly_rain_mm, monthly_temperature_c
        Mean rain of each month, mm, and its mean temperature near the ground, degrees Celsius; the last axis is January to
        December.

    Returns
    -------
    percent
        Shape of the arguments without the months; NaN where a month is NaN or its rain negative.

    Raises
    ------
    QuantityError
        The last axis does not hold twelve months.

    Notes
    -----
    Rec. ITU-R P.837-8, Annex 1, equations (1) to (3). Source key: p837-8-rain-rate.
    """
    share, _ = _months(monthly_rain_mm, monthly_temperature_c)
    return as_result(np.sum(_DAYS * share, axis=-1) / _YEAR_DAYS)  # (3)


def rain_rate_percent(
    rain_rate_mm_h: ArrayLike, *, monthly_rain_mm: ArrayLike, monthly_temperature_c: ArrayLike
) -> Result:
    """Percentage of an average year during which it rains harder than a rate.

    Parameters
    ----------
    rain_rate_mm_h
        Rain rate, mm/h, one-minute integration; broadcasts against the places.
    monthly_rain_mm, monthly_temperature_c
        As `rain_probability_percent` takes them.

    Returns
    -------
    percent
        Broadcast shape; at a rate of 0 the share of time with rain. NaN where the rate is negative.

    Notes
    -----
    Rec. ITU-R P.837-8, Annex 1, equations (4) to (8). Source key: p837-8-rain-rate.
    """
    share, log_rate = _months(monthly_rain_mm, monthly_temperature_c)
    with quiet():
        log_asked = np.log(not_negative(rain_rate_mm_h))
    return as_result(_exceeded(log_asked, share, log_rate))


def rain_rate_mm_h(percent: ArrayLike, *, monthly_rain_mm: ArrayLike, monthly_temperature_c: ArrayLike) -> Result:
    """Rain rate that is exceeded for a percentage of an average year.

    Parameters
    ----------
    percent
        Percentage of time; broadcasts against the places. P.530 wants 0.01.
    monthly_rain_mm, monthly_temperature_c
        As `rain_probability_percent` takes them.

    Returns
    -------
    rain_rate_mm_h
        mm/h, one-minute integration, broadcast shape; 0 where it rains for less than that; NaN where the percentage is not
        above zero.

    Notes
    -----
    Rec. ITU-R P.837-8, Annex 1, equations (1) to (8), solved by bisection of the logarithm to full precision. Source
    key: p837-8-rain-rate.
    """
    share, log_rate = _months(monthly_rain_mm, monthly_temperature_c)
    asked = positive(percent)
    total = np.sum(_DAYS * share, axis=-1) / _YEAR_DAYS
    asked, total = np.broadcast_arrays(asked, total)
    # Forty standard deviations lie outside anything that a double can express.
    low = np.broadcast_to(np.min(log_rate, axis=-1) - 40.0 * _SPREAD, asked.shape)
    high = np.broadcast_to(np.max(log_rate, axis=-1) + 40.0 * _SPREAD, asked.shape)
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        more = _exceeded(middle, share, log_rate) > asked
        low, high = np.where(more, middle, low), np.where(more, high, middle)
    rate = np.where(asked > total, 0.0, np.exp(0.5 * (low + high)))
    return as_result(np.where(np.isnan(asked + total), np.nan, rate))


def zone_rain_rate_001_mm_h(zone: str) -> float:
    """Rain rate exceeded for 0.01 % of the year in a rain climate zone, mm/h.

    Parameters
    ----------
    zone
        Letter of the zone, A to Q without I and O, chosen by the user from a map: it is not found from coordinates here.

    Raises
    ------
    QuantityError
        There is no such zone.

    Notes
    -----
    Rec. ITU-R P.837-1, superseded since 1999; coarse, for want of anything better. Source key: p837-1-zones.
    """
    for letter, rate in ZONE_RAIN_RATE_001_MM_H.items():
        if zone.strip().upper() == letter:
            return rate
    raise QuantityError(f"rain zone {zone!r} does not exist", f"there are {', '.join(ZONE_RAIN_RATE_001_MM_H)}")


def _months(monthly_rain_mm: ArrayLike, monthly_temperature_c: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Share of time with rain, %, and logarithm of the typical rate, for each month."""
    rain, temperature = not_negative(monthly_rain_mm), as_floats(monthly_temperature_c)
    for name, values in (("rain", rain), ("temperature", temperature)):
        if values.shape[-1:] != (12,):
            count = values.shape[-1] if values.ndim else 1
            raise QuantityError(f"{count} monthly values of {name} are given", "give twelve, January to December")
    rate = 0.5874 * np.exp(0.0883 * np.maximum(temperature, 0.0))  # (1)
    share = 100.0 * rain / (24.0 * _DAYS * rate)  # (2)
    often = share > _GREATEST_SHARE
    rate = np.where(often, 100.0 / _GREATEST_SHARE * rain / (24.0 * _DAYS), rate)
    return np.where(often, _GREATEST_SHARE, share), np.log(rate)


def _exceeded(log_asked: FloatArray, share: FloatArray, log_rate: FloatArray) -> FloatArray:
    from scipy.special import ndtr

    tail = ndtr(-(log_asked[..., None] + _SHIFT - log_rate) / _SPREAD)
    return as_floats(np.sum(_DAYS * share * tail, axis=-1) / _YEAR_DAYS)
