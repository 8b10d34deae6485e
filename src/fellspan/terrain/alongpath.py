"""Where things stand relative to a path: distance along it and distance to its side.

For points near a geodesic these two numbers are a plane in which the path is the straight line across = 0 (Fermi
coordinates), so that crossings become plane geometry. Knows nothing of what the things are.
"""

import numpy as np
import shapely
from numpy.typing import NDArray

from fellspan.geodesy.geodesic import WGS84_GEOD, GeodesicPath

_MEAN_RADIUS_M = 6_371_008.8  # IUGG mean radius R1; a first guess only
METRES_PER_DEGREE = 110_574.0  # one degree of latitude at the equator on WGS 84, the shortest
_PIECE_M = 2_000.0

Floats = NDArray[np.float64]


def along_across(path: GeodesicPath, latitude_deg: Floats, longitude_deg: Floats) -> tuple[Floats, Floats]:
    """Distance along the path's geodesic from A and distance to its right, m, both of the shape (n,) given.

    Exact on the WGS 84 ellipsoid to under a millimetre for points within some 100 km of the path; negative along is
    before A. Newton steps on the foot of the perpendicular: at the foot, the geodesic to the point leaves at 90 degrees.
    """
    count = latitude_deg.size
    a = path.a
    return along_across_many(
        np.full(count, a.latitude_deg),
        np.full(count, a.longitude_deg),
        np.full(count, path.bearing_ab_deg),
        latitude_deg,
        longitude_deg,
    )


def along_across_many(
    a_latitude_deg: Floats, a_longitude_deg: Floats, bearing_deg: Floats, latitude_deg: Floats, longitude_deg: Floats
) -> tuple[Floats, Floats]:
    """As `along_across` for points (n,) each beside a path of its own, which leaves A, (n,), at a true bearing, (n,).

    What a point gets does not depend on the others.
    """
    if latitude_deg.size == 0:
        return np.zeros(0), np.zeros(0)
    bearing, _, distance = WGS84_GEOD.inv(a_longitude_deg, a_latitude_deg, longitude_deg, latitude_deg)
    turn = np.radians(np.asarray(bearing) - bearing_deg)
    arc = np.asarray(distance) / _MEAN_RADIUS_M
    along = _MEAN_RADIUS_M * np.arctan2(np.cos(turn) * np.sin(arc), np.cos(arc))
    across = np.asarray(distance) * np.sin(turn)
    open_ = np.arange(latitude_deg.size)
    for _ in range(6):
        foot_longitude, foot_latitude, back = WGS84_GEOD.fwd(
            a_longitude_deg[open_], a_latitude_deg[open_], bearing_deg[open_], along[open_]
        )
        bearing, _, distance = WGS84_GEOD.inv(foot_longitude, foot_latitude, longitude_deg[open_], latitude_deg[open_])
        turn = np.radians(np.asarray(bearing) - (np.asarray(back) + 180.0))
        ahead = np.asarray(distance) * np.cos(turn)
        across[open_] = np.asarray(distance) * np.sin(turn)
        along[open_] += ahead
        open_ = open_[np.abs(ahead) >= 1e-5]
        if open_.size == 0:
            break
    return along, across


def reach_boxes(bounds: Floats, reach_m: Floats) -> NDArray[np.object_]:
    """Boxes in longitude and latitude, (n,), around bounds (n, 4: west, south, east, north), `reach_m` (n,) wider all round."""
    reach_deg = (np.asarray(reach_m) + 5.0) / METRES_PER_DEGREE
    south, north = bounds[:, 1] - reach_deg, bounds[:, 3] + reach_deg
    poleward = np.minimum(np.maximum(np.abs(south), np.abs(north)), 90.0)
    # Beside a pole every longitude is near: the box goes all the way round.
    wide = np.where(poleward > 89.0, 540.0, reach_deg / np.maximum(np.cos(np.radians(poleward)), 1e-3))
    boxes: NDArray[np.object_] = shapely.box(bounds[:, 0] - wide, south, bounds[:, 2] + wide, north)
    return boxes


def near_path(tree: shapely.STRtree, path: GeodesicPath) -> tuple[NDArray[np.int64], Floats]:
    """Indices of the boxes that the path meets, sorted, and the degrees to add to their longitudes to join the path's."""
    count = max(1, int(np.ceil(path.length_m / _PIECE_M)))
    latitude, longitude = path.positions(np.linspace(0.0, path.length_m, count + 1))
    found: list[NDArray[np.int64]] = []
    shifts: list[Floats] = []
    for turn in (-360.0, 0.0, 360.0):
        points = np.column_stack((longitude - turn, latitude))
        if points[:, 0].min() > 900.0 or points[:, 0].max() < -900.0:
            continue
        pieces = shapely.linestrings(np.stack((points[:-1], points[1:]), axis=1))
        indices = np.unique(tree.query(pieces, predicate="intersects")[1])
        found.append(indices.astype(np.int64))
        shifts.append(np.full(indices.size, turn))
    indices, first = np.unique(np.concatenate(found), return_index=True)
    return indices, np.concatenate(shifts)[first]


def near_lines(tree: shapely.STRtree, longitude_deg: Floats, latitude_deg: Floats) -> NDArray[np.bool_]:
    """Which of many lines, nodes in arrays (p, m), meet any of the boxes, (p,); longitudes may run beyond 180.

    As `near_path` does for one path, to what lines between nodes two kilometres apart are off the geodesic.
    """
    found = np.zeros(longitude_deg.shape[0], dtype=np.bool_)
    for turn in (-360.0, 0.0, 360.0):
        lines = shapely.linestrings(np.stack((longitude_deg - turn, latitude_deg), axis=-1))
        found[np.unique(tree.query(lines, predicate="intersects")[0])] = True
    return found


def nodes_for(length_m: float) -> int:
    """How many nodes `near_lines` needs on the longest of its lines."""
    return max(1, int(np.ceil(length_m / _PIECE_M))) + 1
