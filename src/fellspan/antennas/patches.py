"""Rectangular microstrip patch, and arrays of patches: panels and sectors. E plane vertical in the antenna's frame."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.parts import check, no_cross_polar, uniform_array, wavelength_m, with_gain_from_directivity
from fellspan.antennas.pattern import Pattern

_SOURCE = "two-slot model of the rectangular patch (antenna textbooks), infinite ground plane"


@dataclass(frozen=True, slots=True, kw_only=True)
class PatchSize:
    """Dimensions of a resonant rectangular patch, m, and the effective permittivity of its line.

    `length_m` is along the E plane; `electric_length_m` includes the fringe at both ends, `fringe_m` each.
    """

    width_m: float
    length_m: float
    electric_length_m: float
    fringe_m: float
    effective_permittivity: float


def patch_size(*, frequency_hz: float, permittivity: float, height_m: float) -> PatchSize:
    """Size of a patch that resonates at a frequency on a substrate.

    Parameters
    ----------
    frequency_hz
        Hz.
    permittivity
        Relative permittivity of the substrate, 1 to 20.
    height_m
        Substrate thickness, m; up to a tenth of a wavelength.

    Raises
    ------
    AntennaError
        A value is out of range.

    Notes
    -----
    Transmission-line model with the usual closed forms for effective permittivity and fringe length (antenna textbooks).
    """
    check("frequency", frequency_hz, 1e6, 1e12, "Hz")
    check("permittivity", permittivity, 1.0, 20.0, "")
    wavelength = wavelength_m(frequency_hz)
    check("substrate height", height_m, 1e-4 * wavelength, 0.1 * wavelength, "m")
    width = 0.5 * wavelength * math.sqrt(2.0 / (permittivity + 1.0))
    effective = (permittivity + 1.0) / 2.0 + (permittivity - 1.0) / 2.0 / math.sqrt(1.0 + 12.0 * height_m / width)
    ratio = width / height_m
    fringe = 0.412 * height_m * (effective + 0.3) * (ratio + 0.264) / ((effective - 0.258) * (ratio + 0.8))
    electric = 0.5 * wavelength / math.sqrt(effective)
    return PatchSize(
        width_m=width,
        length_m=electric - 2.0 * fringe,
        electric_length_m=electric,
        fringe_m=fringe,
        effective_permittivity=effective,
    )


def patch(
    *,
    frequency_hz: float,
    permittivity: float = 2.2,
    height_m: float | None = None,
    efficiency: float = 0.9,
    front_to_back_db: float | None = None,
    name: str = "patch",
) -> Pattern:
    """One rectangular patch; see `patch_array` for the parameters."""
    return patch_array(
        frequency_hz=frequency_hz,
        rows=1,
        columns=1,
        permittivity=permittivity,
        height_m=height_m,
        efficiency=efficiency,
        front_to_back_db=front_to_back_db,
        name=name,
        kind="patch",
    )


def patch_array(
    *,
    frequency_hz: float,
    rows: int,
    columns: int,
    row_spacing_wavelengths: float = 0.7,
    column_spacing_wavelengths: float = 0.7,
    downtilt_deg: float = 0.0,
    permittivity: float = 2.2,
    height_m: float | None = None,
    efficiency: float = 0.7,
    front_to_back_db: float | None = 25.0,
    name: str | None = None,
    kind: str = "panel",
) -> Pattern:
    """Patches in `rows` (upward) by `columns` (sideways), fed alike; a sector is one column of many rows.

    Parameters
    ----------
    frequency_hz
        Hz.
    rows, columns
        1 to 64 each.
    row_spacing_wavelengths, column_spacing_wavelengths
        Centre to centre, 0.4 to 1.
    downtilt_deg
        Electrical downtilt by a phase step from row to row, 0 to 30 degrees.
    permittivity, height_m
        Substrate; height None takes a fortieth of a wavelength.
    efficiency
        Gain over directivity, above 0 to 1; feed network and substrate losses.
    front_to_back_db
        Level of the mirrored pattern behind the ground plane, dB below the front; None for an infinite ground plane.

    Raises
    ------
    AntennaError
        A value is out of range.

    Notes
    -----
    Field of one patch: sinc(k h u / 2) cos(k Le u / 2) sinc(k W v / 2) sqrt(1 - v^2), with u and v the direction cosines
    along the E and H planes (two-slot model, antenna textbooks), times the array factor; coupling left out.
    """
    for label, number in (("rows", rows), ("columns", columns)):
        check(label, number, 1, 64, "")
    check("row spacing", row_spacing_wavelengths, 0.4, 1.0, "wavelengths")
    check("column spacing", column_spacing_wavelengths, 0.4, 1.0, "wavelengths")
    check("downtilt", downtilt_deg, 0.0, 30.0, "degrees")
    check("efficiency", efficiency, 1e-3, 1.0, "")
    if front_to_back_db is not None:
        check("front-to-back ratio", front_to_back_db, 0.0, 100.0, "dB")
    wavelength = wavelength_m(frequency_hz)
    height = wavelength / 40.0 if height_m is None else height_m
    size = patch_size(frequency_hz=frequency_hz, permittivity=permittivity, height_m=height)
    behind = 0.0 if front_to_back_db is None else 10.0 ** (-front_to_back_db / 20.0)
    tilt = math.sin(math.radians(downtilt_deg))
    turns = 2.0 * math.pi

    def co(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
        upward = np.sin(elevation_rad) + 0.0 * azimuth_rad
        sideways = np.cos(elevation_rad) * np.sin(azimuth_rad)
        ahead = np.cos(elevation_rad) * np.cos(azimuth_rad) > 0.0
        # np.sinc holds a pi: k x / 2 = pi x / lambda.
        field = np.sinc(height / wavelength * upward) * np.cos(math.pi * size.electric_length_m / wavelength * upward)
        field = field * np.sinc(size.width_m / wavelength * sideways) * np.sqrt(np.maximum(1.0 - sideways**2, 0.0))
        array = uniform_array(turns * row_spacing_wavelengths * (upward + tilt), rows) * uniform_array(
            turns * column_spacing_wavelengths * sideways, columns
        )
        return np.abs(field * array) * np.where(ahead, 1.0, behind) / top

    top = 1.0
    if downtilt_deg > 0.0:
        down = np.radians(np.linspace(-90.0, 90.0, 36001))
        top = float(np.max(co(np.zeros_like(down), down)))
    across = wavelength * (columns - 1) * column_spacing_wavelengths + size.width_m
    upright = wavelength * (rows - 1) * row_spacing_wavelengths + size.length_m
    return with_gain_from_directivity(
        Pattern(
            name=name or f"patch array, {rows} x {columns}",
            kind=kind,
            frequency_hz=frequency_hz,
            peak_gain_dbi=0.0,
            co_amplitude=co,
            cross_amplitude=no_cross_polar,
            size_m=max(across, upright),
            efficiency=efficiency,
            turns=rows == columns and downtilt_deg == 0.0,
            source=_SOURCE,
        )
    )
