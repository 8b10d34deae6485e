"""Paths of several widths as one batch: what depends on a path as a whole in columns, its samples in a set for each width.

Holds arrays; knows no losses.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.links.ways_past_trees import PathRows

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PathSets:
    """Sets of paths one after the other; columns (p,) over all of them."""

    sets: tuple[PathRows, ...]
    length_m: Floats
    a_amsl_m: Floats
    b_amsl_m: Floats

    @classmethod
    def of(cls, sets: Sequence[PathRows]) -> "PathSets":
        """From sets of paths in their order."""
        return cls(
            sets=tuple(sets),
            length_m=np.concatenate([one.length_m for one in sets]),
            a_amsl_m=np.concatenate([one.a_amsl_m for one in sets]),
            b_amsl_m=np.concatenate([one.b_amsl_m for one in sets]),
        )

    @property
    def slant_m(self) -> Floats:
        """Distances between the antennas, (p,)."""
        return np.hypot(self.length_m, self.b_amsl_m - self.a_amsl_m)

    def each(self) -> Iterator[tuple[slice, PathRows]]:
        """Each set with the columns that are its own."""
        start = 0
        for one in self.sets:
            yield slice(start, start + one.length_m.size), one
            start += one.length_m.size

    def among(self, paths: Index) -> Iterator[tuple[Index, PathRows]]:
        """Some of the paths, set by set: where in `paths`, rising, they stand, and their samples."""
        for own, one in self.each():
            first, after = np.searchsorted(paths, (own.start, own.stop))
            if first < after:
                yield np.arange(first, after), one.part(paths[first:after] - own.start)
