"""Obstacles and survey points that lie far from every link: they change nothing, and most often were typed wrongly.

Compares places only; a distance over a sphere is good enough for that.
"""

from collections.abc import Iterator, Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.links.site import Link
from fellspan.terrain.listed import Listed

FAR_M: Final = 50_000.0
"""What is farther from every link than this cannot stand in its zone (our own choice)."""
RADIUS_M: Final = 6_371_000.0
_PARTS: Final = 9
"""Points along each link that are compared: a link of 400 km is then met every 50 km."""

Floats = NDArray[np.float64]


def far_cautions(listed: Sequence[Listed], links: Sequence[Link]) -> Iterator[str]:
    """'2 of 5 obstacles lie more than 50 km from every link ...', one for each kind that has such."""
    places = _along(links)
    for group in listed:
        far = np.flatnonzero(_distance_m(group.latitude_deg, group.longitude_deg, places) > FAR_M)
        if not far.size:
            continue
        latitude, longitude = group.latitude_deg[far], group.longitude_deg[far]
        # A longitude beyond 90 can be no latitude, so nothing there was swapped.
        turned = np.abs(longitude) <= 90.0
        near = _distance_m(longitude[turned], latitude[turned], places) <= FAR_M
        names = [f"'{group.names[i]}'" for i in far[:3].tolist()]
        more = f" and {far.size - 3} more" if far.size > 3 else ""
        many = len(group.names) != 1
        count = f"{far.size} of {len(group.names)} {group.kind}s" if many else f"the only {group.kind}"
        lie, change, they, their = (
            ("lie", "change", "they", "their") if far.size > 1 else ("lies", "changes", "it", "its")
        )
        hint = (
            f"swapped, {they} would lie near: latitude comes first" if near.any() else f"are {their} coordinates right?"
        )
        yield (
            f"{count} {lie} more than {FAR_M / 1000:.0f} km from every link and {change} nothing: "
            f"{', '.join(names)}{more}; {hint}"
        )


def _along(links: Sequence[Link]) -> Floats:
    """Unit vectors of points along the links, shape (m, 3)."""
    ends = [
        [unit_vectors(np.array(p.latitude_deg), np.array(p.longitude_deg)) for p in (x.a.position, x.b.position)]
        for x in links
    ]
    share = np.linspace(0.0, 1.0, _PARTS)[:, None]
    points = np.concatenate([a * (1.0 - share) + b * share for a, b in ends])
    length = np.linalg.norm(points, axis=1, keepdims=True)
    return np.asarray(points / np.where(length > 0.0, length, 1.0))


def unit_vectors(latitude_deg: Floats, longitude_deg: Floats) -> Floats:
    """Directions of places from the centre of a sphere, shape (..., 3)."""
    north, east = np.radians(latitude_deg), np.radians(longitude_deg)
    return np.stack((np.cos(north) * np.cos(east), np.cos(north) * np.sin(east), np.sin(north)), axis=-1)


def _distance_m(latitude_deg: Floats, longitude_deg: Floats, places: Floats) -> Floats:
    """Distance of each point to the nearest place, shape (n,)."""
    if not latitude_deg.size:
        return np.empty(0)
    nearest = np.full(latitude_deg.size, -1.0)
    points = unit_vectors(latitude_deg, longitude_deg)
    for start in range(0, len(places), 512):
        nearest = np.maximum(nearest, (points @ places[start : start + 512].T).max(axis=1))
    return np.asarray(RADIUS_M * np.arccos(np.clip(nearest, -1.0, 1.0)))
