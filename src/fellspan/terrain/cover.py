"""Cover from rasters: heights above ground of one kind each, or a surface model beside bare ground.

Works on sampled values; opens nothing and knows nothing of obstacle files.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.alongpath import Floats
from fellspan.vocabulary import COVER_KINDS, CoverKind

NONE, OTHER = COVER_KINDS.index("none"), COVER_KINDS.index("other")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class CoverLayer:
    """Values of one cover raster along a path, m above ground, NaN where it has none; arrays (n,)."""

    kind: CoverKind
    value_m: Floats
    sigma_m: Floats
    growth_m: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Cover:
    """What rasters say stands on the ground; arrays (n,).

    `sigma_m` is the standard error of the height, 0 where nothing stands. `known` is False where a raster that should say
    what stands there has no value; all False where there is no such raster.
    """

    height_m: Floats
    kind: NDArray[np.int8]
    sigma_m: Floats
    known: NDArray[np.bool_]
    negative: bool
    """A cover raster held heights below 0; they were taken as 0."""
    from_surface: NDArray[np.bool_]
    """The height is surface less ground; `sigma_m` is then that of the surface itself."""


def combine(
    ground_m: Floats, layers: Sequence[CoverLayer], surface_m: Floats | None, surface_sigma_m: Floats | None
) -> Cover:
    """Combine cover rasters and a surface raster: the highest wins.

    Unknown cover counts as 0. A sample is known where the surface raster has a value, or where every kind that is given has
    one in at least one of its rasters. Where the surface is highest its kind is that of a cover raster that holds at least
    half of it, else 'other'; a tree so named grows.
    """
    count = ground_m.shape
    height = np.zeros(count)
    kind = np.full(count, NONE, dtype=np.int8)
    sigma = np.zeros(count)
    growth = np.zeros(count)
    negative = False
    has: dict[CoverKind, NDArray[np.bool_]] = {}
    for layer in layers:
        valid = np.isfinite(layer.value_m)
        has[layer.kind] = valid | has.get(layer.kind, np.zeros(count, dtype=np.bool_))
        negative = negative or bool((layer.value_m[valid] < 0.0).any())
        value = np.where(valid & (layer.value_m > 0.0), layer.value_m + layer.growth_m, 0.0)
        wins = value > height
        height = np.where(wins, value, height)
        kind[wins] = COVER_KINDS.index(layer.kind)
        sigma = np.where(wins, layer.sigma_m, sigma)
        growth = np.where(wins, layer.growth_m, growth)
    known = np.logical_and.reduce(list(has.values())) if has else np.zeros(count, dtype=np.bool_)
    from_surface = np.zeros(count, dtype=np.bool_)
    if surface_m is not None and surface_sigma_m is not None:
        above = surface_m - ground_m
        named = (kind != NONE) & (height - growth >= 0.5 * above)
        above = np.where(np.isfinite(above) & (above > 0.0), above + np.where(named, growth, 0.0), 0.0)
        from_surface = above > height
        height = np.where(from_surface, above, height)
        kind[from_surface & ~named] = OTHER
        sigma = np.where(from_surface, surface_sigma_m, sigma)
        known = known | np.isfinite(surface_m)
    return Cover(height_m=height, kind=kind, sigma_m=sigma, known=known, negative=negative, from_surface=from_surface)
