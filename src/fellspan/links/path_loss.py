"""What a path takes from a signal in clear air: free space, diffraction, trees counted once, gases; and diffraction by k.

Arithmetic over a profile at one frequency; knows no radios, antennas, modulations or verdicts.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.climate.figures import ClimateFigures
from fellspan.links.causes import is_sea_level
from fellspan.links.own_building import Standing
from fellspan.links.signal_result import TreeLoss
from fellspan.propagation import (
    delta_bullington_loss_db,
    earth_bulge_m,
    free_space_loss_db,
    gas_loss_db,
    inverse_k,
    woodland_loss_db,
    woodland_loss_spread_db,
    woodland_saturation_db,
    woodland_specific_db_per_m,
)
from fellspan.terrain.profile import PathProfile
from fellspan.vocabulary import COVER_KINDS, Polarization, TreeWay

Floats = NDArray[np.float64]

TREE: Final = COVER_KINDS.index("tree")
_DIFFERS_DB: Final = 1e-9


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PathLoss:
    """Losses of one path at one frequency, dB, and what they were worked out from.

    `diffraction_db` and `vegetation_db` are those of the way past trees that counts. `by_inverse_k_db` is the sum of both at
    the values `inverse_k`, shape (m,), the cheaper way at each.
    """

    frequency_hz: float
    slant_m: float
    free_space_db: float
    diffraction_db: float
    vegetation_db: float
    trees: TreeLoss
    gases_db: float
    sea_fraction: float
    inverse_k: Floats
    by_inverse_k_db: Floats


def sea_share(profile: PathProfile) -> float:
    """Share of the path, 0 to 1, that the study took as open sea, weighted by the length each sample stands for."""
    weights = sample_lengths_m(profile)
    return float(np.sum(weights[is_sea_level(profile)]) / np.sum(weights))


def sample_lengths_m(profile: PathProfile) -> Floats:
    """Length of path that each sample stands for, m, shape (n,)."""
    between = np.diff(profile.distance_m)
    return np.asarray(0.5 * (np.append(between, 0.0) + np.append(0.0, between)))


def path_loss(
    profile: PathProfile,
    standing: Standing,
    *,
    a_amsl_m: float,
    b_amsl_m: float,
    median_k: float,
    frequency_hz: float,
    polarization: Polarization,
    air: ClimateFigures,
    nodes_inverse_k: Floats,
) -> PathLoss:
    """Losses in clear air at the median k, and diffraction at other k.

    Diffraction is delta-Bullington (P.526-16, section 4.5.2) over the surface, own buildings taken out; the smooth-Earth fit
    takes the ground. Trees count once: the lesser of (diffraction over everything but trees, plus woodland on the way through)
    and (diffraction over everything). Free space is over the slant distance.
    """
    trees = standing.cover_kind == TREE
    solid_m = np.where(trees, profile.ground_m, standing.surface_m)
    sea = sea_share(profile)
    values_of_k = np.append(inverse_k(median_k), nodes_inverse_k)

    def diffraction(surface_m: Floats) -> Floats:
        with np.errstate(divide="ignore"):
            k = 1.0 / values_of_k
        loss = delta_bullington_loss_db(
            profile.distance_m,
            profile.ground_m,
            a_amsl_m=a_amsl_m,
            b_amsl_m=b_amsl_m,
            frequency_hz=frequency_hz,
            k=k,
            polarization=polarization,
            sea_fraction=sea,
            surface_m=surface_m,
        )
        return np.maximum(np.asarray(loss, dtype=np.float64), 0.0)

    over = diffraction(standing.surface_m)
    solid = diffraction(solid_m) if trees.any() else over
    depth = _depth_in_trees_m(profile, standing, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m, k=median_k)
    woods, least, most = _woodland_db(depth, frequency_hz)
    through = solid + woods
    way: TreeWay = "through" if through[0] < over[0] - _DIFFERS_DB else "over"
    if depth == 0.0 and abs(through[0] - over[0]) <= _DIFFERS_DB:
        way = "no trees"
    slant = math.hypot(profile.length_m, b_amsl_m - a_amsl_m)
    return PathLoss(
        frequency_hz=frequency_hz,
        slant_m=slant,
        free_space_db=float(free_space_loss_db(slant, frequency_hz=frequency_hz)),
        diffraction_db=float(solid[0] if way == "through" else over[0]),
        vegetation_db=woods if way == "through" else 0.0,
        trees=TreeLoss(
            way=way,
            depth_m=depth,
            through_db=float(through[0]),
            over_db=float(over[0]),
            least_through_db=float(solid[0]) + least,
            most_through_db=float(solid[0]) + most,
        ),
        gases_db=gases_db(slant, frequency_hz=frequency_hz, air=air),
        sea_fraction=sea,
        inverse_k=np.asarray(nodes_inverse_k),
        by_inverse_k_db=np.minimum(through, over)[1:],
    )


def gases_db(slant_m: float, *, frequency_hz: float, air: ClimateFigures) -> float:
    """What oxygen and water vapour take over a distance, dB."""
    return float(
        gas_loss_db(
            slant_m,
            frequency_hz=frequency_hz,
            dry_pressure_hpa=air.dry_pressure_hpa.value,
            temperature_k=air.temperature_k.value,
            vapour_g_m3=air.vapour_g_m3.value,
        )
    )


def _depth_in_trees_m(profile: PathProfile, standing: Standing, *, a_amsl_m: float, b_amsl_m: float, k: float) -> float:
    """Length of the ray between the ground and the tops of trees, m."""
    at = profile.distance_m
    share = at / at[-1]
    ray = a_amsl_m * (1.0 - share) + b_amsl_m * share - np.asarray(earth_bulge_m(at, at[-1] - at, k=k))
    inside = (standing.cover_kind == TREE) & (ray < standing.surface_m)
    return float(np.sum(sample_lengths_m(profile)[inside]))


def _woodland_db(depth_m: float, frequency_hz: float) -> tuple[float, float, float]:
    """Loss through woodland, and the least and most of it, dB."""
    if depth_m == 0.0:
        return 0.0, 0.0, 0.0
    loss = woodland_loss_db(
        depth_m,
        specific_db_per_m=woodland_specific_db_per_m(frequency_hz),
        saturation_db=woodland_saturation_db(frequency_hz),
    )
    least, most = woodland_loss_spread_db(depth_m, frequency_hz=frequency_hz)
    return float(loss), float(least), float(most)
