"""What could govern a path at other heights, k, frequencies or ages of its trees: the peaks, at their true positions.

Chooses points of a closely sampled profile and works out no clearance: whoever shows them asks `need` again. Knows nothing of
pages.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.errors import FellspanError
from fellspan.links.assess import stood
from fellspan.links.causes import SEA_WITHIN_M, is_sea_level
from fellspan.links.own_building import Standing
from fellspan.links.site import Link
from fellspan.terrain.profile import PathProfile
from fellspan.terrain.terrain import Terrain
from fellspan.vocabulary import COVER_KINDS

Floats = NDArray[np.float64]

PARTS: Final = 16
"""The profile is looked at again at this part of the finest cell, as the engine does at its worst minima."""
NEAR_M: Final = 0.5
"""A top this near below one that could govern is looked at again too: between two samples it may stand higher, m."""
STRIPS: Final = 256
"""The path is cut into so many strips, narrower toward its ends, in each of which bulge and zone are as good as straight."""
LATER_YEARS: Final = 25.0
"""Trees are grown to this age as well, so that one which overtakes another is known."""
END_STRIPS, END_PARTS = 10, 8
"""The outermost strips, where the zone widens with the root of the distance, are cut into parts again."""
SPARE_M: Final = 0.002
"""A point that stands no higher than this above the line between its neighbours is not kept, m; near an end, where an antenna
must be raised by many times what is missing, less."""

GROUND, SEA = -1, -2
_COVER: Final = -3
"""Codes of what stands at a point: an index into obstacles, or one of these; `_COVER - kind` for cover of a kind."""
_TREE: Final = COVER_KINDS.index("tree")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class WhatIf:
    """Points of a path that can govern, arrays of shape (n,), rising in distance.

    `surface_m` is what a ray must clear, m above sea level, with trees grown by `growth_years`. In other years it is
    `surface_m + rate * (years - growth_years)` with `rate_before_m` for fewer years and `rate_after_m` for more, m a year.
    """

    distance_m: Floats
    surface_m: Floats
    rate_before_m: Floats
    rate_after_m: Floats
    is_tree: NDArray[np.bool_]
    what: NDArray[np.int32]
    """Index into `obstacles`, `GROUND`, `SEA`, or `cover_code` of a kind."""
    obstacles: tuple[str, ...]
    growth_years: float
    grows: bool
    """Whether the data state a rate of growth, and trees stand on the path."""


def cover_code(kind: str) -> int:
    """The code in `WhatIf.what` of cover of a kind that has no name of its own."""
    return next(_COVER - code for code, name in enumerate(COVER_KINDS) if name == kind)


def ages_of(terrain: Terrain) -> dict[float, Terrain]:
    """The terrain at the ages of its trees that are looked at, by years: once for all links of a study."""
    years = {0.0, LATER_YEARS} if terrain.grows else set()
    return {year: terrain.grown(year) for year in years - {terrain.growth_years}} | {terrain.growth_years: terrain}


def what_if_of(
    link: Link, profile: PathProfile, terrain: Terrain, *, ages: Mapping[float, Terrain] | None = None
) -> WhatIf | None:
    """The points of one link, looked at as closely as the engine looks at its worst minima.

    `profile` is that of the plan, `ages` what `ages_of` gives for `terrain`. None where the terrain, looked at so closely,
    refuses.
    """
    now = terrain.growth_years
    trees = bool((profile.cover_kind == _TREE).any()) or any(item.growth_m_per_year for item in profile.obstacles)
    looked_at = (ages_of(terrain) if ages is None else ages) if trees else {now: terrain}
    years = sorted(looked_at)
    try:
        closer = terrain.refine(profile, _windows(link, profile), step_m=profile.cell_m / PARTS)
        stands = {
            year: stood(link, closer if year == now else aged.resampled(closer)) for year, aged in looked_at.items()
        }
    except FellspanError:
        return None
    surfaces = [stands[year][1].surface_m for year in years]
    if any(surface.shape != surfaces[0].shape for surface in surfaces):
        years, surfaces = [now], [stands[now][1].surface_m]
    return _chosen(stands[now][0], stands[now][1], years, surfaces, now=now, grows=len(years) > 1)


def what_if_without_terrain(link: Link, profile: PathProfile, *, growth_years: float) -> WhatIf:
    """The points of one link from the samples of its plan alone: coarser, and with no rate of growth."""
    profile, stands, _, _ = stood(link, profile)
    return _chosen(profile, stands, [growth_years], [stands.surface_m], now=growth_years, grows=False)


def _chosen(
    profile: PathProfile, stands: Standing, years: list[float], surfaces: list[Floats], *, now: float, grows: bool
) -> WhatIf:
    distance = profile.distance_m
    strip = strips_along(distance)
    kept = [_upper(distance, surface, strip) for surface in surfaces]
    kept.append(_lowest(stands.surface_m, strip))
    index = np.unique(np.concatenate([*kept, [0, distance.size - 1]]))
    before, after = _rates(years, [surface[index] for surface in surfaces], now)
    kind = stands.cover_kind[index].astype(np.int32)
    sea = is_sea_level(profile) | (np.abs(profile.ground_m) <= SEA_WITHIN_M)
    bare = np.where(sea[index], SEA, GROUND)
    loose = np.where(stands.cover_m[index] > 0.0, _COVER - kind, bare)
    which = stands.obstacle_index[index]
    return WhatIf(
        distance_m=distance[index],
        surface_m=stands.surface_m[index],
        rate_before_m=before,
        rate_after_m=after,
        is_tree=kind == _TREE,
        what=np.where(which >= 0, which, loose).astype(np.int32),
        obstacles=tuple(item.name for item in profile.obstacles),
        growth_years=now,
        grows=grows,
    )


def strips_along(distance_m: Floats) -> NDArray[np.intp]:
    """Number of the strip of each distance from A: even parts of a half circle over the path, the outer ones cut finer."""
    share = np.clip(distance_m / distance_m[-1], 0.0, 1.0)
    along = np.arccos(1.0 - 2.0 * share) / np.pi * STRIPS
    fine = np.minimum(along, END_STRIPS) + np.maximum(along - (STRIPS - END_STRIPS), 0.0)
    whole = np.clip(along - END_STRIPS, 0.0, STRIPS - 2 * END_STRIPS)
    return np.asarray(np.floor(whole) + np.floor(fine * END_PARTS), dtype=np.intp)


def _windows(link: Link, profile: PathProfile) -> tuple[tuple[float, float], ...]:
    """Stretches worth a closer look: round each sample that could govern, and each top that comes near to one, trees or not."""
    profile, stands, _, _ = stood(link, profile)
    distance, strip = profile.distance_m, strips_along(profile.distance_m)
    # Near an antenna, where the zone is narrow, a hair counts.
    wanted = (strip < END_STRIPS * END_PARTS) | (strip > strip[-1] - END_STRIPS * END_PARTS)
    trees = stands.cover_kind == _TREE
    for surface in (stands.surface_m, np.where(trees, profile.ground_m, stands.surface_m))[: 2 if trees.any() else 1]:
        over = _over_neighbours(distance, surface)
        upper = _upper(distance, surface, strip, spare_m=(0.0,))
        below = np.interp(distance, distance[upper], surface[upper]) - surface
        wanted |= (over > SPARE_M) & (below < NEAR_M)
    index = np.flatnonzero(wanted)
    if not index.size:
        return ()
    low, high = distance[np.maximum(index - 1, 0)], distance[np.minimum(index + 1, distance.size - 1)]
    apart = np.flatnonzero(low[1:] > high[:-1])
    return tuple(zip(low[np.r_[0, apart + 1]].tolist(), high[np.r_[apart, index.size - 1]].tolist(), strict=True))


def _over_neighbours(distance_m: Floats, surface_m: Floats) -> Floats:
    """How far each sample stands above the line between its neighbours, m; 0 at the ends."""
    share = (distance_m[1:-1] - distance_m[:-2]) / (distance_m[2:] - distance_m[:-2])
    chord = surface_m[:-2] * (1.0 - share) + surface_m[2:] * share
    return np.concatenate(([0.0], surface_m[1:-1] - chord, [0.0]))


def _upper(
    distance_m: Floats, surface_m: Floats, strip: NDArray[np.intp], *, spare_m: tuple[float, ...] = (0.0, SPARE_M)
) -> NDArray[np.intp]:
    """The points that no line between two others of their strip passes above: whatever is asked, one of them governs.

    All points below the line between their neighbours go at once, and again until none does; what stands out by a hair only
    goes at last.
    """
    index = np.arange(distance_m.size)
    for spare in spare_m:
        while index.size > 2:
            before, here, after = index[:-2], index[1:-1], index[2:]
            share = (distance_m[here] - distance_m[before]) / (distance_m[after] - distance_m[before])
            chord = surface_m[before] * (1.0 - share) + surface_m[after] * share
            inner = (strip[before] == strip[here]) & (strip[here] == strip[after])
            over = np.where(inner, surface_m[here] - chord, np.inf)
            out = over <= spare
            if spare > 0.0:
                share = distance_m[here] / distance_m[-1]
                out = over <= spare * np.minimum(1.0, 10.0 * np.minimum(share, 1.0 - share))
                # One of two neighbours at a time, the lesser first: what is left of the other may then stand out.
                padded = np.concatenate(([np.inf], over, [np.inf]))
                out &= (over < padded[:-2]) & (over <= padded[2:])
            if not out.any():
                break
            index = np.delete(index, 1 + np.flatnonzero(out))
    return index


def _lowest(surface_m: Floats, strip: NDArray[np.intp]) -> NDArray[np.intp]:
    """The lowest point of each strip: between two peaks it tells whether they are one obstruction."""
    order = np.lexsort((surface_m, strip))
    return order[np.flatnonzero(np.r_[True, np.diff(strip[order]) > 0])]


def _rates(years: list[float], surfaces: list[Floats], now: float) -> tuple[Floats, Floats]:
    """Growth in a year before and after `now`, m, from what stands in several years; the rate holds beyond them."""
    at = years.index(now)
    flat = np.zeros(surfaces[0].shape)
    if len(years) == 1:
        return flat, flat
    slopes = [(surfaces[i + 1] - surfaces[i]) / (years[i + 1] - years[i]) for i in range(len(years) - 1)]
    before, after = slopes[max(at - 1, 0)], slopes[min(at, len(slopes) - 1)]
    return np.round(before, 6), np.round(after, 6)
