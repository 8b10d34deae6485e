"""Wire antennas standing upright: the half-wave dipole and the collinear omni, computed from their currents."""

import math

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.parts import check, no_cross_polar, uniform_array, wavelength_m, with_gain_from_directivity
from fellspan.antennas.pattern import Pattern


def half_wave_field(elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
    """Relative field of an upright thin half-wave dipole, 1 broadside.

    Any antenna textbook: F = cos((pi/2) cos theta) / sin theta, theta from the wire (90 degrees less the elevation).
    """
    across = np.cos(elevation_rad)
    along = np.sin(elevation_rad)
    safe = np.where(across > 1e-9, across, 1.0)
    return np.where(across <= 1e-9, 0.0, np.abs(np.cos(0.5 * math.pi * along)) / safe)


def dipole(*, frequency_hz: float, efficiency: float = 1.0, name: str = "half-wave dipole") -> Pattern:
    """Upright half-wave dipole: an omni in the H plane, 78 degrees wide in the E plane, 2.151 dBi without loss.

    Parameters
    ----------
    frequency_hz
        Hz, > 0.
    efficiency
        Radiated over accepted power, above 0 to 1.

    Raises
    ------
    AntennaError
        A value is out of range.
    """
    return collinear(frequency_hz=frequency_hz, elements=1, efficiency=efficiency, name=name, kind="dipole")


def collinear(
    *,
    frequency_hz: float,
    elements: int,
    spacing_wavelengths: float = 0.7,
    downtilt_deg: float = 0.0,
    efficiency: float = 1.0,
    name: str | None = None,
    kind: str = "omni",
) -> Pattern:
    """Collinear omni: upright half-wave dipoles in a line, fed alike, or with a phase step for electrical downtilt.

    Parameters
    ----------
    frequency_hz
        Hz, > 0.
    elements
        1 to 64.
    spacing_wavelengths
        Centre to centre, 0.5 to 1 wavelength (half-wave elements would overlap below 0.5).
    downtilt_deg
        Beam below the horizon all around, 0 to 30 degrees.
    efficiency
        Above 0 to 1.

    Raises
    ------
    AntennaError
        A value is out of range.

    Notes
    -----
    Array factor of equal sources, textbook: sin(N x/2) / (N sin(x/2)), x = 2 pi s sin(elevation) + phase. Coupling between
    the elements is left out.
    """
    check("frequency", frequency_hz, 1e6, 1e12, "Hz")
    check("elements", elements, 1, 64, "")
    check("spacing", spacing_wavelengths, 0.5, 1.0, "wavelengths")
    check("downtilt", downtilt_deg, 0.0, 30.0, "degrees")
    check("efficiency", efficiency, 1e-3, 1.0, "")
    phase = 2.0 * math.pi * spacing_wavelengths * math.sin(math.radians(downtilt_deg))

    def shape(elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
        step = 2.0 * math.pi * spacing_wavelengths * np.sin(elevation_rad) + phase
        return half_wave_field(elevation_rad) * np.abs(uniform_array(step, elements))

    top = float(np.max(shape(np.radians(np.linspace(-90.0, 90.0, 36001)))))

    def co(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
        return shape(elevation_rad) / top + 0.0 * azimuth_rad

    wavelength = wavelength_m(frequency_hz)
    lossless = Pattern(
        name=name or f"collinear omni, {elements} elements",
        kind=kind,
        frequency_hz=frequency_hz,
        peak_gain_dbi=0.0,
        co_amplitude=co,
        cross_amplitude=no_cross_polar,
        size_m=wavelength * ((elements - 1) * spacing_wavelengths + 0.5),
        efficiency=efficiency,
        turns=elements == 1,
        polarizations=("vertical", "horizontal", "slant+45", "slant-45") if elements == 1 else ("vertical",),
        source="currents of thin half-wave dipoles (antenna textbooks); coupling left out",
    )
    return with_gain_from_directivity(lossless)
