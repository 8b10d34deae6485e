"""What each antenna of a link gives toward the other end: gain in the true direction, wrong aim, polarisation mismatch.

Asks the pattern and the mounting; knows nothing of losses over the path, verdicts or pages.
"""

from dataclasses import replace
from functools import lru_cache
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.antennas import mounting as hung
from fellspan.antennas.facts import PatternFacts, facts_of
from fellspan.antennas.mounting import Mounting, Mountings
from fellspan.antennas.pattern import Pattern
from fellspan.links.result import AntennaResult, AntennasResult, LinkResult
from fellspan.links.site import Aim, Antenna, Link
from fellspan.vocabulary import Polarization

MOST_DISCRIMINATION_DB: Final = 40.0
"""No antenna on a mast keeps its polarisations further apart than this (common practice, no source)."""
ASSUMED_DISCRIMINATION_DB: Final = 25.0
"""Cross-polar discrimination of an antenna of which only the gain is known, or whose pattern holds no cross-polar level:
real antennas are no better than 20 to 35 dB (common practice, no source)."""
CAUTION_FROM_DB: Final = 1.0
"""Gain lost to aim or polarisation draws a caution from here on (common practice, no source)."""
SAME_ANGLE_DEG: Final = 0.05


@lru_cache(maxsize=256)
def pattern_facts(pattern: Pattern) -> PatternFacts:
    """`facts_of`, kept: many links of a hub ask the same pattern."""
    return facts_of(pattern)


def is_omni(pattern: Pattern | None) -> bool:
    """Whether the gain is the same all around, so that a bearing means nothing."""
    return pattern is not None and pattern_facts(pattern).azimuth.half_power_deg is None


def mounted(antenna: Antenna, *, bearing_deg: float, tilt_deg: float, polarization: Polarization) -> Mounting:
    """The mounting in full; `bearing_deg` and `tilt_deg` are those of the other end, for what is not stated.

    An antenna aimed at the other end points its greatest gain there, so that an electrical downtilt is made up for.
    """
    if isinstance(antenna.mounting, Mounting):
        return antenna.mounting
    many = all_mounted(antenna, bearing_deg=bearing_deg, tilt_deg=tilt_deg, polarization=polarization)
    return Mounting(
        bearing_deg=float(many.bearing_deg),
        tilt_deg=float(many.tilt_deg),
        polarization=many.polarization,
        roll_deg=many.roll_deg,
    )


def all_mounted(
    antenna: Antenna, *, bearing_deg: ArrayLike, tilt_deg: ArrayLike, polarization: Polarization
) -> Mountings:
    """`mounted` for many other ends at once: one antenna as it hangs toward each; arrays of one shape."""
    stated = antenna.mounting or Aim()
    bearing, up = np.broadcast_arrays(np.asarray(bearing_deg, dtype=np.float64), np.asarray(tilt_deg, dtype=np.float64))
    tilt: ArrayLike = 0.0
    if stated.tilt_deg is not None:
        tilt = stated.tilt_deg
    elif stated.bearing_deg is None and not is_omni(antenna.pattern):
        tilt = np.clip(up - _peak_deg(antenna.pattern)[1], -90.0, 90.0)
    return Mountings(
        bearing_deg=bearing if stated.bearing_deg is None else np.full(bearing.shape, stated.bearing_deg),
        tilt_deg=np.broadcast_to(np.asarray(tilt, dtype=np.float64), bearing.shape),
        polarization=stated.polarization or polarization,
        roll_deg=stated.roll_deg,
    )


def antennas_of(link: Link, *, bearings_deg: tuple[float, float], tilts_deg: tuple[float, float]) -> AntennasResult:
    """Both ends' antennas; bearings (true) and tilts (at the median k) are those at A toward B and at B toward A."""
    a, b = (
        _antenna_result(antenna, bearing_deg=bearing, tilt_deg=tilt, polarization=link.radio.polarization)
        for antenna, bearing, tilt in zip((link.antenna_a, link.antenna_b), bearings_deg, tilts_deg, strict=True)
    )
    return AntennasResult(a=a, b=b)


def _antenna_result(
    antenna: Antenna, *, bearing_deg: float, tilt_deg: float, polarization: Polarization
) -> AntennaResult:
    mounting = mounted(antenna, bearing_deg=bearing_deg, tilt_deg=tilt_deg, polarization=polarization)
    pattern = antenna.pattern
    across, up = hung.off_boresight_deg(replace(mounting, roll_deg=0.0), bearing_deg, tilt_deg)
    peak_across, peak_up = _peak_deg(pattern)
    gain, far_field, source = antenna.gain_dbi, None, None
    widths: tuple[float | None, float | None] = (None, None)
    if pattern is not None:
        gain = float(hung.gain_toward_dbi(pattern, mounting, bearing_deg, tilt_deg))
        facts = pattern_facts(pattern)
        widths = facts.azimuth.half_power_deg, facts.elevation.half_power_deg
        if abs(hung.turn_for(pattern, mounting.polarization)) == 90.0:
            widths = widths[1], widths[0]
        far_field, source = pattern.far_field_m, pattern.source
    return AntennaResult(
        name=antenna.name,
        gain_dbi=gain,
        peak_gain_dbi=antenna.peak_gain_dbi,
        bearing_deg=mounting.bearing_deg,
        tilt_deg=mounting.tilt_deg,
        azimuth_off_deg=_tidy(float(across) - peak_across),
        elevation_off_deg=_tidy(float(up) - peak_up),
        polarization=mounting.polarization,
        azimuth_width_deg=widths[0],
        elevation_width_deg=widths[1],
        far_field_m=far_field,
        source=source,
    )


def _peak_deg(pattern: Pattern | None) -> tuple[float, float]:
    """Azimuth and elevation of the greatest gain in the antenna's frame; only patterns that keep their planes have it aside."""
    if pattern is None or pattern.turns:
        return 0.0, 0.0
    facts = pattern_facts(pattern)
    return facts.azimuth.peak_deg, facts.elevation.peak_deg


def _tidy(angle_deg: float) -> float:
    """Without the last bits of the trigonometry."""
    return round(angle_deg, 9) + 0.0


def polarization_loss_db(
    link: Link, *, bearings_deg: tuple[float, float], tilts_deg: tuple[float, float]
) -> float | None:
    """Loss from polarisations that differ, dB; None where nothing is known of either antenna but its gain."""
    ends = link.antenna_a, link.antenna_b
    if all(antenna.pattern is None and antenna.mounting is None for antenna in ends):
        return None
    mountings, discrimination = _ends_discrimination(link, bearings_deg=bearings_deg, tilts_deg=tilts_deg)
    loss = hung.polarization_loss_db(
        hung.field_angle_between_deg(*mountings),
        discrimination_a_db=discrimination[0],
        discrimination_b_db=discrimination[1],
    )
    return max(0.0, float(loss))


def cross_discrimination_db(link: Link, *, bearings_deg: tuple[float, float], tilts_deg: tuple[float, float]) -> float:
    """Cross-polar discrimination of the worse of both antennas toward the other end, dB; assumed where only gain is known."""
    return min(_ends_discrimination(link, bearings_deg=bearings_deg, tilts_deg=tilts_deg)[1])


def _ends_discrimination(
    link: Link, *, bearings_deg: tuple[float, float], tilts_deg: tuple[float, float]
) -> tuple[list[Mounting], list[float]]:
    """Mounting and cross-polar discrimination toward the other end, dB, of A and of B."""
    ends = link.antenna_a, link.antenna_b
    mountings = [
        mounted(antenna, bearing_deg=bearing, tilt_deg=tilt, polarization=link.radio.polarization)
        for antenna, bearing, tilt in zip(ends, bearings_deg, tilts_deg, strict=True)
    ]
    discrimination = [
        _discrimination_db(antenna, mounting, bearing, tilt)
        for antenna, mounting, bearing, tilt in zip(ends, mountings, bearings_deg, tilts_deg, strict=True)
    ]
    return mountings, discrimination


def _discrimination_db(antenna: Antenna, mounting: Mounting, bearing_deg: float, tilt_deg: float) -> float:
    return float(discriminations_db(antenna, mounting, bearing_deg, tilt_deg))


def discriminations_db(
    antenna: Antenna, mounting: Mounting | Mountings, bearing_deg: ArrayLike, tilt_deg: ArrayLike
) -> NDArray[np.float64]:
    """Co-polar over cross-polar gain toward the other end, dB, 0 to `MOST_DISCRIMINATION_DB`; broadcast."""
    if antenna.pattern is None:
        return np.full(np.broadcast(bearing_deg, tilt_deg).shape, ASSUMED_DISCRIMINATION_DB)
    _, below = gains_toward_db(antenna.pattern, mounting, bearing_deg, tilt_deg)
    return np.maximum(below, 0.0)


def gains_toward_db(
    pattern: Pattern, mounting: Mounting | Mountings, bearing_deg: ArrayLike, elevation_deg: ArrayLike
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Co-polar gain, dBi, and how far the cross-polar one lies below it, dB, toward true directions; broadcast.

    At most `MOST_DISCRIMINATION_DB`; `ASSUMED_DISCRIMINATION_DB` of a pattern that was computed or measured without
    cross-polar level, which is no perfect antenna.
    """
    co = np.asarray(hung.gain_toward_dbi(pattern, mounting, bearing_deg, elevation_deg))
    if pattern_facts(pattern).cross_polar_db is None:
        return co, np.full(co.shape, ASSUMED_DISCRIMINATION_DB)
    cross = np.asarray(hung.cross_gain_toward_dbi(pattern, mounting, bearing_deg, elevation_deg))
    return co, np.minimum(co - cross, MOST_DISCRIMINATION_DB)


def antenna_cautions(
    link: Link, antennas: AntennasResult, *, distance_m: float, polarization_db: float | None
) -> list[str]:
    """Doubts about aim, polarisation and nearness, the ends first."""
    found: list[str] = []
    for site, antenna, result in (
        (link.a.name, link.antenna_a, antennas.a),
        (link.b.name, link.antenna_b, antennas.b),
    ):
        if result.gain_dbi is not None and result.peak_gain_dbi is not None:
            lost = result.peak_gain_dbi - result.gain_dbi
            if lost > CAUTION_FROM_DB:
                found.append(
                    f"The antenna of '{site}' ({result.name}) gives {lost:.1f} dB less than its peak toward the other end, "
                    f"which lies {_off_words(antenna, result)}: check its bearing and tilt."
                )
        if result.far_field_m is not None and distance_m < result.far_field_m:
            found.append(
                f"The link is shorter than the far-field distance of the antenna of '{site}', {result.far_field_m:.0f} m: "
                "its gain there is less than stated."
            )
    if polarization_db is not None and polarization_db > CAUTION_FROM_DB:
        found.append(
            f"The antennas do not agree in polarization ({antennas.a.polarization} at '{link.a.name}', "
            f"{antennas.b.polarization} at '{link.b.name}'): {polarization_db:.1f} dB is lost. Turn one of them."
        )
    return found


def _off_words(antenna: Antenna, result: AntennaResult) -> str:
    parts = []
    upright = antenna.pattern is not None and hung.turn_for(antenna.pattern, result.polarization) == 0.0
    # A dipole laid down is no omni any more: its bearing counts.
    if not (is_omni(antenna.pattern) and upright) and abs(result.azimuth_off_deg) >= SAME_ANGLE_DEG:
        parts.append(
            f"{abs(result.azimuth_off_deg):.1f} degrees {'right' if result.azimuth_off_deg > 0 else 'left'} of"
        )
    if abs(result.elevation_off_deg) >= SAME_ANGLE_DEG:
        parts.append(
            f"{abs(result.elevation_off_deg):.1f} degrees {'above' if result.elevation_off_deg > 0 else 'below'}"
        )
    if not parts:
        return "on its boresight, where this pattern has no maximum"
    return f"{' and '.join(parts)} the middle of its beam"


def named_ends(result: LinkResult) -> tuple[tuple[str, AntennaResult], ...]:
    """Letter and antenna of both ends, for views; empty where a result has none."""
    return () if result.antennas is None else (("A", result.antennas.a), ("B", result.antennas.b))
