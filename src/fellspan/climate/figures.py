"""Climate figures of a place as values with their provenance; computes nothing."""

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final, Literal

from fellspan.geodesy.position import Position

GIVEN: Final = "given in the study"
MultipathEdition = Literal["P.530-19", "P.530-17 detailed", "P.530-17 quick"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Figure:
    """One figure.

    Parameters
    ----------
    value, unit
        Number in the unit of its field's name, and that unit for people.
    provenance
        Where it comes from: 'given in the study', 'map of Rec. ITU-R ... by itur 0.4.0', 'default: ...'.
    source_key
        Key of the citation registry; empty for what the study gives.
    """

    value: float
    unit: str
    provenance: str
    source_key: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class ClimateKey:
    """How a study gives a figure, and what people would find usual."""

    key: str
    typical: str


CLIMATE_KEYS: Final[Mapping[str, ClimateKey]] = MappingProxyType(
    {
        "rain_rate_001_mm_h": ClimateKey(
            key="climate.rain_rate",
            typical="20 mm/h in dry plains, 30 in temperate lands, 60 to 80 on warm seas and coasts, 100 near the equator",
        ),
        "dn1_n_per_km": ClimateKey(
            key="climate.dn1", typical="-120 N/km in cool maritime air, -200 inland, -300 on dry high plains"
        ),
        "log_k": ClimateKey(key="climate.log_k", typical="from the map of Rec. ITU-R P.530-19; no usual value"),
        "dn75": ClimateKey(key="climate.dn75", typical="0 to 54 N-units, from the map of Rec. ITU-R P.530-19"),
        "terrain_roughness_m": ClimateKey(
            key="climate.terrain_roughness", typical="2 m at sea, 40 in hills, 500 in high mountains"
        ),
        "gradient_tail_n_per_km": ClimateKey(
            key="climate.gradient_tail",
            typical="15 to 45 N/km on land, up to 100 in the wet tropics, below 0 on open sea",
        ),
    }
)
"""Figures without a default, by field name: the key of the study file and typical values. The typical ones are rounded from
what itur 0.4.0 gives for London, Bern, Denver, Miami, Rio de Janeiro, Singapore and open sea."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ClimateFigures:
    """What is known of a place; None where nothing is, and then `notes` says what that costs and how to give it.

    Parameters
    ----------
    position
        The place, usually the middle of a path.
    rain_rate_001_mm_h
        Rain rate exceeded for 0.01 % of an average year, one-minute values.
    dn1_n_per_km
        Gradient of refractivity of the lowest 65 m not exceeded for 1 % of an average year.
    dn75, log_k
        Refractivity over the lowest 75 m, N-units, and log K, as P.530-19 uses them.
    terrain_roughness_m
        Standard deviation of terrain heights within 110 km.
    gradient_median_n_per_km, gradient_tail_n_per_km
        Gradient dN/dh not exceeded for 50 and for 99.9 % of an average year.
    temperature_k, total_pressure_hpa, dry_pressure_hpa, vapour_g_m3
        Annual mean air at the height of the place.
    rain_height_m
        Mean height of the melting layer above sea level, for wet snow.
    notes
        Sentences for the plan: what is missing, which keys give it, what is usual.
    """

    position: Position
    rain_rate_001_mm_h: Figure | None
    dn1_n_per_km: Figure | None
    dn75: Figure | None
    log_k: Figure | None
    terrain_roughness_m: Figure | None
    gradient_median_n_per_km: Figure
    gradient_tail_n_per_km: Figure | None
    temperature_k: Figure
    total_pressure_hpa: Figure
    dry_pressure_hpa: Figure
    vapour_g_m3: Figure
    rain_height_m: Figure | None
    notes: tuple[str, ...] = ()

    @property
    def multipath_edition(self) -> MultipathEdition | None:
        """The edition that these figures allow: -19 with log K and dN75, else -17; None where there is no gradient either."""
        if self.log_k is not None and self.dn75 is not None:
            return "P.530-19"
        if self.dn1_n_per_km is None:
            return None
        return "P.530-17 quick" if self.terrain_roughness_m is None else "P.530-17 detailed"
