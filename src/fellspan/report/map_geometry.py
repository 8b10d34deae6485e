"""Places on the map: paths, stretches, zones and names in degrees, longitudes running on across the antimeridian."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.geodesy.geodesic import WGS84_GEOD
from fellspan.planning.plan import LinkPlan
from fellspan.report.relief import MapWindow, mercator_y

Places = list[tuple[float, float]]
"""Latitude and longitude pairs, as the map library takes them."""
POINT_EVERY_M = 10_000.0
"""A geodesic leaves a straight line on the map by about 2 m between points so far apart; more points show as kinks."""
MOST_POINTS = 257
ZONE_POINTS = 41


@dataclass(frozen=True, slots=True, kw_only=True)
class SiteMark:
    """A site as the map shows it; `side` is the compass side on which its name stands, away from its links."""

    name: str
    latitude_deg: float
    longitude_deg: float
    side: str
    links: tuple[int, ...]


def nearest_turn(longitude_deg: float, reference_deg: float) -> float:
    """The longitude that is the same place and nearest to the reference."""
    return longitude_deg + 360.0 * round((reference_deg - longitude_deg) / 360.0)


def _along(plan: LinkPlan, at_m: NDArray[np.float64], reference_deg: float) -> tuple[NDArray[np.float64], ...]:
    profile = plan.profile
    longitude = np.unwrap(profile.longitude_deg, period=360.0)
    longitude = longitude + (nearest_turn(float(longitude[0]), reference_deg) - float(longitude[0]))
    return np.interp(at_m, profile.distance_m, profile.latitude_deg), np.interp(at_m, profile.distance_m, longitude)


def _pairs(latitude: NDArray[np.float64], longitude: NDArray[np.float64]) -> Places:
    return [(round(y, 7), round(x, 7)) for y, x in zip(latitude.tolist(), longitude.tolist(), strict=True)]


def _count(length_m: float) -> int:
    return min(MOST_POINTS, 2 + int(length_m / POINT_EVERY_M))


def places(plan: LinkPlan, at_m: NDArray[np.float64], reference_deg: float) -> Places:
    """Places at distances from A, m."""
    return _pairs(*_along(plan, at_m, reference_deg))


def path(plan: LinkPlan, reference_deg: float) -> Places:
    """The geodesic, ends exact."""
    return _pairs(*_along(plan, np.linspace(0.0, plan.profile.length_m, _count(plan.profile.length_m)), reference_deg))


def stretch(plan: LinkPlan, from_m: float, to_m: float, reference_deg: float) -> Places:
    """A part of the path; one that has no length is given a little, so that it is seen."""
    least = plan.profile.length_m / 200.0
    if to_m - from_m < least:
        middle = (from_m + to_m) / 2.0
        from_m, to_m = max(0.0, middle - least / 2.0), min(plan.profile.length_m, middle + least / 2.0)
    return _pairs(*_along(plan, np.linspace(from_m, to_m, _count(to_m - from_m)), reference_deg))


def point(plan: LinkPlan, at_m: float, reference_deg: float) -> tuple[float, float]:
    """One place on the path."""
    return _pairs(*_along(plan, np.array([at_m]), reference_deg))[0]


def zone(plan: LinkPlan, reference_deg: float) -> Places:
    """Outline of the first Fresnel zone seen from above."""
    levels = plan.levels
    at = 0.5 * plan.profile.length_m * (1.0 - np.cos(np.linspace(0.0, np.pi, ZONE_POINTS)))
    radius = np.interp(at, levels.distance_m, levels.fresnel_radius_m)
    latitude, longitude = _along(plan, at, reference_deg)
    azimuth, _, _ = WGS84_GEOD.inv(longitude[:-1], latitude[:-1], longitude[1:], latitude[1:])
    bearing = np.append(azimuth, azimuth[-1])
    outline: Places = []
    for side in (90.0, -90.0):
        lon, lat, _ = WGS84_GEOD.fwd(longitude, latitude, bearing + side, radius)
        lon = longitude + (np.asarray(lon) - longitude + 180.0) % 360.0 - 180.0
        edge = _pairs(np.asarray(lat), lon)
        outline += edge if side > 0.0 else edge[::-1]
    return outline


def sites(plans: Sequence[LinkPlan], reference_deg: float, *, first: int = 0) -> list[SiteMark]:
    """Each site once, with the side on which its name is least in the way; `first` is the number of the first link."""
    where: dict[tuple[str, float, float], list[tuple[int, float, float]]] = {}
    for index, plan in enumerate(plans, start=first):
        ends = plan.result.ends
        for here, there in ((ends.a, ends.b), (ends.b, ends.a)):
            spot = (here.site, here.latitude_deg, here.longitude_deg)
            east = (there.longitude_deg - here.longitude_deg + 180.0) % 360.0 - 180.0
            north = there.latitude_deg - here.latitude_deg
            where.setdefault(spot, []).append((index, east * math.cos(math.radians(here.latitude_deg)), north))
    marks = []
    for (name, latitude, longitude), found in where.items():
        east = sum(x / (math.hypot(x, y) or 1.0) for _, x, y in found)
        north = sum(y / (math.hypot(x, y) or 1.0) for _, x, y in found)
        sideways = abs(east) >= 0.5 * abs(north)
        side = ("w" if east > 0.0 else "e") if sideways else ("s" if north > 0.0 else "n")
        marks.append(
            SiteMark(
                name=name, latitude_deg=latitude, longitude_deg=nearest_turn(longitude, reference_deg), side=side,
                links=tuple(sorted({index for index, _, _ in found})),
            )
        )  # fmt: skip
    return marks


def window_of(places: Places, *, margin: float = 0.22, least_m: float = 250.0, aspect: float = 1.2) -> MapWindow:
    """The part of the map to show: around the places, with a margin, no narrower than `aspect` allows."""
    latitudes, longitudes = [y for y, _ in places], [x for _, x in places]
    low, high = mercator_y(min(latitudes)), mercator_y(max(latitudes))
    west, east = math.radians(min(longitudes)) * 6_378_137.0, math.radians(max(longitudes)) * 6_378_137.0
    stretched = 1.0 / max(0.05, math.cos(math.radians((min(latitudes) + max(latitudes)) / 2.0)))
    pad = max(margin * max(high - low, east - west), least_m * stretched)
    low, high, west, east = low - pad, high + pad, west - pad, east + pad
    wide = max(0.0, (high - low) * aspect - (east - west)) / 2.0
    tall = max(0.0, (east - west) / (aspect * 1.06) - (high - low)) / 2.0
    return MapWindow(
        west_deg=math.degrees((west - wide) / 6_378_137.0), east_deg=math.degrees((east + wide) / 6_378_137.0),
        south_deg=_latitude(low - tall), north_deg=_latitude(high + tall),
    )  # fmt: skip


def _latitude(northing_m: float) -> float:
    return math.degrees(math.atan(math.sinh(northing_m / 6_378_137.0)))
