"""Profiles of many pairs as arrays: the regular samples, then the same with the worst minima looked at again.

Puts distances and samples together as `Terrain.profile` and `Terrain.refine` do for one path; knows no rays and no criteria.
"""

from dataclasses import dataclass, fields, replace
from typing import Final, TypeVar

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.many import LaidPaths, ManySamples
from fellspan.terrain.samples import SAME_M

Floats = NDArray[np.float64]
Index = NDArray[np.int64]
Scalar = TypeVar("Scalar", bound=np.generic)

PER_OCTAVE: Final = 8
"""Widths of arrays that paths are filled up to: so many between a number and its double. A width depends on the path alone, so
that its sums come out the same whatever other paths stand beside it."""

FINE_PER_OCTAVE: Final = 4
"""The same for paths that were looked at more closely, whose numbers scatter more."""


def steps_of(length_m: Floats, step_m: Floats) -> Index:
    """How many equal steps of at most `step_m` each path is divided into, (p,)."""
    return np.maximum(np.ceil(length_m / step_m - 1e-9), 1.0).astype(np.int64)


def width_of(samples: Index, *, per_octave: int = PER_OCTAVE) -> Index:
    """The width of array that paths with so many samples are kept in, (p,)."""
    power = np.ceil(np.log2(samples) * per_octave - 1e-9) / per_octave
    return np.maximum(np.ceil(np.exp2(power) - 1e-9).astype(np.int64), samples)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Profiles:
    """Paths with about the same number of samples, arrays (q, n), or (q, 1) for one value all along; per-path columns (q,).

    `last` is the index of each path's last sample of its own; see `regular` and `Profiles.closer` for what stands beyond it.
    """

    which: Index
    """Which of the batch."""
    last: Index
    length_m: Floats
    cell_m: Floats
    distance_m: Floats
    ground_m: Floats
    cover_m: Floats | None
    cover_kind: NDArray[np.int8] | None
    sigma_m: Floats
    ground_sigma_m: Floats
    source: NDArray[np.int16]
    known: NDArray[np.bool_]
    wet: NDArray[np.bool_] | None
    tells: NDArray[np.bool_]

    def rows(self, rows: Index | NDArray[np.bool_]) -> "Profiles":
        """Some of the paths."""
        return replace(
            self,
            **{field.name: value[rows] for field in fields(self) if (value := getattr(self, field.name)) is not None},
        )


def regular(
    laid: LaidPaths, which: Index, *, length_m: Floats, steps: Index, width: int
) -> tuple[Profiles, NDArray[np.bool_]]:
    """Paths at their regular steps, filled up to `width` with repeats of the last sample; and which are in doubt, (q,)."""
    from fellspan.screening import paths_kernel

    last, length = steps[which], length_m[which]
    distance, t = np.empty((which.size, width)), np.empty((which.size, width))
    paths_kernel.equal_steps(length, last, distance, t)
    laid.read_for(t, which)
    found = laid.sample(t, which, last=last)
    profiles = _profiles(found, which=which, last=last, length_m=length, cell_m=laid.cell_m[which], distance_m=distance)
    return profiles, found.doubtful


def closer(
    laid: LaidPaths, coarse: Profiles, rows: Index, *, more: NDArray[np.int32], total: Index, width: int, step_m: Floats
) -> tuple[Profiles, NDArray[np.bool_]]:
    """Some of the paths, with more samples.

    Parameters
    ----------
    laid
        What they are sampled from.
    coarse
        Paths at their regular steps.
    rows
        Which of them, (g,).
    more, total, step_m
        Of all of `coarse`: how many samples come after each, (q, n), at distances that `step_m`, (q,), divides, and how many
        the path then has, (q,), at most `width`.

    Returns
    -------
    profiles, doubtful
        Filled up with repeats of the last sample but one: maxima, minima and lengths do not notice. Which are in doubt, (g,).
    """
    from fellspan.screening import paths_kernel

    columns = coarse.distance_m.shape[1]
    new = total[rows] - 1 - coarse.last[rows]
    count = int(new.sum())
    distance, come_from = np.empty((rows.size, width)), np.empty((rows.size, width), dtype=np.int64)
    t, row_of, start_of = np.empty((count, 1)), np.empty(count, dtype=np.int64), np.empty(count, dtype=np.int64)
    paths_kernel.with_more(
        rows,
        coarse.distance_m,
        coarse.last,
        coarse.length_m,
        more,
        step_m,
        SAME_M,
        np.cumsum(new) - new,
        distance,
        come_from,
        t[:, 0],
        row_of,
        start_of,
    )
    which = coarse.which[rows]
    wet = None if coarse.wet is None else coarse.wet.reshape(-1)[start_of][:, np.newaxis]
    found = laid.sample(t, which[row_of], wet=wet)
    doubtful = np.zeros(rows.size, dtype=np.bool_)
    doubtful[row_of[found.doubtful]] = True

    def both(old: NDArray[Scalar], fresh: NDArray[Scalar]) -> NDArray[Scalar]:
        wide = np.broadcast_to(old, (coarse.distance_m.shape[0], columns))
        joined = np.empty(come_from.shape, dtype=old.dtype)
        paths_kernel.joined(
            np.ascontiguousarray(wide).reshape(-1), np.ascontiguousarray(fresh[:, 0]), come_from, joined
        )
        return joined

    def alike(old: NDArray[Scalar], fresh: NDArray[Scalar]) -> NDArray[Scalar]:
        """One value all along stays one, unless the closer look has met another."""
        fresh = np.broadcast_to(fresh, (count, 1))
        if old.shape[1] == 1 and (columns > 1) and bool((fresh[:, 0] == old[rows[row_of], 0]).all()):
            return old[rows]
        return both(old, fresh)

    cover = kind = None
    if coarse.cover_m is not None and found.cover_m is not None:
        cover = both(coarse.cover_m, found.cover_m)
    if coarse.cover_kind is not None and found.cover_kind is not None:
        kind = both(coarse.cover_kind, found.cover_kind)
    profiles = Profiles(
        which=which,
        last=total[rows] - 1,
        length_m=coarse.length_m[rows],
        cell_m=coarse.cell_m[rows],
        distance_m=distance,
        ground_m=both(coarse.ground_m, found.ground_m),
        cover_m=cover,
        cover_kind=kind,
        sigma_m=alike(coarse.sigma_m, found.sigma_m),
        ground_sigma_m=alike(coarse.ground_sigma_m, found.ground_sigma_m),
        source=alike(coarse.source, found.source),
        known=alike(coarse.known, found.known),
        wet=None,
        tells=coarse.tells[rows],
    )
    return profiles, doubtful


def _profiles(
    found: ManySamples, *, which: Index, last: Index, length_m: Floats, cell_m: Floats, distance_m: Floats
) -> Profiles:
    return Profiles(
        which=which,
        last=last,
        length_m=length_m,
        cell_m=cell_m,
        distance_m=distance_m,
        ground_m=found.ground_m,
        cover_m=found.cover_m,
        cover_kind=found.cover_kind,
        sigma_m=found.sigma_m,
        ground_sigma_m=found.ground_sigma_m,
        source=found.source,
        known=found.known,
        wet=found.wet,
        tells=found.tells,
    )
