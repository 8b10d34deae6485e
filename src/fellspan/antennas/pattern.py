"""Pattern: the gain of one antenna over the whole sphere at one frequency.

The frame is the antenna's own: boresight at azimuth 0 and elevation 0, azimuth positive to the right seen from behind the
antenna (clockwise from above), elevation positive upward. Where the antenna points and how it is turned about its
boresight is the business of `mounting`.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.vocabulary import MountedPolarization

AmplitudeFunction = Callable[[NDArray[np.float64], NDArray[np.float64]], NDArray[np.float64]]
"""(azimuth_rad, elevation_rad), broadcast together -> field amplitude relative to the co-polar peak, >= 0."""

Plane = Literal["vertical", "horizontal"]

SMALLEST_AMPLITUDE = 1e-10
"""Amplitudes are floored here, 200 dB below the peak, so that a null is a finite number of decibels."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Pattern:
    """Gain over the sphere at one frequency.

    Parameters
    ----------
    name, kind
        For people: 'dish 0.6 m', and the family: 'dish', 'yagi', 'omni', 'panel', 'patch', 'dipole', 'file', 'envelope' ...
    frequency_hz
        Where it holds, Hz.
    peak_gain_dbi
        Co-polar gain at the maximum, dBi.
    co_amplitude, cross_amplitude
        Field amplitude relative to the co-polar peak; pure functions of arrays of radians.
    electric_plane
        Which plane of this frame holds the E cut; the other one holds the H cut.
    size_m
        Largest dimension of the radiating part, m; for the far-field distance.
    efficiency
        Gain over directivity, 0 to 1; None for an envelope, which is a limit and no pattern.
    turns
        True where a quarter turn about the boresight changes the polarisation and swaps the planes (dish, Yagi, patch);
        False where the planes stay as they are whatever the polarisation (sector and omni data).
    polarizations
        How it may be mounted; None for any way. A collinear omni of upright rods is vertical and nothing else.
    source
        Where its shape comes from, in words.
    notes
        What a person must know about it.
    """

    name: str
    kind: str
    frequency_hz: float
    peak_gain_dbi: float
    co_amplitude: AmplitudeFunction
    cross_amplitude: AmplitudeFunction
    electric_plane: Plane = "vertical"
    size_m: float
    efficiency: float | None
    turns: bool = True
    polarizations: tuple[MountedPolarization, ...] | None = None
    source: str
    notes: tuple[str, ...] = ()

    @property
    def is_envelope(self) -> bool:
        """True for a mask that real antennas stay under: it holds no energy balance."""
        return self.efficiency is None

    @property
    def far_field_m(self) -> float:
        """Far-field distance 2 D^2 / lambda, m (common antenna practice; IEEE Std 145 definition)."""
        return 2.0 * self.size_m**2 * self.frequency_hz / 299_792_458.0

    def gain_dbi(self, azimuth_deg: ArrayLike, elevation_deg: ArrayLike) -> NDArray[np.float64] | float:
        """Co-polar gain, dBi, toward directions off boresight, degrees: azimuth any turn, elevation -90 to 90.

        Arrays broadcast together; scalar in, float out; NaN in, NaN out.
        """
        return self._gain(self.co_amplitude, azimuth_deg, elevation_deg)

    def cross_gain_dbi(self, azimuth_deg: ArrayLike, elevation_deg: ArrayLike) -> NDArray[np.float64] | float:
        """Cross-polar gain, dBi, toward directions off boresight, degrees."""
        return self._gain(self.cross_amplitude, azimuth_deg, elevation_deg)

    def _gain(
        self, amplitude: AmplitudeFunction, azimuth_deg: ArrayLike, elevation_deg: ArrayLike
    ) -> NDArray[np.float64] | float:
        azimuth, elevation = np.broadcast_arrays(
            np.radians(np.asarray(azimuth_deg, dtype=np.float64)),
            np.radians(np.asarray(elevation_deg, dtype=np.float64)),
        )
        with np.errstate(invalid="ignore"):
            relative = np.maximum(amplitude(azimuth, elevation), SMALLEST_AMPLITUDE)
        gain: NDArray[np.float64] = self.peak_gain_dbi + 20.0 * np.log10(relative)
        return float(gain) if gain.ndim == 0 else gain
