"""How far to keep away from an antenna: limits of radio exposure, power density, distances; knows no patterns.

Planning figures for continuous transmission at full power. The local code, the maker's instructions and a licensed engineer go
before them, and nobody works in front of a live antenna.
"""

import math
from dataclasses import dataclass
from typing import Final, Literal, get_args

import numpy as np
from numpy.typing import ArrayLike

from fellspan.errors import QuantityError
from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, not_negative, positive, quiet
from fellspan.propagation.free_space import wavelength_m

ExposureRule = Literal["icnirp-2020", "fcc-1.1310"]
ExposureGroup = Literal["public", "occupational"]
ExposureBody = Literal["whole", "local"]


@dataclass(frozen=True, slots=True, kw_only=True)
class ExposureLimit:
    """One row of a rule: power density from `low_hz` to `high_hz`, the factor times (frequency in MHz)^exponent."""

    rule: ExposureRule
    group: ExposureGroup
    body: ExposureBody
    low_hz: float
    high_hz: float
    factor_w_m2: float
    exponent: float
    averaging_min: float


def _rows(
    rule: ExposureRule,
    group: ExposureGroup,
    body: ExposureBody,
    averaging_min: float,
    *bands: tuple[float, float, float, float],
) -> tuple[ExposureLimit, ...]:
    return tuple(
        ExposureLimit(
            rule=rule, group=group, body=body, low_hz=low * 1e6, high_hz=high * 1e6,
            factor_w_m2=factor, exponent=exponent, averaging_min=averaging_min,
        )
        for low, high, factor, exponent in bands
    )  # fmt: skip


_GHZ_FACTOR: Final = 1000.0**0.177
"""The rows for 6 to 300 GHz are printed with the frequency in GHz."""

EXPOSURE_LIMITS: Final[tuple[ExposureLimit, ...]] = (
    *_rows("icnirp-2020", "public", "whole", 30.0, (30, 400, 2.0, 0.0), (400, 2000, 1 / 200, 1.0), (2000, 300e3, 10.0, 0.0)),
    *_rows("icnirp-2020", "occupational", "whole", 30.0, (30, 400, 10.0, 0.0), (400, 2000, 1 / 40, 1.0),
           (2000, 300e3, 50.0, 0.0)),
    *_rows("icnirp-2020", "public", "local", 6.0, (30, 400, 10.0, 0.0), (400, 2000, 0.058, 0.86), (2000, 6000, 40.0, 0.0),
           (6000, 300e3, 55.0 * _GHZ_FACTOR, -0.177)),
    *_rows("icnirp-2020", "occupational", "local", 6.0, (30, 400, 50.0, 0.0), (400, 2000, 0.29, 0.86),
           (2000, 6000, 200.0, 0.0), (6000, 300e3, 275.0 * _GHZ_FACTOR, -0.177)),
    *_rows("fcc-1.1310", "public", "whole", 30.0, (0.3, 1.34, 1000.0, 0.0), (1.34, 30, 1800.0, -2.0), (30, 300, 2.0, 0.0),
           (300, 1500, 1 / 150, 1.0), (1500, 100e3, 10.0, 0.0)),
    *_rows("fcc-1.1310", "occupational", "whole", 6.0, (0.3, 3, 1000.0, 0.0), (3, 30, 9000.0, -2.0), (30, 300, 10.0, 0.0),
           (300, 1500, 1 / 30, 1.0), (1500, 100e3, 50.0, 0.0)),
)  # fmt: skip
"""ICNIRP 2020 reference levels from 30 MHz to 300 GHz, and 47 CFR 1.1310, table 1, from 0.3 MHz to 100 GHz."""


def exposure_limit_w_m2(
    frequency_hz: ArrayLike,
    *,
    group: ExposureGroup = "public",
    rule: ExposureRule | Literal["stricter"] = "stricter",
    body: ExposureBody = "whole",
) -> Result:
    """Limit of incident power density.

    Parameters
    ----------
    frequency_hz
        Frequency, Hz.
    group
        "public", anybody; or "occupational", trained people who know of the exposure.
    rule
        "icnirp-2020", "fcc-1.1310", or "stricter": the lower of those that reach to this frequency.
    body
        "whole", averaged over the body, which decides beyond the near field; or "local", over a small spot (ICNIRP only).

    Returns
    -------
    limit_w_m2
        W/m2, same shape; NaN where no rule asked for reaches. Averages over time are in `EXPOSURE_LIMITS`.

    Raises
    ------
    QuantityError
        An unknown group, rule or body.

    Notes
    -----
    Where bands meet the lower value holds. Source keys: icnirp-2020, fcc-1-1310.
    """
    rules = ("stricter", *get_args(ExposureRule))
    for what, word, words in (("group", group, get_args(ExposureGroup)), ("rule", rule, rules),
                              ("body", body, get_args(ExposureBody))):  # fmt: skip
        if word not in words:
            raise QuantityError(f"exposure {what} {word!r} is unknown", f"there are {', '.join(words)}")
    frequency = as_floats(frequency_hz)
    limit = np.full(frequency.shape, np.nan)
    with quiet():
        for row in EXPOSURE_LIMITS:
            if row.group == group and row.body == body and rule in ("stricter", row.rule):
                within = (frequency >= row.low_hz) & (frequency <= row.high_hz)
                value = row.factor_w_m2 * (frequency / 1e6) ** row.exponent
                limit = np.where(within, np.fmin(limit, value), limit)
    return as_result(limit)


def power_density_w_m2(distance_m: ArrayLike, *, eirp_dbm: ArrayLike) -> Result:
    """Incident power density in the far field, free space.

    Parameters
    ----------
    distance_m
        Distance from the antenna, m.
    eirp_dbm
        Radiated power toward that spot, dBm EIRP: transmitter less feeder plus the gain in that direction.

    Returns
    -------
    density_w_m2
        W/m2, broadcast shape; NaN where the distance is not above zero. In the near field the truth is lower on the axis.

    Notes
    -----
    Definition. A reflecting roof or wall can raise it up to fourfold (both fields in step). Source key: far-field-density.
    """
    with quiet():
        return as_result(_watts(eirp_dbm) / (4.0 * math.pi * positive(distance_m) ** 2))


def distance_to_limit_m(*, eirp_dbm: ArrayLike, limit_w_m2: ArrayLike) -> Result:
    """Distance beyond which the power density in a direction is below a limit, m; far field, free space.

    `eirp_dbm` is the EIRP in that direction, `limit_w_m2` from `exposure_limit_w_m2`. Source key: far-field-density.
    """
    with quiet():
        return as_result(np.sqrt(_watts(eirp_dbm) / (4.0 * math.pi * positive(limit_w_m2))))


def dish_surface_density_w_m2(*, power_w: ArrayLike, diameter_m: ArrayLike) -> Result:
    """Highest power density at the mouth of a dish, W/m2: four times the mean over the aperture.

    UNCONFIRMED, from memory of FCC OET Bulletin 65: show it marked so. Source key: oet65-dish.
    """
    with quiet():
        return as_result(4.0 * not_negative(power_w) / (math.pi / 4.0 * positive(diameter_m) ** 2))


def dish_density_w_m2(
    distance_m: ArrayLike,
    *,
    power_w: ArrayLike,
    diameter_m: ArrayLike,
    aperture_efficiency: ArrayLike,
    frequency_hz: ArrayLike,
) -> Result:
    """Highest power density before a dish, near field included.

    Parameters
    ----------
    distance_m
        Distance before the dish, m.
    power_w
        Power at the feed, W.
    diameter_m
        Diameter of the dish, m.
    aperture_efficiency
        0 to 1.
    frequency_hz
        Frequency, Hz.

    Returns
    -------
    density_w_m2
        W/m2, broadcast shape: level out to D^2/(4 wavelength), falling as 1/R out to 0.6 D^2/wavelength, as 1/R^2 beyond, where
        it starts 3 % higher. NaN where an argument is out of its domain.

    Notes
    -----
    UNCONFIRMED, from memory of FCC OET Bulletin 65, though consistent with its own far field: show it marked so. For ordinary
    dishes; not for arrays. Source key: oet65-dish.
    """
    distance = not_negative(distance_m)
    near, near_end, far_start, far = _dish(power_w, diameter_m, aperture_efficiency, frequency_hz)
    with quiet():
        beyond = np.where(distance <= far_start, near * near_end / distance, far / distance**2)
        return as_result(np.where(distance <= near_end, near + 0.0 * distance, beyond))


def dish_distance_to_limit_m(
    *,
    limit_w_m2: ArrayLike,
    power_w: ArrayLike,
    diameter_m: ArrayLike,
    aperture_efficiency: ArrayLike,
    frequency_hz: ArrayLike,
) -> Result:
    """Distance before a dish beyond which the power density stays below a limit, m, near field included.

    0 where even the near field stays below it; then mind `dish_surface_density_w_m2` at the mouth. Arguments as those of
    `dish_density_w_m2`. UNCONFIRMED, as that is. Source key: oet65-dish.
    """
    limit = positive(limit_w_m2)
    near, near_end, far_start, far = _dish(power_w, diameter_m, aperture_efficiency, frequency_hz)
    with quiet():
        by_far = np.sqrt(far / limit)
        reached = np.where(limit <= near, near * near_end / limit, 0.0)
        reached = np.where(np.isnan(limit + near + far), np.nan, reached)
        return as_result(np.where(by_far > far_start, by_far, reached))


def _dish(
    power_w: ArrayLike, diameter_m: ArrayLike, aperture_efficiency: ArrayLike, frequency_hz: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Near-field density, where it ends, where the far field starts, and the far field's density times distance squared."""
    power, diameter = not_negative(power_w), positive(diameter_m)
    efficiency = np.where(as_floats(aperture_efficiency) <= 1.0, positive(aperture_efficiency), np.nan)
    wavelength = as_floats(wavelength_m(frequency_hz))
    with quiet():
        radiated = efficiency * power
        near = 16.0 * radiated / (math.pi * diameter**2)
        far = radiated * (math.pi * diameter / wavelength) ** 2 / (4.0 * math.pi)
        return near, diameter**2 / (4.0 * wavelength), 0.6 * diameter**2 / wavelength, far


def _watts(level_dbm: ArrayLike) -> FloatArray:
    return as_floats(10.0 ** ((as_floats(level_dbm) - 30.0) / 10.0))
