"""How the errors of heights hang together along a path, and how sure k and positions are: the defaults, each with its origin.

How large the errors of a raster are is stated by the study or in terrain/error_model.py; this is how far they reach.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.profile import PathProfile

GROUND_REACH_M: Final = (
    # up to this cell, correlation length, where the figure comes from
    (2.0, 50.0, "airborne laser scanning: strips and filtering of vegetation; common practice, no source"),
    (12.0, 200.0, "photogrammetry and fine radar models; common practice, no source"),
    (
        100.0,
        500.0,
        "SRTM class: speckle within cells, and motion of the mast over kilometres; common practice, no source",
    ),
    (float("inf"), 2000.0, "two coarse cells; common practice, no source"),
)
COVER_REACH_M: Final = 50.0
"""Correlation length of the error of cover heights: the size of a stand or a block (common practice, no source)."""
POSITION_CELLS: Final = 0.29
"""Standard error of a horizontal position along each axis, in cells: known to the cell and even in it: 1 / sqrt(12)."""
GRADIENT_ERROR: Final = 6.0
"""Standard error of the refractivity gradient that a criterion's k stands for, N/km. Our own rule: medians over the map of
Rec. ITU-R P.453-13 differ by about this much from the one behind k = 4/3. How the gradient varies with time is not in it:
that is what the criterion at the worst-month k is for."""
GRADIENT_UNIT: Final = 1.0 / 157.0
"""1/k for one N/km (Rec. ITU-R P.452: k = 157 / (157 - dN), dN the fall of refractivity over one kilometre)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ErrorModel:
    """How the errors of one path hang together.

    Parameters
    ----------
    ground_reach_m, cover_reach_m
        Distance over which the correlation of the errors of ground and of cover heights falls to 1/e, m, > 0.
    position_error_m
        Standard error of a horizontal position along each axis, m; it shifts the surface along the path.
    gradient_error
        Standard error of the refractivity gradient of each criterion, N/km, one draw for all of them.
    """

    ground_reach_m: float
    cover_reach_m: float = COVER_REACH_M
    position_error_m: float = 0.0
    gradient_error: float = GRADIENT_ERROR


def default_error_model(profile: PathProfile) -> ErrorModel:
    """The defaults for the finest raster of a path."""
    return error_model(profile.cell_m)


def error_model(cell_m: float) -> ErrorModel:
    """The defaults for a raster of such a cell."""
    reach = next(reach for up_to, reach, _ in GROUND_REACH_M if cell_m <= up_to)
    return ErrorModel(
        ground_reach_m=max(reach, cell_m),
        cover_reach_m=max(COVER_REACH_M, cell_m),
        position_error_m=POSITION_CELLS * cell_m,
    )


def error_models(cell_m: NDArray[np.float64]) -> NDArray[np.float64]:
    """The same for rasters of many cells (q,), (q, 4): reaches of ground and cover, m, position error, m, error of 1/k."""
    up_to, reach = (np.array(column) for column in list(zip(*GROUND_REACH_M, strict=True))[:2])
    return np.stack(
        (
            np.maximum(reach[np.searchsorted(up_to, cell_m)], cell_m),
            np.maximum(COVER_REACH_M, cell_m),
            POSITION_CELLS * cell_m,
            np.full(cell_m.shape, GRADIENT_ERROR * GRADIENT_UNIT),
        ),
        axis=1,
    )


def reach_source(cell_m: float) -> str:
    """Where the default correlation length comes from."""
    return next(source for up_to, _, source in GROUND_REACH_M if cell_m <= up_to)
