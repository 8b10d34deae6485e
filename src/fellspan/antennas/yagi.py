"""Yagi-Uda antennas: a design as lengths and places of rods, its pattern from computed currents, and a design helper."""

import math
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.parts import check, no_cross_polar, wavelength_m, with_gain_from_directivity
from fellspan.antennas.pattern import Pattern
from fellspan.antennas.wire_moments import far_field, solve_wires
from fellspan.errors import AntennaError

MODES = 21
"""Modes on each rod; 31 change the gain of the tabled designs by less than 0.07 dB (tests show it)."""

TABLED_RADIUS = 0.00425
"""Rod radius of the tabled designs, wavelengths."""

_DRIVEN = 0.46
_REFLECTOR_SPACING = 0.2

# Boom: (reflector, directors, spacing), wavelengths. NBS Technical Note 688 (Viezbicke, 1976), table 1. Its shortest design is
# printed with a director of 0.424 in some copies and 0.442 in others; 0.442 is where computation finds the most gain.
_TABLED: dict[float, tuple[float, tuple[float, ...], float]] = {
    0.4: (0.482, (0.442,), 0.20),
    0.8: (0.482, (0.428, 0.424, 0.428), 0.20),
    1.2: (0.482, (0.428, 0.420, 0.420, 0.428), 0.25),
    2.2: (0.482, (0.432, 0.415, 0.407, 0.398, 0.390, 0.390, 0.390, 0.390, 0.398, 0.407), 0.20),
    3.2: (0.482, (0.428, 0.420, 0.407, 0.398, 0.394, 0.390, *(0.386,) * 9), 0.20),
    4.2: (0.475, (0.424, 0.424, 0.420, 0.407, 0.403, 0.398, 0.394, *(0.390,) * 6), 0.308),
}


@dataclass(frozen=True, slots=True, kw_only=True)
class YagiDesign:
    """Rods of a Yagi-Uda antenna from the back: reflector, driven element, directors; all in metres.

    `place_m` is measured along the boom from the reflector and rises; `length_m` are full lengths, tip to tip.
    """

    frequency_hz: float
    place_m: tuple[float, ...]
    length_m: tuple[float, ...]
    rod_diameter_m: float
    driven: int = 1

    def __post_init__(self) -> None:
        if len(self.place_m) != len(self.length_m) or len(self.place_m) < 2:
            raise AntennaError(
                f"Yagi with {len(self.place_m)} places and {len(self.length_m)} lengths",
                "give one place and one length for each rod, two rods at least",
            )
        if any(after <= before for before, after in zip(self.place_m, self.place_m[1:], strict=False)):
            raise AntennaError("Yagi rods must stand in rising order along the boom, no two at one place")
        if not 0 <= self.driven < len(self.place_m):
            raise AntennaError(f"Yagi's driven rod {self.driven} is not one of its {len(self.place_m)} rods")
        wavelength = wavelength_m(self.frequency_hz)
        for length in self.length_m:
            check("rod length", length / wavelength, 0.1, 0.9, "wavelengths")
        check("rod diameter", self.rod_diameter_m / wavelength, 1e-4, 0.03, "wavelengths")

    @property
    def boom_m(self) -> float:
        """Length from the first to the last rod, m."""
        return self.place_m[-1] - self.place_m[0]


def propose_yagi(*, frequency_hz: float, boom_m: float, rod_diameter_m: float | None = None) -> YagiDesign:
    """A design for a boom length: that of the longest tabled boom that fits, scaled to the rod diameter.

    Parameters
    ----------
    frequency_hz
        Hz.
    boom_m
        Longest boom allowed, m; at least 0.4 wavelengths.
    rod_diameter_m
        Rod diameter, m; None takes 0.0085 wavelengths.

    Raises
    ------
    AntennaError
        The boom is shorter than the shortest design.

    Notes
    -----
    NBS Technical Note 688, table 1, boom of non-conducting material. For other diameters the rods are shortened by
    0.048 (directors) and 0.010 (reflector) wavelengths for each tenfold thicker rod: a fit of the note's curves.
    """
    wavelength = wavelength_m(frequency_hz)
    boom = boom_m / wavelength
    fitting = [length for length in _TABLED if length <= boom + 1e-6]
    if not fitting:
        raise AntennaError(
            f"a boom of {boom_m:.3f} m is {boom:.2f} wavelengths; the shortest design needs 0.4 ({0.4 * wavelength:.3f} m)",
            "give a longer boom, or take a dipole",
        )
    reflector, directors, spacing = _TABLED[max(fitting)]
    diameter = 2.0 * TABLED_RADIUS * wavelength if rod_diameter_m is None else rod_diameter_m
    check("rod diameter", diameter / wavelength, 5e-4, 0.03, "wavelengths")
    thicker = math.log10(diameter / wavelength / (2.0 * TABLED_RADIUS))
    lengths = (
        reflector - 0.010 * thicker,
        _DRIVEN,
        *(director - 0.048 * thicker for director in directors),
    )
    places = (0.0, *(_REFLECTOR_SPACING + spacing * step for step in range(len(directors) + 1)))
    return YagiDesign(
        frequency_hz=frequency_hz,
        place_m=tuple(place * wavelength for place in places),
        length_m=tuple(length * wavelength for length in lengths),
        rod_diameter_m=diameter,
    )


def yagi(
    design: YagiDesign, *, frequency_hz: float | None = None, efficiency: float = 0.95, name: str | None = None
) -> Pattern:
    """Pattern of a Yagi-Uda antenna with upright rods, from currents by the moment method.

    Parameters
    ----------
    design
        Rods, m.
    frequency_hz
        Where to evaluate it, Hz; None takes the design frequency. Off the design frequency the pattern changes as real
        ones do.
    efficiency
        Gain over directivity, above 0 to 1 (rod and balun losses).

    Notes
    -----
    Within 0.5 dB of the gains that NBS Technical Note 688 measured for its six designs.
    """
    check("efficiency", efficiency, 1e-3, 1.0, "")
    frequency = design.frequency_hz if frequency_hz is None else frequency_hz
    field = _solved(replace(design, frequency_hz=frequency), MODES)
    return with_gain_from_directivity(
        Pattern(
            name=name or f"Yagi, {len(design.place_m)} elements",
            kind="yagi",
            frequency_hz=frequency,
            peak_gain_dbi=0.0,
            co_amplitude=field,
            cross_amplitude=no_cross_polar,
            size_m=max(design.boom_m, *design.length_m),
            efficiency=efficiency,
            polarizations=("vertical", "horizontal", "slant+45", "slant-45"),
            source="moment method, piecewise-sinusoidal modes; designs of NBS Technical Note 688",
        )
    )


class _Field:
    """The field of solved rods relative to its maximum, as a function of direction."""

    def __init__(self, design: YagiDesign, modes: int) -> None:
        wavelength = wavelength_m(design.frequency_hz)
        self._currents = solve_wires(
            place=np.array(design.place_m) / wavelength,
            length=np.array(design.length_m) / wavelength,
            radius=0.5 * design.rod_diameter_m / wavelength,
            driven=design.driven,
            modes=modes,
        )
        # Parallel rods: the maximum stands in the horizontal plane or the vertical one through the boom.
        angle = np.radians(np.linspace(-180.0, 180.0, 7201))
        flat = far_field(self._currents, angle, np.zeros_like(angle))
        steep = far_field(self._currents, np.zeros_like(angle), 0.5 * angle)
        self._top = float(max(np.max(flat), np.max(steep)))
        self.input_impedance_ohm = self._currents.input_impedance_ohm

    def __call__(self, azimuth_rad: NDArray[np.float64], elevation_rad: NDArray[np.float64]) -> NDArray[np.float64]:
        return far_field(self._currents, azimuth_rad, elevation_rad) / self._top


@lru_cache(maxsize=32)
def _solved(design: YagiDesign, modes: int) -> _Field:
    return _Field(design, modes)


def input_impedance_ohm(design: YagiDesign) -> complex:
    """Input impedance at the centre of the driven rod, ohm, at the design frequency (without matching)."""
    return _solved(design, MODES).input_impedance_ohm


def gain_change_with_modes_db(design: YagiDesign, *, modes: int = 31) -> float:
    """Change of directivity, dB, when the currents are found with more modes: how far the solution has converged."""
    coarse = yagi(design, efficiency=1.0)
    fine = with_gain_from_directivity(replace(coarse, co_amplitude=_solved(design, modes)))
    return fine.peak_gain_dbi - coarse.peak_gain_dbi
