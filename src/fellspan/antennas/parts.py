"""Parts that antenna kinds share: ideal polarisation, array factors, gain from directivity, range checks."""

import math
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.pattern import Pattern
from fellspan.antennas.sphere import directivity_dbi
from fellspan.errors import AntennaError


def wavelength_m(frequency_hz: float) -> float:
    """Wavelength in free space, m."""
    return 299_792_458.0 / frequency_hz


def no_cross_polar(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
    """Cross-polar amplitude of an ideal radiator: none."""
    return np.zeros(np.broadcast(azimuth_rad, elevation_rad).shape)


def uniform_array(step_rad: NDArray[np.float64], elements: int) -> NDArray[np.float64]:
    """Array factor of equal sources, 1 at its maximum; `step_rad` is the phase from one source to the next."""
    half = 0.5 * step_rad
    bottom = np.sin(half)
    grating = np.abs(bottom) < 1e-9
    turn = np.cos(elements * half) / np.where(grating, np.cos(half), 1.0)
    return np.where(grating, turn, np.sin(elements * half) / np.where(grating, 1.0, elements * bottom))


def with_gain_from_directivity(pattern: Pattern) -> Pattern:
    """The same pattern with gain = directivity by integration + its efficiency in dB."""
    if pattern.efficiency is None:
        raise AntennaError(f"antenna '{pattern.name}': an envelope has no directivity")
    return replace(pattern, peak_gain_dbi=directivity_dbi(pattern) + 10.0 * math.log10(pattern.efficiency))


def check(what: str, value: float, low: float, high: float, unit: str) -> None:
    """Refuse a number outside its range with an AntennaError that holds the value and the range."""
    if not (math.isfinite(value) and low <= value <= high):
        raise AntennaError(f"antenna {what} {value:g} {unit}".rstrip() + f" is outside {low:g} to {high:g}")
