"""Climate figures of many places as bare arrays: the numbers of `figures_for`, without their provenance.

Knows which source of a figure wins only through the functions that put the figures of one place together.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.climate.assembling import default_gradient_n_per_km, kelvin, rain_from_months_mm_h
from fellspan.climate.figures import ClimateFigures, Figure
from fellspan.climate.given import GivenClimate
from fellspan.climate.maps import MAP_NAMES, map_columns, maps_available
from fellspan.propagation.gases import dry_pressure_hpa, standard_air

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ClimateColumns:
    """Figures of places, of shape () or (p,); NaN where there is none. Fields as in `ClimateFigures`."""

    rain_rate_001_mm_h: Floats
    dn1_n_per_km: Floats
    dn75: Floats
    log_k: Floats
    terrain_roughness_m: Floats
    gradient_median_n_per_km: Floats
    gradient_tail_n_per_km: Floats
    temperature_k: Floats
    dry_pressure_hpa: Floats
    vapour_g_m3: Floats
    rain_height_m: Floats

    @classmethod
    def of(cls, figures: ClimateFigures) -> "ClimateColumns":
        """The numbers of one place, of shape ()."""
        return cls(
            rain_rate_001_mm_h=_number(figures.rain_rate_001_mm_h),
            dn1_n_per_km=_number(figures.dn1_n_per_km),
            dn75=_number(figures.dn75),
            log_k=_number(figures.log_k),
            terrain_roughness_m=_number(figures.terrain_roughness_m),
            gradient_median_n_per_km=_number(figures.gradient_median_n_per_km),
            gradient_tail_n_per_km=_number(figures.gradient_tail_n_per_km),
            temperature_k=_number(figures.temperature_k),
            dry_pressure_hpa=_number(figures.dry_pressure_hpa),
            vapour_g_m3=_number(figures.vapour_g_m3),
            rain_height_m=_number(figures.rain_height_m),
        )

    def part(self, rows: NDArray[np.bool_] | NDArray[np.int64]) -> "ClimateColumns":
        """Some of the places."""
        return ClimateColumns(**{name: getattr(self, name)[rows] for name in self.__slots__})

    def where(self, chosen: NDArray[np.bool_], other: "ClimateColumns") -> "ClimateColumns":
        """These figures at the places chosen, those of `other` elsewhere."""
        both = {name: np.where(chosen, getattr(self, name), getattr(other, name)) for name in self.__slots__}
        return ClimateColumns(**both)

    @property
    def edition_19(self) -> NDArray[np.bool_]:
        """Where multipath goes by edition P.530-19; see `ClimateFigures.multipath_edition`."""
        return np.isfinite(self.log_k) & np.isfinite(self.dn75)

    @property
    def edition_17(self) -> NDArray[np.bool_]:
        """Where it goes by one of the methods of edition -17."""
        return ~self.edition_19 & np.isfinite(self.dn1_n_per_km)


def climate_columns(
    *, latitude_deg: Floats, longitude_deg: Floats, altitude_m: Floats, given: GivenClimate, maps: bool = True
) -> ClimateColumns:
    """Figures of many places, each with the numbers that `figures_for` has of it; arrays of shape (p,).

    Parameters
    ----------
    latitude_deg, longitude_deg
        Places, degrees, shape (p,).
    altitude_m
        Heights of the air above sea level, m, shape (p,); `given.altitude_m` is not asked.
    given, maps
        As for `figures_for`. Maps of figures that are given are not opened.
    """
    shape = latitude_deg.shape
    said: dict[str, float] = {
        name: value for name in ClimateColumns.__slots__ if (value := getattr(given, name, None)) is not None
    }
    monthly = rain_from_months_mm_h(given)
    if monthly is not None:
        said.setdefault("rain_rate_001_mm_h", monthly)
    if given.temperature_c is not None:
        said["temperature_k"] = kelvin(given.temperature_c)
    missing = [name for name in MAP_NAMES if name not in said]
    drawn = _drawn(missing, latitude_deg, longitude_deg, altitude_m) if maps and missing else {}

    def found(name: str) -> Floats:
        return np.full(shape, said[name]) if name in said else drawn.get(name, np.full(shape, np.nan))

    def or_else(name: str, default: object) -> Floats:
        known = found(name)
        return np.where(np.isfinite(known), known, np.asarray(default, dtype=np.float64))

    standard = standard_air(altitude_m)
    temperature = or_else("temperature_k", standard.temperature_k)
    vapour = or_else("vapour_g_m3", standard.vapour_g_m3)
    pressure = standard.total_pressure_hpa if given.total_pressure_hpa is None else given.total_pressure_hpa
    median, tail = or_else("gradient_median_n_per_km", default_gradient_n_per_km()), found("gradient_tail_n_per_km")
    return ClimateColumns(
        rain_rate_001_mm_h=_finite(found("rain_rate_001_mm_h")),
        dn1_n_per_km=_finite(found("dn1_n_per_km")),
        dn75=found("dn75"),
        log_k=found("log_k"),
        terrain_roughness_m=_finite(found("terrain_roughness_m")),
        gradient_median_n_per_km=median,
        gradient_tail_n_per_km=np.where(tail > median, tail, np.nan),
        temperature_k=temperature,
        dry_pressure_hpa=np.asarray(dry_pressure_hpa(pressure, temperature_k=temperature, vapour_g_m3=vapour)),
        vapour_g_m3=vapour,
        rain_height_m=_finite(found("rain_height_m")),
    )


def _drawn(names: list[str], latitude_deg: Floats, longitude_deg: Floats, altitude_m: Floats) -> dict[str, Floats]:
    """What the maps have; nothing where they cannot be read."""
    if not maps_available():
        return {}
    try:
        return map_columns(names, latitude_deg=latitude_deg, longitude_deg=longitude_deg, altitude_m=altitude_m)
    except Exception:  # a package of others may fail in any way; the study's own figures still serve
        return {}


def _finite(values: Floats) -> Floats:
    return np.where(np.isfinite(values), values, np.nan)


def _number(figure: Figure | None) -> Floats:
    return np.asarray(np.nan if figure is None else figure.value)
