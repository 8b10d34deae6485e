"""Holes of exactly 0 inside high land: gaps that somebody filled with a number. Looks at cells; judges no file."""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy import ndimage

_LEAST_CELLS: Final = 4
_LEAST_RIM_M: Final = 10.0
"""A hole whose whole rim stands higher than this is no sea and hardly a lake (our own judgement, no source)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ZeroHoles:
    """How many holes, how many cells of them, and the lowest cell on any rim, m (None without holes)."""

    holes: int = 0
    cells: int = 0
    rim_m: float | None = None

    def __add__(self, other: "ZeroHoles") -> "ZeroHoles":
        rims = [rim for rim in (self.rim_m, other.rim_m) if rim is not None]
        return ZeroHoles(
            holes=self.holes + other.holes, cells=self.cells + other.cells, rim_m=min(rims) if rims else None
        )


def zero_holes(heights: NDArray[np.float64]) -> ZeroHoles:
    """The holes of one window, shape (rows, columns), NaN where nothing is known; what touches its edge is left out."""
    zero = heights == 0.0
    if zero.size == 0 or not zero.any() or zero.all():
        return ZeroHoles()
    labels, count = ndimage.label(zero)
    rim = np.full(count + 1, np.inf)
    whole = np.bincount(labels.ravel(), minlength=count + 1) >= _LEAST_CELLS
    for edge in (labels[0], labels[-1], labels[:, 0], labels[:, -1]):
        whole[edge] = False
    whole[0] = False
    for here, there in (
        (np.s_[:, :-1], np.s_[:, 1:]), (np.s_[:, 1:], np.s_[:, :-1]), (np.s_[:-1], np.s_[1:]), (np.s_[1:], np.s_[:-1]),
    ):  # fmt: skip
        beside = zero[here] & ~zero[there] & np.isfinite(heights[there])
        np.minimum.at(rim, labels[here][beside], heights[there][beside])
    holes = np.flatnonzero(whole & (rim > _LEAST_RIM_M) & np.isfinite(rim))
    if not holes.size:
        return ZeroHoles()
    cells = int(np.isin(labels, holes).sum())
    return ZeroHoles(holes=int(holes.size), cells=cells, rim_m=float(rim[holes].min()))
