"""Site, Radio and Link: what a user states about two ends and the equipment between them."""

import math
from dataclasses import dataclass, field

from fellspan.errors import LinkError
from fellspan.geodesy.position import Position
from fellspan.vocabulary import HeightReference, Polarization


@dataclass(frozen=True, slots=True, kw_only=True)
class Site:
    """A place where an antenna stands.

    Parameters
    ----------
    name
        As the user calls it; shown everywhere.
    position
        WGS 84.
    height_m
        Antenna height, m, measured from `height_reference`.
    height_reference
        'ground', 'roof' or 'sea'.
    roof_m
        Height of the roof above ground, m; for 'roof' where no building in the data gives it.
    ground_amsl_m
        Measured ground level at the spot, m above sea level; replaces the raster's there.
    vertical_datum
        Datum of `ground_amsl_m` and of a 'sea' height; must be that of the terrain.
    roof_edge_m, parapet_m
        Distance from the antenna to the roof edge in the direction of the link, m, and height of the parapet above the
        roof, m; checked as an obstacle.

    Raises
    ------
    LinkError
        A height is negative or not finite, or roof details are given for an antenna that stands on no roof.
    """

    name: str
    position: Position
    height_m: float
    height_reference: HeightReference = "ground"
    roof_m: float | None = None
    ground_amsl_m: float | None = None
    vertical_datum: str | None = None
    roof_edge_m: float | None = None
    parapet_m: float | None = None

    def __post_init__(self) -> None:
        if not math.isfinite(self.height_m) or (self.height_reference != "sea" and self.height_m < 0.0):
            raise LinkError(
                f"site '{self.name}': antenna height {self.height_m:g} m is not a height above {self.height_reference}",
                "give 0 m or more, and say above what: ground, roof or sea",
            )
        for label, value in (("roof", self.roof_m), ("roof edge", self.roof_edge_m), ("parapet", self.parapet_m)):
            if value is not None and not (math.isfinite(value) and value >= 0.0):
                raise LinkError(f"site '{self.name}': {label} {value:g} m must be 0 m or more")
        if self.height_reference != "roof" and (self.roof_edge_m is not None or self.parapet_m is not None):
            raise LinkError(
                f"site '{self.name}': roof edge or parapet given, but the antenna height is above {self.height_reference}",
                "measure the antenna height from the roof, or drop the roof details",
            )
        if self.parapet_m is not None and self.roof_edge_m is None:
            raise LinkError(
                f"site '{self.name}': parapet {self.parapet_m:g} m given without the distance to the roof edge",
                "add the distance from the antenna to the edge in the direction of the link",
            )


@dataclass(frozen=True, slots=True, kw_only=True)
class Radio:
    """The radio at both ends of a link.

    Parameters
    ----------
    frequency_hz
        Carrier, Hz, > 0.
    power_dbm
        Transmit power at the antenna port, dBm; None where unknown: then no level is computed.
    threshold_dbm
        Received level that the wanted modulation needs, dBm; None where unknown: then no margin is computed.
    polarization
        'horizontal' or 'vertical'.
    """

    frequency_hz: float
    power_dbm: float | None = None
    threshold_dbm: float | None = None
    polarization: Polarization = "vertical"
    name: str = "radio"

    def __post_init__(self) -> None:
        if not (math.isfinite(self.frequency_hz) and self.frequency_hz > 0.0):
            raise LinkError(f"radio '{self.name}': frequency {self.frequency_hz:g} Hz must be above 0")


@dataclass(frozen=True, slots=True, kw_only=True)
class Antenna:
    """Gain and feeder loss at one end (`gain_dbi` None where unknown)."""

    gain_dbi: float | None = None
    feeder_loss_db: float = 0.0
    name: str = "antenna"


@dataclass(frozen=True, slots=True, kw_only=True)
class Link:
    """Two sites and what joins them; `wanted_margin_db` is the margin the signal verdict asks for."""

    name: str
    a: Site
    b: Site
    radio: Radio
    antenna_a: Antenna = field(default_factory=Antenna)
    antenna_b: Antenna = field(default_factory=Antenna)
    wanted_margin_db: float = 10.0
