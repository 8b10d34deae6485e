"""ReflectionResult: what smooth water or ground does to one link, as frozen data with plain sentences; no arrays, no physics.

Numbers that are infinite or undefined are None. Distances count from A.
"""

from dataclasses import dataclass
from typing import Final, Literal

KName = Literal["worst month", "median", "infinite"]
SurfaceKind = Literal["water", "flat ground"]
End = Literal["a", "b"]

MATTERS_FROM_DB: Final = 3.0
"""Fades as deep as this are worth a word on the first page, and heights are sought that avoid them (our own figure)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SpecularPoint:
    """Where the ray is mirrored at one k, what is left of it, and what it does to the level at the planned heights.

    `from_m` to `to_m` is the part of the first Fresnel zone on the surface that reflects; `zone_length_m` and `zone_width_m`
    are of the whole zone. `height_a_m` and `height_b_m` are those of the antennas above the surface prolonged.
    `path_difference_wavelengths` counts half a turn at the surface as 0.5, so that whole numbers are nulls;
    `from_null_wavelengths`, 0 to 0.5, is the distance to the nearest of them. `amplitude` is the product of all factors over
    the direct ray. `shaded_at_m` is where terrain cuts a leg: then nothing arrives. `fade_db` is the deepest fade that a
    change of phase can bring, `gain_db` the greatest rise, `level_db` the level over the direct ray at the planned heights.
    """

    name: KName
    k: float | None
    surface: SurfaceKind
    at_m: float
    latitude_deg: float
    longitude_deg: float
    from_m: float
    to_m: float
    zone_length_m: float
    zone_width_m: float
    level_m: float
    slope_mrad: float
    height_a_m: float
    height_b_m: float
    grazing_mrad: float
    path_difference_wavelengths: float
    from_null_wavelengths: float
    coefficient: float
    divergence: float
    roughness_m: float
    smooth_up_to_m: float
    roughness_factor: float
    partial_factor: float
    discrimination_a_db: float
    discrimination_b_db: float
    amplitude: float
    shaded_at_m: float | None
    fade_db: float | None
    gain_db: float
    level_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class LobingCurve:
    """Level over the direct ray, dB, at one k, for each of the heights of its `Lobing`; None where nothing is mirrored."""

    name: KName
    k: float | None
    level_db: tuple[float | None, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Lobing:
    """Level against the height of one antenna above ground, m, the other end as planned and both aimed at each other."""

    end: End
    height_m: tuple[float, ...]
    planned_m: float
    curves: tuple[LobingCurve, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class HeightRange:
    """Heights of an antenna above ground, m."""

    from_m: float
    to_m: float


@dataclass(frozen=True, slots=True, kw_only=True)
class NullFreeHeights:
    """Heights at one end that keep the fade of the mirrored ray within 3 dB at every k of the range and every water level.

    `change_m` is the least change of the planned height that does it: 0 where it does already, None where no height of the
    range searched does. `lowest_m` is the lowest height that the clearance criteria allow, the other end as planned.
    """

    end: End
    planned_m: float
    change_m: float | None
    ranges: tuple[HeightRange, ...]
    searched: HeightRange
    lowest_m: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Spacing:
    """Against fades by reflection: pitch of the minima with height at each end, m, at the median k, and frequencies apart, Hz.

    Two antennas half a pitch apart do not fade together, nor do two frequencies `frequency_hz` apart.
    """

    pitch_a_m: float
    pitch_b_m: float
    frequency_hz: float


@dataclass(frozen=True, slots=True, kw_only=True)
class ReflectionResult:
    """What is mirrored on the way; `points` holds for each k the strongest that arrives, then the others."""

    matters: bool
    """Whether a fade of 3 dB or more can come of it."""
    sentences: tuple[str, ...]
    points: tuple[SpecularPoint, ...]
    surface_material: str | None
    polarization: str
    water_low_m: float | None
    water_high_m: float | None
    span_wavelengths: float | None
    """How far the path difference moves over the k and the water levels, at the planned heights; nulls are 1 apart."""
    lobing: tuple[Lobing, ...]
    heights: tuple[NullFreeHeights, ...]
    spacing: Spacing | None
    notes: tuple[str, ...]
    sources: tuple[str, ...]
