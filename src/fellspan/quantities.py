"""Quantities in the units of the trade: "5.8 GHz", "40 ft above roof" to SI floats, and back for people.

A number without a unit is refused, for its meaning would be a guess. No locale: the decimal mark is a point.
Knows nothing of positions (that is `geodesy`) or of links.
"""

import math
import re
from dataclasses import dataclass
from typing import Final

from fellspan.errors import QuantityError
from fellspan.vocabulary import HeightReference

_TYPOGRAPHY: Final = str.maketrans(
    dict.fromkeys("′’‘ʹ", "'") | dict.fromkeys("″”“", '"') | dict.fromkeys("−–", "-") | dict.fromkeys("\u00a0\u202f", " ")
    | {"µ": "u", "μ": "u"}
)  # fmt: skip
_NUMBER: Final = r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_QUANTITY: Final = re.compile(rf"(?P<number>{_NUMBER})\s*(?P<unit>[^\s0-9.,+-][^0-9]*)?")
_FEET_INCHES: Final = re.compile(r"([0-9]+)\s*(?:ft|feet|')\s*([0-9]+(?:\.[0-9]+)?)\s*(?:in|inch|inches|\")")

_FREQUENCY_HZ: Final = {"hz": 1.0, "khz": 1e3, "mhz": 1e6, "ghz": 1e9}
_FOOT_M: Final = 0.3048
_LENGTH_M: Final = {
    "m": 1.0, "metre": 1.0, "metres": 1.0, "meter": 1.0, "meters": 1.0, "cm": 0.01, "km": 1000.0,
    "ft": _FOOT_M, "foot": _FOOT_M, "feet": _FOOT_M, "'": _FOOT_M, "us-ft": 1200.0 / 3937.0,
    "in": 0.0254, "yd": 0.9144, "mi": 1609.344, "mile": 1609.344, "miles": 1609.344, "nmi": 1852.0,
}  # fmt: skip
_POWER_W: Final = {"uw": 1e-6, "mw": 1e-3, "w": 1.0, "kw": 1e3}
_DIPOLE_DBI: Final = 2.15
"""Gain of the half-wave dipole, 1.64 times the isotropic one: what lies between dBd and dBi."""

FREQUENCY_RANGE_HZ: Final = (30e6, 300e9)
HIGHEST_THRESHOLD_DBM: Final = -20.0
HIGHEST_POWER_DBM: Final = 60.0
"""Beyond these a figure was mistyped: no receiver of a link needs so much, and no radio of one sends so much (our own rule)."""

_REFERENCES: Final[dict[str, HeightReference]] = {
    "ground": "ground", "ground level": "ground", "local ground": "ground", "agl": "ground",
    "roof": "roof", "roof level": "roof", "rooftop": "roof", "roof top": "roof", "arl": "roof",
    "sea": "sea", "sea level": "sea", "mean sea level": "sea", "msl": "sea", "amsl": "sea", "asl": "sea",
}  # fmt: skip
_HEIGHT_RANGE_M: Final[dict[HeightReference | None, tuple[float, float]]] = {
    None: (0.0, 9000.0),
    "ground": (0.0, 1000.0),
    "roof": (0.0, 1000.0),
    "sea": (-500.0, 9000.0),
}
_HEIGHT_EXAMPLES: Final = "say above what: '12 m above ground', '3 m above roof' or '310 m above sea level'"


@dataclass(frozen=True, slots=True, kw_only=True)
class AntennaHeight:
    """A height in metres and what it is measured from; None where the text does not say."""

    height_m: float
    reference: HeightReference | None


def _clean(text: str) -> str:
    return re.sub(r"\s+", " ", text.translate(_TYPOGRAPHY)).strip()


def _shown(text: str) -> str:
    return repr(text if len(text) <= 60 else text[:57] + "...")


def _split(text: str, *, name: str, example: str) -> tuple[float, str]:
    """Number and lower-case unit of a text; a missing unit and a decimal comma are refused."""
    match = _QUANTITY.fullmatch(_clean(text))
    if match is None:
        thousands = re.search(r"(?<![0-9.,])([0-9]{1,3}),([0-9]{3})(?![0-9.,])", text)
        if thousands is not None:
            whole, rest = thousands.groups()
            raise QuantityError(
                f"{_shown(text)} has a comma in its number",
                f"before three digits it may part thousands: write {whole}{rest}, or {whole}.{rest} if it is a decimal",
            )
        if re.search(r"[0-9],[0-9]", text):
            raise QuantityError(
                f"{_shown(text)} has a comma in its number", f"write decimals with a point, for instance {example}"
            )
        raise QuantityError(f"{_shown(text)} is not a {name}", f"write a number and a unit, for instance {example}")
    number = float(match["number"])
    if not math.isfinite(number):
        raise QuantityError(f"{_shown(text)} is not a finite {name}")
    unit = (match["unit"] or "").strip().lower()
    if not unit:
        raise QuantityError(f"{name} {_shown(text)} has no unit", f"write the unit too, for instance {example}")
    return number, unit


def _unknown(text: str, unit: str, *, name: str, allowed: str) -> QuantityError:
    return QuantityError(f"{_shown(text)}: {_shown(unit)} is not a unit of {name}", f"allowed are {allowed}")


def _within(value: float, low: float, high: float, *, text: str, name: str, allowed: str) -> float:
    if not low <= value <= high:  # catches NaN and infinity too
        raise QuantityError(f"{name} {_shown(text)} is out of range", f"allowed are {allowed}")
    return value


def parse_frequency_hz(text: str) -> float:
    """'5.8 GHz', '5800 MHz', '5.8e9 Hz' to Hz; 30 MHz to 300 GHz."""
    number, unit = _split(text, name="frequency", example="5.8 GHz")
    if unit not in _FREQUENCY_HZ:
        raise _unknown(text, unit, name="frequency", allowed="Hz, kHz, MHz, GHz")
    low, high = FREQUENCY_RANGE_HZ
    return _within(
        number * _FREQUENCY_HZ[unit], low, high, text=text, name="frequency", allowed="30 MHz to 300 GHz"
    )  # fmt: skip


def parse_length_m(text: str) -> float:
    """'12 m', '40 ft', "40'", '5 ft 6 in', '1.2 km', '3 mi' to metres; 0 to 20 000 km."""
    return _within(_length_m(text), 0.0, 2e7, text=text, name="length", allowed="0 m to 20 000 km")


def _length_m(text: str) -> float:
    both = _FEET_INCHES.fullmatch(_clean(text).lower())
    if both is not None:
        return float(both[1]) * _FOOT_M + float(both[2]) * _LENGTH_M["in"]
    number, unit = _split(text, name="length", example="12 m or 40 ft")
    if unit not in _LENGTH_M:
        raise _unknown(text, unit, name="length", allowed="m, km, cm, ft, us-ft, in, yd, mi, nmi")
    return number * _LENGTH_M[unit]


def parse_power_dbm(text: str) -> float:
    """'23 dBm', '-7 dBW', '200 mW', '1 W' to dBm; -100 dBm to 100 dBm."""
    number, unit = _split(text, name="power", example="23 dBm or 200 mW")
    allowed = "-100 dBm to 100 dBm; in watts, above 0"
    if re.search(r"M[wW]\s*$", text):
        raise QuantityError(f"power {_shown(text)} is in megawatts", "milliwatts are written mW, for instance 200 mW")
    if unit == "dbm":
        value = number
    elif unit == "dbw":
        value = number + 30.0
    elif unit in _POWER_W:
        value = 10.0 * math.log10(number * _POWER_W[unit] * 1000.0) if number > 0.0 else math.nan
    else:
        raise _unknown(text, unit, name="power", allowed="dBm, dBW, uW, mW, W, kW")
    return _within(value, -100.0, 100.0, text=text, name="power", allowed=allowed)


def parse_gain_dbi(text: str) -> float:
    """'23 dBi', '20.85 dBd' (above a half-wave dipole) to dBi; -50 to 90 dBi. Plain dB is refused: above what?"""
    number, unit = _split(text, name="gain", example="23 dBi")
    if unit == "db":
        raise QuantityError(f"gain {_shown(text)} does not say above what", "write dBi (isotropic) or dBd (dipole)")
    if unit not in ("dbi", "dbd"):
        raise _unknown(text, unit, name="gain", allowed="dBi, dBd")
    value = number + (_DIPOLE_DBI if unit == "dbd" else 0.0)
    return _within(value, -50.0, 90.0, text=text, name="gain", allowed="-50 to 90 dBi")


def parse_loss_db(text: str) -> float:
    """'1.5 dB' to dB; a loss is 0 to 400 dB, positive."""
    number, unit = _split(text, name="loss", example="1.5 dB")
    if unit != "db":
        raise _unknown(text, unit, name="loss", allowed="dB")
    return _within(number, 0.0, 400.0, text=text, name="loss", allowed="0 to 400 dB; a loss is written as positive")


def parse_level_dbm(text: str) -> float:
    """'-72 dBm', '-102 dBW' to dBm; -250 to 100 dBm."""
    number, unit = _split(text, name="level", example="-72 dBm")
    if unit not in ("dbm", "dbw"):
        raise _unknown(text, unit, name="level", allowed="dBm, dBW")
    value = number + (30.0 if unit == "dbw" else 0.0)
    return _within(value, -250.0, 100.0, text=text, name="level", allowed="-250 to 100 dBm")


def parse_threshold_dbm(text: str) -> float:
    """'-72 dBm' to dBm: the least level that a receiver works at, -250 to -20 dBm. Above that the sign was lost."""
    value = parse_level_dbm(text)
    if value > HIGHEST_THRESHOLD_DBM:
        meant = f"; did you mean '{-value:g} dBm'?" if value > 20.0 else ""
        raise QuantityError(
            f"threshold {_shown(text)} is above {HIGHEST_THRESHOLD_DBM:g} dBm, which no receiver needs",
            f"thresholds are negative: -60 to -100 dBm is usual{meant}",
        )
    return value


def parse_transmit_power_dbm(text: str) -> float:
    """'23 dBm', '200 mW' to dBm: the power of a radio at its port, -100 to 60 dBm (1 kW)."""
    value = parse_power_dbm(text)
    if value > HIGHEST_POWER_DBM:
        raise QuantityError(
            f"transmit power {_shown(text)} is {value:.0f} dBm, more than the {HIGHEST_POWER_DBM:g} dBm (1 kW) allowed here",
            "10 to 40 dBm is usual at the antenna port, without the gain of the antenna; 23 dBm is 200 mW",
        )
    return value


def parse_percent(text: str) -> float:
    """'99.99 %' to 99.99; 0 to 100. Without the sign it is refused: 0.9 may mean 0.9 % or 90 %."""
    number, unit = _split(text, name="percentage", example="90 %")
    if unit not in ("%", "percent"):
        raise _unknown(text, unit, name="percentage", allowed="%")
    return _within(number, 0.0, 100.0, text=text, name="percentage", allowed="0 % to 100 %")


def parse_probability(value: str | float) -> float:
    """'90 %', '0.9' or 0.9 to 0.9; a bare number is a fraction of one, 0 to 1."""
    text = value if isinstance(value, str) else repr(float(value))
    try:
        number = float(_clean(text))
    except ValueError:
        return parse_percent(text) / 100.0
    return _within(number, 0.0, 1.0, text=text, name="probability", allowed="0 to 1, or 0 % to 100 % with the sign")


def parse_antenna_height(text: str) -> AntennaHeight:
    """An antenna height and its reference.

    '12 m', '12 m above ground', '8 m agl', '40 ft above roof', '3 m above the roof', 'roof + 3 m', '310 m amsl',
    '310 m above sea level'. Above ground or roof 0 to 1000 m, above sea -500 to 9000 m.

    Raises
    ------
    QuantityError
        No height, an unknown reference, or out of range. Heights above the ellipsoid are refused: they differ from
        those above sea level by up to some 100 m.
    """
    cleaned = _clean(text).lower().replace("+", " + ").replace("  ", " ")
    length, reference_text = cleaned, ""
    first = re.fullmatch(r"([a-z][a-z ]*?) \+ (.+)", cleaned)
    last = re.fullmatch(
        rf"(.*?)\s*\b(?:above|over)\s+(.+)|(.*?)\s+((?:a|am|)sl|msl|agl|arl|hae)|({_NUMBER}.*)", cleaned
    )
    if first is not None:
        reference_text, length = first[1], first[2]
    elif last is not None and last[5] is None:
        length, reference_text = last[1] or last[3] or "", last[2] or last[4]
    reference: HeightReference | None = None
    if reference_text:
        word = reference_text.removeprefix("the ").strip()
        if "ellipsoid" in word or word == "hae":
            raise QuantityError(
                f"height {_shown(text)} is above the ellipsoid, which is not sea level", _HEIGHT_EXAMPLES
            )
        if word not in _REFERENCES:
            raise QuantityError(f"height {_shown(text)}: above {_shown(word)} is not known", _HEIGHT_EXAMPLES)
        reference = _REFERENCES[word]
    try:
        height_m = _length_m(length)
    except QuantityError as error:
        if length == cleaned:
            raise
        raise QuantityError(f"height {_shown(text)}: {error.what}", *error.details[:2]) from error
    low, high = _HEIGHT_RANGE_M[reference]
    allowed = f"{low:g} to {high:g} m" + (f" above {reference}" if reference else "")
    _within(height_m, low, high, text=text, name="height", allowed=allowed)
    return AntennaHeight(height_m=height_m, reference=reference)


def _trimmed(value: float, decimals: int) -> str:
    text = f"{value:.{decimals}f}"
    text = text.rstrip("0").rstrip(".") if "." in text else text
    return "0" if text == "-0" else text


def _fixed(value: float, decimals: int) -> str:
    text = f"{value:.{decimals}f}"
    return text.removeprefix("-") if float(text) == 0.0 else text


def format_frequency(frequency_hz: float) -> str:
    """'5.8 GHz', '433.92 MHz': to 1 kHz above 1 GHz, to 1 Hz below."""
    if frequency_hz >= 1e9:
        return f"{_trimmed(frequency_hz / 1e9, 6)} GHz"
    return f"{_trimmed(frequency_hz / 1e6, 6)} MHz"


def format_distance(distance_m: float) -> str:
    """'850 m', '4.172 km', '57.31 km': metres below 1 km, three decimals of a km below 10 km, two above."""
    if abs(distance_m) < 999.5:
        return f"{_fixed(distance_m, 0)} m"
    return f"{distance_m / 1000.0:.{3 if abs(distance_m) < 9999.5 else 2}f} km"


def format_height(height_m: float, reference: HeightReference | None = None) -> str:
    """'12.5 m above ground'; without a reference '12.5 m'."""
    tail = {None: "", "ground": " above ground", "roof": " above roof", "sea": " above sea level"}[reference]
    return f"{_fixed(height_m, 1)} m{tail}"


def format_db(value: float, unit: str = "dB") -> str:
    """'-72.4 dBm': one decimal, which is finer than any prediction."""
    return f"{_fixed(value, 1)} {unit}"


def format_bearing(bearing_deg: float) -> str:
    """'045.3°': three digits before the point, so that no one mistakes it for an elevation angle."""
    tenths = round(bearing_deg * 10.0) % 3600
    return f"{tenths // 10:03d}.{tenths % 10}°"


def format_percent(percent: float) -> str:
    """'90 %', '99.9995 %': as many decimals as tell it from 100, at most six."""
    if 0.0 < percent < 100.0:
        distance = min(percent, 100.0 - percent)
        decimals = min(6, max(1, 1 - math.floor(math.log10(distance))))
        return f"{_trimmed(min(max(percent, 1e-6), 99.999999), decimals)} %"  # never a 100 or 0 that is not meant
    return f"{_trimmed(percent, 0)} %"
