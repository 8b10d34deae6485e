"""What the terrain of an interfering path takes from a signal: ground and buildings shield, trees do not.

Knows profiles and stations; knows no levels, sums or sentences.
"""

from typing import TYPE_CHECKING, Final

import numpy as np

from fellspan.errors import FellspanError
from fellspan.geodesy import geodesic
from fellspan.geodesy.position import Position
from fellspan.links.budget import sea_share
from fellspan.links.own_building import standing, with_ground_at_end
from fellspan.links.stations import Floats, Station
from fellspan.propagation import delta_bullington_loss_db
from fellspan.terrain.profile import PathProfile
from fellspan.vocabulary import COVER_KINDS

if TYPE_CHECKING:
    from fellspan.terrain.terrain import Terrain

PATH_STEPS: Final = 1000
"""Steps of an interfering path (our own rule)."""
_TREE: Final = COVER_KINDS.index("tree")


def shielding_db(
    couples: list[tuple[Station, Station]], frequency_hz: Floats, *, terrain: "Terrain", median_k: float
) -> Floats | None:
    """Diffraction loss between stations of two places, dB, shape of `couples`; None where the terrain has a gap on the path.

    Parameters
    ----------
    couples
        Stations at the one place and at the other, in this order; all couples stand at the same two places.
    frequency_hz
        What is sent, Hz, shape of `couples`.

    Notes
    -----
    Delta-Bullington (P.526-16, section 4.5.2) at the median k over ground, buildings and other cover, the antennas' own
    buildings taken out. Trees are left out, since leaves fall and trees are felled; so are typed roof edges, which belong to
    the direction of the link. Less shielding is the cautious side here.
    """
    one, other = couples[0]
    profile = _profile(terrain, one.site.position, other.site.position)
    if profile is None:
        return None
    loss = np.empty(len(couples))
    # A measured ground level belongs to a station; couples that state others get a profile of their own.
    groups: dict[tuple[float | None, float | None, bool], list[int]] = {}
    for index, (a, b) in enumerate(couples):
        upright = "vertical" in (a.radio.polarization, b.radio.polarization)
        groups.setdefault((a.site.ground_amsl_m, b.site.ground_amsl_m, upright), []).append(index)
    for (ground_a, ground_b, upright), members in groups.items():
        laid = profile
        if ground_a is not None:
            laid = with_ground_at_end(laid, end="A", ground_amsl_m=ground_a)
        if ground_b is not None:
            laid = with_ground_at_end(laid, end="B", ground_amsl_m=ground_b)
        stands = standing(laid)
        surface = np.where(stands.cover_kind == _TREE, laid.ground_m, stands.surface_m)
        found = delta_bullington_loss_db(
            laid.distance_m,
            laid.ground_m,
            a_amsl_m=[couples[index][0].amsl_m for index in members],
            b_amsl_m=[couples[index][1].amsl_m for index in members],
            frequency_hz=frequency_hz[members],
            k=median_k,
            polarization="vertical" if upright else "horizontal",
            sea_fraction=sea_share(laid),
            surface_m=surface,
        )
        loss[members] = np.maximum(np.nan_to_num(np.asarray(found, dtype=np.float64), nan=0.0), 0.0)
    return loss


def _profile(terrain: "Terrain", a: Position, b: Position) -> PathProfile | None:
    """The path over the terrain; None where it has a gap there, or seams that it refuses."""
    step_m = geodesic.inverse(a, b).distance_m / PATH_STEPS
    try:
        profile = terrain.profiles([(a, b)], step_m=step_m)[0]
    except FellspanError:
        return None
    whole = not profile.gaps and bool(np.isfinite(profile.surface_m).all()) and profile.distance_m.size >= 3
    return profile if whole else None
