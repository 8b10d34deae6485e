"""Moment method for parallel thin wires: currents as piecewise-sinusoidal modes, impedances by induced EMF.

All lengths in wavelengths. Wires stand upright (along z), each centred at z = 0 and x along the boom.
"""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(24)
_TURN = 2.0 * math.pi


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class WireCurrents:
    """Mode currents on parallel wires.

    `current` has shape (wires, modes), A for 1 V at the feed; `mode_length` (wires,) is half the span of a mode, in
    wavelengths; `place` (wires,) is x along the boom and `height` (wires, modes) the z of the mode centres.
    """

    current: NDArray[np.complex128]
    mode_length: NDArray[np.float64]
    place: NDArray[np.float64]
    height: NDArray[np.float64]
    input_impedance_ohm: complex


def solve_wires(
    *,
    place: NDArray[np.float64],
    length: NDArray[np.float64],
    radius: float,
    driven: int,
    modes: int = 15,
) -> WireCurrents:
    """Currents of parallel wires when one of them is fed at its centre with 1 V.

    Parameters
    ----------
    place, length
        Shape (wires,): position along the boom and full length, wavelengths.
    radius
        Wire radius, wavelengths; thin wire, up to about 0.01.
    driven
        Index of the fed wire.
    modes
        Modes on each wire, odd.

    Returns
    -------
    currents
        Solution of Z I = V.

    Notes
    -----
    Galerkin's method with piecewise-sinusoidal modes; the field of a mode is that of a sinusoidal current on a thin
    wire, closed form in antenna textbooks (induced-EMF method), the reaction on another mode by 24-point Gauss quadrature.
    """
    wires = place.size
    span = length / (modes + 1)
    height = span[:, None] * (np.arange(modes) - (modes - 1) / 2.0)
    matrix = np.empty((wires, modes, wires, modes), dtype=np.complex128)
    for source in range(wires):
        for other in range(source, wires):
            apart = abs(place[source] - place[other]) if source != other else radius
            block = _reaction(height[source], span[source], height[other], span[other], apart)
            matrix[source, :, other, :] = block
            matrix[other, :, source, :] = block.T
    voltage = np.zeros((wires, modes), dtype=np.complex128)
    voltage[driven, modes // 2] = 1.0
    solution = np.linalg.solve(matrix.reshape(wires * modes, wires * modes), voltage.ravel())
    current = np.asarray(solution.reshape(wires, modes), dtype=np.complex128)
    return WireCurrents(
        current=current,
        mode_length=span,
        place=place,
        height=height,
        input_impedance_ohm=complex(1.0 / current[driven, modes // 2]),
    )


def _reaction(
    source_z: NDArray[np.float64], source_span: float, other_z: NDArray[np.float64], other_span: float, apart: float
) -> NDArray[np.complex128]:
    """Mutual impedances (source modes, other modes), ohm, of modes on two wires `apart` wavelengths from each other."""
    # Each half of the weighing mode has its own quadrature: the sine has a kink in the middle.
    half = 0.5 * other_span * (_NODES + 1.0)
    offsets = np.concatenate((-half[::-1], half))
    shape = np.sin(_TURN * (other_span - np.abs(offsets))) * 0.5 * other_span
    weight = shape * np.concatenate((_WEIGHTS[::-1], _WEIGHTS))
    z = other_z[None, :, None] + offsets - source_z[:, None, None]
    ends = _wave(z - source_span, apart) + _wave(z + source_span, apart)
    field = ends - 2.0 * math.cos(_TURN * source_span) * _wave(z, apart)
    scale = math.sin(_TURN * source_span) * math.sin(_TURN * other_span)
    return np.asarray(30j * (field @ weight) / scale, dtype=np.complex128)


def _wave(z: NDArray[np.float64], apart: float) -> NDArray[np.complex128]:
    reach = np.sqrt(z * z + apart * apart)
    return np.asarray(np.exp(-1j * _TURN * reach) / reach, dtype=np.complex128)


def far_field(
    currents: WireCurrents, azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Magnitude of the far field toward directions (boom along azimuth 0), arbitrary scale; arrays broadcast."""
    # Not broadcast before they must be: what depends on the elevation alone is worked out once a row of a grid.
    up, flat = np.sin(elevation_rad), np.cos(elevation_rad)
    ahead = flat * np.cos(azimuth_rad)
    total = np.zeros(ahead.shape, dtype=np.complex128)
    safe = np.maximum(np.abs(flat), 1e-9)
    middle = currents.height.shape[1] // 2
    # A wire's modes are symmetric about its centre: the sum over heights is a real cosine series in `up`.
    for wire in range(currents.place.size):
        span = float(currents.mode_length[wire])
        element = (np.cos(_TURN * span * up) - math.cos(_TURN * span)) / (safe * math.sin(_TURN * span))
        series = np.full(up.shape, currents.current[wire, middle], dtype=np.complex128)
        for mode in range(middle):
            z = float(currents.height[wire, mode])
            series = series + 2.0 * currents.current[wire, mode] * np.cos(_TURN * z * up)
        total += element * series * np.exp(1j * _TURN * float(currents.place[wire]) * ahead)
    magnitude: NDArray[np.float64] = np.where(np.abs(flat) > 1e-9, np.abs(total), 0.0)
    # A direction that is not a number in either angle has no field.
    return np.where(np.isnan(flat + ahead), np.nan, magnitude)
