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

    def narrowed(self, width: int) -> "Profiles":
        """As it is, or with fewer columns where what fills up the paths can be spared."""
        count = self.distance_m.shape[1]
        if width >= count:
            return self

        def narrow(values: NDArray[Scalar]) -> NDArray[Scalar]:
            if values.ndim < 2 or values.shape[1] != count:
                return values
            return np.concatenate((values[:, : width - 1], values[:, -1:]), axis=1)

        return replace(
            self,
            **{field.name: narrow(value) for field in fields(self) if (value := getattr(self, field.name)) is not None},
        )


def regular(
    laid: LaidPaths, which: Index, *, length_m: Floats, steps: Index, width: int
) -> tuple[Profiles, NDArray[np.bool_]]:
    """Paths at their regular steps, filled up to `width` with repeats of the last sample; and which are in doubt, (q,)."""
    last = steps[which]
    length = length_m[which]
    place = np.arange(width)
    distance = np.minimum(place, last[:, np.newaxis]) * (length / last)[:, np.newaxis]
    inside = place <= last[:, np.newaxis]
    np.copyto(distance, length[:, np.newaxis], where=place >= last[:, np.newaxis])
    t = 2.0 * (distance / length[:, np.newaxis]) - 1.0
    laid.read_for(t, which)
    found = laid.sample(t, which, inside=inside)
    profiles = _profiles(found, which=which, last=last, length_m=length, cell_m=laid.cell_m[which], distance_m=distance)
    return profiles, found.doubtful


def closer(
    laid: LaidPaths, coarse: Profiles, wanted: NDArray[np.bool_], *, step_m: Floats
) -> tuple[Profiles, NDArray[np.bool_]]:
    """The same paths with more samples on both sides of those `wanted`, (q, n), at distances that `step_m`, (q,), divides.

    Filled up with repeats of the last sample but one: maxima, minima and lengths do not notice. Also which are in doubt, (q,).
    """
    count, columns = coarse.distance_m.shape
    covered = wanted[:, :-1] | wanted[:, 1:]
    path, interval = np.nonzero(covered)
    step = step_m[path]
    start, stop = coarse.distance_m[path, interval], coarse.distance_m[path, interval + 1]
    # As `merged` has it, what stands within half a millimetre of a sample is left out.
    first = np.floor((start + SAME_M) / step) + 1.0
    after = np.ceil((stop - SAME_M) / step)
    more = np.maximum(after - first, 0.0).astype(np.int64)
    added = np.zeros((count, columns), dtype=np.int64)
    added[path, interval + 1] = more
    place = np.cumsum(added, axis=1) + np.arange(columns)
    total = place[np.arange(count), coarse.last] + 1
    width = int(width_of(total, per_octave=FINE_PER_OCTAVE).max())

    begins = np.cumsum(more) - more
    within = np.arange(int(more.sum())) - np.repeat(begins, more)
    fine_path = np.repeat(path, more)
    fine_m = (np.repeat(first, more) + within) * np.repeat(step, more)
    fine_place = np.repeat(place[path, interval], more) + 1 + within

    # Where each sample comes from: one of the coarse ones, or one of the new ones behind them all.
    rows = np.arange(count)[:, np.newaxis] * width
    come_from = np.zeros((count, width), dtype=np.int64)
    flat = come_from.reshape(-1)
    np.copyto(place, width - 1, where=np.arange(columns) >= coarse.last[:, np.newaxis])
    place += rows
    flat[place] = np.arange(count * columns).reshape(count, columns)
    flat[fine_place + fine_path * width] = count * columns + np.arange(fine_m.size)
    # Beyond the last sample but one: the last new one of the path, where the path ends with new ones.
    behind = flat[(total - 2) + rows[:, 0]]
    np.copyto(come_from, behind[:, np.newaxis], where=np.arange(width) >= (total - 1)[:, np.newaxis])
    come_from[:, -1] = np.arange(count) * columns + coarse.last

    t = 2.0 * (fine_m / coarse.length_m[fine_path]) - 1.0
    wet = None if coarse.wet is None else np.repeat(coarse.wet[path, interval], more)[:, np.newaxis]
    found = laid.sample(t[:, np.newaxis], coarse.which[fine_path], wet=wet)
    doubtful = np.zeros(count, dtype=np.bool_)
    doubtful[fine_path[found.doubtful]] = True

    def both(old: NDArray[Scalar], new: NDArray[Scalar]) -> NDArray[Scalar]:
        wide = np.broadcast_to(old, (count, columns)).reshape(-1)
        return np.concatenate((wide, new.reshape(-1))).take(come_from)

    def alike(old: NDArray[Scalar], new: NDArray[Scalar]) -> NDArray[Scalar]:
        """One value all along stays one, unless the closer look has met another."""
        if old.shape[1] == 1 and (columns > 1) and bool((new[:, 0] == old[fine_path, 0]).all()):
            return old
        return both(old, np.broadcast_to(new, (fine_m.size, 1)))

    cover = kind = None
    if coarse.cover_m is not None and found.cover_m is not None:
        cover = both(coarse.cover_m, found.cover_m)
    if coarse.cover_kind is not None and found.cover_kind is not None:
        kind = both(coarse.cover_kind, found.cover_kind)
    profiles = replace(
        coarse,
        last=total - 1,
        distance_m=both(coarse.distance_m, fine_m),
        ground_m=both(coarse.ground_m, found.ground_m),
        cover_m=cover,
        cover_kind=kind,
        sigma_m=alike(coarse.sigma_m, found.sigma_m),
        ground_sigma_m=alike(coarse.ground_sigma_m, found.ground_sigma_m),
        source=alike(coarse.source, found.source),
        known=alike(coarse.known, found.known),
        wet=None,
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
