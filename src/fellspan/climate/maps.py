"""Climate figures from the maps that the package itur carries; the only module that knows itur. Works with no network.

itur is an optional extra and takes seconds to import, so it is imported when the first figure is asked for.
"""

import importlib.util
from dataclasses import dataclass
from functools import lru_cache
from importlib import import_module
from typing import Any, Final

import numpy as np

MAP_PACKAGE: Final = "itur"
PLACE_DECIMALS: Final = 2
"""Positions are rounded to this many decimals of a degree, about 1 km; the finest map has cells of 0.125 degrees."""


@dataclass(frozen=True, slots=True, kw_only=True)
class MapFigures:
    """Figures of one place as the maps have them; NaN where a map has none. Fields as in `ClimateFigures`."""

    rain_rate_001_mm_h: float
    dn1_n_per_km: float
    gradient_median_n_per_km: float
    gradient_tail_n_per_km: float
    terrain_roughness_m: float
    rain_height_m: float
    temperature_k: float
    vapour_g_m3: float
    version: str


def maps_available() -> bool:
    """Whether the package with the maps is installed; does not import it."""
    return importlib.util.find_spec(MAP_PACKAGE) is not None


def map_figures(*, latitude_deg: float, longitude_deg: float, altitude_m: float | None = None) -> MapFigures:
    """Figures of a place from the maps.

    Parameters
    ----------
    latitude_deg, longitude_deg
        The place, degrees; rounded to 0.01.
    altitude_m
        Height above sea level for the water vapour, m, rounded to 10; the map's own terrain where not given.

    Raises
    ------
    ImportError
        The package is not installed, or cannot be imported.

    Notes
    -----
    Source keys: p837-7-rain-map, p453-13-gradient-map, p530-17-roughness-map, p839-4-rain-height-map, p1510-1-temperature-map,
    p836-6-vapour-map.
    """
    altitude = None if altitude_m is None else round(altitude_m / 10.0) * 10.0
    return _looked_up(round(latitude_deg, PLACE_DECIMALS), round(longitude_deg, PLACE_DECIMALS), altitude)


@lru_cache(maxsize=4096)
def _looked_up(latitude_deg: float, longitude_deg: float, altitude_m: float | None) -> MapFigures:
    # Importing itur changes NumPy's error state for the whole program: this puts it back, and keeps its divisions quiet.
    with np.errstate(all="ignore"):
        return _from_itur(latitude_deg, longitude_deg % 360.0, altitude_m)


def _from_itur(latitude_deg: float, longitude_deg: float, altitude_m: float | None) -> MapFigures:
    version = str(import_module(MAP_PACKAGE).__version__)

    def value(model: str, function: str, *arguments: float, **options: float) -> float:
        call: Any = getattr(import_module(f"{MAP_PACKAGE}.models.{model}"), function)
        return float(np.squeeze(call(latitude_deg, longitude_deg, *arguments, **options).value))

    # The roughness map has no public function; the class that holds it is that of itur 0.4.0.
    older: Any = import_module(f"{MAP_PACKAGE}.models.itu530")._ITU530_17_
    roughness = older.s_a(np.array([[latitude_deg]]), np.array([[longitude_deg]]))
    vapour_at = {} if altitude_m is None else {"alt": altitude_m / 1000.0}
    return MapFigures(
        rain_rate_001_mm_h=value("itu837", "rainfall_rate", 0.01),
        dn1_n_per_km=value("itu453", "DN65", 1.0),
        gradient_median_n_per_km=value("itu453", "DN65", 50.0),
        gradient_tail_n_per_km=value("itu453", "DN65", 99.9),
        terrain_roughness_m=float(np.squeeze(roughness)),
        rain_height_m=value("itu839", "rain_height") * 1000.0,
        temperature_k=value("itu1510", "surface_mean_temperature"),
        vapour_g_m3=value("itu836", "surface_water_vapour_density", 50.0, **vapour_at),
        version=version,
    )
