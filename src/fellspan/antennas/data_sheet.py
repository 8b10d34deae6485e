"""A smooth pattern from what a data sheet says: gain, beamwidths, front-to-back ratio, cross-polar discrimination.

The beam is a bell in azimuth and elevation with exactly the stated widths; around it lies a side-lobe floor that carries
what power the beam leaves over, and straight behind stands exactly the stated front-to-back ratio.
"""

import math
from dataclasses import replace
from functools import partial

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.dishes import off_boresight_rad
from fellspan.antennas.parts import check, wavelength_m
from fellspan.antennas.pattern import Pattern, Plane
from fellspan.antennas.sphere import ENERGY_TOLERANCE_DB, directivity_dbi, radiated_power
from fellspan.errors import AntennaError

USUAL_EFFICIENCY = 0.8
"""Gain over directivity that is aimed at; the side-lobe floor is set to reach it (common practice, no source)."""

HIGHEST_FLOOR_DB = -15.0
"""The side-lobe floor never stands above this, relative to the peak; the efficiency gives way instead."""

_BACK = math.radians(90.0), math.radians(150.0)
_NARROW_BACK = math.radians(150.0), math.radians(172.0)
"""Where the level behind begins and is reached. A back lobe that would take more than a tenth of all power is a narrow one."""


def from_data_sheet(
    *,
    name: str,
    frequency_hz: float,
    gain_dbi: float,
    azimuth_width_deg: float | None,
    elevation_width_deg: float,
    front_to_back_db: float | None = None,
    cross_polar_db: float = 25.0,
    downtilt_deg: float = 0.0,
    size_m: float | None = None,
    electric_plane: Plane = "vertical",
    kind: str = "data sheet",
) -> Pattern:
    """Pattern that honours a data sheet and energy.

    Parameters
    ----------
    gain_dbi
        Peak gain.
    azimuth_width_deg
        Half-power width in azimuth, 0.1 to 180 degrees; None for an omni.
    elevation_width_deg
        Half-power width in elevation, 0.1 to 120 degrees.
    front_to_back_db
        Peak over level straight behind, 5 to 90 dB; None for an omni, which has none, and must be given otherwise.
    cross_polar_db
        Discrimination in the beam, 5 to 60 dB.
    downtilt_deg
        Electrical, -30 to 30 degrees; the elevation width is kept.
    size_m
        Largest dimension; None takes wavelength over the smaller beamwidth in radians.

    Raises
    ------
    AntennaError
        A value is out of range, or the beam as stated cannot hold the gain: it would radiate more than it gets.
    """
    check("gain", gain_dbi, -3.0, 70.0, "dBi")
    check("elevation width", elevation_width_deg, 0.1, 120.0, "degrees")
    check("cross-polar discrimination", cross_polar_db, 5.0, 60.0, "dB")
    check("downtilt", downtilt_deg, -30.0, 30.0, "degrees")
    if azimuth_width_deg is not None:
        check("azimuth width", azimuth_width_deg, 0.1, 180.0, "degrees")
        if front_to_back_db is None:
            raise AntennaError(f"antenna '{name}' is no omni: its front-to-back ratio is missing")
        check("front-to-back ratio", front_to_back_db, 5.0, 90.0, "dB")
    elif front_to_back_db is not None:
        raise AntennaError(
            f"antenna '{name}' is an omni: a front-to-back ratio of {front_to_back_db:g} dB means nothing"
        )
    narrow = min(azimuth_width_deg or 360.0, elevation_width_deg)
    beam = partial(
        _beam,
        azimuth_width_rad=None if azimuth_width_deg is None else math.radians(azimuth_width_deg),
        elevation_width_rad=math.radians(elevation_width_deg),
        downtilt_rad=math.radians(downtilt_deg),
    )
    back = 0.0 if front_to_back_db is None else 10.0 ** (-front_to_back_db / 10.0)
    leak = 10.0 ** (-cross_polar_db / 10.0)
    # The wide back fills about 3 steradians.
    begins, reached = _NARROW_BACK if 3.0 * back > 0.4 * math.pi / 10.0 ** (gain_dbi / 10.0) else _BACK

    def made(floor: float) -> Pattern:
        def power(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
            bell, outside = beam(azimuth_rad, elevation_rad)
            if azimuth_width_deg is None:
                return bell + floor * outside
            behind = _smooth((off_boresight_rad(azimuth_rad, elevation_rad) - begins) / (reached - begins))
            return (bell + floor * outside) * (1.0 - behind) + back * behind

        def co(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
            return np.asarray(np.sqrt(power(azimuth_rad, elevation_rad)))

        def cross(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
            return np.asarray(np.sqrt(leak * power(azimuth_rad, elevation_rad)))

        return Pattern(
            name=name,
            kind=kind,
            frequency_hz=frequency_hz,
            peak_gain_dbi=gain_dbi,
            co_amplitude=co,
            cross_amplitude=cross,
            electric_plane=electric_plane,
            size_m=size_m if size_m is not None else wavelength_m(frequency_hz) / math.radians(min(narrow, 57.3)),
            efficiency=1.0,
            turns=False,
            source="data sheet; beam as a bell, side-lobe floor from the energy balance",
        )

    # Power on the sphere is linear in the floor: two integrals say how high it must be for the usual efficiency.
    bare, with_floor = radiated_power(made(0.0)), radiated_power(made(0.01))
    wanted = 4.0 * math.pi / 10.0 ** (gain_dbi / 10.0) * USUAL_EFFICIENCY
    floor = min(max((wanted - bare) / (with_floor - bare) * 0.01, 0.0), 10.0 ** (HIGHEST_FLOOR_DB / 10.0))
    pattern = made(floor)
    surplus = gain_dbi - directivity_dbi(pattern)
    if surplus > ENERGY_TOLERANCE_DB:
        raise AntennaError(
            f"antenna '{name}' would radiate more than it gets: {gain_dbi:.2f} dBi, but beams of "
            f"{'360' if azimuth_width_deg is None else format(azimuth_width_deg, 'g')} by {elevation_width_deg:g} degrees "
            f"hold {gain_dbi - surplus:.2f} dBi at most",
            "check gain, beamwidths and front-to-back ratio against the data sheet",
        )
    return replace(pattern, efficiency=min(10.0 ** (surplus / 10.0), 1.0))


def _beam(
    azimuth_rad: NDArray[np.float64],
    elevation_rad: NDArray[np.float64],
    *,
    azimuth_width_rad: float | None,
    elevation_width_rad: float,
    downtilt_rad: float,
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """The bell, 1 at its top, and the place outside it, 0 within a beamwidth of the axis rising to 1 at 1.6."""
    up = (elevation_rad + downtilt_rad) / elevation_width_rad
    side = 0.0 * azimuth_rad if azimuth_width_rad is None else azimuth_rad / azimuth_width_rad
    squared = up * up + side * side
    bell = np.exp2(-4.0 * squared)
    return bell, _smooth((np.sqrt(squared) - 1.0) / 0.6)


def _smooth(x: NDArray[np.float64]) -> NDArray[np.float64]:
    clipped = np.clip(x, 0.0, 1.0)
    return np.asarray(clipped * clipped * (3.0 - 2.0 * clipped))
