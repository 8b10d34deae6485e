"""Words with a fixed meaning, shared by the command line, the study file and the engine; imports nothing of Fellspan."""

from typing import Final, Literal, get_args

PathVerdict = Literal["clear", "marginal", "obstructed"]
SignalVerdict = Literal["meets", "marginal", "below"]
Basis = Literal["surveyed", "surface raster", "bare ground only"]

CoverKind = Literal["none", "building", "tree", "other"]
COVER_KINDS: Final[tuple[CoverKind, ...]] = get_args(CoverKind)
"""Order is the code: `PathProfile.cover_kind` holds indices into this tuple."""

HeightReference = Literal["ground", "roof", "sea"]
"""What an antenna height is measured from: the ground at the site, the roof the mast stands on, or sea level."""

RasterRole = Literal["ground", "surface", "cover"]
"""Bare ground (m above sea level), first surface (m above sea level), or cover (m above ground)."""

GapPolicy = Literal["error", "sea"]
Polarization = Literal["horizontal", "vertical"]
MountedPolarization = Literal["horizontal", "vertical", "slant+45", "slant-45", "dual"]
"""How an antenna is mounted; "dual" carries two at right angles, so the other end always finds its own."""
CriteriaPreset = Literal["p530-temperate", "p530-tropical", "sixty-percent"]
LengthUnit = Literal["m", "ft", "us-ft"]

Duplex = Literal["time", "frequency"]
FeederKind = Literal[
    "coaxial 6 mm",
    "coaxial 10 mm",
    "coaxial 13 mm",
    "coaxial 22 mm",
    "coaxial 28 mm",
    "coaxial 41 mm",
    "waveguide 6 GHz",
    "waveguide 8 GHz",
    "waveguide 11 GHz",
    "waveguide 13 GHz",
    "waveguide 18 GHz",
    "waveguide 23 GHz",
]
"""Coaxial cables by their outer diameter, waveguides by their band."""

TreeWay = Literal["no trees", "through", "over"]
"""Which way past trees costs less, and so counts: through them, or over them as if they were solid."""
