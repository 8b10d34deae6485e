"""Knife edges and rounded tops: limits, symmetry, undefined values."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fellspan.propagation import (
    double_edge_loss_db,
    fresnel_radius_m,
    hilltop_radius_m,
    knife_edge_loss_db,
    knife_edge_loss_exact_db,
    knife_edge_nu,
    rounded_obstacle_extra_db,
    rounded_obstacle_loss_db,
    smooth_enough_m,
)

seeded = settings(derandomize=True, deadline=None)

heights = st.floats(-200, 200)
distances = st.floats(100, 1e5)


@seeded
@given(heights, distances, distances)
def test_nu_is_clearance_in_zones(above: float, a: float, b: float) -> None:
    radius = fresnel_radius_m(a, b, frequency_hz=6e9)
    nu = knife_edge_nu(above, from_a_m=a, from_b_m=b, frequency_hz=6e9)
    assert nu == pytest.approx(math.sqrt(2) * above / radius, rel=1e-12, abs=1e-15)
    assert nu == pytest.approx(knife_edge_nu(above, from_a_m=b, from_b_m=a, frequency_hz=6e9), rel=1e-12)


@seeded
@given(st.floats(-50, 50), st.floats(-50, 50))
def test_higher_edges_never_cost_less(one: float, other: float) -> None:
    low, high = sorted((one, other))
    assert 0.0 <= knife_edge_loss_db(low) <= knife_edge_loss_db(high)


def test_limits_of_the_approximation() -> None:
    assert knife_edge_loss_db(-0.78) == 0.0
    assert knife_edge_loss_db(-1e300) == 0.0
    assert knife_edge_loss_db(-math.inf) == 0.0
    assert knife_edge_loss_db(math.inf) == math.inf
    assert knife_edge_loss_db(-0.7799) == pytest.approx(0.0, abs=0.01)
    # Far in the shadow the field falls as 1/(pi nu sqrt 2): 20 log nu + 12.95 dB (asymptote of the Fresnel integrals).
    assert knife_edge_loss_db(1e3) == pytest.approx(60 + 12.95, abs=0.1)
    assert knife_edge_loss_exact_db(1e3) == pytest.approx(60 + 20 * math.log10(math.pi * math.sqrt(2)), abs=1e-3)


def test_arrays_equal_scalars() -> None:
    nu = np.linspace(-3, 8, 23)
    for function in (knife_edge_loss_db, knife_edge_loss_exact_db):
        one_by_one = [function(float(value)) for value in nu]
        assert all(type(value) is float for value in one_by_one)
        np.testing.assert_array_equal(function(nu.reshape(1, -1)), [one_by_one])


def test_nan_goes_through() -> None:
    nan = math.nan
    stretches = {"a_to_first_m": 1e3, "first_to_second_m": 1e3, "second_to_b_m": 1e3, "frequency_hz": 1e9}
    values = [
        knife_edge_loss_db(nan),
        knife_edge_loss_exact_db(nan),
        knife_edge_nu(1.0, from_a_m=0.0, from_b_m=1.0, frequency_hz=1e9),
        knife_edge_nu(nan, from_a_m=1.0, from_b_m=1.0, frequency_hz=1e9),
        double_edge_loss_db(nan, 1.0, **stretches),
        double_edge_loss_db(1.0, 1.0, **{**stretches, "first_to_second_m": 0.0}),
        rounded_obstacle_extra_db(nan, 1.0),
        rounded_obstacle_extra_db(-1.0, 1.0),
        rounded_obstacle_loss_db(1.0, from_a_m=1e3, from_b_m=1e3, radius_m=-1.0, frequency_hz=1e9),
        hilltop_radius_m([1.0, 2.0], [0.1, nan]),
        hilltop_radius_m([0.0, 0.0], [0.0, -1.0]),
        smooth_enough_m(-1.0, frequency_hz=1e9),
    ]
    assert [value for value in values if not math.isnan(value)] == []


@seeded
@given(heights, heights, distances, distances, distances)
def test_two_edges_are_the_same_from_both_ends(one: float, two: float, a: float, b: float, c: float) -> None:
    there = double_edge_loss_db(one, two, a_to_first_m=a, first_to_second_m=b, second_to_b_m=c, frequency_hz=2e9)
    back = double_edge_loss_db(two, one, a_to_first_m=c, first_to_second_m=b, second_to_b_m=a, frequency_hz=2e9)
    assert there == pytest.approx(back, abs=1e-9)


def test_a_rounded_top_costs_more_than_an_edge_and_tends_to_it() -> None:
    radii = np.array([0.0, 1e-3, 10.0, 100.0, 1000.0])
    loss = np.asarray(rounded_obstacle_loss_db(20.0, from_a_m=5e3, from_b_m=10e3, radius_m=radii, frequency_hz=6e9))
    edge = knife_edge_loss_db(knife_edge_nu(20.0, from_a_m=5e3, from_b_m=10e3, frequency_hz=6e9))
    assert loss[0] == edge
    assert loss[1] == pytest.approx(edge, abs=0.05)
    assert (np.diff(loss) > 0).all()


def test_hilltop_radius_of_a_circle() -> None:
    # The cap of a circle of 500 m radius; the parabola departs from it by y/(2R).
    x = np.array([-30.0, -20.0, -10.0, 0.0, 10.0, 20.0, 30.0])
    y = 500.0 - np.sqrt(500.0**2 - x**2)
    assert hilltop_radius_m(x, y) == pytest.approx(500.0, rel=1e-3)
    assert hilltop_radius_m(x, 2 * y) == pytest.approx(250.0, rel=1e-3)
    assert np.shape(hilltop_radius_m(x, np.stack([y, 2 * y]))) == (2,)


def test_smooth_enough() -> None:
    # Equation (5) of P.526-16 by hand: R 1000 m, wavelength 0.05 m: 0.04 (1000 * 0.0025)^(1/3) = 0.0543 m.
    assert smooth_enough_m(1000.0, frequency_hz=299_792_458 / 0.05) == pytest.approx(0.0543, abs=5e-5)
