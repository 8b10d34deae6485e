"""How the radio side of a result is said, the same on the terminal and the pages: verdict, editions, rules, distances.

Formats results and works nothing out.
"""

from typing import Final

from fellspan.links.receivers import UNNAMED
from fellspan.links.result import LinkResult
from fellspan.links.signal_result import ClimateUsed, DirectionResult, SignalResult
from fellspan.links.signal_words import LEFT_OUT_NOTE
from fellspan.links.words import up_db

THROUGH: Final = "the level is there, but through an obstruction"
"""A level that arrives by diffraction over what cuts the sight line is no reason to build."""
NO_RULE: Final = "no rule is named: rule of the link, or of [rules], holds the power against one"
NO_EXPOSURE: Final = "not computed: it needs power of the radio and gain (or model, pattern) of the antenna"
CLIMATE_WORDS: Final = {
    "rain_rate_001_mm_h": "rain for 0.01 % of the year",
    "dn1_n_per_km": "gradient for 1 % of the year",
    "dn75": "refractivity over 75 m",
    "log_k": "log K",
    "terrain_roughness_m": "terrain roughness",
    "gradient_median_n_per_km": "median gradient",
    "gradient_tail_n_per_km": "gradient for 99.9 %",
    "temperature_k": "temperature",
    "total_pressure_hpa": "pressure",
    "dry_pressure_hpa": "dry pressure",
    "vapour_g_m3": "water vapour",
    "rain_height_m": "rain height",
}


def verdict_why(result: LinkResult) -> str:
    """What stands behind the signal verdict: margin, target availability, or what holds it down; empty without one."""
    verdict, signal = result.signal_verdict, result.signal
    if verdict is None:
        return ""
    if verdict == "meets" and result.verdict == "obstructed":
        return THROUGH
    if verdict == "meets":
        wanted = None if signal is None else signal.target_availability_percent
        return "margin and availability wanted are there" if wanted is not None else "the margin wanted is there"
    return (signal.verdict_reason if signal is not None else "") or "see the reasons and cautions"


def leaves_neighbours_out(signal: SignalResult) -> bool:
    """Whether there are neighbours on the channel, which availability does not count."""
    return LEFT_OUT_NOTE in signal.notes


def rows_named(direction: DirectionResult) -> bool:
    """Whether the radio has a table of modulations."""
    return any(row.name != UNNAMED for row in direction.modulations)


def editions_words(signal: SignalResult) -> str:
    """'rain P.530-19 (reading A), multipath P.530-17 detailed, gases P.676-12, diffraction P.526-16'."""
    editions = signal.editions
    rain = None if editions.rain is None else f"rain {editions.rain} (reading {editions.rain_reading})"
    multipath = None if editions.multipath is None else f"multipath {editions.multipath}"
    month = None if editions.worst_month is None else f"worst month {editions.worst_month}"
    parts = (rain, multipath, month, f"gases {editions.gases}", f"diffraction {editions.diffraction}")
    return ", ".join(part for part in parts if part)


def climate_words(figure: ClimateUsed) -> str:
    """'rain for 0.01 % of the year 42 mm/h'."""
    return f"{CLIMATE_WORDS.get(figure.key, figure.key)} {figure.value:.4g} {figure.unit}".rstrip()


def missing_figures(signal: SignalResult) -> tuple[str, ...]:
    """The notes that say what is not computed and which key gives it."""
    return tuple(note for note in signal.notes if note.startswith(("no ", "climate figures", "not computed")))


def told_by_end(a: str, b: str) -> tuple[tuple[str, str], ...]:
    """What is said of A and of B; said once where it is the same."""
    return (("A and B", a),) if a == b else (("A", a), ("B", b))


def power_sentences(result: LinkResult) -> tuple[tuple[str, str], ...]:
    """What the rule says of each end, with the letters of the ends; empty where there is no rule."""
    power = result.power
    if power is None:
        return ()
    return told_by_end(power.a.sentence, power.b.sentence)


def breach_words(result: LinkResult) -> str:
    """'15.7 dB over power rule ROW', the end named where it is one alone or the two differ; empty where none is over it."""
    power = result.power
    if power is None:
        return ""
    # Up, not to the nearest: a breach is never shown as 0.0 dB.
    over = {
        end: f"{up_db(check.breach_db or 0.0):.1f}"
        for end, check in (("A", power.a), ("B", power.b))
        if check.is_breach
    }
    if not over:
        return ""
    rule = f"over power rule {power.a.rule_id}"
    if len(over) == 2 and over["A"] == over["B"]:
        return f"{over['A']} dB {rule}"
    return f"{', '.join(f'{value} dB at {end}' for end, value in over.items())} {rule}"


def exposure_sentences(result: LinkResult) -> tuple[tuple[str, str], ...]:
    """Distances to keep at each end, with the letters of the ends."""
    pair = result.exposure
    a, b = (None, None) if pair is None else (pair.a, pair.b)
    said = [NO_EXPOSURE if end is None else end.sentence for end in (a, b)]
    return told_by_end(said[0], said[1])
