"""Loss through woodland, and how it joins the loss over the trees; knows nothing of where trees stand."""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import Result, as_floats, as_result, not_negative, positive, quiet


@dataclass(frozen=True, slots=True, kw_only=True)
class MeasuredWoodland:
    """One measured row: attenuation per metre of depth, and the loss that deep woodland does not exceed."""

    frequency_hz: float
    specific_db_per_m: float
    saturation_db: float


MEASURED_WOODLAND: Final = tuple(
    MeasuredWoodland(frequency_hz=mhz * 1e6, specific_db_per_m=specific, saturation_db=saturation)
    for mhz, specific, saturation in (
        (105.9, 0.04, 9.4), (466.475, 0.12, 18.0), (949.0, 0.17, 26.5), (1852.2, 0.30, 29.0), (2117.5, 0.34, 34.1)
    )
)  # fmt: skip
"""Mixed woodland near St Petersburg: Rec. ITU-R P.833-10, table 1."""

WOODLAND_SPREAD: Final = 0.2
"""How far woods differ from the line of `woodland_specific_db_per_m`, as a share of it, either way; leaves alone make that."""

_LINE_HZ: Final = (30e6, 1e9, 30e9)
_LINE_DB_PER_M: Final = (0.02, 0.2, 6.0)


def woodland_specific_db_per_m(frequency_hz: ArrayLike) -> Result:
    """Attenuation per metre of depth in woodland, dB/m; vertical polarization, in leaf.

    Straight between 0.02 dB/m at 30 MHz, 0.2 at 1 GHz and 6 at 30 GHz, in logarithms, and on beyond. Rec. ITU-R P.833-10,
    figure 2, as others read it: taken as right to 20 % (`WOODLAND_SPREAD`). Source key: p833-10-specific.
    """
    with quiet():
        x = np.log10(positive(frequency_hz))
        x0, x1, x2 = np.log10(_LINE_HZ)
        y0, y1, y2 = np.log10(_LINE_DB_PER_M)
        low, high = y1 + (x - x1) * (y1 - y0) / (x1 - x0), y1 + (x - x1) * (y2 - y1) / (x2 - x1)
        return as_result(10.0 ** np.where(x < x1, low, high))


def woodland_saturation_db(frequency_hz: ArrayLike) -> Result:
    """Loss that deep woodland does not exceed, dB: 1.37 f^0.42, f in MHz.

    Fitted to the measurements near St Petersburg, 106 to 2118 MHz; above that it is an extrapolation. Rec. ITU-R P.833-10.
    Source key: p833-10-woodland.
    """
    with quiet():
        return as_result(1.37 * (positive(frequency_hz) / 1e6) ** 0.42)


def woodland_loss_db(depth_m: ArrayLike, *, specific_db_per_m: ArrayLike, saturation_db: ArrayLike) -> Result:
    """Loss through woodland, above free space and any diffraction.

    Parameters
    ----------
    depth_m
        Length of the ray within the trees, m.
    specific_db_per_m
        Attenuation per metre, dB/m, measured or from `woodland_specific_db_per_m`.
    saturation_db
        Loss that deep woodland does not exceed, dB, measured or from `woodland_saturation_db`.

    Returns
    -------
    loss_db
        dB, broadcast shape; 0 at no depth, never above `saturation_db`; NaN where an argument is negative.

    Notes
    -----
    Rec. ITU-R P.833-10, one end of the path within the woodland. Real woods scatter around it by several decibels, more when
    wet or in wind; nobody builds on a path through trees who can go over them. Source key: p833-10-woodland.
    """
    depth, specific, limit = not_negative(depth_m), not_negative(specific_db_per_m), not_negative(saturation_db)
    with quiet():
        loss = -limit * np.expm1(-depth * specific / limit)
    return as_result(np.where(limit == 0.0, 0.0 * depth * specific, loss))


def woodland_loss_spread_db(depth_m: ArrayLike, *, frequency_hz: ArrayLike) -> tuple[Result, Result]:
    """Least and most loss through woodland that the line of attenuation against frequency leaves open, dB.

    Both attenuation and saturation are varied by `WOODLAND_SPREAD`. Source keys: p833-10-specific, p833-10-woodland.
    """
    specific = as_floats(woodland_specific_db_per_m(frequency_hz))
    limit = as_floats(woodland_saturation_db(frequency_hz))
    least, most = (
        woodland_loss_db(depth_m, specific_db_per_m=specific * factor, saturation_db=limit * factor)
        for factor in (1.0 - WOODLAND_SPREAD, 1.0 + WOODLAND_SPREAD)
    )
    return least, most


def loss_past_trees_db(*, through_db: ArrayLike, over_db: ArrayLike) -> Result:
    """Loss that trees cost in the end, dB: the lesser of the way through and the way over them.

    `through_db` is diffraction over ground and buildings plus woodland on the way, `over_db` diffraction over everything, trees
    taken as solid. Trees are so counted once. Common practice, no source. Source key: trees-through-or-over.
    """
    return as_result(np.minimum(as_floats(through_db), as_floats(over_db)))
