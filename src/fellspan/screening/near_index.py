"""Which pairs' paths come near an obstacle or a surveyed point, and which: what makes a path more than its rasters.

Asks the indices of `terrain`; what a pair is told does not depend on the pairs beside it. Knows no heights.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.propagation import wavelength_m
from fellspan.screening.pairs import Candidates, Floats
from fellspan.screening.single import name_of
from fellspan.screening.ways import Ways
from fellspan.terrain.alongpath import nodes_for
from fellspan.terrain.assemble import Layers
from fellspan.terrain.obstacles import BESIDE_M

Index = NDArray[np.int64]

_LEAST_WITHIN_M: Final = 4.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Nearby:
    """What paths come near: obstacles, columns (k,), paths rising; and which paths come near surveyed rows, (p,)."""

    path: Index
    obstacle: Index
    shift_deg: Floats
    surveyed: NDArray[np.bool_]

    @classmethod
    def nothing(cls, count: int) -> "Nearby":
        """So many paths that come near nothing."""
        none = np.zeros(0, dtype=np.int64)
        return cls(path=none, obstacle=none, shift_deg=np.zeros(0), surveyed=np.zeros(count, dtype=np.bool_))

    def of(self, paths: Index) -> "Nearby":
        """What some of the paths, rising, come near."""
        new = np.full(self.surveyed.size, -1, dtype=np.int64)
        new[paths] = np.arange(paths.size)
        some = np.flatnonzero(new[self.path] >= 0)
        return Nearby(
            path=new[self.path[some]],
            obstacle=self.obstacle[some],
            shift_deg=self.shift_deg[some],
            surveyed=self.surveyed[paths],
        )

    def paths(self) -> NDArray[np.bool_]:
        """Which paths come near anything, (p,)."""
        near = self.surveyed.copy()
        near[self.path] = True
        return near


def nearby(candidates: Candidates, layers: Layers, ways: Ways, hub: Index, place: Index) -> Nearby:
    """What the paths of pairs, (p,), come near.

    Obstacles count within the widest part of the first zone that a criterion asks for, up to `BESIDE_M`; wider than that none
    changes an answer.
    """
    nothing = np.zeros(0, dtype=np.int64)
    surveyed = np.zeros(ways.size, dtype=np.bool_)
    obstacles, survey = layers.obstacles, layers.survey
    columns: list[tuple[Index, Index, Floats]] = [(nothing, nothing, np.zeros(0))]
    if obstacles.obstacles or survey.rows:
        within, nodes = _classes(candidates, ways.length_m)
        for one in np.unique(np.column_stack((within, nodes)), axis=0).tolist():
            some = np.flatnonzero((within == one[0]) & (nodes == one[1]))
            longitude, latitude = _nodes(ways, some, int(one[1]))
            path, obstacle, shift = obstacles.touching(longitude, latitude, within_m=one[0])
            columns.append((some[path], obstacle, shift))
            surveyed[some] |= survey.meets(longitude, latitude)
    if survey.links:
        pairs = zip(hub.tolist(), place.tolist(), strict=True)
        surveyed |= np.array([survey.names(name_of(candidates, *pair)) for pair in pairs], dtype=np.bool_)
    path, obstacle, shift = (np.concatenate([one[column] for one in columns]) for column in range(3))
    order = np.argsort(path, kind="stable")
    return Nearby(path=path[order], obstacle=obstacle[order], shift_deg=shift[order], surveyed=surveyed)


def greatest_share(candidates: Candidates) -> float:
    """How wide the zone is that a criterion may ask for, against that of a wavelength of 1 m."""
    fraction = max(1.0, *(rule.fraction for rule in candidates.settings.criteria), 0.0)
    return fraction * math.sqrt(float(wavelength_m(candidates.radio.frequency_hz)))


def _classes(candidates: Candidates, length_m: Floats) -> tuple[Floats, Index]:
    """How far beside each path obstacles count, m, and its number of nodes, both (p,): of few values, by its length alone."""
    widest = 0.5 * greatest_share(candidates) * np.sqrt(length_m)
    within = np.minimum(np.exp2(np.ceil(np.log2(np.maximum(widest, _LEAST_WITHIN_M)))), BESIDE_M)
    doubled = np.exp2(np.ceil(np.log2(np.maximum(length_m, 1.0))))
    nodes = {length: nodes_for(length) for length in np.unique(doubled).tolist()}
    return within, np.array([nodes[length] for length in doubled.tolist()], dtype=np.int64)


def _nodes(ways: Ways, some: Index, count: int) -> tuple[Floats, Floats]:
    """Longitude and latitude at even shares of some paths, (q, count)."""
    shares = np.linspace(0.0, 1.0, count).tolist()
    places = [ways.positions_of(some, np.full(some.size, share)) for share in shares]
    return np.stack([place[1] for place in places], axis=1), np.stack([place[0] for place in places], axis=1)
