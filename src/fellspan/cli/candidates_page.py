"""The terminal page of a run over pairs, at 80 columns: what the places get, what stands in the way, what to do next.

Shows what was counted and computes nothing.
"""

from collections.abc import Sequence
from pathlib import Path
from typing import Final

from fellspan.cli.layout import Ink, printable, rule, table, wrapped
from fellspan.links.words import STATE_WORDS
from fellspan.runs.summary import RunSummary

_TONES: Final = {"clear": "good", "clear-bare": "doubt", "marginal": "doubt", "obstructed": "bad"}
_MOST_HUBS: Final = 12
_MOST_NOTES: Final = 6


def page_lines(
    summary: RunSummary, *, title: str, notes: Sequence[str], out: Path, chosen: bool, ink: Ink
) -> list[str]:
    """The page as lines without line ends."""
    reached = summary.places - summary.by_best_state["no hub in reach"]
    lines = [ink.emphasise(wrapped(f"{title}: {_many(len(summary.hubs), 'hub')}, {_many(summary.places, 'place')}")[0])]
    lines += wrapped(f"{_many(summary.pairs, 'pair')} judged, {_many(reached, 'place')} with a hub in reach.")
    lines += ["", *_places(summary, ink), "", *_pairs(summary), "", *_hubs(summary, ink)]
    if summary.refusals:
        lines += ["", ink.emphasise("Not judged")]
        for reason, count in summary.refusals:
            lines += wrapped(f"{_many(count, 'pair')}: {reason}", first="  ")
    lines += ["", rule(), *_cautions(summary, notes)]
    lines += ["", *_next(out, chosen, summary.no_chosen)]
    return lines


def counted(count: int) -> str:
    """A number with its thousands apart."""
    return f"{count:,}".replace(",", " ")


def _many(count: int, what: str) -> str:
    return f"{counted(count)} {what}{'' if count == 1 else 's'}"


def _places(summary: RunSummary, ink: Ink) -> list[str]:
    counts = summary.by_best_state
    clear = counts["clear"] + counts["clear-bare"]
    lines = wrapped(f"{_many(clear, 'place')} of {counted(summary.places)} with at least one clear hub:")
    for state, words in STATE_WORDS.items():
        share = 100.0 * counts[state] / max(summary.places, 1)
        named = ink.emphasise(words, _TONES[state])
        lines.append(f"  {counted(counts[state]):>9} {share:>5.1f} %  {named}")
    for word, said in (("no answer", "no answer: gaps or refused, see below"), ("no hub in reach", "no hub in reach")):
        if counts[word]:
            lines.append(f"  {counted(counts[word]):>9} {100.0 * counts[word] / summary.places:>5.1f} %  {said}")
    if any(summary.by_signal.values()):
        lines += wrapped(
            f"{_many(summary.places_served, 'place')} with a clear hub whose signal meets margin and target too."
        )
        if summary.unjudged:
            lines += wrapped(
                f"The target cannot be judged for {_many(summary.unjudged, 'pair')}, marginal at best: {summary.unjudged_why}."
            )
    else:
        lines += wrapped("No signal was worked out: the radio states no power or no threshold.")
    return lines


def _pairs(summary: RunSummary) -> list[str]:
    states = ", ".join(f"{counted(summary.by_state[state])} {words}" for state, words in STATE_WORDS.items())
    lines = wrapped(f"Pairs: {states}.")
    status = summary.by_status
    other = [
        f"{counted(status['gap'])} over a gap in the terrain" if status["gap"] else "",
        f"{counted(status['same place'])} at one and the same place" if status["same place"] else "",
        f"{counted(status['refused'])} refused" if status["refused"] else "",
    ]
    if any(other):
        lines += wrapped(f"Without an answer: {', '.join(part for part in other if part)}.")
    return lines


def _hubs(summary: RunSummary, ink: Ink) -> list[str]:
    listed = sorted(summary.hubs, key=lambda hub: (-hub.best_for, hub.name))
    heads = ("Hub", "best for", "pairs", "clear", "bare", "marginal", "obstr.")
    rows = [
        (
            hub.name,
            counted(hub.best_for),
            counted(hub.pairs),
            *(counted(hub.by_state[state]) for state in ("clear", "clear-bare", "marginal", "obstructed")),
        )
        for hub in listed[:_MOST_HUBS]
    ]
    lines = table(heads, rows, widths=(26, 8, 8, 8, 8, 8, 8), right=(1, 2, 3, 4, 5, 6))
    lines[0] = ink.emphasise(lines[0])
    if listed[_MOST_HUBS:]:
        lines += wrapped(f"and {len(listed) - _MOST_HUBS} more hubs; summary.json lists all", first="  ")
    return lines


def _cautions(summary: RunSummary, notes: Sequence[str]) -> list[str]:
    lines: list[str] = []
    if summary.by_basis["bare ground only"]:
        lines += wrapped(
            f"{_many(summary.by_basis['bare ground only'], 'pair')} rest on bare ground only: trees and buildings are not "
            "in the data, and a path that is clear there may be blocked. Look before anything is promised.",
            first="  ! ",
        )
    lines += wrapped(
        "A raster decides nothing for good: plan the pairs that are chosen in full, and verify them on the ground.",
        first="  ! ",
    )
    for note in notes[:_MOST_NOTES]:
        lines += wrapped(note, first="  ! ")
    if notes[_MOST_NOTES:]:
        lines += wrapped(f"{len(notes) - _MOST_NOTES} more notes stand in summary.json", first="  ! ")
    return lines


def _next(out: Path, chosen: bool, no_chosen: str) -> list[str]:
    lines = wrapped(f"map and lists: {printable(str(out / 'index.html'))}")
    if chosen:
        lines += wrapped(f"next: fellspan plan {printable(str(out / 'chosen.toml'))} --out REPORT")
    else:
        if no_chosen:
            lines += wrapped(f"chosen.toml was not written: {no_chosen}")
        lines += wrapped("next: put the pairs that matter into a study, and plan them with fellspan plan")
    return lines
