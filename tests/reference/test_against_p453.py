"""Refractivity and k against Rec. ITU-R P.453-13 (as in the reference library itur 0.4.0) and P.452-18, equation (5)."""

import math

import pytest

from fellspan.propagation import (
    effective_earth_radius_m,
    k_from_gradient,
    refractivity,
    saturation_vapour_pressure_hpa,
    vapour_pressure_hpa,
)


def test_refractivity_of_the_reference_atmosphere() -> None:
    # Computed with itur 0.4.0 (n = 1.00031772) and by hand: dry 270.187, wet 47.534, N 317.720; rounded to 0.001.
    n = refractivity(1003.277, temperature_k=288.15, vapour_pressure_hpa=9.9729)
    assert n == pytest.approx(317.720, abs=1e-3)
    dry = refractivity(1003.277, temperature_k=288.15, vapour_pressure_hpa=0.0)
    assert dry == pytest.approx(270.187, abs=1e-3)


def test_vapour_pressure() -> None:
    # By hand: 7.5 g/m3 at 288.15 K.
    assert vapour_pressure_hpa(7.5, temperature_k=288.15) == pytest.approx(9.9729, abs=5e-5)


@pytest.mark.parametrize(("celsius", "hpa"), [(0, 6.13632), (15, 17.12159), (30, 42.64231)])
def test_saturation(celsius: float, hpa: float) -> None:
    # Computed with itur 0.4.0 at 1013.25 hPa; rounded to 5 decimals.
    assert saturation_vapour_pressure_hpa(celsius) == pytest.approx(hpa, abs=6e-6)


@pytest.mark.parametrize(
    ("gradient", "k"),
    [(-300, -1.098), (-157, math.inf), (-100, 2.754), (0, 1.0), (80, 0.662), (100, 0.611), (157, 0.5), (254, 0.382)],
)
def test_k_from_gradient(gradient: float, k: float) -> None:
    # By hand from P.452-18, equation (5), rounded to 3 decimals.
    assert k_from_gradient(gradient) == pytest.approx(k, abs=6e-4)


@pytest.mark.parametrize(("gradient", "k"), [(-40, 1.3419), (-39, 1.3305)])
def test_k_in_normal_air(gradient: float, k: float) -> None:
    assert k_from_gradient(gradient) == pytest.approx(k, abs=6e-5)


def test_radius_at_four_thirds() -> None:
    # 4/3 of 6371 km, by hand; not the rounded 8500 km.
    assert effective_earth_radius_m(4 / 3) == pytest.approx(8_494_667, abs=0.5)
