"""Pairs over made profiles for the tests of screening: profiles in all directions, and the bucket that they make."""

from dataclasses import dataclass, replace

import numpy as np
from made_profiles import profile_of

from fellspan.geodesy import geodesic
from fellspan.geodesy.position import Position
from fellspan.links.assess import Assessment, assess_profile, trees_in_zone
from fellspan.links.budget import tilt_deg
from fellspan.links.causes import is_sea_level
from fellspan.links.own_building import standing
from fellspan.links.site import Link, Site
from fellspan.screening.laid import LaidBucket
from fellspan.screening.pairs import Candidates, SiteColumns
from fellspan.terrain.profile import PathProfile

HUB = Position(latitude_deg=36.05, longitude_deg=-45.2)
MAST_M = 60.0
"""Of the hub, above ground."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Spot:
    """A place for an antenna, m above ground, and the path from the hub to it."""

    profile: PathProfile
    height_m: float


def spots(
    count: int,
    *,
    seed: int,
    longest_m: float = 40e3,
    shortest_m: float = 1000.0,
    rough_m: tuple[float, ...] = (0.0, 0.3, 2.0),
    n: int = 160,
) -> list[Spot]:
    """Paths of many kinds: rough or smooth, over sea in part, with trees and houses or without, short and long."""
    random = np.random.default_rng(seed)
    found = []
    for number in range(count):
        near = number % 7 == 3
        reach = (random.uniform(300.0, 700.0) if near else random.uniform(shortest_m, longest_m)) / 111e3
        angle = random.uniform(0.0, 2.0 * np.pi)
        place = Position(
            latitude_deg=HUB.latitude_deg + reach * np.cos(angle),
            longitude_deg=HUB.longitude_deg + reach * np.sin(angle) / np.cos(np.radians(HUB.latitude_deg)),
        )
        length = geodesic.inverse(HUB, place).distance_m
        samples = n - number % 3
        share = np.linspace(0.0, 1.0, samples)
        rough = random.choice(rough_m)
        ground = random.uniform(5.0, 900.0) + np.cumsum(random.normal(0.0, rough, samples))
        sea = np.zeros(samples, dtype=np.int16)
        if number % 4 == 0:
            wet = (share > 0.3) & (share < random.uniform(0.4, 1.1))
            ground, sea = np.where(wet, 0.0, ground), wet.astype(np.int16)
        covered = (number % 5 == 0) & (random.random(samples) < 0.2)
        cover = np.where(covered, random.uniform(2.0, 25.0, samples), 0.0)
        height_m = float(random.choice([3.0, 12.0, 40.0, 150.0]))
        if near:
            # A thin wood that reaches above the ray: the way through it is the cheaper one.
            at = samples // 2
            cover[at] = 0.5 * (ground[0] + MAST_M + ground[-1] + height_m) + 20.0 - ground[at]
        profile = profile_of(
            length,
            lambda _, level=ground: level,
            n=samples,
            cover=lambda _, height=cover: height,
            kind="building" if number % 10 == 0 else "tree",
            a=HUB,
            b=place,
            latitude_deg=HUB.latitude_deg + share * (place.latitude_deg - HUB.latitude_deg),
            longitude_deg=HUB.longitude_deg + share * (place.longitude_deg - HUB.longitude_deg),
            sources=("made_dtm.tif", "sea level"),
        )
        profile = replace(profile, source=sea)
        found.append(Spot(profile=profile, height_m=height_m))
    return found


def columns_of(sites: list[Site]) -> SiteColumns:
    """Sites above ground as columns."""
    return SiteColumns(
        name=tuple(site.name for site in sites),
        latitude_deg=np.array([site.position.latitude_deg for site in sites]),
        longitude_deg=np.array([site.position.longitude_deg for site in sites]),
        height_m=np.array([site.height_m for site in sites]),
        height_reference=np.zeros(len(sites), dtype=np.int8),
        roof_m=np.full(len(sites), np.nan),
    )


def directions_of(made: list[Spot], *, k: float) -> tuple[np.ndarray, np.ndarray]:
    """Bearing and tilt of the places from the hub, degrees."""
    bearing = [geodesic.inverse(HUB, spot.profile.b).bearing_ab_deg for spot in made]
    tilt = [
        tilt_deg(
            distance_m=spot.profile.length_m,
            from_amsl_m=float(spot.profile.ground_m[0]) + MAST_M,
            to_amsl_m=float(spot.profile.ground_m[-1]) + spot.height_m,
            k=k,
        )
        for spot in made
    ]
    return np.array(bearing), np.array(tilt)


def sites_of(made: list[Spot]) -> tuple[SiteColumns, SiteColumns]:
    """The hub and the places."""
    hub = Site(name="Beacon", position=HUB, height_m=MAST_M)
    places = [
        Site(name=f"Place {number}", position=spot.profile.b, height_m=spot.height_m)
        for number, spot in enumerate(made)
    ]
    return columns_of([hub]), columns_of(places)


def planned(candidates: Candidates, made: list[Spot], sector: np.ndarray) -> list[Assessment]:
    """What planning makes of each pair alone."""
    found = []
    for number, (spot, one) in enumerate(zip(made, sector.tolist(), strict=True)):
        link = Link(
            name=f"Beacon - Place {number}",
            a=Site(name="Beacon", position=HUB, height_m=float(candidates.hubs.height_m[0])),
            b=Site(name=f"Place {number}", position=spot.profile.b, height_m=spot.height_m),
            radio=candidates.radio,
            antenna_a=candidates.sectors[one].antenna,
            antenna_b=candidates.place_antenna,
            wanted_margin_db=candidates.wanted_margin_db,
            target_availability_percent=candidates.target_availability_percent,
        )
        found.append(assess_profile(link, spot.profile, candidates.settings))
    return found


def bucket_of(assessments: list[Assessment], sector: np.ndarray) -> LaidBucket:
    """The same pairs as one bucket; shorter paths repeat their last sample but one."""
    longest = max(one.profile.distance_m.size for one in assessments)
    stands = [standing(one.profile) for one in assessments]

    def stacked(arrays: list[np.ndarray]) -> np.ndarray:
        rows = [
            np.concatenate((array[:-1], np.repeat(array[-2:-1], longest - array.size), array[-1:])) for array in arrays
        ]
        return np.stack(rows)

    profiles = [one.profile for one in assessments]
    middles = [int(np.argmin(np.abs(one.distance_m - 0.5 * one.length_m))) for one in profiles]
    results = [one.result for one in assessments]
    count = len(assessments)
    return LaidBucket(
        row=np.arange(count),
        hub=np.zeros(count, dtype=np.int64),
        place=np.arange(count),
        sector=sector,
        length_m=np.array([one.length_m for one in profiles]),
        bearing_ab_deg=np.array([one.bearing_ab_deg for one in results]),
        bearing_ba_deg=np.array([one.bearing_ba_deg for one in results]),
        tilt_ab_deg=np.array([one.tilt_ab_deg for one in results]),
        tilt_ba_deg=np.array([one.tilt_ba_deg for one in results]),
        a_amsl_m=np.array([one.ends.a.antenna_amsl_m for one in results]),
        b_amsl_m=np.array([one.ends.b.antenna_amsl_m for one in results]),
        middle_latitude_deg=np.array([one.latitude_deg[at] for one, at in zip(profiles, middles, strict=True)]),
        middle_longitude_deg=np.array([one.longitude_deg[at] for one, at in zip(profiles, middles, strict=True)]),
        trees_in_zone=np.array([trees_in_zone(s, one.levels) for s, one in zip(stands, assessments, strict=True)]),
        distance_m=stacked([one.distance_m for one in profiles]),
        ground_m=stacked([one.ground_m for one in profiles]),
        surface_m=stacked([one.surface_m for one in stands]),
        cover_kind=stacked([one.cover_kind for one in stands]),
        is_sea=stacked([is_sea_level(one) for one in profiles]),
    )
