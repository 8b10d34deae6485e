"""Dipole, collinear omni, patch and apertures against textbook values.

Values marked 'numerical' were obtained by integrating the textbook formulas independently of this code; the rest are the
figures every antenna textbook prints. Tolerances: half a unit of the last printed place, or as said.
"""

import math

import numpy as np
import pytest
from scipy.integrate import quad

from fellspan.antennas.dishes import aperture_field, dish
from fellspan.antennas.facts import cut, cut_facts, facts_of
from fellspan.antennas.patches import patch, patch_size
from fellspan.antennas.sphere import directivity_dbi
from fellspan.antennas.wires import collinear, dipole


def test_half_wave_dipole() -> None:
    # Textbook: directivity 1.6409 = 2.151 dBi, 78.08 degrees between half-power points in the E plane.
    antenna = dipole(frequency_hz=2.4e9)
    facts = facts_of(antenna)
    assert antenna.peak_gain_dbi == pytest.approx(2.151, abs=0.002)
    assert facts.electric.half_power_deg == pytest.approx(78.08, abs=0.02)
    assert facts.magnetic.half_power_deg is None
    assert facts.front_to_back_db is None


@pytest.mark.parametrize(
    ("from_wire_deg", "relative_db"),
    [(90, 0.0), (80, -0.19), (70, -0.78), (60, -1.76), (51, -3.00), (45, -4.04), (30, -7.58)],
)
def test_half_wave_dipole_off_broadside(from_wire_deg: float, relative_db: float) -> None:
    # cos((pi/2) cos theta) / sin theta, by hand.
    antenna = dipole(frequency_hz=2.4e9)
    assert antenna.gain_dbi(123.0, 90.0 - from_wire_deg) - antenna.peak_gain_dbi == pytest.approx(
        relative_db, abs=0.006
    )


def test_half_wavelength_at_2400_mhz() -> None:
    # Common practice, no source: 12.5 cm (4.9 in) wavelength, so a dipole of half of it.
    assert dipole(frequency_hz=2.4e9).size_m == pytest.approx(0.0625, abs=0.0001)


@pytest.mark.parametrize(
    ("elements", "spacing", "gain", "width"),
    [
        (2, 0.5, 3.82, 47.8),
        (2, 0.9, 5.38, 30.0),
        (4, 0.7, 7.65, 18.2),
        (4, 0.9, 8.52, 14.3),
        (8, 0.7, 10.58, 9.08),
        (8, 0.9, 11.56, 7.08),
    ],
)
def test_collinear_omni(elements: int, spacing: float, gain: float, width: float) -> None:
    # Numerical.
    antenna = collinear(frequency_hz=5.8e9, elements=elements, spacing_wavelengths=spacing)
    assert antenna.peak_gain_dbi == pytest.approx(gain, abs=0.01)
    assert facts_of(antenna).elevation.half_power_deg == pytest.approx(width, abs=0.06)


@pytest.mark.parametrize(
    ("ghz", "permittivity", "height_mm", "width", "length", "effective", "fringe", "gain", "e_width", "h_width"),
    [
        (10.0, 2.2, 1.588, 11.850, 9.053, 1.9715, 0.8110, 7.365, 88.9, 77.0),
        (5.8, 2.2, 0.787, 20.432, 17.022, 2.0962, 0.4142, 7.235, 92.7, 77.0),
        (2.4, 4.4, 1.6, 38.010, 29.422, 4.0857, 0.7388, 6.085, None, 81.9),
        (2.4, 1.0001, 5.0, 62.455, 55.527, 1.0001, 3.4634, 9.347, 59.9, 70.8),
    ],
)
def test_patch(
    ghz: float,
    permittivity: float,
    height_mm: float,
    width: float,
    length: float,
    effective: float,
    fringe: float,
    gain: float,
    e_width: float | None,
    h_width: float,
) -> None:
    # Transmission-line model and two-slot pattern of the textbooks; numerical. First row: a usual textbook example.
    size = patch_size(frequency_hz=ghz * 1e9, permittivity=permittivity, height_m=height_mm / 1e3)
    assert size.width_m * 1e3 == pytest.approx(width, abs=0.001)
    assert size.length_m * 1e3 == pytest.approx(length, abs=0.001)
    assert size.effective_permittivity == pytest.approx(effective, abs=1e-4)
    assert size.fringe_m * 1e3 == pytest.approx(fringe, abs=1e-4)
    antenna = patch(frequency_hz=ghz * 1e9, permittivity=permittivity, height_m=height_mm / 1e3, efficiency=1.0)
    facts = facts_of(antenna)
    assert antenna.peak_gain_dbi == pytest.approx(gain, abs=0.01)
    assert facts.magnetic.half_power_deg == pytest.approx(h_width, abs=0.06)
    if e_width is None:  # 2.9 dB down where the ground plane ends it
        assert facts.electric.half_power_deg is None
    else:
        assert facts.electric.half_power_deg == pytest.approx(e_width, abs=0.06)


# Power n, edge dB (None: no pedestal), efficiency, width factor, first side lobe dB; numerical, textbook where known.
APERTURES = [
    (1, 0.0, 1.0, 58.96, -17.57),
    (1, 10.0, 0.9175, 65.16, -22.3),
    (2, 10.0, 0.8769, 66.83, -27.05),
    (2, 12.0, 0.8342, 68.68, -29.5),
    (1, None, 0.75, 72.75, -24.6),
    (2, None, 0.5556, 84.4, -30.6),
]


@pytest.mark.parametrize(("power", "edge", "efficiency", "factor", "lobe"), APERTURES)
def test_circular_aperture(power: int, edge: float | None, efficiency: float, factor: float, lobe: float) -> None:
    pedestal = 0.0 if edge is None else 10.0 ** (-edge / 20.0)
    size = 200.0
    theta = np.radians(np.linspace(0.0, 3.0, 60_001))
    level = 20.0 * np.log10(
        np.maximum(aperture_field(theta, size_wavelengths=size, pedestal=pedestal, power=power), 1e-9)
    )
    half = float(np.interp(10.0 * math.log10(2.0), -level[: 20 * 600], np.degrees(theta[: 20 * 600])))
    assert 2.0 * half * size == pytest.approx(factor, rel=1e-3)
    null = int(np.flatnonzero(np.diff(level) > 0.0)[0])
    assert float(np.max(level[null:])) == pytest.approx(lobe, abs=0.06)
    if edge == 0.0:
        assert math.degrees(theta[null]) * size == pytest.approx(
            69.88, abs=0.02
        )  # 1.2197 lambda / D, from the first zero of J1

    def taper(r: float) -> float:
        return pedestal + (1.0 - pedestal) * (1.0 - r * r) ** power

    voltage = quad(lambda r: taper(r) * r, 0.0, 1.0)[0]
    watts = quad(lambda r: taper(r) ** 2 * r, 0.0, 1.0)[0]
    assert 2.0 * voltage**2 / watts == pytest.approx(efficiency, abs=1e-4)


@pytest.mark.parametrize(("power", "edge", "efficiency"), [(1, 10.0, 0.9175), (2, 10.0, 0.8769), (2, 12.0, 0.8342)])
def test_dish_directivity_is_that_of_its_taper_less_what_is_scattered(
    power: int, edge: float, efficiency: float
) -> None:
    # 12 % scattered of what is radiated; the lobe itself holds taper efficiency times (pi D / lambda)^2.
    antenna = dish(frequency_hz=11e9, diameter_m=1.2, edge_taper_db=edge, taper_power=power, cross_polar_db=60.0)
    size = 1.2 * 11e9 / 299_792_458.0
    closed = 10.0 * math.log10(efficiency * (math.pi * size) ** 2 * 0.88)
    assert directivity_dbi(antenna) == pytest.approx(closed, abs=0.05)


@pytest.mark.parametrize(
    ("diameter", "ghz", "efficiency", "gain"),
    [(0.6, 5.8, 0.55, 28.64), (1.2, 11.0, 0.60, 40.60), (0.3, 60.0, 0.50, 42.50), (0.6, 23.0, 0.60, 40.99)],
)
def test_dish_gain(diameter: float, ghz: float, efficiency: float, gain: float) -> None:
    # eta (pi D / lambda)^2, by hand.
    antenna = dish(frequency_hz=ghz * 1e9, diameter_m=diameter, aperture_efficiency=efficiency)
    assert antenna.peak_gain_dbi == pytest.approx(gain, abs=0.006)
    assert antenna.gain_dbi(0.0, 0.0) == pytest.approx(gain, abs=0.006)


@pytest.mark.parametrize("diameter", [0.3, 0.6, 1.2, 1.8])
@pytest.mark.parametrize("ghz", [5.8, 11.0, 23.0, 38.0, 80.0])
def test_dish_beamwidth_over_sizes_and_bands(diameter: float, ghz: float) -> None:
    # 65.16 lambda / D for this taper (numerical); the rule of thumb 70 lambda / D is for real dishes, within 10 %.
    facts = facts_of(dish(frequency_hz=ghz * 1e9, diameter_m=diameter))
    waves = diameter * ghz / 0.299792458
    for plane in (facts.azimuth, facts.elevation):
        assert plane.half_power_deg == pytest.approx(65.16 / waves, rel=0.01)
        assert plane.half_power_deg == pytest.approx(70.0 / waves, rel=0.10)


@pytest.mark.parametrize(
    ("diameter", "ghz", "distance"), [(0.6, 5.8, 13.93), (1.2, 11.0, 105.7), (0.3, 60.0, 36.0), (0.6, 23.0, 55.2)]
)
def test_far_field_distance(diameter: float, ghz: float, distance: float) -> None:
    # 2 D^2 / lambda, by hand.
    assert dish(frequency_hz=ghz * 1e9, diameter_m=diameter).far_field_m == pytest.approx(distance, rel=2e-3)


def test_uniform_line_has_its_first_side_lobe_at_13_db() -> None:
    # Textbook: a long uniform line, -13.26 dB; 64 elements in a line come within 0.05 dB.
    facts = cut_facts(
        cut(collinear(frequency_hz=5.8e9, elements=64, spacing_wavelengths=0.5), "vertical", step_deg=0.01)
    )
    assert facts.side_lobe_db == pytest.approx(-13.26, abs=0.05)
