"""Several rasters of one role as one: the finest that has data at a place answers there.

Heights in metres, gaps as gaps. Knows nothing of cover kinds, obstacles or radio.
"""

import math
import threading
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from rasterio.io import DatasetReader

from fellspan.errors import TerrainError
from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.terrain.blocks import bilinear
from fellspan.terrain.handles import HandlePool, gdal
from fellspan.terrain.placing import PathPlacing, Placing, ScatteredPlacing
from fellspan.terrain.raster_file import RasterFile, on_plane
from fellspan.terrain.seams import Seam, SeamBook, spread
from fellspan.terrain.sources import CoverSource, RasterSource
from fellspan.terrain.tiles import names_of, open_source
from fellspan.terrain.units import common_datum, is_ellipsoidal
from fellspan.vocabulary import RasterRole

_SAME_CELL = 1.1
"""Cells within a tenth count as equally fine: tiles of one model vary by latitude, and the user's order decides."""
_CHUNK_SAMPLES = 256
EDGE_CELLS = 1e-6
"""Places this little off a raster still count as on its edge, in cells."""

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class StackSample:
    """Heights at points, arrays of shape (n,).

    `value_m` is NaN and `source` -1 in a gap; else `source` indexes `RasterStack.names`. `sigma_m` is one standard
    error, NaN in a gap. `seams` are the steps measured between rasters that overlap under these points.
    """

    value_m: Floats
    source: NDArray[np.int16]
    sigma_m: Floats
    seams: tuple[Seam, ...] = ()


class RasterStack:
    """Several rasters of one role, finest first; equally fine ones in the order declared.

    Make it with `open`. Safe to use from several threads: each has its own GDAL handles.
    """

    def __init__(self, files: Sequence[RasterFile], origins: Sequence[int], *, role: RasterRole) -> None:
        finest = min(file.cell_m for file in files)
        order = sorted(
            range(len(files)),
            key=lambda i: (math.floor(math.log(files[i].cell_m / finest, _SAME_CELL) + 1e-9), origins[i], i),
        )
        self.role = role
        self.files = tuple(files[i] for i in order)
        self.origins = tuple(origins[i] for i in order)
        self.names = names_of(self.files)
        self.cell_m = finest
        self.vertical_datum = common_datum(
            {name: file.vertical_datum for name, file in zip(self.names, self.files, strict=True)}
        )
        self._header_notes = _header_notes(self.files, self.names, self.vertical_datum, role)
        self._seams = SeamBook()
        self._lock = threading.Lock()
        self._handles = HandlePool()
        self._groups = _by_crs(self.files)

    @classmethod
    def open(cls, sources: Sequence[RasterSource | CoverSource], *, role: RasterRole) -> "RasterStack":
        """Read the headers of all files that the sources stand for.

        Raises
        ------
        RasterError
            A file cannot serve as heights; the message names it.
        VerticalDatumError
            Files or sources state different vertical datums.
        """
        files: list[RasterFile] = []
        origins: list[int] = []
        for number, source in enumerate(sources):
            opened = open_source(source, role=role)
            files += opened
            origins += [number] * len(opened)
        if not files:
            raise TerrainError(f"no {role} raster is given", "give at least one file or folder of tiles")
        if len(files) > np.iinfo(np.int16).max:
            raise TerrainError(
                f"{len(files)} {role} rasters are too many, allowed are {np.iinfo(np.int16).max}",
                "join them into one with: gdalbuildvrt OUT.vrt FILES",
            )
        return cls(files, origins, role=role)

    @property
    def notes(self) -> tuple[str, ...]:
        """What a person must know: unit assumed, datum not stated, and the seams that samples so far have met."""
        with self._lock:
            return self._header_notes + self._seams.notes()

    def sample(self, path: GeodesicPath, distance_m: ArrayLike) -> StackSample:
        """Heights along a path, at distances from A of shape (n,), metres.

        Raises
        ------
        RasterError
            A block cannot be read.
        SeamError
            Rasters that overlap under the path disagree by more than their errors explain.
        """
        return self._sample(PathPlacing(path, np.asarray(distance_m, dtype=np.float64)))

    def sample_positions(self, latitude_deg: ArrayLike, longitude_deg: ArrayLike) -> StackSample:
        """As `sample`, at positions anywhere, arrays of shape (n,)."""
        latitude = np.asarray(latitude_deg, dtype=np.float64)
        return self._sample(ScatteredPlacing(latitude, np.asarray(longitude_deg, dtype=np.float64)))

    def seams_at(self, latitude_deg: ArrayLike, longitude_deg: ArrayLike) -> tuple[Seam, ...]:
        """The steps between rasters that overlap at positions, arrays of shape (n,), refused ones included."""
        latitude = np.asarray(latitude_deg, dtype=np.float64)
        placing = ScatteredPlacing(latitude, np.asarray(longitude_deg, dtype=np.float64))
        return self._sample(placing, refuse=False).seams

    def cell_along(self, path: GeodesicPath) -> float:
        """Ground size, m, of the finest cell that the path touches; `cell_m` where it touches none."""
        placing = PathPlacing(path, np.linspace(0.0, path.length_m, 4 * _CHUNK_SAMPLES))
        finest = math.inf
        for group in self._groups:
            x, y = placing.in_crs(group.crs_text, cell=group.cell)
            for number in group.near(x, y):
                _, _, inside = _in_cells(self.files[number], x, y)
                for i in spread(inside, 3):
                    finest = min(finest, *self.files[number].cell_at_m(float(x[i]), float(y[i])))
        return finest if math.isfinite(finest) else self.cell_m

    def dataset_of(self, number: int) -> Callable[[], DatasetReader]:
        """What gives the calling thread its handle on a file."""
        file = self.files[number]
        return lambda: self._handles.dataset(file.path, file.name)

    def close(self) -> None:
        """Close the open files of all threads."""
        self._handles.close()

    def _sample(self, placing: Placing, *, refuse: bool = True) -> StackSample:
        value = np.full(placing.size, np.nan)
        source = np.full(placing.size, -1, dtype=np.int16)
        near: list[tuple[int, Floats, Floats, Index]] = []
        for group in self._groups:
            x, y = placing.in_crs(group.crs_text, cell=group.cell)
            for number, where in group.near(x, y).items():
                column, row, inside = _in_cells(self.files[number], x[where], y[where])
                if inside.any():
                    near.append((number, column[inside], row[inside], where[inside]))
        near.sort(key=lambda item: item[0])
        with gdal():
            for number, column, row, where in near:
                open_still = source[where] < 0
                if open_still.any():
                    heights = self._read(number, column[open_still], row[open_still])
                    found = np.isfinite(heights)
                    hit = where[open_still][found]
                    value[hit], source[hit] = heights[found], number
            book = self._measure_seams(near, value, source)
        if refuse:
            book.refuse()
        sigma = np.append([file.sigma_m for file in self.files], np.nan)[source]
        return StackSample(value_m=value, source=source, sigma_m=sigma, seams=book.seams())

    def _read(self, number: int, column: Floats, row: Floats) -> Floats:
        file = self.files[number]
        return bilinear(self._handles.dataset(file.path, file.name), file, column, row)

    def _measure_seams(
        self, near: list[tuple[int, Floats, Floats, Index]], value: Floats, source: NDArray[np.int16]
    ) -> SeamBook:
        """Compare each raster, at a few of the points it shares, with the one that answered there."""
        book = SeamBook()
        for number, column, row, where in near:
            shared = (source[where] >= 0) & (source[where] != number)
            few = spread(shared)
            if few.size == 0:
                continue
            step = self._read(number, column[few], row[few]) - value[where[few]]
            answered = source[where[few]]
            for other in np.unique(answered).tolist():
                book.add(
                    (self.names[other], self.names[number]),
                    step[answered == other],
                    errors_m=(self.files[other].sigma_m, self.files[number].sigma_m),
                    siblings=self.origins[other] == self.origins[number],
                )
        with self._lock:
            self._seams.keep(book)
        return book


class _CrsGroup:
    """Files that share a CRS, with their bounds as arrays."""

    def __init__(self, numbers: Sequence[int], files: Sequence[RasterFile]) -> None:
        own = [files[n] for n in numbers]
        self.numbers = tuple(numbers)
        self.crs_text = own[0].crs_text
        self.period = own[0].period
        self.cell = min(file.cell_crs for file in own)
        self.bounds = np.array([file.bounds for file in own])

    def near(self, x: Floats, y: Floats) -> dict[int, Index]:
        """By file number, the points in those stretches that may touch its bounds."""
        starts = np.arange(0, x.size, _CHUNK_SAMPLES)
        if starts.size == 0:
            return {}
        x_low, x_high = np.fmin.reduceat(x, starts), np.fmax.reduceat(x, starts)
        y_low, y_high = np.fmin.reduceat(y, starts), np.fmax.reduceat(y, starts)
        west, south, east, north = (side[:, np.newaxis] for side in self.bounds.T)
        if self.period is None:
            touches = (x_high >= west) & (x_low <= east)
        else:
            # a whole turn east or west is the same meridian
            turns = np.floor((east - x_low) / self.period)
            touches = x_high + turns * self.period >= west
        touches &= (y_high >= south) & (y_low <= north)
        found: dict[int, Index] = {}
        for i in np.flatnonzero(touches.any(axis=1)):
            chunks = starts[touches[i]][:, np.newaxis] + np.arange(_CHUNK_SAMPLES)
            found[self.numbers[i]] = chunks[chunks < x.size]
        return found


def _by_crs(files: Sequence[RasterFile]) -> list[_CrsGroup]:
    by_text: dict[str, list[int]] = {}
    for number, file in enumerate(files):
        by_text.setdefault(file.crs_text, []).append(number)
    return [_CrsGroup(numbers, files) for numbers in by_text.values()]


def _in_cells(file: RasterFile, x: Floats, y: Floats) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Column and row of points, and which of them lie on the raster."""
    if file.period is not None:
        middle = (file.bounds[0] + file.bounds[2]) / 2.0
        x = x + file.period * np.round((middle - x) / file.period)
    column, row = on_plane(~file.transform, x, y)
    inside = (column >= -EDGE_CELLS) & (column <= file.width + EDGE_CELLS)
    inside &= (row >= -EDGE_CELLS) & (row <= file.height + EDGE_CELLS)
    return column, row, inside


def _header_notes(
    files: Sequence[RasterFile], names: Sequence[str], datum: str | None, role: RasterRole
) -> tuple[str, ...]:
    notes = []
    unitless = [name for name, file in zip(names, files, strict=True) if not file.unit_is_stated]
    if unitless:
        notes.append(f"{_listed(unitless)}: vertical unit not stated, taken as metres")
    datumless = [name for name, file in zip(names, files, strict=True) if file.vertical_datum is None]
    if datumless and role != "cover":
        taken = "heights are taken as above sea level" if datum is None else f"taken as that of the others, '{datum}'"
        notes.append(f"{_listed(datumless)}: vertical datum not stated, {taken}")
    if is_ellipsoidal(datum):
        notes.append(f"heights are above an ellipsoid ('{datum}'), not above sea level")
    return tuple(notes)


def _listed(names: Sequence[str]) -> str:
    return ", ".join(names) if len(names) <= 3 else f"{names[0]} and {len(names) - 1} more rasters"
