"""A stack of rasters sampled for many paths at once: the finest that has data answers, as in `stack`, from sheets of cells.

Takes the columns and rows of whole batches; knows no geodesics and no obstacles. Seams are not judged here: paths on which two
rasters may disagree too much are named, for the caller to look at one by one.
"""

import threading
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final, Protocol

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.cell_size import CellSizes
from fellspan.terrain.raster_file import RasterFile
from fellspan.terrain.seams import allowed_m
from fellspan.terrain.sheet import Curves, Sheet
from fellspan.terrain.stack import EDGE_CELLS, RasterStack

ALONG: Final = 4 * 256
"""Places along a path at which `RasterStack.cell_along` looks for cells."""
_APART = 32
_EDGE_NEAR_CELLS = 1e-3
"""How near an edge the polynomials of paths do not tell on which side of it a place lies."""

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


class Paths(Protocol):
    """A batch of paths that can say where it runs on any raster."""

    @property
    def size(self) -> int:
        """How many."""
        ...

    def curves_on(self, file: RasterFile) -> Curves:
        """The paths on a raster."""
        ...


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Sampled:
    """Heights at places along paths, (q, n), NaN in a gap.

    `source` is the file that answered, -1 in a gap; (q, n), or (q, 1) where one file answers for all of each path. `doubtful`
    names paths on which rasters that overlap may disagree too much, (q,).
    """

    value_m: Floats
    source: NDArray[np.int16]
    doubtful: NDArray[np.bool_]


class StackSheets:
    """The sheets of a stack, made when first asked for. Safe to use from several threads."""

    def __init__(self, stack: RasterStack) -> None:
        self.stack = stack
        self._sheets: dict[int, Sheet] = {}
        self._sizes: dict[int, CellSizes] = {}
        self._lock = threading.Lock()

    def sheet(self, number: int) -> Sheet | None:
        """The sheet of a file; None where the raster is too large for one."""
        file = self.stack.files[number]
        if not Sheet.fits(file):
            return None
        with self._lock:
            if number not in self._sheets:
                self._sheets[number] = Sheet(file, self.stack.dataset_of(number))
            return self._sheets[number]

    def sizes(self, number: int) -> CellSizes:
        """How large the cells of a file are."""
        with self._lock:
            if number not in self._sizes:
                self._sizes[number] = CellSizes(self.stack.files[number])
            return self._sizes[number]

    @property
    def sheets(self) -> tuple[Sheet, ...]:
        """Those made so far."""
        with self._lock:
            return tuple(self._sheets.values())

    def over(self, paths: Paths) -> "PathsOnStack":
        """A batch of paths laid on the stack."""
        return PathsOnStack(self, paths)


class PathsOnStack:
    """A batch of paths on a stack: which files they touch, the finest cell each of them touches, and heights along them."""

    def __init__(self, sheets: StackSheets, paths: Paths) -> None:
        self.sheets = sheets
        files = sheets.stack.files
        self.numbers: list[int] = []
        self.curves: list[Curves] = []
        touched: list[NDArray[np.bool_]] = []
        within: list[NDArray[np.bool_]] = []
        self.usable = np.ones(paths.size, dtype=np.bool_)
        """Whether sheets and polynomials serve all of a path, (p,)."""
        for number, file in enumerate(files):
            curves = paths.curves_on(file)
            left, right, top, bottom = curves.range_of()
            with np.errstate(invalid="ignore"):
                meets = (right >= -1.0) & (left <= file.width + 1.0) & (bottom >= -1.0) & (top <= file.height + 1.0)
                inside = (left >= 0.0) & (right <= file.width) & (top >= 0.0) & (bottom <= file.height)
            meets &= curves.is_close
            self.usable &= curves.is_close
            some = np.flatnonzero(meets)
            self.usable[some] &= ~_end_on_edge(file, curves, some)
            if not meets.any():
                continue
            if sheets.sheet(number) is None:
                self.usable &= ~meets
                meets &= False
                continue
            self.numbers.append(number)
            self.curves.append(curves)
            touched.append(meets)
            within.append(inside & meets)
        shape = (len(self.numbers), paths.size)
        self._touches = np.array(touched, dtype=np.bool_).reshape(shape)
        many = self._touches.sum(axis=0)
        self._single = (many == 1) & (np.array(within, dtype=np.bool_).reshape(shape).any(axis=0))
        """Paths that lie on one file from end to end and touch no other."""
        self.cell_m = self._cells(paths.size)

    def _cells(self, count: int) -> Floats:
        """The finest cell that each path touches, m, as `RasterStack.cell_along` finds it."""
        finest = np.full(count, np.inf)
        for place, number in enumerate(self.numbers):
            sizes, curves = self.sheets.sizes(number), self.curves[place]
            whole = np.flatnonzero(self._touches[place] & self._single)
            thirds = np.linspace(0, ALONG - 1, 3).astype(np.int64)
            for index in thirds.tolist() if whole.size else ():
                t = np.full((whole.size, 1), 2.0 * index / (ALONG - 1) - 1.0)
                column, row = curves.at(t, whole)
                finest[whole] = np.minimum(finest[whole], sizes.at(column[:, 0], row[:, 0]))
            rest = np.flatnonzero(self._touches[place] & ~self._single)
            if rest.size:
                finest[rest] = np.minimum(finest[rest], self._finest_inside(place, rest))
        return np.where(np.isfinite(finest), finest, self.sheets.stack.cell_m)

    def _finest_inside(self, place: int, which: Index) -> Floats:
        """The finest of three cells of one file, spread over what of a path lies on it; infinite where nothing does."""
        file, sizes = self.sheets.stack.files[self.numbers[place]], self.sheets.sizes(self.numbers[place])
        from fellspan.terrain import sheet_kernel

        curves, t = self.curves[place], np.linspace(-1.0, 1.0, ALONG)
        found = np.empty((which.size, 3), dtype=np.int64)
        sheet_kernel.spread_inside(curves.column, curves.row, which, t, file.width, file.height, EDGE_CELLS, found)
        finest = np.full(which.size, np.inf)
        hit = np.flatnonzero(found[:, 0] >= 0)
        column, row = curves.at(t[found[hit]], which[hit])
        for rank in range(3):
            finest[hit] = np.minimum(finest[hit], sizes.at(column[:, rank], row[:, rank]))
        return finest

    def read_for(self, t: Floats, which: Index) -> None:
        """Read what `sample` needs at these places, t rising along each path, and anywhere between them."""
        for place, number in enumerate(self.numbers):
            rows = np.flatnonzero(self._touches[place][which])
            sheet = self.sheets.sheet(number)
            if rows.size == 0 or sheet is None or sheet.is_complete:
                continue
            ends = self.curves[place].at(t[rows][:, [0, -1]], which[rows])
            # By cells and not by samples: these may stand far apart where a study states its step.
            longest = max(float(np.abs(np.diff(one, axis=1)).max(initial=0.0)) for one in ends)
            share = np.linspace(0.0, 1.0, 2 + int(longest / _APART))
            along = t[rows][:, :1] * (1.0 - share) + t[rows][:, -1:] * share
            column, row = self.curves[place].at(along, which[rows])
            reach = max(float(np.abs(np.diff(one, axis=1)).max(initial=0.0)) for one in (column, row))
            sheet.read_near(column, row, reach=reach + 1.0)

    def sample(self, t: Floats, which: Index) -> Sampled:
        """Heights at t, -1 at A to 1 at B, shape (q, n), of the paths `which`, shape (q,); the places must have been read."""
        if self._single[which].all():
            return self._on_single_files(t, which)
        value = np.full(t.shape, np.nan)
        source = np.full(t.shape, -1, dtype=np.int16)
        doubtful = np.zeros(which.size, dtype=np.bool_)
        files = self.sheets.stack.files
        for place, number in enumerate(self.numbers):
            rows = np.flatnonzero(self._touches[place][which])
            sheet = self.sheets.sheet(number)
            if rows.size == 0 or sheet is None:
                continue
            column, row = self.curves[place].at(t[rows], which[rows])
            inside = _on(files[number], column, row)
            before = source[rows]
            open_still = inside & (before < 0)
            heights = np.full(column.shape, np.nan)
            heights[open_still] = sheet.heights(column[open_still], row[open_still])
            found = np.isfinite(heights)
            shared = inside & (before >= 0)
            if shared.any():
                doubtful[rows] |= self._may_disagree(number, column, row, shared, value[rows], before)
            value[rows] = np.where(found, heights, value[rows])
            source[rows] = np.where(found, number, before)
        return Sampled(value_m=value, source=source, doubtful=doubtful)

    def _on_single_files(self, t: Floats, which: Index) -> Sampled:
        numbers = np.argmax(self._touches[:, which], axis=0)
        source = np.asarray(self.numbers, dtype=np.int16)[numbers][:, np.newaxis]
        value: Floats | None = None
        whole = True
        for place in np.unique(numbers).tolist() if len(self.numbers) > 1 else (0,):
            sheet = self.sheets.sheet(self.numbers[place])
            assert sheet is not None
            rows = np.flatnonzero(numbers == place)
            if rows.size == which.size:
                value, whole = sheet.heights_along(self.curves[place], t, which)
            else:
                value = np.empty(t.shape) if value is None else value
                value[rows], none_missing = sheet.heights_along(self.curves[place], t[rows], which[rows])
                whole &= none_missing
        assert value is not None
        if not whole:
            source = np.where(np.isfinite(value), source, -1).astype(np.int16)
        return Sampled(value_m=value, source=source, doubtful=np.zeros(which.size, dtype=np.bool_))

    def _may_disagree(
        self,
        number: int,
        column: Floats,
        row: Floats,
        shared: NDArray[np.bool_],
        value: Floats,
        source: NDArray[np.int16],
    ) -> NDArray[np.bool_]:
        """Paths on which a file departs from what answered by more than the errors explain, anywhere."""
        files = self.sheets.stack.files
        sheet = self.sheets.sheet(number)
        assert sheet is not None
        step = np.zeros(column.shape)
        step[shared] = sheet.heights(column[shared], row[shared]) - value[shared]
        errors = np.array([file.sigma_m for file in files])
        beyond = np.abs(step) > allowed_m(errors[number], errors)[source]
        return np.asarray((beyond & shared).any(axis=1))


def _end_on_edge(file: RasterFile, curves: Curves, which: Index) -> NDArray[np.bool_]:
    """Paths (q,) that end on an edge of a file, so all that run along one: rounding puts what lies there on it or off it."""
    column, row = curves.at(np.broadcast_to(np.array([-1.0, 1.0]), (which.size, 2)), which)
    away = [np.abs(at - edge) for at, size in ((column, file.width), (row, file.height)) for edge in (0, size)]
    return np.asarray((np.minimum.reduce(away) < _EDGE_NEAR_CELLS).any(axis=1))


def _on(file: RasterFile, column: Floats, row: Floats) -> NDArray[np.bool_]:
    inside = (column >= -EDGE_CELLS) & (column <= file.width + EDGE_CELLS)
    inside &= (row >= -EDGE_CELLS) & (row <= file.height + EDGE_CELLS)
    return inside


def sigmas_of(files: Sequence[RasterFile], source: NDArray[np.int16]) -> Floats:
    """Standard error of what each source gives, m, NaN in a gap."""
    return np.append([file.sigma_m for file in files], np.nan)[source]
