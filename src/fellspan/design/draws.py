"""Draws of what a path may really be: 10,000 sets of height errors that hang together along it, and what they ask of heights.

Errors of the ground and of cover are first-order autoregressive along the path; the ground under each antenna is part of the
same field, so that a raster that is wrong as a whole moves antennas and ridges alike. Only samples that can come to govern are
drawn. Seeded: the same link gives the same numbers.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.design.case import Case, Rules
from fellspan.design.error_model import GRADIENT_UNIT, ErrorModel
from fellspan.design.normals import normals
from fellspan.links import clearance
from fellspan.links.own_building import ROOF_SOURCE
from fellspan.terrain.profile import PathProfile

Floats = NDArray[np.float64]

DRAWS: Final = 10_000
SEED: Final = 530
MOST_POINTS: Final = 240
"""Samples drawn at most: more would not fit into the time, and thinner ones are made up for (`_overshoot_m`)."""
NEAR: Final = 3.6
"""Samples with this many standard errors to spare at the lowest workable heights are left out."""
OVERSHOOT: Final = 0.5826
"""Of Siegmund's continuity correction (from memory)."""
LEAST_M: Final = 1e-3
"""Errors of cover or by a shift that are smaller anywhere are left out there, m."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Errors:
    """Standard errors along a case, shape (n,): of the ground, of what stands on it, and per metre of shift along the path.

    `moves_with` is 0 where the surface moves with the antenna at A, 1 with that at B (a typed roof edge), -1 elsewhere.
    """

    ground_m: Floats
    cover_m: Floats
    slope: Floats
    moves_with: NDArray[np.int8]


def errors_of(case: Case) -> Errors:
    """Split the stated errors of a case into ground and cover.

    The error of the ground under cover is taken as that of the nearest bare sample of the same source; what is left of the
    stated one is the cover's. Where the own building was left out only the ground's remains.
    """
    profile, stands = case.profile, case.stands
    ground = _bare_sigma_m(profile)
    bared = np.isfinite(stands.left_out_m) & (stands.cover_m == 0.0)
    total = np.where(bared, np.minimum(profile.sigma_m, ground), profile.sigma_m)
    typed = np.asarray([*(item.source == ROOF_SOURCE for item in profile.obstacles), False])[stands.obstacle_index]
    moves = np.where(typed, np.where(case.share < 0.5, 0, 1), -1).astype(np.int8)
    return Errors(
        ground_m=ground,
        cover_m=np.sqrt(np.maximum(total**2 - ground**2, 0.0)),
        # A surveyed spot is known where it stands.
        slope=np.where(total > 0.0, _slope(profile), 0.0),
        moves_with=moves,
    )


def _bare_sigma_m(profile: PathProfile) -> Floats:
    """Standard error of the ground at every sample: the nearest bare one's of the same source, never above the stated one."""
    bare = np.array(profile.sigma_m)
    for source in np.unique(profile.source):
        mine = profile.source == source
        known = np.flatnonzero(mine & (profile.cover_m == 0.0))
        if known.size:
            at = np.searchsorted(profile.distance_m[known], profile.distance_m[mine])
            left, right = known[np.clip(at - 1, 0, known.size - 1)], known[np.clip(at, 0, known.size - 1)]
            here = profile.distance_m[mine]
            nearer = np.where(
                np.abs(here - profile.distance_m[left]) <= np.abs(profile.distance_m[right] - here), left, right
            )
            bare[mine] = np.minimum(profile.sigma_m[nearer], profile.sigma_m[mine])
    return bare


def _slope(profile: PathProfile) -> Floats:
    """Slope of the ground along the path over about one cell each way, so that detail inside a cell does not count."""
    distance, ground = profile.distance_m, profile.ground_m
    half = max(0.5 * profile.cell_m, 1e-6)
    before, after = np.maximum(distance - half, 0.0), np.minimum(distance + half, profile.length_m)
    rise = np.interp(after, distance, ground) - np.interp(before, distance, ground)
    return np.asarray(rise / (after - before))


def marginal_m(case: Case, errors: Errors, model: ErrorModel) -> Floats:
    """Standard error of the clearance at each sample under the model, m, shape (n,): what the draws scatter by."""
    distance, length, share = case.profile.distance_m, case.profile.length_m, case.share
    to_a, to_b = np.exp(-distance / model.ground_reach_m), np.exp(-(length - distance) / model.ground_reach_m)
    a, b = (1.0 - share) * case.a_error_m, share * case.b_error_m
    ground = np.where(errors.moves_with < 0, errors.ground_m, 0.0)
    cover = np.where(errors.moves_with < 0, errors.cover_m, 0.0)
    a = np.where(errors.moves_with == 0, a - case.a_error_m, a)
    b = np.where(errors.moves_with == 1, b - case.b_error_m, b)
    variance = ground**2 + a**2 + b**2 - 2.0 * ground * (a * to_a + b * to_b)
    variance += 2.0 * a * b * math.exp(-length / model.ground_reach_m)
    variance += cover**2 + 2.0 * (errors.slope * model.position_error_m) ** 2
    variance += (case.curve_m * GRADIENT_UNIT * model.gradient_error) ** 2
    return np.asarray(np.sqrt(np.maximum(variance, 0.0)))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Draws:
    """Errors of need against the ray at some samples, m, shape (m, draws); positive is worse."""

    case: Case
    points: NDArray[np.intp]
    share: Floats
    error_m: NDArray[np.float32]
    shift_m: Floats
    """What thinning left out, per point (m,): part of the error in every draw."""

    def holds(self, need_m: Floats, a_m: float, b_m: float) -> float:
        """Share of the draws in which the ray clears `need_m` (n,) everywhere."""
        return float(np.mean(self.spare_m(need_m, a_m, b_m) >= -clearance.TOLERANCE_M))

    def spare_m(self, need_m: Floats, a_m: float, b_m: float) -> Floats:
        """Least height to spare along the path in each draw, shape (draws,)."""
        spare = self._ray_m(a_m, b_m) - need_m[self.points] - self.shift_m
        return np.asarray(-(self.error_m - spare[:, np.newaxis].astype(np.float32)).max(axis=0), dtype=np.float64)

    def lowest_a(self, need_m: Floats, b_m: float) -> Floats:
        """Lowest level of A that clears each draw with B at `b_m`, shape (draws,); infinite where none does."""
        return self._lowest(need_m[self.points] + self.shift_m - self.share * b_m, 1.0 - self.share)

    def lowest_b(self, need_m: Floats, a_m: float) -> Floats:
        """Lowest level of B that clears each draw with A at `a_m`, shape (draws,); infinite where none does."""
        return self._lowest(need_m[self.points] + self.shift_m - (1.0 - self.share) * a_m, self.share)

    def _ray_m(self, a_m: float, b_m: float) -> Floats:
        return np.asarray((1.0 - self.share) * a_m + self.share * b_m)

    def _lowest(self, wanted: Floats, lever: Floats) -> Floats:
        can = np.flatnonzero((lever > 1e-9) & np.isfinite(wanted))
        # In place of one division for each draw and point: the scale is the point's alone.
        scale = (1.0 / lever[can])[:, np.newaxis].astype(np.float32)
        low = (wanted[can] / lever[can]).min() if can.size else 0.0
        offset = (wanted[can] / lever[can] - low)[:, np.newaxis].astype(np.float32)
        level = low + (self.error_m[can] * scale + offset).max(axis=0).astype(np.float64)
        for index in np.flatnonzero((lever <= 1e-9) & np.isfinite(wanted)).tolist():
            level[self.error_m[index] + wanted[index] > clearance.TOLERANCE_M] = math.inf
        return np.asarray(level)


def draw(
    case: Case,
    model: ErrorModel,
    lines: Sequence[tuple[Rules, float, float]],
    *,
    count: int = DRAWS,
    seed: int = SEED,
) -> Draws:
    """Draw the errors at the samples that can govern near some lines (rules, level of A, level of B).

    Half of the draws are the other half with the signs turned, so that averages need fewer of them.
    """
    parts = parts_of(case, model, lines)
    half = (count + 1) // 2
    rows = parts.rows
    numbers = normals(seed, half * rows).reshape(rows, half)
    field = _field(numbers[: parts.points.size], case.profile.distance_m[parts.points], model.ground_reach_m)
    e_a, e_b = field[0].copy(), field[-1].copy()
    error = field
    error *= parts.ground_m[:, np.newaxis].astype(np.float32)
    row = parts.points.size
    for some, sizes, reach in parts.fields:
        if some.size:
            own = _field(numbers[row : row + some.size], case.profile.distance_m[parts.points[some]], reach)
            error[some] += own * sizes[some, np.newaxis].astype(np.float32)
            row += some.size
    along = numbers[-2] * model.position_error_m
    gradient = numbers[-1] * model.gradient_error * GRADIENT_UNIT
    error += parts.common.astype(np.float32) @ np.stack((e_a, e_b, along, gradient)).astype(np.float32)
    return Draws(
        case=case,
        points=parts.points,
        share=parts.share,
        error_m=np.concatenate((error, -error), axis=1)[:, :count],
        shift_m=parts.shift_m,
    )


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Parts:
    """What the draws of a case are made of, at the samples that are drawn, (m,)."""

    points: NDArray[np.intp]
    share: Floats
    shift_m: Floats
    ground_m: Floats
    fields: tuple[tuple[NDArray[np.intp], Floats, float], ...]
    """Of cover and of the shift along the path: which samples have it, its sizes, m, (m,), and its reach, m."""
    common: Floats
    """What the errors at A and at B, a metre of shift and a unit of 1/k do to each, (m, 4)."""

    @property
    def rows(self) -> int:
        """Rows of unit normals that each draw takes a number of: of the ground, of each field, of shift and gradient."""
        return self.points.size + sum(some.size for some, _, _ in self.fields) + 2


def parts_of(case: Case, model: ErrorModel, lines: Sequence[tuple[Rules, float, float]]) -> Parts:
    """Choose the samples to draw, and take the errors apart there."""
    errors = errors_of(case)
    sigma = marginal_m(case, errors, model)
    points, spacing_m = _points(case, sigma, lines)
    moves = errors.moves_with[points]
    cover = np.where(moves < 0, errors.cover_m[points], 0.0)
    shift = errors.slope[points] * model.position_error_m
    share = case.share[points]
    lever_a = case.a_error_m * ((moves == 0) - (1.0 - share))
    lever_b = case.b_error_m * ((moves == 1) - share)
    return Parts(
        points=points,
        share=share,
        shift_m=_overshoot_m(case, sigma[points], points, spacing_m, model),
        ground_m=np.where(moves < 0, errors.ground_m[points], 0.0),
        fields=tuple(
            (np.flatnonzero(np.abs(sizes) > LEAST_M), sizes, reach)
            for sizes, reach in ((cover, model.cover_reach_m), (shift, model.ground_reach_m))
        ),
        common=np.stack((lever_a, lever_b, errors.slope[points], case.curve_m[points]), axis=1),
    )


def _field(fresh: NDArray[np.float32], distance_m: Floats, reach_m: float) -> NDArray[np.float32]:
    """Unit normal errors with correlation exp(-distance / reach) along the points, from fresh ones, shape (m, count)."""
    field = fresh.copy()
    keep, new = links_of(distance_m, reach_m)
    for i in range(1, distance_m.size):
        field[i] *= np.float32(new[i - 1])
        field[i] += np.float32(keep[i - 1]) * field[i - 1]
    return field


def links_of(distance_m: Floats, reach_m: float) -> tuple[Floats, Floats]:
    """What each point of such a field keeps of the one before it, and how much of it is new, shape (m - 1,)."""
    keep = np.exp(-np.diff(distance_m) / reach_m)
    return keep, np.sqrt(1.0 - keep**2)


def _points(
    case: Case, sigma_m: Floats, lines: Sequence[tuple[Rules, float, float]]
) -> tuple[NDArray[np.intp], Floats]:
    """Samples that can come to govern, both ends among them, and how far each stands for, m."""
    distance = case.profile.distance_m
    nearness = np.full(distance.shape, np.inf)
    for rules, a_m, b_m in lines:
        spare = case.ray_m(a_m, b_m) - rules.most_m
        spare = spare - min(float(spare.min()), 0.0)
        z = np.where(spare <= clearance.TOLERANCE_M, 0.0, np.inf)
        np.divide(spare, sigma_m, out=z, where=sigma_m > 0.0)
        nearness = np.minimum(nearness, z - z.min())
    # Which of two samples that are as near is kept must not hang on rounding: answers touch several at once.
    nearness = np.round(nearness, 6)
    kept = np.flatnonzero(nearness < NEAR)
    gaps = np.gradient(distance)
    finest = float(np.median(gaps))
    width = finest
    chosen = kept
    while True:
        # The farther from governing, the thinner.
        bins = np.floor(
            distance[kept] / (width * np.where(nearness[kept] < 1.0, 1.0, np.where(nearness[kept] < 2.0, 2.0, 4.0)))
        )
        order = np.lexsort((nearness[kept], bins))
        first = order[np.r_[True, np.diff(bins[order]) != 0]]
        chosen = np.sort(kept[first])
        if chosen.size <= MOST_POINTS or kept.size <= MOST_POINTS:
            break
        width *= 1.5
    if kept.size <= MOST_POINTS:
        chosen = kept
    points = np.unique(np.concatenate(([0], chosen, [distance.size - 1]))).astype(np.intp)
    spaced = np.minimum(np.gradient(distance[points]) if points.size > 1 else gaps[points], 4.0 * width)
    return points, np.maximum(spaced, gaps[points]) if chosen.size < kept.size else gaps[points]


def _overshoot_m(case: Case, sigma_m: Floats, points: NDArray[np.intp], spacing_m: Floats, model: ErrorModel) -> Floats:
    """How much the samples left out between the points would have added to the greatest error, m, shape (m,).

    A first-order process seen at steps w misses 0.5826 sqrt(2 w / reach) standard errors of its running maximum (Siegmund's
    continuity correction; from memory); what the profile's own steps miss belongs to the profile.
    """
    own = np.gradient(case.profile.distance_m)[points]
    missed = np.sqrt(2.0 * spacing_m / model.ground_reach_m) - np.sqrt(2.0 * own / model.ground_reach_m)
    return np.asarray(np.where(spacing_m > 1.01 * own, OVERSHOOT * sigma_m * np.maximum(missed, 0.0), 0.0))
