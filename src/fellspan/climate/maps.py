"""Climate figures from the maps that the package itur carries; the only module that knows itur. Works with no network.

itur is an optional extra and takes seconds to import, so it is imported when the first figure is asked for.
"""

import importlib.util
import threading
from collections.abc import Iterable
from dataclasses import dataclass, fields
from functools import lru_cache
from importlib import import_module
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

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


MAP_NAMES: Final = tuple(field.name for field in fields(MapFigures) if field.name != "version")


_ONE_AT_A_TIME: Final = threading.Lock()
"""Two threads that import the package at once find it half made, and its maps are read when first asked for."""


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


def map_columns(
    names: Iterable[str], *, latitude_deg: Floats, longitude_deg: Floats, altitude_m: Floats
) -> dict[str, Floats]:
    """Some of `MAP_NAMES` for many places, each as `map_figures` has it for one; arrays of shape (p,).

    Every place and height that rounding leaves apart is looked up once. Raises as `map_figures`.
    """
    # Python rounds to the nearest decimal, NumPy after a multiplication: the first, so that one place never has two figures.
    latitude = np.array([round(value, PLACE_DECIMALS) for value in latitude_deg.tolist()])
    longitude = np.array([round(value, PLACE_DECIMALS) for value in longitude_deg.tolist()])
    altitude = np.rint(altitude_m / 10.0) * 10.0
    places, back = np.unique(np.stack((latitude, longitude, altitude)), axis=1, return_inverse=True)
    with _ONE_AT_A_TIME, np.errstate(all="ignore"):
        return {name: _map_values(name, places[0], places[1] % 360.0, places[2])[back.reshape(-1)] for name in names}


@lru_cache(maxsize=4096)
def _looked_up(latitude_deg: float, longitude_deg: float, altitude_m: float | None) -> MapFigures:
    place = np.array([latitude_deg]), np.array([longitude_deg % 360.0])
    altitude = None if altitude_m is None else np.array([altitude_m])
    # Importing itur changes NumPy's error state for the whole program: this puts it back, and keeps its divisions quiet.
    with _ONE_AT_A_TIME, np.errstate(all="ignore"):
        found = {name: float(_map_values(name, *place, altitude)[0]) for name in MAP_NAMES}
        return MapFigures(**found, version=str(import_module(MAP_PACKAGE).__version__))


_PUBLIC: Final = {
    "rain_rate_001_mm_h": ("itu837", "rainfall_rate", (0.01,)),
    "dn1_n_per_km": ("itu453", "DN65", (1.0,)),
    "gradient_median_n_per_km": ("itu453", "DN65", (50.0,)),
    "gradient_tail_n_per_km": ("itu453", "DN65", (99.9,)),
    "rain_height_m": ("itu839", "rain_height", ()),
    "temperature_k": ("itu1510", "surface_mean_temperature", ()),
    "vapour_g_m3": ("itu836", "surface_water_vapour_density", (50.0,)),
}


def _map_values(name: str, latitude_deg: Floats, longitude_deg: Floats, altitude_m: Floats | None) -> Floats:
    """One map at many places, shape (p,); longitudes 0 to 360."""
    if name == "terrain_roughness_m":
        # The roughness map has no public function; the class that holds it is that of itur 0.4.0.
        older: Any = import_module(f"{MAP_PACKAGE}.models.itu530")._ITU530_17_
        return np.asarray(older.s_a(latitude_deg[:, np.newaxis], longitude_deg[:, np.newaxis])).reshape(-1)
    model, function, arguments = _PUBLIC[name]
    call: Any = getattr(import_module(f"{MAP_PACKAGE}.models.{model}"), function)
    options = {"alt": altitude_m / 1000.0} if name == "vapour_g_m3" and altitude_m is not None else {}
    found = np.asarray(call(latitude_deg, longitude_deg, *arguments, **options).value, dtype=np.float64).reshape(-1)
    return found * 1000.0 if name == "rain_height_m" else found
