"""Yagi-Uda designs against NBS Technical Note 688 (Viezbicke, 1976), table 1, and against other moment-method programs.

Gains are published in dB over a half-wave dipole, 2.15 dB below dBi. The shortest design is printed with a director of 0.424
wavelengths in some copies and 0.442 in others: computed, the first stays 0.4 dB below the published gain, the second, which the
tool proposes, 0.4 dB above it. The independent runs: four open moment-method programs, the range of their results, at the
printed dimensions, 0.424 for the shortest.
"""

from dataclasses import replace

import numpy as np
import pytest

from fellspan.antennas.facts import facts_of
from fellspan.antennas.wire_moments import solve_wires
from fellspan.antennas.yagi import gain_change_with_modes_db, input_impedance_ohm, propose_yagi, yagi

FREQUENCY_HZ = 400e6
WAVELENGTH_M = 299_792_458.0 / FREQUENCY_HZ
BOOMS = [0.4, 0.8, 1.2, 2.2, 3.2, 4.2]
PUBLISHED_DBD = [7.1, 9.2, 10.2, 12.25, 13.4, 14.2]
INDEPENDENT_DBD = [None, (9.05, 9.08), (10.24, 10.28), (12.03, 12.06), (13.12, 13.20), (13.90, 13.94)]
WIDTHS_DEG = [None, (47, 57), (41, 47), (35, 38), (30, 32), (28, 29)]


def gain_dbd(boom: float) -> float:
    design = propose_yagi(frequency_hz=FREQUENCY_HZ, boom_m=boom * WAVELENGTH_M)
    return yagi(design, efficiency=1.0).peak_gain_dbi - 2.15


@pytest.mark.parametrize(("boom", "published"), list(zip(BOOMS, PUBLISHED_DBD, strict=True)))
def test_within_half_a_decibel_of_the_published_gain(boom: float, published: float) -> None:
    assert gain_dbd(boom) == pytest.approx(published, abs=0.5)


@pytest.mark.parametrize(("boom", "band"), list(zip(BOOMS[1:], INDEPENDENT_DBD[1:], strict=True)))
def test_within_0_3_db_of_independent_moment_methods(boom: float, band: tuple[float, float]) -> None:
    assert band[0] - 0.3 <= gain_dbd(boom) <= band[1] + 0.3


def test_the_shortest_as_most_copies_print_it_agrees_with_the_independent_runs() -> None:
    # 6.8 to 6.95 dBd by the four programs, with the director of 0.424 wavelengths.
    design = propose_yagi(frequency_hz=FREQUENCY_HZ, boom_m=0.4 * WAVELENGTH_M)
    printed = replace(design, length_m=(*design.length_m[:2], 0.424 * WAVELENGTH_M))
    assert 6.8 - 0.3 <= yagi(printed, efficiency=1.0).peak_gain_dbi - 2.15 <= 6.95 + 0.3


@pytest.mark.parametrize(("boom", "widths"), list(zip(BOOMS[1:], WIDTHS_DEG[1:], strict=True)))
def test_beamwidths_within_three_degrees(boom: float, widths: tuple[float, float]) -> None:
    facts = facts_of(yagi(propose_yagi(frequency_hz=FREQUENCY_HZ, boom_m=boom * WAVELENGTH_M)))
    assert facts.electric.half_power_deg == pytest.approx(widths[0], abs=3.0)
    assert facts.magnetic.half_power_deg == pytest.approx(widths[1], abs=3.0)


@pytest.mark.parametrize("boom", [0.4, 1.2])
def test_currents_have_converged(boom: float) -> None:
    design = propose_yagi(frequency_hz=FREQUENCY_HZ, boom_m=boom * WAVELENGTH_M)
    assert abs(gain_change_with_modes_db(design)) < 0.07


@pytest.mark.parametrize("boom", [4.2])
def test_the_longest_has_converged_too(boom: float) -> None:
    design = propose_yagi(frequency_hz=FREQUENCY_HZ, boom_m=boom * WAVELENGTH_M)
    assert abs(gain_change_with_modes_db(design)) < 0.07


@pytest.mark.parametrize(
    ("apart", "resistance", "reactance"),
    [
        (0.1, 67.33, 7.54),
        (0.2, 51.40, -19.17),
        (0.25, 40.786, -28.349),
        (0.5, -12.532, -29.929),
        (1.0, 4.012, 17.742),
    ],
)
def test_mutual_impedance_of_half_waves(apart: float, resistance: float, reactance: float) -> None:
    # Induced-EMF method, closed form with sine and cosine integrals (textbook). One mode a wire is that method exactly.
    assert mutual(apart, 0.5, 0.5) == pytest.approx(complex(resistance, reactance), abs=0.01)


def test_mutual_and_self_impedance_of_other_lengths() -> None:
    # The same method by numerical integration, by hand: 0.482 and 0.424 wavelengths, 0.2 apart; radius 0.00425.
    assert mutual(0.2, 0.482, 0.424) == pytest.approx(38.884 - 15.903j, abs=0.01)
    assert own(0.482) == pytest.approx(65.75 + 16.62j, abs=0.05)
    assert own(0.424) == pytest.approx(46.38 - 57.59j, abs=0.05)


def test_self_impedance_of_a_thin_half_wave() -> None:
    # Textbook: 73.13 + j42.54 ohm.
    solved = solve_wires(place=np.zeros(1), length=np.array([0.5]), radius=1e-4, driven=0, modes=1)
    assert solved.input_impedance_ohm == pytest.approx(73.13 + 42.54j, abs=0.35)


def own(length: float) -> complex:
    return solve_wires(
        place=np.zeros(1), length=np.array([length]), radius=0.00425, driven=0, modes=1
    ).input_impedance_ohm


def mutual(apart: float, first: float, second: float) -> complex:
    """Z21 from the currents: 0 = Z21 I1 + Z22 I2 on the wire that is not fed."""
    radius = 0.00425
    solved = solve_wires(
        place=np.array([0.0, apart]), length=np.array([first, second]), radius=radius, driven=0, modes=1
    )
    return complex(-solved.current[1, 0] / solved.current[0, 0]) * own(second)


def test_a_yagi_needs_matching_but_is_no_short() -> None:
    resistance = input_impedance_ohm(propose_yagi(frequency_hz=FREQUENCY_HZ, boom_m=0.8 * WAVELENGTH_M)).real
    assert 5.0 < resistance < 150.0
