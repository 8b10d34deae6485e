"""Cover from rasters: heights above ground of one kind each, or a surface model beside bare ground.

Works on sampled values; opens nothing and knows nothing of obstacle files.
"""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.errors import SeamError
from fellspan.terrain.alongpath import Floats
from fellspan.terrain.seams import allowed_m
from fellspan.terrain.stack import StackSample
from fellspan.vocabulary import COVER_KINDS, CoverKind

NONE, OTHER = COVER_KINDS.index("none"), COVER_KINDS.index("other")
_NEEDED: Final[tuple[CoverKind, ...]] = ("tree", "building")
"""What must be known before the surface is."""
_FEWEST_POINTS, _NOTED_SHARE = 5, 0.05
_RISES_M: Final = 0.5
"""A surface that nowhere stands this far above the ground shows nothing on it, m (our own rule)."""
_LONG_M, _LAND_M = 200.0, 1.0
"""That is remarkable on a path longer than this, most of it on ground above this level, m (our own rule)."""


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

    `sigma_m` is the standard error of the height, 0 where nothing stands. `valued` is False where a raster that should say
    what stands there has no value, and all False where there is no such raster; `known` is False also where trees or
    buildings are in no raster.
    """

    height_m: Floats
    kind: NDArray[np.int8]
    sigma_m: Floats
    known: NDArray[np.bool_]
    valued: NDArray[np.bool_]
    negative: bool
    """A cover raster held heights below 0; they were taken as 0."""
    from_surface: NDArray[np.bool_]
    """The height is surface less ground; `sigma_m` is then that of the surface itself."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SurfaceStep:
    """How a surface raster stands against a ground raster along a path; `share_below` of its samples lie too deep."""

    ground: str
    surface: str
    points: int
    median_m: float
    allowed_m: float
    """What the errors of both explain: 3 combined standard errors, 1 m at least."""
    below: int
    worst_m: float
    worst_at_m: float
    highest_m: float
    """Greatest height of the surface above the ground."""
    on_land: int
    """How many of the points stand above the level of a shore."""

    @property
    def is_refused(self) -> bool:
        """True where the surface lies below the ground all along, by more than is allowed."""
        return self.points >= _FEWEST_POINTS and self.median_m < -self.allowed_m

    @property
    def is_noted(self) -> bool:
        """True where it does so on more than a twentieth of the samples."""
        return self.below > _NOTED_SHARE * self.points

    @property
    def low_note(self) -> str:
        """A sentence where the surface lies below the ground in the median, though their errors may explain it; else ''."""
        if self.median_m >= -_RISES_M:
            return ""
        return (
            f"{self.surface} lies {-self.median_m:.1f} m below {self.ground} in the median along this path: check the unit "
            "and the vertical datum of both"
        )

    def __str__(self) -> str:
        return (
            f"{self.surface} lies below {self.ground} by more than their errors explain on "
            f"{100.0 * self.below / self.points:.0f} % of this path, by {-self.worst_m:.1f} m at "
            f"{self.worst_at_m / 1000.0:.2f} km; the ground counts there"
        )

    def error(self) -> SeamError:
        """The error that refuses the pair."""
        return SeamError(
            f"surface {self.surface} lies {-self.median_m:.1f} m below ground {self.ground} in the median along the path",
            f"allowed is {self.allowed_m:.1f} m, three standard errors of both; median of {self.points} points",
            "is one in feet, above another datum, or are the two swapped? correct the unit or datum that is declared,",
            "or state the larger error of the worse one with error_m",
        )


def surface_steps(
    distance_m: Floats, ground: StackSample, surface: StackSample, names: tuple[Sequence[str], Sequence[str]]
) -> tuple[SurfaceStep, ...]:
    """Surface less ground for each pair of rasters that meet under a path; `names` those of ground and surface rasters."""
    both = np.isfinite(ground.value_m) & np.isfinite(surface.value_m)
    if not both.any():
        return ()
    step = surface.value_m - ground.value_m
    allowed = allowed_m(ground.sigma_m, surface.sigma_m)
    pairs = np.column_stack((ground.source, surface.source))
    found = []
    for first, second in np.unique(pairs[both], axis=0).tolist():
        here = np.flatnonzero(both & (pairs[:, 0] == first) & (pairs[:, 1] == second))
        worst = here[int(np.argmin(step[here]))]
        found.append(
            SurfaceStep(
                ground=names[0][first],
                surface=names[1][second],
                points=int(here.size),
                median_m=float(np.median(step[here])),
                allowed_m=float(np.median(allowed[here])),
                below=int(np.count_nonzero(step[here] < -allowed[here])),
                worst_m=float(step[worst]),
                worst_at_m=float(distance_m[worst]),
                highest_m=float(step[here].max()),
                on_land=int(np.count_nonzero(ground.value_m[here] > _LAND_M)),
            )
        )
    return tuple(found)


def never_rises(steps: Sequence[SurfaceStep], length_m: float) -> bool:
    """True where no surface raster stands above the ground anywhere on a long path over land: it may be bare ground."""
    points = sum(step.points for step in steps)
    on_land = sum(step.on_land for step in steps)
    return length_m > _LONG_M and 2 * on_land > points and all(step.highest_m <= _RISES_M for step in steps)


def may_be_refused(
    step_m: Floats, ground_sigma_m: Floats, surface_sigma_m: Floats, *, inside: NDArray[np.bool_], is_one_pair: bool
) -> NDArray[np.bool_]:
    """Paths (q,) of which `surface_steps` might refuse the pair of rasters, by surface less ground at samples (q, n).

    `inside` tells samples from what fills up shorter paths, (q, n); `is_one_pair` whether one ground and one surface raster
    answer everywhere.
    """
    below = inside & (step_m < -allowed_m(ground_sigma_m, surface_sigma_m))
    count = below.sum(axis=1)
    if not is_one_pair:
        return np.asarray(2 * count >= _FEWEST_POINTS)
    return np.asarray((2 * count >= _FEWEST_POINTS) & (2 * count >= (inside & np.isfinite(step_m)).sum(axis=1)))


def rises_somewhere(
    step_m: Floats, ground_m: Floats, length_m: Floats, *, inside: NDArray[np.bool_]
) -> NDArray[np.bool_]:
    """Paths (q,) of which `never_rises` is False, by surface less ground and by ground at samples (q, n)."""
    both = inside & np.isfinite(step_m)
    on_land = (both & (ground_m > _LAND_M)).sum(axis=1)
    highest = np.where(both, step_m, -np.inf).max(axis=1)
    return np.asarray(~((length_m > _LONG_M) & (2 * on_land > both.sum(axis=1)) & (highest <= _RISES_M)))


def missing_kinds(layers: Iterable[CoverKind], complete: Iterable[CoverKind]) -> tuple[CoverKind, ...]:
    """Which of tree and building no cover raster and no complete file tells of; a raster of kind 'other' tells of both."""
    told = {*layers, *complete}
    return () if "other" in told else tuple(kind for kind in _NEEDED if kind not in told)


def combine(
    ground_m: Floats,
    layers: Sequence[CoverLayer],
    surface_m: Floats | None,
    surface_sigma_m: Floats | None,
    *,
    complete: Iterable[CoverKind] = (),
) -> Cover:
    """Combine cover rasters and a surface raster: the highest wins.

    Unknown cover counts as 0. A sample has a value where the surface raster has one, or where every kind that is given has
    one in at least one of its rasters. It is known where the surface raster has a value, or where trees and buildings both
    are in rasters that have one, in a raster of kind 'other', or in files declared `complete`.

    Where the surface is highest its kind is that of a cover raster that holds at least half of it, else 'other'; a tree so
    named grows.
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
    valued = np.logical_and.reduce(list(has.values())) if has else np.zeros(count, dtype=np.bool_)
    complete = tuple(complete)
    if missing_kinds(has, complete):
        known = np.zeros(count, dtype=np.bool_)
    else:
        known = valued if has else np.ones(count, dtype=np.bool_)
    from_surface = np.zeros(count, dtype=np.bool_)
    if surface_m is not None and surface_sigma_m is not None:
        above = surface_m - ground_m
        named = (kind != NONE) & (height - growth >= 0.5 * above)
        above = np.where(np.isfinite(above) & (above > 0.0), above + np.where(named, growth, 0.0), 0.0)
        from_surface = above > height
        height = np.where(from_surface, above, height)
        kind[from_surface & ~named] = OTHER
        sigma = np.where(from_surface, surface_sigma_m, sigma)
        known, valued = known | np.isfinite(surface_m), valued | np.isfinite(surface_m)
    return Cover(
        height_m=height,
        kind=kind,
        sigma_m=sigma,
        known=known,
        valued=valued,
        negative=negative,
        from_surface=from_surface,
    )
