"""Receiver noise, sensitivity and interference, and the signal-to-noise that a modulation needs; knows no radios."""

from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from fellspan.errors import QuantityError
from fellspan.propagation._arrays import FloatArray, Result, as_floats, as_result, positive, quiet

BOLTZMANN_J_K: Final = 1.380649e-23
"""Exact by the definition of the kelvin (SI)."""

REFERENCE_TEMPERATURE_K: Final = 290.0
"""Temperature that noise figures refer to, by convention."""

IEEE_80211_SENSITIVITY_DBM: Final = (-82.0, -79.0, -77.0, -74.0, -70.0, -66.0, -65.0, -64.0, -59.0, -57.0, -54.0, -52.0)
"""Least sensitivity that IEEE 802.11ac and ax ask of a receiver, by modulation index 0 to 11: 20 MHz, 10 % of packets lost."""

_IEEE_WIDTHS_HZ: Final = (20e6, 40e6, 80e6, 160e6)


def thermal_noise_dbm(
    bandwidth_hz: ArrayLike, *, noise_figure_db: ArrayLike = 0.0, temperature_k: ArrayLike = REFERENCE_TEMPERATURE_K
) -> Result:
    """Noise power at a receiver's input: k T B times its noise figure.

    Parameters
    ----------
    bandwidth_hz
        Noise bandwidth, Hz; the channel width, as a rule.
    noise_figure_db
        Noise figure, dB.
    temperature_k
        Temperature, K; 290 by convention.

    Returns
    -------
    noise_dbm
        dBm, broadcast shape; -173.975 for 1 Hz. NaN where bandwidth or temperature is not above zero.

    Notes
    -----
    Definition, with the exact Boltzmann constant. Source key: thermal-noise.
    """
    with quiet():
        watts = BOLTZMANN_J_K * positive(temperature_k) * positive(bandwidth_hz)
        return as_result(10.0 * np.log10(watts) + 30.0 + as_floats(noise_figure_db))


def sensitivity_dbm(
    bandwidth_hz: ArrayLike,
    *,
    noise_figure_db: ArrayLike,
    required_snr_db: ArrayLike,
    implementation_loss_db: ArrayLike = 0.0,
) -> Result:
    """Weakest level that a receiver can use, dBm: noise, required signal-to-noise ratio, and what the circuit loses.

    Definition, at 290 K. A data sheet's threshold is better than this sum. Source key: thermal-noise.
    """
    noise = as_floats(thermal_noise_dbm(bandwidth_hz, noise_figure_db=noise_figure_db))
    return as_result(noise + as_floats(required_snr_db) + as_floats(implementation_loss_db))


def sum_powers_dbm(levels_dbm: ArrayLike) -> Result:
    """Sum of powers over the last axis, in dBm; -inf where there are none.

    Interferers that are not in step add as powers. Source key: threshold-degradation.
    """
    levels = np.atleast_1d(as_floats(levels_dbm))
    with quiet():
        return as_result(10.0 * np.log10(np.sum(10.0 ** (levels / 10.0), axis=-1)))


def threshold_degradation_db(interference_dbm: ArrayLike, *, noise_dbm: ArrayLike) -> Result:
    """How much more level a receiver needs because of interference that looks like noise.

    Parameters
    ----------
    interference_dbm
        Interference within the receiver's bandwidth, dBm; of several the sum (`sum_powers_dbm`); -inf for none.
    noise_dbm
        The receiver's own noise, dBm (`thermal_noise_dbm`).

    Returns
    -------
    degradation_db
        dB, broadcast shape; 0 without interference, 3.01 where it equals the noise.

    Notes
    -----
    Definition: 10 log10(1 + I/N). Source key: threshold-degradation.
    """
    with quiet():
        ratio = 10.0 ** ((as_floats(interference_dbm) - as_floats(noise_dbm)) / 10.0)
        return as_result(10.0 / np.log(10.0) * np.log1p(ratio))


def bit_error_ratio(es_n0_db: ArrayLike, *, bits_per_symbol: ArrayLike) -> Result:
    """Share of wrong bits of uncoded, Gray-coded modulation in white noise.

    Parameters
    ----------
    es_n0_db
        Energy of a symbol over the noise density, dB; the signal-to-noise ratio in the symbol bandwidth.
    bits_per_symbol
        1 for BPSK, 2 for QPSK, 3 for 8-PSK, 4 for 16-QAM, ... 12 for 4096-QAM; whole numbers.

    Returns
    -------
    ratio
        Broadcast shape.

    Notes
    -----
    Textbook union formula, good at ratios of 1e-3 and less. Radios code their bits and need 3 to 8 dB less: a data sheet's
    threshold goes before this. Source key: qam-error-ratio.
    """
    from scipy.special import ndtr

    share, squared = _qam(bits_per_symbol)
    with quiet():
        return as_result(share * ndtr(-np.sqrt(squared * 10.0 ** (as_floats(es_n0_db) / 10.0))))


def es_n0_for_error_ratio_db(error_ratio: ArrayLike, *, bits_per_symbol: ArrayLike) -> Result:
    """Symbol energy over noise density, dB, that gives a share of wrong bits; the inverse of `bit_error_ratio`.

    NaN where the ratio is not above zero or is more than the formula gives without any signal. Source key: qam-error-ratio.
    """
    from scipy.special import ndtri

    share, squared = _qam(bits_per_symbol)
    with quiet():
        tail = positive(error_ratio) / share
        distance = -ndtri(np.where(tail < 0.5, tail, np.nan))
        return as_result(10.0 * np.log10(distance**2 / squared))


def shannon_snr_db(bits_per_s_per_hz: ArrayLike) -> Result:
    """Least signal-to-noise ratio, dB, at which any code can carry a rate; -inf at 0.

    Shannon's capacity of the channel with white noise: 10 log10(2^b - 1). Source key: shannon-floor.
    """
    with quiet():
        return as_result(10.0 * np.log10(np.expm1(as_floats(bits_per_s_per_hz) * np.log(2.0))))


def ieee_80211_sensitivity_dbm(index: ArrayLike, *, channel_width_hz: ArrayLike = 20e6) -> Result:
    """Least sensitivity that IEEE 802.11ac and ax ask for, dBm; real radios do 5 to 10 dB better.

    Parameters
    ----------
    index
        Modulation and coding index, 0 to 11.
    channel_width_hz
        20, 40, 80 or 160 MHz; each doubling costs 3 dB.

    Raises
    ------
    QuantityError
        There is no such index or width.

    Notes
    -----
    Tables of the standard as two programs hold them; 10 % of packets lost. Source key: ieee-80211-sensitivity.
    """
    indices, widths = as_floats(index), as_floats(channel_width_hz)
    last = len(IEEE_80211_SENSITIVITY_DBM) - 1
    wrong = indices[~np.isin(indices, np.arange(last + 1))]
    if wrong.size:
        raise QuantityError(f"modulation index {wrong.reshape(-1)[0]:g} is not in the table", f"there are 0 to {last}")
    wide = widths[~np.isin(widths, _IEEE_WIDTHS_HZ)]
    if wide.size:
        raise QuantityError(
            f"channel width {wide.reshape(-1)[0] / 1e6:g} MHz is not in the table", "20, 40, 80 and 160 MHz are"
        )
    table = np.array(IEEE_80211_SENSITIVITY_DBM)[indices.astype(np.intp)]
    return as_result(table + 3.0 * np.log2(widths / 20e6))


def _qam(bits_per_symbol: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Factor before the normal tail, and its squared argument over Es/N0."""
    bits = as_floats(bits_per_symbol)
    wrong = bits[~((bits >= 1.0) & (bits == np.floor(bits)))]
    if wrong.size:
        raise QuantityError(
            f"{wrong.reshape(-1)[0]:g} bits a symbol are not a modulation", "whole numbers from 1 (BPSK) on are"
        )
    order = 2.0**bits
    edge = np.where(bits % 2.0 == 0.0, order, 2.0 * order)  # squares; crosses, which have fewer outer points
    share = np.select([bits <= 2.0, bits == 3.0], [1.0, 2.0 / 3.0], 4.0 / bits * (1.0 - 1.0 / np.sqrt(edge)))
    squared = np.select(
        [bits == 1.0, bits == 3.0], [2.0, 2.0 * np.sin(np.pi / 8.0) ** 2], 3.0 / np.maximum(order - 1.0, 1.0)
    )
    return as_floats(share), as_floats(squared)
