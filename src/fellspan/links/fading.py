"""How often a margin is used up, by cause: rain, multipath, diffraction at low k; for one direction, many margins at once.

Joins the physics to the climate of a place; knows no budgets, no thresholds and no verdicts.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.climate.figures import ClimateFigures, MultipathEdition
from fellspan.links.path_loss import PathLoss
from fellspan.links.signal_result import WorkingInput
from fellspan.links.site import Diversity
from fellspan.propagation import (
    Outage,
    RainEdition,
    RainReading,
    annual_from_worst_month_geographic_percent,
    annual_from_worst_month_percent,
    clear_air_cross_polar_outage_percent,
    clear_air_outage_percent,
    diffraction_outage_percent,
    diversity_improvement,
    diversity_outage_percent,
    fade_exceeded_percent,
    gradient_from_k_n_per_km,
    inverse_k_from_gradient,
    k_exceeded_99_9,
    multipath_occurrence_detailed_percent,
    multipath_occurrence_percent,
    multipath_occurrence_quick_percent,
    one_way_outage,
    path_inclination_mrad,
    precipitation_regime,
    rain_cross_polar_outage_percent,
    rain_loss_001_db,
    rain_percent,
    selective_outage_percent,
    space_correlation_squared,
    worst_month_from_annual_percent,
)
from fellspan.propagation.diffraction_fading import TAIL_PERCENT, gradient_spread_n_per_km
from fellspan.propagation.multipath import NO_MULTIPATH_UP_TO_M

Floats = NDArray[np.float64]

NODES: Final = 16
REACH: Final = 5.0
"""Diffraction is worked out at so many values of 1/k, up to so many standard deviations beyond the median."""
MONTHS: Final = 12.0
LEAST_RAIN_MARGIN_DB: Final = 0.1
"""A wet radome that eats the whole margin takes the link down whenever it rains this much, not all the time: our own rule."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Geometry:
    """What fading asks of a path: length, antenna levels, mean of the ground without trees, m; latitude, degrees."""

    length_m: float
    a_amsl_m: float
    b_amsl_m: float
    mean_ground_m: float
    latitude_deg: float

    @property
    def inclination_mrad(self) -> float:
        """Slope between the antennas."""
        return float(path_inclination_mrad(self.length_m, a_amsl_m=self.a_amsl_m, b_amsl_m=self.b_amsl_m))


@dataclass(frozen=True, slots=True, kw_only=True)
class Spread:
    """Gradient of refractivity: median, and 99.9 % of the year and of the worst month, N/km; None where not known."""

    median: float
    year: float | None
    worst_month: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Cross:
    """Cross-polar interference of a direction: discrimination of the antennas and what a canceller improves, dB."""

    discrimination_db: float
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
    level_difference_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Rain:
    """How rain was worked out: edition, reading, rate (None where unknown), tilt of the field, what leaves its range."""

    edition: RainEdition
    reading: RainReading
    rate_mm_h: float | None
    provenance: str
    tilt_deg: float
    breaches: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Fading:
    """Climate and path of one direction, ready to be asked for margins."""

    frequency_hz: float
    geometry: Geometry
    spread: Spread
    loss: PathLoss
    rain: Rain
    rain_001_db: float | None
    occurrence_percent: float | None
    edition: MultipathEdition | None
    wet_radomes_db: float
    multipath_inputs: tuple[WorkingInput, ...] = ()
    multipath_breaches: tuple[str, ...] = ()

    @property
    def rain_reading(self) -> RainReading:
        """Of the bracket in equation (36)."""
        return self.rain.reading

    @property
    def loss_in_level_db(self) -> float:
        """Diffraction and trees that the level counts already, dB."""
        return self.loss.diffraction_db + self.loss.vegetation_db

    @property
    def tail_loss_db(self) -> float:
        """Diffraction and trees at the gradient of 99.9 % of the worst month, dB."""
        at = inverse_k_from_gradient(self.spread.worst_month)
        return float(np.interp(float(at), self.loss.inverse_k, self.loss.by_inverse_k_db))

    def outage(self, margin_db: Floats, receiver: Receiver) -> tuple[Outage, Outage]:
        """Outage of the average year and of its worst month, arrays of the shape of `margin_db`; NaN where not computed."""
        rain, rain_cross = self._rain(margin_db, receiver)
        multipath_worst = self._multipath(margin_db, receiver)
        low_k, low_k_worst = self._diffraction(margin_db)
        year = one_way_outage(
            rain_percent=rain,
            rain_cross_polar_percent=rain_cross,
            multipath_percent=self._annual(multipath_worst),
            diffraction_percent=low_k,
        )
        worst = one_way_outage(
            rain_percent=worst_month_from_annual_percent(rain),
            rain_cross_polar_percent=worst_month_from_annual_percent(rain_cross),
            multipath_percent=multipath_worst,
            diffraction_percent=low_k_worst,
        )
        return year, worst

    def _rain(self, margin: Floats, receiver: Receiver) -> tuple[Floats, Floats]:
        if self.rain_001_db is None:
            return np.full(margin.shape, np.nan), np.zeros(margin.shape)
        left = np.where(margin > 0.0, np.maximum(margin - self.wet_radomes_db, LEAST_RAIN_MARGIN_DB), margin)
        share = rain_percent(
            left, loss_001_db=self.rain_001_db, frequency_hz=self.frequency_hz, reading=self.rain_reading
        )
        crossed = np.zeros(margin.shape)
        if receiver.cross is not None:
            crossed = np.nan_to_num(
                np.asarray(
                    rain_cross_polar_outage_percent(
                        self.rain_001_db,
                        frequency_hz=self.frequency_hz,
                        required_ratio_db=receiver.required_ratio_db,
                        canceller_db=receiver.cross.canceller_db,
                    )
                )
            )
        return np.asarray(share), crossed

    def _multipath(self, margin: Floats, receiver: Receiver) -> Floats:
        occurrence = self.occurrence_percent
        if occurrence is None:
            return np.full(margin.shape, np.nan)
        flat = np.asarray(fade_exceeded_percent(margin, occurrence_percent=occurrence))
        selective = np.asarray(
            selective_outage_percent(
                occurrence,
                distance_m=self.geometry.length_m,
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
        if receiver.second is not None and occurrence > 0.0:
            correlation = space_correlation_squared(
                receiver.second.spacing_m,
                distance_m=self.geometry.length_m,
                frequency_hz=self.frequency_hz,
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
            flat, selective, cross = np.asarray(both), np.zeros(margin.shape), cross / gained
        outage = clear_air_outage_percent(flat, selective_percent=selective, cross_polar_percent=cross)
        return np.asarray(outage)

    def _annual(self, worst_month_percent: Floats) -> Floats:
        if self.edition is None or self.edition == "P.530-19":
            return np.asarray(annual_from_worst_month_percent(worst_month_percent))
        return np.asarray(
            annual_from_worst_month_geographic_percent(
                worst_month_percent,
                distance_m=self.geometry.length_m,
                latitude_deg=self.geometry.latitude_deg,
                inclination_mrad=self.geometry.inclination_mrad,
            )
        )

    def _diffraction(self, margin: Floats) -> tuple[Floats, Floats]:
        room = margin + self.loss_in_level_db

        def outage(tail_n_per_km: float) -> Floats:
            share = diffraction_outage_percent(
                room,
                inverse_k=self.loss.inverse_k,
                loss_db=self.loss.by_inverse_k_db,
                median_n_per_km=self.spread.median,
                tail_n_per_km=tail_n_per_km,
            )
            return np.asarray(share)

        worst = outage(self.spread.worst_month)
        if self.spread.year is None:
            return np.asarray(annual_from_worst_month_percent(worst)), worst
        year = outage(self.spread.year)
        # A worst month is no better than the year, and cannot hold more than all of what the year holds.
        return year, np.clip(worst, year, np.minimum(MONTHS * year, 100.0))


def spread_of(figures: ClimateFigures, *, length_m: float) -> Spread:
    """The spread of the gradient at a place; the worst month is that of `k_exceeded_99_9`, never short of the year."""
    median = figures.gradient_median_n_per_km.value
    year = None if figures.gradient_tail_n_per_km is None else figures.gradient_tail_n_per_km.value
    worst = float(gradient_from_k_n_per_km(k_exceeded_99_9(length_m)))
    least = median + 1.0 if year is None else year
    return Spread(median=median, year=year, worst_month=max(worst, least))


def nodes_of(spread: Spread) -> Floats:
    """Values of 1/k, rising, at which diffraction is worked out, shape (`NODES`,)."""
    tail = max(spread.worst_month, spread.median if spread.year is None else spread.year)
    sigma = float(
        gradient_spread_n_per_km(median_n_per_km=spread.median, tail_n_per_km=tail, tail_percent=TAIL_PERCENT)
    )
    ends = inverse_k_from_gradient(np.array([spread.median, spread.median + REACH * sigma]))
    low, high = np.asarray(ends)
    return np.linspace(low, high, NODES)


def rain_001(
    figures: ClimateFigures, *, geometry: Geometry, frequency_hz: float, tilt_deg: float, edition: RainEdition
) -> float | None:
    """Rain loss exceeded for 0.01 % of the year, dB; None without a rain rate, 0 where all precipitation is dry snow."""
    rate = figures.rain_rate_001_mm_h
    if rate is None:
        return None
    if regime(figures, geometry=geometry) == "none":
        return 0.0
    loss = rain_loss_001_db(
        geometry.length_m,
        rain_rate_001_mm_h=rate.value,
        frequency_hz=frequency_hz,
        tilt_deg=tilt_deg,
        elevation_deg=np.degrees(np.arctan(geometry.inclination_mrad / 1000.0)),
        edition=edition,
    )
    return float(loss)


def regime(figures: ClimateFigures, *, geometry: Geometry) -> str | None:
    """'rain', 'combined' or 'none'; None where no rain height is known."""
    top = figures.rain_height_m
    if top is None:
        return None
    return str(precipitation_regime(geometry.a_amsl_m, geometry.b_amsl_m, rain_height_m=top.value))


def occurrence(figures: ClimateFigures, *, geometry: Geometry, frequency_hz: float) -> float | None:
    """Multipath occurrence factor p0, % of the worst month, by the edition that the figures allow; None where none does."""
    if geometry.length_m <= NO_MULTIPATH_UP_TO_M:
        return 0.0
    edition = figures.multipath_edition
    if edition is None:
        return None
    ends = {"a_amsl_m": geometry.a_amsl_m, "b_amsl_m": geometry.b_amsl_m}
    if edition == "P.530-19":
        assert figures.log_k is not None
        assert figures.dn75 is not None
        share = multipath_occurrence_percent(
            geometry.length_m,
            frequency_hz=frequency_hz,
            mean_ground_amsl_m=geometry.mean_ground_m,
            log_k=figures.log_k.value,
            dn75=figures.dn75.value,
            **ends,
        )
        return float(share)
    assert figures.dn1_n_per_km is not None
    gradient = figures.dn1_n_per_km.value
    if edition == "P.530-17 quick" or figures.terrain_roughness_m is None:
        share = multipath_occurrence_quick_percent(
            geometry.length_m, frequency_hz=frequency_hz, dn1_n_per_km=gradient, **ends
        )
        return float(share)
    share = multipath_occurrence_detailed_percent(
        geometry.length_m,
        frequency_hz=frequency_hz,
        dn1_n_per_km=gradient,
        terrain_roughness_m=figures.terrain_roughness_m.value,
        **ends,
    )
    return float(share)
