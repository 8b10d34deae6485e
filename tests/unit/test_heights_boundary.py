"""The boundary of workable heights against brute force, and its named answers on cases that can be worked out by hand."""

import math

import numpy as np
import pytest

from fellspan.design.boundary import Boundary, upper_hull
from fellspan.design.heights_result import HeightKind, HeightSettings, Limits
from fellspan.design.options import Ground, cost_of, exact, rounded
from fellspan.errors import LinkError

FREE = {"a_from_m": 0.0, "a_to_m": math.inf, "b_from_m": 0.0, "b_to_m": math.inf}


def ground(**changes: object) -> Ground:
    fields = {"base_a_m": 0.0, "base_b_m": 0.0, "planned": (10.0, 10.0), **FREE}
    return Ground(**(fields | changes))  # type: ignore[arg-type]


def some_need(rng: np.random.Generator) -> tuple[np.ndarray, np.ndarray]:
    count = int(rng.integers(3, 28))
    share = np.concatenate(([0.0], np.sort(rng.uniform(0.01, 0.99, count - 2)), [1.0]))
    need = rng.uniform(0.0, 25.0, count) * rng.uniform(0.1, 1.0)
    need[[0, -1]] = rng.uniform(0.0, 3.0, 2)
    need[1:-1][rng.random(count - 2) < 0.1] = -np.inf
    return share, need


def test_the_boundary_of_a_thousand_profiles_equals_brute_force() -> None:
    rng = np.random.default_rng(11)
    grid = np.arange(0.0, 60.0, 0.1)
    for _ in range(1000):
        share, need = some_need(rng)
        boundary = Boundary.over(share, need)
        levels = rng.choice(grid, 20, replace=False)
        rays = (1.0 - share) * levels[:, None, None] + share * grid[None, :, None]
        works = (rays >= need - 1e-9).all(axis=-1)
        lowest = np.array([boundary.lowest_b(a) for a in levels.tolist()])
        assert np.array_equal(works, grid >= lowest[:, None] - 1e-7)
        back = np.array([boundary.lowest_a(b) for b in levels.tolist()])
        rays = (1.0 - share) * grid[None, :, None] + share * levels[:, None, None]
        assert np.array_equal((rays >= need - 1e-9).all(axis=-1), grid >= back[:, None] - 1e-7)


def test_the_least_total_and_the_least_cost_equal_brute_force() -> None:
    rng = np.random.default_rng(12)
    grid = np.arange(0.0, 80.0, 0.1)
    settings = HeightSettings(cost_a_per_m=3.0, cost_b_per_m=1.0, cost_per_section=20.0, section_m=3.0)
    for _ in range(120):
        share, need = some_need(rng)
        boundary = Boundary.over(share, need)
        lowest = np.array([boundary.lowest_b(a) for a in grid.tolist()])
        best = np.nanmin(np.where(np.isfinite(lowest), grid + lowest, np.nan))
        total = exact("least total", boundary, share, need, ground(), settings)
        assert total is not None
        assert sum(total) <= best + 1e-9
        assert sum(total) > best - 0.1 - 1e-9 or total[0] > grid[-1]
        works = np.isfinite(lowest)
        priced = [
            cost_of((a, b), ground(), settings)
            for a, b in zip(grid[works].tolist(), lowest[works].tolist(), strict=True)
        ]
        cheap = exact("least cost", boundary, share, need, ground(), settings)
        assert cheap is not None
        assert cost_of(cheap, ground(), settings) <= min(priced) + 1e-6


def test_one_ridge_gives_the_lever_rule() -> None:
    share, need = np.array([0.0, 0.25, 1.0]), np.array([0.0, 20.0, 0.0])
    boundary = Boundary.over(share, need)
    # 0.75 a + 0.25 b = 20 by hand.
    assert boundary.lowest_a(10.0) == pytest.approx((20.0 - 2.5) / 0.75)
    assert boundary.lowest_b(10.0) == pytest.approx((20.0 - 7.5) / 0.25)
    assert exact("equal", boundary, share, need, ground(), HeightSettings()) == pytest.approx((20.0, 20.0))
    # All of it at A, the end near the ridge, is the least total: 26.67 m.
    assert exact("least total", boundary, share, need, ground(), HeightSettings()) == pytest.approx((20.0 / 0.75, 0.0))


def test_the_limits_of_a_mast_hold_and_a_path_beyond_them_has_no_answer() -> None:
    share, need = np.array([0.0, 0.25, 1.0]), np.array([0.0, 20.0, 0.0])
    boundary = Boundary.over(share, need)
    held = exact("least total", boundary, share, need, ground(a_to_m=20.0), HeightSettings())
    assert held == pytest.approx((20.0, 20.0))
    assert exact("a alone", boundary, share, need, ground(a_to_m=20.0), HeightSettings()) is None
    assert exact("equal", boundary, share, need, ground(a_to_m=15.0), HeightSettings()) is None
    assert exact("equal", boundary, share, need, ground(b_from_m=25.0), HeightSettings()) == pytest.approx((25.0, 25.0))


@pytest.mark.parametrize("kind", ["a alone", "b alone", "equal", "alike", "least total", "least cost"])
def test_heights_to_build_are_whole_steps_that_work(kind: HeightKind) -> None:
    rng = np.random.default_rng(13)
    settings = HeightSettings(step_m=1.5, cost_a_per_m=1.0, cost_b_per_m=2.0)
    place = ground(base_a_m=0.7, base_b_m=-0.4, planned=(12.2, 11.3))
    for _ in range(60):
        share, need = some_need(rng)
        boundary = Boundary.over(share, need)
        raw = exact(kind, boundary, share, need, place, settings)
        if raw is None:
            continue
        built = rounded(kind, raw, boundary, place, settings)
        assert built is not None
        assert ((1.0 - share) * built[0] + share * built[1] >= need - 1e-6).all()
        for level, base, end in ((built[0], 0.7, "b alone"), (built[1], -0.4, "a alone")):
            if kind not in (end, "alike"):
                assert (level - base) / 1.5 == pytest.approx(round((level - base) / 1.5), abs=1e-6)
        if kind in ("least total", "least cost"):
            steps = [0.7 + 1.5 * number for number in range(200)]
            pairs = [
                (a, -0.4 + 1.5 * math.ceil((max(boundary.lowest_b(a), 0.0) + 0.4) / 1.5 - 1e-6))
                for a in steps
                if math.isfinite(boundary.lowest_b(a))
            ]
            prices = [
                sum(pair) if kind == "least total" else cost_of(pair, place, settings) for pair in [built, *pairs]
            ]
            assert prices[0] == pytest.approx(min(prices), abs=1e-6)


def test_the_hull_of_many_points_is_that_of_few() -> None:
    rng = np.random.default_rng(14)
    x = np.linspace(0.0, 1.0, 5001)
    y = np.cumsum(rng.normal(size=5001))
    hull = upper_hull(x, y)
    assert (np.interp(x, x[hull], y[hull]) >= y - 1e-9).all()
    assert (np.diff(np.diff(y[hull]) / np.diff(x[hull])) < 0.0).all()


@pytest.mark.parametrize("kind", ["walk", "bowed", "level", "steps", "gaps"])
def test_the_hull_is_that_of_a_plain_walk_over_all_points(kind: str) -> None:
    rng = np.random.default_rng(29)
    for n in (2, 3, 65, 400, 2_000):
        x = np.unique(np.concatenate(([0.0, 1.0], rng.random(n))))
        y = {
            "walk": lambda x=x: np.cumsum(rng.normal(size=x.size)),
            # Bulge and zone under small bumps: most points are near the hull.
            "bowed": lambda x=x: 80.0 * x * (1.0 - x) + rng.normal(0.0, 0.02, x.size),
            "level": lambda x=x: np.zeros(x.size),
            "steps": lambda x=x: np.round(rng.random(x.size), 1),
            "gaps": lambda x=x: np.where(rng.random(x.size) < 0.4, -np.inf, rng.random(x.size)),
        }[kind]()
        y[[0, -1]] = 0.0
        hull: list[int] = []
        for i in np.flatnonzero(np.isfinite(y)).tolist():
            while len(hull) > 1 and (y[i] - y[hull[-2]]) * (x[hull[-1]] - x[hull[-2]]) >= (
                y[hull[-1]] - y[hull[-2]]
            ) * (x[i] - x[hull[-2]]):
                hull.pop()
            hull.append(i)
        found = upper_hull(x, y)
        assert np.abs(np.interp(x, x[found], y[found]) - np.interp(x, x[hull], y[hull])).max() < 1e-9


@pytest.mark.parametrize("wrong", [{"low_m": -1.0}, {"low_m": 9.0, "high_m": 4.0}, {"low_m": math.nan}])
def test_limits_that_make_no_range_are_refused(wrong: dict[str, float]) -> None:
    with pytest.raises(LinkError, match="do not make a range"):
        Limits(**wrong)


def test_a_mast_step_of_nothing_is_refused() -> None:
    with pytest.raises(LinkError, match="0 m is outside"):
        HeightSettings(step_m=0.0)
