"""Quantities that a study file alone holds: channel widths, data rates, delays, rain, air; text with a unit to SI.

Which key holds which of them is the schema's business. What else has a unit is in `quantities`.
"""

import math
import re
from collections.abc import Mapping
from typing import Final

from fellspan.errors import QuantityError

_MEASURE: Final = re.compile(r"([+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)\s*(\S.*)?")

_WIDTH_HZ: Final = {"Hz": 1.0, "kHz": 1e3, "MHz": 1e6, "GHz": 1e9}
_RATE_BPS: Final = {"bit/s": 1.0, "kbit/s": 1e3, "Mbit/s": 1e6, "Gbit/s": 1e9, "kbps": 1e3, "Mbps": 1e6, "Gbps": 1e9}
_DELAY_S: Final = {"ns": 1e-9, "us": 1e-6}
_RAIN_MM_H: Final = {"mm/h": 1.0, "in/h": 25.4}
_PRESSURE_HPA: Final = {"hPa": 1.0, "mbar": 1.0, "kPa": 10.0}
_VAPOUR_G_M3: Final = {"g/m3": 1.0, "g/m^3": 1.0}
_TEMPERATURE: Final = {"C": 1.0, "degC": 1.0, "°C": 1.0, "F": 1.0, "degF": 1.0, "°F": 1.0, "K": 1.0}
_PER_100_M_DB: Final = {"dB per 100 m": 1.0, "dB/100 m": 1.0, "dB/100m": 1.0, "dB per 100 ft": 100.0 / 30.48}


def parse_width_hz(text: str) -> float:
    """'40 MHz', '250 kHz' to Hz; 1 kHz to 10 GHz."""
    return _measure(text, _WIDTH_HZ, name="width", example="40 MHz", low=1e3, high=1e10, allowed="1 kHz to 10 GHz")


def parse_rate_bps(text: str) -> float:
    """'150 Mbit/s' to bit/s; up to 1000 Gbit/s."""
    return _measure(text, _RATE_BPS, name="rate", example="150 Mbit/s", low=0.0, high=1e12, allowed="0 to 1000 Gbit/s")


def parse_delay_s(text: str) -> float:
    """'6.3 ns' to s; above 0 to 1 us."""
    return _measure(text, _DELAY_S, name="delay", example="6.3 ns", low=1e-12, high=1e-6, allowed="0.001 ns to 1 us")


def parse_rain_rate_mm_h(text: str) -> float:
    """'30 mm/h' to mm/h; 0 to 400 mm/h."""
    return _measure(text, _RAIN_MM_H, name="rain rate", example="30 mm/h", low=0.0, high=400.0, allowed="0 to 400 mm/h")


def parse_pressure_hpa(text: str) -> float:
    """'1013 hPa' to hPa; 300 to 1100 hPa."""
    return _measure(
        text, _PRESSURE_HPA, name="pressure", example="1013 hPa", low=300.0, high=1100.0, allowed="300 to 1100 hPa"
    )


def parse_vapour_g_m3(text: str) -> float:
    """'9 g/m3' to g/m3; 0 to 50 g/m3."""
    return _measure(
        text, _VAPOUR_G_M3, name="water vapour", example="9 g/m3", low=0.0, high=50.0, allowed="0 to 50 g/m3"
    )


def parse_temperature_c(text: str) -> float:
    """'14 C', '57 F', '287 K' to degrees Celsius; -90 to 60."""
    number, unit = _split(text, _TEMPERATURE, name="temperature", example="14 C")
    value = (number - 32.0) / 1.8 if unit.endswith("F") else number - 273.15 if unit == "K" else number
    return _within(value, -90.0, 60.0, text=text, name="temperature", allowed="-90 to 60 degrees Celsius")


def parse_db_per_100_m(text: str) -> float:
    """'6.5 dB per 100 m' to dB per 100 m; 0 to 1000."""
    return _measure(
        text, _PER_100_M_DB, name="loss of line", example="6.5 dB per 100 m", low=0.0, high=1000.0,
        allowed="0 to 1000 dB per 100 m",
    )  # fmt: skip


def _split(text: str, units: Mapping[str, float], *, name: str, example: str) -> tuple[float, str]:
    shown = repr(text if len(text) <= 60 else text[:57] + "...")
    found = _MEASURE.fullmatch(text.strip().replace("µ", "u").replace("−", "-"))
    if found is None:
        raise QuantityError(f"{shown} is not a {name}", f"write a number and a unit, for instance {example}")
    unit = " ".join((found[2] or "").split())
    by_folded = {known.casefold(): known for known in units}
    if not unit:
        raise QuantityError(f"{name} {shown} has no unit", f"write the unit too, for instance {example}")
    if unit.casefold() not in by_folded:
        raise QuantityError(f"{shown}: {unit[:20]!r} is not a unit of {name}", f"allowed are {', '.join(units)}")
    return float(found[1]), by_folded[unit.casefold()]


def _measure(
    text: str, units: Mapping[str, float], *, name: str, example: str, low: float, high: float, allowed: str
) -> float:
    number, unit = _split(text, units, name=name, example=example)
    return _within(number * units[unit], low, high, text=text, name=name, allowed=allowed)


def _within(value: float, low: float, high: float, *, text: str, name: str, allowed: str) -> float:
    if not (math.isfinite(value) and low <= value <= high):
        raise QuantityError(f"{name} {text[:60]!r} is out of range", f"allowed are {allowed}")
    return value
