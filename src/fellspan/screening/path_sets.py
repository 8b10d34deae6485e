"""Paths of several widths as one batch: what depends on a path as a whole in columns, its samples in a set for each width.

Holds arrays, and has the smooth Earth fitted and horizons found for all of them; knows no losses.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.links.path_loss import TREE
from fellspan.links.ways_past_trees import PathRows, share_of_path
from fellspan.propagation.constants import EARTH_RADIUS_M
from fellspan.screening.laid import LaidBucket

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PathSets:
    """Sets of paths one after the other; columns (p,) over all of them."""

    sets: tuple[PathRows, ...]
    length_m: Floats
    a_amsl_m: Floats
    b_amsl_m: Floats
    a_height_m: Floats
    b_height_m: Floats
    """Above the smooth Earth fitted to the ground."""
    mean_ground_m: Floats
    sea_fraction: Floats

    @classmethod
    def of(cls, buckets: Sequence[LaidBucket]) -> "PathSets":
        """The paths of buckets in their order."""
        fitted = [_fitted(bucket) for bucket in buckets]
        sets = tuple(rows for rows, _ in fitted)
        columns = {
            name: np.concatenate([getattr(one, name) for one in sets])
            for name in ("length_m", "a_amsl_m", "b_amsl_m", "a_height_m", "b_height_m", "sea_fraction")
        }
        return cls(sets=sets, mean_ground_m=np.concatenate([mean for _, mean in fitted]), **columns)

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

    def horizons(self, inverse_k: Floats) -> Floats:
        """Slopes of the horizons over everything at values of 1/k (p, m), (3, p, m), as `propagation.bullington` has them."""
        from fellspan.screening import horizons_kernel

        curve = inverse_k / (2.0 * EARTH_RADIUS_M)
        found = np.empty((3, *inverse_k.shape))
        for own, one in self.each():
            part = np.empty((3, *curve[own].shape))
            horizons_kernel.horizons(one.distance_m, one.surface_m, one.a_amsl_m, one.b_amsl_m, curve[own], part)
            found[:, own] = part
        return found

    def smooth_horizons(self, inverse_k: Floats, paths: Index) -> Floats:
        """The same over the smooth Earth of some of the paths, rising, (3, r, m); `inverse_k` is (p, m) as before."""
        from fellspan.screening import horizons_kernel

        curve = inverse_k[paths] / (2.0 * EARTH_RADIUS_M)
        found = np.empty((3, *curve.shape))
        for place, one in self.among(paths):
            part = np.empty((3, place.size, curve.shape[1]))
            level = np.empty((place.size, 0))
            horizons_kernel.horizons(one.distance_m, level, one.a_height_m, one.b_height_m, curve[place], part)
            found[:, place] = part
        return found


def _fitted(bucket: LaidBucket) -> tuple[PathRows, Floats]:
    """The paths of a bucket as losses are worked out from, and the mean of their ground."""
    from fellspan.screening import horizons_kernel

    count, distance = bucket.length_m.size, bucket.distance_m
    ends, mean = np.empty((2, count)), np.empty(count)
    horizons_kernel.smooth_ends(distance, bucket.ground_m, bucket.a_amsl_m, bucket.b_amsl_m, ends, mean)
    rows = PathRows(
        distance_m=distance,
        ground_m=bucket.ground_m,
        surface_m=bucket.surface_m,
        trees=None if bucket.cover_kind is None else bucket.cover_kind == TREE,
        a_amsl_m=bucket.a_amsl_m,
        b_amsl_m=bucket.b_amsl_m,
        a_height_m=bucket.a_amsl_m - ends[0],
        b_height_m=bucket.b_amsl_m - ends[1],
        sea_fraction=np.zeros(count) if bucket.is_sea is None else share_of_path(distance, bucket.is_sea),
    )
    return rows, mean
