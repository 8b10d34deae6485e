"""One criterion on one path: governing point, shortfalls by name, extra heights, probability.

Reads levels that `clearance` made and turns them into a CriterionResult; computes no `need` of its own.
"""

import math
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

from fellspan.links import clearance
from fellspan.links.causes import cause_at
from fellspan.links.criteria import Criterion
from fellspan.links.levels import PathLevels
from fellspan.links.own_building import Standing
from fellspan.links.result import CriterionResult, ExtraHeight, Obstruction
from fellspan.terrain.profile import MEASURED_TOP, PathProfile


def criterion_result(
    criterion: Criterion,
    row: int,
    *,
    profile: PathProfile,
    standing: Standing,
    levels: PathLevels,
    errors_m: NDArray[np.float64],
) -> CriterionResult:
    """Result of the criterion that stands in row `row` of `levels`, which share the samples of `profile`.

    `errors_m` are those of the clearance, as `uncertainty.clearance_errors_m` gives them, shape (n,).
    """
    distance = levels.distance_m
    bulge, need = levels.bulge_m[row], levels.need_m[row]
    clear = levels.available_m - levels.surface_m - bulge
    shortfall = need - levels.available_m
    normalised = clearance.normalised_clearance(clear, levels.fresnel_radius_m)
    worst = clearance.worst_index(normalised, distance)
    short = clearance.worst_index(-shortfall, distance)
    missing = max(float(shortfall[short]), 0.0)
    met = missing <= clearance.TOLERANCE_M
    extra = (_finite(float(value)) for value in clearance.extra_heights_m(shortfall, distance))
    extra_a, extra_b, extra_both = extra
    return CriterionResult(
        criterion=criterion.name,
        k=_finite(criterion.k),
        required_fraction=criterion.fraction,
        met=met,
        worst_fraction=_finite(float(normalised[worst])),
        worst_at_m=float(distance[worst]),
        clearance_m=float(clear[worst]),
        required_m=float(criterion.fraction * levels.fresnel_radius_m[worst]),
        fresnel_radius_m=float(levels.fresnel_radius_m[worst]),
        surface_m=float(levels.surface_m[worst]),
        bulge_m=float(bulge[worst]),
        available_m=float(levels.available_m[worst]),
        latitude_deg=float(profile.latitude_deg[worst]),
        longitude_deg=float(profile.longitude_deg[worst]),
        shortfall_m=0.0 if met else missing,
        shortfall_at_m=float(distance[short]),
        cause=_cause(profile, standing, levels, row, worst),
        extra_height_m=ExtraHeight(a=extra_a, b=extra_b, both=extra_both),
        probability=_finite(float(clearance.probability_met(-shortfall, errors_m))),
        obstructions=_obstructions(row, profile=profile, standing=standing, levels=levels),
        source=criterion.source,
        note=criterion.note,
    )


def _obstructions(row: int, *, profile: PathProfile, standing: Standing, levels: PathLevels) -> tuple[Obstruction, ...]:
    shortfall = levels.need_m[row] - levels.available_m
    cut = levels.surface_m + levels.bulge_m[row] - levels.available_m
    found = []
    for first, last, from_m, to_m in _joined(clearance.stretches(shortfall, levels.distance_m), profile, standing):
        worst = first + int(np.argmax(shortfall[first : last + 1]))
        found.append(
            Obstruction(
                from_m=from_m,
                to_m=to_m,
                worst_at_m=float(levels.distance_m[worst]),
                shortfall_m=float(shortfall[worst]),
                cause=_cause(profile, standing, levels, row, worst),
                cuts_sight=bool(cut[first : last + 1].max() > clearance.TOLERANCE_M),
                measured=int(profile.measured[worst]) == MEASURED_TOP,
            )
        )
    return tuple(found)


def _joined(
    found: list[tuple[int, int, float, float]], profile: PathProfile, standing: Standing
) -> list[tuple[int, int, float, float]]:
    """Stretches less than a cell or a thousandth of the path apart made one; named obstacles stay by themselves.

    The raster cannot tell the first apart, and nobody walks a list of every tree on a long path.
    """
    near_m = max(profile.cell_m, 0.001 * profile.length_m)
    named = standing.obstacle_index >= 0
    joined: list[tuple[int, int, float, float]] = []
    for first, last, from_m, to_m in found:
        if joined and from_m - joined[-1][3] < near_m and not named[joined[-1][0] : last + 1].any():
            joined[-1] = (joined[-1][0], last, joined[-1][2], to_m)
        else:
            joined.append((first, last, from_m, to_m))
    return joined


def _cause(profile: PathProfile, standing: Standing, levels: PathLevels, row: int, index: int) -> str:
    return cause_at(
        profile,
        standing,
        index,
        available_m=float(levels.available_m[index]),
        bulge_m=float(levels.bulge_m[row, index]),
        need_m=float(levels.need_m[row, index]),
    )


def extra_for_confidence(levels: PathLevels, errors_m: NDArray[np.float64], *, confidence: float) -> ExtraHeight:
    """Height to add so that every criterion holds with a confidence, at A alone, at B alone, at both alike.

    `errors_m` as `uncertainty.clearance_errors_m` gives them, shape (n,); `confidence` above 0 and below 1.
    """
    sigmas = NormalDist().inv_cdf(confidence)
    shortfall = levels.need_m + sigmas * errors_m - levels.available_m
    at_a, at_b, both = (
        _finite(float(np.max(extra))) for extra in clearance.extra_heights_m(shortfall, levels.distance_m)
    )
    return ExtraHeight(a=at_a, b=at_b, both=both)


def spare_m(result: CriterionResult) -> float:
    """Height to spare at the governing point, m; negative where it is missing."""
    return result.clearance_m - result.required_m


def governing_row(results: tuple[CriterionResult, ...]) -> int:
    """The criterion that the drawing shows: the greatest shortfall, else the least spare height at a governing point."""
    return int(
        governing_rows(
            np.array([result.shortfall_m for result in results]), np.array([spare_m(result) for result in results])
        )
    )


def governing_rows(shortfall_m: NDArray[np.float64], spare_m: NDArray[np.float64]) -> NDArray[np.intp]:
    """As `governing_row`, for arrays (c, ...) of shortfalls, 0 where met, and of heights to spare at the governing points."""
    return np.asarray(
        np.where((shortfall_m > 0.0).any(axis=0), np.argmax(shortfall_m, axis=0), np.argmin(spare_m, axis=0))
    )


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None
