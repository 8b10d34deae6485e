"""Diffraction along paths, and trees counted once: over everything, or over all but the trees and through the woods.

Arrays throughout, so that one path and a batch are the same thing: path arrays (..., n), one value a path (...), results
(..., m, f) for m values of 1/k and f frequencies. Knows no profiles, radios or verdicts.
"""

from dataclasses import dataclass
from typing import Final, Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.propagation import (
    earth_bulge_m,
    effective_heights_m,
    spherical_earth_loss_db,
    woodland_loss_db,
    woodland_loss_spread_db,
    woodland_saturation_db,
    woodland_specific_db_per_m,
)
from fellspan.propagation.bullington import fitted_delta_bullington_loss_db
from fellspan.vocabulary import Polarization

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

DIFFERS_DB: Final = 1e-9
"""Two ways whose losses differ by no more than this cost the same."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PathRows:
    """Paths laid on the terrain, own buildings out; the last axis of the first four runs along the path.

    `surface_m` is what a ray must clear, `trees` where that is trees; None where there are none anywhere. Levels are m above
    sea level, `a_height_m` and `b_height_m` those above the smooth Earth fitted to the ground; `sea_fraction` is the share of
    the path over open sea.
    """

    distance_m: Floats
    ground_m: Floats
    surface_m: Floats
    trees: Flags | None
    a_amsl_m: Floats
    b_amsl_m: Floats
    a_height_m: Floats
    b_height_m: Floats
    sea_fraction: Floats

    @classmethod
    def of(
        cls,
        *,
        distance_m: Floats,
        ground_m: Floats,
        surface_m: Floats,
        trees: Flags | None,
        a_amsl_m: Floats,
        b_amsl_m: Floats,
        sea_fraction: Floats,
    ) -> "PathRows":
        """Paths with the smooth Earth fitted to their ground."""
        a_height, b_height = effective_heights_m(distance_m, ground_m, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m)
        return cls(
            distance_m=distance_m,
            ground_m=ground_m,
            surface_m=surface_m,
            trees=trees,
            a_amsl_m=a_amsl_m,
            b_amsl_m=b_amsl_m,
            a_height_m=np.asarray(a_height),
            b_height_m=np.asarray(b_height),
            sea_fraction=sea_fraction,
        )

    @property
    def length_m(self) -> Floats:
        """Path lengths, shape (...)."""
        return np.asarray(self.distance_m[..., -1])

    @property
    def slant_m(self) -> Floats:
        """Distances between the antennas, shape (...)."""
        return np.hypot(self.length_m, self.b_amsl_m - self.a_amsl_m)

    def part(self, rows: NDArray[np.int64]) -> "PathRows":
        """Some paths of a batch of shape (p,)."""
        surface = self.surface_m[rows]
        return PathRows(
            distance_m=self.distance_m[rows],
            ground_m=surface if self.surface_m is self.ground_m else self.ground_m[rows],
            surface_m=surface,
            trees=None if self.trees is None else self.trees[rows],
            a_amsl_m=self.a_amsl_m[rows],
            b_amsl_m=self.b_amsl_m[rows],
            a_height_m=self.a_height_m[rows],
            b_height_m=self.b_height_m[rows],
            sea_fraction=self.sea_fraction[rows],
        )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class WaysPast:
    """Diffraction over everything and over all but trees, (..., m, f), and what the woods on the way cost, (..., f); dB."""

    over_db: Floats
    solid_db: Floats
    woods_db: Floats

    @property
    def through_db(self) -> Floats:
        """Diffraction over all but trees, and the way through them."""
        return self.solid_db + self.woods_db[..., np.newaxis, :]

    @property
    def is_through(self) -> Flags:
        """Where the way through is the cheaper one."""
        return self.through_db < self.over_db - DIFFERS_DB

    @property
    def cheaper_db(self) -> Floats:
        """The sum of diffraction and woods on the cheaper way."""
        return np.minimum(self.through_db, self.over_db)


def sample_lengths_m(distance_m: Floats) -> Floats:
    """Length of path that each sample stands for, m, shape (..., n)."""
    between = 0.5 * np.diff(distance_m, axis=-1)
    lengths = np.zeros(distance_m.shape)
    lengths[..., :-1] = between
    lengths[..., 1:] += between
    return lengths


def share_of_path(distance_m: Floats, inside: Flags) -> Floats:
    """Share of the path, 0 to 1, that some of its samples stand for, shape (...)."""
    return np.asarray(np.sum(sample_lengths_m(distance_m), axis=-1, where=inside) / distance_m[..., -1])


def mean_over_path_m(distance_m: Floats, height_m: Floats) -> Floats:
    """Mean of heights along the path, each sample by the length it stands for, m, shape (...)."""
    return np.asarray(np.sum(sample_lengths_m(distance_m) * height_m, axis=-1) / distance_m[..., -1])


def depth_in_trees_m(rows: PathRows, *, k: ArrayLike) -> Floats:
    """Length of the ray between the ground and the tops of trees at one k, m, shape (...)."""
    if rows.trees is None:
        return np.zeros(rows.length_m.shape)
    at, length = rows.distance_m, rows.length_m[..., np.newaxis]
    share = at / length
    ray = rows.a_amsl_m[..., np.newaxis] * (1.0 - share) + rows.b_amsl_m[..., np.newaxis] * share
    ray = ray - np.asarray(earth_bulge_m(at, length - at, k=k))
    inside = rows.trees & (ray < rows.surface_m)
    return np.asarray(np.sum(sample_lengths_m(at), axis=-1, where=inside))


def ways_past_trees(
    rows: PathRows, *, inverse_k: Floats, frequency_hz: Floats, polarization: Polarization, depth_m: Floats
) -> WaysPast:
    """Losses of both ways.

    Diffraction is delta-Bullington (P.526-16, section 4.5.2) over the surface; the smooth-Earth fit takes the ground.

    Parameters
    ----------
    rows
        Paths of shape (...).
    inverse_k
        Values of 1/k, shape (m,) for all of them, or (..., m).
    frequency_hz
        Hz, shape (f,).
    polarization
        Of the radio.
    depth_m
        Length of the ray in trees, m, shape (...), from `depth_in_trees_m`.
    """
    with np.errstate(divide="ignore"):
        k = 1.0 / inverse_k
    over = _diffraction_db(rows, rows.surface_m, k=k, frequency_hz=frequency_hz, polarization=polarization)
    solid = over
    if rows.trees is not None:
        with_trees = rows.trees.any(axis=-1)
        if not with_trees.ndim and with_trees:
            bare = np.where(rows.trees, rows.ground_m, rows.surface_m)
            solid = _diffraction_db(rows, bare, k=k, frequency_hz=frequency_hz, polarization=polarization)
        elif with_trees.any():
            some = np.flatnonzero(with_trees)
            few = rows.part(some)
            assert few.trees is not None
            bare = np.where(few.trees, few.ground_m, few.surface_m)
            its_k = k if k.ndim == 1 else k[some]
            solid = over.copy()
            solid[some] = _diffraction_db(few, bare, k=its_k, frequency_hz=frequency_hz, polarization=polarization)
    return WaysPast(over_db=over, solid_db=solid, woods_db=woods_db(depth_m, frequency_hz)[0])


def _diffraction_db(
    rows: PathRows, surface_m: Floats, *, k: Floats, frequency_hz: Floats, polarization: Polarization
) -> Floats:
    """Shape (..., m, f)."""
    loss = fitted_delta_bullington_loss_db(
        rows.distance_m[..., np.newaxis, np.newaxis, :],
        surface_m[..., np.newaxis, np.newaxis, :],
        a_amsl_m=rows.a_amsl_m[..., np.newaxis, np.newaxis],
        b_amsl_m=rows.b_amsl_m[..., np.newaxis, np.newaxis],
        a_height_m=rows.a_height_m[..., np.newaxis, np.newaxis],
        b_height_m=rows.b_height_m[..., np.newaxis, np.newaxis],
        frequency_hz=frequency_hz,
        k=k[..., np.newaxis],
        polarization=polarization,
        sea_fraction=rows.sea_fraction[..., np.newaxis, np.newaxis],
    )
    return np.maximum(np.asarray(loss, dtype=np.float64), 0.0)


class FittedPaths(Protocol):
    """Paths by what the smooth Earth fitted to them needs, one value a path (...)."""

    @property
    def length_m(self) -> Floats:
        """Path lengths."""
        ...

    @property
    def a_height_m(self) -> Floats:
        """Of A above the smooth Earth."""
        ...

    @property
    def b_height_m(self) -> Floats:
        """Of B."""
        ...

    @property
    def sea_fraction(self) -> Floats:
        """Share of the path over open sea."""
        ...


def most_db(
    rows: FittedPaths, over_db: Floats, *, inverse_k: Floats, frequency_hz: Floats, polarization: Polarization
) -> Floats:
    """What the cheaper way does not exceed at any of several k, dB, shape (..., f); cheap, and sure rather than near.

    Parameters
    ----------
    rows, frequency_hz, polarization
        As for `ways_past_trees`.
    over_db
        Diffraction over everything at the greatest of the values of 1/k, shape (..., f).
    inverse_k
        The values of 1/k, shape (..., m).

    Notes
    -----
    The more the Earth bulges, the more the Bullington part costs: its slopes and heights above the ray only grow. The smooth
    Earth adds no more than its whole loss, which asks for no samples.
    """
    with np.errstate(divide="ignore"):
        k = 1.0 / inverse_k
    smooth = spherical_earth_loss_db(
        rows.length_m[..., np.newaxis, np.newaxis],
        a_height_m=rows.a_height_m[..., np.newaxis, np.newaxis],
        b_height_m=rows.b_height_m[..., np.newaxis, np.newaxis],
        frequency_hz=frequency_hz,
        k=k[..., np.newaxis],
        polarization=polarization,
        sea_fraction=rows.sea_fraction[..., np.newaxis, np.newaxis],
    )
    # Where k is below 0 the smooth Earth is not defined, and adds nothing.
    counted = np.where(inverse_k[..., np.newaxis] < 0.0, 0.0, np.maximum(smooth, 0.0))
    return np.asarray(over_db + np.max(counted, axis=-2))


def woods_db(depth_m: Floats, frequency_hz: Floats) -> tuple[Floats, Floats, Floats]:
    """Loss through woods of a depth (...), and the least and most of it, dB, each (..., f)."""
    depth = depth_m[..., np.newaxis]
    if not depth_m.any():
        none = np.zeros(np.broadcast_shapes(depth.shape, frequency_hz.shape))
        return none, none, none
    loss = woodland_loss_db(
        depth,
        specific_db_per_m=woodland_specific_db_per_m(frequency_hz),
        saturation_db=woodland_saturation_db(frequency_hz),
    )
    least, most = woodland_loss_spread_db(depth, frequency_hz=frequency_hz)
    return np.asarray(loss), np.asarray(least), np.asarray(most)
