"""How the causes of an outage add up: rain, multipath and diffraction fading, one way and both ways, in minutes and per cent.

Percentages of time in and out, of the average year or of the average worst month, never mixed: one call handles one period.
Knows no links and no targets.
"""

from dataclasses import dataclass
from typing import Final, Literal, get_args

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, not_negative

MINUTES_PER_YEAR: Final = 365.25 * 24.0 * 60.0
"""An average year: 525 960 minutes."""
MINUTES_PER_MONTH: Final = MINUTES_PER_YEAR / 12.0

FadingCause = Literal["none", "rain", "multipath", "diffraction"]
FADING_CAUSES: Final[tuple[FadingCause, ...]] = get_args(FadingCause)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Outage:
    """Outage of one direction, or of both at once, in one period: all shares in % of that period, one broadcast shape.

    `dominant` is the cause with the greatest share ("none" where there is no outage or a share is NaN): a word, or an array.
    `total_percent` is the sum of the shares, at most 100; NaN where a share is.
    """

    rain_percent: Result
    multipath_percent: Result
    diffraction_percent: Result
    total_percent: Result
    dominant: str | NDArray[np.str_]

    @property
    def availability_percent(self) -> Result:
        """100 less the total."""
        return as_result(100.0 - as_floats(self.total_percent))


def one_way_outage(
    *,
    rain_percent: ArrayLike,
    multipath_percent: ArrayLike,
    diffraction_percent: ArrayLike = 0.0,
    rain_cross_polar_percent: ArrayLike = 0.0,
) -> Outage:
    """Outage of one direction, by the sum of the percentages of time.

    Parameters
    ----------
    rain_percent
        Time for which rain attenuates by more than the margin, %.
    multipath_percent
        Clear-air outage, %: flat, selective and cross-polar, with diversity where there is one.
    diffraction_percent
        Time for which low k costs more than the margin, %; `diffraction_outage_percent`.
    rain_cross_polar_percent
        Outage by loss of cross-polar discrimination in rain, %; the larger of this and `rain_percent` counts.

    Notes
    -----
    Rec. ITU-R P.530-19, sections 2.4 and 7: rain and multipath come at different times, so their percentages add. That
    diffraction fading adds to them in the same way is our own rule. All figures must be of the same period.
    Source keys: p530-19-sum-of-outages, outage-rules.
    """
    rain = np.maximum(not_negative(rain_percent), not_negative(rain_cross_polar_percent))
    return _outage(rain, not_negative(multipath_percent), not_negative(diffraction_percent))


def two_way_outage(a: Outage, b: Outage, *, common_multipath: bool = False) -> Outage:
    """Outage of a link that needs both directions at once.

    Parameters
    ----------
    a, b
        Outage of each direction, of the same period.
    common_multipath
        True where both directions use one frequency and fade together (time division).

    Notes
    -----
    Our own rule. Rain and low k hit both directions at once, so each costs what it costs the weaker direction. Multipath on two
    frequencies is taken as independent, 1 - (1 - pa)(1 - pb), which is as good as the sum; on one frequency the path is
    the same both ways and the larger counts. Source key: outage-rules.
    """
    one, other = as_floats(a.multipath_percent), as_floats(b.multipath_percent)
    multipath = np.maximum(one, other) if common_multipath else one + other - one * other / 100.0
    return _outage(
        np.maximum(as_floats(a.rain_percent), as_floats(b.rain_percent)),
        multipath,
        np.maximum(as_floats(a.diffraction_percent), as_floats(b.diffraction_percent)),
    )


def _outage(rain: FloatArray, multipath: FloatArray, diffraction: FloatArray) -> Outage:
    shares = np.stack(np.broadcast_arrays(rain, multipath, diffraction))
    total = np.minimum(shares.sum(axis=0), 100.0)
    unknown = np.isnan(total)
    worst = np.where(unknown, 0, np.argmax(shares, axis=0) + 1)
    words = np.asarray(FADING_CAUSES)[np.where(total == 0.0, 0, worst)]
    return Outage(
        rain_percent=as_result(shares[0]),
        multipath_percent=as_result(shares[1]),
        diffraction_percent=as_result(shares[2]),
        total_percent=as_result(total),
        dominant=str(words) if words.ndim == 0 else words,
    )


def minutes_per_year(outage_percent: ArrayLike) -> Result:
    """Minutes of an average year of 365.25 days, from % of the average year (not of the worst month)."""
    return as_result(as_floats(outage_percent) / 100.0 * MINUTES_PER_YEAR)


def minutes_per_worst_month(outage_percent: ArrayLike) -> Result:
    """Minutes of an average month (43 830 in all), from % of the average worst month."""
    return as_result(as_floats(outage_percent) / 100.0 * MINUTES_PER_MONTH)
