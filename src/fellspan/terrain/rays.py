"""The polar gather: terrain on rays that leave one place in all directions, and grids of cells around it.

Rays are geodesics of the ellipsoid; where they fall in a raster is worked out exactly at a few of them and carried to the rest
as smooth functions, to a tested error. Knows no antenna, no frequency and no k.
"""

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np
from affine import Affine
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from fellspan.errors import TerrainError
from fellspan.geodesy.geodesic import WGS84_GEOD, inverse_many
from fellspan.geodesy.position import Position
from fellspan.geodesy.transforms import WGS84, transformer
from fellspan.terrain.placing import to_crs
from fellspan.terrain.raster_file import RasterFile, on_plane

Floats = NDArray[np.float64]

AGREEMENT_CELLS: Final = 0.01
"""How far from its exact place a sample may lie."""
_LADDER: Final = ((64, 5), (128, 7), (256, 9), (512, 11), (1024, 13))
_GRID_LADDER: Final = (5, 8, 12, 18)
_CHECKS: Final = 400
_CLOSER: Final = ((8, 8), (32, 4), (128, 2))
"""Up to so many steps from the place a step is parted into so many."""


@dataclass(frozen=True, eq=False)
class Rays:
    """`held` rays from number `first` on, of `whole` that leave `at` evenly around the compass; the first of all points north.

    Targets stand at `step_m`, 2 `step_m` ... `count` times. Samples stand there too, and closer together near the place, where
    an error of height is a greater error of slope.
    """

    at: Position
    whole: int
    first: int
    held: int
    step_m: float
    count: int

    @property
    def reach_m(self) -> float:
        """Distance of the last target, m."""
        return self.step_m * self.count

    @property
    def is_whole(self) -> bool:
        """Whether all rays are held."""
        return self.held == self.whole

    @cached_property
    def distance_m(self) -> Floats:
        """Of the samples, (n,), rising."""
        stretches, begun = [], 0
        for end, parts in _CLOSER:
            until = min(end, self.count)
            stretches.append(begun + np.arange(1, (until - begun) * parts + 1) / parts)
            begun = until
        return np.asarray(self.step_m * np.concatenate((*stretches, np.arange(begun + 1.0, self.count + 1.0))))

    @cached_property
    def target(self) -> NDArray[np.int64]:
        """Which target each sample is, (n,); -1 for those in between."""
        number = np.rint(self.distance_m / self.step_m).astype(np.int64)
        return np.where(np.abs(self.distance_m - number * self.step_m) < 1e-6 * self.step_m, number - 1, -1)

    @cached_property
    def share(self) -> Floats:
        """Of the samples, as shares of the reach, (n,)."""
        return np.asarray(self.distance_m / self.reach_m)

    @cached_property
    def bearing_deg(self) -> Floats:
        """True bearings at the place, (held,); they may pass 360."""
        return np.asarray((self.first + np.arange(self.held)) * (360.0 / self.whole))

    @cached_property
    def _placed(self) -> dict[str, tuple[Floats, Floats]]:
        return {}

    def in_cells(self, file: RasterFile) -> tuple[Floats, Floats]:
        """Column and row in `file` as polynomials of the share of the reach, (held, p) each, highest power first.

        Raises
        ------
        TerrainError
            The raster's coordinate system bends too much here, as degrees do beside a pole.
        """
        x, y = self._in_crs(file)
        if file.period is not None:
            x = x.copy()
            x[:, -1] += file.period * np.round(((file.bounds[0] + file.bounds[2]) / 2.0 - x[0, -1]) / file.period)
        inverse = ~file.transform
        columns, rows = inverse.a * x + inverse.b * y, inverse.d * x + inverse.e * y
        columns[:, -1] += inverse.c
        rows[:, -1] += inverse.f
        return np.ascontiguousarray(columns), np.ascontiguousarray(rows)

    def _in_crs(self, file: RasterFile) -> tuple[Floats, Floats]:
        known = self._placed.get(file.crs_text)
        if known is not None:
            return known
        rng = np.random.default_rng(1)
        rays = rng.integers(0, self.held, _CHECKS)
        shares = rng.uniform(0.0, 1.0, _CHECKS)
        true = self._exact(file, self.bearing_deg[rays], shares)
        for bearings, powers in _LADDER:
            x, y = self._fitted(file, bearings, powers)
            off = np.hypot(_value(x[rays], shares) - true[0], _value(y[rays], shares) - true[1])
            if off.max() <= AGREEMENT_CELLS * file.cell_crs:
                self._placed[file.crs_text] = x, y
                return x, y
        raise TerrainError(
            f"{file.name}: its coordinate system bends too much within {self.reach_m / 1000:.3g} km of this place",
            "it may not reach so far, or a pole is near; use a raster in a projected system of this region",
        )

    def _exact(self, file: RasterFile, bearing_deg: Floats, share: Floats) -> tuple[Floats, Floats]:
        start = np.full(share.shape, self.at.longitude_deg), np.full(share.shape, self.at.latitude_deg)
        longitude, latitude, _ = WGS84_GEOD.fwd(*start, bearing_deg, share * self.reach_m)
        x, y = to_crs(file.crs_text, np.asarray(latitude), np.asarray(longitude))
        if file.period is not None:
            here, _ = to_crs(file.crs_text, np.array([self.at.latitude_deg]), np.array([self.at.longitude_deg]))
            x = x - file.period * np.round((x - here) / file.period)
        return x, y

    def _fitted(self, file: RasterFile, bearings: int, powers: int) -> tuple[Floats, Floats]:
        nodes = 0.5 - 0.5 * np.cos(np.pi * (np.arange(powers) + 0.5) / powers)
        few = self.whole <= bearings
        around = self.bearing_deg if few else np.arange(bearings) * (360.0 / bearings)
        grid = np.meshgrid(around, nodes, indexing="ij")
        values = self._exact(file, grid[0].ravel(), grid[1].ravel())
        to_powers = np.linalg.inv(np.vander(nodes, powers)).T
        fitted = []
        for value in values:
            known = value.reshape(-1, powers) @ to_powers
            if not few:
                # smooth and periodic in the bearing: what few bearings say of all is a sum of waves
                waves = np.fft.rfft(known, axis=0)
                every = np.fft.irfft(waves, n=self.whole, axis=0) * (self.whole / bearings)
                known = every[(self.first + np.arange(self.held)) % self.whole]
            fitted.append(known)
        return fitted[0], fitted[1]


def _value(polynomials: Floats, share: Floats) -> Floats:
    result = polynomials[:, 0]
    for power in range(1, polynomials.shape[1]):
        result = result * share + polynomials[:, power]
    return result


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CellGrid:
    """A grid of cells: `transform` takes column and row, from the outer corner of the first cell, to `crs_text`."""

    transform: Affine
    crs_text: str
    rows: int
    columns: int

    def positions(self, column: Floats, row: Floats) -> tuple[Floats, Floats]:
        """Latitude and longitude of places in cells."""
        x, y = on_plane(self.transform, column, row)
        longitude, latitude = transformer(self.crs_text, WGS84).transform(x, y)
        return np.asarray(latitude, dtype=np.float64), np.asarray(longitude, dtype=np.float64)

    def around(self, at: Position, *, cell_m: float) -> tuple[Floats, Floats, Floats]:
        """Where the cells' centres lie from a place: polynomials of each row, and the argument at each column.

        Returns
        -------
        easts, norths
            (rows, p), highest power first: distance times sine and cosine of the true bearing at the place, m.
        at_columns
            (columns,), from -1 to 1.

        Raises
        ------
        TerrainError
            The grid's coordinate system bends too much here.
        """
        rng = np.random.default_rng(2)
        u, v = rng.uniform(-1.0, 1.0, (2, _CHECKS))
        true = self._east_north(at, u, v)
        at_columns = 2.0 * (np.arange(self.columns, dtype=np.float64) + 0.5) / self.columns - 1.0
        at_rows = 2.0 * (np.arange(self.rows, dtype=np.float64) + 0.5) / self.rows - 1.0
        for powers in _GRID_LADDER:
            nodes = np.cos(np.pi * (np.arange(powers) + 0.5) / powers)
            down, across = np.meshgrid(nodes, nodes, indexing="ij")
            to_series = np.linalg.inv(chebyshev.chebvander(nodes, powers - 1))
            rows, checks, off = [], [], np.zeros(_CHECKS)
            for value, wanted in zip(self._east_north(at, across.ravel(), down.ravel()), true, strict=True):
                series = to_series @ value.reshape(powers, powers) @ to_series.T
                off = np.maximum(off, np.abs(chebyshev.chebval2d(v, u, series) - wanted))
                powered = np.apply_along_axis(_as_powers, 1, series)
                rows.append(np.ascontiguousarray(chebyshev.chebvander(at_rows, powers - 1) @ powered))
                checks.append(wanted)
            if off.max() <= AGREEMENT_CELLS * cell_m:
                return rows[0], rows[1], at_columns
        raise TerrainError(
            "the raster's coordinate system bends too much over so wide an area",
            "choose a smaller radius around the site",
        )

    def _east_north(self, at: Position, u: Floats, v: Floats) -> tuple[Floats, Floats]:
        latitude, longitude = self.positions((u + 1.0) * (self.columns / 2.0), (v + 1.0) * (self.rows / 2.0))
        way = inverse_many(at.latitude_deg, at.longitude_deg, latitude, longitude)
        angle = np.radians(way.bearing_ab_deg)
        return way.distance_m * np.sin(angle), way.distance_m * np.cos(angle)


def _as_powers(series: Floats) -> Floats:
    """Powers, highest first, of a Chebyshev series, as many as it has terms."""
    powers = chebyshev.cheb2poly(series)
    return np.asarray(np.concatenate((powers, np.zeros(series.size - powers.size)))[::-1])


def rays_around(
    at: Position, *, reach_m: float, step_m: float, apart_m: float, sector_deg: tuple[float, float] | None = None
) -> Rays:
    """Rays with targets every `step_m`, at the rim at most `apart_m` from each other; `sector_deg` from, to clockwise."""
    count = max(2, math.ceil(reach_m / step_m - 1e-9))
    whole = max(16, math.ceil(2.0 * math.pi * reach_m / apart_m))
    first, held = 0, whole
    if sector_deg is not None and (sector_deg[1] - sector_deg[0]) % 360.0 < 359.0:
        low = math.floor(sector_deg[0] / 360.0 * whole) - 1
        high = low + math.ceil(((sector_deg[1] - sector_deg[0]) % 360.0) / 360.0 * whole) + 3
        if high - low + 1 < whole:
            first, held = low % whole, high - low + 1
    return Rays(at=at, whole=whole, first=first, held=held, step_m=step_m, count=count)
