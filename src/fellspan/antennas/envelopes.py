"""Reference envelopes for interference work: ITU-R F.699-8 and F.1245-3 dishes.

An envelope is what real antennas stay under (F.699) or what their side lobes average (F.1245). It holds no energy balance
and is never used for the wanted signal of a link. The texts of these Recommendations were not read: the formulas agree in
two independent open implementations. Sectors and omnis stand in `envelopes_p2mp`.
"""

from collections.abc import Callable
from functools import partial

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.antennas.dishes import off_boresight_rad
from fellspan.antennas.parts import check, wavelength_m
from fellspan.antennas.pattern import Pattern

Envelope = Callable[[NDArray[np.float64]], NDArray[np.float64]]


def peak_gain_of_dish_dbi(size_wavelengths: float) -> float:
    """Gain of a dish when nothing else is known, dBi: 20 log(D/lambda) + 7.7 (ITU-R F.699-8, note)."""
    return 20.0 * float(np.log10(size_wavelengths)) + 7.7


def f699_gain_dbi(
    off_axis_deg: ArrayLike, *, size_wavelengths: float, frequency_hz: float, peak_gain_dbi: float | None = None
) -> NDArray[np.float64] | float:
    """Peak envelope of a dish's side lobes, ITU-R F.699-8.

    Parameters
    ----------
    off_axis_deg
        Angle off the boresight, degrees, 0 to 180; any shape.
    size_wavelengths
        Diameter over wavelength, > 0.63.
    frequency_hz
        0.1 to 86 GHz.
    peak_gain_dbi
        Gain on the axis; None takes `peak_gain_of_dish_dbi`.

    Returns
    -------
    gain_dbi
        Same shape as `off_axis_deg`.
    """
    angle = np.asarray(off_axis_deg, dtype=np.float64)
    size, ghz = size_wavelengths, frequency_hz / 1e9
    peak = peak_gain_of_dish_dbi(size) if peak_gain_dbi is None else peak_gain_dbi
    main, first_lobe, main_to = _main_lobe(angle, size, peak)
    log_size, log_angle = np.log10(size), np.log10(np.maximum(angle, 1e-9))
    turn = 48.0 if ghz <= 70.0 else 120.0
    if size > 100.0:
        plateau_to = max(main_to, 15.85 * size**-0.6)
        slope = 32.0 - 25.0 * log_angle
        back = -10.0 if ghz <= 70.0 else -20.0
    else:
        plateau_to = max(main_to, 100.0 / size)
        slope = 52.0 - 10.0 * log_size - 25.0 * log_angle
        back = (10.0 if ghz <= 70.0 else 0.0) - 10.0 * log_size
        if ghz < 1.0:
            turn, back = 144.5 * size**-0.2, -2.0 - 5.0 * log_size
    return _joined(angle, main, main_to, first_lobe, plateau_to, slope, turn, float(back))


def f1245_gain_dbi(
    off_axis_deg: ArrayLike, *, size_wavelengths: float, frequency_hz: float, peak_gain_dbi: float | None = None
) -> NDArray[np.float64] | float:
    """Average side lobes of a dish, for sums over many interferers, ITU-R F.1245-3, recommends 2; 1 to 86 GHz.

    Parameters and return value as in `f699_gain_dbi`.
    """
    angle = np.asarray(off_axis_deg, dtype=np.float64)
    size, ghz = size_wavelengths, frequency_hz / 1e9
    peak = peak_gain_of_dish_dbi(size) if peak_gain_dbi is None else peak_gain_dbi
    main, first_lobe, main_to = _main_lobe(angle, size, peak)
    log_size, log_angle = np.log10(size), np.log10(np.maximum(angle, 1e-9))
    turn = 48.0 if ghz <= 70.0 else 120.0
    if size > 100.0:
        plateau_to = max(main_to, 12.02 * size**-0.6)
        slope = 29.0 - 25.0 * log_angle
        back = -13.0 if ghz <= 70.0 else -23.0
    else:
        plateau_to = main_to
        slope = 39.0 - 5.0 * log_size - 25.0 * log_angle
        back = (-3.0 if ghz <= 70.0 else -13.0) - 5.0 * log_size
    return _joined(angle, main, main_to, first_lobe, plateau_to, slope, turn, float(back))


def _main_lobe(angle: NDArray[np.float64], size: float, peak: float) -> tuple[NDArray[np.float64], float, float]:
    first_lobe = 2.0 + 15.0 * float(np.log10(size))
    main_to = 20.0 / size * float(np.sqrt(max(peak - first_lobe, 0.0)))
    return peak - 2.5e-3 * (size * angle) ** 2, first_lobe, main_to


def _joined(
    angle: NDArray[np.float64],
    main: NDArray[np.float64],
    main_to: float,
    first_lobe: float,
    plateau_to: float,
    slope: NDArray[np.float64],
    turn: float,
    back: float,
) -> NDArray[np.float64] | float:
    gain = np.select(
        [np.isnan(angle), angle < main_to, angle < plateau_to, angle < turn], [np.nan, main, first_lobe, slope], back
    )
    return float(gain) if gain.ndim == 0 else gain


def envelope_pattern(
    gain_at: Callable[[NDArray[np.float64]], NDArray[np.float64] | float],
    *,
    name: str,
    frequency_hz: float,
    peak_gain_dbi: float,
    size_m: float,
    source: str,
) -> Pattern:
    """A Pattern from an envelope that depends on the angle off the boresight alone, degrees.

    Both polarisations get it: an envelope promises no cross-polar discrimination.
    """

    def co(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
        off_axis = np.degrees(off_boresight_rad(azimuth_rad, elevation_rad))
        return np.asarray(10.0 ** ((gain_at(off_axis) - peak_gain_dbi) / 20.0), dtype=np.float64)

    return Pattern(
        name=name,
        kind="envelope",
        frequency_hz=frequency_hz,
        peak_gain_dbi=peak_gain_dbi,
        co_amplitude=co,
        cross_amplitude=co,
        size_m=size_m,
        efficiency=None,
        source=source,
        notes=("a limit for interference work, not for the wanted signal",),
    )


def f699_envelope(*, frequency_hz: float, diameter_m: float, peak_gain_dbi: float | None = None) -> Pattern:
    """ITU-R F.699-8 as a Pattern for a dish of a diameter, m, 0.1 to 86 GHz."""
    return _dish_envelope(f699_gain_dbi, "ITU-R F.699-8", frequency_hz, diameter_m, peak_gain_dbi)


def f1245_envelope(*, frequency_hz: float, diameter_m: float, peak_gain_dbi: float | None = None) -> Pattern:
    """ITU-R F.1245-3 as a Pattern for a dish of a diameter, m, 1 to 86 GHz."""
    return _dish_envelope(f1245_gain_dbi, "ITU-R F.1245-3", frequency_hz, diameter_m, peak_gain_dbi)


def _dish_envelope(
    law: Callable[..., NDArray[np.float64] | float],
    document: str,
    frequency_hz: float,
    diameter_m: float,
    peak_gain_dbi: float | None,
) -> Pattern:
    lowest = 0.1e9 if "699" in document else 1e9
    check("frequency", frequency_hz, lowest, 86e9, "Hz")
    size = diameter_m / wavelength_m(frequency_hz)
    check("diameter", size, 0.64, 5000.0, "wavelengths")
    peak = peak_gain_of_dish_dbi(size) if peak_gain_dbi is None else peak_gain_dbi
    return envelope_pattern(
        partial(law, size_wavelengths=size, frequency_hz=frequency_hz, peak_gain_dbi=peak),
        name=f"{document}, {diameter_m:g} m",
        frequency_hz=frequency_hz,
        peak_gain_dbi=peak,
        size_m=diameter_m,
        source=f"{document} (formulas agree in two independent implementations; text not read)",
    )
