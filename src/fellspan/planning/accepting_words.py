"""What is said of a link as built: decision, path, and the causes that the crew itself wrote down. Words, no engine."""

from dataclasses import dataclass

from fellspan.design.acceptance_directions import Judged
from fellspan.design.acceptance_hypotheses import GROUND, Change, Check, db
from fellspan.design.acceptance_result import Cause, DirectionCheck, PathAsBuilt
from fellspan.design.as_built import AsBuilt
from fellspan.errors import FellspanError
from fellspan.links.assess import Assessment
from fellspan.links.result import LinkResult
from fellspan.vocabulary import PathVerdict

_ORDER: tuple[PathVerdict, ...] = ("clear", "marginal", "obstructed")
WORSE_M = 0.5
"""A path that lacks this much more height than planned is worse, whatever its verdict (our own figure)."""
TAPE = Check(rung=GROUND, text="measure both heights again with a tape, from the same reference as planned")
LOWER = Cause(
    key="height",
    title="antenna height or place as measured is not that of the plan",
    fit="stated by the crew",
    share=1.0,
    change_a_db=0.0,
    change_b_db=0.0,
    why="the level of an ordinary day does not show it, but the path as built is worse than the one planned",
    alike=(),
    tells_apart="",
    checks=(TAPE.text,),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Stated:
    """What the crew wrote down that differs from the plan, and what the engine makes of it."""

    key: str
    title: str
    change: Change
    checks: tuple[Check, ...]


def power_set(end: str, judged: Judged, check: Check) -> Cause:
    """Power or modulation that the crew says was set otherwise than planned."""
    change = judged.stated_change_db
    at_a = judged.check.direction == "B to A"
    return Cause(
        key="power",
        title=f"{end} transmitted with other power than planned",
        fit="stated by the crew",
        share=1.0,
        change_a_db=change if at_a else 0.0,
        change_b_db=0.0 if at_a else change,
        why=f"what the file says of power and modulation at {end} changes the level of {judged.check.direction} by "
        f"{change:+.1f} dB; the level expected here counts that in already",
        alike=(),
        tells_apart="",
        checks=(check.text,),
    )


def written(one: Stated) -> Cause:
    """A cause that the crew wrote down, with what the engine makes of it."""
    return Cause(
        key=one.key,
        title=one.title,
        fit="stated by the crew",
        share=1.0,
        change_a_db=one.change.a_db,
        change_b_db=one.change.b_db,
        why=f"worked out again with what was measured, the level changes by {db(one.change.a_db)} at A and "
        f"{db(one.change.b_db)} at B",
        alike=(),
        tells_apart="",
        checks=tuple(check.text for check in one.checks),
    )


def path_as_built(planned: LinkResult, placed: Assessment | FellspanError | None) -> PathAsBuilt:
    """The verdict on the path where the antennas were measured."""
    short = planned.clearance[planned.governing].shortfall_m
    if placed is None:
        return PathAsBuilt(
            verdict=None,
            planned_verdict=planned.verdict,
            confidence=None,
            missing_m=None,
            planned_missing_m=short,
            sentence="heights and places were not measured, or are as planned: the verdict on the path stands as planned",
            remeasured=False,
        )
    if isinstance(placed, FellspanError):
        return PathAsBuilt(
            verdict=None,
            planned_verdict=planned.verdict,
            confidence=None,
            missing_m=None,
            planned_missing_m=short,
            sentence=f"the path could not be worked out as built: {placed.what}",
            remeasured=True,
        )
    result = placed.result
    governing = result.clearance[result.governing]
    words = f"the path as built is {result.verdict}" + (
        ", as planned" if result.verdict == planned.verdict else f"; {planned.verdict} was planned"
    )
    if governing.shortfall_m > 0.0:
        words += (
            f"; {governing.shortfall_m:.1f} m (planned: {short:.1f} m) are missing at "
            f"{governing.shortfall_at_m / 1000.0:.2f} km from A for "
            f"{governing.criterion} ({governing.cause})"
        )
    return PathAsBuilt(
        verdict=result.verdict,
        planned_verdict=planned.verdict,
        confidence=result.confidence,
        missing_m=governing.shortfall_m,
        planned_missing_m=short,
        sentence=words,
        remeasured=True,
    )


def is_worse(path: PathAsBuilt) -> bool:
    """Whether the path as built is worse than the one planned."""
    if path.verdict is None or path.missing_m is None:
        return False
    lower = path.missing_m > path.planned_missing_m + WORSE_M
    return lower or _ORDER.index(path.verdict) > _ORDER.index(path.planned_verdict)


def state_notes(built: AsBuilt) -> list[str]:
    """What the file leaves open of the state of the radios."""
    notes = []
    if built.power_control is None:
        notes.append("the file does not say that power control was off")
    if built.adaptive_modulation == "on":
        notes.append("adaptive modulation was on: a radio may send with other power at another modulation")
    if built.modulation is None:
        notes.append("the file does not say which modulation was set; the planned one is taken")
    return notes


def _told(directions: tuple[DirectionCheck, ...]) -> str:
    """'Not accepted: A to B 21.7 dB below, B to A 21.2 dB below the level expected'; each by itself where they differ."""
    verdicts = {one.verdict for one in directions}
    if verdicts == {"not accepted"}:
        offs = ", ".join(
            f"{one.direction} {abs(one.difference_db or 0.0):.1f} dB {'above' if (one.difference_db or 0.0) > 0 else 'below'}"
            for one in directions
        )
        return f"Not accepted: {offs} the level expected"
    parts = [f"{one.direction} {one.verdict} ({one.why})" for one in directions]
    whys = {one.why for one in directions}
    if len(verdicts) == 1 and len(whys) == 1:
        verdict = next(iter(verdicts))
        return f"Both directions {verdict}: {next(iter(whys))}"
    return "; ".join(parts)


def _is_off(one: DirectionCheck) -> bool:
    return one.difference_db is not None and abs(one.difference_db) > one.band_db


def decision(directions: tuple[DirectionCheck, ...], holds: tuple[str, ...], causes: tuple[Cause, ...]) -> str:
    """One sentence for the top of the page."""
    if all(one.verdict == "accepted" for one in directions):
        if not holds:
            return "Accepted: both directions are within their band."
        return f"Not accepted, though both directions are within their band: {holds[0]}."
    parts = _told(directions)
    first = next((cause for cause in causes), None)
    if first is None and not any(_is_off(one) for one in directions):
        return f"{parts}."
    if first is None:
        return f"{parts}. No cause known here explains it: see first that the file is of this link, and its units are right."
    words = {
        "stated by the crew": "by what the crew wrote down",
        "fits well": "likeliest, and it fits well",
        "possible": "likeliest, but no more than possible",
        "cannot be told apart": "first of several that cannot be told apart",
    }[first.fit]
    return f"{parts}. First to look at ({words}): {first.title}."
