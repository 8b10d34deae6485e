"""Numbers and states as people read them on a page. Formats what it is given and works nothing out."""

import math
import re

from fellspan.links import radio_words, words
from fellspan.links.result import CriterionResult, LinkResult
from fellspan.links.words import STATE_WORDS, State, state_of
from fellspan.vocabulary import Basis

STATE_SYMBOL: dict[State, str] = {"clear": "✓", "clear-bare": "(✓)", "marginal": "≈", "obstructed": "✕"}
STATE_WORD: dict[State, str] = {state: text.capitalize() for state, text in STATE_WORDS.items()}
BASIS_WORD: dict[Basis, str] = {
    "surveyed": "surveyed on the ground",
    "surface raster": "surface raster",
    "bare ground only": "bare ground only: what stands on it is not all known",
}
BASIS_SHORT: dict[Basis, str] = {
    "surveyed": "surveyed",
    "surface raster": "surface raster",
    "bare ground only": "on bare ground only",
}
_MINUS = re.compile(r"(?<=[\s(])-(?=\d+(?:\.\d+)? ?(?:dB|m\b|%|°))")
_CONTROL = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f\ud800-\udfff]")


def clean(text: str) -> str:
    """`text` without control characters, which neither HTML nor SVG can hold."""
    return _CONTROL.sub("", text)


def true_minus(text: str) -> str:
    """A sentence as the terminal has it with the minus signs of its quantities as pages write them."""
    return _MINUS.sub("−", text)


def shorten(text: str, length: int) -> str:
    """`text` on one line, cut to `length` characters with an ellipsis."""
    flat = " ".join(clean(text).split())
    return flat if len(flat) <= length else flat[: max(1, length - 1)].rstrip() + "…"


def number(value: float | None, digits: int = 1, *, sign: bool = False) -> str:
    """A number with a true minus sign, or a dash where there is none."""
    if value is None or not math.isfinite(value):
        return "–"
    text = f"{value:+.{digits}f}" if sign else f"{value:.{digits}f}"
    if float(text) == 0.0:
        text = text.lstrip("+-")
    return text.replace("-", "−")


def metres(value: float | None, digits: int = 1, *, sign: bool = False) -> str:
    """`12.3 m`."""
    return "–" if value is None else f"{number(value, digits, sign=sign)} m"


def decibels(value: float | None, unit: str = "dB", *, sign: bool = False) -> str:
    """A margin, or a level in dBm: rounded down as everywhere; no unit where `unit` is empty."""
    return "–" if value is None else f"{number(words.down_db(value), sign=sign)} {unit}".rstrip()


def kilometres(distance_m: float, *, length_m: float | None = None) -> str:
    """Kilometres with as many decimals as the path (`length_m`, else the distance itself) deserves, no unit."""
    scale = distance_m if length_m is None else length_m
    return number(distance_m / 1000.0, 3 if scale < 2_000.0 else 2 if scale < 100_000.0 else 1)


def distance(distance_m: float) -> str:
    """A distance in the unit people would say it in; always as many decimals, so that two distances compare."""
    return f"{number(distance_m, 0)} m" if distance_m < 999.5 else f"{number(distance_m / 1000.0, 2)} km"


def percent(share: float | None, digits: int = 0) -> str:
    """`0.6` as `60 %`."""
    return "–" if share is None else f"{number(share * 100.0, digits)} %"


def probability(share: float | None) -> str:
    """A probability in percent, rounded down: 89.6 % must not read as 90 %, nor anything as certain or impossible."""
    if share is None:
        return "–"
    if share > 0.995:
        return "> 99.9 %" if share > 0.9995 else "> 99 %"
    return "< 1 %" if share < 0.01 else percent(math.floor(share * 100.0 + 1e-6) / 100.0)


def frequency(frequency_hz: float) -> str:
    """`5.8 GHz`, `433 MHz`."""
    return f"{frequency_hz / 1e9:.6g} GHz" if frequency_hz >= 1e9 else f"{frequency_hz / 1e6:.6g} MHz"


def k_factor(k: float | None) -> str:
    """k as engineers write it."""
    if k is None:
        return "infinite"
    return "4/3" if abs(k - 4.0 / 3.0) < 5e-4 else number(k, 2)


def degrees(value: float | None, digits: int = 1, *, sign: bool = False) -> str:
    """`123.4°`."""
    return "–" if value is None else f"{number(value, digits, sign=sign)}°"


def bearing(value: float | None) -> str:
    """A bearing with three figures before the point, 360 written as 0."""
    if value is None:
        return "–"
    tenths = round(value * 10.0) % 3600
    return f"{tenths // 10:03d}.{tenths % 10}°"


def missing(value_m: float) -> str:
    """A height that is missing, rounded up."""
    return metres(words.up_m(value_m))


def to_build(value_m: float | None) -> str:
    """A height to add at an end, with its sign; in words where it is none that is built."""
    text = words.to_build(value_m)
    return f"+{text}" if text.endswith(" m") and not text.startswith("0.0") else text


def share(fraction: float | None) -> str:
    """A share of the zone that is free, rounded down."""
    return "–" if fraction is None else percent(words.zone_share(fraction))


def decisive_words(criterion: CriterionResult) -> str:
    """The greatest height missing, else what is to spare at the governing point."""
    if criterion.met:
        return f"{metres(words.down_m(max(criterion.clearance_m - criterion.required_m, 0.0)))} to spare"
    return f"{missing(criterion.shortfall_m)} missing"


def governing_words(criterion: CriterionResult, length_m: float) -> str:
    """What is spare or missing at the governing point of a criterion, on a path of this length."""
    spare = words.spare_m(criterion, length_m=length_m)
    if spare >= 0.0:
        return f"{metres(spare)} to spare"
    return f"{metres(-spare)} short of the required clearance"


def signal_words(result: LinkResult) -> str:
    """What the signal verdict says, and what stands behind it, with the path in mind."""
    if result.signal_verdict is None:
        return "not computed"
    why = radio_words.verdict_why(result)
    return why if why == radio_words.THROUGH else f"{result.signal_verdict}: {why}"


def signal_short(result: LinkResult) -> str:
    """The verdict in a word or two, for a card."""
    if radio_words.verdict_why(result) == radio_words.THROUGH:
        return "through an obstruction"
    return result.signal_verdict or "not computed"


def criterion_words(criterion: CriterionResult) -> str:
    """`k 4/3, 60 % of the first Fresnel zone`."""
    return f"k {k_factor(criterion.k)}, {percent(criterion.required_fraction)} of the first Fresnel zone"


def headline(result: LinkResult) -> str:
    """The decisive reason, or the governing criterion where none was stated."""
    if result.reasons:
        return result.reasons[0]
    return f"{STATE_WORD[state_of(result)]}: {decisive_words(result.clearance[result.governing])}"
