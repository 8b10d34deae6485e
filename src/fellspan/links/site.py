"""Site, Radio, Antenna and Link: what a user states about two ends and the equipment between them."""

import math
from dataclasses import dataclass, field
from pathlib import Path

from fellspan.antennas.mounting import Mounting
from fellspan.antennas.pattern import Pattern
from fellspan.errors import LinkError
from fellspan.geodesy.position import Position
from fellspan.links.feeders import Feeder
from fellspan.links.radio import CoChannel, Modulation, Radio, Signature
from fellspan.links.rule_types import PowerRule
from fellspan.vocabulary import HeightReference, MountedPolarization

__all__ = [
    "Aim",
    "Antenna",
    "Channel",
    "CoChannel",
    "Diversity",
    "Feeder",
    "Link",
    "Modulation",
    "NoiseFloor",
    "PatternOrigin",
    "Radio",
    "Signature",
    "Site",
    "Sway",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class NoiseFloor:
    """What a site survey heard at a receiver: noise and interference from others.

    Parameters
    ----------
    level_dbm
        Power in `bandwidth_hz`, dBm, at the port of the radio with the antenna of the link; taken as coming on top of the
        receiver's own noise.
    bandwidth_hz
        Width that it was measured in, Hz; the channel's where not stated.
    bearing_deg, width_deg
        The sector that the antenna looked into: true bearing of its middle and its width, degrees; all around where not
        stated.
    low_hz, high_hz
        The part of the band that it holds for; all of it where not stated.
    """

    level_dbm: float
    bandwidth_hz: float | None = None
    bearing_deg: float | None = None
    width_deg: float = 90.0
    low_hz: float | None = None
    high_hz: float | None = None

    def __post_init__(self) -> None:
        if not math.isfinite(self.level_dbm):
            raise LinkError(f"noise floor {self.level_dbm:g} dBm must be a number", "a quiet channel needs no entry")
        width, sector = self.bandwidth_hz, self.width_deg
        if width is not None and not (math.isfinite(width) and width > 0.0):
            raise LinkError(f"noise floor: measured in {width:g} Hz", "the width must be above 0")
        if self.bearing_deg is not None and not 0.0 <= self.bearing_deg <= 360.0:
            raise LinkError(f"noise floor: bearing {self.bearing_deg:g} degrees is outside 0 to 360")
        if not 0.0 < sector <= 360.0:
            raise LinkError(f"noise floor: sector of {sector:g} degrees must be above 0 and at most 360")
        if self.low_hz is not None and self.high_hz is not None and self.low_hz >= self.high_hz:
            raise LinkError(f"noise floor: from {self.low_hz / 1e9:g} to {self.high_hz / 1e9:g} GHz is no band")


@dataclass(frozen=True, slots=True, kw_only=True)
class Channel:
    """A stretch of spectrum that a site cannot use, Hz, and why."""

    low_hz: float
    high_hz: float
    reason: str = ""

    def __post_init__(self) -> None:
        if not 0.0 <= self.low_hz < self.high_hz:
            raise LinkError(
                f"unusable channel from {self.low_hz / 1e9:g} to {self.high_hz / 1e9:g} GHz is no stretch of spectrum",
                "give its lower and its upper end",
            )


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
    noise_floors: tuple[NoiseFloor, ...] = ()
    unusable_channels: tuple[Channel, ...] = ()

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
class Aim:
    """A mounting as far as it is stated: what is None follows the link.

    `bearing_deg` None points at the other end. `tilt_deg` None points at it too, unless the bearing is stated or the antenna
    is an omni: then it is level. `polarization` None is the radio's. Ranges are those of `Mounting`.
    """

    bearing_deg: float | None = None
    tilt_deg: float | None = None
    polarization: MountedPolarization | None = None
    roll_deg: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class PatternOrigin:
    """Where a pattern came from, so that a study can be written again: a catalogue name, a file, or data-sheet numbers."""

    model: str | None = None
    file: Path | None = None
    azimuth_width_deg: float | None = None
    elevation_width_deg: float | None = None
    front_to_back_db: float | None = None
    cross_polar_db: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Sway:
    """How far an antenna is off its aim: steady errors, and the standard deviation of mast twist and sway, degrees.

    What it costs follows from the pattern; for an antenna of which only the gain is known it is not computed.
    """

    azimuth_sigma_deg: float = 0.0
    elevation_sigma_deg: float = 0.0
    azimuth_offset_deg: float = 0.0
    elevation_offset_deg: float = 0.0

    def __post_init__(self) -> None:
        for label, sigma in (("azimuth", self.azimuth_sigma_deg), ("elevation", self.elevation_sigma_deg)):
            if not (math.isfinite(sigma) and sigma >= 0.0):
                raise LinkError(f"{label} sway {sigma:g} degrees must be 0 or more")


@dataclass(frozen=True, slots=True, kw_only=True)
class Diversity:
    """A second receiving antenna on the same mast.

    `spacing_m` is the height between the two, m; `gain_dbi` and `feeder_loss_db` are those of the second one, None where they
    are as the first one's.
    """

    spacing_m: float
    gain_dbi: float | None = None
    feeder_loss_db: float | None = None

    def __post_init__(self) -> None:
        if not (math.isfinite(self.spacing_m) and self.spacing_m > 0.0):
            raise LinkError(f"second antenna: spacing {self.spacing_m:g} m must be above 0", "3 to 23 m are usual")


@dataclass(frozen=True, slots=True, kw_only=True)
class Antenna:
    """The antenna at one end.

    Parameters
    ----------
    gain_dbi
        Peak gain, dBi; None where unknown, or where the pattern says it.
    feeder_loss_db
        Of cable and connectors, dB; with `feeder`, of what comes on top of that run.
    feeder
        A run of line of a known class and length; its loss is added.
    branching_loss_db
        Of filters, circulators and couplers between radio and feeder, dB.
    radome_wet_db, radome_iced_db
        What a wet and an iced radome cost, dB, apart from the rain on the path; the wet one counts while it rains, the iced one
        is said beside the result.
    sway
        Errors of aim and sway; None counts nothing.
    diversity
        A second receiving antenna; None where there is one only.
    pattern
        Gain in every direction, at the frequency of the radio; None where only the gain is known, which then holds in any
        direction.
    mounting
        Where it points; None is aimed at the other end exactly, with the radio's polarization.
    origin
        Where the pattern came from.
    """

    gain_dbi: float | None = None
    feeder_loss_db: float = 0.0
    name: str = "antenna"
    pattern: Pattern | None = field(default=None, compare=False)
    mounting: Mounting | Aim | None = None
    origin: PatternOrigin | None = None
    feeder: Feeder | None = None
    branching_loss_db: float = 0.0
    radome_wet_db: float = 0.0
    radome_iced_db: float = 0.0
    sway: Sway | None = None
    diversity: Diversity | None = None

    def __post_init__(self) -> None:
        for label, loss in (
            ("feeder loss", self.feeder_loss_db),
            ("branching loss", self.branching_loss_db),
            ("wet radome", self.radome_wet_db),
            ("iced radome", self.radome_iced_db),
        ):
            if not (math.isfinite(loss) and loss >= 0.0):
                raise LinkError(f"antenna '{self.name}': {label} {loss:g} dB must be 0 dB or more")

    @property
    def peak_gain_dbi(self) -> float | None:
        """Gain at the maximum: the pattern's where there is one, else as stated."""
        return self.gain_dbi if self.pattern is None else self.pattern.peak_gain_dbi


@dataclass(frozen=True, slots=True, kw_only=True)
class Link:
    """Two sites and what joins them.

    `wanted_margin_db` is the margin that the signal verdict asks for; `target_availability_percent`, above 0 and below 100, the
    share of an average year for which each direction must carry the wanted modulation, None where nobody asks for one.
    `power_rule` is the row that both ends are held against.
    """

    name: str
    a: Site
    b: Site
    radio: Radio
    antenna_a: Antenna = field(default_factory=Antenna)
    antenna_b: Antenna = field(default_factory=Antenna)
    wanted_margin_db: float = 10.0
    target_availability_percent: float | None = None
    power_rule: PowerRule | None = None

    def __post_init__(self) -> None:
        target = self.target_availability_percent
        if target is not None and not 0.0 < target < 100.0:
            raise LinkError(
                f"link '{self.name}': target availability {target:g} % must be above 0 and below 100",
                "99.99 allows 53 minutes a year; nothing is there all the time",
            )
