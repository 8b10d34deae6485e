"""What stands in the way, in the few words a person on a ladder needs; reads a profile and computes no clearance."""

from typing import Final

import numpy as np

from fellspan.links.own_building import Standing
from fellspan.terrain.profile import PathProfile
from fellspan.vocabulary import COVER_KINDS

SEA_WITHIN_M: Final = 1.0
"""A bare surface this near to level 0 is called the sea where it lies on no named sea level (common practice, no source)."""

_WORDS: Final = {"building": "building", "tree": "trees", "other": "cover", "none": "cover"}


def cover_words(kind: int, height_m: float) -> str:
    """'trees, 14 m' for a cover kind code and its height above ground."""
    return f"{_WORDS[COVER_KINDS[kind]]}, {_metres(height_m)}"


def cause_at(
    profile: PathProfile,
    standing: Standing,
    index: int,
    *,
    available_m: float,
    bulge_m: float,
    need_m: float,
) -> str:
    """Name of what governs at one sample.

    The user's own name for an obstacle; else cover by kind and height, with the ground under it where that alone stands too
    high; else the Earth bulge where the surface would meet the need without it and stands out less than it bulges; else the
    ground.
    """
    obstacle = int(standing.obstacle_index[index])
    if obstacle >= 0:
        return profile.obstacles[obstacle].name
    cover = float(standing.cover_m[index])
    missing = need_m - available_m
    if cover > 0.0:
        words = cover_words(int(standing.cover_kind[index]), cover)
        return f"{_ground(profile, index)} and {words}" if missing - cover > 0.0 else words
    over_sea = _is_sea(profile, index)
    if missing > 0.0 and missing - bulge_m <= 0.0 and _prominence_m(profile, index) <= bulge_m:
        return "Earth bulge over the sea" if over_sea else "Earth bulge"
    return "sea" if over_sea else _ground(profile, index)


def is_sea_level(profile: PathProfile) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
    """Which samples the study took as open sea, shape (n,)."""
    named = [name == "sea level" for name in profile.sources]
    if not any(named):
        return np.zeros(profile.source.shape, dtype=np.bool_)
    return np.asarray(np.asarray([*named, False])[profile.source])


def _is_sea(profile: PathProfile, index: int) -> bool:
    return bool(is_sea_level(profile)[index]) or abs(float(profile.ground_m[index])) <= SEA_WITHIN_M


def _prominence_m(profile: PathProfile, index: int) -> float:
    """How far the ground stands above the chord between the ground at the two ends, m."""
    share = float(profile.distance_m[index]) / profile.length_m
    chord = float(profile.ground_m[0]) * (1.0 - share) + float(profile.ground_m[-1]) * share
    return float(profile.ground_m[index]) - chord


def _ground(profile: PathProfile, index: int) -> str:
    word = "ground" if profile.ground_is_bare else "surface"
    return f"{word} at {float(profile.ground_m[index]):.0f} m"


def _metres(height_m: float) -> str:
    return f"{height_m:.0f} m" if height_m >= 10.0 else f"{height_m:.1f} m".replace(".0 m", " m")
