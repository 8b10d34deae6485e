"""The terminal page of a link as built: decision, both directions, what was measured against the plan, causes, what to do.

Shows what was found and computes nothing.
"""

from collections.abc import Iterator
from typing import Final

from fellspan.cli import figures
from fellspan.cli.layout import WIDTH, Ink, columns_of, cut, labelled, printable, table, wrapped
from fellspan.design.acceptance_result import AcceptanceResult, Cause, DirectionCheck

_LEVELS: Final = (8, 24, 10, 10, 7, 6, 8)
_TONES: Final = {"accepted": "good", "not accepted": "bad", "cannot be judged": "doubt"}
FIT_WORDS: Final = {
    "stated by the crew": "written down by the crew",
    "fits well": "fits well",
    "possible": "possible",
    "cannot be told apart": "possible, like others below",
}


def accept_lines(found: AcceptanceResult, *, ink: Ink) -> list[str]:
    """The page as lines without line ends."""
    when = found.measured_on or "date not stated"
    name = cut(printable(found.link), WIDTH - len(when) - 2)
    gap = " " * (WIDTH - columns_of(name) - len(when))
    verdict, tone = _verdict(found)
    return [
        f"{ink.emphasise(name)}{gap}{when}",
        ink.emphasise(verdict, tone),
        *wrapped(found.decision, first="  "),
        "",
        *_levels(found),
        *_built(found),
        "",
        *labelled("Path", found.path.sentence),
        *(line for hold in found.holds for line in wrapped(hold, first="  ! ", rest="    ")),
        *_causes(found, ink),
        *_steps(found),
        *_notes(found),
    ]


def _verdict(found: AcceptanceResult) -> tuple[str, str]:
    if found.accepted:
        return "ACCEPTED AS BUILT", "good"
    if any(one.verdict == "not accepted" for one in found.directions) or found.holds:
        return "NOT ACCEPTED", "bad"
    return "CANNOT BE JUDGED", "doubt"


def _levels(found: AcceptanceResult) -> Iterator[str]:
    heads = ("", "received at", "measured", "expected", "off", "band", "")
    rows = [
        (
            one.direction,
            one.received_at,
            _dbm(one.measured_dbm),
            _dbm(one.expected_dbm),
            "-" if one.difference_db is None else f"{one.difference_db:+.1f}",
            f"+-{one.band_db:g}",
            {"accepted": "ok", "not accepted": "NOT OK", "cannot be judged": "unsure"}[one.verdict],
        )
        for one in found.directions
    ]
    yield from ("  " + line for line in table(heads, rows, widths=_LEVELS, right=(2, 3, 4, 5)))
    for one in found.directions:
        for note in _of_direction(one):
            yield from wrapped(f"{one.direction}: {note}", first="  ", rest="    ")


def _of_direction(one: DirectionCheck) -> Iterator[str]:
    yield from one.notes
    if len(one.chains) > 1:
        yield "chains " + ", ".join(f"{name}: {level:.1f} dBm" for name, level in one.chains)
    if one.readings > 1:
        yield f"{one.readings} readings"


def _dbm(value: float | None) -> str:
    return figures.decibels(value, "dBm")


def _built(found: AcceptanceResult) -> Iterator[str]:
    if not found.built:
        return
    yield ""
    for one in found.built:
        mark = "!" if one.differs else " "
        told = f"{one.what}: {one.measured}; planned {one.planned} ({one.difference})" + (
            f"; {one.note}" if one.note else ""
        )
        yield from wrapped(told, first=f"{mark} {one.end}  ", rest="       ")


def _causes(found: AcceptanceResult, ink: Ink) -> Iterator[str]:
    if not found.causes:
        return
    yield ""
    yield ink.emphasise("Likely causes")
    for number, cause in enumerate(found.causes, start=1):
        yield from wrapped(f"{cause.title} ({FIT_WORDS[cause.fit]})", first=f"  {number}. ", rest="     ")
        yield from wrapped(f"{_predicts(cause)}{cause.why}", first="     ")
        if cause.alike:
            yield from wrapped(f"not told apart from: {'; '.join(cause.alike)}", first="     ")
            yield from wrapped(f"told apart by: {cause.tells_apart}", first="     ")


def _predicts(cause: Cause) -> str:
    if cause.change_a_db is None or cause.change_b_db is None:
        return ""
    return f"would change A by {cause.change_a_db:+.1f} dB and B by {cause.change_b_db:+.1f} dB: "


def _steps(found: AcceptanceResult) -> Iterator[str]:
    if not found.next_steps:
        return
    yield ""
    yield "Next, in this order; climb last, with the transmitter off"
    for number, step in enumerate(found.next_steps, start=1):
        yield from wrapped(step, first=f"  {number}. ", rest="     ")


def _notes(found: AcceptanceResult) -> Iterator[str]:
    if found.notes:
        yield ""
    for note in found.notes:
        yield from wrapped(note, first="  ! ", rest="    ")
