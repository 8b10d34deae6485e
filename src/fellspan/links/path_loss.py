"""What a path takes from a signal in clear air: free space, diffraction, trees counted once, gases; and diffraction by k.

Arithmetic over a profile at one frequency; knows no radios, antennas, modulations or verdicts.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.climate.figures import ClimateFigures
from fellspan.links.causes import is_sea_level
from fellspan.links.own_building import Standing
from fellspan.links.signal_result import TreeLoss
from fellspan.links.ways_past_trees import (
    DIFFERS_DB,
    PathRows,
    depth_in_trees_m,
    share_of_path,
    ways_past_trees,
    woods_db,
)
from fellspan.propagation import free_space_loss_db, gas_loss_db, inverse_k
from fellspan.terrain.profile import PathProfile
from fellspan.vocabulary import COVER_KINDS, Polarization, TreeWay

Floats = NDArray[np.float64]

TREE: Final = COVER_KINDS.index("tree")


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
    return float(share_of_path(profile.distance_m, is_sea_level(profile)))


def path_rows(profile: PathProfile, standing: Standing, *, a_amsl_m: float, b_amsl_m: float) -> PathRows:
    """One path as the arrays that losses are worked out from."""
    return PathRows.of(
        distance_m=profile.distance_m,
        ground_m=profile.ground_m,
        surface_m=standing.surface_m,
        trees=standing.cover_kind == TREE,
        a_amsl_m=np.asarray(a_amsl_m),
        b_amsl_m=np.asarray(b_amsl_m),
        sea_fraction=np.asarray(sea_share(profile)),
    )


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
    rows = path_rows(profile, standing, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m)
    depth = depth_in_trees_m(rows, k=median_k)
    frequency = np.array([frequency_hz])
    ways = ways_past_trees(
        rows,
        inverse_k=np.append(inverse_k(median_k), nodes_inverse_k),
        frequency_hz=frequency,
        polarization=polarization,
        depth_m=depth,
    )
    woods, least, most = (float(value[0]) for value in woods_db(depth, frequency))
    through, over, solid = (float(loss[0, 0]) for loss in (ways.through_db, ways.over_db, ways.solid_db))
    way: TreeWay = "through" if ways.is_through[0, 0] else "over"
    if depth == 0.0 and abs(through - over) <= DIFFERS_DB:
        way = "no trees"
    slant = float(rows.slant_m)
    return PathLoss(
        frequency_hz=frequency_hz,
        slant_m=slant,
        free_space_db=float(free_space_loss_db(slant, frequency_hz=frequency_hz)),
        diffraction_db=solid if way == "through" else over,
        vegetation_db=woods if way == "through" else 0.0,
        trees=TreeLoss(
            way=way,
            depth_m=float(depth),
            through_db=through,
            over_db=over,
            least_through_db=solid + least,
            most_through_db=solid + most,
        ),
        gases_db=gases_db(slant, frequency_hz=frequency_hz, air=air),
        sea_fraction=float(rows.sea_fraction),
        inverse_k=np.asarray(nodes_inverse_k),
        by_inverse_k_db=ways.cheaper_db[1:, 0],
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
