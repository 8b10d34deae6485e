"""The queue of the sweep against the plain maximum over all samples, with the need of `links.clearance`."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fellspan.design import sweep_kernel
from fellspan.links.clearance import need_m

FREQUENCY_HZ, EARTH_M = 5.8e9, 6_371_000.0
NEAR_M, NEAR_SHARE = 10.0, 0.1


def by_queue(
    distance: np.ndarray, ground: np.ndarray, surface: np.ndarray, antenna: float, rules: list[tuple[float, float]]
) -> np.ndarray:
    wavelength = 299_792_458.0 / FREQUENCY_HZ
    roots = np.array([fraction * math.sqrt(wavelength) for _, fraction in rules])
    flats = np.array([1.0 / k / (2.0 * EARTH_M) for k, _ in rules])
    level = np.empty((1, distance.size))
    has_cover = not np.array_equal(ground, surface, equal_nan=True)
    own = NEAR_M, NEAR_M, NEAR_SHARE
    every = np.arange(distance.size)
    sweep_kernel.sweep(distance, every, ground[None], surface[None], has_cover, antenna, roots, flats, *own, level)
    return level[0]


def by_force(
    distance: np.ndarray, ground: np.ndarray, surface: np.ndarray, antenna: float, rules: list[tuple[float, float]]
) -> np.ndarray:
    """For each target the lowest far end whose straight ray is nowhere under `need`."""
    level = ground.copy()
    for j in range(1, distance.size):
        path = np.concatenate(([0.0], distance[: j + 1]))
        own = min(NEAR_M, NEAR_SHARE * path[-1]) + 1e-6
        at_end = (path <= own) | (path[-1] - path <= own)
        standing = np.where(at_end, np.concatenate(([0.0], ground[: j + 1])), np.concatenate(([0.0], surface[: j + 1])))
        share = (path / path[-1])[1:-1]
        asked = [
            need_m(standing, path, k=k, fraction=fraction, frequency_hz=FREQUENCY_HZ)[1:-1] for k, fraction in rules
        ]
        level[j] = max(float(((need - antenna * (1.0 - share)) / share).max()) for need in asked)
    return level


@pytest.mark.parametrize("covered", [False, True])
def test_fifty_random_rays_agree_to_a_nanometre(covered: bool) -> None:
    rng = np.random.default_rng(31)
    for _ in range(50):
        count = int(rng.integers(3, 900))
        distance = rng.uniform(0.5, 20.0) * np.arange(1.0, count + 1.0)
        ground = 300.0 + np.cumsum(rng.normal(0.0, rng.choice([0.1, 1.0, 5.0]), count))
        stands = np.where(rng.random(count) < 0.2, rng.uniform(0.0, 20.0, count), 0.0) if covered else 0.0
        rules = [(float(rng.choice([4 / 3, 0.6, -2.0, math.inf])), float(rng.choice([0.0, 0.6, 1.0]))) for _ in "ab"]
        ray = distance, ground, ground + stands, float(ground[0] + rng.uniform(0.0, 50.0)), rules
        # 1e-9 m: what is promised; 20 km of slopes rounded to 1e-16 leave some 1e-11
        np.testing.assert_allclose(by_queue(*ray), by_force(*ray), rtol=0.0, atol=1e-9)


heights = st.one_of(
    st.lists(st.floats(-500.0, 9000.0), min_size=2, max_size=40),
    st.lists(st.sampled_from([0.0, 100.0, 100.0, 250.0]), min_size=2, max_size=60),  # plateaus and equal steps
    st.builds(lambda n, a: [a * i for i in range(n)], st.integers(2, 60), st.floats(-20.0, 20.0)),  # one even slope
)


@settings(deadline=None, max_examples=150, derandomize=True)
@given(
    heights,
    st.floats(0.25, 200.0),
    st.floats(-500.0, 9000.0),
    st.sampled_from([4 / 3, 0.5, math.inf, -math.inf, -0.3, -4.0, 0.01]),
    st.sampled_from([0.0, 1e-9, 0.3, 0.6, 1.0, 8.0]),
    st.integers(0, 7),
)
def test_nasty_rays_agree(ground: list[float], step: float, antenna: float, k: float, part: float, cover: int) -> None:
    level = np.array(ground)
    distance = step * np.arange(1.0, level.size + 1.0)
    stands = np.where(np.arange(level.size) % 3 == 1, float(cover), 0.0)
    ray = distance, level, level + stands, antenna, [(k, part)]
    got, wanted = by_queue(*ray), by_force(*ray)
    # heights of thousands of metres beside the site become slopes of thousands: 1e-9 m, or 1e-12 of the level
    np.testing.assert_allclose(got, wanted, rtol=1e-12, atol=1e-9)


def test_nothing_is_known_beyond_a_gap() -> None:
    ground = np.array([10.0, 12.0, np.nan, 11.0, 9.0])
    level = by_queue(np.arange(1.0, 6.0), ground, ground, 20.0, [(4 / 3, 0.6)])
    assert np.isfinite(level[:3]).all()  # what stands before the gap is known
    assert np.isnan(level[3:]).all()


def test_without_machine_code_it_says_the_same() -> None:
    """The function as Python runs it: what coverage sees, and what machine code must equal to the last bit or so."""
    rng = np.random.default_rng(8)
    distance, ground = 30.0 * np.arange(1.0, 200.0), 100.0 + np.cumsum(rng.normal(0.0, 4.0, 199))
    surface = ground + np.where(rng.random(199) < 0.3, 12.0, 0.0)
    roots, flats, level = np.array([0.13, 0.0]), np.array([5.8e-8, -1e-8]), np.empty((1, 199))
    plain = getattr(sweep_kernel.sweep, "py_func", sweep_kernel.sweep)
    twice = []
    for run in (plain, sweep_kernel.sweep):
        run(distance, np.arange(199), ground[None], surface[None], True, 130.0, roots, flats, 10.0, 10.0, 0.1, level)
        twice.append(level[0].copy())
    np.testing.assert_allclose(twice[0], twice[1], rtol=0.0, atol=1e-10)
