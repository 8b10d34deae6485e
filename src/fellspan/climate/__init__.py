"""What is known of the weather and the air at a place, and from where each figure comes.

`figures_for` puts them together: given in the study first, then worked out from monthly rain and temperature, then from
maps, then a harmless default. `maps` is the only module that knows itur (optional extra `climate`, works offline). Knows no
links, no frequencies and no study files.
"""

from fellspan.climate.assembling import figures_for
from fellspan.climate.figures import CLIMATE_KEYS, ClimateFigures, ClimateKey, Figure, MultipathEdition
from fellspan.climate.given import GivenClimate
from fellspan.climate.maps import maps_available

__all__ = [
    "CLIMATE_KEYS",
    "ClimateFigures",
    "ClimateKey",
    "Figure",
    "GivenClimate",
    "MultipathEdition",
    "figures_for",
    "maps_available",
]
