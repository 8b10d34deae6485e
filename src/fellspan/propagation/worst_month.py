"""From the average worst month to the average year and to shorter periods, events, and hops in tandem.

Percentages of time in, percentages of time out. Knows no fading mechanism and no places but a latitude.
"""

from typing import Final, Literal, get_args

import numpy as np
from numpy.typing import ArrayLike

from fellspan.errors import QuantityError
from fellspan.propagation._arrays import Result, as_floats, as_result, not_negative, positive, quiet

WORST_MONTH_Q1: Final = 2.85
WORST_MONTH_BETA: Final = 0.13
"""The law of Rec. ITU-R P.841 with the figures that Rec. ITU-R P.530-19, equation (24), takes for multipath."""

GREATEST_Q: Final = 12.0
"""A year has twelve months: the worst one cannot hold more than all of the time that the year holds."""

GEOGRAPHIC_CAP_DB: Final = 10.8
"""Greatest correction of equation (B.7) of Rec. ITU-R P.2001-6; that is, twelve months."""

PathRelief = Literal["flat", "hilly", "hilly land"]
_SHORT_PERIODS: Final = {
    "flat": (89.34, -0.854, 0.676),
    "hilly": (119.0, -0.78, 0.295),
    "hilly land": (199.85, -0.834, 0.175),
}


def annual_from_worst_month_percent(worst_month_percent: ArrayLike) -> Result:
    """Percentage of an average year from the percentage of the average worst month.

    Parameters
    ----------
    worst_month_percent
        0 to 100 %.

    Returns
    -------
    annual_percent
        Same shape; NaN where the input is negative.

    Notes
    -----
    Rec. ITU-R P.530-19, equation (24), with the power law of Rec. ITU-R P.841: the worst month holds Q = 2.85 p^-0.13 times the
    share p of the year. The law spans 1.6e-5 to 3 % of the year, 1.9e-4 to 7.4 % of the worst month. Outside that span the
    published branches were not read. Our rule: below, Q stays at 12 (the most a month can hold, and the two meet there); above,
    the power law goes on, except that a month that is wholly lost counts as a year lost. Source key: p530-19-worst-month.
    """
    worst = not_negative(worst_month_percent)
    with quiet():
        power_law = (worst / WORST_MONTH_Q1) ** (1.0 / (1.0 - WORST_MONTH_BETA))
    annual = np.maximum(power_law, worst / GREATEST_Q)
    return as_result(np.where(worst >= 100.0, 100.0, annual))


def worst_month_from_annual_percent(annual_percent: ArrayLike) -> Result:
    """Percentage of the average worst month from that of an average year, at most 100.

    Inverse of `annual_from_worst_month_percent`, with the same span. For rain too: see the methods page.
    Source key: p530-19-worst-month.
    """
    annual = not_negative(annual_percent)
    with quiet():
        power_law = WORST_MONTH_Q1 * annual ** (1.0 - WORST_MONTH_BETA)
    return as_result(np.minimum(np.minimum(power_law, GREATEST_Q * annual), 100.0))


def geographic_correction_db(
    distance_m: ArrayLike, *, latitude_deg: ArrayLike, inclination_mrad: ArrayLike = 0.0
) -> Result:
    """How much less an average year is hit than the worst month, dB: the older, geographic form, at most 10.8.

    Parameters
    ----------
    distance_m
        Path length, m.
    latitude_deg
        Latitude of the path, degrees.
    inclination_mrad
        Slope between the antennas, mrad, from `path_inclination_mrad`.

    Notes
    -----
    Rec. ITU-R P.2001-6, equation (B.7); Rec. ITU-R P.530 had it up to edition -18. Not taken below 0, our rule, so that the
    year is never hit harder than its worst month (paths of several thousand km). Source key: p2001-6-worst-month.
    """
    latitude = as_floats(latitude_deg)
    swing = np.abs(np.cos(2.0 * np.radians(latitude))) ** 0.7
    sign = np.where(np.abs(latitude) <= 45.0, 1.0, -1.0)
    with quiet():
        correction = (
            10.5
            - 5.6 * np.log10(1.1 + sign * swing)
            - 2.7 * np.log10(positive(distance_m) / 1000.0)
            + 1.7 * np.log10(1.0 + not_negative(inclination_mrad))
        )
    return as_result(np.clip(correction, 0.0, GEOGRAPHIC_CAP_DB))


def annual_from_worst_month_geographic_percent(
    worst_month_percent: ArrayLike,
    *,
    distance_m: ArrayLike,
    latitude_deg: ArrayLike,
    inclination_mrad: ArrayLike = 0.0,
) -> Result:
    """Percentage of an average year by the older form, 10^(-DeltaG/10) of the worst month; for editions up to -18.

    A month that is wholly lost counts as a year lost, our rule. Source key: p2001-6-worst-month.
    """
    correction = as_floats(
        geographic_correction_db(distance_m, latitude_deg=latitude_deg, inclination_mrad=inclination_mrad)
    )
    worst = not_negative(worst_month_percent)
    return as_result(np.where(worst >= 100.0, 100.0, worst * 10.0 ** (-correction / 10.0)))


def shorter_worst_period_factor(hours: ArrayLike, *, relief: PathRelief = "flat") -> Result:
    """How much worse the worst period of so many hours is than the worst month: a factor on its percentage.

    Parameters
    ----------
    hours
        Length of the period, h, 1 to 720 (a month).
    relief
        Of the path: "flat" (as much as none), "hilly", or "hilly land" (hilly with no water).

    Notes
    -----
    Rec. ITU-R P.530-19, equations (25) to (27). Source key: p530-19-shorter-periods.
    """
    if relief not in _SHORT_PERIODS:
        raise QuantityError(f"relief of the path is {relief!r}", f"it must be one of {', '.join(get_args(PathRelief))}")
    factor, power, rest = _SHORT_PERIODS[relief]
    with quiet():
        return as_result(factor * positive(hours) ** power + rest)


def multipath_events_per_year(annual_percent: ArrayLike) -> Result:
    """Fades of 10 s or longer in an average year, from the percentage of the year.

    Rec. ITU-R P.530-19, equation (31): 3650 p^0.95. Source key: p530-19-fade-events.
    """
    return as_result(3650.0 * not_negative(annual_percent) ** 0.95)


def tandem_outage_percent(hop_outage_percent: ArrayLike, *, distance_m: ArrayLike, fade_db: ArrayLike) -> Result:
    """Multipath outage of hops in a row, less what neighbouring hops suffer at the same time.

    Parameters
    ----------
    hop_outage_percent
        Shape (..., n): outage of each hop, in their order along the chain, % of the worst month.
    distance_m
        Length of each hop, m, (n,) or (..., n).
    fade_db
        Flat fade margin, dB, the same for all hops, (...).

    Returns
    -------
    outage_percent
        Shape (...): at most the sum over the hops, and at most 100; never less than the worst hop.

    Notes
    -----
    Rec. ITU-R P.530-19, equations (29) and (30): sum of Pi less sum of (Pi Pi+1)^C, C = 0.5 + 0.0052 A + 0.0025 (di + di+1) for
    A up to 40 dB and di + di+1 up to 120 km, else 1. Source key: p530-19-tandem.
    """
    share = not_negative(hop_outage_percent) / 100.0
    distance_km = np.broadcast_to(positive(distance_m) / 1000.0, share.shape)
    fade = as_floats(fade_db)[..., np.newaxis]
    both = distance_km[..., :-1] + distance_km[..., 1:]
    exponent = np.where((fade <= 40.0) & (both <= 120.0), 0.5 + 0.0052 * fade + 0.0025 * both, 1.0)  # (30)
    # Near the ends of its span C comes out a little above 1, where hops are independent; they cannot be less than that.
    joint = (share[..., :-1] * share[..., 1:]) ** np.minimum(exponent, 1.0)
    total = share.sum(axis=-1) - joint.sum(axis=-1)  # (29)
    return as_result(100.0 * np.clip(total, share.max(axis=-1), 1.0))
