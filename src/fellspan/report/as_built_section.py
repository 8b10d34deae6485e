"""The section of a link's page on what a crew measured: levels, causes, what to do, what was built. Computes nothing."""

import re
from dataclasses import dataclass
from typing import Final

from fellspan.design.acceptance_result import AcceptanceResult, Cause, DirectionCheck
from fellspan.design.equip_words import capital
from fellspan.planning.plan import LinkPlan
from fellspan.report import wording

_SYMBOL: Final = {"accepted": "✓", "not accepted": "✕", "cannot be judged": "?"}
_CLASS: Final = {"accepted": "clear", "not accepted": "obstructed", "cannot be judged": "marginal"}
FIT_WORDS: Final = {
    "stated by the crew": "written down by the crew",
    "fits well": "fits well",
    "possible": "possible",
    "cannot be told apart": "possible, and like others here",
}
_MINUS: Final = re.compile(r"(?<![\w.-])-(?=\d)")
_DEGREES: Final = re.compile(r"(?<=\d) deg\b")
Cells = tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class CauseView:
    """One cause: title, how far it can be trusted, what it predicts, why, and what would tell it from others."""

    title: str
    fit: str
    predicts: str
    why: str
    alike: str
    tells_apart: str


@dataclass(frozen=True, slots=True, kw_only=True)
class AsBuiltView:
    """All that the section shows."""

    state: str
    symbol: str
    verdict: str
    decision: str
    issue: str
    path: str
    holds: tuple[str, ...]
    levels: tuple[Cells, ...]
    level_notes: tuple[str, ...]
    built: tuple[tuple[Cells, bool, str], ...]
    causes: tuple[CauseView, ...]
    steps: tuple[str, ...]
    notes: tuple[str, ...]


def as_built_section(link: LinkPlan) -> AsBuiltView | None:
    """The view of one link; None where nothing was measured."""
    found = link.as_built
    if found is None:
        return None
    verdict = _verdict(found)
    return AsBuiltView(
        state=_CLASS[verdict],
        symbol=_SYMBOL[verdict],
        verdict="Accepted as built" if verdict == "accepted" else verdict.capitalize(),
        decision=found.decision,
        issue=_issue(found),
        path=capital(found.path.sentence),
        holds=tuple(capital(hold) for hold in found.holds),
        levels=tuple(_level(one) for one in found.directions),
        level_notes=tuple(f"{one.direction}: {note}." for one in found.directions for note in _notes(one)),
        built=tuple(
            (
                (row.end, capital(row.what), *(_figures(cell) for cell in (row.planned, row.measured, row.difference))),
                row.differs,
                row.note,
            )
            for row in found.built
        ),
        causes=tuple(_cause(cause) for cause in found.causes),
        steps=tuple(capital(step) for step in found.next_steps),
        notes=tuple(capital(note) for note in found.notes),
    )


def verdict_words(found: AcceptanceResult) -> str:
    """The verdict with its sign, for lists of many links."""
    verdict = _verdict(found)
    return f"{_SYMBOL[verdict]} {verdict}"


def _verdict(found: AcceptanceResult) -> str:
    if found.accepted:
        return "accepted"
    refused = found.holds or any(one.verdict == "not accepted" for one in found.directions)
    return "not accepted" if refused else "cannot be judged"


def _issue(found: AcceptanceResult) -> str:
    parts = [
        f"Revision {found.revision}",
        f"measured {found.measured_on or 'on a day not stated'}",
        f"by {found.measured_by}" if found.measured_by else "",
        f"from {found.file}" if found.file else "",
    ]
    return ", ".join(part for part in parts if part) + "."


def _level(one: DirectionCheck) -> Cells:
    return (
        one.direction,
        one.received_at,
        _dbm(one.measured_dbm),
        _dbm(one.planned_dbm),
        _dbm(one.expected_dbm),
        "–" if one.difference_db is None else f"{wording.number(one.difference_db, sign=True)} dB",
        f"±{wording.number(one.band_db, 0 if one.band_db == round(one.band_db) else 1)} dB",
        f"{_SYMBOL[one.verdict]} {one.verdict}",
    )


def _notes(one: DirectionCheck) -> list[str]:
    notes = list(one.notes)
    if one.verdict == "cannot be judged":
        notes.insert(0, one.why)
    if len(one.chains) > 1:
        notes.append("chains " + ", ".join(f"{name}: {_dbm(level)}" for name, level in one.chains))
    if one.readings > 1:
        notes.append(
            f"{one.readings} readings, {wording.number(one.swing_db)} dB between the highest and the lowest time"
        )
    return notes


def _figures(words: str) -> str:
    """Numbers of the terminal's words as pages write them; names stay as they are."""
    return _DEGREES.sub("°", _MINUS.sub("−", words))


def _dbm(value: float | None) -> str:
    return wording.decibels(value, "dBm")


def _cause(cause: Cause) -> CauseView:
    predicts = ""
    if cause.change_a_db is not None and cause.change_b_db is not None:
        at_a, at_b = (wording.number(change, sign=True) for change in (cause.change_a_db, cause.change_b_db))
        predicts = f"{at_a} dB at A, {at_b} dB at B"
    return CauseView(
        title=capital(cause.title),
        fit=FIT_WORDS[cause.fit],
        predicts=predicts,
        why=f"{capital(cause.why)}.",
        alike="; ".join(cause.alike),
        tells_apart=cause.tells_apart,
    )
