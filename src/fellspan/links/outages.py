"""How often a margin is used up, by cause, on arrays: one direction with many margins, or many directions with one each.

Everything broadcasts: values of shape () with margins (m,), or all of shape (p,). What is not known is NaN. Knows no climate
tables, budgets, thresholds or verdicts.
"""

from dataclasses import dataclass, replace
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from fellspan.links.site import Diversity
from fellspan.propagation import (
    Outage,
    RainReading,
    annual_from_worst_month_geographic_percent,
    annual_from_worst_month_percent,
    clear_air_cross_polar_outage_percent,
    clear_air_outage_percent,
    diffraction_outage_percent,
    diversity_improvement,
    diversity_outage_percent,
    fade_exceeded_percent,
    one_way_outage,
    rain_cross_polar_outage_percent,
    rain_percent,
    selective_outage_percent,
    space_correlation_squared,
    worst_month_from_annual_percent,
)

Floats = NDArray[np.float64]

MONTHS: Final = 12.0
LEAST_RAIN_MARGIN_DB: Final = 0.1
"""A wet radome that eats the whole margin takes the link down whenever it rains this much, not all the time: our own rule."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Cross:
    """Cross-polar interference of a direction: discrimination of the antennas and what a canceller improves, dB."""

    discrimination_db: Floats | float
    canceller_db: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Receiver:
    """What the modulations ask, arrays of one shape (m,): signature (width 0 for none) and required carrier to interference.

    `second` is a second receiving antenna, `level_difference_db` how much weaker its level is.
    """

    width_hz: Floats
    depth_db: Floats
    delay_s: Floats
    required_ratio_db: Floats
    cross: Cross | None
    second: Diversity | None
    level_difference_db: Floats | float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Causes:
    """What takes a level down on a path at one frequency, arrays of shape (); or (p,), then with margins (p,).

    Parameters
    ----------
    frequency_hz, rain_reading
        Hz, and the reading of the bracket in equation (36).
    rain_001_db, wet_radomes_db
        Rain loss exceeded for 0.01 % of the year, dB, NaN where no rain is known; what wet radomes cost.
    occurrence_percent
        Multipath occurrence factor p0, % of the worst month; NaN where it is not known.
    geographic
        Where the year follows from the worst month by the older form.
    length_m, latitude_deg, inclination_mrad
        Of the path.
    median_n_per_km, year_n_per_km, worst_month_n_per_km
        Gradient of refractivity: median, and 99.9 % of the year (NaN where not known) and of the worst month.
    inverse_k, by_inverse_k_db
        Rising values of 1/k and the loss by diffraction and trees at them, (..., n).
    loss_in_level_db
        Diffraction and trees that the level counts already.
    """

    frequency_hz: float
    rain_reading: RainReading
    rain_001_db: Floats
    wet_radomes_db: Floats | float
    occurrence_percent: Floats
    geographic: NDArray[np.bool_]
    length_m: Floats
    latitude_deg: Floats
    inclination_mrad: Floats
    median_n_per_km: Floats
    year_n_per_km: Floats
    worst_month_n_per_km: Floats
    inverse_k: Floats
    by_inverse_k_db: Floats
    loss_in_level_db: Floats

    def part(self, rows: NDArray[np.int64]) -> "Causes":
        """Some of many paths."""
        columns: dict[str, Any] = {
            name: value[rows]
            for name in self.__slots__
            if isinstance(value := getattr(self, name), np.ndarray) and value.ndim
        }
        return replace(self, **columns)


def outages_of(causes: Causes, margin_db: Floats, receiver: Receiver) -> tuple[Outage, Outage]:
    """Outage of the average year and of its worst month, arrays of the shape of `margin_db`; NaN where not computed."""
    rain, rain_cross = _rain(causes, margin_db, receiver)
    multipath = _multipath(causes, margin_db, receiver)
    low_k_worst = _low_k(causes, margin_db, causes.worst_month_n_per_km)
    low_k = _low_k_of_year(causes, margin_db, low_k_worst)
    known = np.isfinite(causes.year_n_per_km)
    # A worst month is no better than the year, and cannot hold more than all of what the year holds.
    held = np.clip(low_k_worst, low_k, np.minimum(MONTHS * low_k, 100.0))
    worst = one_way_outage(
        rain_percent=worst_month_from_annual_percent(rain),
        rain_cross_polar_percent=worst_month_from_annual_percent(rain_cross),
        multipath_percent=multipath,
        diffraction_percent=np.where(known, held, low_k_worst),
    )
    return _year(causes, rain, rain_cross, multipath, low_k), worst


def outage_of_year(causes: Causes, margin_db: Floats, receiver: Receiver) -> Outage:
    """The first of `outages_of` alone."""
    rain, rain_cross = _rain(causes, margin_db, receiver)
    multipath = _multipath(causes, margin_db, receiver)
    if np.isfinite(causes.year_n_per_km).all():
        low_k = _low_k(causes, margin_db, causes.year_n_per_km)
    else:
        low_k = _low_k_of_year(causes, margin_db, _low_k(causes, margin_db, causes.worst_month_n_per_km))
    return _year(causes, rain, rain_cross, multipath, low_k)


def _year(causes: Causes, rain: Floats, rain_cross: Floats, multipath: Floats, low_k: Floats) -> Outage:
    return one_way_outage(
        rain_percent=rain,
        rain_cross_polar_percent=rain_cross,
        multipath_percent=_annual(causes, multipath),
        diffraction_percent=low_k,
    )


def _rain(causes: Causes, margin: Floats, receiver: Receiver) -> tuple[Floats, Floats]:
    """Of the year: by attenuation, and by the loss of cross-polar discrimination."""
    left = np.where(margin > 0.0, np.maximum(margin - causes.wet_radomes_db, LEAST_RAIN_MARGIN_DB), margin)
    at_001, frequency = causes.rain_001_db, causes.frequency_hz
    share = np.asarray(rain_percent(left, loss_001_db=at_001, frequency_hz=frequency, reading=causes.rain_reading))
    if receiver.cross is None:
        return share, np.zeros(share.shape)
    crossed = rain_cross_polar_outage_percent(
        at_001,
        frequency_hz=frequency,
        required_ratio_db=receiver.required_ratio_db,
        canceller_db=receiver.cross.canceller_db,
    )
    return share, np.nan_to_num(np.asarray(crossed))


def _multipath(causes: Causes, margin: Floats, receiver: Receiver) -> Floats:
    """Of the worst month."""
    occurrence = causes.occurrence_percent
    flat = np.asarray(fade_exceeded_percent(margin, occurrence_percent=occurrence))
    selective = np.asarray(
        selective_outage_percent(
            occurrence,
            distance_m=causes.length_m,
            signature_width_hz=receiver.width_hz,
            signature_depth_db=receiver.depth_db,
            reference_delay_s=receiver.delay_s,
        )
    )
    cross = np.zeros(margin.shape)
    if receiver.cross is not None:
        cross = np.asarray(
            clear_air_cross_polar_outage_percent(
                occurrence,
                antenna_discrimination_db=receiver.cross.discrimination_db,
                required_ratio_db=receiver.required_ratio_db,
                canceller_db=receiver.cross.canceller_db,
            )
        )
        cross = np.where(np.isnan(receiver.required_ratio_db), 0.0, cross)
    if receiver.second is not None:
        fades = occurrence > 0.0
        correlation = space_correlation_squared(
            receiver.second.spacing_m,
            distance_m=causes.length_m,
            frequency_hz=causes.frequency_hz,
            occurrence_percent=occurrence,
        )
        gained = np.asarray(
            diversity_improvement(
                correlation,
                occurrence_percent=occurrence,
                fade_db=margin,
                level_difference_db=receiver.level_difference_db,
            )
        )
        both = diversity_outage_percent(
            flat,
            selective_percent=selective,
            correlation_squared=correlation,
            improvement=gained,
            occurrence_percent=occurrence,
        )
        flat, cross = np.where(fades, both, flat), np.where(fades, cross / gained, cross)
        selective = np.where(fades, 0.0, selective)
    return np.asarray(clear_air_outage_percent(flat, selective_percent=selective, cross_polar_percent=cross))


def _annual(causes: Causes, worst_month_percent: Floats) -> Floats:
    newer = np.asarray(annual_from_worst_month_percent(worst_month_percent))
    if not causes.geographic.any():
        return newer
    older = annual_from_worst_month_geographic_percent(
        worst_month_percent,
        distance_m=causes.length_m,
        latitude_deg=causes.latitude_deg,
        inclination_mrad=causes.inclination_mrad,
    )
    return np.where(causes.geographic, older, newer)


def _low_k(causes: Causes, margin: Floats, tail_n_per_km: Floats) -> Floats:
    share = diffraction_outage_percent(
        margin + causes.loss_in_level_db,
        inverse_k=causes.inverse_k,
        loss_db=causes.by_inverse_k_db,
        median_n_per_km=causes.median_n_per_km,
        tail_n_per_km=tail_n_per_km,
    )
    return np.asarray(share)


def _low_k_of_year(causes: Causes, margin: Floats, worst: Floats) -> Floats:
    """Of the year: by its own tail, or from the worst month where that is not known."""
    known = np.isfinite(causes.year_n_per_km)
    from_worst = np.asarray(annual_from_worst_month_percent(worst))
    if not known.any():
        return from_worst
    return np.where(known, _low_k(causes, margin, causes.year_n_per_km), from_worst)
