"""How much of the worst month multipath fading takes: occurrence by edition, every fade depth, enhancement.

Percentages are of the average worst month. Knows no maps and no places: the climate comes in as numbers. Year, shorter periods
and chains of hops are in `worst_month`, wide channels in `multipath_selective`, second antennas in `diversity`.
"""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, not_negative, positive, quiet

NO_MULTIPATH_UP_TO_M: Final = 5000.0
"""Paths up to this length have no multipath fading worth counting: Rec. ITU-R P.530-19, section 2.3."""

_HALVINGS: Final = 60
"""Enough to bring any bracket of decibels down to the last bits of a float."""


def path_inclination_mrad(distance_m: ArrayLike, *, a_amsl_m: ArrayLike, b_amsl_m: ArrayLike) -> Result:
    """Slope of the straight line between the antennas, mrad: height difference over distance, never negative.

    Rec. ITU-R P.530-19, section 2.3.1. Source key: p530-19-multipath.
    """
    with quiet():
        return as_result(np.abs(as_floats(a_amsl_m) - as_floats(b_amsl_m)) / positive(distance_m) * 1000.0)


def multipath_clearance_m(
    distance_m: ArrayLike, *, a_amsl_m: ArrayLike, b_amsl_m: ArrayLike, mean_ground_amsl_m: ArrayLike
) -> Result:
    """Height of mid-path over the mean ground, hc, m, as the occurrence of edition -19 uses it and states its range.

    Mean of both antennas less d^2/102 (d in km) less the mean terrain height without trees. Source key: p530-19-multipath.
    """
    distance_km = as_floats(distance_m) / 1000.0
    mean_antenna = (as_floats(a_amsl_m) + as_floats(b_amsl_m)) / 2.0
    return as_result(mean_antenna - distance_km**2 / 102.0 - as_floats(mean_ground_amsl_m))


def multipath_occurrence_percent(
    distance_m: ArrayLike,
    *,
    frequency_hz: ArrayLike,
    a_amsl_m: ArrayLike,
    b_amsl_m: ArrayLike,
    mean_ground_amsl_m: ArrayLike,
    log_k: ArrayLike,
    dn75: ArrayLike,
) -> Result:
    """Multipath occurrence factor p0 by edition -19.

    Parameters
    ----------
    distance_m, frequency_hz
        Path length, m, and frequency, Hz.
    a_amsl_m, b_amsl_m
        Heights of the antennas above sea level, m.
    mean_ground_amsl_m
        Mean terrain height along the path, trees left out, m above sea level.
    log_k
        Decimal logarithm of the geoclimatic factor K, K in %.
    dn75
        Refractivity over the lowest 75 m, N-units (not per km), 0 to 54. Above 54 the result explodes.

    Returns
    -------
    occurrence_percent
        % of the average worst month, broadcast shape; may exceed 100. 0 for paths up to 5 km.

    Notes
    -----
    Rec. ITU-R P.530-19, section 2.3.1, equations (5) to (11); the law is that of edition -18. Standard error 5.2 dB.
    Source key: p530-19-multipath.
    """
    distance = as_floats(distance_m)
    distance_km = positive(distance) / 1000.0
    frequency_ghz = positive(frequency_hz) / 1e9
    refractivity = not_negative(dn75)
    height = as_floats(
        multipath_clearance_m(distance, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m, mean_ground_amsl_m=mean_ground_amsl_m)
    )
    inclination = as_floats(path_inclination_mrad(distance, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m))
    lower = np.minimum(as_floats(a_amsl_m), as_floats(b_amsl_m))
    with quiet():
        limit = refractivity * distance_km**1.5 * np.sqrt(frequency_ghz) / 24730.0
        surface = np.minimum((refractivity / 50.0) ** 1.8 * np.exp(-height / (2.5 * np.sqrt(distance_km))), limit)
        exponent = (
            -0.376 * np.tanh((height - 147.0) / 125.0) - 0.334 * inclination**0.39 - 0.00027 * lower + 17.85 * surface
        )
        occurrence = (
            10.0 ** as_floats(log_k) * distance_km**3.51 * (frequency_ghz**2 + 13.0) ** 0.447 * 10.0**exponent
        )  # (10), (11)
    return _none_on_short_paths(distance, occurrence)


def multipath_occurrence_detailed_percent(
    distance_m: ArrayLike,
    *,
    frequency_hz: ArrayLike,
    a_amsl_m: ArrayLike,
    b_amsl_m: ArrayLike,
    dn1_n_per_km: ArrayLike,
    terrain_roughness_m: ArrayLike,
) -> Result:
    """Multipath occurrence factor p0 by the detailed method of edition -17.

    Parameters
    ----------
    distance_m, frequency_hz, a_amsl_m, b_amsl_m
        Path length, m; frequency, Hz; heights of the antennas above sea level, m.
    dn1_n_per_km
        Refractivity gradient of the lowest 65 m not exceeded for 1 % of an average year, N-units per km, negative.
    terrain_roughness_m
        Standard deviation of terrain heights in a square of 110 km, m.

    Returns
    -------
    occurrence_percent
        % of the average worst month, broadcast shape; may exceed 100. 0 for paths up to 5 km.

    Notes
    -----
    Rec. ITU-R P.530-17, section 2.3.1, the text of which was not read. Source key: p530-17-multipath-detailed.
    """
    with quiet():
        factor = 10.0 ** (-4.4 - 0.0027 * as_floats(dn1_n_per_km)) * (10.0 + not_negative(terrain_roughness_m)) ** -0.46
    return _older_occurrence(
        distance_m, frequency_hz, a_amsl_m, b_amsl_m, factor, powers=(3.4, -1.03), height_slope=0.00076
    )


def multipath_occurrence_quick_percent(
    distance_m: ArrayLike,
    *,
    frequency_hz: ArrayLike,
    a_amsl_m: ArrayLike,
    b_amsl_m: ArrayLike,
    dn1_n_per_km: ArrayLike,
) -> Result:
    """Multipath occurrence factor p0 by the quick method of edition -17, for want of a terrain roughness.

    Parameters, result and limits as `multipath_occurrence_detailed_percent`, without the roughness.

    Notes
    -----
    As Rec. ITU-R P.2001-6 prints it, equations (B.1) and (B.6). Source key: p530-17-multipath-quick.
    """
    with quiet():
        factor = 10.0 ** (-4.6 - 0.0027 * as_floats(dn1_n_per_km))
    return _older_occurrence(
        distance_m, frequency_hz, a_amsl_m, b_amsl_m, factor, powers=(3.1, -1.29), height_slope=0.00089
    )


def _older_occurrence(
    distance_m: ArrayLike,
    frequency_hz: ArrayLike,
    a_amsl_m: ArrayLike,
    b_amsl_m: ArrayLike,
    factor: FloatArray,
    *,
    powers: tuple[float, float],
    height_slope: float,
) -> Result:
    distance = as_floats(distance_m)
    of_distance, of_inclination = powers
    inclination = as_floats(path_inclination_mrad(distance, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m))
    lower = np.minimum(as_floats(a_amsl_m), as_floats(b_amsl_m))
    with quiet():
        occurrence = (
            factor
            * (positive(distance) / 1000.0) ** of_distance
            * (1.0 + inclination) ** of_inclination
            * (positive(frequency_hz) / 1e9) ** 0.8
            * 10.0 ** (-height_slope * lower)
        )
    return _none_on_short_paths(distance, occurrence)


def _none_on_short_paths(distance: FloatArray, occurrence: FloatArray) -> Result:
    short = (distance >= 0.0) & (distance <= NO_MULTIPATH_UP_TO_M)
    return as_result(np.where(short, 0.0, occurrence))


def transition_fade_db(occurrence_percent: ArrayLike) -> Result:
    """Fade depth At where the law of shallow fades passes into that of deep ones, dB: 25 + 1.2 log p0, -inf for no fading.

    Rec. ITU-R P.530-19, section 2.3.2, equation (12). Source key: p530-19-fade-depths.
    """
    with quiet():
        return as_result(25.0 + 1.2 * np.log10(not_negative(occurrence_percent)))  # (12)


def deep_fade_exceeded_percent(fade_db: ArrayLike, *, occurrence_percent: ArrayLike) -> Result:
    """Percentage of the worst month by the law of deep fades alone, p0 10^(-A/10), at most 100.

    Right at and above `transition_fade_db`; too high or too low below it. Source key: p530-19-fade-depths.
    """
    with quiet():
        return as_result(np.minimum(not_negative(occurrence_percent) * 10.0 ** (-as_floats(fade_db) / 10.0), 100.0))


def fade_exceeded_percent(fade_db: ArrayLike, *, occurrence_percent: ArrayLike) -> Result:
    """Percentage of the average worst month for which multipath fades deeper than this: every fade depth.

    Parameters
    ----------
    fade_db
        Fade depth, or the flat fade margin, dB.
    occurrence_percent
        Occurrence factor p0, %, from one of the editions.

    Returns
    -------
    percent
        0 to 100, broadcast shape. 63.2 at 0 dB (the median level lies a little below free space when the air is
        layered), 0 where p0 is 0.

    Notes
    -----
    Rec. ITU-R P.530-19, section 2.3.2, equations (12) to (18); unchanged since -16. Falls steadily with depth for p0 below
    2000 %. Below 0 dB the Recommendation says nothing: our rule is 100 %, a link that lacks level even without fading
    is down all the time. Source key: p530-19-fade-depths.
    """
    fade, occurrence = np.broadcast_arrays(as_floats(fade_db), not_negative(occurrence_percent))
    transition = as_floats(transition_fade_db(occurrence))
    deep = as_floats(deep_fade_exceeded_percent(fade, occurrence_percent=occurrence))
    percent = np.where(fade >= transition, deep, _shallow(fade, occurrence, transition))
    percent = np.where(occurrence == 0.0, 0.0, percent)
    percent = np.where(fade < 0.0, 100.0, percent)
    return as_result(np.where(np.isnan(fade) | np.isnan(occurrence), np.nan, percent))


def _shallow(fade: FloatArray, occurrence: FloatArray, transition: FloatArray) -> FloatArray:
    with quiet():
        at_transition = np.minimum(occurrence * 10.0 ** (-transition / 10.0), 99.9999)  # (13)
        slope = -20.0 * np.log10(-np.log1p(-at_transition / 100.0)) / transition  # (14)
        shape = (slope - 2.0) / _bend(transition) - _offset(transition)  # (15)
        exponent = 2.0 + _bend(fade) * (shape + _offset(fade))  # (16)
        return np.asarray(-100.0 * np.expm1(-(10.0 ** (-exponent * fade / 20.0))), dtype=np.float64)  # (17)


def _bend(fade: FloatArray) -> FloatArray:
    return np.asarray((1.0 + 0.3 * 10.0 ** (-fade / 20.0)) * 10.0 ** (-0.016 * fade), dtype=np.float64)


def _offset(fade: FloatArray) -> FloatArray:
    return np.asarray(4.3 * (10.0 ** (-fade / 20.0) + fade / 800.0), dtype=np.float64)


def fade_for_percent_db(percent: ArrayLike, *, occurrence_percent: ArrayLike) -> Result:
    """Fade depth exceeded for this percentage of the average worst month; the flat margin that such an outage needs.

    Parameters
    ----------
    percent
        Percentage of the average worst month, above 0.
    occurrence_percent
        Occurrence factor p0, %.

    Returns
    -------
    fade_db
        dB, broadcast shape; 0 where no fade is needed (no fading, or more than 63.2 %), infinite for 0 %, NaN below.

    Notes
    -----
    Inverse of `fade_exceeded_percent`, exact for deep fades and by bisection for shallow ones. Source key: p530-19-fade-depths.
    """
    wanted, occurrence = np.broadcast_arrays(not_negative(percent), not_negative(occurrence_percent))
    transition = as_floats(transition_fade_db(occurrence))
    with quiet():
        deep = 10.0 * np.log10(occurrence / wanted)
    low = np.zeros(wanted.shape)
    high = np.where(transition > 0.0, transition, 0.0)
    for _ in range(_HALVINGS):
        middle = (low + high) / 2.0
        over = as_floats(fade_exceeded_percent(middle, occurrence_percent=occurrence)) > wanted
        low, high = np.where(over, middle, low), np.where(over, high, middle)
    fade = np.where(deep >= transition, np.maximum(deep, 0.0), (low + high) / 2.0)
    fade = np.where(occurrence == 0.0, 0.0, fade)
    return as_result(np.where(np.isnan(wanted) | np.isnan(occurrence), np.nan, fade))


def enhancement_exceeded_percent(enhancement_db: ArrayLike, *, fade_001_db: ArrayLike) -> Result:
    """Percentage of the average worst month for which the level is enhanced by more than this.

    Parameters
    ----------
    enhancement_db
        Enhancement over the level without fading, dB; above 10.
    fade_001_db
        Multipath fade exceeded for 0.01 % of the worst month, dB.

    Notes
    -----
    Rec. ITU-R P.530-19, equation (19), which prints the complement: 100 less this is the time the enhancement is not exceeded.
    Source key: p530-19-enhancement.
    """
    with quiet():
        exceeded = 10.0 ** ((-1.7 + 0.2 * as_floats(fade_001_db) - as_floats(enhancement_db)) / 3.5)
    return as_result(np.minimum(exceeded, 100.0))
