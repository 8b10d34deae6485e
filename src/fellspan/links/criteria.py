"""Clearance criteria: lists of (k, fraction of the first Fresnel zone), with their sources.

Knows the published rules and common practice, and how to tell an isolated obstruction from an extended one; knows nothing of
terrain, sites or verdicts.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.errors import LinkError
from fellspan.propagation.constants import K_FORMULA_LOW_M
from fellspan.propagation.refraction import k_exceeded_99_9
from fellspan.propagation.sources import source
from fellspan.vocabulary import CriteriaPreset


@dataclass(frozen=True, slots=True, kw_only=True)
class Criterion:
    """One rule: at this k the ray clears the surface by this fraction of the first Fresnel zone radius.

    `k` may be infinite or negative (1/k is what counts).

    Raises
    ------
    LinkError
        k is 0 or no number, or the fraction is no number, infinite or below 0: such a rule would hold anywhere or nowhere.
    """

    name: str
    k: float
    fraction: float
    source: str
    note: str = ""

    def __post_init__(self) -> None:
        if math.isnan(self.k) or self.k == 0.0:
            raise LinkError(
                f"criterion '{self.name}': k {self.k:g} must be a number other than 0",
                "4/3 is usual; inf is a flat Earth, and below 0 the ray is bent more than the Earth",
            )
        if not (math.isfinite(self.fraction) and self.fraction >= 0.0):
            raise LinkError(
                f"criterion '{self.name}': fraction {self.fraction:g} of the first Fresnel zone must be a number of 0 or more",
                "0 lets the ray graze; 0.6 and 1 are usual",
            )


P530: Final = source("p530-19-clearance").reference
COMMON_PRACTICE: Final = source("sixty-percent").reference
TROPICAL_FROM_M: Final = 30_000.0
"""P.530 gives the tropical rule at k exceeded 99.9 % for longer paths only."""
ISOLATED_BAND: Final = 0.3
"""Samples within this fraction of F1 of the worst one count as the same obstruction (common practice, no source)."""
ISOLATED_SHARE: Final = 0.1
"""An isolated obstruction takes less of the path than this (common practice, no source)."""


def worst_month_k(distance_m: float) -> float:
    """k exceeded 99.9 % of the worst month for a path of this length, m (P.530-19, equation (4))."""
    return float(k_exceeded_99_9(distance_m))


def is_extended(distance_m: ArrayLike, normalised_clearance: ArrayLike) -> bool:
    """Whether what comes nearest to the ray is extended along part of the path, rather than a single isolated obstruction.

    Isolated only if the samples whose normalised clearance lies within 0.3 F1 of the worst form one contiguous stretch
    shorter than 10 % of the path, counted to the next samples outside it; extended otherwise, so also when in doubt. The
    Recommendation tells the two apart without a rule; this one is common practice, no source.

    Parameters
    ----------
    distance_m
        Shape (n,), rising, m.
    normalised_clearance
        (ray - surface - bulge) / F1 at the k of the rule, shape (n,); what is not finite (the two ends) is left out.
    """
    return bool(are_extended(distance_m, normalised_clearance))


def are_extended(distance_m: ArrayLike, normalised_clearance: ArrayLike) -> NDArray[np.bool_]:
    """As `is_extended`, for arrays of shape (..., n): answers of shape (...)."""
    distance = np.asarray(distance_m, dtype=np.float64)
    normalised = np.asarray(normalised_clearance, dtype=np.float64)
    count = normalised.shape[-1]
    finite = np.where(np.isfinite(normalised), normalised, np.inf)
    least = finite.min(axis=-1, keepdims=True)
    near = finite <= least + ISOLATED_BAND
    first, last = near.argmax(axis=-1), count - 1 - near[..., ::-1].argmax(axis=-1)
    apart = last - first + 1 != near.sum(axis=-1)
    outer_from = _at(distance, np.maximum(first - 1, 0))
    outer_to = _at(distance, np.minimum(last + 1, count - 1))
    wide = outer_to - outer_from >= ISOLATED_SHARE * (distance[..., -1] - distance[..., 0])
    return np.asarray(apart | wide | np.isinf(least[..., 0]))


def _at(values: NDArray[np.float64], index: NDArray[np.intp]) -> NDArray[np.float64]:
    """Values (..., n) at one index for each path (...)."""
    return np.asarray(np.take_along_axis(values, index[..., np.newaxis], axis=-1)[..., 0])


def rule_numbers(
    preset: CriteriaPreset, *, distance_m: ArrayLike, median_k: float = 4.0 / 3.0, extended: ArrayLike = True
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """k and fraction of the criteria of a preset for many paths, each of shape (c, ...).

    Parameters as for `criteria_for`, of shape (...). Where a preset asks less of some paths, their rows repeat the first.
    """
    distance, long_obstruction = np.broadcast_arrays(np.asarray(distance_m, dtype=np.float64), np.asarray(extended))
    if preset == "sixty-percent":
        return np.full((1, *distance.shape), 4.0 / 3.0), np.full((1, *distance.shape), 0.6)
    first_k, first = np.full(distance.shape, median_k), np.ones(distance.shape)
    worst_k = np.asarray(k_exceeded_99_9(distance), dtype=np.float64)
    if preset == "p530-tropical":
        short = distance <= TROPICAL_FROM_M
        return np.stack((first_k, np.where(short, median_k, worst_k))), np.stack((first, np.where(short, 1.0, 0.6)))
    return np.stack((first_k, worst_k)), np.stack((first, np.where(long_obstruction, 0.3, 0.0)))


def criteria_for(
    preset: CriteriaPreset, *, distance_m: float, median_k: float = 4.0 / 3.0, extended: bool = True
) -> tuple[Criterion, ...]:
    """Criteria of a preset for one path.

    Parameters
    ----------
    preset
        'p530-temperate', 'p530-tropical' or 'sixty-percent'.
    distance_m
        Path length, m, > 0.
    median_k
        Median effective Earth radius factor; the 'sixty-percent' preset holds at 4/3 whatever it is.
    extended
        Whether the obstruction is extended along part of the path (`is_extended`); read by 'p530-temperate' only.
    """
    numbers = rule_numbers(preset, distance_m=distance_m, median_k=median_k, extended=extended)
    k, fractions = (rows.tolist() for rows in numbers)
    if preset == "sixty-percent":
        return (Criterion(name="0.6 F1 at k = 4/3", k=k[0], fraction=fractions[0], source=COMMON_PRACTICE),)
    first = Criterion(
        name="1.0 F1 at the median k",
        k=k[0],
        fraction=fractions[0],
        source=f"{P530}, step 1",
        note=f"k = {median_k:.3g}",
    )
    if preset == "p530-tropical" and distance_m <= TROPICAL_FROM_M:
        note = (
            f"{first.note}; P.530 gives no tropical rule at the worst-month k for paths up to about 30 km, so only step 1 "
            "is checked"
        )
        return (Criterion(name=first.name, k=first.k, fraction=first.fraction, source=first.source, note=note),)
    k_worst, fraction = k[1], fractions[1]
    about_k = f"k = {k_worst:.3g}, exceeded 99.9 % of the worst month for {distance_m / 1000.0:.3g} km (equation 4)"
    if distance_m < K_FORMULA_LOW_M:
        about_k += (
            "; the published curve begins at about 18 km: on shorter paths its value there is held (our own rule)"
        )
    if preset == "p530-tropical":
        about_rule = "tropical climate, path over 30 km"
    elif extended:
        about_rule = "obstruction taken as extended along part of the path"
    else:
        about_rule = "single isolated obstruction: one stretch shorter than 10 % of the path (common practice)"
    return (
        first,
        Criterion(
            name=f"{fraction:.1f} F1 at the worst-month k",
            k=k_worst,
            fraction=fraction,
            source=f"{P530}, steps 2 and 3",
            note=f"{about_rule}; {about_k}",
        ),
    )


def range_cautions(preset: CriteriaPreset, *, frequency_hz: float) -> tuple[str, ...]:
    """What P.530 says about frequencies outside the range its clearance rules are made for."""
    if preset == "sixty-percent":
        return ()
    if frequency_hz < 2e9:
        text = (
            f"The P.530 clearance rules are for about 2 GHz and up; at {frequency_hz / 1e9:.3g} GHz smaller fractions of "
            "the Fresnel zone may do, and would spare height."
        )
        return (text,)
    if frequency_hz > 13e9:
        text = (
            f"At {frequency_hz / 1e9:.3g} GHz the error of obstacle heights is as large as the Fresnel zone; P.530 advises "
            "to add it to the clearance above about 13 GHz. Here it enters the confidence, not the clearance."
        )
        return (text,)
    return ()
