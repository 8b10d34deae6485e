"""From the rain loss at 0.01 % of the year to other shares of time, frequencies and polarizations; knows no rain rates.

Also when a path needs the method for wet snow, which is not computed here.
"""

from typing import Any, Final, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.errors import QuantityError
from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, not_negative, positive, quiet
from fellspan.propagation.rain import RainReading

PrecipitationRegime = Literal["rain", "combined", "none"]
"""Rain alone; rain and wet snow, by a method that is not computed here; no loss by precipitation (all of it dry snow)."""

_HORIZONTAL: Final = 335.0
_VERTICAL: Final = 300.0


def rain_loss_db(
    loss_001_db: ArrayLike, *, percent: ArrayLike, frequency_hz: ArrayLike, reading: RainReading = "A"
) -> Result:
    """Loss by rain that is exceeded for a percentage of an average year.

    Parameters
    ----------
    loss_001_db
        Loss exceeded for 0.01 %, dB, from `rain_loss_001_db`.
    percent
        Percentage of time, 0.001 to 1.
    frequency_hz
        Frequency, Hz.
    reading
        Of the bracket in equation (36). "A", as printed: 0.4 times the logarithm of (f/10)^0.8. "B": 0.4 times the logarithm to
        the power 0.8. Same below 10 GHz; B is up to 3.2 % lower at 0.001 % and 4.4 % lower at 1 % (80 GHz).

    Returns
    -------
    loss_db
        dB, broadcast shape; NaN where the percentage is not above zero or the loss is negative. At 0.01 % it is 0.998 of
        `loss_001_db`: the law is not normalised.

    Notes
    -----
    Rec. ITU-R P.530-19, equations (34) to (36). Source key: p530-19-rain-percent.
    """
    c1_log, c2, c3 = _law(frequency_hz, reading)
    with quiet():
        x = np.log10(positive(percent))
        return as_result(not_negative(loss_001_db) * 10.0 ** (c1_log - c2 * x - c3 * x**2))  # (34)


def rain_percent(
    loss_db: ArrayLike, *, loss_001_db: ArrayLike, frequency_hz: ArrayLike, reading: RainReading = "A"
) -> Result:
    """Percentage of an average year for which rain costs a loss or more; the inverse of `rain_loss_db`.

    Parameters
    ----------
    loss_db
        Loss, dB: the margin that rain may use up.
    loss_001_db
        Loss exceeded for 0.01 %, dB, from `rain_loss_001_db`.
    frequency_hz, reading
        As `rain_loss_db` takes them.

    Returns
    -------
    percent
        0 to 100, broadcast shape; never rises with `loss_db`. 100 for a loss of 0 or below, 0 where there is no rain.

    Notes
    -----
    Rec. ITU-R P.530-19, equations (34) to (36), a parabola in the logarithms, solved in closed form. Below 0.001 % and
    above 1 % it is an extrapolation. The law turns round near 0.0001 %; losses beyond that point get its
    percentage, an upper bound. Source key: p530-19-rain-percent.
    """
    c1_log, c2, c3 = _law(frequency_hz, reading)
    loss, at_001 = as_floats(loss_db), not_negative(loss_001_db)
    with quiet():
        excess = np.log10(loss / at_001) - c1_log
        root = np.sqrt(np.maximum(c2**2 - 4.0 * c3 * excess, 0.0))
        # -2 excess / (c2 + root) is (root - c2) / (2 c3) without the cancellation.
        x = np.where(root == 0.0, -c2 / (2.0 * c3), -2.0 * excess / (c2 + root))
        percent = np.where(at_001 == 0.0, 0.0, np.minimum(10.0**x, 100.0))
        percent = np.where(loss <= 0.0, 100.0, percent)
    return as_result(np.where(np.isnan(loss + at_001 + c1_log), np.nan, percent))


def rain_loss_at_frequency_db(loss_db: ArrayLike, *, from_hz: ArrayLike, to_hz: ArrayLike) -> Result:
    """Rain loss at another frequency, from a known one on the same path at the same percentage and polarization.

    Parameters
    ----------
    loss_db
        Loss at `from_hz`, dB; measured, as a rule.
    from_hz, to_hz
        Frequencies, Hz, 7 to 50 GHz.

    Returns
    -------
    loss_db
        dB, broadcast shape; 0 for 0.

    Notes
    -----
    Rec. ITU-R P.530-19, section 2.4.3, equations (72) to (74). Source key: p530-19-rain-scaling.
    """
    loss = not_negative(loss_db)
    with quiet():
        one, two = _phi(from_hz), _phi(to_hz)
        h = 1.12e-3 * np.sqrt(two / one) * (one * loss) ** 0.55
        return as_result(loss * (two / one) ** (1.0 - h))


def vertical_from_horizontal_rain_db(loss_db: ArrayLike) -> Result:
    """Rain loss with vertical polarization from that with horizontal, same path, frequency and percentage, dB.

    NaN where negative. Rec. ITU-R P.530-19, section 2.4.4. Source key: p530-19-rain-scaling.
    """
    loss = not_negative(loss_db)
    return as_result(_VERTICAL * loss / (_HORIZONTAL + loss))


def horizontal_from_vertical_rain_db(loss_db: ArrayLike) -> Result:
    """Rain loss with horizontal polarization from that with vertical, same path, frequency and percentage, dB.

    NaN where negative or from 300 dB on, which no horizontal loss gives. Rec. ITU-R P.530-19, section 2.4.4. Source
    key: p530-19-rain-scaling.
    """
    loss = not_negative(loss_db)
    with quiet():
        return as_result(np.where(loss < _VERTICAL, _HORIZONTAL * loss / (_VERTICAL - loss), np.nan))


def rain_events_per_year(percent: ArrayLike) -> Result:
    """Number of rain fades of 10 s or longer a year, for the percentage of time that they take together.

    NaN where negative; 0 at 0, where the published 1 + 1313 p^0.945 would say 1. Rec. ITU-R P.530-19, equation (78). Source
    key: p530-19-rain-events.
    """
    share = not_negative(percent)
    return as_result(np.where(share == 0.0, 0.0, 1.0 + 1313.0 * share**0.945))


def rain_height_m(zero_isotherm_m: ArrayLike) -> Result:
    """Mean rain height above sea level, m, from that of the 0 degree isotherm: 360 m more.

    Rec. ITU-R P.839-4. Source key: p839-4-rain-height.
    """
    return as_result(as_floats(zero_isotherm_m) + 360.0)


def precipitation_regime(
    a_amsl_m: ArrayLike, b_amsl_m: ArrayLike, *, rain_height_m: ArrayLike
) -> str | NDArray[np.str_]:
    """Which method a path needs, from how its antennas lie to the rain height.

    Parameters
    ----------
    a_amsl_m, b_amsl_m
        Heights of the antennas, m above sea level.
    rain_height_m
        Mean rain height above sea level, m.

    Returns
    -------
    regime
        A word of `PrecipitationRegime`, or an array of them in the broadcast shape. "combined" says that wet snow adds to
        the loss of rain and that this room does not compute how much.

    Raises
    ------
    QuantityError
        A height is not a number.

    Notes
    -----
    Rec. ITU-R P.530-19, section 2.4.2: rain alone up to 3600 m below the rain height, no loss from 2400 m above it. Source
    key: p530-19-wet-snow.
    """
    a, b, top = np.broadcast_arrays(as_floats(a_amsl_m), as_floats(b_amsl_m), as_floats(rain_height_m))
    if np.any(np.isnan(a + b + top)):
        raise QuantityError(
            "a height is not a number", "give antenna heights and rain height in metres above sea level"
        )
    words = np.where(
        np.maximum(a, b) <= top - 3600.0, "rain", np.where(np.minimum(a, b) >= top + 2400.0, "none", "combined")
    )
    return str(words) if words.ndim == 0 else words


def wet_snow_multiplier(height_above_rain_m: ArrayLike) -> Result:
    """Factor on the specific attenuation of rain in the melting layer, from the height against the rain height.

    Parameters
    ----------
    height_above_rain_m
        Height less the rain height, m; negative below it.

    Returns
    -------
    factor
        Same shape; 0 above the rain height, 1 from 1200 m below it on, up to about 3.5 between.

    Notes
    -----
    Rec. ITU-R P.530-19, equation (43). Not a path method: that averages over 49 rain heights. Source key: p530-19-wet-snow.
    """
    height = as_floats(height_above_rain_m)
    inside = np.clip(height, -1200.0, 0.0)
    melt = 4.0 * (1.0 - np.exp(inside / 70.0)) ** 2
    fade = (1.0 - np.exp(-((inside / 600.0) ** 2))) ** 2
    layer = melt / (1.0 + fade * (melt - 1.0))  # (43)
    factor = np.where(height < -1200.0, 1.0, layer)
    return as_result(np.where(np.isnan(height), np.nan, factor))


def _law(frequency_hz: ArrayLike, reading: str) -> tuple[FloatArray, FloatArray, FloatArray]:
    """log10 C1, C2 and C3 of equations (35) and (36)."""
    if reading not in ("A", "B"):
        raise QuantityError(
            f"reading {reading!r} of equation (36) of P.530 is unknown", "there are 'A' (as printed) and 'B'"
        )
    decades = np.log10(np.maximum(positive(frequency_hz) / 1e10, 1.0))
    c0 = 0.12 + 0.4 * (0.8 * decades if reading == "A" else decades**0.8)  # (36)
    c1_log = c0 * np.log10(0.07) + (1.0 - c0) * np.log10(0.12)  # (35a)
    return c1_log, 0.855 * c0 + 0.546 * (1.0 - c0), 0.139 * c0 + 0.043 * (1.0 - c0)  # (35b), (35c)


def _phi(frequency_hz: ArrayLike) -> Any:
    squared = (positive(frequency_hz) / 1e9) ** 2
    return squared / (1.0 + 1e-4 * squared)
