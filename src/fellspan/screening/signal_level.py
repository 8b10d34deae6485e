"""What the paths of many pairs take in clear air, and the climate over them; knows no antennas, powers or margins."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.climate.columns import ClimateColumns, climate_columns
from fellspan.links import fades
from fellspan.links.signal_path import air_level_m
from fellspan.links.ways_past_trees import (
    DIFFERS_DB,
    depth_in_trees_m,
    ways_past_trees,
)
from fellspan.propagation import free_space_loss_db, gas_loss_db, inverse_k
from fellspan.propagation.bullington import delta_bullington_over_horizons_db
from fellspan.screening.laid import LaidBucket
from fellspan.screening.pairs import Candidates
from fellspan.screening.path_sets import PathSets
from fellspan.vocabulary import Polarization

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Level:
    """Clear air at the median k, dB, shape (p, f) for the frequencies of the radio."""

    frequency_hz: Floats
    diffraction_db: Floats
    vegetation_db: Floats
    total_db: Floats
    """Free space, diffraction, trees and gases."""
    lowest_k_db: Floats
    """Diffraction over everything at the lowest k at which it is worked out."""

    def at(self, frequency_hz: float) -> int:
        """The column of a frequency."""
        return int(np.flatnonzero(self.frequency_hz == frequency_hz)[0])


def climate_of(candidates: Candidates, bucket: LaidBucket, *, has_margin: NDArray[np.bool_]) -> ClimateColumns:
    """Figures of the middles of the paths; from the maps only where a margin is known, as for one link."""
    given = candidates.settings.weather.given
    altitude = air_level_m(bucket.a_amsl_m, bucket.b_amsl_m)
    if given.altitude_m is not None:
        altitude = np.full(altitude.shape, given.altitude_m)

    def figures(maps: bool) -> ClimateColumns:
        return climate_columns(
            latitude_deg=bucket.middle_latitude_deg,
            longitude_deg=bucket.middle_longitude_deg,
            altitude_m=altitude,
            given=given,
            maps=maps,
        )

    if has_margin.all() or not has_margin.any():
        return figures(bool(has_margin.any()))
    return figures(True).where(has_margin, figures(False))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SpreadColumns:
    """Spread of the gradient of refractivity over paths, N/km, shape (p,), and the values of 1/k that it makes one ask."""

    median_n_per_km: Floats
    year_n_per_km: Floats
    worst_month_n_per_km: Floats
    inverse_k: Floats
    """Rising, shape (p, m)."""

    def part(self, rows: NDArray[np.int64]) -> "SpreadColumns":
        """Some of the paths."""
        return SpreadColumns(**{name: getattr(self, name)[rows] for name in self.__slots__})


def spread_columns(rows: PathSets, climate: ClimateColumns) -> SpreadColumns:
    """How far the gradient spreads over paths in their climates."""
    median, year = climate.gradient_median_n_per_km, climate.gradient_tail_n_per_km
    worst = fades.worst_month_n_per_km(climate, length_m=rows.length_m)
    return SpreadColumns(
        median_n_per_km=median,
        year_n_per_km=year,
        worst_month_n_per_km=worst,
        inverse_k=fades.nodes_inverse_k(median, year_n_per_km=year, worst_n_per_km=worst),
    )


def level_of(candidates: Candidates, rows: PathSets, climate: ClimateColumns, spread: SpreadColumns) -> Level:
    """What paths take in clear air at the median k, at the frequencies of the radio."""
    radio, k = candidates.radio, candidates.settings.median_k
    frequency = np.array(list(dict.fromkeys(radio.transmit_hz)))
    both_k = np.stack((np.full(rows.length_m.shape, inverse_k(k)), spread.inverse_k[:, -1]), axis=-1)
    over = _over_everything_db(rows, inverse_k=both_k, frequency_hz=frequency, polarization=radio.polarization)
    wooded = np.zeros(rows.length_m.shape, dtype=np.bool_)
    for own, some in rows.each():
        wooded[own] = False if some.trees is None else some.trees.any(axis=-1)
    diffraction, vegetation = over[:, 0].copy(), np.zeros(over[:, 0].shape)
    # The way through trees costs at least nothing: it can only be the cheaper one where the way over them costs something.
    through = np.flatnonzero(wooded & ~(diffraction <= DIFFERS_DB).all(axis=-1))
    for place, few in rows.among(through):
        ways = ways_past_trees(
            few,
            inverse_k=np.array([inverse_k(k)]),
            frequency_hz=frequency,
            polarization=radio.polarization,
            depth_m=depth_in_trees_m(few, k=k),
        )
        wins = ways.is_through[:, 0]
        diffraction[through[place]] = np.where(wins, ways.solid_db[:, 0], ways.over_db[:, 0])
        vegetation[through[place]] = np.where(wins, ways.woods_db, 0.0)
    slant = rows.slant_m[:, np.newaxis]
    gases = gas_loss_db(
        slant,
        frequency_hz=frequency,
        dry_pressure_hpa=climate.dry_pressure_hpa[:, np.newaxis],
        temperature_k=climate.temperature_k[:, np.newaxis],
        vapour_g_m3=climate.vapour_g_m3[:, np.newaxis],
    )
    free = np.asarray(free_space_loss_db(slant, frequency_hz=frequency))
    return Level(
        frequency_hz=frequency,
        diffraction_db=diffraction,
        vegetation_db=vegetation,
        total_db=free + diffraction + vegetation + gases,
        lowest_k_db=over[:, 1],
    )


def _over_everything_db(
    rows: PathSets, *, inverse_k: Floats, frequency_hz: Floats, polarization: Polarization
) -> Floats:
    """Diffraction over everything at values of 1/k (p, m) and frequencies (f,), dB, shape (p, m, f)."""
    length, a, b, sea = (
        column[:, np.newaxis, np.newaxis]
        for column in (rows.length_m, rows.a_height_m, rows.b_height_m, rows.sea_fraction)
    )
    with np.errstate(divide="ignore"):
        k = 1.0 / inverse_k[..., np.newaxis]
    loss = delta_bullington_over_horizons_db(
        rows.horizons(inverse_k)[..., np.newaxis],
        lambda some: rows.smooth_horizons(inverse_k, some)[..., np.newaxis],
        length_m=length,
        a_height_m=a,
        b_height_m=b,
        frequency_hz=frequency_hz,
        k=k,
        polarization=polarization,
        sea_fraction=sea,
    )
    return np.maximum(loss, 0.0)
