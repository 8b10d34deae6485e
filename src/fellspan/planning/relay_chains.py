"""Chains of two relays: a place that A sees, a place that B sees, and a hop between them.

Of what each end's sweep lets through every cell is judged, or the highest of each block of cells; of those that serve, the
highest of each coarser block stands for it; then every pair of such places within reach is judged, none left out. A chain that
is reported is certain; one that is missing may hide between cells of one block.
"""

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray
from shapely.geometry.base import BaseGeometry

from fellspan.design.relay_picks import thinned, thinned_by
from fellspan.geodesy.geodesic import inverse_many
from fellspan.geodesy.position import Position
from fellspan.links.site import Link, Site
from fellspan.planning.inputs import Study
from fellspan.planning.planner import settings_of
from fellspan.planning.relay_cells import Cells, Ground, cells_between
from fellspan.planning.relay_hops import End, HopColumns, affordable, screen_between, screen_hop
from fellspan.planning.relay_result import ChainsTried
from fellspan.terrain.terrain import Terrain

OUTER: Final = 20_000
"""Cells of each end that are judged at most."""
PAIRS: Final = 400_000
"""Hops between relays that are judged at most; it sets how many places stand for the cells of an end."""
PAIRS_NEARBY: Final = 40_000
"""The same where the study has obstacles or surveyed points: hops near them take longer."""
_PLACES: Final = (3000, 2000, 1400, 1000, 700, 500, 350, 250, 150, 100)
"""How many places may stand for an end: the most that keep within the hops above."""
SAMPLES: Final = 150_000_000
"""Samples of all hops in one of these steps; over fine rasters and long hops that is fewer cells and pairs."""
_CHAINS: Final = 40

Tell = Callable[[int, int, str], None]


@dataclass(frozen=True, slots=True, kw_only=True)
class ChainSearch:
    """What is asked: the link, how far and with how much mast, where, and with how much margin."""

    study: Study
    link: Link
    terrain: Terrain
    mast_m: float
    hop_m: float
    area: BaseGeometry | None
    margin_db: float
    apart_m: float
    tell: Tell

    @property
    def pairs(self) -> int:
        """How many hops between relays may be judged."""
        layers = self.terrain.layers
        nearby = bool(layers.obstacles.obstacles) or bool(layers.survey.rows)
        return int(min(PAIRS_NEARBY if nearby else PAIRS, max(10_000.0, SAMPLES / self.steps)))

    @property
    def steps(self) -> float:
        """Samples of the longest hop."""
        return max(1.0, self.hop_m / (0.5 * min(stack.cell_m for stack in self.terrain.layers.stacks)))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Side:
    """The places that stand for what one end sees, the hop to each, and how they were come by."""

    cells: Cells
    hop: HopColumns
    counts: tuple[int, int, int]
    block: int = 1

    def thinned(self, most: int) -> "_Side":
        """The highest of each block."""
        cells = self.cells
        kept, block = thinned_by(cells.ground_m, cells.row, cells.column, most=most)
        return replace(self, cells=cells.chosen(kept), hop=self.hop.chosen(kept), block=block)


def chains_of_two(search: ChainSearch) -> tuple[ChainsTried, Iterator[list[Site]]]:
    """What was tried, and pairs of relay sites, best first, no two chains nearer than `apart_m` at both relays."""
    sides = _side(search, "a"), _side(search, "b")
    for most in _PLACES:
        near, far = (side.thinned(most) for side in sides)
        one, two = _within_reach(near.cells, far.cells, hop_m=search.hop_m)
        if one.size <= search.pairs:
            break
    middle = screen_between(
        search.link,
        near=near.cells.columns(search.mast_m),
        far=far.cells.columns(search.mast_m),
        pairs=(one, two),
        terrain=search.terrain,
        settings=settings_of(search.study),
        margin_db=search.margin_db,
        growth_years=search.study.growth_years,
        progress=lambda done: search.tell(done, one.size, "hops between relays"),
    )
    serves = np.flatnonzero(middle.serves)
    one, two = one[serves], two[serves]
    outer = np.minimum(near.hop.worth(search.margin_db)[one], far.hop.worth(search.margin_db)[two])
    worth = np.minimum(middle.worth(search.margin_db)[serves], outer)
    tried = ChainsTried(
        cells=(near.counts[0], far.counts[0]),
        judged=(near.counts[1], far.counts[1]),
        serve=(near.counts[2], far.counts[2]),
        places=(near.cells.row.size, far.cells.row.size),
        block=(near.block, far.block),
        cell_m=float(np.sqrt(near.cells.cell_area_m2)),
        pairs=middle.serves.size,
        chains=serves.size,
    )
    return tried, _apart(worth, one, two, near.cells, far.cells, search)


def _side(search: ChainSearch, end: End) -> _Side:
    search.tell(0, 1, "places that one end sees")
    site = search.link.a if end == "a" else search.link.b
    cells = cells_between(
        Ground(
            study=search.study,
            link=search.link,
            ends=(site,),
            hop_m=search.hop_m,
            mast_m=search.mast_m,
            area=search.area,
            terrain=search.terrain,
        )
    )
    let_through = max(cells.row.size, cells.seen_cells)
    # High ground sees far: of each block the highest cell stands for it.
    if cells.row.size:
        most = min(OUTER, max(1000, int(SAMPLES / search.steps)))
        most = affordable((site,), cells.latitude_deg, cells.longitude_deg, search.terrain, most=most)
        cells = cells.chosen(thinned(cells.ground_m, cells.row, cells.column, most=most))
    judged = cells.row.size
    hop = screen_hop(
        search.link,
        end=end,
        places=cells.columns(search.mast_m),
        terrain=search.terrain,
        settings=settings_of(search.study),
        margin_db=search.margin_db,
        growth_years=search.study.growth_years,
        progress=lambda done: search.tell(done, judged, "places that one end sees"),
    )
    serving = np.flatnonzero(hop.serves)
    cells, hop = cells.chosen(serving), hop.chosen(serving)
    return _Side(cells=cells, hop=hop, counts=(let_through, judged, serving.size))


def _within_reach(near: Cells, far: Cells, *, hop_m: float) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """All pairs that a hop may join; a place is no hop from itself."""
    away = np.hypot(near.x_m[:, None] - far.x_m[None, :], near.y_m[:, None] - far.y_m[None, :])
    one, two = (index.astype(np.int64) for index in np.nonzero((away <= 1.01 * hop_m) & (away > 1.0)))
    if not one.size:
        return one, two
    exact_m = inverse_many(
        near.latitude_deg[one], near.longitude_deg[one], far.latitude_deg[two], far.longitude_deg[two]
    ).distance_m
    return one[exact_m <= hop_m], two[exact_m <= hop_m]


def _apart(
    worth: NDArray[np.float64],
    one: NDArray[np.int64],
    two: NDArray[np.int64],
    near: Cells,
    far: Cells,
    search: ChainSearch,
) -> Iterator[list[Site]]:
    order = np.lexsort((two, one, -worth))
    for _ in range(_CHAINS):
        if not order.size:
            return
        first, second = int(one[order[0]]), int(two[order[0]])
        yield [
            Site(name="relay", position=_position(cells, index), height_m=search.mast_m)
            for cells, index in ((near, first), (far, second))
        ]
        away = [
            np.hypot(cells.x_m[which[order]] - cells.x_m[index], cells.y_m[which[order]] - cells.y_m[index])
            for cells, which, index in ((near, one, first), (far, two, second))
        ]
        apart = (away[0] >= search.apart_m) | (away[1] >= search.apart_m)
        apart[0] = False  # also where apart_m is 0
        order = order[apart]


def _position(cells: Cells, index: int) -> Position:
    return Position(
        latitude_deg=round(float(cells.latitude_deg[index]), 7),
        longitude_deg=round(float(cells.longitude_deg[index]), 7),
    )
