"""Many geodesics as polynomials: where each runs, in degrees and in the cells of any raster.

PROJ is asked at a few nodes a path; between them a polynomial through these nodes serves where its last terms are small
enough to say so. Knows no heights.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from fellspan.geodesy.geodesic import WGS84_GEOD
from fellspan.terrain.placing import to_crs
from fellspan.terrain.raster_file import RasterFile, on_plane

NODES: Final = 5
MOST_LAST_CELLS: Final = 1e-3
"""The last term may be this large, in cells: what is left out is smaller by about the path's share of the Earth's radius."""
_NOTHING_CELLS: Final = 1e-9
"""Terms smaller than this are left out."""

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


def _to_powers() -> Floats:
    """From values at the Chebyshev nodes to coefficients of powers of t, shape (NODES, NODES)."""
    nodes = chebyshev.chebpts1(NODES)
    weights = 2.0 / NODES * chebyshev.chebvander(nodes, NODES - 1)
    weights[:, 0] /= 2.0
    powers = np.zeros((NODES, NODES))
    for degree in range(NODES):
        unit = np.zeros(degree + 1)
        unit[degree] = 1.0
        series = chebyshev.cheb2poly(unit)
        powers[: series.size] += series[:, np.newaxis] * weights.T[degree]
    return powers


_POWERS: Final = _to_powers()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Curves:
    """Columns and rows of paths on one raster: coefficients of powers of t from -1 at A to 1 at B, each (NODES, p)."""

    column: Floats
    row: Floats
    is_close: NDArray[np.bool_]
    """Whether the polynomial is close enough, (p,); False also where the CRS of the raster does not reach."""

    def at(self, t: Floats, which: Index) -> tuple[Floats, Floats]:
        """Columns and rows at t, shape (q, n), of the paths `which`, shape (q,)."""
        return _value(self.column[:, which], t), _value(self.row[:, which], t)

    def range_of(self) -> tuple[Floats, Floats, Floats, Floats]:
        """Least and greatest column, least and greatest row that a path can reach, each (p,)."""
        bounds: list[Floats] = []
        for terms in (self.column, self.row):
            bent = np.abs(terms[2:]).sum(axis=0)
            away = np.abs(terms[1]) + bent
            bounds += [terms[0] - away, terms[0] + away]
        return bounds[0], bounds[1], bounds[2], bounds[3]


class Ways:
    """Geodesics from A to B, arrays (p,); curves on rasters are worked out once for each CRS and transform."""

    def __init__(
        self, latitude_a: Floats, longitude_a: Floats, bearing_ab_deg: Floats, bearing_ba_deg: Floats, length_m: Floats
    ) -> None:
        self.length_m = length_m
        self.bearing_ab_deg, self.bearing_ba_deg = bearing_ab_deg, bearing_ba_deg
        share = (chebyshev.chebpts1(NODES) + 1.0) / 2.0
        count = length_m.size
        longitude, latitude, _ = WGS84_GEOD.fwd(
            np.repeat(longitude_a, NODES),
            np.repeat(latitude_a, NODES),
            np.repeat(bearing_ab_deg, NODES),
            (length_m[:, np.newaxis] * share).ravel(),
        )
        self._latitude, self._longitude = np.asarray(latitude), np.asarray(longitude)
        self.size = count
        self._in_crs: dict[str, tuple[Floats, Floats]] = {}

    def curves_on(self, file: RasterFile) -> Curves:
        """The paths in cells of a raster, (0, 0) the outer corner of its first cell."""
        if file.crs_text not in self._in_crs:
            self._in_crs[file.crs_text] = to_crs(file.crs_text, self._latitude, self._longitude)
        x, y = self._in_crs[file.crs_text]
        if file.period is not None:
            middle = (file.bounds[0] + file.bounds[2]) / 2.0
            x = x + file.period * np.round((middle - x) / file.period)
        column, row = on_plane(~file.transform, x, y)
        columns, rows = (_terms(values.reshape(self.size, NODES).T) for values in (column, row))
        last = np.maximum(np.abs(columns[-1]), np.abs(rows[-1]))
        with np.errstate(invalid="ignore"):
            close = last <= MOST_LAST_CELLS
        for terms in (columns, rows):
            # What rounding alone makes is left out, so that lower degrees serve short paths.
            terms[4][np.abs(terms[4]) < _NOTHING_CELLS] = 0.0
            terms[3][(terms[4] == 0.0) & (np.abs(terms[3]) < _NOTHING_CELLS)] = 0.0
        return Curves(column=columns, row=rows, is_close=close)

    def positions(self, share: Floats) -> tuple[Floats, Floats]:
        """Latitude and longitude, degrees, at one share of each path, shape (p,); longitudes may run beyond 180."""
        return self.positions_of(np.arange(self.size), share)

    def positions_of(self, which: Index, share: Floats) -> tuple[Floats, Floats]:
        """As `positions`, of the paths `which`, shape (q,)."""
        latitude = self._latitude.reshape(self.size, NODES)[which].T
        longitude = self._longitude.reshape(self.size, NODES)[which].T
        longitude = longitude[:1] + (np.mod(longitude - longitude[:1] + 180.0, 360.0) - 180.0)
        t = (2.0 * share - 1.0)[:, np.newaxis]
        return _value(_terms(latitude), t)[:, 0], _value(_terms(longitude), t)[:, 0]


def _terms(values: Floats) -> Floats:
    """Coefficients of powers of t from values at the nodes, both (NODES, p)."""
    terms = np.empty_like(values)
    for degree in range(NODES):
        # One product after the other: what a path gets must not depend on how many others there are.
        total = values[0] * _POWERS[degree, 0]
        for node in range(1, NODES):
            total += values[node] * _POWERS[degree, node]
        terms[degree] = total
    return terms


def _value(terms: Floats, t: Floats) -> Floats:
    """Polynomials (NODES, q) at t (q, n)."""
    highest = NODES - 1
    while highest > 1 and not terms[highest].any():
        highest -= 1
    value: Floats = terms[highest][:, np.newaxis] * t
    for degree in range(highest - 1, 0, -1):
        value += terms[degree][:, np.newaxis]
        value *= t
    value += terms[0][:, np.newaxis]
    return value
