"""The beam's footprint: where on flat ground a tilted antenna's main lobe stays above a level, as outlines and distances.

Flat ground and straight rays: for coverage close by, not for links. Knows nothing of drawings.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.facts import cut as cut_of
from fellspan.antennas.facts import cut_facts, facts_of
from fellspan.antennas.mounting import Mounting, off_boresight_deg
from fellspan.antennas.parts import check
from fellspan.antennas.pattern import Pattern
from fellspan.antennas.sphere import direction_from_boresight
from fellspan.errors import AntennaError

LEVELS_DB = (-3.0, -6.0, -10.0)
"""Levels below the greatest gain that are outlined where nothing else is asked."""
_TURNS = 400


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Contour:
    """Where the main lobe falls to one level; arrays of shape (n,), m, read-only, the antenna's foot at 0, 0.

    `near_m` and `far_m` are the nearest and farthest ground within the outline straight ahead; `far_m` is None where the
    lobe reaches beyond `reach_m` of the footprint; both are None where the outline does not cross the line ahead.
    `width_m` is the greatest width across (the diameter of an omni's ring), None where it is cut at the reach.
    """

    level_db: float
    ahead_m: NDArray[np.float64]
    right_m: NDArray[np.float64]
    near_m: float | None
    far_m: float | None
    width_m: float | None

    def __post_init__(self) -> None:
        self.ahead_m.flags.writeable = False
        self.right_m.flags.writeable = False


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Footprint:
    """Outlines of equal gain on flat ground, the widest last; `centre_m` is where the boresight meets it (None: it does not).

    Of an omni, each outline is a ring: `is_ring` is True, and the contours hold the outer edge.
    """

    height_m: float
    tilt_deg: float
    reach_m: float
    centre_m: float | None
    is_ring: bool
    contours: tuple[Contour, ...]


def footprint(
    pattern: Pattern,
    *,
    height_m: float,
    tilt_deg: float,
    levels_db: Sequence[float] = LEVELS_DB,
    reach_m: float | None = None,
) -> Footprint:
    """Outline the main lobe on flat ground.

    Parameters
    ----------
    pattern
        In its own frame; mounted without a turn.
    height_m
        Of the antenna above the ground, m, above 0 to 10,000.
    tilt_deg
        Of the boresight, up is positive, -90 to 90.
    levels_db
        Relative to the greatest gain, below 0.
    reach_m
        Ground farther than this is left out; None takes what holds the half-power outline, at most 300 heights or 3 km.

    Raises
    ------
    AntennaError
        A value is out of range, or no part of the outlines meets the ground within the reach.
    """
    check("height", height_m, 0.01, 10_000.0, "m")
    check("tilt", tilt_deg, -90.0, 90.0, "degrees")
    if any(not -60.0 <= level < 0.0 for level in levels_db):
        raise AntennaError(
            f"footprint levels {', '.join(f'{level:g}' for level in levels_db)} dB are not all -60 to below 0"
        )
    facts = facts_of(pattern)
    is_ring = facts.azimuth.half_power_deg is None
    most = max(300.0 * height_m, 3000.0)
    if is_ring:
        lobes = [_ring_directions(pattern, level, tilt_deg) for level in levels_db]
    else:
        lobes = _lobe_directions(pattern, levels_db, tilt_deg)
    reach = _reach_m(lobes[0], height_m, most) if reach_m is None else reach_m
    contours = [
        _ring(level, lobe, height_m, reach) if is_ring else _outline(level, lobe, height_m, reach)
        for level, lobe in zip(levels_db, lobes, strict=True)
    ]
    found = tuple(contour for contour in contours if contour is not None)
    if not found:
        raise AntennaError(
            f"the beam of '{pattern.name}', {height_m:g} m up, tilt {tilt_deg:g} degrees, meets no ground within {reach:.0f} m",
            "tilt it down (a negative tilt) or lower it",
        )
    down = tilt_deg + (facts.elevation.peak_deg if not pattern.turns else 0.0)
    return Footprint(
        height_m=height_m,
        tilt_deg=tilt_deg,
        reach_m=reach,
        centre_m=height_m / math.tan(math.radians(-down)) if -90.0 < down < 0.0 else None,
        is_ring=is_ring,
        contours=found,
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Lobe:
    """Edge of a lobe as bearings off the boresight and elevations on the ground frame, degrees."""

    bearing_deg: NDArray[np.float64]
    elevation_deg: NDArray[np.float64]
    low_deg: float | None
    high_deg: float | None


def _lobe_directions(pattern: Pattern, levels_db: Sequence[float], tilt_deg: float) -> list[_Lobe]:
    """The main lobe is taken as star-shaped about its maximum: the first fall below the level in each direction counts."""
    facts = facts_of(pattern)
    centre_up = math.radians(facts.elevation.peak_deg)
    widths = [width for width in (facts.azimuth.half_power_deg, facts.elevation.half_power_deg) if width is not None]
    angles = np.radians(np.concatenate(([0.0], np.geomspace(max(min(widths) / 40.0, 0.002), 179.0, 500))))
    # Even steps along an ellipse as wide and high as the beam, so that the ends of a flat fan are as fine as its middle.
    wide, high = facts.azimuth.half_power_deg or 360.0, facts.elevation.half_power_deg or 360.0
    even = np.linspace(0.0, 2.0 * math.pi, _TURNS + 1)
    turn = np.arctan2(high * np.sin(even), wide * np.cos(even))
    azimuth, elevation = _tilted(*direction_from_boresight(angles[None, :], turn[:, None]), centre_up)
    gain = np.asarray(pattern.gain_dbi(np.degrees(azimuth), np.degrees(elevation)))
    rows = np.arange(turn.size)
    found = []
    for level_db in levels_db:
        limit = float(gain[0, 0]) + level_db
        below = gain < limit
        below[:, -1] = True
        after = np.argmax(below, axis=1)
        upper, lower = gain[rows, after - 1], gain[rows, after]
        share = np.clip((upper - limit) / np.maximum(upper - lower, 1e-12), 0.0, 1.0)
        edge = angles[after - 1] + share * (angles[after] - angles[after - 1])
        azimuth, elevation = _tilted(*direction_from_boresight(edge, turn), centre_up)
        bearing, up = _tilted(azimuth, elevation, math.radians(tilt_deg))
        lowest, highest = _ahead(pattern, level_db, tilt_deg)
        found.append(
            _Lobe(bearing_deg=np.degrees(bearing), elevation_deg=np.degrees(up), low_deg=lowest, high_deg=highest)
        )
    return found


def _tilted(
    azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64], up_rad: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Directions given about an axis that is tilted up, in the frame in which it is tilted."""
    azimuth, elevation = off_boresight_deg(
        Mounting(bearing_deg=0.0, tilt_deg=-math.degrees(up_rad)), np.degrees(azimuth_rad), np.degrees(elevation_rad)
    )
    return np.radians(azimuth), np.radians(elevation)


def _ahead(pattern: Pattern, level_db: float, tilt_deg: float) -> tuple[float, float]:
    """Lower and upper elevation, degrees, at which the lobe straight ahead falls to the level; read along the vertical cut."""
    data = cut_of(pattern, "vertical")
    top = int(np.argmin(np.abs(data.angle_deg - cut_facts(data).peak_deg)))
    limit = data.gain_dbi[top] + level_db
    edges = []
    for side in (-1, 1):
        run, at = data.gain_dbi[top::side], data.angle_deg[top::side]
        below = np.flatnonzero(run < limit)
        if below.size == 0:
            edges.append(float(at[-1]))
            continue
        index = int(below[0])
        share = (run[index - 1] - limit) / (run[index - 1] - run[index])
        edges.append(float(at[index - 1] + share * (at[index] - at[index - 1])))
    return edges[0] + tilt_deg, edges[1] + tilt_deg


def _ring_directions(pattern: Pattern, level_db: float, tilt_deg: float) -> _Lobe:
    """An omni stands upright: its tilt is electrical or none, and a mechanical one is taken all around."""
    low, high = _ahead(pattern, level_db, tilt_deg)
    bearing = np.linspace(-180.0, 180.0, _TURNS + 1)
    return _Lobe(bearing_deg=bearing, elevation_deg=np.full(bearing.shape, high), low_deg=low, high_deg=high)


def _on_ground_m(elevation_deg: float, height_m: float) -> float | None:
    """How far away a ray at this elevation meets the ground; None where it does not. Steeper than 90 degrees is behind."""
    if elevation_deg >= 0.0 or elevation_deg <= -180.0:
        return None
    return height_m / math.tan(math.radians(-elevation_deg)) if elevation_deg != -90.0 else 0.0


def _reach_m(lobe: _Lobe, height_m: float, most_m: float) -> float:
    near, far = (None if at is None else _on_ground_m(at, height_m) for at in (lobe.low_deg, lobe.high_deg))
    if far is not None and far < most_m / 1.25:
        return max(1.25 * far, 4.0 * height_m)
    # Open ahead: far enough to show how it opens.
    return most_m if near is None else min(max(6.0 * near, 4.0 * height_m), most_m)


def _outline(level_db: float, lobe: _Lobe, height_m: float, reach_m: float) -> Contour | None:
    least = math.degrees(math.atan(height_m / reach_m))
    if float(np.min(lobe.elevation_deg)) > -least:
        return None
    down = np.maximum(-lobe.elevation_deg, least)
    away = height_m / np.tan(np.radians(np.minimum(down, 90.0)))
    bearing = np.radians(lobe.bearing_deg)
    ahead, right = away * np.cos(bearing), away * np.sin(bearing)
    near, far = (None if at is None else _on_ground_m(at, height_m) for at in (lobe.low_deg, lobe.high_deg))
    return Contour(
        level_db=level_db,
        ahead_m=ahead,
        right_m=right,
        near_m=near if near is not None and near <= reach_m else None,
        far_m=far if far is not None and far <= reach_m else None,
        width_m=None if bool(np.any(down <= least)) else float(np.max(right) - np.min(right)),
    )


def _ring(level_db: float, lobe: _Lobe, height_m: float, reach_m: float) -> Contour | None:
    near, far = (None if at is None else _on_ground_m(at, height_m) for at in (lobe.low_deg, lobe.high_deg))
    if near is None or near > reach_m:
        return None
    outer = reach_m if far is None or far > reach_m else far
    bearing = np.radians(lobe.bearing_deg)
    return Contour(
        level_db=level_db,
        ahead_m=outer * np.cos(bearing),
        right_m=outer * np.sin(bearing),
        near_m=max(near, 0.0),
        far_m=far if far is not None and far <= reach_m else None,
        width_m=None if far is None or far > reach_m else 2.0 * far,
    )
