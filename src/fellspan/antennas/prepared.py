"""Prepared patterns: the gain of one pattern read from tables, fast enough for sweeps over millions of directions.

What the pattern depends on is found out first, then tabulated with steps that a measured error chooses:

    omni        elevation alone                                   one table
    revolved    angle off the boresight alone (dishes)            one table over the chord 2 sin(theta/2)
    separable   product over the direction cosines (patches)      two tables
    grid        anything else                                     one table over azimuth and elevation
    exact       what no table of fair size holds to the bound     the pattern itself, slowly

Tables hold field amplitude, never decibels, and are read by linear interpolation in float32.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.antennas.pattern import Pattern
from fellspan.antennas.prepared_tables import (
    ERROR_LIMIT_DB,
    GridTable,
    LineTable,
    SeparableTable,
    elevation_table,
    grid_table,
    off_axis_table,
    separable_table,
)

Form = Literal["omni", "revolved", "separable", "grid", "exact"]

CHUNK = 8192
"""Directions worked on at a time: the buffers of a chunk stay in the cache of one core."""


class _Scratch:
    """Buffers of one call; each call has its own, so that threads may share a prepared pattern."""

    def __init__(self, size: int) -> None:
        self.real = [np.empty(size, dtype=np.float32) for _ in range(5)]
        self.index = [np.empty(size, dtype=np.int32) for _ in range(2)]
        self.place = np.empty(size, dtype=np.intp)
        self.pair = np.empty(size, dtype=np.complex64)
        self.quad = np.empty(size, dtype=np.complex128)
        self.truth = np.empty(size, dtype=np.bool_)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PreparedPattern:
    """A pattern with its table.

    Attributes
    ----------
    pattern
        What was prepared.
    form
        What the table is over; 'exact' has none.
    error_db
        Largest error, dB, found half-way between the nodes wherever the gain is within 30 dB of the peak; under 0.01 dB by
        construction.
    error_below_db
        The same from 30 to 40 dB below the peak; aimed at 0.15 dB or less. Deeper there is no bound in decibels: a table
        fills the bottom of a null.
    """

    pattern: Pattern
    form: Form
    table: LineTable | SeparableTable | GridTable | None
    error_db: float
    error_below_db: float

    def gain_dbi(
        self,
        azimuth_deg: ArrayLike,
        elevation_deg: ArrayLike,
        out: NDArray[np.float64] | NDArray[np.float32] | None = None,
    ) -> NDArray[np.float64] | NDArray[np.float32] | float:
        """Co-polar gain, dBi, toward directions off the boresight.

        Parameters
        ----------
        azimuth_deg, elevation_deg
            Degrees, broadcast together; azimuth at any turn, elevation -90 to 90 (beyond, the pole is taken).
        out
            Array of the broadcast shape, contiguous, float64 or float32, that receives the gains; saves its making.

        Returns
        -------
        gain_dbi
            `out`, or a new float64 array; a float for scalars. NaN in, NaN out.

        Raises
        ------
        ValueError
            `out` has another shape, or is not contiguous.
        """
        azimuth, elevation = np.broadcast_arrays(azimuth_deg, elevation_deg)
        if out is not None and (out.shape != azimuth.shape or not out.flags.c_contiguous):
            raise ValueError(f"out must be contiguous and of shape {azimuth.shape}, it has shape {out.shape}")
        gain = np.empty(azimuth.shape, dtype=np.float64) if out is None else out
        if self.table is None:
            gain[...] = self.pattern.gain_dbi(azimuth, np.clip(elevation, -90.0, 90.0))
        else:
            self._read(azimuth.reshape(-1), elevation.reshape(-1), gain.reshape(-1))
        return float(gain) if gain.ndim == 0 and out is None else gain

    def _read(
        self,
        azimuth: NDArray[np.float64],
        elevation: NDArray[np.float64],
        gain: NDArray[np.float64] | NDArray[np.float32],
    ) -> None:
        if self.table is None:
            return
        scratch = _Scratch(min(CHUNK, max(gain.size, 1)))
        read = _READERS[self.form]
        peak, scale = np.float32(self.pattern.peak_gain_dbi), np.float32(20.0 / np.log(10.0))
        # A direction that is not a number makes an index out of range on the way; clipping keeps it inside the table.
        with np.errstate(invalid="ignore"):
            for start in range(0, gain.size, CHUNK):
                stop = min(start + CHUNK, gain.size)
                n = stop - start
                field = read(self.table, azimuth[start:stop], elevation[start:stop], scratch, n)
                np.maximum(field, np.float32(1e-10), out=field)
                np.log(field, out=field)
                np.multiply(field, scale, out=field)
                np.add(field, peak, out=gain[start:stop], casting="same_kind")


def prepare(pattern: Pattern) -> PreparedPattern:
    """Tabulate a pattern for fast reading; takes milliseconds (dish, omni) to 8 s and 66 MB (long Yagi).

    The table is refined until its error, measured against the pattern half-way between the nodes, is below 0.01 dB wherever
    the gain is within 30 dB of the peak. A pattern that no table of fair size holds (an envelope with steps) is
    evaluated as it is.
    """
    makers: tuple[tuple[Form, Callable[[Pattern], LineTable | SeparableTable | GridTable | None]], ...] = (
        ("omni", elevation_table),
        ("revolved", off_axis_table),
        ("separable", separable_table),
        ("grid", grid_table),
    )
    for form, make in makers:
        table = make(pattern)
        if table is not None:
            near, below = table.error.near_db, table.error.below_db
            if near <= ERROR_LIMIT_DB:
                return PreparedPattern(pattern=pattern, form=form, table=table, error_db=near, error_below_db=below)
            break
    return PreparedPattern(pattern=pattern, form="exact", table=None, error_db=0.0, error_below_db=0.0)


def _line(table: LineTable, at: NDArray[np.float32], scratch: _Scratch, n: int) -> NDArray[np.float32]:
    """Amplitude at places counted in nodes; `at` is overwritten with it."""
    place, pair = scratch.place[:n], scratch.pair[:n]
    np.copyto(place, at, casting="unsafe")
    np.subtract(at, place, out=at, casting="unsafe", dtype=np.float32)
    np.take(table.pairs, place, out=pair, mode="clip")
    np.multiply(at, pair.imag, out=at)
    np.add(at, pair.real, out=at)
    return at


def _read_omni(
    table: LineTable, azimuth: NDArray[np.float64], elevation: NDArray[np.float64], scratch: _Scratch, n: int
) -> NDArray[np.float32]:
    at, other = scratch.real[0][:n], scratch.real[1][:n]
    np.clip(elevation, -90.0, 90.0, out=at, casting="same_kind")
    np.add(at, np.float32(90.0), out=at)
    np.multiply(at, np.float32(table.cells / 180.0), out=at)
    field = _line(table, at, scratch, n)
    # An azimuth that is not a number must show, though the gain does not depend on it.
    np.multiply(azimuth, 0.0, out=other, casting="same_kind")
    return np.add(field, other, out=field)


def _read_revolved(
    table: LineTable, azimuth: NDArray[np.float64], elevation: NDArray[np.float64], scratch: _Scratch, n: int
) -> NDArray[np.float32]:
    # chord^2 / 4 = sin^2(el/2) + cos(el) sin^2(az/2): keeps its precision at the smallest angles, where arccos loses it.
    half, turn, third = (buffer[:n] for buffer in scratch.real[:3])
    np.clip(elevation, -90.0, 90.0, out=half, casting="same_kind")
    np.multiply(half, np.float32(np.pi / 360.0), out=half)
    np.multiply(azimuth, np.pi / 360.0, out=turn, casting="same_kind")
    np.sin(half, out=half)
    np.multiply(half, half, out=half)
    np.sin(turn, out=turn)
    np.multiply(turn, turn, out=turn)
    np.multiply(half, np.float32(-2.0), out=third)  # cos(el) = 1 - 2 sin^2(el/2)
    np.add(third, np.float32(1.0), out=third)
    np.multiply(turn, third, out=turn)
    np.add(half, turn, out=half)
    np.sqrt(half, out=half)
    np.multiply(half, np.float32(table.cells), out=half)
    return _line(table, half, scratch, n)


def _read_separable(
    table: SeparableTable, azimuth: NDArray[np.float64], elevation: NDArray[np.float64], scratch: _Scratch, n: int
) -> NDArray[np.float32]:
    up, flat, side, ahead = (buffer[:n] for buffer in scratch.real[:4])
    behind = scratch.truth[:n]
    np.clip(elevation, -90.0, 90.0, out=flat, casting="same_kind")
    np.multiply(flat, np.float32(np.pi / 180.0), out=flat)
    np.multiply(azimuth, np.pi / 180.0, out=ahead, casting="same_kind")
    np.sin(flat, out=up)
    np.cos(flat, out=flat)
    np.sin(ahead, out=side)
    np.cos(ahead, out=ahead)
    np.multiply(side, flat, out=side)
    for line, at in ((table.upward, up), (table.sideways, side)):
        np.add(at, np.float32(1.0), out=at)
        np.multiply(at, np.float32(line.cells / 2.0), out=at)
        _line(line, at, scratch, n)
    np.multiply(up, side, out=up)
    np.less_equal(ahead, np.float32(0.0), out=behind)
    np.multiply(behind, np.float32(table.behind - 1.0), out=flat)
    np.add(flat, np.float32(1.0), out=flat)
    return np.multiply(up, flat, out=up)


def _read_grid(
    table: GridTable, azimuth: NDArray[np.float64], elevation: NDArray[np.float64], scratch: _Scratch, n: int
) -> NDArray[np.float32]:
    x, y, bent = (buffer[:n] for buffer in scratch.real[:3])
    column, row = (buffer[:n] for buffer in scratch.index)
    place, quad = scratch.place[:n], scratch.quad[:n]
    np.multiply(azimuth, 1.0 / 360.0, out=x, casting="same_kind")
    np.rint(x, out=bent)
    np.subtract(x, bent, out=x)  # in turns, -0.5 to 0.5
    np.clip(elevation, -90.0, 90.0, out=y, casting="same_kind")
    np.multiply(y, np.float32(1.0 / 90.0), out=y)
    np.multiply(x, np.float32(2.0), out=x)
    for axis, at, index in ((table.columns, x, column), (table.rows, y, row)):
        if axis.folded:
            np.abs(at, out=at)
        axis.bend(at, bent)
        np.copyto(index, at, casting="unsafe")
        np.minimum(index, np.int32(axis.cells - 1), out=index)
        np.subtract(at, index, out=at, casting="unsafe", dtype=np.float32)
    np.multiply(row, np.int32(table.columns.cells), out=row)
    np.add(row, column, out=place, casting="same_kind")
    np.take(table.quads, place, out=quad, mode="clip")
    parts = quad.view(np.float32).reshape(n, 4)
    np.multiply(parts[:, 3], x, out=bent)
    np.add(bent, parts[:, 2], out=bent)
    np.multiply(bent, y, out=bent)
    np.multiply(x, parts[:, 1], out=x)
    np.add(x, parts[:, 0], out=x)
    return np.add(x, bent, out=x)


_READERS: dict[str, Callable[..., NDArray[np.float32]]] = {
    "omni": _read_omni,
    "revolved": _read_revolved,
    "separable": _read_separable,
    "grid": _read_grid,
}
