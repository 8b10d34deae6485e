"""Neighbours in sentences: the worst pair, warnings of a site, cautions of a receiver, rules. Works nothing out."""

from collections.abc import Sequence
from typing import Final

from fellspan.links.interference_result import HighLowConflict, InterferenceResult, NearAntennas
from fellspan.links.stations import Station
from fellspan.links.words import down_db

CAUTION_FROM_DB: Final = 1.0
"""A threshold raised by more than this draws a caution (common practice, no source)."""
CAUTION_RATIO_DB: Final = 20.0
"""Where no channel width is known, a carrier less than this above the interference draws one (common practice, no source)."""


def worst_sentence(results: Sequence[InterferenceResult]) -> str | None:
    """The worst pair; `results` are sorted, the worst first."""
    if not results or not results[0].interferers:
        return None
    worst = results[0]
    return f"Worst pair: {_pair(worst)}{_figures(worst)}."


def receiver_caution(result: InterferenceResult) -> str | None:
    """A caution where other links of the study harm a receiver; None where they do not."""
    if not result.interferers:
        return None
    worse, ratio = result.threshold_degradation_db, result.c_i_db
    if worse is None:
        if ratio is None or ratio >= CAUTION_RATIO_DB:
            return None
        side = "above" if ratio >= 0.0 else "below"
        return (
            f"Neighbours: {_pair(result)}; the carrier is {abs(ratio):.1f} dB {side} all of them together. State the "
            "channel width of the radio to know what that costs, or use another channel."
        )
    if worse <= CAUTION_FROM_DB:
        return None
    left = result.effective_margin_db
    margin = "" if left is None else f", which leaves a margin of {down_db(left):.1f} dB"
    return (
        f"Neighbours: other links of this study raise the threshold at '{result.site}' by {worse:.1f} dB{margin}; most comes "
        f"from {_sender(result)}. Use another channel, the other polarization or an antenna that hears less there."
    )


def warning_sentences(conflicts: Sequence[HighLowConflict], near: Sequence[NearAntennas]) -> tuple[str, ...]:
    """High/low conflicts, then antennas too near each other, one sentence for each site."""
    words = [
        f"High/low conflict at '{one.site}': '{one.high_link}' transmits high there ({one.high_hz / 1e9:.6g} GHz) and "
        f"'{one.low_link}' low ({one.low_hz / 1e9:.6g} GHz), each in the half of the band in which the other receives. Swap "
        "the two frequencies of one of them."
        for one in conflicts
    ]
    by_site: dict[str, list[NearAntennas]] = {}
    for pair in near:
        by_site.setdefault(pair.site, []).append(pair)
    for site, pairs in by_site.items():
        close = [pair for pair in pairs if pair.is_close]
        if close:
            worst = max(close, key=lambda pair: pair.keep_m - pair.distance_m)
            words.append(
                f"Antennas too near each other at '{site}': {_names(close)}. As typed, those of '{worst.link}' and "
                f"'{worst.other_link}' are {worst.distance_m:.1f} m apart; keep {worst.keep_m:.1f} m (common practice, no "
                "source), and give each its own position and height."
            )
        rest = [pair for pair in pairs if not pair.is_close]
        if rest:
            far = max(pair.far_field_m for pair in rest)
            words.append(
                f"Antennas at '{site}' ({_names(rest)}) stand nearer to each other than the far-field distance of {far:.0f} m: "
                "their patterns do not hold there, and levels between them are rough figures."
            )
    return tuple(words)


def rule_notes(
    stations: Sequence[Station],
    *,
    free_space_only: bool,
    paths_left: int,
    with_gaps: int,
    not_planned: Sequence[str],
) -> tuple[str, ...]:
    """What the figures rest on and leave out."""
    notes = [
        "Every transmitter at its greatest power, all at once; radios of time division out of step, unless synchronised.",
        "At the median k: for small parts of the time distant transmitters come in stronger.",
    ]
    unknown = _of([one for one in stations if one.radio.bandwidth_hz is None])
    if unknown:
        notes.append(
            f"No channel width is stated for {unknown}: compared only with links on the same frequency, and no rise of the "
            "threshold is computed."
        )
    bare = _of([one for one in stations if one.has_gain and one.antenna.pattern is None])
    if bare:
        notes.append(
            f"Only the gain is known of antennas of {bare}: taken as the gain in every direction, the worst case, but no "
            "more than 0 dBi toward its own site. A model or data-sheet beamwidths say more."
        )
    mute = _of([one for one in stations if one.power_dbm is None or not one.has_gain])
    if mute:
        notes.append(f"Power or an antenna gain is not stated for {mute}: not counted as interference.")
    if not_planned:
        notes.append(f"Not counted, because they could not be planned: {_listed(not_planned)}.")
    if free_space_only:
        notes.append("Paths between links were counted in free space, without terrain.")
    if with_gaps:
        notes.append(
            f"{with_gaps} pairs have a gap of the terrain between them: counted in free space, the worst case."
        )
    if paths_left:
        notes.append(
            f"{paths_left} weaker paths were counted in free space, the worst case: there are too many for the terrain."
        )
    return tuple(notes)


def _pair(result: InterferenceResult) -> str:
    return f"{_sender(result)} is heard at '{result.site}' ('{result.link}')"


def _sender(result: InterferenceResult) -> str:
    first = result.interferers[0]
    return f"'{first.site}' of '{first.link}'"


def _figures(result: InterferenceResult) -> str:
    first = result.interferers[0]
    words = f" with {first.level_dbm:.1f} dBm"
    if first.c_i_db is not None:
        words += f", {abs(first.c_i_db):.1f} dB {'below' if first.c_i_db >= 0.0 else 'above'} the carrier"
    if result.threshold_degradation_db is not None:
        words += f"; all neighbours together raise the threshold there by {result.threshold_degradation_db:.1f} dB"
    return words


def _names(pairs: Sequence[NearAntennas]) -> str:
    names = dict.fromkeys(name for pair in pairs for name in (pair.link, pair.other_link))
    return _listed(tuple(names))


def _of(stations: Sequence[Station]) -> str:
    return _listed(tuple(dict.fromkeys(one.link for one in stations)))


def _listed(names: Sequence[str], most: int = 4) -> str:
    shown = ", ".join(f"'{name}'" for name in names[:most])
    return shown if len(names) <= most else f"{shown} and {len(names) - most} more"
