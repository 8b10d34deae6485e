"""Which pairs a run is about, cut into chunks that the input alone fixes; never all pairs at once in memory.

Knows positions and distances, and nothing of terrain, results or files.
"""

import hashlib
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.geodesy import geodesic
from fellspan.screening.pairs import SiteColumns

CHUNK_PAIRS: Final = 4096
_SMALLEST_RADIUS_M: Final = 6_335_000.0
"""No normal section of the ellipsoid is bent more than this: a bound on the arc over a chord."""
_A_M: Final = 6_378_137.0
_E2: Final = geodesic.WGS84_GEOD.es

Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Chunk:
    """Pairs that are worked on and committed together: indices of hubs and places, shape (n,)."""

    number: int
    hub: Index
    place: Index


@dataclass(frozen=True, slots=True, kw_only=True)
class PairCount:
    """How many pairs and chunks there are, and a digest of all of them in their order."""

    pairs: int
    chunks: int
    digest: str


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PairList:
    """The pairs of a run: those in `listed` (hub and place indices, sorted by hub), else all hubs with all places, as far as
    their distance, m, lies in `min_distance_m` .. `max_distance_m`.

    Within a hub, pairs are in the order of their bearing: a chunk is a wedge, which crosses few blocks of a raster.
    """

    hubs: SiteColumns
    places: SiteColumns
    listed: tuple[Index, Index] | None = None
    min_distance_m: float = 0.0
    max_distance_m: float = np.inf
    chunk_pairs: int = CHUNK_PAIRS

    def chunks(self) -> Iterator[Chunk]:
        """All chunks in their order."""
        number, waiting, held = 0, [np.empty((2, 0), dtype=np.int64)], 0
        for pairs in self._by_hub():
            waiting.append(pairs)
            held += pairs.shape[1]
            while held >= self.chunk_pairs:
                together = np.concatenate(waiting, axis=1)
                full, rest = together[:, : self.chunk_pairs], together[:, self.chunk_pairs :]
                yield Chunk(number=number, hub=full[0], place=full[1])
                number, waiting, held = number + 1, [rest], rest.shape[1]
        if held:
            last = np.concatenate(waiting, axis=1)
            yield Chunk(number=number, hub=last[0], place=last[1])

    def count(self) -> PairCount:
        """Count the pairs, and sum up which they are."""
        digest, pairs, chunks = hashlib.sha256(), 0, 0
        for chunk in self.chunks():
            digest.update(np.ascontiguousarray(np.stack((chunk.hub, chunk.place)), dtype="<i8").tobytes())
            pairs, chunks = pairs + chunk.hub.size, chunks + 1
        return PairCount(pairs=pairs, chunks=chunks, digest=digest.hexdigest())

    def _by_hub(self) -> Iterator[Index]:
        """Pairs of one hub after the other, shape (2, n)."""
        place_xyz = _xyz(self.places)
        hub_xyz = _xyz(self.hubs)
        everything = np.arange(len(self.places.name), dtype=np.int64)
        for hub in range(len(self.hubs.name)):
            if self.listed is None:
                place = everything
            else:
                start, stop = np.searchsorted(self.listed[0], [hub, hub + 1])
                place = self.listed[1][start:stop]
            if place.size:
                step = place_xyz[place] - hub_xyz[hub]
                near = self._near(hub, place, np.sqrt(np.einsum("ij,ij->i", step, step)))
                place, step = place[near], step[near]
                turned = place[np.lexsort((place, self._bearing(hub, step)))]
                yield np.stack((np.full(turned.size, hub, dtype=np.int64), turned))

    def _near(self, hub: int, place: Index, chord_m: NDArray[np.float64]) -> NDArray[np.bool_]:
        """Which places lie within the distances; the geodesic itself is asked only where chord and arc leave it open."""
        half = np.minimum(chord_m / (2.0 * _SMALLEST_RADIUS_M), 1.0)
        longest_m = np.where(half < 0.5, 2.0 * _SMALLEST_RADIUS_M * np.arcsin(half), np.inf)
        near = (chord_m >= self.min_distance_m) & (longest_m <= self.max_distance_m)
        open_still = np.flatnonzero(~near & (chord_m <= self.max_distance_m) & (longest_m >= self.min_distance_m))
        if open_still.size:
            asked = place[open_still]
            distance_m = geodesic.inverse_many(
                self.hubs.latitude_deg[hub],
                self.hubs.longitude_deg[hub],
                self.places.latitude_deg[asked],
                self.places.longitude_deg[asked],
            ).distance_m
            near[open_still] = (distance_m >= self.min_distance_m) & (distance_m <= self.max_distance_m)
        return near

    def _bearing(self, hub: int, step: NDArray[np.float64]) -> NDArray[np.float64]:
        """Bearings of chords from a hub, coarse: they order the pairs of a hub and are shown nowhere."""
        phi, lam = np.radians(self.hubs.latitude_deg[hub]), np.radians(self.hubs.longitude_deg[hub])
        east = -np.sin(lam) * step[:, 0] + np.cos(lam) * step[:, 1]
        up = np.cos(lam) * step[:, 0] + np.sin(lam) * step[:, 1]
        north = np.cos(phi) * step[:, 2] - np.sin(phi) * up
        # rounded, so that the last bit of another machine's arithmetic cannot turn the order
        return np.asarray(np.round(np.degrees(np.arctan2(east, north)), 3) + 0.0, dtype=np.float64)


def _xyz(sites: SiteColumns) -> NDArray[np.float64]:
    """Earth-centred coordinates on the ellipsoid, m, shape (n, 3)."""
    phi, lam = np.radians(sites.latitude_deg), np.radians(sites.longitude_deg)
    normal = _A_M / np.sqrt(1.0 - _E2 * np.sin(phi) ** 2)
    return np.stack(
        (
            normal * np.cos(phi) * np.cos(lam),
            normal * np.cos(phi) * np.sin(lam),
            (1.0 - _E2) * normal * np.sin(phi),
        ),
        axis=1,
    )
