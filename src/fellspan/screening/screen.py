"""Decide on many pairs: columns in, columns out. The front door of the room.

Splits the pairs by what their paths need and puts the answers together; holds no formula.
"""

import numpy as np
from numpy.typing import NDArray

from fellspan.errors import CoordinateError
from fellspan.geodesy import geodesic
from fellspan.links.assess import SAME_PLACE_M
from fellspan.screening.columns import DONE, SAME_PLACE, Columns
from fellspan.screening.pairs import Candidates, PairResults, SiteColumns
from fellspan.screening.single import screen_single, site_of
from fellspan.terrain.terrain import Terrain

Index = NDArray[np.int64]


def screen_pairs(
    candidates: Candidates, *, hub: NDArray[np.int64], place: NDArray[np.int64], terrain: Terrain
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

    Raises
    ------
    RasterError
        A raster cannot be read; gaps, places that coincide and sites that cannot be are the status of their pairs.
    """
    hub, place = np.asarray(hub, dtype=np.int64), np.asarray(place, dtype=np.int64)
    columns = Columns(hub, place)
    _ways(candidates, columns)
    for row in np.flatnonzero(columns.status == DONE).tolist():
        screen_single(candidates, columns, row, terrain=terrain)
    return columns.results()


def _ways(candidates: Candidates, columns: Columns) -> None:
    """Distances and bearings; pairs at one place, and those whose positions are none, are told apart at once."""
    hubs, places = candidates.hubs, candidates.places
    way = geodesic.inverse_many(
        hubs.latitude_deg[columns.hub],
        hubs.longitude_deg[columns.hub],
        places.latitude_deg[columns.place],
        places.longitude_deg[columns.place],
    )
    columns.distance_m[:], columns.bearing_deg[:] = way.distance_m, way.bearing_ab_deg
    columns.status[way.distance_m < SAME_PLACE_M] = SAME_PLACE
    for row in np.flatnonzero(~np.isfinite(way.distance_m)).tolist():
        columns.refuse(
            row, _why_no_place(hubs, int(columns.hub[row])) or _why_no_place(places, int(columns.place[row]))
        )


def _why_no_place(sites: SiteColumns, index: int) -> str:
    try:
        site_of(sites, index)
    except CoordinateError as error:
        return error.what
    return ""
