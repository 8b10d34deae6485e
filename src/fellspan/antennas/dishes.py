"""Parabolic dishes: the aperture's own field for main lobe and near side lobes, scattered power for the rest."""

import math
from collections.abc import Callable
from dataclasses import replace
from functools import partial

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.parts import check, wavelength_m
from fellspan.antennas.pattern import Pattern
from fellspan.errors import AntennaError

SPILLED_SOLID = 0.12
SPILLED_GRID = 0.20
"""Share of the radiated power that feed spill-over, struts, rim and mesh scatter (common practice, no source)."""


def dish(
    *,
    frequency_hz: float,
    diameter_m: float,
    aperture_efficiency: float = 0.55,
    edge_taper_db: float = 10.0,
    taper_power: int = 1,
    grid: bool = False,
    cross_polar_db: float = 30.0,
    name: str | None = None,
) -> Pattern:
    """Parabolic dish with electric field upright.

    Parameters
    ----------
    frequency_hz
        Hz.
    diameter_m
        Of the reflector, m; at least 1.5 wavelengths.
    aperture_efficiency
        Gain over (pi D / lambda)^2, above 0 to 1; what a data sheet's gain amounts to.
    edge_taper_db
        Illumination at the rim below the centre, dB, 0 to 30.
    taper_power
        1 or 2: the power n of (1 - r^2)^n.
    grid
        A grid of rods: less wind, more power behind, one polarisation.
    cross_polar_db
        Co-polar peak over cross-polar level on the boresight, dB, 0 to 60.

    Raises
    ------
    AntennaError
        A value is out of range, or the efficiency is more than taper and scattering leave.

    Notes
    -----
    Field of a circular aperture with illumination C + (1 - C)(1 - r^2)^n (antenna textbooks), its power by the projected
    aperture, cos(theta), so that it ends at a right angle without a step. Scattered power falls as the
    -2.5th power of the angle from one beamwidth to 48 degrees and stays level behind, the form of the envelope of Rec.
    ITU-R F.699; all lobes stay under that envelope for 0.3 to 3 m dishes (tests show it). Efficiency of the result is
    gain over directivity: what surface, blockage, cover and ohmic loss take.
    """
    wavelength = wavelength_m(frequency_hz)
    check("diameter", diameter_m / wavelength, 1.5, 5000.0, "wavelengths")
    check("aperture efficiency", aperture_efficiency, 1e-2, 1.0, "")
    check("edge taper", edge_taper_db, 0.0, 30.0, "dB")
    check("cross-polar discrimination", cross_polar_db, 0.0, 60.0, "dB")
    if taper_power not in (1, 2):
        raise AntennaError(f"taper power {taper_power} is not 1 or 2")
    size = diameter_m / wavelength
    pedestal = 10.0 ** (-edge_taper_db / 20.0)
    field = partial(_projected_field, size_wavelengths=size, pedestal=pedestal, power=taper_power)
    beam = math.radians(65.0 / size)
    spilled = SPILLED_GRID if grid else SPILLED_SOLID
    scatter = partial(_scattered, beam_rad=beam, behind=6.0 if grid else 1.0)
    cross_scatter = partial(_scattered_across, beam_rad=beam, behind=scatter.keywords["behind"])
    scattered = _revolved(scatter, size) + _revolved(cross_scatter, size)
    level = spilled / (1.0 - spilled) * _revolved(lambda theta: field(theta) ** 2, size) / scattered
    leak = 10.0 ** (-cross_polar_db / 10.0)

    def co(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
        theta = off_boresight_rad(azimuth_rad, elevation_rad)
        amplitude: NDArray[np.float64] = np.sqrt((field(theta) ** 2 + level * scatter(theta)) / (1.0 + level))
        return amplitude

    def cross(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
        theta = off_boresight_rad(azimuth_rad, elevation_rad)
        amplitude: NDArray[np.float64] = np.sqrt(
            (leak * field(theta) ** 2 + level * cross_scatter(theta)) / (1.0 + level)
        )
        return amplitude

    gain = 10.0 * math.log10(aperture_efficiency * (math.pi * size) ** 2)
    made = Pattern(
        name=name or f"{'grid dish' if grid else 'dish'} {diameter_m:g} m",
        kind="dish",
        frequency_hz=frequency_hz,
        peak_gain_dbi=gain,
        co_amplitude=co,
        cross_amplitude=cross,
        size_m=diameter_m,
        efficiency=1.0,
        polarizations=("vertical", "horizontal", "slant+45", "slant-45") if grid else None,
        source="circular aperture with taper; scattered power under the envelope of Rec. ITU-R F.699",
    )
    every_way = _revolved(lambda theta: co(theta, 0.0 * theta) ** 2 + cross(theta, 0.0 * theta) ** 2, size)
    possible = 10.0 * math.log10(4.0 * math.pi / every_way)
    if gain > possible:
        raise AntennaError(
            f"{made.name}: an aperture efficiency that gives {gain:.2f} dBi is more than its taper and scattering leave, "
            f"{possible:.2f} dBi",
            "lower the aperture efficiency or the edge taper",
        )
    return replace(made, efficiency=10.0 ** ((gain - possible) / 10.0))


def off_boresight_rad(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
    """Angle between directions and the boresight, rad, 0 to pi; exact for small angles too."""
    ahead = np.cos(elevation_rad) * np.cos(azimuth_rad)
    aside = np.hypot(np.cos(elevation_rad) * np.sin(azimuth_rad), np.sin(elevation_rad))
    theta: NDArray[np.float64] = np.arctan2(aside, ahead)
    return theta


def _projected_field(
    theta_rad: NDArray[np.float64], *, size_wavelengths: float, pedestal: float, power: int
) -> NDArray[np.float64]:
    field = aperture_field(theta_rad, size_wavelengths=size_wavelengths, pedestal=pedestal, power=power)
    return field * np.sqrt(np.maximum(np.cos(theta_rad), 0.0))


def aperture_field(
    theta_rad: NDArray[np.float64], *, size_wavelengths: float, pedestal: float, power: int
) -> NDArray[np.float64]:
    """Relative field of a circular aperture with illumination C + (1 - C)(1 - r^2)^n, 1 on the axis.

    Parameters
    ----------
    theta_rad
        Angle off the axis, rad; beyond a right angle the aperture radiates nothing.
    size_wavelengths
        Diameter over wavelength.
    pedestal
        C, the illumination at the rim, 0 to 1 (amplitude).
    power
        n, 1 or 2.

    Notes
    -----
    Sum of C L1(u) and (1 - C)/(n + 1) L(n+1)(u), u = pi D/lambda sin(theta), L(m)(u) = m! (2/u)^m J_m(u).
    """
    u = math.pi * size_wavelengths * np.sin(theta_rad)
    tapered = (1.0 - pedestal) / (power + 1.0)
    field = (pedestal * _lambda(1, u) + tapered * _lambda(power + 1, u)) / (pedestal + tapered)
    return np.where(theta_rad >= 0.5 * math.pi, 0.0, np.abs(field))


def _lambda(order: int, u: NDArray[np.float64]) -> NDArray[np.float64]:
    from scipy.special import jv

    small = np.abs(u) < 1e-3
    safe = np.where(small, 1.0, u)
    exact = math.factorial(order) * (2.0 / safe) ** order * jv(order, safe)
    result: NDArray[np.float64] = np.where(small, 1.0 - u * u / (4.0 * (order + 1)), exact)
    return result


def _scattered(theta_rad: NDArray[np.float64], *, beam_rad: float, behind: float) -> NDArray[np.float64]:
    edge = math.radians(48.0)
    fall = (beam_rad / np.clip(theta_rad, beam_rad, max(edge, beam_rad))) ** 2.5
    # A grid's rear is stronger; the change takes 20 degrees around the rim's plane.
    past = np.clip((theta_rad - math.radians(80.0)) / math.radians(20.0), 0.0, 1.0)
    return np.asarray(fall * (1.0 + (behind - 1.0) * past * past * (3.0 - 2.0 * past)))


def _scattered_across(theta_rad: NDArray[np.float64], *, beam_rad: float, behind: float) -> NDArray[np.float64]:
    # Half as much in the other polarisation, and none on the boresight, where data sheets state the discrimination.
    return 0.5 * np.minimum(theta_rad / beam_rad, 1.0) ** 2 * _scattered(theta_rad, beam_rad=beam_rad, behind=behind)


def _revolved(power: Callable[[NDArray[np.float64]], NDArray[np.float64]], size: float) -> float:
    """Integral over the sphere of a power that depends on the angle off the boresight only."""
    panels = max(64, min(8000, int(4.0 * math.pi * size)))
    nodes, weights = np.polynomial.legendre.leggauss(6)
    half = 0.5 * math.pi / panels
    theta = (half * (2.0 * np.arange(panels) + 1.0)[:, None] + half * nodes).ravel()
    return float(2.0 * math.pi * np.sum(power(theta) * np.sin(theta) * np.tile(half * weights, panels)))
