"""Integration of a pattern over the sphere: directivity, and the refusal of what radiates more than it gets.

Angles here are polar about the boresight: theta off the boresight, phi around it (0 to the right, 90 degrees up).
"""

import math

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.pattern import Pattern
from fellspan.errors import AntennaError

ENERGY_TOLERANCE_DB = 0.05
"""How far gain may stand above directivity before a pattern is refused: the error of the integration and of rounded data."""

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(6)
_MOST_PANELS = 4000


def direction_from_boresight(
    theta_rad: NDArray[np.float64], phi_rad: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Azimuth and elevation, rad, of directions given as angle off the boresight and angle around it, rad; broadcast."""
    forward, side = np.cos(theta_rad), np.sin(theta_rad)
    azimuth = np.arctan2(side * np.cos(phi_rad), forward + 0.0 * phi_rad)
    elevation = np.arcsin(np.clip(side * np.sin(phi_rad), -1.0, 1.0))
    return azimuth, elevation


def radiated_power(pattern: Pattern) -> float:
    """Integral over the sphere of co-polar plus cross-polar relative power; 4 pi for an isotropic radiator.

    Gauss-Legendre panels of half a wavelength over size in theta, even steps in phi doubled until the change is below
    0.002 dB.

    Raises
    ------
    AntennaError
        The pattern yields numbers that are not finite.
    """
    width = 0.5 * 299_792_458.0 / (pattern.frequency_hz * max(pattern.size_m, 1e-6))
    panels = int(min(_MOST_PANELS, max(24, math.ceil(math.pi / width))))
    edges = np.linspace(0.0, math.pi, panels + 1)
    half = 0.5 * (edges[1] - edges[0])
    theta = (0.5 * (edges[:-1] + edges[1:])[:, None] + half * _NODES).ravel()
    weight = np.tile(half * _WEIGHTS, panels) * np.sin(theta)
    earlier, steps = math.nan, 32
    while True:
        total = _integrate(pattern, theta, weight, steps)
        if not math.isfinite(total) or total <= 0.0:
            raise AntennaError(f"antenna '{pattern.name}': the pattern does not integrate to a finite power")
        if abs(10.0 * math.log10(total / earlier)) < 0.002 if math.isfinite(earlier) else False:
            return total
        if steps * theta.size > 40_000_000:
            return total
        earlier, steps = total, steps * 2


def _integrate(pattern: Pattern, theta: NDArray[np.float64], weight: NDArray[np.float64], steps: int) -> float:
    # Half a step off zero: a cut that is special (a plane of symmetry, an omni's axis) must not be weighed too much.
    phi = np.asarray((np.arange(steps) + 0.5) * (2.0 * math.pi / steps), dtype=np.float64)
    total = 0.0
    rows = max(1, 200_000 // steps)
    for start in range(0, theta.size, rows):
        azimuth, elevation = direction_from_boresight(theta[start : start + rows, None], phi)
        power = pattern.co_amplitude(azimuth, elevation) ** 2 + pattern.cross_amplitude(azimuth, elevation) ** 2
        total += float(np.sum(power * weight[start : start + rows, None]))
    return total * (2.0 * math.pi / steps)


def directivity_dbi(pattern: Pattern) -> float:
    """Directivity at the co-polar maximum, dBi, by integration of the pattern over the sphere."""
    return 10.0 * math.log10(4.0 * math.pi / radiated_power(pattern))


def refuse_surplus(pattern: Pattern) -> None:
    """Refuse a pattern whose gain exceeds its directivity: it would radiate more than it gets.

    Raises
    ------
    AntennaError
        Gain stands more than 0.05 dB above the directivity. Envelopes are not checked: they are limits.
    """
    if pattern.is_envelope:
        return
    directivity = directivity_dbi(pattern)
    if pattern.peak_gain_dbi > directivity + ENERGY_TOLERANCE_DB:
        raise AntennaError(
            f"antenna '{pattern.name}' would radiate more than it gets: gain {pattern.peak_gain_dbi:.2f} dBi, "
            f"but its pattern can hold {directivity:.2f} dBi",
            "lower the gain, narrow the beams, or lower the side lobes",
        )
