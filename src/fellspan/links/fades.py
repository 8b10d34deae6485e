"""What the climate of a place makes of a path, on arrays: rain loss, multipath occurrence, spread of k.

Values of shape () for one path or (p,) for many; NaN where a figure is not known. Knows no profiles, radios or margins.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.climate.columns import ClimateColumns
from fellspan.propagation import (
    RainEdition,
    gradient_from_k_n_per_km,
    inverse_k_from_gradient,
    k_exceeded_99_9,
    multipath_occurrence_detailed_percent,
    multipath_occurrence_percent,
    multipath_occurrence_quick_percent,
    path_inclination_mrad,
    precipitation_regime,
    rain_loss_001_db,
)
from fellspan.propagation.diffraction_fading import TAIL_PERCENT, gradient_spread_n_per_km
from fellspan.propagation.multipath import NO_MULTIPATH_UP_TO_M

Floats = NDArray[np.float64]

NODES: Final = 16
REACH: Final = 5.0
"""Diffraction is worked out at so many values of 1/k, up to so many standard deviations beyond the median."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PathColumns:
    """What fading asks of paths: length, antenna levels, mean of the ground without trees, m; latitude, degrees."""

    length_m: Floats
    a_amsl_m: Floats
    b_amsl_m: Floats
    mean_ground_m: Floats
    latitude_deg: Floats

    @property
    def inclination_mrad(self) -> Floats:
        """Slope between the antennas."""
        return np.asarray(path_inclination_mrad(self.length_m, a_amsl_m=self.a_amsl_m, b_amsl_m=self.b_amsl_m))


def worst_month_n_per_km(climate: ClimateColumns, *, length_m: Floats) -> Floats:
    """Gradient of 99.9 % of the worst month, N/km: that of `k_exceeded_99_9`, never short of the year's, nor of the median."""
    worst = np.asarray(gradient_from_k_n_per_km(k_exceeded_99_9(length_m)))
    year = climate.gradient_tail_n_per_km
    least = np.where(np.isnan(year), climate.gradient_median_n_per_km + 1.0, year)
    return np.asarray(np.maximum(worst, least))


def nodes_inverse_k(median_n_per_km: Floats, *, year_n_per_km: Floats, worst_n_per_km: Floats) -> Floats:
    """Values of 1/k, rising, at which diffraction is worked out, shape (..., `NODES`)."""
    tail = np.fmax(worst_n_per_km, np.where(np.isnan(year_n_per_km), median_n_per_km, year_n_per_km))
    sigma = gradient_spread_n_per_km(median_n_per_km=median_n_per_km, tail_n_per_km=tail, tail_percent=TAIL_PERCENT)
    low = inverse_k_from_gradient(median_n_per_km)
    high = inverse_k_from_gradient(median_n_per_km + REACH * np.asarray(sigma))
    return np.linspace(low, high, NODES, axis=-1)


def rain_001_db(
    climate: ClimateColumns, path: PathColumns, *, frequency_hz: float, tilt_deg: ArrayLike, edition: RainEdition
) -> Floats:
    """Rain loss exceeded for 0.01 % of the year, dB; NaN without a rain rate, 0 where all precipitation is dry snow."""
    loss = rain_loss_001_db(
        path.length_m,
        rain_rate_001_mm_h=climate.rain_rate_001_mm_h,
        frequency_hz=frequency_hz,
        tilt_deg=tilt_deg,
        elevation_deg=np.degrees(np.arctan(path.inclination_mrad / 1000.0)),
        edition=edition,
    )
    dry = _only_dry_snow(climate, path) & np.isfinite(climate.rain_rate_001_mm_h)
    return np.where(dry, 0.0, loss)


def _only_dry_snow(climate: ClimateColumns, path: PathColumns) -> NDArray[np.bool_]:
    top = climate.rain_height_m
    known = np.isfinite(top)
    if not known.any():
        return known
    regime = precipitation_regime(path.a_amsl_m, path.b_amsl_m, rain_height_m=np.where(known, top, 0.0))
    return np.asarray(known & (np.asarray(regime) == "none"))


def occurrence_percent(climate: ClimateColumns, path: PathColumns, *, frequency_hz: float) -> Floats:
    """Multipath occurrence factor p0, % of the worst month, by the edition that the figures allow; NaN where none does."""
    share = np.full(path.length_m.shape, np.nan)
    newer, older = climate.edition_19, climate.edition_17
    if newer.any():
        found = multipath_occurrence_percent(
            path.length_m,
            frequency_hz=frequency_hz,
            a_amsl_m=path.a_amsl_m,
            b_amsl_m=path.b_amsl_m,
            mean_ground_amsl_m=path.mean_ground_m,
            log_k=climate.log_k,
            dn75=climate.dn75,
        )
        share = np.where(newer, found, share)
    detailed = older & np.isfinite(climate.terrain_roughness_m)
    if detailed.any():
        found = multipath_occurrence_detailed_percent(
            path.length_m,
            frequency_hz=frequency_hz,
            a_amsl_m=path.a_amsl_m,
            b_amsl_m=path.b_amsl_m,
            dn1_n_per_km=climate.dn1_n_per_km,
            terrain_roughness_m=climate.terrain_roughness_m,
        )
        share = np.where(detailed, found, share)
    quick = older & ~detailed
    if quick.any():
        found = multipath_occurrence_quick_percent(
            path.length_m,
            frequency_hz=frequency_hz,
            a_amsl_m=path.a_amsl_m,
            b_amsl_m=path.b_amsl_m,
            dn1_n_per_km=climate.dn1_n_per_km,
        )
        share = np.where(quick, found, share)
    return np.where(path.length_m <= NO_MULTIPATH_UP_TO_M, 0.0, share)
