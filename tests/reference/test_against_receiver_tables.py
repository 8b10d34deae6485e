"""Noise, error ratios and sensitivities against tables worked by hand, and the tables of IEEE 802.11."""

import math

import pytest

from fellspan.propagation import (
    bit_error_ratio,
    es_n0_for_error_ratio_db,
    ieee_80211_sensitivity_dbm,
    sensitivity_dbm,
    shannon_snr_db,
    thermal_noise_dbm,
    threshold_degradation_db,
)


def test_thermal_noise() -> None:
    # By hand, two decimals; the textbooks' -174 dBm/Hz.
    widths_mhz = [3, 20, 28, 40, 56, 80, 160, 2160]
    by_hand = [-109.20, -100.96, -99.50, -97.95, -96.49, -94.94, -91.93, -80.63]
    assert thermal_noise_dbm([width * 1e6 for width in widths_mhz]) == pytest.approx(by_hand, abs=6e-3)
    assert thermal_noise_dbm(1.0) == pytest.approx(-173.975, abs=6e-4)


def test_degradation() -> None:
    # By hand.
    found = threshold_degradation_db([-110, -106, -103, -100], noise_dbm=-100)
    assert found == pytest.approx([0.414, 0.973, 1.764, 3.010], abs=6e-4)


def test_signal_to_noise_of_uncoded_modulations() -> None:
    # By hand from the standard union formulas, two decimals.
    bits = [1, 2, 4, 5, 6, 7, 8, 9, 10, 11, 12]
    millionth = [10.53, 13.54, 20.42, 23.55, 26.56, 29.57, 32.55, 35.53, 38.50, 41.48, 44.46]
    assert es_n0_for_error_ratio_db(1e-6, bits_per_symbol=bits) == pytest.approx(millionth, abs=6e-3)
    thousandth = es_n0_for_error_ratio_db(1e-3, bits_per_symbol=[1, 2, 4, 6, 8])
    assert thousandth == pytest.approx([6.79, 9.80, 16.54, 22.55, 28.41], abs=6e-3)


@pytest.mark.parametrize("es_n0_db", [4.0, 7.0, 9.6])
def test_bpsk_is_the_complementary_error_function(es_n0_db: float) -> None:
    # Textbook: half of erfc(sqrt(Eb/N0)); another function of another library.
    expected = 0.5 * math.erfc(math.sqrt(10 ** (es_n0_db / 10)))
    assert bit_error_ratio(es_n0_db, bits_per_symbol=1) == pytest.approx(expected, rel=1e-12)


def test_eight_phases() -> None:
    # Textbook: a third of erfc(sqrt(Es/N0) sin(pi/8)).
    expected = math.erfc(math.sqrt(10**1.5) * math.sin(math.pi / 8)) / 3
    assert bit_error_ratio(15.0, bits_per_symbol=3) == pytest.approx(expected, rel=1e-12)


def test_shannon() -> None:
    floor = [4.77, 11.76, 17.99, 24.07, 30.10, 36.12]  # by hand
    assert shannon_snr_db([2, 4, 6, 8, 10, 12]) == pytest.approx(floor, abs=6e-3)


def test_ieee_80211() -> None:
    # Tables of 802.11ac and ax, 20 MHz, indices 0 to 11.
    table = [-82, -79, -77, -74, -70, -66, -65, -64, -59, -57, -54, -52]
    assert list(ieee_80211_sensitivity_dbm(range(12))) == table
    assert ieee_80211_sensitivity_dbm(7, channel_width_hz=80e6) == -58.0
    # A noise figure of 10 dB and 5 dB of loss stand behind them: whole decibels of signal-to-noise ratio.
    ratios = [4, 7, 9, 12, 16, 20, 21, 22, 27, 29, 32, 34]
    behind = sensitivity_dbm(20e6, noise_figure_db=10, required_snr_db=ratios, implementation_loss_db=5)
    assert behind == pytest.approx(table, abs=0.05)
