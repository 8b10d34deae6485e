"""Decide on many pairs: columns in, columns out. The front door of the room.

Splits the pairs by what their paths need and puts the answers together; holds no formula.
"""

from collections.abc import Callable, Iterable
from concurrent.futures import ThreadPoolExecutor
from typing import Final, TypeVar

import numpy as np
from numpy.typing import NDArray

from fellspan.errors import FellspanError
from fellspan.geodesy import geodesic
from fellspan.links.assess import SAME_PLACE_M
from fellspan.screening.batch import Batch, Setting, wrong_sites
from fellspan.screening.columns import DONE, SAME_PLACE, Columns
from fellspan.screening.near import NEAR_BATCH, NearBatch
from fellspan.screening.pairs import Candidates, PairResults, SiteColumns
from fellspan.screening.single import draw_single, screen_single, site_of
from fellspan.terrain.terrain import Terrain

BATCH: Final = 131_072
"""Pairs that are laid out at once."""


Item = TypeVar("Item")
Answer = TypeVar("Answer")


class Stopped(Exception):
    """Screening was told to stop."""


class _Pool:
    """Threads that ask before each part of the work whether to go on."""

    def __init__(self, threads: ThreadPoolExecutor, stopped: Callable[[], bool] | None) -> None:
        self._threads, self._stopped = threads, stopped

    def map(self, do: Callable[[Item], Answer], items: Iterable[Item]) -> list[Answer]:
        """The answers, in the order of the items."""

        def one(item: Item) -> Answer:
            if self._stopped is not None and self._stopped():
                raise Stopped
            return do(item)

        return list(self._threads.map(one, items))


def screen_pairs(
    candidates: Candidates,
    *,
    hub: NDArray[np.int64],
    place: NDArray[np.int64],
    terrain: Terrain,
    threads: int = 2,
    stopped: Callable[[], bool] | None = None,
) -> PairResults:
    """Assess pairs of hubs and places, of shape (n,), as planning would assess each of them alone.

    Parameters
    ----------
    candidates
        What the pairs are made of.
    hub, place
        Indices into `candidates.hubs` and `candidates.places`, shape (n,).
    terrain
        Opened; its trees grown already.
    threads
        How many work at once; the answers do not depend on it.
    stopped
        Asked before each part of the work whether to end here.

    Raises
    ------
    Stopped
        It said so.
    RasterError
        A raster cannot be read; gaps, places that coincide and sites that cannot be are the status of their pairs.
    """
    hub, place = np.asarray(hub, dtype=np.int64), np.asarray(place, dtype=np.int64)
    columns = Columns(hub, place)
    setting = Setting(
        candidates=candidates,
        many=terrain.many,
        vertical_datum=terrain.vertical_datum,
        wrong_hubs=wrong_sites(candidates.hubs, vertical_datum=terrain.vertical_datum),
        wrong_places=wrong_sites(candidates.places, vertical_datum=terrain.vertical_datum),
    )
    _ways(setting, columns)
    rows = np.flatnonzero(columns.status == DONE)
    with ThreadPoolExecutor(max_workers=threads) as several:
        pool = _Pool(several, stopped)
        for start in range(0, rows.size, BATCH):
            batch = Batch(setting, columns, rows[start : start + BATCH])
            done = pool.map(batch.run, batch.blocks())
            others = [batch.others]
            for part, nearby in batch.near(NEAR_BATCH):
                near = NearBatch(setting, columns, part, nearby)
                others.append(near.others)
                done += pool.map(near.run, near.blocks())
            alone = _sorted([*others, *(rows for block in done for rows in block.one_by_one)])
            pool.map(lambda row: screen_single(candidates, columns, row, terrain=terrain), alone)
            unsure = _sorted([rows for block in done for rows in block.unsure])
            unsure = [row for row in unsure if columns.status[row] == DONE]
            pool.map(lambda row: draw_single(candidates, columns, row, terrain=terrain), unsure)
    return columns.results()


def _sorted(rows: list[NDArray[np.int64]]) -> list[int]:
    return sorted(set(np.concatenate([*rows, np.zeros(0, dtype=np.int64)]).tolist()))


def _ways(setting: Setting, columns: Columns) -> None:
    """Distances and bearings; pairs at one place are told apart, those of positions that are none are refused."""
    hubs, places = setting.candidates.hubs, setting.candidates.places
    there = _on_earth(hubs)[columns.hub] & _on_earth(places)[columns.place]
    rows = np.flatnonzero(there)
    hub, place = columns.hub[rows], columns.place[rows]
    way = geodesic.inverse_many(
        hubs.latitude_deg[hub], hubs.longitude_deg[hub], places.latitude_deg[place], places.longitude_deg[place]
    )
    columns.distance_m[rows], columns.bearing_deg[rows] = way.distance_m, way.bearing_ab_deg
    columns.back_bearing_deg[rows] = way.bearing_ba_deg
    columns.status[rows[way.distance_m < SAME_PLACE_M]] = SAME_PLACE
    for row in np.flatnonzero(~there).tolist():
        columns.refuse(
            row, _why_no_place(hubs, int(columns.hub[row])) or _why_no_place(places, int(columns.place[row]))
        )


def _on_earth(sites: SiteColumns) -> NDArray[np.bool_]:
    return np.asarray((np.abs(sites.latitude_deg) <= 90.0) & (np.abs(sites.longitude_deg) <= 360.0))


def _why_no_place(sites: SiteColumns, index: int) -> str:
    try:
        site_of(sites, index)
    except FellspanError as error:
        return error.what
    return ""
