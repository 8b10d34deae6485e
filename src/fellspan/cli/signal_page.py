"""The radio side of one link on the terminal: level, modulations, availability, rule, distances to keep; 80 columns.

Shows what assessment found and computes nothing.
"""

from typing import Final

from fellspan.cli import figures
from fellspan.cli.layout import Ink, labelled, table, wrapped
from fellspan.links import radio_words, words
from fellspan.links.result import AtEnds, LinkResult, Losses
from fellspan.links.signal_result import DirectionResult, SignalResult
from fellspan.links.signal_words import LEFT_OUT, minutes_text, percent_text, rate_text

_TONES: Final = {"meets": "good", "marginal": "doubt", "below": "bad"}
_CAUSES: Final = {"rain": "rain", "multipath": "multipath", "diffraction": "low k", "level": "too little level"}
_WIDTHS: Final = (18, 4, 12, 9, 10, 9, 10)
_OTHER_LOSSES: Final = (
    ("vegetation", "trees"),
    ("gases", "air"),
    ("polarization", "polarization"),
    ("feeders", "feeders"),
    ("branching", "branching"),
    ("pointing", "aim"),
)


def signal_lines(result: LinkResult, ink: Ink) -> list[str]:
    """Everything about the radio side of a link, as lines without line ends."""
    lines: list[str] = []
    if result.signal_verdict is not None:
        word, why = result.signal_verdict, radio_words.verdict_why(result)
        if why == radio_words.THROUGH:
            lines += labelled("Signal", why)
        else:
            first, *rest = labelled("Signal", f"{word.upper()}: {why}")
            lines += [first.replace(word.upper(), ink.emphasise(word.upper(), _TONES[word]), 1), *rest]
    lines += labelled("Received", _at_ends(result.received_dbm, "dBm"))
    if result.margin_db.at_a is not None or result.margin_db.at_b is not None:
        of = f" of {result.modulation}" if result.modulation else ""
        lines += labelled("Margin", f"{_at_ends(result.margin_db, 'dB')}{of}; {result.wanted_margin_db:g} dB wanted")
        if words.neighbours_take(result):
            lines += labelled("", f"with neighbours {_at_ends(words.decisive_margin_db(result), 'dB')}")
    lines += labelled("Losses", _losses(result.losses_db))
    if result.signal is not None:
        lines += _availability(result.signal)
        lines += _modulations(result.signal)
    return lines + _people_and_rules(result)


def _at_ends(values: AtEnds, unit: str) -> str:
    if values.at_a is None and values.at_b is None:
        return "not computed: power or an antenna gain is not given"
    return f"{figures.decibels(values.at_a, unit)} at A, {figures.decibels(values.at_b, unit)} at B"


def _losses(losses: Losses) -> str:
    """Free space and diffraction always; the rest where it is 0.05 dB or more."""
    words = f"free space {losses.free_space:.1f} dB, diffraction {losses.diffraction:.1f} dB"
    for name, label in _OTHER_LOSSES:
        value = getattr(losses, name)
        if value is not None and value >= 0.05:
            words += f", {label} {value:.1f} dB"
    if losses.rain_001 is not None and losses.rain_001 >= 0.05:
        words += f"; rain {losses.rain_001:.1f} dB for 0.01 % of the year"
    return words


def _availability(signal: SignalResult) -> list[str]:
    year, month = signal.availability_percent.year, signal.availability_percent.worst_month
    lines: list[str] = []
    if year is not None and month is not None and signal.minutes_per_year is not None:
        cause = _CAUSES.get(signal.dominant_cause or "")
        lines += labelled(
            "Available",
            f"{percent_text(year)} of the year both ways ({minutes_text(signal.minutes_per_year)} out"
            f"{f', mostly by {cause}' if cause else ''}), {percent_text(month)} of its worst month"
            f"{f'; {LEFT_OUT}' if radio_words.leaves_neighbours_out(signal) else ''}",
        )
    if signal.target_availability_percent is not None:
        said = {True: "met", False: "not met", None: "cannot be judged"}[signal.target_met]
        lines += labelled("Target", f"{signal.target_availability_percent:g} % of the year in each direction: {said}")
    missing = radio_words.missing_figures(signal)
    if lines and year is not None:
        lines += labelled("Climate", "; ".join(_climate(signal)))
        lines += labelled("Methods", radio_words.editions_words(signal))
    return lines + [line for note in missing for line in wrapped(note, first="  ! ", rest="    ")]


def _climate(signal: SignalResult) -> list[str]:
    """What rain and multipath rest on."""
    told = [figure for figure in signal.climate if figure.key in ("rain_rate_001_mm_h", "dn1_n_per_km", "log_k")]
    return [f"{radio_words.climate_words(figure)} ({figure.provenance})" for figure in told]


def _modulations(signal: SignalResult) -> list[str]:
    there, back = signal.a_to_b, signal.b_to_a
    if not radio_words.rows_named(there):
        return []
    rows = [
        (
            f"{one.name}{' *' if one.name == there.wanted else ''}",
            f"{one.threshold_dbm:.0f}",
            "-" if one.throughput_bps is None else rate_text(one.throughput_bps),
            *_cells(there, index),
            *_cells(back, index),
        )
        for index, one in enumerate(there.modulations)
    ]
    heads = ("Modulation", "dBm", "for users", "A to B dB", "of year", "B to A dB", "of year")
    lines = table(heads, rows, widths=_WIDTHS, right=(1, 2, 3, 4, 5, 6))
    lines.append("* wanted; dBm: the level it needs; A to B, B to A: the margin in clear air")
    if radio_words.leaves_neighbours_out(signal):
        lines.append("margins and shares of the year leave neighbours out")
    mean = there.throughput_mean_bps, back.throughput_mean_bps
    if mean[0] is not None and mean[1] is not None:
        lines.append(f"for users, mean over the year: {rate_text(mean[0])} A to B, {rate_text(mean[1])} B to A")
    return ["", *("  " + line for line in lines), ""]


def _cells(direction: DirectionResult, index: int) -> tuple[str, str]:
    row = direction.modulations[index]
    year = row.availability_percent.year
    return figures.decibels(row.margin_db, ""), "-" if year is None else percent_text(year).replace("over ", ">")


def _people_and_rules(result: LinkResult) -> list[str]:
    """What the power rule allows, and how far people keep away."""
    lines: list[str] = []
    for ends, said in radio_words.power_sentences(result):
        lines += labelled("Power rule", f"{ends}: {said}")
    if result.received_dbm.at_a is not None and result.power is None:
        lines += labelled("Power rule", radio_words.NO_RULE)
    if result.exposure is not None:
        for ends, said in radio_words.exposure_sentences(result):
            lines += labelled("Exposure", f"{ends}: {said}")
    return lines
