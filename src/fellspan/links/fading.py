"""How often a margin is used up, by cause: rain, multipath, diffraction at low k; for one direction, many margins at once.

Joins the physics to the climate of a place; knows no budgets, no thresholds and no verdicts.
"""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.climate.columns import ClimateColumns
from fellspan.climate.figures import ClimateFigures, MultipathEdition
from fellspan.links import fades
from fellspan.links.outages import Causes, Cross, Receiver, outages_of
from fellspan.links.path_loss import PathLoss
from fellspan.links.signal_result import WorkingInput
from fellspan.propagation import Outage, RainEdition, RainReading, inverse_k_from_gradient, precipitation_regime

__all__ = [
    "Cross",
    "Fading",
    "Geometry",
    "Rain",
    "Receiver",
    "Spread",
    "nodes_of",
    "occurrence",
    "rain_001",
    "regime",
    "spread_of",
]

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Geometry:
    """What fading asks of a path: length, antenna levels, mean of the ground without trees, m; latitude, degrees."""

    length_m: float
    a_amsl_m: float
    b_amsl_m: float
    mean_ground_m: float
    latitude_deg: float

    @property
    def rows(self) -> fades.PathColumns:
        """The same as arrays of shape ()."""
        return fades.PathColumns(
            length_m=np.asarray(self.length_m),
            a_amsl_m=np.asarray(self.a_amsl_m),
            b_amsl_m=np.asarray(self.b_amsl_m),
            mean_ground_m=np.asarray(self.mean_ground_m),
            latitude_deg=np.asarray(self.latitude_deg),
        )

    @property
    def inclination_mrad(self) -> float:
        """Slope between the antennas."""
        return float(self.rows.inclination_mrad)


@dataclass(frozen=True, slots=True, kw_only=True)
class Spread:
    """Gradient of refractivity: median, and 99.9 % of the year and of the worst month, N/km; None where not known."""

    median: float
    year: float | None
    worst_month: float


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
        return outages_of(self.causes(), margin_db, receiver)

    def causes(self) -> Causes:
        """What takes the level down, of shape ()."""
        path, spread = self.geometry, self.spread
        return Causes(
            frequency_hz=self.frequency_hz,
            rain_reading=self.rain_reading,
            rain_001_db=_or_nan(self.rain_001_db),
            wet_radomes_db=self.wet_radomes_db,
            occurrence_percent=_or_nan(self.occurrence_percent),
            geographic=np.asarray(self.edition is not None and self.edition != "P.530-19"),
            length_m=np.asarray(path.length_m),
            latitude_deg=np.asarray(path.latitude_deg),
            inclination_mrad=np.asarray(path.inclination_mrad),
            median_n_per_km=np.asarray(spread.median),
            year_n_per_km=_or_nan(spread.year),
            worst_month_n_per_km=np.asarray(spread.worst_month),
            inverse_k=self.loss.inverse_k,
            by_inverse_k_db=self.loss.by_inverse_k_db,
            loss_in_level_db=np.asarray(self.loss_in_level_db),
        )


def _or_nan(value: float | None) -> Floats:
    return np.asarray(np.nan if value is None else value)


def spread_of(figures: ClimateFigures, *, length_m: float) -> Spread:
    """The spread of the gradient at a place; the worst month is that of `k_exceeded_99_9`, never short of the year."""
    climate = ClimateColumns.of(figures)
    worst = float(fades.worst_month_n_per_km(climate, length_m=np.asarray(length_m)))
    year = None if figures.gradient_tail_n_per_km is None else figures.gradient_tail_n_per_km.value
    return Spread(median=figures.gradient_median_n_per_km.value, year=year, worst_month=worst)


def nodes_of(spread: Spread) -> Floats:
    """Values of 1/k, rising, at which diffraction is worked out, shape (`NODES`,)."""
    return fades.nodes_inverse_k(
        np.asarray(spread.median), year_n_per_km=_or_nan(spread.year), worst_n_per_km=np.asarray(spread.worst_month)
    )


def rain_001(
    figures: ClimateFigures, *, geometry: Geometry, frequency_hz: float, tilt_deg: float, edition: RainEdition
) -> float | None:
    """Rain loss exceeded for 0.01 % of the year, dB; None without a rain rate, 0 where all precipitation is dry snow."""
    if figures.rain_rate_001_mm_h is None:
        return None
    climate, rows = ClimateColumns.of(figures), geometry.rows
    return float(fades.rain_001_db(climate, rows, frequency_hz=frequency_hz, tilt_deg=tilt_deg, edition=edition))


def regime(figures: ClimateFigures, *, geometry: Geometry) -> str | None:
    """'rain', 'combined' or 'none'; None where no rain height is known."""
    top = figures.rain_height_m
    if top is None:
        return None
    return str(precipitation_regime(geometry.a_amsl_m, geometry.b_amsl_m, rain_height_m=top.value))


def occurrence(figures: ClimateFigures, *, geometry: Geometry, frequency_hz: float) -> float | None:
    """Multipath occurrence factor p0, % of the worst month, by the edition that the figures allow; None where none does."""
    share = float(fades.occurrence_percent(ClimateColumns.of(figures), geometry.rows, frequency_hz=frequency_hz))
    return None if math.isnan(share) else share
