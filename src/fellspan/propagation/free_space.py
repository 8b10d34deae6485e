"""Wavelength and free-space loss; knows nothing of terrain or the atmosphere."""

import numpy as np
from numpy.typing import ArrayLike

from fellspan.propagation._arrays import Result, as_floats, as_result, positive, quiet
from fellspan.propagation.constants import SPEED_OF_LIGHT_M_S


def wavelength_m(frequency_hz: ArrayLike) -> Result:
    """Wavelength in vacuum.

    Parameters
    ----------
    frequency_hz
        Frequency, Hz.

    Returns
    -------
    wavelength_m
        Same shape as `frequency_hz`; NaN where that is not above zero.

    Notes
    -----
    c = 299 792 458 m/s. All formulas of this room know the frequency only through this function.
    """
    with quiet():
        return as_result(SPEED_OF_LIGHT_M_S / positive(frequency_hz))


def free_space_loss_db(distance_m: ArrayLike, *, frequency_hz: ArrayLike) -> Result:
    """Basic transmission loss between isotropic antennas in free space.

    Parameters
    ----------
    distance_m
        Distance between the antennas, m, along the ray.
    frequency_hz
        Frequency, Hz; broadcasts against `distance_m`.

    Returns
    -------
    loss_db
        dB, broadcast shape; NaN where distance or frequency is not above zero.

    Notes
    -----
    Rec. ITU-R P.525, 20 log10(4 pi d / wavelength), exact: no rounded 32.4 or 92.45. Holds in the far field of both
    antennas only; nearer than that the value is still returned. Source key: p525-free-space.
    """
    with quiet():
        return as_result(20.0 * np.log10(4.0 * np.pi * positive(distance_m) / as_floats(wavelength_m(frequency_hz))))
