"""Numbers of a result as short phrases for people; rounded toward caution, so that a shortfall never reads too small."""

import math

from fellspan.links import words
from fellspan.links.result import CriterionResult, ExtraHeight


def up(value_m: float) -> str:
    """Metres to one decimal, rounded up: for what is missing."""
    return f"{words.up_m(value_m):.1f} m"


def down(value_m: float) -> str:
    """Metres to one decimal, rounded down: for what there is."""
    return f"{words.down_m(value_m):.1f} m"


def distance(value_m: float) -> str:
    """A distance along a path."""
    return f"{value_m:.0f} m" if value_m < 1000 else f"{value_m / 1000:.2f} km"


def frequency(value_hz: float) -> str:
    """A frequency in the unit that people use for it."""
    for scale, unit in ((1e9, "GHz"), (1e6, "MHz"), (1e3, "kHz")):
        if value_hz >= scale:
            return f"{value_hz / scale:.6g} {unit}"
    return f"{value_hz:.6g} Hz"


def earth_factor(k: float | None) -> str:
    """k as people write it; None is a flat Earth, which JSON has no number for."""
    return "infinite" if k is None or math.isinf(k) else f"{k:.2f}"


def position(latitude_deg: float, longitude_deg: float) -> str:
    """Latitude and longitude to about a metre."""
    north = f"{abs(latitude_deg):.5f} {'S' if latitude_deg < 0 else 'N'}"
    return f"{north}, {abs(longitude_deg):.5f} {'W' if longitude_deg < 0 else 'E'}"


def percent(value: float) -> str:
    """A probability in per cent, rounded down; near the ends it says so, for heights are never that certain."""
    if value > 0.999:
        return ">99.9 %"
    return "<0.1 %" if value < 0.001 else f"{math.floor(value * 1000 + 1e-6) / 10:g} %"


def zone_part(fraction: float) -> str:
    """A part of the first Fresnel zone; hundredths where they can matter."""
    return f"{words.zone_share(fraction):.2f}" if abs(fraction) < 100 else f"{fraction:.0f}"


def by_how_much(criterion: CriterionResult) -> str:
    """The greatest height missing, else what is to spare at the governing point."""
    if not criterion.met:
        return f"{up(criterion.shortfall_m)} short"
    return f"{down(max(criterion.clearance_m - criterion.required_m, 0.0))} to spare"


def extra_height(extra: ExtraHeight) -> str:
    """Which height clears a criterion; an end that cannot do it alone, or only with a tower, is said so."""
    both = words.to_build(extra.both)
    each = " each" if both.endswith(" m") else ""
    return f"A alone {words.to_build(extra.a)}, B alone {words.to_build(extra.b)}, or both {both}{each}"


def decibels(value: float | None, unit: str = "dB") -> str:
    """A margin, or a level in dBm, rounded down as everywhere; a dash where it was not computed."""
    return "-" if value is None else f"{words.down_db(value):.1f} {unit}".rstrip()


def bearing(true_deg: float, magnetic_deg: float | None) -> str:
    """A bearing to aim by, the magnetic one beside it."""
    magnetic = "magnetic unknown" if magnetic_deg is None else f"{_compass(magnetic_deg)} deg magnetic"
    return f"{_compass(true_deg)} deg true, {magnetic}"


def _compass(bearing_deg: float) -> str:
    """Three digits before the point; 359.96 is north, not 360.0."""
    return f"{round(bearing_deg, 1) % 360.0:05.1f}"


def tilt(value_deg: float) -> str:
    """A tilt in words as well as with its sign."""
    return "level" if abs(value_deg) < 0.005 else f"{abs(value_deg):.2f} deg {'up' if value_deg > 0 else 'down'}"
