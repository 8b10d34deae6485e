"""How much a second antenna, or a second frequency, takes off a multipath outage.

Deep fades only. Outages are percentages of the average worst month, spacings and distances in m. Knows no antennas or radios.
"""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, not_negative, positive, quiet
from fellspan.propagation.multipath_selective import multipath_activity

WIDEST_SPACING_M: Final = 23.0
"""A wider spacing counts as this one: Rec. ITU-R P.530-19, section 6.2.4."""


def space_correlation_squared(
    spacing_m: ArrayLike, *, distance_m: ArrayLike, frequency_hz: ArrayLike, occurrence_percent: ArrayLike
) -> Result:
    """Squared correlation of flat fading at two antennas one above the other, kns2, 0 to 1.

    Parameters
    ----------
    spacing_m
        Vertical distance of the two receiving antennas, m; 3 to 23, wider ones count as 23.
    distance_m, frequency_hz
        Path length, m (43 to 240 km, perhaps from 25); frequency, Hz (2 to 11 GHz).
    occurrence_percent
        Occurrence factor p0, %.

    Notes
    -----
    Rec. ITU-R P.530-19, section 6.2.5.1, equations (155) to (162); 0 where there is no multipath.
    Source key: p530-19-space-diversity.
    """
    activity, occurrence = _activity(occurrence_percent)
    spacing = np.minimum(not_negative(spacing_m), WIDEST_SPACING_M)
    with quiet():
        exponent = (
            spacing**0.87
            * (positive(frequency_hz) / 1e9) ** -0.12
            * (positive(distance_m) / 1000.0) ** 0.48
            * occurrence**-0.04
        )
        return as_result(np.exp(-0.0004 * exponent / activity))


def frequency_correlation_squared(
    separation_hz: ArrayLike, *, frequency_hz: ArrayLike, occurrence_percent: ArrayLike
) -> Result:
    """Squared correlation of flat fading on two frequencies, for one protection channel beside one working channel.

    Parameters
    ----------
    separation_hz
        Difference of the two frequencies, Hz, up to 0.5 GHz.
    frequency_hz
        Carrier frequency, Hz, 2 to 11 GHz; paths of 30 to 70 km.
    occurrence_percent
        Occurrence factor p0, %.

    Notes
    -----
    Rec. ITU-R P.530-19, equation (163). Source key: p530-19-frequency-diversity.
    """
    activity, _ = _activity(occurrence_percent)
    with quiet():
        return as_result(np.exp(-0.07 / activity * not_negative(separation_hz) / positive(frequency_hz)))  # (163)


def diversity_improvement(
    correlation_squared: ArrayLike,
    *,
    occurrence_percent: ArrayLike,
    fade_db: ArrayLike,
    level_difference_db: ArrayLike = 0.0,
) -> Result:
    """Improvement I: how many times rarer a deep flat fade is on both branches than on the one.

    Parameters
    ----------
    correlation_squared
        kns2, from `space_correlation_squared` or `frequency_correlation_squared`.
    occurrence_percent
        Occurrence factor p0, %.
    fade_db
        Fade depth, or the flat margin, dB.
    level_difference_db
        How far apart the levels of the branches are without fading, |(G1 - L1) - (G2 - L2)|, dB; the sign is ignored.

    Returns
    -------
    improvement
        1 or more; a second branch cannot harm (our rule, which acts on shallow fades only, outside the range of the formula).

    Notes
    -----
    Rec. ITU-R P.530-19, section 6.2.5.1, equations (155) to (162). Source key: p530-19-space-diversity.
    """
    activity, occurrence = _activity(occurrence_percent)
    fade = as_floats(fade_db)
    correlation = as_floats(correlation_squared)
    with quiet():
        ratio = occurrence / (100.0 * activity)
        improvement = (1.0 - correlation * (1.0 - ratio * 10.0 ** (-fade / 10.0))) / ratio
        improvement = improvement * 10.0 ** ((fade - np.abs(as_floats(level_difference_db))) / 10.0)
    return as_result(np.maximum(improvement, 1.0))


def older_space_improvement(
    spacing_m: ArrayLike,
    *,
    distance_m: ArrayLike,
    frequency_hz: ArrayLike,
    occurrence_percent: ArrayLike,
    fade_db: ArrayLike,
    level_difference_db: ArrayLike = 0.0,
) -> Result:
    """Improvement by space diversity in the form of older editions, which need no multipath activity.

    Parameters and limits as `space_correlation_squared` and `diversity_improvement`; 1 or more.

    Notes
    -----
    [1 - exp(-0.04 S^0.87 f^-0.12 d^0.48 p0^-1.04)] 10^((A - V)/10). No text was read: remembered, and it follows from the newer
    form with eta = p0/100 and its small term dropped. Source key: p530-older-space-diversity.
    """
    spacing = np.minimum(not_negative(spacing_m), WIDEST_SPACING_M)
    with quiet():
        exponent = (
            spacing**0.87
            * (positive(frequency_hz) / 1e9) ** -0.12
            * (positive(distance_m) / 1000.0) ** 0.48
            * positive(occurrence_percent) ** -1.04
        )
        improvement = -np.expm1(-0.04 * exponent) * 10.0 ** (
            (as_floats(fade_db) - np.abs(as_floats(level_difference_db))) / 10.0
        )
    return as_result(np.maximum(improvement, 1.0))


def amplitude_correlation(correlation_squared: ArrayLike) -> Result:
    """Correlation of relative amplitudes, rw, from kns2. Rec. ITU-R P.530-19, section 6.2.5.1, equations (155) to (162).

    Source key: p530-19-space-diversity.
    """
    correlation = as_floats(correlation_squared)
    with quiet():
        low = 1.0 - 0.9746 * (1.0 - correlation) ** 2.170
        high = 1.0 - 0.6921 * (1.0 - correlation) ** 1.034
    return as_result(np.where(correlation <= 0.26, low, high))


def selective_correlation_squared(amplitude_correlation: ArrayLike) -> Result:
    """Squared correlation of selective fading, ks2, from rw. Rec. ITU-R P.530-19, section 6.2.5.1, equations (155) to (162).

    Source key: p530-19-space-diversity.
    """
    amplitude = as_floats(amplitude_correlation)
    rest = 1.0 - amplitude
    with quiet():
        middle = 1.0 - 0.195 * rest ** (0.109 - 0.13 * np.log10(rest))
        high = 1.0 - 0.3957 * rest**0.5136
    known = np.where(amplitude <= 0.5, 0.8238, np.where(amplitude <= 0.9628, middle, high))
    return as_result(np.where(np.isnan(amplitude), np.nan, known))


def diversity_outage_percent(
    flat_percent: ArrayLike,
    *,
    selective_percent: ArrayLike,
    correlation_squared: ArrayLike,
    improvement: ArrayLike,
    occurrence_percent: ArrayLike,
) -> Result:
    """Clear-air outage with diversity, flat and selective together.

    Parameters
    ----------
    flat_percent, selective_percent
        Outages of one branch alone, % of the average worst month.
    correlation_squared, improvement
        kns2, and I from `diversity_improvement` at the flat margin.
    occurrence_percent
        Occurrence factor p0, %.

    Returns
    -------
    outage_percent
        % of the average worst month; 0 where there is no multipath; never more than without diversity.

    Notes
    -----
    Rec. ITU-R P.530-19, section 6.2.5.1: Pdns = Pns/I, Pds = Ps^2/(eta (1 - ks2)), Pd = (Pds^0.75 + Pdns^0.75)^(4/3). Each
    part is held to what it is without diversity, our rule; the published range has no need of it.
    Source key: p530-19-space-diversity.
    """
    flat = not_negative(flat_percent) / 100.0
    selective = not_negative(selective_percent) / 100.0
    activity, occurrence = _activity(occurrence_percent)
    correlation = as_floats(selective_correlation_squared(amplitude_correlation(correlation_squared)))
    with quiet():
        both_flat = flat / as_floats(improvement)
        both_selective = np.minimum(selective**2 / (activity * (1.0 - correlation)), selective)
        together = (both_selective**0.75 + both_flat**0.75) ** (4.0 / 3.0)
    percent = 100.0 * np.minimum(together, np.minimum(flat + selective, 1.0))
    return as_result(np.where(occurrence == 0.0, 0.0, percent))


def _activity(occurrence_percent: ArrayLike) -> tuple[FloatArray, FloatArray]:
    occurrence = not_negative(occurrence_percent)
    return as_floats(multipath_activity(occurrence)), occurrence
