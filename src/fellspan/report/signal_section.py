"""The radio side of one link on its page: budget, modulations, outages, climate, rule, exposure. Computes nothing."""

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

from fellspan.links import radio_words
from fellspan.links.exposure import RULE_WORDS, ExposureDistances, ExposureResult
from fellspan.links.result import LinkResult
from fellspan.links.rules import RuleCheck
from fellspan.links.signal_result import DirectionResult, ModulationResult, Shares, SignalResult, Working
from fellspan.links.signal_words import LEFT_OUT, minutes_text, percent_text, rate_text
from fellspan.propagation.sources import SOURCES
from fellspan.report import wording
from fellspan.report.workings_section import value_words

_ENDS: Final = {
    "transmit_branching": "branching, transmitting end",
    "transmit_feeder": "feeder, transmitting end",
    "transmit_gain": "gain, transmitting antenna",
    "transmit_pointing": "error of aim, transmitting end",
    "receive_branching": "branching, receiving end",
    "receive_feeder": "feeder, receiving end",
    "receive_gain": "gain, receiving antenna",
    "receive_pointing": "error of aim, receiving end",
}
_CAUSES: Final = (("rain", "rain"), ("multipath", "multipath"), ("diffraction", "low k"), ("total", "all together"))
_CAUSE_WORD: Final = {"rain": "rain", "multipath": "multipath", "diffraction": "low k", "level": "too little level"}
_GROUPS: Final = {"public": "general public", "occupational": "trained workers"}

Rows = tuple[tuple[str, ...], ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class SignalSection:
    """What the link page shows of the radio side; every list may be empty where its figures are not known."""

    verdict: str
    available: str
    target: str
    budget: Rows
    modulations: tuple[tuple[str, Rows], ...]
    throughput: str
    causes: Rows
    climate: Rows
    editions: str
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class RulesSection:
    """What the power rule says, by end, and the distances to keep."""

    power: tuple[tuple[str, RuleCheck], ...]
    no_rule: str
    exposure: tuple[tuple[str, ExposureResult], ...]
    distances: Rows
    notes: tuple[str, ...]
    no_exposure: str


def signal_section(result: LinkResult) -> SignalSection | None:
    """The section of a link; None where the result holds no signal."""
    signal = result.signal
    if signal is None:
        return None
    there, back = signal.a_to_b, signal.b_to_a
    target = signal.target_availability_percent
    said = {True: "met", False: "not met", None: "cannot be judged"}[signal.target_met]
    return SignalSection(
        verdict=wording.signal_words(result),
        available=_available(signal),
        target="" if target is None else f"{target:g} % of the year in each direction: {said}",
        budget=tuple(_budget(signal)),
        modulations=_modulations(there, back) if radio_words.rows_named(there) else (),
        throughput=_throughput(there, back),
        causes=tuple(_outages(there, back)),
        climate=tuple(
            (
                radio_words.CLIMATE_WORDS.get(one.key, one.key),
                value_words(one.value, one.unit),
                _provenance(one.provenance, one.source_key),
            )
            for one in signal.climate
        )
        if _known(signal)
        else (),
        editions=radio_words.editions_words(signal),
        notes=signal.notes,
    )


def _known(signal: SignalResult) -> bool:
    return signal.a_to_b.margin_db is not None


def availability_short(result: LinkResult) -> str:
    """'99.984 %' of the year for a card; empty where it is not known, or is that of a path that nobody should build on."""
    year = result.availability_percent.year
    return "" if year is None or radio_words.verdict_why(result) == radio_words.THROUGH else percent_text(year)


def _available(signal: SignalResult) -> str:
    year, month, minutes = (
        signal.availability_percent.year,
        signal.availability_percent.worst_month,
        signal.minutes_per_year,
    )
    if year is None or month is None or minutes is None:
        return (
            "not computed: the notes say which figure is missing"
            if _known(signal)
            else "not computed: no margin is known"
        )
    cause = _CAUSE_WORD.get(signal.dominant_cause or "")
    mostly = f", mostly by {cause}" if cause else ""
    return (
        f"{percent_text(year)} of the year both ways at once, {minutes_text(minutes)} out{mostly}; "
        f"{percent_text(month)} of its worst month{f'; {LEFT_OUT}' if radio_words.leaves_neighbours_out(signal) else ''}"
    )


def _budget(signal: SignalResult) -> Iterator[tuple[str, ...]]:
    """Signed terms of both directions, then their sum; terms that are 0 in both are left out."""
    back = {one.key: one for one in signal.b_to_a.workings}
    for one in signal.a_to_b.workings:
        other = back.get(one.key)
        if other is None or (one.in_level_db is None and other.in_level_db is None):
            continue
        if one.in_level_db == 0.0 == other.in_level_db and one.key not in ("diffraction", "power"):
            continue
        label = _ENDS.get(one.key, one.label)
        yield label[:1].upper() + label[1:], _signed(one), _signed(other)


def _signed(working: Working) -> str:
    unit = "dBm" if working.key == "power" else "dB"
    return f"{wording.number(working.in_level_db, sign=working.key != 'power')} {unit}"


def _modulations(there: DirectionResult, back: DirectionResult) -> tuple[tuple[str, Rows], ...]:
    """A table for each direction; one for both where they read the same."""
    one, other = (tuple(_modulation(row, direction) for row in direction.modulations) for direction in (there, back))
    if one == other:
        return (("both ways", one),)
    return (there.direction, one), (back.direction, other)


def _modulation(row: ModulationResult, direction: DirectionResult) -> tuple[str, ...]:
    year, month = row.availability_percent.year, row.availability_percent.worst_month
    return (
        f"{row.name} (wanted)" if row.name == direction.wanted else row.name,
        f"{wording.number(row.power_dbm)} dBm",
        f"{wording.number(row.threshold_dbm)} dBm",
        wording.decibels(row.received_dbm, "dBm"),
        wording.decibels(row.margin_db, sign=True),
        "–" if year is None else percent_text(year),
        "–" if month is None else percent_text(month),
        "–" if row.throughput_bps is None else rate_text(row.throughput_bps),
        "–" if row.carried_percent is None else _percent(row.carried_percent),
    )


def _throughput(there: DirectionResult, back: DirectionResult) -> str:
    if there.throughput_mean_bps is None or back.throughput_mean_bps is None:
        return ""
    return f"{rate_text(there.throughput_mean_bps)} A to B, {rate_text(back.throughput_mean_bps)} B to A"


def _outages(there: DirectionResult, back: DirectionResult) -> Iterator[tuple[str, ...]]:
    """Outage of the wanted modulation by cause: year and worst month of A to B, then of B to A."""
    shares: list[Shares | None] = []
    for direction in (there, back):
        row = _wanted(direction)
        shares += [None, None] if row is None else [row.year, row.worst_month]
    if all(one is None for one in shares):
        return
    for key, label in _CAUSES:
        yield label.capitalize(), *("–" if one is None else _percent(getattr(one, key)) for one in shares)


def _wanted(direction: DirectionResult) -> ModulationResult | None:
    rows = direction.modulations
    return next((row for row in rows if row.name == direction.wanted), rows[0] if rows else None)


def _percent(value: float | None) -> str:
    """A share of time in %; what is small is not shown as nothing."""
    if value is None or not math.isfinite(value):
        return "–"
    if value == 0.0:
        return "0 %"
    return "under 0.001 %" if value < 0.001 else f"{value:.3g} %"


def _provenance(words: str, source_key: str) -> str:
    found = SOURCES.get(source_key)
    return words if found is None or "Rec. ITU-R" in words else f"{words} ({found.reference})"


def rules_section(result: LinkResult) -> RulesSection:
    """Power rule and exposure of a link, each end once where both are alike."""
    power, pair = result.power, result.exposure
    checks: tuple[tuple[str, RuleCheck], ...] = ()
    if power is not None:
        checks = (("A and B", power.a),) if power.a == power.b else (("A", power.a), ("B", power.b))
    ends: list[tuple[str, ExposureResult]] = []
    if pair is not None:
        if pair.a is not None and pair.a == pair.b:
            ends = [("A and B", pair.a)]
        else:
            ends = [(letter, end) for letter, end in (("A", pair.a), ("B", pair.b)) if end is not None]
    return RulesSection(
        power=checks,
        no_rule=radio_words.NO_RULE,
        exposure=tuple(ends),
        distances=tuple(_distances(letter, one) for letter, end in ends for one in (end.public, end.occupational)),
        notes=tuple(
            dict.fromkeys(
                [note for _, end in ends for note in end.notes]
                + [_near(letter, end) for letter, end in ends if end.dish_near_field is not None]
            )
        ),
        no_exposure=radio_words.NO_EXPOSURE,
    )


def _distances(letters: str, group: ExposureDistances) -> tuple[str, ...]:
    return (
        f"{letters}, {_GROUPS[group.group]}",
        *(
            wording.missing(one) if one is not None else "as in front"
            for one in (group.front_m, group.beside_m, group.behind_m)
        ),
        wording.missing(group.largest_m),
        f"{group.limit_w_m2:.3g} W/m² over {group.averaging_min:g} minutes, {RULE_WORDS[group.rule]}",
    )


def _near(letters: str, end: ExposureResult) -> str:
    near = end.dish_near_field
    assert near is not None
    return (
        f"{letters}, near field: {near.surface_w_m2:.3g} W/m² at the mouth; general public {_along(near.public_m)}, trained "
        f"workers {_along(near.occupational_m)}. {near.note}"
    )


def _along(distance_m: float) -> str:
    return f"{wording.missing(distance_m)} along the axis" if distance_m > 0.0 else "below the limit already there"
