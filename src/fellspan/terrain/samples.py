"""The samples of one path as arrays, and how distances and samples are put together.

Knows no file and no raster.
"""

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.alongpath import Floats
from fellspan.terrain.cover import SurfaceStep

SAME_M = 5e-4
"""Samples no further apart than this are one."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Samples:
    """What stands at distances along a path; arrays (n,), meanings as in `PathProfile`."""

    distance_m: Floats
    latitude_deg: Floats
    longitude_deg: Floats
    ground_m: Floats
    cover_m: Floats
    cover_kind: NDArray[np.int8]
    obstacle_index: NDArray[np.int32]
    source: NDArray[np.int16]
    measured: NDArray[np.int8]
    sigma_m: Floats
    known: NDArray[np.bool_]
    """Trees and buildings are both known here."""
    valued: NDArray[np.bool_]
    """Every raster that should say what stands here does, or a survey does, whether or not that tells of all kinds."""
    negative_cover: bool = False
    removed: frozenset[int] = frozenset()
    """Which of the obstacles on the path a survey has removed somewhere."""
    surface_steps: tuple[SurfaceStep, ...] = ()
    """How the surface raster stands against the ground raster."""


def merged(exact_m: Floats, beside_m: Floats, regular_m: Floats, length_m: float) -> Floats:
    """Distances, rising by at least half a millimetre: of those that crowd, exact ones stay first, then those beside."""
    kept = np.array([0.0, length_m])
    for group in (exact_m, beside_m, regular_m):
        # Most of what is sorted here stands in order already: a stable sort then takes one pass.
        inside = np.sort(group[(group > 0.0) & (group < length_m)], kind="stable")
        if inside.size == 0:
            continue
        apart = np.empty(inside.size, dtype=np.bool_)
        apart[0] = True
        np.greater(inside[1:] - inside[:-1], SAME_M, out=apart[1:])
        inside = inside[apart]
        after = kept.searchsorted(inside)
        away = np.minimum(kept[after] - inside, inside - kept[after - 1])
        kept = np.sort(np.concatenate((kept, inside[away > SAME_M])), kind="stable")
    return kept


def joined(parts: Sequence[Samples]) -> Samples:
    """Samples of one path, taken in parts, in the order of their distance."""
    order = np.argsort(np.concatenate([part.distance_m for part in parts]), kind="stable")
    arrays = {
        field.name: np.concatenate([getattr(part, field.name) for part in parts])[order]
        for field in fields(Samples)
        if field.name not in ("negative_cover", "removed", "surface_steps")
    }
    return Samples(
        **arrays,
        negative_cover=any(part.negative_cover for part in parts),
        removed=frozenset().union(*(part.removed for part in parts)),
        surface_steps=tuple(step for part in parts for step in part.surface_steps),
    )
