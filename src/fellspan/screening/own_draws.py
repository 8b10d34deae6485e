"""Planning's own draws of pairs whose profiles are at hand: the very samples and numbers, and no second look at the rasters.

For the few pairs on which nothing less can decide, where rasters alone count. Asks `design`; holds no formula.
"""

from typing import Final, TypeVar

import numpy as np
from numpy.typing import NDArray

from fellspan.design.answers import FEW, confidence_of_case
from fellspan.design.case import Case
from fellspan.design.draws import DRAWS
from fellspan.errors import FellspanError
from fellspan.geodesy.position import Position
from fellspan.links.site import Link
from fellspan.screening.pairs import Candidates
from fellspan.screening.profiles import Profiles
from fellspan.screening.single import name_of, site_of
from fellspan.terrain.profile import PathProfile

Floats = NDArray[np.float64]
Scalar = TypeVar("Scalar", bound=np.generic)

_SOMEWHERE: Final = Position(latitude_deg=0.0, longitude_deg=0.0)


def own_share(
    candidates: Candidates, hub: int, place: int, profiles: Profiles, row: int, *, is_bare: bool
) -> float | None:
    """Share of planning's draws in which a pair holds; None where so few would decide that planning must look itself.

    `row` is the pair's in `profiles`; `is_bare` says whether their ground is.
    """
    try:
        return _share(candidates, hub, place, profiles, row, is_bare=is_bare)
    except FellspanError:
        return None


def _share(
    candidates: Candidates, hub: int, place: int, profiles: Profiles, row: int, *, is_bare: bool
) -> float | None:
    link = Link(
        name=name_of(candidates, hub, place),
        a=site_of(candidates.hubs, hub),
        b=site_of(candidates.places, place),
        radio=candidates.radio,
        antenna_a=candidates.place_antenna,
        antenna_b=candidates.place_antenna,
    )
    case = Case.over(link, path_profile(profiles, row, is_bare=is_bare), candidates.settings)
    share = confidence_of_case(case)
    # Positions are some micrometres off planning's.
    return share if abs(share - candidates.settings.confidence) * DRAWS > FEW else None


def path_profile(profiles: Profiles, row: int, *, is_bare: bool) -> PathProfile:
    """One path as planning has it, but for where on Earth it runs and what its sources are called."""
    columns = np.append(np.arange(profiles.last[row]), profiles.distance_m.shape[1] - 1)
    shape = (columns.size,)

    def own(values: NDArray[Scalar]) -> NDArray[Scalar]:
        return values[row, columns] if values.shape[1] > 1 else np.broadcast_to(values[row], shape).copy()

    ground = own(profiles.ground_m)
    cover = np.zeros(shape) if profiles.cover_m is None else own(profiles.cover_m)
    kind = np.zeros(shape, dtype=np.int8) if profiles.cover_kind is None else own(profiles.cover_kind)
    nowhere = np.zeros(shape)
    return PathProfile(
        a=_SOMEWHERE,
        b=_SOMEWHERE,
        distance_m=own(profiles.distance_m),
        latitude_deg=nowhere,
        longitude_deg=nowhere,
        ground_m=ground,
        cover_m=cover,
        cover_kind=kind,
        obstacle_index=np.full(shape, -1, dtype=np.int32),
        surface_m=ground + cover,
        source=own(profiles.source),
        measured=np.zeros(shape, dtype=np.int8),
        sigma_m=own(profiles.sigma_m),
        sources=(),
        obstacles=(),
        gaps=(),
        step_m=float(profiles.cell_m[row]),
        cell_m=float(profiles.cell_m[row]),
        ground_is_bare=is_bare,
        surface_is_known=False,
        vertical_datum=None,
    )
