"""Receiver noise, interference, error ratios: limits, inverse, mistakes."""

import math

import numpy as np
import pytest
import scipy.constants

from fellspan.errors import QuantityError
from fellspan.propagation import (
    BOLTZMANN_J_K,
    bit_error_ratio,
    es_n0_for_error_ratio_db,
    ieee_80211_sensitivity_dbm,
    sensitivity_dbm,
    shannon_snr_db,
    sum_powers_dbm,
    thermal_noise_dbm,
    threshold_degradation_db,
)


def test_noise_adds_up() -> None:
    assert scipy.constants.k == BOLTZMANN_J_K
    assert thermal_noise_dbm(28e6, noise_figure_db=5.0) == pytest.approx(thermal_noise_dbm(28e6) + 5.0)
    assert thermal_noise_dbm(56e6) - thermal_noise_dbm(28e6) == pytest.approx(10 * math.log10(2))
    level = sensitivity_dbm(28e6, noise_figure_db=5.0, required_snr_db=20.0, implementation_loss_db=2.0)
    assert level == pytest.approx(thermal_noise_dbm(28e6) + 27.0)
    assert math.isnan(thermal_noise_dbm(0.0))
    assert math.isnan(thermal_noise_dbm(1e6, temperature_k=-1.0))


def test_interferers_add_as_powers() -> None:
    assert sum_powers_dbm([-90.0, -90.0]) == pytest.approx(-90.0 + 10 * math.log10(2))
    assert sum_powers_dbm(-90.0) == pytest.approx(-90.0)
    assert sum_powers_dbm([]) == -math.inf
    assert sum_powers_dbm([-math.inf, -80.0]) == pytest.approx(-80.0)
    np.testing.assert_allclose(sum_powers_dbm([[-90.0, -90.0], [-80.0, -300.0]]), [-86.98970004, -80.0])
    together = threshold_degradation_db(sum_powers_dbm([-103.0, -103.0]), noise_dbm=-100.0)
    assert together == pytest.approx(threshold_degradation_db(-103.0 + 10 * math.log10(2), noise_dbm=-100.0))


def test_no_interference_no_degradation() -> None:
    assert threshold_degradation_db(-math.inf, noise_dbm=-100.0) == 0.0
    assert threshold_degradation_db(-300.0, noise_dbm=-100.0) == pytest.approx(4.343e-20, rel=1e-3, abs=0.0)
    steps = threshold_degradation_db(np.linspace(-150, -50, 101), noise_dbm=-100.0)
    assert np.all(np.diff(steps) > 0.0)
    assert steps[-1] == pytest.approx(50.0, abs=1e-3)


@pytest.mark.parametrize("bits", range(1, 13))
def test_error_ratio_and_signal_to_noise_are_inverses(bits: int) -> None:
    ratio = np.geomspace(1e-12, 1e-3, 10)
    needed = es_n0_for_error_ratio_db(ratio, bits_per_symbol=bits)
    assert np.all(np.diff(needed) < 0.0)
    np.testing.assert_allclose(bit_error_ratio(needed, bits_per_symbol=bits), ratio, rtol=1e-9)


def test_denser_modulations_need_more_and_shannon_needs_least() -> None:
    bits = np.arange(1, 13)
    needed = es_n0_for_error_ratio_db(1e-6, bits_per_symbol=bits)
    assert np.all(np.diff(needed) > 0.0)
    assert np.all(needed > shannon_snr_db(bits))
    assert shannon_snr_db(0.0) == -math.inf


def test_undefined_ratios() -> None:
    assert math.isnan(es_n0_for_error_ratio_db(0.0, bits_per_symbol=4))
    assert math.isnan(es_n0_for_error_ratio_db(0.6, bits_per_symbol=1))
    assert type(es_n0_for_error_ratio_db(1e-6, bits_per_symbol=4)) is float


@pytest.mark.parametrize("bits", [0, 2.5, math.nan, -1])
def test_what_is_no_modulation_is_refused(bits: float) -> None:
    with pytest.raises(QuantityError, match=f"{bits:g} bits"):
        bit_error_ratio(10.0, bits_per_symbol=bits)


def test_rows_that_the_standard_has_not_are_refused() -> None:
    with pytest.raises(QuantityError, match="index 12"):
        ieee_80211_sensitivity_dbm(12)
    with pytest.raises(QuantityError, match=r"1\.5"):
        ieee_80211_sensitivity_dbm([1.0, 1.5])
    with pytest.raises(QuantityError, match="30 MHz"):
        ieee_80211_sensitivity_dbm(0, channel_width_hz=30e6)
    np.testing.assert_array_equal(
        ieee_80211_sensitivity_dbm(0, channel_width_hz=[20e6, 40e6, 80e6, 160e6]), [-82, -79, -76, -73]
    )
