"""Puts the climate figures of a place together, each with its provenance: given, worked out, from maps, or a default.

Knows which of them wins and what to say where there is none; knows no package of maps by itself.
"""

import math
from dataclasses import replace
from typing import Final

from fellspan.climate.figures import CLIMATE_KEYS, GIVEN, ClimateFigures, Figure
from fellspan.climate.given import GivenClimate
from fellspan.climate.maps import MapFigures, map_figures, maps_available
from fellspan.geodesy.position import Position
from fellspan.propagation._arrays import Result
from fellspan.propagation.constants import STANDARD_K
from fellspan.propagation.gases import dry_pressure_hpa, standard_air
from fellspan.propagation.rain_rate import rain_rate_mm_h
from fellspan.propagation.refraction import gradient_from_k_n_per_km

FROM_MONTHS: Final = "P.837-8 from monthly rain and temperature"
_ZERO_CELSIUS_K: Final = 273.15

_MAPS: Final = {
    "rain_rate_001_mm_h": ("P.837-7", "p837-7-rain-map"),
    "dn1_n_per_km": ("P.453-13", "p453-13-gradient-map"),
    "gradient_median_n_per_km": ("P.453-13", "p453-13-gradient-map"),
    "gradient_tail_n_per_km": ("P.453-13", "p453-13-gradient-map"),
    "terrain_roughness_m": ("P.530-17", "p530-17-roughness-map"),
    "rain_height_m": ("P.839-4", "p839-4-rain-height-map"),
    "temperature_k": ("P.1510-1", "p1510-1-temperature-map"),
    "vapour_g_m3": ("P.836-6", "p836-6-vapour-map"),
}


def figures_for(position: Position, *, given: GivenClimate | None = None, maps: bool = True) -> ClimateFigures:
    """Climate figures of a place.

    Parameters
    ----------
    position
        The place; for a link, the middle of its path. The same place rounded to 0.01 degrees is looked up once.
    given
        What the study says; it comes before everything else.
    maps
        False leaves the maps aside, which take a second to open: for callers that need the air only.

    Returns
    -------
    figures
        A figure that nothing provides is None, and the notes then say what is not computed, which keys give it, what is usual.
        Defaults, said as such, exist for the median gradient (k = 4/3) and for the air (reference atmosphere) only. The air is
        at `given.altitude_m`; where that is not given, at sea level.

    Notes
    -----
    Never raises for a missing or broken optional package: that too is a note. Offline.
    """
    given = given or GivenClimate()
    looked_up, trouble = _maps_at(position, given.altitude_m) if maps else (None, "")
    found = _Finder(given, looked_up)
    rain = found("rain_rate_001_mm_h", "mm/h", monthly=_rain_from_months(given))
    dn1 = found("dn1_n_per_km", "N/km")
    dn75, log_k = found("dn75", "N-units"), found("log_k", "")
    median = found("gradient_median_n_per_km", "N/km") or _default_gradient()
    tail = found("gradient_tail_n_per_km", "N/km")
    notes: list[str] = []
    if tail is not None and tail.value <= median.value:
        notes.append(
            f"the gradient at 99.9 % ({tail.value:.4g} N/km, {tail.provenance}) does not lie above the median "
            f"({median.value:.4g} N/km, {median.provenance}): the first is left out"
        )
        tail = None
    temperature, pressure, dry, vapour = _air(given, found)
    figures = ClimateFigures(
        position=position,
        rain_rate_001_mm_h=rain,
        dn1_n_per_km=dn1,
        dn75=dn75,
        log_k=log_k,
        terrain_roughness_m=found("terrain_roughness_m", "m"),
        gradient_median_n_per_km=median,
        gradient_tail_n_per_km=tail,
        temperature_k=temperature,
        total_pressure_hpa=pressure,
        dry_pressure_hpa=dry,
        vapour_g_m3=vapour,
        rain_height_m=found("rain_height_m", "m"),
    )
    return replace(figures, notes=(*notes, *_missing(figures, trouble)))


class _Finder:
    """Looks a figure up: given first, then worked out from months, then from a map."""

    def __init__(self, given: GivenClimate, maps: MapFigures | None) -> None:
        self._given = given
        self._maps = maps

    def __call__(self, name: str, unit: str, *, monthly: Figure | None = None) -> Figure | None:
        said = getattr(self._given, name, None)
        if said is not None:
            return Figure(value=said, unit=unit, provenance=GIVEN)
        if monthly is not None:
            return monthly
        if self._maps is None or name not in _MAPS:
            return None
        value = float(getattr(self._maps, name))
        document, key = _MAPS[name]
        if not math.isfinite(value):
            return None
        return Figure(
            value=value,
            unit=unit,
            provenance=f"map of Rec. ITU-R {document} by itur {self._maps.version}",
            source_key=key,
        )


def _maps_at(position: Position, altitude_m: float | None) -> tuple[MapFigures | None, str]:
    """The maps' figures, and where there are none the reason in a few words."""
    if not maps_available():
        return None, "no maps: the optional extra 'climate' is not installed"
    try:
        return (
            map_figures(
                latitude_deg=position.latitude_deg, longitude_deg=position.longitude_deg, altitude_m=altitude_m
            ),
            "",
        )
    except Exception as error:  # a package of others may fail in any way; the study's own figures still serve
        lines = str(error).splitlines()
        return None, f"the maps cannot be read: {type(error).__name__}: {lines[0] if lines else 'no reason given'}"


def rain_from_months_mm_h(given: GivenClimate) -> float | None:
    """Rain rate exceeded for 0.01 % of the year from monthly means, mm/h; None without them."""
    if given.monthly_rain_mm is None or given.monthly_temperature_c is None:
        return None
    return float(
        rain_rate_mm_h(0.01, monthly_rain_mm=given.monthly_rain_mm, monthly_temperature_c=given.monthly_temperature_c)
    )


def _rain_from_months(given: GivenClimate) -> Figure | None:
    rate = rain_from_months_mm_h(given)
    return (
        None if rate is None else Figure(value=rate, unit="mm/h", provenance=FROM_MONTHS, source_key="p837-8-rain-rate")
    )


def default_gradient_n_per_km() -> float:
    """Median gradient where nothing better is known: that of k = 4/3."""
    return float(gradient_from_k_n_per_km(STANDARD_K))


def kelvin(temperature_c: float) -> float:
    """Degrees Celsius in kelvin."""
    return temperature_c + _ZERO_CELSIUS_K


def _default_gradient() -> Figure:
    return Figure(value=default_gradient_n_per_km(), unit="N/km", provenance="default: k = 4/3", source_key="p452-18-k")


def _air(given: GivenClimate, found: _Finder) -> tuple[Figure, Figure, Figure, Figure]:
    """Temperature, total and dry pressure, and vapour at the height of the place."""
    altitude = 0.0 if given.altitude_m is None else given.altitude_m
    where = "sea level" if given.altitude_m is None else f"{altitude:.0f} m"
    standard = standard_air(altitude)
    default = f"default: reference atmosphere of Rec. ITU-R P.835-6 at {where}"

    def standing_in(value: Result, unit: str) -> Figure:
        return Figure(value=float(value), unit=unit, provenance=default, source_key="p835-6-standard-air")

    if given.temperature_c is not None:
        temperature = Figure(value=kelvin(given.temperature_c), unit="K", provenance=GIVEN)
    else:
        temperature = found("temperature_k", "K") or standing_in(standard.temperature_k, "K")
    vapour = found("vapour_g_m3", "g/m3") or standing_in(standard.vapour_g_m3, "g/m3")
    pressure = found("total_pressure_hpa", "hPa") or standing_in(standard.total_pressure_hpa, "hPa")
    dry = Figure(
        value=float(dry_pressure_hpa(pressure.value, temperature_k=temperature.value, vapour_g_m3=vapour.value)),
        unit="hPa",
        provenance=f"total pressure ({pressure.provenance}) less that of the vapour ({vapour.provenance})",
        source_key="p453-13-refractivity",
    )
    return temperature, pressure, dry, vapour


def _missing(figures: ClimateFigures, trouble: str) -> list[str]:
    notes = [f"climate figures: {trouble}"] if trouble else []
    if figures.rain_rate_001_mm_h is None:
        notes.append(
            "no rain rate: outage by rain, and so the availability, is not computed; set "
            f"{_ask('rain_rate_001_mm_h')}, or climate.monthly_rain and climate.monthly_temperature"
        )
    if figures.multipath_edition is None:
        notes.append(
            "no refractivity gradient: multipath is not computed, and so no availability of paths above 5 km; set "
            f"{_ask('dn1_n_per_km')}, or climate.log_k and climate.dn75 from the maps of Rec. ITU-R P.530-19"
        )
    if (figures.log_k is None) != (figures.dn75 is None):
        there, absent = ("log_k", "dn75") if figures.dn75 is None else ("dn75", "log_k")
        notes.append(f"{CLIMATE_KEYS[there].key} alone is not used: edition P.530-19 also needs {_ask(absent)}")
    if figures.multipath_edition == "P.530-17 quick":
        notes.append(f"multipath by the quick method; the detailed one also needs {_ask('terrain_roughness_m')}")
    if figures.gradient_tail_n_per_km is None:
        notes.append(
            "no spread of the gradient: diffraction fading rests on k exceeded for 99.9 % of the worst month by Rec. ITU-R "
            f"P.530-19, or set {_ask('gradient_tail_n_per_km')}"
        )
    return notes


def _ask(name: str) -> str:
    return f"{CLIMATE_KEYS[name].key} (usual: {CLIMATE_KEYS[name].typical})"
