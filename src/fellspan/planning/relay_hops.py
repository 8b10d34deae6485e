"""One hop to many possible relay places, as arrays: the batch engine asked from an end of the link.

Turns a link and a set of places into what `screening` takes, and its columns into what the relay search asks: is the path
clear, and what margin is left. Holds no physics.
"""

from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Final, Literal

import numpy as np
from numpy.typing import NDArray

from fellspan.links.assess import AssessSettings
from fellspan.links.site import Aim, Antenna, Link, Site
from fellspan.screening.pairs import (
    HEIGHT_REFERENCES,
    PATH_VERDICTS,
    SIGNAL_VERDICTS,
    STATUSES,
    UNKNOWN,
    Candidates,
    Floats,
    PairResults,
    Sector,
    SiteColumns,
)
from fellspan.screening.screen import screen_pairs
from fellspan.terrain.terrain import Terrain

End = Literal["a", "b"]
Progress = Callable[[int, int, str], None]
CHUNK: Final = 4096
"""Pairs in one call of the engine; keeps memory level and the progress moving."""
NEARBY: Final = 25_000
"""Most hops of one end that come near an obstacle or a surveyed point: some 20 s."""
_CLEAR: Final = PATH_VERDICTS.index("clear")
_MEETS: Final = SIGNAL_VERDICTS.index("meets")
_DONE: Final = STATUSES.index("done")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class HopColumns:
    """What one hop is worth at each place, shape (n,)."""

    clear: NDArray[np.bool_]
    serves: NDArray[np.bool_]
    """Clear, and the signal meets what is wanted wherever levels are known."""
    margin_db: Floats
    """The lesser of both ends, NaN where levels are not known."""
    free_share: Floats
    """Least free share of the first zone under the criterion that governs."""

    @classmethod
    def of(cls, pairs: PairResults, *, margin_db: float) -> "HopColumns":
        margin = np.minimum(pairs.margin_at_hub_db, pairs.margin_at_place_db)
        clear = (pairs.status == _DONE) & (pairs.verdict == _CLEAR)
        meets = (pairs.signal_verdict == UNKNOWN) | (pairs.signal_verdict == _MEETS)
        return cls(
            clear=clear,
            serves=clear & meets & (np.isnan(margin) | (margin >= margin_db)),
            margin_db=margin,
            free_share=pairs.worst_fraction,
        )

    @property
    def worth(self) -> Floats:
        """The margin, or where levels are not known the free share of the zone."""
        return np.where(np.isnan(self.margin_db), self.free_share, self.margin_db)

    def chosen(self, which: NDArray[np.int64]) -> "HopColumns":
        """Some of them."""
        return HopColumns(
            clear=self.clear[which],
            serves=self.serves[which],
            margin_db=self.margin_db[which],
            free_share=self.free_share[which],
        )

    def of_some(self, which: NDArray[np.int64], count: int) -> "HopColumns":
        """These as the answers for places `which` of `count`; the others were not asked and serve nobody."""
        whole = HopColumns(
            clear=np.zeros(count, dtype=np.bool_),
            serves=np.zeros(count, dtype=np.bool_),
            margin_db=np.full(count, np.nan),
            free_share=np.full(count, np.nan),
        )
        for name in ("clear", "serves", "margin_db", "free_share"):
            getattr(whole, name)[which] = getattr(self, name)
        return whole


def chosen_places(places: SiteColumns, which: NDArray[np.int64]) -> SiteColumns:
    """Some of the places."""
    return SiteColumns(
        name=tuple(places.name[index] for index in which.tolist()),
        latitude_deg=places.latitude_deg[which],
        longitude_deg=places.longitude_deg[which],
        height_m=places.height_m[which],
        height_reference=places.height_reference[which],
        roof_m=places.roof_m[which],
    )


def near_things(end: Site, latitude_deg: Floats, longitude_deg: Floats, terrain: Terrain) -> int:
    """How many hops from an end to places, shape (n,), come near an obstacle or a surveyed point.

    The engine looks at these closely, up to a millisecond each; all others cost a tenth of that or less.
    """
    layers = terrain.many.layers
    east = np.remainder(longitude_deg - end.position.longitude_deg + 180.0, 360.0) - 180.0
    ends = end.position.longitude_deg, end.position.latitude_deg
    longitude, latitude = (
        np.stack([np.full(way.shape, start), start + way], axis=1)
        for start, way in zip(ends, (east, latitude_deg - end.position.latitude_deg), strict=True)
    )
    return int((layers.obstacles.meets(longitude, latitude) | layers.survey.meets(longitude, latitude)).sum())


def affordable(
    ends: tuple[Site, ...], latitude_deg: Floats, longitude_deg: Floats, terrain: Terrain, *, most: int
) -> int:
    """How many of these places may be judged: `most`, or fewer where many come near an obstacle or a surveyed point."""
    slow = max(near_things(end, latitude_deg, longitude_deg, terrain) for end in ends)
    if slow <= NEARBY:
        return most
    return min(most, max(1, latitude_deg.size * NEARBY // slow))


def columns_of(sites: tuple[Site, ...]) -> SiteColumns:
    """Sites as columns; roof edges and measured levels stay behind, the full plan of a relay brings them back."""
    return SiteColumns(
        name=tuple(site.name for site in sites),
        latitude_deg=np.array([site.position.latitude_deg for site in sites]),
        longitude_deg=np.array([site.position.longitude_deg for site in sites]),
        height_m=np.array([site.height_m for site in sites]),
        height_reference=np.array([HEIGHT_REFERENCES.index(site.height_reference) for site in sites], dtype=np.int8),
        roof_m=np.array([np.nan if site.roof_m is None else site.roof_m for site in sites]),
    )


def aimed_anew(antenna: Antenna) -> Antenna:
    """The same antenna turned to whatever the other end of its hop is; polarization and roll stay."""
    mounting = antenna.mounting
    if mounting is None:
        return antenna
    return replace(antenna, mounting=Aim(polarization=mounting.polarization, roll_deg=mounting.roll_deg))


def hop_link(link: Link, *, name: str, a: Site, b: Site) -> Link:
    """One hop of a chain with the radio, the antennas and the wishes of the link."""
    return replace(
        link, name=name, a=a, b=b, antenna_a=aimed_anew(link.antenna_a), antenna_b=aimed_anew(link.antenna_b)
    )


def screen_hop(
    link: Link,
    *,
    end: End | Site,
    places: SiteColumns,
    terrain: Terrain,
    settings: AssessSettings,
    margin_db: float,
    growth_years: float = 0.0,
    progress: Callable[[int], None] | None = None,
) -> HopColumns:
    """The hop from end 'a' or 'b' of the link (or from another site, with A's antenna) to each place."""
    site = link.a if end == "a" else link.b if end == "b" else end
    turned = link if end != "b" else replace(link, antenna_a=link.antenna_b, antenna_b=link.antenna_a)
    return screen_between(
        turned,
        near=columns_of((site,)),
        far=places,
        pairs=(np.zeros(len(places.name), dtype=np.int64), np.arange(len(places.name), dtype=np.int64)),
        terrain=terrain,
        settings=settings,
        margin_db=margin_db,
        growth_years=growth_years,
        progress=progress,
    )


def screen_between(
    link: Link,
    *,
    near: SiteColumns,
    far: SiteColumns,
    pairs: tuple[NDArray[np.int64], NDArray[np.int64]],
    terrain: Terrain,
    settings: AssessSettings,
    margin_db: float,
    growth_years: float = 0.0,
    progress: Callable[[int], None] | None = None,
) -> HopColumns:
    """The hops of pairs, as numbers in `near` (which gets the antenna of end A) and in `far` (B's)."""
    candidates = Candidates(
        hubs=near,
        places=far,
        sectors=tuple(Sector(hub=hub, name="", antenna=aimed_anew(link.antenna_a)) for hub in range(len(near.name))),
        place_antenna=aimed_anew(link.antenna_b),
        radio=link.radio,
        settings=settings,
        wanted_margin_db=link.wanted_margin_db,
        target_availability_percent=link.target_availability_percent,
        power_rule=link.power_rule,
        growth_years=growth_years,
    )
    one, two = pairs
    parts = []
    for first in range(0, one.size, CHUNK):
        part = slice(first, min(first + CHUNK, one.size))
        found = screen_pairs(candidates, hub=one[part], place=two[part], terrain=terrain)
        parts.append(HopColumns.of(found, margin_db=margin_db))
        if progress is not None:
            progress(part.stop)
    if not parts:
        nothing = np.zeros(0)
        return HopColumns(clear=nothing > 0, serves=nothing > 0, margin_db=nothing, free_share=nothing)
    return HopColumns(
        clear=np.concatenate([part.clear for part in parts]),
        serves=np.concatenate([part.serves for part in parts]),
        margin_db=np.concatenate([part.margin_db for part in parts]),
        free_share=np.concatenate([part.free_share for part in parts]),
    )
