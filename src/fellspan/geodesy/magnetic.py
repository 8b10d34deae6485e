"""Magnetic declination by the World Magnetic Model, offline, for the crew that aims with a compass.

The model itself is pygeomag's, with the coefficient files it ships. Knows nothing of links.
"""

import calendar
import datetime
from dataclasses import dataclass
from typing import Final

from fellspan.errors import MagneticModelError
from fellspan.geodesy.geodesic import normalized_bearing_deg
from fellspan.geodesy.position import Position

_MODELS: Final = ((2020, "WMM-2020", "wmm/WMM_2020.COF"), (2025, "WMM-2025", "wmm/WMM_2025.COF"))
_YEARS_VALID: Final = 5


@dataclass(frozen=True, slots=True, kw_only=True)
class Declination:
    """Declination at a place and date.

    `declination_deg` is positive where magnetic north lies east of true north. `uncertainty_deg` is one standard
    deviation, None where the compass is unusable. `caution` is set where the horizontal field is weak.
    """

    declination_deg: float
    model: str
    uncertainty_deg: float | None
    caution: str | None = None


def declination(position: Position, date: datetime.date, *, height_m: float = 0.0) -> Declination:
    """Magnetic declination.

    Parameters
    ----------
    position
        Where.
    date
        When; 2020-01-01 to 2029-12-31.
    height_m
        Metres above the ellipsoid, -1000 to 850 000; the effect is far below the uncertainty for any mast.

    Raises
    ------
    MagneticModelError
        The date lies outside every model.

    Notes
    -----
    World Magnetic Model 2025 (NOAA NCEI and British Geological Survey, 2024) and 2020, degree 12. Uncertainty by their
    error models, sqrt(0.26^2 + (5417/H)^2) and sqrt(0.26^2 + (5625/H)^2) degrees, H in nT. Zones: below 2000 nT the
    declination is not to be relied on (blackout), below 6000 nT with caution. Local iron is not in the model.
    """
    from pygeomag import GeoMag

    covering = [entry for entry in _MODELS if entry[0] <= date.year < entry[0] + _YEARS_VALID]
    if not covering:
        raise MagneticModelError(
            f"no magnetic model covers {date.isoformat()}",
            f"the models here run from {_MODELS[0][0]}-01-01 to {_MODELS[-1][0] + _YEARS_VALID - 1}-12-31",
            "give a date in that range, or aim by true bearing; a newer Fellspan may carry a newer model",
        )
    _, model, file = covering[0]
    days = 366 if calendar.isleap(date.year) else 365
    decimal_year = date.year + (date.timetuple().tm_yday - 1) / days
    # a fresh object each time: it works in buffers of its own, which threads must not share
    field = GeoMag(coefficients_file=file).calculate(
        glat=position.latitude_deg, glon=position.longitude_deg, alt=height_m / 1000.0, time=decimal_year
    )
    caution = None
    if field.in_blackout_zone:
        caution = "so near a magnetic pole that no compass can be relied on: aim by true bearing and landmarks"
    elif field.in_caution_zone:
        caution = "near a magnetic pole, where a compass settles badly: check the aim by landmarks"
    return Declination(
        declination_deg=float(field.d),
        model=model,
        uncertainty_deg=None if field.in_blackout_zone else float(field.calculate_uncertainty().d),
        caution=caution,
    )


def magnetic_bearing_deg(true_deg: float, declination_deg: float) -> float:
    """What a compass shows, 0 <= bearing < 360, for a true bearing and an east-positive declination."""
    return float(normalized_bearing_deg(true_deg - declination_deg))
