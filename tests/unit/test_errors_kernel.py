"""The errors of many paths, the samples that are drawn and the shares that hold, compiled, are those of `design.draws`."""

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from made_profiles import link_of, profile_of
from numpy.typing import NDArray

from fellspan.design.case import Case
from fellspan.design.draws import DRAWS, MOST_POINTS, draw, errors_of, marginal_m, parts_of
from fellspan.design.error_model import GRADIENT_UNIT, ErrorModel, default_error_model, error_model, error_models
from fellspan.links import clearance
from fellspan.links.assess import AssessSettings
from fellspan.screening import draws_kernel, errors_kernel
from fellspan.screening.draws_kernel import FALLS, HOLDS, UNSURE
from fellspan.screening.errors_kernel import COVER, CURVE, FROM_A, FROM_B, GROUND, PARTS, SIGMA, SLOPE
from fellspan.terrain.profile import PathProfile

Floats = NDArray[np.float64]
TOLERANCE_M = clearance.TOLERANCE_M


def rough(count: int, seed: int) -> Floats:
    return np.cumsum(np.random.default_rng(seed).normal(0.0, 0.6, count))


def paths() -> dict[str, PathProfile]:
    """Bare; wooded over two sources, one bare nowhere; a house at A that is left out; sea, which is known exactly; fine."""
    random = np.random.default_rng(4)
    bare = profile_of(3e3, lambda d: rough(150, 1), n=150, sigma_m=1.3, cell_m=30.0)
    trees = np.where(random.random(150) < 0.4, random.uniform(3.0, 9.0, 150), 0.0)
    trees[90:] = 4.0
    trees[[0, -1]] = 0.0
    wooded = profile_of(3e3, lambda d: rough(150, 2), n=150, cover=lambda d: trees, cell_m=8.0)
    source = np.where(np.arange(150) < 90, 0, 1).astype(np.int16)
    wooded = replace(
        wooded,
        sigma_m=np.where(trees > 0.0, random.uniform(1.0, 2.5, 150), random.uniform(0.8, 1.2, 150)),
        source=source,
    )
    houses = np.where(np.arange(301) < 2, 6.0, 0.0)
    housed = profile_of(2e3, lambda d: rough(301, 3), n=301, cover=lambda d: houses, kind="building", cell_m=2.0)
    housed = replace(housed, sigma_m=np.where(houses > 0.0, 2.0, 0.8))
    level = np.where(np.abs(np.arange(150) - 70) < 30, 0.0, 8.0 + rough(150, 5))
    sea = profile_of(6e3, lambda d: level, n=150, cell_m=12.0)
    sea = replace(sea, sigma_m=np.where(level == 0.0, 0.0, 1.5), source=(level == 0.0).astype(np.int16))
    fine = profile_of(2e3, lambda d: 0.02 * rough(1201, 6), n=1201, sigma_m=1.0, cell_m=3.0)
    return {"bare": bare, "wooded": wooded, "housed": housed, "sea": sea, "fine": fine}


def case_of(profile: PathProfile, *, sigmas: float = 1.7) -> Case:
    """Antennas as high as leaves the worst sample so many standard errors, B 3 m above A."""
    settings, height = AssessSettings(), 20.0
    for _ in range(30):
        case = Case.over(link_of(profile, height, height + 3.0), profile, settings)
        a, b = case.planned
        sigma = np.maximum(marginal_m(case, errors_of(case), default_error_model(profile)), 1e-3)
        lacking = float((sigmas * sigma - (case.ray_m(a, b) - case.rules_at(a, b).most_m)).max())
        if abs(lacking) < 1e-3:
            break
        height = max(height + lacking, 0.1)
    return case


def arrays_of(case: Case, *, fill: int = 3) -> tuple[Any, ...]:
    """One path as the kernels take it, filled up before its last sample."""
    profile, model = case.profile, default_error_model(case.profile)
    columns = np.concatenate(
        (
            np.arange(profile.distance_m.size - 1),
            np.full(fill, profile.distance_m.size - 2),
            [profile.distance_m.size - 1],
        )
    )
    a, b = case.planned
    spare = case.ray_m(a, b) - case.rules_at(a, b).most_m
    bared = np.isfinite(case.stands.left_out_m) & (case.stands.cover_m == 0.0)
    wide = (profile.distance_m, profile.ground_m, spare, profile.cover_m, bared, profile.sigma_m, profile.source)
    return (
        np.array([profile.distance_m.size - 1]),
        *(np.ascontiguousarray(values[columns][np.newaxis]) for values in wide),
        np.array([profile.cell_m]),
        np.array([case.a_error_m]),
        np.array([case.b_error_m]),
        columns_of(model),
    )


def columns_of(model: ErrorModel) -> Floats:
    gradient = model.gradient_error * GRADIENT_UNIT
    return np.array([[model.ground_reach_m, model.cover_reach_m, model.position_error_m, gradient]])


def taken_apart(case: Case) -> tuple[Floats, int]:
    last, distance, ground, spare, cover, bared, sigma, source, cell, a, b, models = arrays_of(case)
    parts = np.empty((PARTS, distance.shape[1]))
    count = int(last[0]) + 1
    errors_kernel.taken_apart(
        0, count, distance, ground, spare, cover, bared, sigma, source, float(cell[0]), float(a[0]), float(b[0]), models[0],
        parts,
    )  # fmt: skip
    return parts, count


def test_models_of_many_cells_are_those_of_each() -> None:
    cells = np.array([0.25, 2.0, 2.0000001, 11.9, 12.0, 30.0, 60.0, 100.0, 101.0, 3000.0])
    each = [columns_of(error_model(cell))[0] for cell in cells.tolist()]
    np.testing.assert_allclose(error_models(cells), each, rtol=1e-15)


@pytest.mark.parametrize("name", list(paths()))
def test_errors_are_taken_apart_as_design_does(name: str) -> None:
    case = case_of(paths()[name])
    parts, count = taken_apart(case)
    errors = errors_of(case)
    for row, wanted in (
        (GROUND, errors.ground_m),
        (COVER, errors.cover_m),
        (SLOPE, errors.slope),
        (CURVE, case.curve_m),
        (FROM_A, (1.0 - case.share) * case.a_error_m),
        (FROM_B, case.share * case.b_error_m),
    ):
        np.testing.assert_allclose(parts[row, :count], wanted, rtol=1e-9, atol=1e-9)
    sigma = marginal_m(case, errors, default_error_model(case.profile))
    a, b = case.planned
    spare = case.ray_m(a, b) - case.rules_at(a, b).most_m
    near = spare < 6.9 * sigma
    assert near.any()
    np.testing.assert_allclose(parts[SIGMA, :count][near], sigma[near], rtol=1e-9, atol=1e-9)
    assert (parts[SIGMA, :count] >= sigma - 1e-9).all()


def test_one_value_all_along_and_no_cover_are_the_same_as_columns_of_them() -> None:
    case = case_of(paths()["bare"])
    last, distance, ground, spare, cover, bared, sigma, source, *rest = arrays_of(case)
    found = []
    for given in ((cover, bared, sigma, source), (cover[:, :0], bared[:, :0], sigma[:, :1], source[:, :1])):
        worst, together = np.empty(1), np.empty(1)
        which = np.zeros(1, dtype=np.int64)
        errors_kernel.bound(which, last, distance, ground, spare, *given, *rest, TOLERANCE_M, worst, together)
        found.append((worst[0], together[0]))
    assert found[0] == found[1]
    assert found[0][0] == pytest.approx(0.5 * math.erfc(1.7 / math.sqrt(2.0)), abs=1e-3)
    assert found[0][1] > found[0][0]


@pytest.mark.parametrize("name", list(paths()))
def test_samples_are_chosen_as_design_chooses_them_near_the_heights_as_planned(name: str) -> None:
    case = case_of(paths()[name])
    parts, count = taken_apart(case)
    model = default_error_model(case.profile)
    a, b = case.planned
    wanted = parts_of(case, model, [(case.rules_at(a, b), a, b)])
    points, left = np.empty(count + 2, dtype=np.int64), np.empty(count + 2)
    found = draws_kernel._chosen(parts, count, TOLERANCE_M, points, left, model.ground_reach_m)
    np.testing.assert_array_equal(points[:found], wanted.points)
    spare = (case.ray_m(a, b) - case.rules_at(a, b).most_m)[wanted.points] - wanted.shift_m
    inside = parts[SIGMA, points[:found]] < 1e6
    np.testing.assert_allclose(left[:found][inside], spare[inside], atol=1e-6)
    assert (name == "fine") == bool(wanted.shift_m.any())
    if name == "fine":
        assert found <= MOST_POINTS + 2


def drawn(case: Case, numbers: NDArray[np.float32], *, asked: float, allowance: float = 6.0) -> tuple[int, float, int]:
    verdict, share = np.empty(1, dtype=np.int8), np.empty(1)
    made, samples = np.empty(1, dtype=np.int64), np.empty(1, dtype=np.int64)
    draws_kernel.draw(
        np.zeros(1, dtype=np.int64), *arrays_of(case), TOLERANCE_M, numbers, 1.0 - asked, allowance, DRAWS, np.zeros(1),
        verdict, share, made, samples,
    )  # fmt: skip
    return int(verdict[0]), float(share[0]), 2 * int(made[0])


@pytest.mark.parametrize("name", list(paths()))
def test_the_share_that_holds_is_that_of_the_draws_of_design(name: str) -> None:
    case = case_of(paths()[name])
    model = default_error_model(case.profile)
    a, b = case.planned
    wanted = draw(case, model, [(case.rules_at(a, b), a, b)]).holds(case.rules_at(a, b).most_m, a, b)
    assert 0.5 < wanted < 0.99
    parts = parts_of(case, model, [(case.rules_at(a, b), a, b)])
    # As few as uncompiled loops make in a second. Asked for its own share, it never stops early.
    blocks = 2 if not hasattr(draws_kernel.draw, "py_func") else 12
    numbers = np.random.default_rng(8).standard_normal(parts.rows * draws_kernel.FIRST * blocks, dtype=np.float32)
    verdict, share, made = drawn(case, numbers, asked=wanted)
    assert verdict == UNSURE
    assert made >= 2 * draws_kernel.FIRST
    assert share == pytest.approx(
        wanted, abs=4.0 * math.sqrt(wanted * (1.0 - wanted) * 2.0 * (1.0 / made + 1.0 / DRAWS))
    )


def test_it_stops_where_draws_tell_and_on_the_right_side() -> None:
    case = case_of(paths()["bare"], sigmas=2.2)
    numbers = np.random.default_rng(9).standard_normal(400_000, dtype=np.float32)
    _, share, _ = drawn(case, numbers, asked=0.5)
    assert drawn(case, numbers, asked=share - 0.2) == (HOLDS, share, 2 * draws_kernel.FIRST)
    assert drawn(case, numbers, asked=0.9999)[0] == FALLS


def test_too_few_numbers_leave_it_unsure() -> None:
    case = case_of(paths()["bare"])
    assert drawn(case, np.zeros(10, dtype=np.float32), asked=0.9) == (UNSURE, 0.0, 0)


def test_each_round_takes_numbers_of_its_own() -> None:
    case = case_of(paths()["wooded"])
    model = default_error_model(case.profile)
    a, b = case.planned
    block = parts_of(case, model, [(case.rules_at(a, b), a, b)]).rows * draws_kernel.FIRST
    numbers = np.zeros(2 * block, dtype=np.float32)
    numbers[:block] = np.random.default_rng(10).standard_normal(block)
    _, once, made = drawn(case, numbers[:block], asked=0.9, allowance=1e6)
    _, twice, made_twice = drawn(case, numbers, asked=0.9, allowance=1e6)
    assert (made, made_twice) == (2 * draws_kernel.FIRST, 4 * draws_kernel.FIRST)
    assert once < 1.0
    assert twice == pytest.approx(0.5 * (once + 1.0))  # nothing fails without errors


def decided(fails: int, twice: int, made: int, *, asked: float, room: float = 0.0) -> int:
    return int(draws_kernel._decided(fails, twice, made, 1.0 - asked, 6.0, DRAWS, room))


def test_what_decides_is_six_standard_errors_of_both_shares() -> None:
    made, asked = 2560, 0.9
    both = math.sqrt(0.5 * 0.1 * 0.9 * (1.0 / made + 2.0 / DRAWS))
    low, high = int((0.1 - 6.1 * both) * 2 * made), int((0.1 + 6.6 * both) * 2 * made)
    assert decided(low, 0, made, asked=asked) == HOLDS
    assert decided(high, 0, made, asked=asked) == FALLS
    assert decided(int((0.1 - 5.9 * both) * 2 * made), 0, made, asked=asked) == UNSURE
    assert decided(low, 0, made, asked=asked, room=0.006) == UNSURE
    # Pairs that fail together scatter more.
    assert decided(high, high // 2, made, asked=asked) == UNSURE
    assert decided(int(0.1 * 2 * made), 0, made, asked=asked) == -1


def test_a_few_unlucky_draws_decide_nothing_where_hardly_any_may_fail() -> None:
    # Of 512 draws with 1 in 1000 failing, five or more fail once in 5,000 times (Poisson's law).
    assert decided(5, 0, 256, asked=0.999) == UNSURE
    assert decided(40, 0, 256, asked=0.999) == FALLS
    assert decided(0, 0, 2560, asked=0.999) == UNSURE
