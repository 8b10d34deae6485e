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
from fellspan.links.criteria import rule_numbers
from fellspan.links.site import Aim, Antenna, Link, Site
from fellspan.propagation.fresnel import fresnel_radius_m
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
AMPLE_DB: Final = 10.0
"""What a hop must have beyond the margin wanted before places are told apart by clearance (our own rule)."""
AMPLE_M: Final = 10.0
"""Height to spare from which the margin tells them apart again: else the highest hill would win, however far off."""
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
    spare_m: Floats
    """Height to spare there, m; an obstruction is taken for extended where the preset tells the two apart."""

    @classmethod
    def of(cls, pairs: PairResults, *, margin_db: float, settings: AssessSettings, frequency_hz: float) -> "HopColumns":
        """What the engine found, for a hop that must keep `margin_db`."""
        margin = np.minimum(pairs.margin_at_hub_db, pairs.margin_at_place_db)
        clear = (pairs.status == _DONE) & (pairs.verdict == _CLEAR)
        meets = (pairs.signal_verdict == UNKNOWN) | (pairs.signal_verdict == _MEETS)
        return cls(
            clear=clear,
            serves=clear & meets & (np.isnan(margin) | (margin >= margin_db)),
            margin_db=margin,
            free_share=pairs.worst_fraction,
            spare_m=spare_height_m(pairs, settings=settings, frequency_hz=frequency_hz),
        )

    def worth(self, wanted_db: float) -> Floats:
        """What places are ranked by, higher is better: a scarce margin, then the height to spare, then the margin again.

        A margin of `wanted_db` and `AMPLE_DB` more is ample: up to `AMPLE_M`, clearance is worth more than more of it. The
        worth of a chain is the least of its hops. Where levels are not known, the height to spare alone counts.
        """
        beyond_db = self.margin_db - (wanted_db + AMPLE_DB)
        spare_m = np.fmax(self.spare_m, 0.0)
        ample = np.where(spare_m < AMPLE_M, spare_m, AMPLE_M + beyond_db)
        return np.where(np.isnan(beyond_db), spare_m, np.where(beyond_db < 0.0, beyond_db, ample))

    def chosen(self, which: NDArray[np.int64]) -> "HopColumns":
        """Some of them."""
        return HopColumns(
            clear=self.clear[which],
            serves=self.serves[which],
            margin_db=self.margin_db[which],
            free_share=self.free_share[which],
            spare_m=self.spare_m[which],
        )

    def of_some(self, which: NDArray[np.int64], count: int) -> "HopColumns":
        """These as the answers for places `which` of `count`; the others were not asked and serve nobody."""
        whole = HopColumns(
            clear=np.zeros(count, dtype=np.bool_),
            serves=np.zeros(count, dtype=np.bool_),
            margin_db=np.full(count, np.nan),
            free_share=np.full(count, np.nan),
            spare_m=np.full(count, np.nan),
        )
        for name in ("clear", "serves", "margin_db", "free_share", "spare_m"):
            getattr(whole, name)[which] = getattr(self, name)
        return whole


def spare_height_m(pairs: PairResults, *, settings: AssessSettings, frequency_hz: float) -> Floats:
    """Height to spare at the point that governs, m, shape (n,); NaN where the path was not judged."""
    length_m = pairs.distance_m
    if settings.criteria:
        asked = np.array([rule.fraction for rule in settings.criteria])[np.maximum(pairs.governing, 0)]
    else:
        fractions = rule_numbers(settings.preset, distance_m=length_m, median_k=settings.median_k)[1]
        asked = fractions[np.maximum(pairs.governing, 0), np.arange(length_m.size)]
    radius_m = np.asarray(
        fresnel_radius_m(pairs.worst_at_m, np.maximum(length_m - pairs.worst_at_m, 0.0), frequency_hz=frequency_hz)
    )
    return np.asarray((pairs.worst_fraction - asked) * radius_m, dtype=np.float64)


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
        parts.append(HopColumns.of(found, margin_db=margin_db, settings=settings, frequency_hz=link.radio.frequency_hz))
        if progress is not None:
            progress(part.stop)
    if not parts:
        nothing = np.zeros(0)
        return HopColumns(clear=nothing > 0, serves=nothing > 0, margin_db=nothing, free_share=nothing, spare_m=nothing)
    return HopColumns(
        clear=np.concatenate([part.clear for part in parts]),
        serves=np.concatenate([part.serves for part in parts]),
        margin_db=np.concatenate([part.margin_db for part in parts]),
        free_share=np.concatenate([part.free_share for part in parts]),
        spare_m=np.concatenate([part.spare_m for part in parts]),
    )
