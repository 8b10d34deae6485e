"""Chains of two relays: a place that A sees, a place that B sees, and a hop between them.

Each end's sweep is thinned to its best places, spread over the whole area; every pair of them within reach is judged by the
batch engine, then the outer hops. Not every cell is tried: a chain that is reported is certain, one that is missing is not.
"""

from collections.abc import Callable, Iterator
from typing import Final

import numpy as np
from shapely.geometry.base import BaseGeometry

from fellspan.design.relay_picks import thinned
from fellspan.geodesy.position import Position
from fellspan.links.site import Link, Site
from fellspan.planning.inputs import Study
from fellspan.planning.planner import settings_of
from fellspan.planning.relay_cells import Cells, Ground, cells_between
from fellspan.planning.relay_hops import HopColumns, affordable, screen_hop
from fellspan.terrain.terrain import Terrain

OUTER: Final = 1500
"""Places of each end that are judged, spread over all that its sweep let through."""
INNER: Final = 150
"""Of those that serve, how many are tried against the other end's."""
_CHAINS: Final = 40

Tell = Callable[[int, int, str], None]


def chains_of_two(
    study: Study,
    link: Link,
    terrain: Terrain,
    *,
    mast_m: float,
    hop_m: float,
    area: BaseGeometry | None,
    margin_db: float,
    apart_m: float,
    tell: Tell,
) -> Iterator[list[Site]]:
    """Pairs of relay sites, best first, no two chains nearer to each other than `apart_m` at both relays."""
    settings = settings_of(study)
    sides: list[tuple[Cells, HopColumns]] = []
    for end, site in (("a", link.a), ("b", link.b)):
        tell(0, 1, "places that one end sees")
        ground = Ground(study=study, link=link, ends=(site,), hop_m=hop_m, mast_m=mast_m, area=area, terrain=terrain)
        cells = cells_between(ground)
        # High ground sees far: of each block the highest cell stands for it.
        if cells.row.size:
            most = affordable((site,), cells.latitude_deg, cells.longitude_deg, terrain, most=OUTER)
            cells = cells.chosen(thinned(cells.ground_m, cells.row, cells.column, most=most))
        hop = screen_hop(
            link,
            end="a" if end == "a" else "b",
            places=cells.columns(mast_m),
            terrain=terrain,
            settings=settings,
            margin_db=margin_db,
            growth_years=study.growth_years,
        )
        cells, hop = _serving(cells, hop)
        sides.append((cells, hop))
    (near, hop_a), (far, hop_b) = sides
    found: list[tuple[float, int, int]] = []
    for one in range(near.row.size):
        tell(one, near.row.size, "hops between relays")
        position = _position(near, one)
        reach = np.hypot(far.x_m - near.x_m[one], far.y_m - near.y_m[one])
        within = np.flatnonzero((reach <= hop_m) & (reach > 1.0))
        if not within.size:
            continue
        middle = screen_hop(
            link,
            end=Site(name="relay", position=position, height_m=mast_m),
            places=far.chosen(within).columns(mast_m),
            terrain=terrain,
            settings=settings,
            margin_db=margin_db,
            growth_years=study.growth_years,
        )
        for place in np.flatnonzero(middle.serves).tolist():
            two = int(within[place])
            worth = min(_worth(hop_a, one), _worth(middle, place), _worth(hop_b, two))
            found.append((worth, one, two))
    yield from _apart(found, near, far, apart_m=apart_m, mast_m=mast_m)


def _serving(cells: Cells, hop: HopColumns) -> tuple[Cells, HopColumns]:
    """The places that the end reaches, the best of each block."""
    serving = np.flatnonzero(hop.serves)
    if serving.size:
        kept = cells.chosen(serving)
        serving = serving[thinned(kept.ground_m, kept.row, kept.column, most=INNER)]
    return cells.chosen(serving), HopColumns(
        clear=hop.clear[serving],
        serves=hop.serves[serving],
        margin_db=hop.margin_db[serving],
        free_share=hop.free_share[serving],
    )


def _worth(hop: HopColumns, index: int) -> float:
    margin = float(hop.margin_db[index])
    return float(hop.free_share[index]) if np.isnan(margin) else margin


def _apart(
    found: list[tuple[float, int, int]], near: Cells, far: Cells, *, apart_m: float, mast_m: float
) -> Iterator[list[Site]]:
    given: list[tuple[int, int]] = []
    for _, one, two in sorted(found, key=lambda chain: (-chain[0], chain[1], chain[2])):
        if len(given) == _CHAINS:
            return
        if any(
            np.hypot(near.x_m[one] - near.x_m[other], near.y_m[one] - near.y_m[other]) < apart_m
            and np.hypot(far.x_m[two] - far.x_m[another], far.y_m[two] - far.y_m[another]) < apart_m
            for other, another in given
        ):
            continue
        given.append((one, two))
        yield [
            Site(name="relay", position=_position(cells, index), height_m=mast_m)
            for cells, index in ((near, one), (far, two))
        ]


def _position(cells: Cells, index: int) -> Position:
    return Position(
        latitude_deg=round(float(cells.latitude_deg[index]), 7),
        longitude_deg=round(float(cells.longitude_deg[index]), 7),
    )
