"""The ends of paths on which obstacles and survey count: antennas on outlines, own buildings out, doubts about roofs.

`links.ends` and `links.own_building` on arrays where no outline holds an end, and asked themselves where one does.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fellspan.geodesy.position import Position
from fellspan.links.ends import ROOF_DOUBT_M
from fellspan.links.own_building import ERRORS, NEAR_M, NEAR_SHARE, SAME_SPOT_M, TOUCH_M, standing
from fellspan.screening.near_overlay import OnPath, Overlaid
from fellspan.screening.pairs import SiteColumns
from fellspan.screening.profiles import Profiles
from fellspan.screening.stand import Antennas, Standings, antennas_at, roof_doubts
from fellspan.terrain.obstacles import JOIN_M
from fellspan.terrain.profile import MEASURED_TOP, PathObstacle, PathProfile
from fellspan.vocabulary import COVER_KINDS

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Index = NDArray[np.int64]

_BUILDING = COVER_KINDS.index("building")
_LEAST_ROOF_M = 1e-9
_SOMEWHERE = Position(latitude_deg=0.0, longitude_deg=0.0)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Outlines:
    """The building outlines that hold ends of paths, (q,): whether any does, and the top of the highest, m above sea level."""

    holds_a: Flags
    holds_b: Flags
    top_a_m: Floats
    top_b_m: Floats

    @classmethod
    def of(cls, over: Overlaid, on: Sequence[OnPath]) -> "Outlines":
        """Of profiles and what stands on each of their paths."""
        count = len(on)
        holds, top = np.zeros((2, count), dtype=np.bool_), np.full((2, count), -np.inf)
        length, ground = over.profiles.length_m, over.profiles.ground_m
        for row, path in enumerate(on):
            for one in path.standing:
                shown = one.shown
                if shown.kind != "building":
                    continue
                for end, (at_m, column) in enumerate(((0.0, 0), (float(length[row]), -1))):
                    if not (shown.from_m <= TOUCH_M if end == 0 else shown.to_m >= at_m - TOUCH_M):
                        continue
                    holds[end, row] = True
                    if shown.from_m - JOIN_M <= at_m <= shown.to_m + JOIN_M:
                        level = min(shown.top_amsl_m, float(ground[row, column]) + shown.height_m)
                        top[end, row] = max(top[end, row], level)
        return cls(holds_a=holds[0], holds_b=holds[1], top_a_m=top[0], top_b_m=top[1])

    def rows(self, rows: Index | Flags) -> "Outlines":
        """Those of some paths."""
        return Outlines(
            holds_a=self.holds_a[rows],
            holds_b=self.holds_b[rows],
            top_a_m=self.top_a_m[rows],
            top_b_m=self.top_b_m[rows],
        )

    def at(self, profiles: Profiles, *, at_a: bool) -> tuple[Flags, Floats]:
        """Whether one holds this end, and how high it is there above the ground, (q,)."""
        holds, top = (self.holds_a, self.top_a_m) if at_a else (self.holds_b, self.top_b_m)
        return holds, np.maximum(top - profiles.ground_m[:, 0 if at_a else -1], 0.0)


def near_antennas(
    sites: SiteColumns, index: Index, over: Overlaid, outlines: Outlines, *, at_a: bool, ground_is_bare: bool
) -> Antennas:
    """As `antennas_at`; the roof is that of the outline the antenna stands in."""
    profiles, end = over.profiles, 0 if at_a else -1
    holds, roof = outlines.at(profiles, at_a=at_a)
    # An outline without height is a roof, too.
    cover = np.where(holds, np.maximum(roof, _LEAST_ROOF_M), over.cover_m[:, end])[:, np.newaxis]
    kind = np.where(holds, _BUILDING, over.cover_kind[:, end]).astype(np.int8)[:, np.newaxis]
    ground = profiles.ground_m[:, end][:, np.newaxis]
    there = replace(profiles, ground_m=ground, cover_m=cover, cover_kind=kind)
    return antennas_at(sites, index, there, at_a=at_a, ground_is_bare=ground_is_bare)


def near_roof_doubts(antennas: Antennas, over: Overlaid, outlines: Outlines, *, at_a: bool) -> Flags:
    """As `roof_doubts`, over bare ground; an outline that holds the end speaks for what stands there."""
    profiles = over.profiles
    holds, held = outlines.at(profiles, at_a=at_a)
    sigma = profiles.sigma_m[:, 0 if at_a else -1]
    with np.errstate(invalid="ignore"):
        above = (held > 0.0) & (antennas.roof_m - held > ROOF_DOUBT_M + ERRORS * sigma)
    return np.where(holds, above, roof_doubts(antennas, profiles, at_a=at_a))


def near_standings(over: Overlaid, on: Sequence[OnPath], outlines: Outlines) -> tuple[Standings, Flags]:
    """As `standings`, and which samples belong to the spots that antennas stand on, (q, n)."""
    profiles = over.profiles
    near = np.minimum(NEAR_M, NEAR_SHARE * profiles.length_m)[:, np.newaxis] + SAME_SPOT_M
    distance = profiles.distance_m
    own = (distance <= near) | (profiles.length_m[:, np.newaxis] - distance <= near)
    surface, kind = profiles.ground_m + over.cover_m, over.cover_kind.copy()
    out = own & (over.cover_m > 0.0) & (over.obstacle < 0) & ~over.inside
    if over.measured is not None:
        out &= over.measured != MEASURED_TOP
    left_out = np.where(out, surface, -np.inf)
    surface = np.where(out, profiles.ground_m, surface)
    kind[out] = 0
    for row in np.flatnonzero(outlines.holds_a | outlines.holds_b).tolist():
        count = int(profiles.last[row])
        columns = _columns_at_ends(profiles, row, [one.shown for one in on[row].standing])
        stands = standing(_profile(over, row, columns, on[row]))
        surface[row, columns], kind[row, columns] = stands.surface_m, stands.cover_kind
        left_out[row, columns], own[row, columns] = stands.left_out_m, stands.own
        out[row, columns] = np.isfinite(stands.left_out_m) & (stands.cover_m == 0.0)
        # What fills the row up repeats the last sample but one.
        for values in (surface, kind, left_out, own, out):
            values[row, count:-1] = values[row, count - 1]
    if not np.isfinite(left_out).any():
        return Standings(surface_m=surface, cover_kind=kind, left_out_m=None, bared=None), own
    return Standings(surface_m=surface, cover_kind=kind, left_out_m=left_out, bared=out), own


def _columns_at_ends(profiles: Profiles, row: int, shown: Sequence[PathObstacle]) -> Index:
    """The samples of one path in outlines that hold its ends, and those so near to them that cover there may be left out."""
    count, length = int(profiles.last[row]), float(profiles.length_m[row])
    houses = [one for one in shown if one.kind == "building"]
    near = min(NEAR_M, NEAR_SHARE * length)
    to_m = max([near, *(one.to_m for one in houses if one.from_m <= TOUCH_M)])
    from_m = min([length - near, *(one.from_m for one in houses if one.to_m >= length - TOUCH_M)])
    distance = profiles.distance_m[row, :count]
    first = int(distance.searchsorted(to_m + 2.0 * JOIN_M, side="right"))
    second = max(int(distance.searchsorted(from_m - 2.0 * JOIN_M)), first)
    return np.concatenate((np.arange(first), np.arange(second, count), [profiles.distance_m.shape[1] - 1]))


def _profile(over: Overlaid, row: int, taken: Index, on: OnPath) -> PathProfile:
    """Samples of one path as `own_building.standing` takes them; where on Earth they are does not matter to it."""
    profiles = over.profiles
    distance, ground, cover = profiles.distance_m[row, taken], profiles.ground_m[row, taken], over.cover_m[row, taken]
    nowhere = np.zeros(taken.size)
    measured = np.zeros(taken.size, dtype=np.int8) if over.measured is None else over.measured[row, taken]
    return PathProfile(
        a=_SOMEWHERE,
        b=_SOMEWHERE,
        distance_m=distance,
        latitude_deg=nowhere,
        longitude_deg=nowhere,
        ground_m=ground,
        cover_m=cover,
        cover_kind=over.cover_kind[row, taken],
        obstacle_index=over.obstacle[row, taken],
        surface_m=ground + cover,
        source=profiles.source[row, taken],
        measured=measured,
        sigma_m=profiles.sigma_m[row, taken],
        sources=(),
        obstacles=tuple(one.shown for one in on.standing),
        gaps=(),
        step_m=float(profiles.cell_m[row]),
        cell_m=float(profiles.cell_m[row]),
        ground_is_bare=True,
        surface_is_known=False,
        vertical_datum=None,
    )
