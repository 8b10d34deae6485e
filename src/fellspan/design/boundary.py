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
_FEW: Final = 32


def upper_hull(x: Floats, y: Floats) -> NDArray[np.intp]:
    """Indices of the corners of the upper convex hull of points whose `x` rises strictly, shape (h,), from left to right.

    Points at -inf are left out; the first and the last point must be finite.
    """
    left = np.flatnonzero(np.isfinite(y))
    # A point on or below the chord of its two neighbours is no corner: all such at once, again and again.
    while left.size > _FEW:
        px, py = x[left], y[left]
        rise = (py[1:-1] - py[:-2]) * (px[2:] - px[:-2]) - (py[2:] - py[:-2]) * (px[1:-1] - px[:-2])
        stays = np.concatenate(([True], rise > 0.0, [True]))
        if stays.all():
            break
        left = left[stays]
    kept: list[int] = []
    xs, ys = x[left].tolist(), y[left].tolist()
    for i in range(left.size):
        while len(kept) > 1:
            o, m = kept[-2], kept[-1]
            if (ys[m] - ys[o]) * (xs[i] - xs[o]) > (ys[i] - ys[o]) * (xs[m] - xs[o]):
                break
            kept.pop()
        kept.append(i)
    return np.asarray(left[kept], dtype=np.intp)


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

    def candidates(self, a_from_m: float, a_to_m: float, b_from_m: float, b_to_m: float) -> list[tuple[float, float]]:
        """Corners inside the limits, and where the boundary meets them: any linear cost is least at one of these."""
        at = [a_from_m, a_to_m, *self.a_m.tolist(), self.lowest_a(b_from_m), self.lowest_a(b_to_m)]
        return self.pairs_at(at, a_from_m, a_to_m, b_from_m, b_to_m)

    def pairs_at(
        self, levels_a_m: list[float], a_from_m: float, a_to_m: float, b_from_m: float, b_to_m: float
    ) -> list[tuple[float, float]]:
        """Lowest pairs within the limits at these levels of A; levels that do not work are left out."""
        found = []
        for a in levels_a_m:
            level = max(a, a_from_m)
            if not (math.isfinite(level) and level <= a_to_m):
                continue
            b = max(self.lowest_b(level), b_from_m)
            if b <= b_to_m and math.isfinite(b):
                found.append((level, b))
        return found


def _lowest(level: float, given: Floats, sought: Floats) -> float:
    """Value of the falling line `sought` over the rising `given`; infinite left of it, its last value right of it."""
    if level < given[0]:
        # A level that misses by rounding alone is on the boundary.
        return float(sought[0]) if level >= given[0] - 1e-9 else math.inf
    if level >= given[-1]:
        return float(sought[-1])
    return float(np.interp(level, given, sought))
