"""The building an antenna stands on does not block it; its typed roof edge and parapet do.

Takes a PathProfile and says what stands along it for clearance. Ground is never left out; what was left out is listed, and
its tops are kept, so that a sight line that passes below them can be told.
Knows nothing of rays, zones or verdicts.
"""

from dataclasses import dataclass, replace
from typing import Final, Literal, TypeVar

import numpy as np
from numpy.typing import NDArray

from fellspan.links.result import Ignored
from fellspan.terrain.profile import MEASURED_TOP, PathObstacle, PathProfile
from fellspan.vocabulary import COVER_KINDS

EndName = Literal["A", "B"]
Scalar = TypeVar("Scalar", bound=np.generic)

NEAR_M: Final = 10.0
"""Without an outline, cover this near to an antenna counts as what it stands on, m (common practice, no source)."""
NEAR_SHARE: Final = 0.1
"""... but never more than this share of the path (our own rule)."""
ERRORS: Final = 2.0
"""Raster cover counts as the own building's up to this many standard errors above its top (our own rule),"""
LEAST_TOLERANCE_M, MOST_TOLERANCE_M = 1.0, 5.0
"""and within these bounds, m (our own rule)."""
SPOT_M: Final = 100.0
"""An outline counts as the antenna's own spot up to this far, m; beyond it trees can grow on it (our own rule)."""
TOUCH_M: Final = 0.01
_INSIDE_M: Final = 1e-3
_BUILDING, _OTHER = COVER_KINDS.index("building"), COVER_KINDS.index("other")
ROOF_SOURCE: Final = "typed for the site"
SAME_SPOT_M: Final = 1e-6


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Standing:
    """What a ray must clear along a profile, the antennas' own buildings taken out; arrays of shape (n,)."""

    surface_m: NDArray[np.float64]
    cover_m: NDArray[np.float64]
    cover_kind: NDArray[np.int8]
    obstacle_index: NDArray[np.int32]
    own: NDArray[np.bool_]
    """Samples that belong to the spot an antenna stands on: the outline up to `SPOT_M`, else `NEAR_M`."""
    left_out_m: NDArray[np.float64]
    """Top of what was left out, m above sea level; -inf where nothing was."""
    ignored: tuple[Ignored, ...]


def own_outlines(profile: PathProfile, end: EndName) -> tuple[int, ...]:
    """Indices of the building outlines that hold the end of the path."""
    return tuple(
        index
        for index, obstacle in enumerate(profile.obstacles)
        if obstacle.kind == "building"
        and obstacle.source != ROOF_SOURCE
        and (obstacle.from_m <= TOUCH_M if end == "A" else obstacle.to_m >= profile.length_m - TOUCH_M)
    )


def own_top_m(profile: PathProfile, end: EndName) -> NDArray[np.float64]:
    """Top of the outlines that hold the end, m above sea level, at each sample; -inf outside them. Shape (n,)."""
    return _top_m(profile, own_outlines(profile, end))[0]


def standing(profile: PathProfile) -> Standing:
    """Take the own buildings out of a profile.

    Inside an outline that holds the end, that outline is left out, and building (or unknown) cover no taller than it but for
    raster errors: what stands taller in it stays. Without an outline, cover within 10 m of the end, and within a tenth of the
    path, is left out, unless it was surveyed or lies on another obstacle. Trees over an outline, other obstacles of the
    user's file and the ground always stay.
    """
    cover = profile.cover_m.copy()
    kind = profile.cover_kind.copy()
    obstacle = profile.obstacle_index.copy()
    own = np.zeros(cover.shape, dtype=np.bool_)
    left_out = np.full(cover.shape, -np.inf)
    ignored: list[Ignored] = []
    near_m = min(NEAR_M, NEAR_SHARE * profile.length_m)
    ends: tuple[EndName, EndName] = ("A", "B")
    for end in ends:
        outlines = own_outlines(profile, end)
        from_end = profile.distance_m if end == "A" else profile.length_m - profile.distance_m
        if outlines:
            own_top, _ = _top_m(profile, outlines)
            inside = np.isfinite(own_top)
            own |= inside & (from_end <= SPOT_M)
            tolerance = np.minimum(np.maximum(ERRORS * profile.sigma_m, LEAST_TOLERANCE_M), MOST_TOLERANCE_M)
            house = (obstacle == -1) & ((kind == _BUILDING) | (kind == _OTHER))
            house &= profile.ground_m + cover <= own_top + tolerance
            for index in outlines:
                house |= obstacle == index
            out = inside & (cover > 0.0) & house
        else:
            inside = from_end <= near_m + SAME_SPOT_M
            own |= inside
            out = inside & (cover > 0.0) & (obstacle == -1) & (profile.measured != MEASURED_TOP)
        if not out.any():
            continue
        others = tuple(
            index
            for index, item in enumerate(profile.obstacles)
            if index not in outlines and item.source != ROOF_SOURCE
        )
        other_top, which = _top_m(profile, others)
        if not outlines:
            out &= ~np.isfinite(other_top)
            if not out.any():
                continue
        ignored.append(_ignored(profile, end, out, outlines))
        left_out[out] = np.maximum(left_out, profile.ground_m + cover)[out]
        # What the own building hid comes to light: another obstacle in its outline stays one.
        hidden = np.where(out, np.maximum(np.minimum(other_top - profile.ground_m, cover), 0.0), 0.0)
        shown = hidden > 0.0
        cover[out] = hidden[out]
        kind[out], obstacle[out] = 0, -1
        obstacle[shown] = which[shown]
        for index in others:
            kind[shown & (which == index)] = COVER_KINDS.index(profile.obstacles[index].kind)
    return Standing(
        surface_m=profile.ground_m + cover,
        cover_m=cover,
        cover_kind=kind,
        obstacle_index=obstacle,
        own=own,
        left_out_m=left_out,
        ignored=tuple(ignored),
    )


def with_roof_edge(
    profile: PathProfile, *, end: EndName, edge_m: float, top_amsl_m: float, parapet_m: float
) -> PathProfile:
    """The profile with a sample at the roof edge in front of an antenna, as an obstacle up to `top_amsl_m`.

    `edge_m` counts from that end. The obstacle is named 'parapet at A' or, without a parapet, 'roof edge of A'.
    """
    from_end = float(np.clip(edge_m, TOUCH_M, profile.length_m - TOUCH_M))
    at_m = from_end if end == "A" else profile.length_m - from_end
    profile = with_nodes(profile, (at_m,))
    index = int(np.argmin(np.abs(profile.distance_m - at_m)))
    ground = float(profile.ground_m[index])
    if top_amsl_m <= ground:
        return profile
    edge = PathObstacle(
        name=f"parapet at {end}" if parapet_m > 0.0 else f"roof edge of {end}",
        kind="building",
        from_m=at_m,
        to_m=at_m,
        top_amsl_m=top_amsl_m,
        height_m=top_amsl_m - ground,
        source=ROOF_SOURCE,
    )
    return replace(
        profile,
        obstacles=(*profile.obstacles, edge),
        cover_m=_changed(profile.cover_m, index, edge.height_m),
        surface_m=_changed(profile.surface_m, index, top_amsl_m),
        cover_kind=_changed(profile.cover_kind, index, _BUILDING),
        obstacle_index=_changed(profile.obstacle_index, index, len(profile.obstacles)),
        measured=_changed(profile.measured, index, MEASURED_TOP),
        sigma_m=_changed(profile.sigma_m, index, 0.0),
    )


def with_ground_at_end(profile: PathProfile, *, end: EndName, ground_amsl_m: float) -> PathProfile:
    """The profile with a measured ground level at one end; what stands on the ground there moves with it."""
    index = 0 if end == "A" else profile.distance_m.size - 1
    surface = ground_amsl_m + float(profile.cover_m[index])
    return replace(
        profile,
        ground_m=_changed(profile.ground_m, index, ground_amsl_m),
        surface_m=_changed(profile.surface_m, index, surface),
        measured=_changed(profile.measured, index, max(1, int(profile.measured[index]))),
        sigma_m=profile.sigma_m if profile.cover_m[index] > 0.0 else _changed(profile.sigma_m, index, 0.0),
    )


def with_nodes(profile: PathProfile, at_m: tuple[float, ...]) -> PathProfile:
    """The profile with samples at more distances, values interpolated; distances that it has already are left alone."""
    known = profile.distance_m
    new = np.asarray([at for at in at_m if np.abs(known - at).min() > SAME_SPOT_M], dtype=np.float64)
    if not new.size:
        return profile
    distance = np.sort(np.concatenate((known, new)))
    right = np.clip(np.searchsorted(known, distance), 1, known.size - 1)
    nearest = np.where(distance - known[right - 1] < known[right] - distance, right - 1, right)

    def between(values: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.interp(distance, known, values)

    longitude = between(np.rad2deg(np.unwrap(np.deg2rad(profile.longitude_deg))))
    ground, cover = between(profile.ground_m), between(profile.cover_m)
    return replace(
        profile,
        distance_m=distance,
        latitude_deg=between(profile.latitude_deg),
        longitude_deg=(longitude + 180.0) % 360.0 - 180.0,
        ground_m=ground,
        cover_m=cover,
        surface_m=ground + cover,
        cover_kind=profile.cover_kind[nearest],
        obstacle_index=profile.obstacle_index[nearest],
        source=profile.source[nearest],
        measured=profile.measured[nearest],
        sigma_m=between(profile.sigma_m),
    )


def _top_m(profile: PathProfile, indices: tuple[int, ...]) -> tuple[NDArray[np.float64], NDArray[np.int32]]:
    """Highest top of some obstacles at each sample, m above sea level, and whose it is; -inf and -1 outside them all."""
    top = np.full(profile.distance_m.shape, -np.inf)
    which = np.full(top.shape, -1, dtype=np.int32)
    for index in indices:
        item = profile.obstacles[index]
        inside = (profile.distance_m >= item.from_m - _INSIDE_M) & (profile.distance_m <= item.to_m + _INSIDE_M)
        # A level top is the same all over; one that follows the ground is nowhere higher above it than stated.
        level = np.minimum(item.top_amsl_m, profile.ground_m + item.height_m)
        higher = inside & (level > top)
        top[higher], which[higher] = level[higher], index
    return top, which


def _ignored(profile: PathProfile, end: EndName, out: NDArray[np.bool_], outlines: tuple[int, ...]) -> Ignored:
    at = profile.distance_m[out]
    if outlines:
        what = " and ".join(dict.fromkeys(profile.obstacles[index].name for index in outlines))
    else:
        kinds = {COVER_KINDS[int(code)] for code in profile.cover_kind[out]}
        words = {"tree": "trees", "building": "building", "other": "cover", "none": "cover"}
        what = " and ".join(sorted({words[kind] for kind in kinds}))
    return Ignored(
        end=end,
        from_m=float(at[0]),
        to_m=float(at[-1]),
        height_m=float(profile.cover_m[out].max()),
        what=what,
    )


def _changed(array: NDArray[Scalar], index: int, value: float) -> NDArray[Scalar]:
    copy = array.copy()
    copy[index] = value
    return copy
