"""Tables of field amplitude for prepared patterns: what a pattern depends on, and steps chosen by a measured error.

Makers return None where the pattern has not the form; the error of a table is measured half-way between its nodes.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.pattern import SMALLEST_AMPLITUDE, Pattern
from fellspan.antennas.sphere import direction_from_boresight

ERROR_LIMIT_DB = 0.01
_AIM_DB = 0.008
"""Refinement stops here: the rest is for float32 and for what lies off the midpoints."""

NEAR_DB, FAR_DB = 30.0, 40.0
_FLOOR = 10.0 ** (-NEAR_DB / 20.0)
BELOW_LIMIT_DB = 0.15
_LINE_CELLS = tuple(2**power for power in range(14, 19))
_GRID_CELLS = (90, 180, 360, 720, 1080, 1440, 1800, 2160, 2880)
_SAME = 1e-9

Amplitude = Callable[[NDArray[np.float64], NDArray[np.float64]], NDArray[np.float64]]
Line = Callable[[NDArray[np.float64]], NDArray[np.float64]]


@dataclass(frozen=True, slots=True, kw_only=True)
class TableError:
    """Largest error, dB: within 30 dB of the peak, and from 30 to 40 dB below it."""

    near_db: float
    below_db: float

    def worst_of(self, *others: "TableError") -> "TableError":
        """The larger of each."""
        every = (self, *others)
        return TableError(near_db=max(e.near_db for e in every), below_db=max(e.below_db for e in every))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LineTable:
    """`pairs` (cells + 1,): amplitude at a node and its change to the next one, as real and imaginary part."""

    pairs: NDArray[np.complex64]
    cells: int
    error: TableError


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SeparableTable:
    """Amplitude = upward(sin el) * sideways(cos el sin az), times `behind` in the rear half-space."""

    upward: LineTable
    sideways: LineTable
    behind: float
    error: TableError


@dataclass(frozen=True, slots=True, kw_only=True)
class Axis:
    """One axis of a grid over -1 to 1, or 0 to 1 where folded; `bend_at` crowds nodes around the middle, None does not.

    Bent: t = x (1 + b) / (|x| + b), which is -1, 0 and 1 where x is.
    """

    cells: int
    folded: bool
    bend_at: float | None

    def bend(self, at: NDArray[np.float32], buffer: NDArray[np.float32]) -> None:
        """Turn x, in place, into places counted in cells."""
        if self.bend_at is not None:
            np.abs(at, out=buffer)
            np.add(buffer, np.float32(self.bend_at), out=buffer)
            np.multiply(at, np.float32(1.0 + self.bend_at), out=at)
            np.divide(at, buffer, out=at)
        if self.folded:
            np.multiply(at, np.float32(self.cells), out=at)
        else:
            np.multiply(at, np.float32(0.5 * self.cells), out=at)
            np.add(at, np.float32(0.5 * self.cells), out=at)

    def x_of(self, place: NDArray[np.float64]) -> NDArray[np.float64]:
        """The way back: x of places counted in cells."""
        t = place / self.cells if self.folded else 2.0 * place / self.cells - 1.0
        return t if self.bend_at is None else t * self.bend_at / (1.0 + self.bend_at - np.abs(t))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class GridTable:
    """`quads` (rows * columns,): the four float32 a, b, c, d of a + b x + (c + d x) y in each cell, packed in 16 bytes."""

    quads: NDArray[np.complex128]
    columns: Axis
    rows: Axis
    error: TableError


def _amplitude(pattern: Pattern) -> Amplitude:
    def amplitude(azimuth: NDArray[np.float64], elevation: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.maximum(pattern.co_amplitude(azimuth, elevation), SMALLEST_AMPLITUDE)

    return amplitude


def _probes(pattern: Pattern) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Directions, rad, to try a form on: all over the sphere, and about the boresight."""
    random = np.random.default_rng(20_240_229)
    beam = min(299_792_458.0 / (pattern.frequency_hz * max(pattern.size_m, 1e-6)), 1.0)
    theta = np.concatenate((np.arccos(random.uniform(-1.0, 1.0, 3000)), 3.0 * beam * random.uniform(0.0, 1.0, 1000)))
    return direction_from_boresight(theta, random.uniform(0.0, 2.0 * math.pi, theta.size))


def _measured(
    exact: NDArray[np.float64], read: NDArray[np.float64], level: NDArray[np.float64] | None = None
) -> TableError:
    """Errors sorted by `level`, the amplitude that the cell reaches; None takes the exact amplitude itself."""
    level = exact if level is None else level
    off = np.abs(20.0 * np.log10(np.maximum(read, SMALLEST_AMPLITUDE) / exact))
    near = level >= _FLOOR
    below = (level >= 10.0 ** (-FAR_DB / 20.0)) & ~near
    return TableError(
        near_db=float(np.max(off, where=near, initial=0.0)),
        below_db=float(np.max(off, where=below, initial=0.0)),
    )


def _good(error: TableError) -> bool:
    return error.near_db <= _AIM_DB and error.below_db <= BELOW_LIMIT_DB


def _line_table(line: Line, low: float, high: float) -> LineTable:
    """Refined until good; the finest one otherwise."""
    table: LineTable | None = None
    for cells in _LINE_CELLS:
        fine = line(np.linspace(low, high, 2 * cells + 1))
        nodes, between = fine[::2], fine[1::2]
        # A steep cell counts by its higher end: the midpoint of one that ends in a null lies below all bounds.
        error = _measured(between, 0.5 * (nodes[1:] + nodes[:-1]), np.maximum(nodes[1:], nodes[:-1]))
        pairs = np.empty(cells + 1, dtype=np.complex64)
        pairs.real, pairs.imag = nodes, np.append(np.diff(nodes), 0.0)
        table = LineTable(pairs=pairs, cells=cells, error=error)
        if _good(error):
            break
    assert table is not None
    return table


def elevation_table(pattern: Pattern) -> LineTable | None:
    """Over the elevation, -90 to 90 degrees, where the gain depends on nothing else."""
    amplitude = _amplitude(pattern)
    azimuth, elevation = _probes(pattern)
    if np.max(np.abs(amplitude(azimuth, elevation) - amplitude(np.zeros_like(elevation), elevation))) > _SAME:
        return None
    return _line_table(lambda up: amplitude(np.zeros_like(up), up), -0.5 * math.pi, 0.5 * math.pi)


def off_axis_table(pattern: Pattern) -> LineTable | None:
    """Over half the chord, sin(theta / 2), 0 to 1, where the gain depends on the angle off the boresight alone."""
    amplitude = _amplitude(pattern)
    azimuth, elevation = _probes(pattern)
    theta = 2.0 * np.arcsin(
        np.minimum(np.sqrt(np.sin(elevation / 2.0) ** 2 + np.cos(elevation) * np.sin(azimuth / 2.0) ** 2), 1.0)
    )
    if np.max(np.abs(amplitude(azimuth, elevation) - amplitude(theta, np.zeros_like(theta)))) > _SAME:
        return None
    return _line_table(lambda half: amplitude(2.0 * np.arcsin(half), np.zeros_like(half)), 0.0, 1.0)


def separable_table(pattern: Pattern) -> SeparableTable | None:
    """Over the direction cosines upward and sideways, where the field is a product over them."""
    amplitude = _amplitude(pattern)
    middle = float(amplitude(np.zeros(1), np.zeros(1))[0])
    if middle < 0.01:
        return None
    behind = float(amplitude(np.full(1, math.pi), np.zeros(1))[0]) / middle

    def upward(sine: NDArray[np.float64]) -> NDArray[np.float64]:
        return amplitude(np.zeros_like(sine), np.arcsin(sine)) / middle

    def sideways(sine: NDArray[np.float64]) -> NDArray[np.float64]:
        return amplitude(np.arcsin(sine), np.zeros_like(sine))

    azimuth, elevation = _probes(pattern)
    up, side = np.sin(elevation), np.cos(elevation) * np.sin(azimuth)
    rear = np.where(np.cos(azimuth) <= 0.0, behind, 1.0)
    exact = amplitude(azimuth, elevation)
    if np.max(np.abs(exact - np.maximum(upward(up) * sideways(side) * rear, SMALLEST_AMPLITUDE))) > _SAME:
        return None
    first, second = _line_table(upward, -1.0, 1.0), _line_table(sideways, -1.0, 1.0)
    read = _at(first, up) * _at(second, side) * rear
    # Of a product, errors in decibels add at worst.
    error = _measured(exact, read).worst_of(
        TableError(
            near_db=first.error.near_db + second.error.near_db, below_db=first.error.below_db + second.error.below_db
        )
    )
    return SeparableTable(upward=first, sideways=second, behind=behind, error=error)


def _at(table: LineTable, sine: NDArray[np.float64]) -> NDArray[np.float64]:
    at = (sine + 1.0) * (0.5 * table.cells)
    place = np.minimum(at.astype(np.intp), table.cells)
    return np.asarray(table.pairs.real[place] + (at - place) * table.pairs.imag[place], dtype=np.float64)


def grid_table(pattern: Pattern) -> GridTable | None:
    """Over azimuth and elevation; folded where the gain is even in them, crowded about a narrow beam."""
    amplitude = _amplitude(pattern)
    azimuth, elevation = _probes(pattern)
    exact = amplitude(azimuth, elevation)
    even_across = bool(np.max(np.abs(exact - amplitude(-azimuth, elevation))) <= _SAME)
    even_up = bool(np.max(np.abs(exact - amplitude(azimuth, -elevation))) <= _SAME)
    across, up = (_width(amplitude, plane) for plane in (0, 1))
    best: GridTable | None = None
    tried, excess = 0, 1.0
    for cells in _GRID_CELLS:
        # The error falls as the square of the step: steps that cannot do are not tried.
        if excess * (tried / cells) ** 2 > 1.3:
            continue
        tried, excess = cells, math.inf
        for crowd in (None, 8.0, 3.0):
            columns, rows = (
                Axis(
                    cells=(cells if folded else 2 * cells) // (1 if around else 2),
                    folded=folded,
                    bend_at=None if crowd is None or width * crowd > 0.25 else width * crowd,
                )
                for around, folded, width in (
                    (True, even_across, across / math.pi),
                    # A narrow beam needs as many rows as columns; evenly spaced, half as many make the same step.
                    (crowd is not None, even_up, up / (0.5 * math.pi)),
                )
            )
            if crowd is not None and columns.bend_at is None and rows.bend_at is None:
                continue
            table = _grid(amplitude, columns, rows)
            if best is None or table.error.near_db < best.error.near_db:
                best = table
            if _good(table.error):
                return table
            excess = min(excess, max(table.error.near_db / _AIM_DB, table.error.below_db / BELOW_LIMIT_DB))
    return best


def _width(amplitude: Amplitude, plane: int) -> float:
    """Half-power half-width about the boresight, rad, coarse; a right angle where there is none."""
    angle = np.concatenate(([0.0], np.geomspace(1e-4, 0.5 * math.pi, 600)))
    flat = np.zeros_like(angle)
    field = amplitude(angle, flat) if plane == 0 else amplitude(flat, angle)
    low = np.flatnonzero(field < field[0] * math.sqrt(0.5))
    return float(angle[low[0]]) if low.size else 0.5 * math.pi


def _grid(amplitude: Amplitude, columns: Axis, rows: Axis) -> GridTable:
    def at(column: NDArray[np.float64], row: NDArray[np.float64]) -> NDArray[np.float64]:
        return amplitude(math.pi * columns.x_of(column)[None, :], 0.5 * math.pi * rows.x_of(row)[:, None])

    over, up = np.arange(columns.cells + 1.0), np.arange(rows.cells + 1.0)
    nodes = at(over, up)
    low, high = nodes[:-1], nodes[1:]
    a, b = low[:, :-1], low[:, 1:] - low[:, :-1]
    c, d = high[:, :-1] - a, high[:, 1:] - high[:, :-1] - b
    packed = np.stack((a, b, c, d), axis=-1).astype(np.float32)
    # Of many rows every third will do: errors do not change from one row to the next.
    some = slice(None, None, 3 if rows.cells >= 360 else 1)
    over, up = over[:-1], up[:-1][some]
    a, b, c, d = a[some], b[some], c[some], d[some]
    error = _measured(at(over + 0.5, up + 0.5), a + 0.5 * b + 0.5 * c + 0.25 * d).worst_of(
        _measured(at(over + 0.5, up), a + 0.5 * b),
        _measured(at(over, up + 0.5), a + 0.5 * c),
    )
    return GridTable(quads=packed.reshape(-1).view(np.complex128), columns=columns, rows=rows, error=error)
