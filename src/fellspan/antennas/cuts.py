"""Two measured cuts become gain in any direction; a dense grid becomes the same by interpolation."""

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.parts import no_cross_polar, wavelength_m
from fellspan.antennas.pattern import AmplitudeFunction, Pattern, Plane
from fellspan.antennas.sphere import directivity_dbi, refuse_surplus

METHOD = (
    "horizontal projection interpolation: the azimuth cut, less what the elevation cut loses in front and behind, weighed "
    "by the angle around (Gil, Claro, Ferreira, Pardelinha, Correia, IEEE Antennas and Propagation Magazine, 2001; from memory)"
)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class MeasuredCut:
    """One cut: angles in degrees, rising, over the full circle from -180 to 180; gains in dB relative to the co-polar peak."""

    angle_deg: NDArray[np.float64]
    relative_db: NDArray[np.float64]

    def at(self, angle_deg: NDArray[np.float64]) -> NDArray[np.float64]:
        """Relative gain, dB, interpolated in amplitude; the angle is taken around the circle."""
        amplitude = 10.0 ** (self.relative_db / 20.0)
        read = np.interp(angle_deg, self.angle_deg, amplitude, period=360.0)
        return np.asarray(20.0 * np.log10(np.maximum(read, 1e-10)))


def combine_cuts(azimuth: MeasuredCut, elevation: MeasuredCut) -> AmplitudeFunction:
    """Amplitude in any direction from the two principal cuts, which it keeps where they agree ahead and behind.

    Notes
    -----
    G(az, el) = H(az) - [(1 - w)(H(0) - V(el)) + w (H(180) - V(180 - el))], w = |az|/180 degrees: the horizontal projection
    interpolation named in `METHOD`, with V the elevation cut run over the top to the back.
    """
    # The elevation cut is counted from what the azimuth cut has ahead and behind. Where both were taken through one point that
    # is the elevation cut's own value there; an azimuth cut taken through a tilted beam is lowered off the beam, as it must be.
    front_top = float(azimuth.at(np.array([0.0]))[0])
    back_top = float(azimuth.at(np.array([180.0]))[0])

    def amplitude(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
        around, up = np.broadcast_arrays(np.degrees(azimuth_rad), np.degrees(elevation_rad))
        weight = np.abs(around) / 180.0
        front = front_top - elevation.at(up)
        back = back_top - elevation.at(180.0 - up)
        gain = azimuth.at(around) - ((1.0 - weight) * front + weight * back)
        # The method can add what neither cut has: nothing may stand above the peak.
        return np.asarray(10.0 ** (np.minimum(gain, 0.0) / 20.0))

    return amplitude


def pattern_from_cuts(
    *,
    name: str,
    frequency_hz: float,
    gain_dbi: float,
    azimuth: MeasuredCut,
    elevation: MeasuredCut,
    cross_azimuth: MeasuredCut | None = None,
    cross_elevation: MeasuredCut | None = None,
    electric_plane: Plane = "vertical",
    size_m: float | None = None,
) -> Pattern:
    """Pattern from two measured cuts and the gain; `size_m` None estimates it from the narrower beam.

    Raises
    ------
    AntennaError
        The pattern would radiate more than it gets.
    """
    co = combine_cuts(azimuth, elevation)
    crossed: AmplitudeFunction = no_cross_polar
    if cross_azimuth is not None and cross_elevation is not None:
        crossed = combine_cuts(cross_azimuth, cross_elevation)
    return finished(
        Pattern(
            name=name,
            kind="file",
            frequency_hz=frequency_hz,
            peak_gain_dbi=gain_dbi,
            co_amplitude=co,
            cross_amplitude=crossed,
            electric_plane=electric_plane,
            size_m=size_m or _size_from_width(azimuth, elevation, frequency_hz),
            efficiency=1.0,
            turns=False,
            source=f"measured cuts; {METHOD}",
        )
    )


def finished(pattern: Pattern) -> Pattern:
    """The pattern with its efficiency (gain over directivity), refused where that is above 1."""
    refuse_surplus(pattern)
    surplus = pattern.peak_gain_dbi - directivity_dbi(pattern)
    return replace(pattern, efficiency=min(10.0 ** (surplus / 10.0), 1.0))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class DenseGrid:
    """Relative gain, dB, shape (elevations, azimuths), on a regular grid that covers -90 to 90 and the full circle."""

    azimuth_deg: NDArray[np.float64]
    elevation_deg: NDArray[np.float64]
    relative_db: NDArray[np.float64]

    def amplitude(self) -> AmplitudeFunction:
        """Amplitude in any direction, bilinear in amplitude, around the circle in azimuth."""
        table = 10.0 ** (self.relative_db / 20.0)
        table = np.concatenate((table, table[:, :1]), axis=1)
        columns, rows = self.azimuth_deg.size, self.elevation_deg.size
        first, low_edge = float(self.azimuth_deg[0]), float(self.elevation_deg[0])

        def at(azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
            around, up = np.broadcast_arrays(np.degrees(azimuth_rad), np.degrees(elevation_rad))
            column = ((around - first) % 360.0) / (360.0 / columns)
            row = (up - low_edge) / (180.0 / (rows - 1))
            # What is not a number takes any cell and stays not a number by its place in it.
            left = np.clip(np.nan_to_num(column), 0, columns - 1).astype(np.intp)
            low = np.clip(np.nan_to_num(row), 0, rows - 2).astype(np.intp)
            x, y = column - left, row - low
            below = table[low, left] * (1.0 - x) + table[low, left + 1] * x
            above = table[low + 1, left] * (1.0 - x) + table[low + 1, left + 1] * x
            return np.asarray(below * (1.0 - y) + above * y)

        return at


def _size_from_width(azimuth: MeasuredCut, elevation: MeasuredCut, frequency_hz: float) -> float:
    width = 360.0
    for data in (azimuth, elevation):
        inside = data.relative_db >= np.max(data.relative_db) - 3.0103
        width = min(width, float(np.sum(inside)) * 360.0 / data.angle_deg.size)
    return wavelength_m(frequency_hz) / math.radians(min(max(width, 0.1), 57.3))
