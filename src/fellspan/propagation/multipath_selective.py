"""What multipath does to a wide channel: the echo that notches the band, and the sum with flat fading.

Outages are percentages of the average worst month; the occurrence factor comes from `multipath`. Knows no radios: a signature
comes in as numbers.
"""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, not_negative, positive, quiet

REFERENCE_DELAY_S: Final = 6.3e-9
"""Delay at which signatures are usually measured; common practice, no source."""


def multipath_activity(occurrence_percent: ArrayLike) -> Result:
    """Share of the worst month in which the air makes echoes at all, eta, 0 to 1: 1 - exp(-0.2 P0^0.75), P0 = p0/100.

    Rec. ITU-R P.530-19, equation (102). Source key: p530-19-selective.
    """
    return as_result(-np.expm1(-0.2 * (not_negative(occurrence_percent) / 100.0) ** 0.75))  # (102)


def mean_echo_delay_s(distance_m: ArrayLike) -> Result:
    """Mean delay of the echo, s: 0.7 ns (d/50 km)^1.3. Rec. ITU-R P.530-19, equation (116). Source key: p530-19-selective."""
    return as_result(0.7e-9 * (not_negative(distance_m) / 50_000.0) ** 1.3)  # (116)


def selective_outage_percent(
    occurrence_percent: ArrayLike,
    *,
    distance_m: ArrayLike,
    signature_width_hz: ArrayLike,
    signature_depth_db: ArrayLike,
    reference_delay_s: ArrayLike = REFERENCE_DELAY_S,
    other_width_hz: ArrayLike | None = None,
    other_depth_db: ArrayLike | None = None,
    other_delay_s: ArrayLike | None = None,
) -> Result:
    """Outage by selective fading, from the signature of the radio.

    Parameters
    ----------
    occurrence_percent
        Occurrence factor p0, % of the worst month.
    distance_m
        Path length, m.
    signature_width_hz, signature_depth_db, reference_delay_s
        Signature for the minimum-phase echo: width, Hz; depth, dB; delay it was measured at, s (6.3 ns unless given).
    other_width_hz, other_depth_db, other_delay_s
        The same for the non-minimum-phase echo; as the first where not given.

    Returns
    -------
    outage_percent
        % of the average worst month, at most 100; 0 where there is no multipath.

    Notes
    -----
    Rec. ITU-R P.530-19, section 5.1, equations (102), (116) and (117). Source key: p530-19-selective.
    """
    one = _signature_term(signature_width_hz, signature_depth_db, reference_delay_s)
    other = _signature_term(
        signature_width_hz if other_width_hz is None else other_width_hz,
        signature_depth_db if other_depth_db is None else other_depth_db,
        reference_delay_s if other_delay_s is None else other_delay_s,
    )
    activity = as_floats(multipath_activity(occurrence_percent))
    delay_ns = as_floats(mean_echo_delay_s(distance_m)) * 1e9
    return as_result(np.minimum(215.0 * activity * (one + other) * delay_ns**2, 100.0))  # (117), x 100 for %


def _signature_term(width_hz: ArrayLike, depth_db: ArrayLike, delay_s: ArrayLike) -> FloatArray:
    with quiet():
        width_ghz = not_negative(width_hz) / 1e9
        delay_ns = positive(np.abs(as_floats(delay_s))) * 1e9
        return np.asarray(width_ghz * 10.0 ** (-as_floats(depth_db) / 20.0) / delay_ns, dtype=np.float64)


def selective_outage_normalised_percent(
    occurrence_percent: ArrayLike,
    *,
    distance_m: ArrayLike,
    kn: ArrayLike,
    baud_period_s: ArrayLike,
    other_kn: ArrayLike | None = None,
) -> Result:
    """Outage by selective fading, where only the normalised parameter Kn of the radio is known.

    Parameters
    ----------
    occurrence_percent, distance_m
        Occurrence factor p0, % of the worst month; path length, m.
    kn, other_kn
        Normalised signature area for the minimum and the non-minimum phase; the second as the first if not given.
    baud_period_s
        Length of a symbol, s.

    Notes
    -----
    Rec. ITU-R P.530-19, equation (118). At most 100. Source key: p530-19-selective.
    """
    both = not_negative(kn) + not_negative(kn if other_kn is None else other_kn)
    activity = as_floats(multipath_activity(occurrence_percent))
    with quiet():
        ratio = as_floats(mean_echo_delay_s(distance_m)) / positive(baud_period_s)
        return as_result(np.minimum(215.0 * activity * both * ratio**2, 100.0))  # (118)


def clear_air_outage_percent(
    flat_percent: ArrayLike, *, selective_percent: ArrayLike = 0.0, cross_polar_percent: ArrayLike = 0.0
) -> Result:
    """Clear-air outage: flat (non-selective), selective and cross-polar parts added, at most 100 %.

    The flat part is `fade_exceeded_percent` of the flat margin. With diversity give `diversity_outage_percent` as the flat
    part, no selective one, and the cross-polar part divided by the improvement.

    Notes
    -----
    Rec. ITU-R P.530-19, section 7, equation (177). Source key: p530-19-clear-air-outage.
    """
    total = not_negative(flat_percent) + not_negative(selective_percent) + not_negative(cross_polar_percent)
    return as_result(np.minimum(total, 100.0))


def composite_fade_margin_db(*margins_db: ArrayLike) -> Result:
    """One margin for several: flat, dispersive, interference ... dB, their powers added.

    -10 log(sum of 10^(-M/10)). Common practice, no source. Source key: composite-margin.
    """
    if not margins_db:
        return np.inf
    with quiet():
        parts = [10.0 ** (-as_floats(margin) / 10.0) for margin in margins_db]
        return as_result(-10.0 * np.log10(sum(parts[1:], start=parts[0])))
