"""PathLevels: the levels along a path that clearance worked out and the drawings show."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PathLevels:
    """Levels along a path, m above sea level; arrays read-only.

    `distance_m`, `surface_m` (own building taken out, roof edges put in), `available_m` (the straight ray between the
    antennas) and `fresnel_radius_m` (first zone) have shape (n,); `bulge_m` and `need_m` have shape (c, n), one row for each
    criterion: need = surface + bulge(k) + fraction * F1.
    """

    distance_m: NDArray[np.float64]
    surface_m: NDArray[np.float64]
    available_m: NDArray[np.float64]
    fresnel_radius_m: NDArray[np.float64]
    bulge_m: NDArray[np.float64]
    need_m: NDArray[np.float64]

    def __post_init__(self) -> None:
        for name in ("distance_m", "surface_m", "available_m", "fresnel_radius_m", "bulge_m", "need_m"):
            getattr(self, name).flags.writeable = False
