"""What terrain knows along one path; made by `Terrain.profiles`, read by `links` and the drawings."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.geodesy.position import Position
from fellspan.vocabulary import CoverKind

MEASURED_NOTHING, MEASURED_GROUND, MEASURED_TOP = 0, 1, 2
"""Codes of `PathProfile.measured`: nothing surveyed, ground surveyed, ground and top surveyed."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Gap:
    """A stretch of a path on which the rasters have no data."""

    from_m: float
    to_m: float
    raster: str
    reason: str = ""
    """Why it was not taken as sea, where gaps are to be sea."""


@dataclass(frozen=True, slots=True, kw_only=True)
class PathObstacle:
    """An obstacle of the user's file that a path crosses.

    `from_m` to `to_m` is the stretch covered, from A; `top_amsl_m` its top there (with growth), `height_m` above ground.
    """

    name: str
    kind: CoverKind
    from_m: float
    to_m: float
    top_amsl_m: float
    height_m: float
    source: str
    growth_m_per_year: float = 0.0
    sigma_m: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class BesidePath:
    """An obstacle of the user's file that a path passes but does not cross, there or within 60 m of there.

    `at_m` from A is the place where it is nearest in terms of the path's own Fresnel zones, whatever their frequency: where
    `offset_m`, the distance from the path to its edge, is least against the zone's radius. `top_amsl_m` is its top there, with
    growth; NaN where the ground it stands on is not known.
    """

    name: str
    kind: CoverKind
    at_m: float
    offset_m: float
    top_amsl_m: float
    source: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PathProfile:
    """Terrain along the geodesic from `a` to `b`; all arrays have shape (n,) and are read-only.

    Samples stand at a regular step, with more where obstacles begin and end, where survey points stand and where
    `Terrain.refine` looked closer: `distance_m` rises strictly but not evenly; the first is 0, the last the path length.
    In a gap `ground_m` and `surface_m` are NaN.
    """

    a: Position
    b: Position
    distance_m: NDArray[np.float64]
    latitude_deg: NDArray[np.float64]
    longitude_deg: NDArray[np.float64]
    ground_m: NDArray[np.float64]
    """Bare ground above sea level, m; where only a surface raster is given, that surface (`ground_is_bare` is False)."""
    cover_m: NDArray[np.float64]
    """Height of cover or obstacle above `ground_m`, m, >= 0."""
    cover_kind: NDArray[np.int8]
    """Index into `vocabulary.COVER_KINDS`."""
    obstacle_index: NDArray[np.int32]
    """Index into `obstacles` of the one that makes the surface here, else -1."""
    surface_m: NDArray[np.float64]
    """`ground_m + cover_m`: what a ray must clear, m above sea level."""
    source: NDArray[np.int16]
    """Index into `sources` of what gave the ground here; -1 in a gap."""
    measured: NDArray[np.int8]
    """0 nothing, 1 ground, 2 ground and top were surveyed here."""
    sigma_m: NDArray[np.float64]
    """Standard error of `surface_m`, m."""
    sources: tuple[str, ...]
    """Names: raster file names, 'survey: FILE', 'sea level'."""
    obstacles: tuple[PathObstacle, ...]
    gaps: tuple[Gap, ...]
    step_m: float
    """The regular step, m."""
    cell_m: float
    """Ground size of the finest cell that was used, m."""
    ground_is_bare: bool
    """False where the only raster is a surface model."""
    surface_is_known: bool
    """True where a surface raster or cover raster covers the whole path (obstacle files alone do not make it so)."""
    vertical_datum: str | None
    """As the rasters or the study state it; None where nobody did."""
    name: str | None = None
    """The path's name, where it was given; survey rows by link and distance go by it."""
    beside: tuple[BesidePath, ...] = ()
    """Obstacles passed within `beside.BESIDE_M` but not crossed, by distance from A; the 200 deepest in the zones at most."""
    notes: tuple[str, ...] = ()
    """Things a person must know: seams found, datum unknown, sea filled in ..."""

    def __post_init__(self) -> None:
        for name in (
            "distance_m",
            "latitude_deg",
            "longitude_deg",
            "ground_m",
            "cover_m",
            "cover_kind",
            "obstacle_index",
            "surface_m",
            "source",
            "measured",
            "sigma_m",
        ):
            array = getattr(self, name)
            if array.shape != self.distance_m.shape:
                raise ValueError(f"PathProfile.{name} has shape {array.shape}, not {self.distance_m.shape}")
            array.flags.writeable = False

    @property
    def length_m(self) -> float:
        """Path length, m."""
        return float(self.distance_m[-1])
