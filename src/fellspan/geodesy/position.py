"""A position on Earth."""

import math
from dataclasses import dataclass

from fellspan.errors import CoordinateError


@dataclass(frozen=True, slots=True, kw_only=True)
class Position:
    """A point on the WGS 84 ellipsoid.

    Parameters
    ----------
    latitude_deg
        Geodetic latitude, degrees, -90 to 90, north positive.
    longitude_deg
        Longitude, degrees, east positive; stored in -180 <= longitude < 180.

    Raises
    ------
    CoordinateError
        A value is not finite, the latitude is beyond +-90 or the longitude beyond +-360.
    """

    latitude_deg: float
    longitude_deg: float

    def __post_init__(self) -> None:
        if not (math.isfinite(self.latitude_deg) and math.isfinite(self.longitude_deg)):
            raise CoordinateError(
                f"position {self.latitude_deg}, {self.longitude_deg} is not a pair of finite numbers",
                "give latitude and longitude in degrees",
            )
        if abs(self.latitude_deg) > 90.0:
            raise CoordinateError(
                f"latitude {self.latitude_deg:g} is outside -90 to 90 degrees",
                "latitude comes first; are latitude and longitude swapped?",
            )
        if abs(self.longitude_deg) > 360.0:
            raise CoordinateError(f"longitude {self.longitude_deg:g} is outside -180 to 180 degrees")
        wrapped = (self.longitude_deg + 180.0) % 360.0 - 180.0 if abs(self.longitude_deg) >= 180.0 else None
        object.__setattr__(self, "latitude_deg", float(self.latitude_deg))
        object.__setattr__(self, "longitude_deg", float(self.longitude_deg if wrapped is None else wrapped))
