"""Rays over many profiles: levels, criteria, the minima to look at again, and the verdict with its numbers.

Asks `links.clearance`, `links.criteria`, `links.minima` and `links.evaluate` for arrays of paths, as they are asked for one.
Knows no rasters and no antennas' patterns.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.links import clearance
from fellspan.links.assess import AssessSettings
from fellspan.links.criteria import are_extended, rule_numbers
from fellspan.links.evaluate import governing_rows
from fellspan.links.minima import lowest_minima
from fellspan.screening.pairs import BASES, PATH_VERDICTS
from fellspan.screening.profiles import Profiles
from fellspan.screening.stand import Antennas, HeightErrors, Standings, height_errors, roof_doubts
from fellspan.vocabulary import COVER_KINDS

Floats = NDArray[np.float64]

CLEAR, MARGINAL, OBSTRUCTED = (PATH_VERDICTS.index(word) for word in ("clear", "marginal", "obstructed"))
_TREE = COVER_KINDS.index("tree")
_RASTER, _BARE = BASES.index("surface raster"), BASES.index("bare ground only")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Rays:
    """Rays over profiles under the criteria that apply; a row of (c, q, n) for each criterion."""

    available_m: Floats
    """(q, n)."""
    radius_m: Floats
    k: Floats
    """(c, q)."""
    fraction: Floats
    clear_m: Floats
    """Ray less surface and bulge, (c, q, n)."""
    normalised: Floats
    """The same in radii of the first zone; infinite at the ends."""
    margin_m: Floats
    """What is left of it beyond the fraction that is asked for."""


def rays_over(
    profiles: Profiles, stands: Standings, a: Antennas, b: Antennas, *, settings: AssessSettings, frequency_hz: float
) -> Rays:
    """Rays between antennas; criteria as `links.assess` chooses them."""
    distance = profiles.distance_m
    available = clearance.available_m(distance, a_amsl_m=a.amsl_m, b_amsl_m=b.amsl_m)
    radius = clearance.zone_radius_m(distance, frequency_hz=frequency_hz)
    above = available - stands.surface_m
    count = distance.shape[0]
    if settings.criteria:
        k = np.array([[rule.k] * count for rule in settings.criteria])
        fraction = np.array([[rule.fraction] * count for rule in settings.criteria])
    else:
        k, fraction = rule_numbers(settings.preset, distance_m=profiles.length_m, median_k=settings.median_k)
    clear = clearance.bulge_m(distance, k=k)
    np.subtract(above, clear, out=clear)
    normalised = clearance.normalised_clearance(clear, radius)
    if not settings.criteria and settings.preset == "p530-temperate":
        # The least of P.530's second rule is for an isolated obstruction; rule_numbers gave that for an extended one.
        _, isolated = rule_numbers(settings.preset, distance_m=profiles.length_m[:1], extended=False)
        fraction[1] = np.where(are_extended(distance, normalised[1]), fraction[1], isolated[1, 0])
    margin = fraction[..., np.newaxis] * radius
    np.subtract(clear, margin, out=margin)
    return Rays(
        available_m=available,
        radius_m=radius,
        k=k,
        fraction=fraction,
        clear_m=clear,
        normalised=normalised,
        margin_m=margin,
    )


def worth_a_closer_look(rays: Rays, profiles: Profiles) -> NDArray[np.bool_]:
    """Samples (q, n) at the least margins and normalised clearances of every criterion."""
    wanted = np.zeros(profiles.distance_m.shape, dtype=np.bool_)
    for rows in (rays.margin_m, rays.normalised):
        for row in rows:
            wanted |= lowest_minima(row, last=profiles.last)
    return wanted


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Judged:
    """Verdicts of pairs, columns (q,), as those of the same names in `PairResults`."""

    verdict: NDArray[np.int8]
    basis: NDArray[np.int8]
    confidence: Floats
    governing: NDArray[np.int8]
    worst_fraction: Floats
    worst_at_m: Floats
    extra_at_place_m: Floats
    trees_in_zone: NDArray[np.bool_]
    errors: HeightErrors


def judged(
    rays: Rays,
    profiles: Profiles,
    stands: Standings,
    a: Antennas,
    b: Antennas,
    *,
    settings: AssessSettings,
    ground_is_bare: bool,
) -> Judged:
    """The verdict on every pair, and the numbers beside it."""
    distance = profiles.distance_m
    worst = np.stack([clearance.worst_indices(row, distance) for row in rays.normalised])
    most = -rays.margin_m.min(axis=-1)
    least = rays.margin_m.min(axis=0)
    missing = np.where(most > clearance.TOLERANCE_M, most, 0.0)
    at_worst = np.take_along_axis(rays.margin_m, worst[..., np.newaxis], axis=-1)[..., 0]
    governing = governing_rows(missing, at_worst)
    rows = np.arange(governing.size)
    worst_at = worst[governing, rows]
    errors = height_errors(profiles, stands, a, b)
    probability = clearance.probability_met(rays.margin_m, errors.clearance_m)
    confidence = np.asarray(probability.min(axis=0))
    sight = rays.clear_m[0]
    if not (rays.k[0] == settings.median_k).all():
        sight = rays.available_m - stands.surface_m - clearance.bulge_m(distance, k=settings.median_k)
    cut = -sight.min(axis=-1) > clearance.TOLERANCE_M
    doubts = roof_doubts(a, profiles, at_a=True) | roof_doubts(b, profiles, at_a=False)
    if stands.left_out_m is not None:
        over = stands.left_out_m + clearance.bulge_m(distance, k=settings.median_k) - rays.available_m
        doubts |= over.max(axis=-1) > clearance.TOLERANCE_M
    met = (missing == 0.0).all(axis=0)
    sure = met & (confidence >= settings.confidence) & ~doubts
    verdict = np.where(cut, OBSTRUCTED, np.where(sure, CLEAR, MARGINAL)).astype(np.int8)
    known = profiles.known.all(axis=1) & profiles.tells
    extra = np.zeros(rows.size)
    lacking = np.flatnonzero(~met)
    if lacking.size:
        extra[lacking] = clearance.extra_at_b_m(-least[lacking], distance[lacking])
    trees = np.zeros(rows.size, dtype=np.bool_)
    if stands.cover_kind is not None:
        trees = ((stands.cover_kind == _TREE) & (least < 0.0)).any(axis=-1)
    return Judged(
        verdict=verdict,
        basis=np.where(known | (not ground_is_bare), _RASTER, _BARE).astype(np.int8),
        confidence=confidence,
        governing=governing.astype(np.int8),
        worst_fraction=rays.normalised[governing, rows, worst_at],
        worst_at_m=distance[rows, worst_at],
        extra_at_place_m=extra,
        trees_in_zone=trees,
        errors=errors,
    )
