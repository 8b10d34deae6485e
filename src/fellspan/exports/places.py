"""Positions along a planned path, and lines cut at the antimeridian; reads the profile and computes no clearance."""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from fellspan.planning.plan import LinkPlan
from fellspan.terrain.profile import PathProfile

LonLat = tuple[float, float]
MOST_VERTICES = 65
"""A geodesic of many kilometres looks the same with this many."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """A point of a path: distance from A, m; degrees; height of the ray above sea level there, m."""

    distance_m: float
    latitude_deg: float
    longitude_deg: float
    ray_amsl_m: float

    @property
    def lonlat(self) -> LonLat:
        """Longitude first, as GeoJSON and KML have it, rounded to a centimetre."""
        return round(self.longitude_deg, 7) + 0.0, round(self.latitude_deg, 7) + 0.0


def nearest(distances_m: NDArray[np.float64], distance_m: float) -> int:
    """Index of the sample nearest to `distance_m`."""
    return int(np.argmin(np.abs(distances_m - distance_m)))


def position_at(profile: PathProfile, distance_m: float) -> LonLat:
    """Longitude and latitude, degrees, between the samples of a profile; longitude in -180 to 180."""
    latitude = float(np.interp(distance_m, profile.distance_m, profile.latitude_deg))
    longitude = float(np.interp(distance_m, profile.distance_m, np.unwrap(profile.longitude_deg, period=360.0)))
    return (longitude + 180.0) % 360.0 - 180.0, latitude


def places(linked: LinkPlan, from_m: float, to_m: float) -> tuple[Place, ...]:
    """Vertices of a stretch of a path, its two ends exact; one alone where the stretch has no length.

    The ray is the one at the governing criterion's k: the straight line between the antennas less the Earth bulge.
    """
    profile, levels = linked.profile, linked.levels
    inside = profile.distance_m[(profile.distance_m > from_m) & (profile.distance_m < to_m)]
    picked = inside[:: max(1, -(-inside.size // (MOST_VERTICES - 2)))]
    ray = levels.available_m - levels.bulge_m[linked.result.governing]
    distances = [from_m] if to_m <= from_m else [from_m, *picked.tolist(), to_m]
    latitude = np.interp(distances, profile.distance_m, profile.latitude_deg)
    longitude = np.interp(distances, profile.distance_m, np.unwrap(profile.longitude_deg, period=360.0))
    rays = np.interp(distances, levels.distance_m, ray)
    columns = distances, latitude.tolist(), ((longitude + 180.0) % 360.0 - 180.0).tolist(), rays.tolist()
    return tuple(
        Place(distance_m=distance, latitude_deg=north, longitude_deg=east, ray_amsl_m=level)
        for distance, north, east, level in zip(*columns, strict=True)
    )


def path_places(linked: LinkPlan) -> tuple[Place, ...]:
    """Vertices of the whole path."""
    return places(linked, 0.0, linked.profile.length_m)


def split_at_antimeridian(line: tuple[Place, ...]) -> tuple[tuple[Place, ...], ...]:
    """A line as parts that do not cross longitude 180 (RFC 7946, section 3.1.9); the cut point is in both parts."""
    parts: list[list[Place]] = [[line[0]]]
    for before, after in pairwise(line):
        jump = after.longitude_deg - before.longitude_deg
        if abs(jump) <= 180.0:
            parts[-1].append(after)
            continue
        edge = 180.0 if jump < 0.0 else -180.0
        run = after.longitude_deg + 2.0 * edge - before.longitude_deg
        share = 0.0 if run == 0.0 else (edge - before.longitude_deg) / run
        for longitude in (edge, -edge):
            cut = Place(
                distance_m=before.distance_m + share * (after.distance_m - before.distance_m),
                latitude_deg=before.latitude_deg + share * (after.latitude_deg - before.latitude_deg),
                longitude_deg=longitude,
                ray_amsl_m=before.ray_amsl_m + share * (after.ray_amsl_m - before.ray_amsl_m),
            )
            if longitude == edge:
                if before.longitude_deg != edge:
                    parts[-1].append(cut)
            else:
                parts.append([after] if after.longitude_deg == -edge else [cut, after])
    whole = [tuple(part) for part in parts if len(part) > 1]
    return tuple(whole) or (line,)
