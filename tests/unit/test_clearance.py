"""The one quantity, and what follows from it: extra heights, probability, stretches."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from fellspan.errors import LinkError
from fellspan.links import clearance
from fellspan.links.criteria import Criterion, is_extended


def test_batch_of_paths_equals_a_loop_over_them() -> None:
    rng = np.random.default_rng(7)
    distance = np.linspace(0.0, 1.0, 41) * np.array([[2e3], [9e3], [40e3]])
    surface = rng.uniform(0.0, 80.0, distance.shape)
    k, fraction, frequency = np.array([4 / 3, 0.6, math.inf]), np.array([1.0, 0.3, 0.0]), np.array([6e9, 11e9, 2e9])
    batch = clearance.need_m(surface, distance, k=k, fraction=fraction, frequency_hz=frequency)
    for row in range(3):
        alone = clearance.need_m(
            surface[row], distance[row], k=k[row], fraction=fraction[row], frequency_hz=frequency[row]
        )
        np.testing.assert_array_equal(batch[row], alone)


def test_one_path_with_several_criteria_has_a_row_for_each() -> None:
    levels = clearance.path_levels(
        np.linspace(0.0, 20e3, 101),
        np.zeros(101),
        a_amsl_m=30.0,
        b_amsl_m=50.0,
        k=[4 / 3, math.inf, -2.0],
        fraction=[1.0, 0.6, 0.0],
        frequency_hz=6e9,
    )
    assert levels.need_m.shape == (3, 101)
    assert levels.available_m[50] == pytest.approx(40.0)
    assert levels.bulge_m[0, 50] == pytest.approx(10.0 * 10.0 / (12.742 * 4 / 3), rel=1e-9)  # km, P.526-16 form
    assert levels.bulge_m[1].max() == 0.0
    assert levels.bulge_m[2].min() < 0.0
    assert not levels.need_m.flags.writeable


@given(
    st.lists(st.floats(-50.0, 50.0), min_size=5, max_size=30),
    st.floats(500.0, 60e3),
)
def test_extra_height_leaves_nothing_missing_and_nothing_over(missing: list[float], length: float) -> None:
    distance = np.linspace(0.0, length, len(missing))
    shortfall = np.array([0.0, *missing[1:-1], 0.0])
    at_a, at_b, both = (float(value) for value in clearance.extra_heights_m(shortfall, distance))
    share = distance / length
    for left in (shortfall - at_a * (1 - share), shortfall - at_b * share, shortfall - both):
        if shortfall.max() > clearance.TOLERANCE_M:
            assert left.max() == pytest.approx(0.0, abs=1e-9)
        else:
            np.testing.assert_array_equal(left, shortfall)


def test_what_stands_at_one_end_cannot_be_cleared_from_the_other() -> None:
    at_a, at_b, both = clearance.extra_heights_m(np.array([3.0, -1.0, -1.0]), np.array([0.0, 50.0, 100.0]))
    assert float(at_a) == 3.0
    assert float(at_b) == math.inf
    assert float(both) == 3.0


@pytest.mark.parametrize(
    ("margin", "sigma", "expected"),
    [
        # Phi(1) and Phi(-2) from a table of the normal distribution (from memory)
        ([9.0, 2.0, 9.0], [2.0, 2.0, 2.0], 0.841345),
        ([9.0, -4.0, 9.0], [2.0, 2.0, 2.0], 0.022750),
        ([9.0, 2.0, 9.0], [9.0, 1.0, 9.0], 0.841345),  # the worst ratio counts, not the least margin
        ([9.0, 0.0, 9.0], [1.0, 1.0, 1.0], 0.5),
        ([9.0, 0.1, 9.0], [0.0, 0.0, 0.0], 1.0),  # no error: a step
        ([9.0, -0.1, 9.0], [0.0, 0.0, 0.0], 0.0),
        ([9.0, 0.0, 9.0], [0.0, 0.0, 0.0], 1.0),
    ],
)
def test_probability_is_that_of_the_worst_sample(margin: list[float], sigma: list[float], expected: float) -> None:
    assert float(clearance.probability_met(margin, sigma)) == pytest.approx(expected, abs=1e-6)


def test_probability_of_a_batch_keeps_its_shape() -> None:
    batch = clearance.probability_met(np.ones((2, 3, 5)), np.ones(5))
    assert batch.shape == (2, 3)


def test_stretches_end_where_the_shortfall_passes_zero() -> None:
    distance = np.array([0.0, 10.0, 20.0, 30.0, 40.0, 50.0])
    found = clearance.stretches(np.array([-1.0, 1.0, 3.0, -3.0, -1.0, 4.0]), distance)
    assert found == [(1, 2, 5.0, 25.0), (5, 5, 42.0, 50.0)]


def test_no_stretch_where_nothing_is_missing() -> None:
    assert clearance.stretches(np.array([-1.0, 0.0, -1.0]), np.array([0.0, 1.0, 2.0])) == []


def test_normalised_clearance_is_infinite_where_the_zone_has_no_width() -> None:
    np.testing.assert_array_equal(
        clearance.normalised_clearance([5.0, -4.0, 5.0], [0.0, 2.0, 0.0]), [np.inf, -2.0, np.inf]
    )


def _clearance_with_ridges(*ridges: tuple[float, float]) -> tuple[np.ndarray, np.ndarray]:
    distance = np.linspace(0.0, 10e3, 1001)
    normalised = np.full(1001, 2.0)
    for from_m, to_m in ridges:
        normalised[(distance >= from_m) & (distance <= to_m)] = 0.4
    normalised[[0, -1]] = np.inf
    return distance, normalised


def test_one_short_ridge_is_isolated() -> None:
    assert not is_extended(*_clearance_with_ridges((4000.0, 4500.0)))


def test_two_ridges_are_extended() -> None:
    assert is_extended(*_clearance_with_ridges((4000.0, 4100.0), (6000.0, 6100.0)))
    assert is_extended(*_clearance_with_ridges((4000.0, 4100.0), (4300.0, 4400.0)))  # near each other, but two


def test_a_long_ridge_is_extended_from_a_tenth_of_the_path() -> None:
    assert not is_extended(*_clearance_with_ridges((4000.0, 4970.0)))
    assert is_extended(*_clearance_with_ridges((4000.0, 4990.0)))


def test_in_doubt_it_is_extended() -> None:
    assert is_extended([0.0, 1.0], [np.inf, np.inf])


def test_smooth_earth_is_extended() -> None:
    distance = np.linspace(0.0, 40e3, 2001)
    clear = 60.0 - clearance.bulge_m(distance, k=0.75)
    radius = clearance.zone_radius_m(distance, frequency_hz=6e9)
    assert is_extended(distance, clearance.normalised_clearance(clear, radius))


@pytest.mark.parametrize(
    ("field", "value"),
    [
        ("k", 0.0),
        ("k", math.nan),
        ("fraction", math.nan),
        ("fraction", -0.1),
        ("fraction", math.inf),
    ],
)
def test_criteria_that_mean_nothing_are_refused(field: str, value: float) -> None:
    with pytest.raises(LinkError, match=rf"'house rule'.*{field} {value:g}"):
        Criterion(**({"name": "house rule", "k": 1.0, "fraction": 0.6, "source": "made"} | {field: value}))  # type: ignore[arg-type]


def test_criteria_for_flat_and_hollow_earth_are_legal() -> None:
    for k in (math.inf, -math.inf, -3.0, 0.5):
        assert Criterion(name="rule", k=k, fraction=0.0, source="made").k == k
