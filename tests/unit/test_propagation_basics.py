"""Free space, refraction, Fresnel zones and bulge: shapes, limits, symmetry, undefined values."""

import math
import subprocess
import sys

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fellspan.propagation import (
    average_diffraction_loss_db,
    earth_bulge_m,
    effective_earth_radius_m,
    free_space_loss_db,
    fresnel_radius_m,
    gradient_from_k_n_per_km,
    inverse_k,
    inverse_k_from_gradient,
    k_exceeded_99_9,
    k_from_gradient,
    refractivity,
    saturation_vapour_pressure_hpa,
    wavelength_m,
)
from fellspan.propagation.constants import SPEED_OF_LIGHT_M_S

seeded = settings(derandomize=True, deadline=None)

distances = st.floats(1.0, 5e5)
frequencies = st.floats(1e8, 1e11)


def test_importing_the_room_loads_no_scipy() -> None:
    code = "import sys, fellspan.propagation; sys.exit('scipy' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_scalars_make_python_floats_and_arrays_broadcast() -> None:
    for value in (
        wavelength_m(1e9),
        free_space_loss_db(1e3, frequency_hz=1e9),
        fresnel_radius_m(1, 2, frequency_hz=1e9),
        earth_bulge_m(1, 2, k=1),
        k_exceeded_99_9(3e4),
        k_from_gradient(-40),
        inverse_k(2),
        effective_earth_radius_m(2),
        refractivity(1000, temperature_k=290, vapour_pressure_hpa=10),
        saturation_vapour_pressure_hpa(np.float64(15)),
        average_diffraction_loss_db(np.array(0.0)),
    ):
        assert type(value) is float
    radius = fresnel_radius_m(np.ones((3, 1)), np.ones(4), frequency_hz=1e9, zone=[[[1]], [[2]]])
    assert np.shape(radius) == (2, 3, 4)


def test_inputs_are_left_alone() -> None:
    distance = np.array([-1.0, 0.0, 2.0])
    kept = distance.copy()
    distance.flags.writeable = False
    free_space_loss_db(distance, frequency_hz=1e9)
    fresnel_radius_m(distance, distance, frequency_hz=1e9)
    earth_bulge_m(distance, distance, k=distance)
    k_exceeded_99_9(distance)
    np.testing.assert_array_equal(distance, kept)


@seeded
@given(distances, frequencies)
def test_frequency_counts_only_through_the_wavelength(distance_m: float, frequency_hz: float) -> None:
    # Scaling the frequency by c / 3e8 is the same as taking c = 3e8 m/s.
    scaled = frequency_hz * SPEED_OF_LIGHT_M_S / 3e8
    assert wavelength_m(scaled) == pytest.approx(3e8 / frequency_hz, rel=1e-12)
    expected = 20 * math.log10(4 * math.pi * distance_m * frequency_hz / 3e8)
    assert free_space_loss_db(distance_m, frequency_hz=scaled) == pytest.approx(expected, abs=1e-9)


def test_undefined_is_nan() -> None:
    nan = math.nan
    undefined = [
        free_space_loss_db(0.0, frequency_hz=1e9),
        free_space_loss_db(-1.0, frequency_hz=1e9),
        free_space_loss_db(1.0, frequency_hz=0.0),
        free_space_loss_db(nan, frequency_hz=1e9),
        fresnel_radius_m(-1.0, 5.0, frequency_hz=1e9),
        fresnel_radius_m(-5.0, 1.0, frequency_hz=1e9),
        fresnel_radius_m(0.0, 0.0, frequency_hz=1e9),
        fresnel_radius_m(1.0, nan, frequency_hz=1e9),
        fresnel_radius_m(1.0, 1.0, frequency_hz=1e9, zone=0),
        earth_bulge_m(1.0, 1.0, k=0.0),
        earth_bulge_m(1.0, 1.0, k=nan),
        inverse_k(0.0),
        effective_earth_radius_m(0.0),
        gradient_from_k_n_per_km(0.0),
        k_exceeded_99_9(-1.0),
        k_exceeded_99_9(nan),
        refractivity(1000.0, temperature_k=0.0, vapour_pressure_hpa=1.0),
        average_diffraction_loss_db(nan),
    ]
    assert [value for value in undefined if not math.isnan(value)] == []


@seeded
@given(distances, distances, frequencies)
def test_fresnel_zone_is_the_same_from_both_ends(a: float, b: float, frequency_hz: float) -> None:
    radius = fresnel_radius_m(a, b, frequency_hz=frequency_hz)
    assert radius == pytest.approx(fresnel_radius_m(b, a, frequency_hz=frequency_hz), rel=1e-12)
    fourth = fresnel_radius_m(a, b, frequency_hz=frequency_hz, zone=4)
    assert fourth == pytest.approx(2 * radius, rel=1e-12)


def test_fresnel_zone_closes_at_the_ends() -> None:
    along = np.linspace(0.0, 10e3, 11)
    radius = np.asarray(fresnel_radius_m(along, 10e3 - along, frequency_hz=5.8e9))
    assert radius[0] == radius[-1] == 0.0
    assert radius.argmax() == 5


def test_fresnel_zone_is_half_a_wavelength_longer() -> None:
    # The definition of the first zone: the way over its rim is half a wavelength longer (for radii small against distances).
    radius = fresnel_radius_m(3e3, 7e3, frequency_hz=10e9)
    assert isinstance(radius, float)
    detour = math.hypot(3e3, radius) - 3e3 + math.hypot(7e3, radius) - 7e3
    assert detour == pytest.approx(SPEED_OF_LIGHT_M_S / 10e9 / 2, rel=1e-5)


def test_bulge_for_every_sign_of_k() -> None:
    # 20 km at k = 1: 10 * 10 / 12.742 m; the same hollow at k = -1, none at infinite k.
    assert earth_bulge_m(10e3, 10e3, k=1.0) == pytest.approx(100 / 12.742, abs=1e-9)
    assert earth_bulge_m(10e3, 10e3, k=-1.0) == pytest.approx(-100 / 12.742, abs=1e-9)
    assert earth_bulge_m(10e3, 10e3, k=math.inf) == 0.0
    assert earth_bulge_m(10e3, 10e3, k=1e12) == pytest.approx(0.0, abs=1e-9)
    assert earth_bulge_m(10e3, 10e3, k=-1e12) == pytest.approx(0.0, abs=1e-9)


def test_bulge_is_the_parabola_near_the_circle() -> None:
    # Sagitta of the true circle at mid-path of 50 km: the parabola departs by less than a centimetre.
    circle = 6371e3 - math.sqrt(6371e3**2 - 25e3**2)
    assert earth_bulge_m(25e3, 25e3, k=1.0) == pytest.approx(circle, abs=0.01)


@seeded
@given(st.floats(-1000, 1000).filter(lambda g: abs(g + 157) > 1e-3))
def test_gradient_and_k_are_inverse(gradient: float) -> None:
    k = k_from_gradient(gradient)
    assert gradient_from_k_n_per_km(k) == pytest.approx(gradient, abs=1e-9)
    assert inverse_k(k) == pytest.approx(inverse_k_from_gradient(gradient), abs=1e-12)


def test_gradient_through_the_pole_of_k() -> None:
    assert k_from_gradient(-157.0) == math.inf
    assert inverse_k_from_gradient(-157.0) == 0.0
    assert gradient_from_k_n_per_km(math.inf) == -157.0
    assert effective_earth_radius_m(math.inf) == math.inf
    assert effective_earth_radius_m(-2.0) == pytest.approx(-12_742_000.0)


@seeded
@given(st.floats(0, 1e6), st.floats(0, 1e6))
def test_k_of_the_worst_month_rises_with_length(one: float, other: float) -> None:
    low, high = sorted((one, other))
    assert k_exceeded_99_9(low) <= k_exceeded_99_9(high) < 157 / 144


def test_far_beyond_the_figure_the_formula_goes_on() -> None:
    # Equation (4) by hand at 1000 km: 157 / 146.67.
    assert k_exceeded_99_9(1e6) == pytest.approx(157 / 146.67, abs=1e-9)
