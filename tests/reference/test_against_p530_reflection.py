"""Ground reflection against hand calculations from Rec. ITU-R P.530-19, sections 6.1.2 and 6.2.1, as printed.

The printed forms round c to 3e8 m/s, take the Earth as 6375 km in (121) and twice 6370 km in the heights above the plane; the
rows below were worked out with those constants, in double precision, and are tried with them here.
"""

import dataclasses

import numpy as np
import pytest

from fellspan.propagation import (
    amplitude_from_height_scan,
    complex_permittivity,
    frequency_separation_hz,
    ground_permittivity,
    partial_surface_factor,
    path_difference_wavelengths,
    pitch_of_minima_m,
    reflected_ray_angles_rad,
    reflecting_zone_length_m,
    reflecting_zone_width_m,
    reflection_coefficient,
    roughness_factor,
    smooth_up_to_m,
    specular_geometry,
    water_permittivity,
)

PRINTED_SIX_GHZ = 6e9 * 299_792_458.0 / 3e8
"""The frequency whose exact wavelength is the printed 0.3/6 m."""

HAND = [
    # h1, h2, km, k, d1 km, phi mrad, D, h1', h2', path difference in wavelengths at 6 GHz (hand calculation)
    (100.0, 50.0, 30.0, 4.0 / 3.0, 19.3031, 4.04503, 0.84505, 78.0645, 43.2639, 4.50317),
    (60.0, 60.0, 40.0, 4.0 / 3.0, 20.0, 1.82353, 0.66077, 36.4521, 36.4521, 1.32876),
    (100.0, 50.0, 30.0, 1e9, 20.0, 5.0, 1.0, 100.0, 50.0, 6.66667),
    (100.0, 50.0, 30.0, 0.67382, 18.7674, 3.14389, 0.70003, 58.9705, 35.3024, 2.77574),
]


@pytest.mark.parametrize(("h1", "h2", "km", "k", "d1", "phi", "divergence", "a", "b", "tau"), HAND)
def test_point_angle_divergence_and_path_difference(
    h1: float,
    h2: float,
    km: float,
    k: float,
    d1: float,
    phi: float,
    divergence: float,
    a: float,
    b: float,
    tau: float,
) -> None:
    found = specular_geometry(km * 1e3, height_a_m=h1, height_b_m=h2, k=k, earth_radius_m=6375e3)
    assert found.from_a_m / 1e3 == pytest.approx(d1, abs=5.1e-5)
    assert found.grazing_rad * 1e3 == pytest.approx(phi, abs=5.1e-6)
    assert found.divergence == pytest.approx(divergence, abs=5.1e-6)
    tangent_a = h1 - float(found.from_a_m) ** 2 / (2.0 * 6370e3 * k)
    tangent_b = h2 - float(found.from_b_m) ** 2 / (2.0 * 6370e3 * k)
    assert tangent_a == pytest.approx(a, abs=5.1e-5)
    assert tangent_b == pytest.approx(b, abs=5.1e-5)
    wavelengths = path_difference_wavelengths(
        km * 1e3, tangent_a_m=tangent_a, tangent_b_m=tangent_b, frequency_hz=PRINTED_SIX_GHZ
    )
    assert wavelengths == pytest.approx(tau, abs=5.1e-6)


def test_our_earth_radius_moves_the_first_row_as_worked_out_by_hand() -> None:
    found = specular_geometry(30e3, height_a_m=100.0, height_b_m=50.0, k=4.0 / 3.0)
    assert found.divergence == pytest.approx(0.84495, abs=5.1e-6)
    assert found.grazing_rad * 1e3 == pytest.approx(4.04444, abs=1e-5)


@pytest.mark.parametrize(
    ("surface", "degrees", "horizontal", "vertical"),
    [
        ("sea", (1.0, 5.0, 30.0), (0.99588, 0.97959, 0.88846), (0.74240, 0.15669, 0.62108)),
        ("wet ground", (1.0, 5.0, 15.0), (0.99097, 0.95570, 0.874), (0.86933, 0.48364, 0.0749)),
        ("medium dry ground", (1.0, 5.0, 15.0), (0.98988, 0.95049, 0.860), (0.87868, 0.51262, 0.0416)),
    ],
)
def test_coefficients_at_6_ghz(
    surface: str, degrees: tuple[float, ...], horizontal: tuple[float, ...], vertical: tuple[float, ...]
) -> None:
    if surface == "sea":
        eta = complex_permittivity(70.0, conductivity_s_m=5.0, frequency_hz=6e9)
    else:
        eta = ground_permittivity(surface, frequency_hz=6e9)  # type: ignore[arg-type]
    angle = np.radians(degrees)
    for polarization, hand in (("horizontal", horizontal), ("vertical", vertical)):
        found = np.abs(reflection_coefficient(angle, permittivity=eta, polarization=polarization))
        # the last column of the ground rows is printed to three or four decimals
        assert found == pytest.approx(hand, abs=5.1e-4 if hand[2] in (0.874, 0.860) else 5.1e-5)
        assert found[:2] == pytest.approx(hand[:2], abs=5.1e-6)


def test_water_relaxations() -> None:
    # pure water at 20 degrees Celsius (hand calculation)
    hand = (79.815 - 4.394j, 78.606 - 10.375j, 72.245 - 22.898j, 60.789 - 32.721j, 10.879 - 19.724j)
    found = water_permittivity(np.array([1.0, 2.4, 5.8, 10.0, 60.0]) * 1e9)
    assert np.abs(found - np.array(hand)).max() < 8e-4


def test_zone_on_the_ground_roughness_and_smoothness() -> None:
    length = reflecting_zone_length_m(30e3, height_a_m=100.0, height_b_m=50.0, frequency_hz=PRINTED_SIX_GHZ)
    assert length == pytest.approx(7098.6, abs=0.051)
    assert reflecting_zone_width_m(30e3, frequency_hz=PRINTED_SIX_GHZ) == pytest.approx(38.73, abs=0.0051)
    assert roughness_factor([0.5, 1.2575, 2.0, 4.82]) == pytest.approx([0.89902, 0.51369, 0.31193, 0.12], abs=5.1e-6)
    # Rayleigh's criterion, 6 GHz, 5 mrad (hand calculation with the exact speed of light)
    assert smooth_up_to_m(5e-3, frequency_hz=6e9) == pytest.approx(1.249, abs=5.1e-4)


def test_partial_surface_as_printed() -> None:
    # sqrt(f (h1 + h2)^4 dx^2 1e-2 / (3 h1 h2 d^3)), GHz, m, km (hand calculation); more than the zone counts as all of it
    hand = np.sqrt(6.0 * 150.0**4 * 1.5**2 * 1e-2 / (3.0 * 5000.0 * 30.0**3))
    given = {"distance_m": 30e3, "height_a_m": 100.0, "height_b_m": 50.0, "frequency_hz": PRINTED_SIX_GHZ}
    assert partial_surface_factor(1500.0, **given) == pytest.approx(hand, rel=1e-12)
    assert partial_surface_factor(9000.0, **given) == 1.0


def test_amplitude_from_a_height_scan() -> None:
    assert amplitude_from_height_scan([3.0, 6.0, 10.0, 20.0]) == pytest.approx(
        [0.1710, 0.3323, 0.5195, 0.8182], abs=5.1e-5
    )
    assert amplitude_from_height_scan(0.0) == 0.0


def test_angles_between_the_rays() -> None:
    found = specular_geometry(30e3, height_a_m=100.0, height_b_m=50.0, k=4.0 / 3.0, earth_radius_m=6375e3)
    drop = [float(along) ** 2 / (2.0 * 6370e3 * 4.0 / 3.0) for along in (found.from_a_m, found.from_b_m)]
    found = dataclasses.replace(found, tangent_a_m=100.0 - drop[0], tangent_b_m=50.0 - drop[1])
    at_a, at_b = np.degrees(reflected_ray_angles_rad(found, height_a_m=100.0, height_b_m=50.0))
    assert at_a == pytest.approx(0.16525, abs=5.1e-6)
    assert at_b == pytest.approx(0.29820, abs=5.1e-6)


def test_spacing_of_antennas_and_frequencies() -> None:
    given = {"distance_m": 30e3, "frequency_hz": PRINTED_SIX_GHZ}
    assert pitch_of_minima_m(other_tangent_m=43.2639, **given) == pytest.approx(17.335, abs=5.1e-4)
    assert pitch_of_minima_m(other_tangent_m=78.0645, **given) == pytest.approx(9.607, abs=5.1e-4)
    separation = frequency_separation_hz(30e3, tangent_a_m=78.0645, tangent_b_m=43.2639)
    assert separation * 3e8 / 299_792_458.0 == pytest.approx(666.2e6, abs=0.051e6)
