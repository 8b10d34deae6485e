"""Which gaps of the rasters under a path may be taken as open water: those whose shores lie near the sea's level.

Works on ground levels along one path; opens nothing.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.alongpath import Floats

SEA_ERROR_M: Final = 0.5
"""Standard error of a sea level that fills gaps, m: waves and the tide left over (common practice, no source)."""
SHORE_M: Final = 5.0
"""How far the ground beside a gap may lie from the level of the sea, three standard errors apart, m (our own choice)."""
_SIGMAS = 3.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Shores:
    """Ground that is known along a path, arrays (n,), distances rising: what stands beside a gap decides about it."""

    distance_m: Floats
    ground_m: Floats
    sigma_m: Floats
    sea_level_m: float

    @classmethod
    def of(cls, distance_m: Floats, ground_m: Floats, sigma_m: Floats, *, sea_level_m: float) -> "Shores":
        """From samples with NaN in the gaps."""
        known = np.isfinite(ground_m)
        return cls(
            distance_m=distance_m[known],
            ground_m=ground_m[known],
            sigma_m=sigma_m[known],
            sea_level_m=sea_level_m,
        )

    def are_sea(self, distance_m: Floats) -> NDArray[np.bool_]:
        """Of places without data, (n,): True where the nearest known ground on both sides lies near the sea's level.

        A gap that reaches an end of the path is not taken as sea: nothing then tells where the antenna stands.
        """
        if self.distance_m.size == 0:
            return np.zeros(distance_m.shape, dtype=np.bool_)
        low = np.abs(self.ground_m - self.sea_level_m) <= SHORE_M + _SIGMAS * self.sigma_m
        before = np.searchsorted(self.distance_m, distance_m, side="right") - 1
        after = before + 1
        inside = (before >= 0) & (after < self.distance_m.size)
        last = self.distance_m.size - 1
        return inside & low[np.maximum(before, 0)] & low[np.minimum(after, last)]

    def reason(self, from_m: float, to_m: float) -> str:
        """Why a gap is not taken as sea."""
        middle = 0.5 * (from_m + to_m)
        after = int(np.searchsorted(self.distance_m, middle, side="right"))
        ends = [end for end, open_ in (("A", after == 0), ("B", after == self.distance_m.size)) if open_]
        if ends:
            return f"not taken as sea: it reaches the path's end {' and '.join(ends)}, where the ground must be known"
        beside = max(
            (after - 1, after), key=lambda i: abs(self.ground_m[i] - self.sea_level_m) - _SIGMAS * self.sigma_m[i]
        )
        return (
            f"not taken as sea: beside it, at {self.distance_m[beside] / 1000.0:.2f} km, the ground is "
            f"{self.ground_m[beside]:.1f} m, and the sea {self.sea_level_m:g} m"
        )


def near_shores(
    ground_m: Floats, sigma_m: Floats, inside: NDArray[np.bool_], *, sea_level_m: float
) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """For many paths, arrays (q, n): whether the nearest known ground at or before each sample lies near the sea's level, and
    whether the nearest at or after it does. False where there is none; `inside` tells samples from what fills up paths.

    A place without data is sea, as `Shores.are_sea` has it, where both hold of the samples on its two sides.
    """
    count = ground_m.shape[1]
    known = inside & np.isfinite(ground_m)
    with np.errstate(invalid="ignore"):
        low = known & (np.abs(ground_m - sea_level_m) <= SHORE_M + _SIGMAS * sigma_m)
    place = np.arange(count)
    before = np.maximum.accumulate(np.where(known, place, -1), axis=1)
    after = np.minimum.accumulate(np.where(known, place, count)[:, ::-1], axis=1)[:, ::-1]
    low_before = np.take_along_axis(low, np.maximum(before, 0), axis=1) & (before >= 0)
    low_after = np.take_along_axis(low, np.minimum(after, count - 1), axis=1) & (after < count)
    return low_before, low_after
