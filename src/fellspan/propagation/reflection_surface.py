"""What water and ground do to a wave that meets them: permittivity of kinds of surface, and the reflection coefficient.

Complex permittivities have a negative imaginary part (time goes as exp(+j w t)). Knows no geometry of paths.
"""

from typing import Any, Final, Literal, get_args

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.errors import QuantityError
from fellspan.propagation._arrays import FloatArray, as_floats, is_vertical, positive, quiet

ReflectingSurface = Literal["sea water", "fresh water", "wet ground", "medium dry ground", "very dry ground"]
REFLECTING_SURFACES: Final[tuple[ReflectingSurface, ...]] = get_args(ReflectingSurface)

_CONDUCTED: Final = 17.975
"""1 / (2 pi eps0) in GHz m/S: sigma / f becomes a permittivity; P.530 prints 18."""
_FROM_GHZ: Final = 1.0
_LOW: Final[dict[ReflectingSurface, tuple[float, float]]] = {
    "sea water": (70.0, 5.0),
    "fresh water": (80.0, 0.003),
    "wet ground": (30.0, 0.01),
    "medium dry ground": (15.0, 0.001),
    "very dry ground": (3.0, 1e-4),
}
"""Relative permittivity and conductivity, S/m, below about 1 GHz."""
_HIGH: Final[dict[ReflectingSurface, tuple[float, float, float, float]]] = {
    "wet ground": (30.0, -0.4, 0.15, 1.30),
    "medium dry ground": (15.0, -0.1, 0.035, 1.63),
    "very dry ground": (3.0, 0.0, 0.00015, 2.52),
}
"""a, b, c, d of eps_r = a f^b and sigma = c f^d, f in GHz, 1 to 10 GHz."""


def ground_permittivity(surface: ReflectingSurface, *, frequency_hz: ArrayLike) -> Any:
    """Complex relative permittivity of a kind of surface, negative imaginary part; complex, or an array of complex.

    Parameters
    ----------
    surface
        One of `REFLECTING_SURFACES`; water at 20 degrees Celsius.
    frequency_hz
        Hz, > 0. Below 1 GHz the constants of P.527; from 1 GHz ground after P.2040 (published to 10 GHz), water by its two
        relaxations, sea water with a conductivity of 5 S/m beside them (an approximation).

    Notes
    -----
    Rec. ITU-R P.527 and P.2040-3 by way of independent programs; the texts were not read.
    Source keys: p527-ground, p527-6-water, p2040-3-ground.
    """
    if surface not in REFLECTING_SURFACES:
        raise QuantityError(f"surface is {surface!r}", f"it must be one of: {', '.join(REFLECTING_SURFACES)}")
    f = positive(frequency_hz) / 1e9
    real, siemens = _LOW[surface]
    with quiet():
        low = real - 1j * _CONDUCTED * siemens / f
        if surface in _HIGH:
            a, b, c, d = _HIGH[surface]
            high = a * f**b - 1j * _CONDUCTED * c * f ** (d - 1.0)
        else:
            high = water_permittivity(frequency_hz) - 1j * _CONDUCTED * siemens / f
        return _plain(np.where(f < _FROM_GHZ, low, high))


def water_permittivity(frequency_hz: ArrayLike, *, temperature_k: ArrayLike = 293.15) -> Any:
    """Complex relative permittivity of pure water: the two relaxations of Rec. ITU-R P.527-6.

    Taken from independent programs; the text was not read. Source key: p527-6-water.
    """
    f = positive(frequency_hz) / 1e9
    theta = 300.0 / positive(temperature_k) - 1.0
    static = 77.66 + 103.3 * theta
    middle, high = 0.0671 * static, 3.52 - 7.52 * theta
    first = 20.2 - 146.4 * theta + 316.0 * theta**2
    return _plain((static - middle) / (1.0 + 1j * f / first) + (middle - high) / (1.0 + 1j * f / (39.8 * first)) + high)


def complex_permittivity(relative: ArrayLike, *, conductivity_s_m: ArrayLike, frequency_hz: ArrayLike) -> Any:
    """eps_r - j sigma / (2 pi f eps0). Rec. ITU-R P.530-19, equations (127) to (131). Source key: p530-19-reflection."""
    return _plain(as_floats(relative) - 1j * _CONDUCTED * as_floats(conductivity_s_m) / (positive(frequency_hz) / 1e9))


def reflection_coefficient(grazing_rad: ArrayLike, *, permittivity: Any, polarization: ArrayLike) -> Any:
    """Complex reflection coefficient of a smooth surface; -1 at grazing incidence. Complex, or an array of complex.

    Parameters
    ----------
    grazing_rad
        Angle between ray and surface, radians, 0 to pi/2.
    permittivity
        Complex relative permittivity, from `ground_permittivity` or `complex_permittivity`.
    polarization
        'horizontal' or 'vertical', against the surface.

    Notes
    -----
    Rec. ITU-R P.530-19, section 6.1.2, equations (127) to (131). Source key: p530-19-reflection.
    """
    angle: FloatArray = as_floats(grazing_rad)
    eta = np.asarray(permittivity, dtype=np.complex128)
    with quiet():
        inner = eta - np.cos(angle) ** 2
        root = np.sqrt(np.where(is_vertical(polarization), inner / eta**2, inner))
        return _plain((np.sin(angle) - root) / (np.sin(angle) + root))


def _plain(value: Any) -> Any:
    array: NDArray[np.complex128] = np.asarray(value, dtype=np.complex128)
    return complex(array) if array.ndim == 0 else array
