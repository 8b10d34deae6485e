"""Where points on Earth fall in the coordinates of rasters, each CRS worked out once.

Along a path PROJ is asked at a few nodes only and the rest is interpolated, to a tested error. Opens no file.
"""

from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.transforms import WGS84, transformer

_AGREEMENT_CELLS = 0.02
"""Nodes are doubled until the middles lie so near the chord; a parabola through them then leaves far less (tests show it)."""
_FIRST_INTERVALS = 8
_MOST_INTERVALS = 1024

Floats = NDArray[np.float64]


class Placing(Protocol):
    """Points that can say where they are in any CRS."""

    size: int

    def in_crs(self, crs_text: str, *, cell: float) -> tuple[Floats, Floats]:
        """x and y, shape (size,), NaN where the CRS does not reach; `cell` is the finest cell that will be asked."""
        ...

    def part(self, members: NDArray[np.int64]) -> "Placing":
        """Some of the points."""
        ...


class ScatteredPlacing:
    """Points anywhere, each transformed exactly."""

    def __init__(self, latitude_deg: Floats, longitude_deg: Floats) -> None:
        self.latitude_deg = np.asarray(latitude_deg, dtype=np.float64)
        self.longitude_deg = np.asarray(longitude_deg, dtype=np.float64)
        self.size = self.latitude_deg.size

    def in_crs(self, crs_text: str, *, cell: float) -> tuple[Floats, Floats]:
        """As `Placing.in_crs`."""
        return to_crs(crs_text, self.latitude_deg, self.longitude_deg)

    def part(self, members: NDArray[np.int64]) -> "ScatteredPlacing":
        """As `Placing.part`."""
        return ScatteredPlacing(self.latitude_deg[members], self.longitude_deg[members])


class PathPlacing:
    """Points along one geodesic, at distances from A."""

    def __init__(self, path: GeodesicPath, distance_m: Floats) -> None:
        self.path = path
        self.distance_m = np.asarray(distance_m, dtype=np.float64)
        self.size = self.distance_m.size

    def part(self, members: NDArray[np.int64]) -> "PathPlacing":
        """As `Placing.part`."""
        return PathPlacing(self.path, self.distance_m[members])

    def in_crs(self, crs_text: str, *, cell: float) -> tuple[Floats, Floats]:
        """As `Placing.in_crs`."""
        if self.size <= 2 * _FIRST_INTERVALS or self.path.length_m == 0.0:
            return to_crs(crs_text, *self.path.positions(self.distance_m))
        count = _FIRST_INTERVALS
        nodes = np.linspace(0.0, self.path.length_m, count + 1)
        x, y = to_crs(crs_text, *self.path.positions(nodes))
        while True:
            middles = (nodes[:-1] + nodes[1:]) / 2.0
            all_nodes = np.empty(2 * count + 1)
            all_nodes[0::2], all_nodes[1::2] = nodes, middles
            all_x, all_y = to_crs(crs_text, *self.path.positions(all_nodes))
            with np.errstate(invalid="ignore"):
                off = np.hypot(all_x[1::2] - (x[:-1] + x[1:]) / 2.0, all_y[1::2] - (y[:-1] + y[1:]) / 2.0)
                settled = off <= _AGREEMENT_CELLS * cell
            nodes, x, y, count = all_nodes, all_x, all_y, 2 * count
            if settled.all() or count >= min(_MOST_INTERVALS, self.size):
                break
        # A parabola through both nodes and the middle: what the midpoints told is not thrown away.
        width = self.path.length_m / settled.size
        interval = np.clip((self.distance_m / width).astype(np.int64), 0, settled.size - 1)
        t = self.distance_m / width - interval
        at_x, at_y = _parabola(x, interval, t), _parabola(y, interval, t)
        if not settled.all():
            # longitudes that jump, a CRS with a seam, or one that does not reach the whole path: there, every point exactly
            rest = np.flatnonzero(~settled[interval])
            at_x[rest], at_y[rest] = to_crs(crs_text, *self.path.positions(self.distance_m[rest]))
        return at_x, at_y


def _parabola(values: Floats, interval: NDArray[np.int64], t: Floats) -> Floats:
    """Values at the share `t` of each interval, whose ends and middle stand in `values` in turn."""
    first, middle, last = values[2 * interval], values[2 * interval + 1], values[2 * interval + 2]
    return np.asarray(first + t * (4.0 * middle - 3.0 * first - last + 2.0 * t * (first + last - 2.0 * middle)))


def to_crs(crs_text: str, latitude_deg: Floats, longitude_deg: Floats) -> tuple[Floats, Floats]:
    """Exact coordinates in a CRS, NaN where it does not reach."""
    x, y = transformer(WGS84, crs_text).transform(longitude_deg, latitude_deg)
    x, y = np.array(x, dtype=np.float64), np.array(y, dtype=np.float64)
    lost = ~(np.isfinite(x) & np.isfinite(y))
    x[lost] = y[lost] = np.nan
    return x, y
