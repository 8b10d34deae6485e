"""How far the heights on a path may be wrong against the ray: errors of the surface and of the ground under the antennas.

Knows a profile, what stands on it and the error of each antenna's own level; knows no criteria and no verdicts.
"""

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.links.own_building import ROOF_SOURCE, Standing
from fellspan.terrain.profile import PathProfile


def bare_error_m(profile: PathProfile, index: int) -> float:
    """Standard error of the ground at a sample, m: of the nearest bare sample of the same source, else the stated one."""
    alike = (profile.cover_m == 0.0) & (profile.source == profile.source[index])
    if not alike.any():
        return float(profile.sigma_m[index])
    away = np.where(alike, np.abs(profile.distance_m - profile.distance_m[index]), np.inf)
    return min(float(profile.sigma_m[int(np.argmin(away))]), float(profile.sigma_m[index]))


def clearance_errors_m(
    profile: PathProfile, standing: Standing, *, a_error_m: float, b_error_m: float
) -> NDArray[np.float64]:
    """Standard error of the clearance at each sample, m, shape (n,).

    The ray is wrong by (1 - x) of the error at A and x of that at B, the surface by its own. The three are independent, but
    where the surface and the ground under an antenna come from one source they are the same raster value at the antenna: the
    part they share falls from all of it there to none one cell away. `a_error_m` and `b_error_m` are the errors of the
    antennas' levels.
    """
    distance = profile.distance_m
    surface = _surface_errors_m(profile, standing)
    source = profile.source
    variance = clearance_variance_m2(
        distance,
        surface,
        a_error_m=a_error_m,
        b_error_m=b_error_m,
        cell_m=profile.cell_m,
        like_a=source == source[0],
        like_b=source == source[-1],
        ends_alike=source[0] == source[-1],
    )
    share = distance / profile.length_m
    # An edge or parapet was measured from the antenna and moves with it, however wrong the ground under both is.
    lever = np.minimum(share, 1.0 - share)
    variance = np.where(_typed(profile, standing), lever**2 * (a_error_m**2 + b_error_m**2), variance)
    return np.asarray(np.sqrt(np.maximum(variance, 0.0)))


def clearance_variance_m2(
    distance_m: NDArray[np.float64],
    surface_error_m: ArrayLike,
    *,
    a_error_m: ArrayLike,
    b_error_m: ArrayLike,
    cell_m: ArrayLike,
    like_a: NDArray[np.bool_] | bool,
    like_b: NDArray[np.bool_] | bool,
    ends_alike: NDArray[np.bool_] | bool,
) -> NDArray[np.float64]:
    """Variance of the clearance, m2, shape (..., n), as `clearance_errors_m` says; rounding may leave it a hair below 0.

    Parameters
    ----------
    distance_m, surface_error_m
        From A, and the standard error of what must be cleared, (..., n).
    a_error_m, b_error_m, cell_m
        Errors of the antennas' levels and the finest cell, (...).
    like_a, like_b
        Where the surface comes from the source that the ground under the antenna comes from, (..., n).
    ends_alike
        Whether the ground under both comes from one source, (...).
    """
    length = distance_m[..., -1:]
    share = distance_m / length
    surface = np.asarray(surface_error_m, dtype=np.float64)
    a, b, cell = (np.asarray(value, dtype=np.float64)[..., np.newaxis] for value in (a_error_m, b_error_m, cell_m))
    variance = surface**2 + ((1.0 - share) * a) ** 2 + (share * b) ** 2
    for from_end, error, like in ((distance_m, a, like_a), (length - distance_m, b, like_b)):
        alike = _alike(from_end, cell) * np.asarray(like)
        variance -= 2.0 * (1.0 - from_end / length) * alike * np.minimum(surface, error) ** 2
    both = _alike(length, cell) * np.asarray(ends_alike)[..., np.newaxis] * np.minimum(a, b) ** 2
    return np.asarray(variance + 2.0 * share * (1.0 - share) * both)


def _alike(distance_m: NDArray[np.float64], cell_m: NDArray[np.float64]) -> NDArray[np.float64]:
    """Correlation of the errors of two spots of one raster: 1 at the same spot, falling evenly to 0 one cell away."""
    return np.asarray(np.clip(1.0 - distance_m / np.maximum(cell_m, 1e-9), 0.0, 1.0))


def _surface_errors_m(profile: PathProfile, standing: Standing) -> NDArray[np.float64]:
    """Error of what must be cleared: the stated one, and that of the ground where the own building was left out."""
    bared = np.isfinite(standing.left_out_m) & (standing.cover_m == 0.0)
    if not bared.any():
        return profile.sigma_m
    near_a = profile.distance_m < 0.5 * profile.length_m
    ground = np.where(near_a, bare_error_m(profile, 0), bare_error_m(profile, -1))
    return np.where(bared, np.minimum(profile.sigma_m, ground), profile.sigma_m)


def _typed(profile: PathProfile, standing: Standing) -> NDArray[np.bool_]:
    typed = np.asarray([*(obstacle.source == ROOF_SOURCE for obstacle in profile.obstacles), False])
    return np.asarray(typed[standing.obstacle_index])
