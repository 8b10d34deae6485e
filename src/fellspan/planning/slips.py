"""Slips in coordinates behind a path that leaves the rasters or spans an ocean: longitude typed first, an absurd length.

Looks at a link and its terrain, and puts a sentence beside what went wrong; changes no position.
"""

import dataclasses
from collections.abc import Iterator

from fellspan.errors import FellspanError, TerrainGapError
from fellspan.geodesy import geodesic
from fellspan.geodesy.position import Position
from fellspan.links.cautions import LONGEST_M
from fellspan.links.site import Link, Site
from fellspan.terrain.terrain import Terrain

_NEARER = 0.1
"""A swapped position this much nearer to the other end is suspected even where no raster holds it (our own rule)."""


def explained(error: FellspanError, link: Link, terrain: Terrain) -> FellspanError:
    """The error of a link, with what its coordinates may have to do with it where the path leaves the rasters."""
    if not isinstance(error, TerrainGapError):
        return error
    length_m = geodesic.inverse(link.a.position, link.b.position).distance_m
    hints = [hint for hint in (_absurd(length_m), swapped_hint(link, terrain)) if hint]
    if not hints:
        return error
    raster, *others = error.details or ("",)
    return TerrainGapError(error.what, *[line for line in (raster, *hints, *others[-1:]) if line][:3])


def swapped_hint(link: Link, terrain: Terrain) -> str | None:
    """Which end, if latitude and longitude were swapped, would bring the path onto the rasters or its ends together."""
    length_m = geodesic.inverse(link.a.position, link.b.position).distance_m
    near = None
    for a, b, whose in _swapped(link):
        swapped_m = geodesic.inverse(a.position, b.position).distance_m
        if swapped_m > LONGEST_M:
            continue
        hint = (
            f"with latitude and longitude of {whose} swapped the path would be {swapped_m / 1000.0:.1f} km long: "
            "latitude comes first"
        )
        if _holds(terrain, a.position, b.position, swapped_m):
            return hint
        if swapped_m < _NEARER * length_m:
            # Which of two far ends is the swapped one, nearness alone cannot tell; a raster can.
            near = near or hint
    return near


def _absurd(length_m: float) -> str | None:
    if length_m <= LONGEST_M:
        return None
    return f"the path is {length_m / 1000.0:.0f} km long, which no radio link spans: check the coordinates of both ends"


def _swapped(link: Link) -> Iterator[tuple[Site, Site, str]]:
    a, b = _turned(link.a), _turned(link.b)
    if a is not None:
        yield a, link.b, f"'{link.a.name}'"
    if b is not None:
        yield link.a, b, f"'{link.b.name}'"
    if a is not None and b is not None:
        yield a, b, f"'{link.a.name}' and '{link.b.name}'"


def _turned(site: Site) -> Site | None:
    """The site with latitude and longitude swapped; None where that is no position."""
    place = site.position
    if abs(place.longitude_deg) > 90.0:
        return None
    turned = Position(latitude_deg=place.longitude_deg, longitude_deg=place.latitude_deg)
    return dataclasses.replace(site, position=turned)


def _holds(terrain: Terrain, a: Position, b: Position, length_m: float) -> bool:
    """Whether the rasters have data all the way."""
    if length_m < 1.0:
        return False
    return not terrain.profiles([(a, b)], step_m=max(length_m / 1000.0, 1.0))[0].gaps
