"""The lower boundary of workable antenna levels, exact: pure geometry of points that a straight line must pass above.

`need` is linear in the two levels: at the share x of the path the ray stands at (1 - x) a + x b. It clears every point (x, y)
exactly where it clears their upper convex hull, and the line through each edge of the hull is a corner of the boundary. No
grid is searched. Knows nothing of terrain or radio.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
_FEW: Final = 64
_DUST_M: Final = 1e-9


def upper_hull(x: Floats, y: Floats) -> NDArray[np.intp]:
    """Indices of the corners of the upper convex hull of points whose `x` rises strictly, shape (h,), from left to right.

    Points at -inf are left out; the first and the last point must be finite.
    """
    left = np.flatnonzero(np.isfinite(y))
    # What lies below the hull of some of the points is no corner: the highest of each of many blocks leave few others.
    while left.size > _FEW:
        rough = _walk(x, y, _highest_of_blocks(y[left], left))
        above = y[left] > np.interp(x[left], x[rough], y[rough]) - _DUST_M
        before, left = left.size, np.union1d(left[above], rough)
        if left.size > before // 2:
            break
    return _walk(x, y, left)


def _highest_of_blocks(y: Floats, indices: NDArray[np.intp]) -> NDArray[np.intp]:
    """The ends, and of each of some tens of blocks of points the highest."""
    wide = math.isqrt(y.size)
    count = y.size // wide
    tops = y[: count * wide].reshape(count, wide).argmax(axis=1) + wide * np.arange(count)
    return np.unique(indices[np.concatenate(([0], tops, [y.size - 1]))])


def _walk(x: Floats, y: Floats, indices: NDArray[np.intp]) -> NDArray[np.intp]:
    """The hull of a few points, one after the other."""
    kept: list[int] = []
    xs, ys = x[indices].tolist(), y[indices].tolist()
    for i in range(indices.size):
        while len(kept) > 1:
            o, m = kept[-2], kept[-1]
            if (ys[m] - ys[o]) * (xs[i] - xs[o]) > (ys[i] - ys[o]) * (xs[m] - xs[o]):
                break
            kept.pop()
        kept.append(i)
    return np.asarray(indices[kept], dtype=np.intp)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Boundary:
    """Lowest workable levels, m above sea level: corners with `a_m` rising and `b_m` falling, shape (h - 1,).

    Left of the first corner no level of B helps, since A's own spot stands too high; right of the last one B needs what stands
    at its own spot. `touches` (h,) are the points that govern: corner j lies on the line through `touches[j]` and
    `touches[j + 1]`, and between the corners j - 1 and j the point `touches[j]` governs.
    """

    a_m: Floats
    b_m: Floats
    touches: NDArray[np.intp]

    @classmethod
    def over(cls, share: Floats, need_m: Floats) -> "Boundary":
        """Boundary of lines above the points (`share`, `need_m`), shape (n,); `share` rises strictly from 0 to 1.

        Points at -inf ask for nothing.
        """
        hull = upper_hull(share, need_m)
        x, y = share[hull], need_m[hull]
        slope = np.diff(y) / np.diff(x)
        # From the corner nearest to each end, so that no digits are lost.
        a = y[:-1] - slope * x[:-1]
        b = y[1:] + slope * (1.0 - x[1:])
        return cls(a_m=np.maximum.accumulate(a), b_m=np.minimum.accumulate(b), touches=hull)

    def lowest_b(self, a_m: float) -> float:
        """Lowest level of B for a level of A; infinite where none is enough."""
        return _lowest(a_m, self.a_m, self.b_m)

    def lowest_a(self, b_m: float) -> float:
        """Lowest level of A for a level of B; infinite where none is enough."""
        return _lowest(b_m, self.b_m[::-1], self.a_m[::-1])

    def lift(self, a_m: float, b_m: float, *, share: Floats, need_m: Floats) -> float:
        """How far both ends must rise alike from (a, b), m; negative where they can come down."""
        x = share[self.touches]
        return float((need_m[self.touches] - (1.0 - x) * a_m - x * b_m).max())

    def candidates(self, a_from_m: float, a_to_m: float, b_from_m: float, b_to_m: float) -> Floats:
        """Corners inside the limits, and where the boundary meets them, shape (m, 2): any linear cost is least at one."""
        at = [a_from_m, a_to_m, *self.a_m.tolist(), self.lowest_a(b_from_m), self.lowest_a(b_to_m)]
        return self.pairs_at(np.array(at), a_from_m, a_to_m, b_from_m, b_to_m)

    def lowest_a_each(self, levels_b_m: Floats) -> Floats:
        """`lowest_a` for many levels of B at once."""
        return _lowest_each(levels_b_m, self.b_m[::-1], self.a_m[::-1])

    def pairs_at(self, levels_a_m: Floats, a_from_m: float, a_to_m: float, b_from_m: float, b_to_m: float) -> Floats:
        """Lowest pairs within the limits at these levels of A, shape (m, 2); levels that do not work are left out."""
        a = np.maximum(levels_a_m, a_from_m)
        a = a[np.isfinite(a) & (a <= a_to_m)]
        b = np.maximum(_lowest_each(a, self.a_m, self.b_m), b_from_m)
        works = np.isfinite(b) & (b <= b_to_m)
        return np.column_stack((a[works], b[works]))


def _lowest_each(levels: Floats, given: Floats, sought: Floats) -> Floats:
    # A level that misses by rounding alone is on the boundary.
    return np.where(levels < given[0] - 1e-9, np.inf, np.interp(levels, given, sought))


def _lowest(level: float, given: Floats, sought: Floats) -> float:
    """Value of the falling line `sought` over the rising `given`; infinite left of it, its last value right of it."""
    return float(_lowest_each(np.array(level), given, sought))
