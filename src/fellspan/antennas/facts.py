"""What a person asks of an antenna: beamwidths, side lobes, front-to-back, read off the pattern's two cuts."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.pattern import Pattern, Plane

HALF_POWER_DB = 10.0 * math.log10(2.0)

SIDE_LOBE_RISE_DB = 1.0
"""What stands less than this above the valley before it is a ripple of measured data and no side lobe."""

SHEER_DB = 10.0
"""A fall of this much below half power from one sample to the next is the edge of a ground plane, not a beam's flank."""

BACK_CONE_DEG = 30.0
"""Front-to-back ratio counts the highest level within this angle of straight behind (common practice, no source)."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Cut:
    """One plane of a pattern: angle from boresight, degrees, -180 to 180, and gains, dBi; arrays of shape (n,), read-only."""

    plane: Plane
    angle_deg: NDArray[np.float64]
    gain_dbi: NDArray[np.float64]
    cross_gain_dbi: NDArray[np.float64]

    def __post_init__(self) -> None:
        for array in (self.angle_deg, self.gain_dbi, self.cross_gain_dbi):
            array.flags.writeable = False


@dataclass(frozen=True, slots=True, kw_only=True)
class CutFacts:
    """Facts of one cut; None where there is none (an omni's azimuth cut has no half-power width).

    `side_lobe_db` is the first side lobe relative to the peak, at `side_lobe_deg` from it, the higher one of both sides;
    `half_power_from_deg` and `half_power_to_deg` are where the main lobe falls 3.01 dB below its maximum. A beam that a
    ground plane cuts off before it has fallen so far has no half-power width.
    """

    peak_deg: float
    half_power_deg: float | None
    half_power_from_deg: float | None
    half_power_to_deg: float | None
    side_lobe_db: float | None
    side_lobe_deg: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class PatternFacts:
    """Facts of a pattern; `electric` and `magnetic` are the E and H cuts, `azimuth` and `elevation` the same two by plane."""

    peak_gain_dbi: float
    electric: CutFacts
    magnetic: CutFacts
    azimuth: CutFacts
    elevation: CutFacts
    front_to_back_db: float | None
    """Peak over the highest level behind; None where there is no front (an omni), or nothing behind (over 100 dB)."""
    cross_polar_db: float | None
    """Co-polar peak over cross-polar level in the same direction, dB; None where there is none to speak of (over 100 dB)."""
    far_field_m: float


def cut(pattern: Pattern, plane: Plane, *, step_deg: float | None = None) -> Cut:
    """The pattern along one plane through the boresight, -180 to 180 degrees.

    In the vertical plane, angles beyond +-90 degrees run over the top to the back: positive is up all the way.
    """
    step = _fine_step_deg(pattern) if step_deg is None else step_deg
    half = math.ceil(180.0 / step)
    angle = np.asarray(np.arange(-half, half + 1) * (180.0 / half), dtype=np.float64)
    if plane == "horizontal":
        azimuth, elevation = angle, np.zeros_like(angle)
    else:
        behind = np.abs(angle) > 90.0
        azimuth = np.where(behind, 180.0, 0.0)
        elevation = np.where(behind, np.sign(angle) * 180.0 - angle, angle)
    return Cut(
        plane=plane,
        angle_deg=angle,
        gain_dbi=np.asarray(pattern.gain_dbi(azimuth, elevation)),
        cross_gain_dbi=np.asarray(pattern.cross_gain_dbi(azimuth, elevation)),
    )


def facts_of(pattern: Pattern) -> PatternFacts:
    """Read the facts off both cuts, sampled at a fortieth of the beam scale (wavelength over size) or finer."""
    horizontal, vertical = cut(pattern, "horizontal"), cut(pattern, "vertical")
    azimuth, elevation = cut_facts(horizontal), cut_facts(vertical)
    back = max(_highest_behind(horizontal), _highest_behind(vertical))
    peak = float(np.max(horizontal.gain_dbi)), float(np.max(vertical.gain_dbi))
    ratio = max(peak) - back
    # A beam with electrical downtilt has its middle off the boresight, and its data sheet's discrimination there.
    best, middle = (vertical, elevation) if peak[1] >= peak[0] else (horizontal, azimuth)
    cross = max(peak) - float(np.interp(middle.peak_deg, best.angle_deg, best.cross_gain_dbi))
    upright = pattern.electric_plane == "vertical"
    return PatternFacts(
        peak_gain_dbi=pattern.peak_gain_dbi,
        electric=elevation if upright else azimuth,
        magnetic=azimuth if upright else elevation,
        azimuth=azimuth,
        elevation=elevation,
        front_to_back_db=ratio if HALF_POWER_DB < ratio < 100.0 else None,
        cross_polar_db=cross if cross < 100.0 else None,
        far_field_m=pattern.far_field_m,
    )


def cut_facts(data: Cut) -> CutFacts:
    """Half-power width and first side lobe of one cut, crossings interpolated in amplitude."""
    angle, gain = data.angle_deg, data.gain_dbi
    top = int(np.argmax(gain))
    # The maximum nearest the boresight: an omni's flat cut, or a dipole's two lobes, must not move it aside.
    level = np.flatnonzero(gain >= gain[top] - 1e-6)
    top = int(level[np.argmin(np.abs(angle[level]))])
    left, right = _crossing(angle, gain, top, -1), _crossing(angle, gain, top, 1)
    lobe_db, lobe_deg = _first_side_lobe(angle, gain, top)
    return CutFacts(
        peak_deg=float(angle[top]) + 0.0,
        half_power_deg=None if left is None or right is None else right - left,
        half_power_from_deg=left,
        half_power_to_deg=right,
        side_lobe_db=lobe_db,
        side_lobe_deg=lobe_deg,
    )


def _fine_step_deg(pattern: Pattern) -> float:
    beam = math.degrees(299_792_458.0 / (pattern.frequency_hz * max(pattern.size_m, 1e-6)))
    return min(0.25, max(beam / 40.0, 0.002))


def _crossing(angle: NDArray[np.float64], gain: NDArray[np.float64], top: int, side: int) -> float | None:
    run = gain[top::side]
    below = np.flatnonzero(run < gain[top] - HALF_POWER_DB)
    if below.size == 0:
        return None
    after = top + side * int(below[0])
    before = after - side
    if gain[after] < gain[top] - HALF_POWER_DB - SHEER_DB:
        return None
    low, high = 10.0 ** (gain[after] / 20.0), 10.0 ** (gain[before] / 20.0)
    wanted = 10.0 ** (gain[top] / 20.0) / math.sqrt(2.0)
    return float(angle[before] + (angle[after] - angle[before]) * (high - wanted) / (high - low))


def _first_side_lobe(
    angle: NDArray[np.float64], gain: NDArray[np.float64], top: int
) -> tuple[float | None, float | None]:
    found: list[tuple[float, float]] = []
    for side in (1, -1):
        # Past straight behind the cut goes on at its other end: a lobe there belongs to the other side.
        run, at = gain[top::side], angle[top::side]
        left = np.flatnonzero(run < gain[top] - HALF_POWER_DB)
        if left.size == 0:
            continue
        run, at = run[left[0] :], at[left[0] :]
        risen = np.flatnonzero(run > np.minimum.accumulate(run) + SIDE_LOBE_RISE_DB)
        if risen.size == 0:
            continue
        run, at = run[risen[0] :], at[risen[0] :]
        fallen = np.flatnonzero(run < np.maximum.accumulate(run) - SIDE_LOBE_RISE_DB)
        lobe = int(np.argmax(run[: fallen[0]] if fallen.size else run))
        found.append((float(run[lobe] - gain[top]), float(abs(at[lobe] - angle[top]))))
    return max(found) if found else (None, None)


def _highest_behind(data: Cut) -> float:
    return float(np.max(data.gain_dbi[np.abs(data.angle_deg) >= 180.0 - BACK_CONE_DEG]))
