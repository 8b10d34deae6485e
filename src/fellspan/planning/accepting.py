"""A link as built against its plan: works out what the engine must say of changes, and joins verdict, causes and rows.

Reads no measured file and writes nothing.
"""

from dataclasses import dataclass, replace

from fellspan.design.acceptance import in_ladder_order, rank_causes
from fellspan.design.acceptance_built import built_checks
from fellspan.design.acceptance_directions import IMBALANCE_DB, SAME_POWER_DB, SWING_HELD_DB, Judged, judge
from fellspan.design.acceptance_hypotheses import DESK, ENDS, GROUND, MAST, Change, Check, Numbers, db, label
from fellspan.design.acceptance_result import AcceptanceResult, Cause, DirectionCheck, PathAsBuilt
from fellspan.design.as_built import AsBuilt
from fellspan.errors import FellspanError
from fellspan.links.assess import Assessment, AssessSettings
from fellspan.links.radiated import power_checks
from fellspan.links.result import LinkResult
from fellspan.links.site import Link
from fellspan.planning import as_built_links as changed
from fellspan.planning.inputs import Study
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.planning.planner import settings_of
from fellspan.terrain.terrain import Terrain
from fellspan.vocabulary import PathVerdict

_ORDER: tuple[PathVerdict, ...] = ("clear", "marginal", "obstructed")
NO_LEVEL = "the link is not expected to work as planned, so the plan has no level to accept by"
WORTH_DB = 0.7
"""What the crew wrote down counts as a cause from this change on (our own figure)."""


_TAPE = Check(rung=GROUND, text="measure both heights again with a tape, from the same reference as planned")
_LOWER = Cause(
    key="height",
    title="antenna height or place as measured is not that of the plan",
    fit="stated by the crew",
    share=1.0,
    change_a_db=0.0,
    change_b_db=0.0,
    why="the level of an ordinary day does not show it, but the path as built is worse than the one planned",
    alike=(),
    tells_apart="",
    checks=(_TAPE.text,),
)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Stated:
    """What the crew wrote down that differs from the plan, and what the engine makes of it."""

    key: str
    title: str
    change: Change
    checks: tuple[Check, ...]


def accept_link(study: Study, planned: LinkPlan, built: AsBuilt, *, terrain: Terrain) -> AcceptanceResult:
    """Hold a link as built against its plan.

    Parameters
    ----------
    study, planned
        The study, and the link of it as `plan_study` planned it.
    built
        What the crew measured.
    terrain
        The terrain of the study, open: links are worked out again with what was measured.
    """
    settings, link, result = settings_of(study), planned.link, planned.result
    refuse = NO_LEVEL if result.verdict == "obstructed" or result.signal_verdict == "below" else ""
    there, back = judge(link, result, built, refuse=refuse)
    low_k, k = changed.low_k_change(planned, settings)
    numbers = Numbers(
        link=link,
        result=result,
        built=built,
        reflections=planned.reflections,
        low_k=low_k,
        low_k_value=k,
        lower=changed.lower_changes(planned, built, terrain, settings),
        crossed=changed.crossed_change(planned),
        others=changed.other_antennas(study, planned),
        expected_a_dbm=back.expected_dbm,
        expected_b_dbm=there.expected_dbm,
    )
    placed = _placed(link, built, terrain, settings)
    stated = _stated(study, planned, built, placed, settings, terrain)
    levels: tuple[float | None, float | None] = (None, None)
    if isinstance(placed, Assessment):
        ends = placed.result.ends
        levels = ends.a.antenna_amsl_m, ends.b.antenna_amsl_m
    path = _path(result, placed)
    causes, checks, notes = _causes(numbers, stated, there=there, back=back, worse=_is_worse(path))
    holds = _holds(link, built, path, (there, back))
    directions = there.check, back.check
    accepted = all(one.verdict == "accepted" for one in directions) and not holds
    return AcceptanceResult(
        link=result.name,
        revision=f"{study.revision}, as built" if study.revision else "as built",
        measured_on="" if built.date is None else built.date.isoformat(),
        measured_by=built.by,
        file=built.file,
        accepted=accepted,
        decision=_decision(directions, holds, causes),
        holds=holds,
        directions=directions,
        built=built_checks(numbers, as_built_amsl_m=levels),
        path=path,
        causes=causes,
        next_steps=in_ladder_order(checks),
        notes=(*notes, *_state_notes(built)),
    )


def with_acceptance(plan: StudyPlan, found: AcceptanceResult) -> StudyPlan:
    """The plan with what was found of one link beside its result."""
    return replace(
        plan,
        links=tuple(
            replace(linked, as_built=found) if linked.result.name == found.link else linked for linked in plan.links
        ),
    )


def as_built_issue(plan: StudyPlan, linked: LinkPlan) -> StudyPlan:
    """The plan as the page of one link names it: its revision is marked where the link was measured as built."""
    if linked.as_built is None:
        return plan
    return replace(plan, study=replace(plan.study, revision=linked.as_built.revision))


def _placed(
    link: Link, built: AsBuilt, terrain: Terrain, settings: AssessSettings
) -> Assessment | FellspanError | None:
    """The link with its antennas where they were measured; None where nothing of that was."""
    try:
        moved = changed.placed_as_built(link, built)
    except FellspanError as error:
        return error
    return None if (moved.a, moved.b) == (link.a, link.b) else changed.assessed(moved, terrain, settings)


def _stated(
    study: Study,
    planned: LinkPlan,
    built: AsBuilt,
    placed: Assessment | FellspanError | None,
    settings: AssessSettings,
    terrain: Terrain,
) -> tuple[_Stated, ...]:
    """What was written down and changes the level: heights and places, lines, antennas, polarizations."""
    link, result = planned.link, planned.result
    found: list[_Stated | None] = []
    if isinstance(placed, Assessment):
        found.append(_changed("height", _LOWER.title, placed.result, result, _TAPE))
    _, lost = changed.stated_line(link, built)
    if lost:
        change = Change(words="", a_db=-lost, b_db=-lost)
        title = (
            "feeders as measured lose more than planned" if lost > 0.0 else "feeders as measured lose less than planned"
        )
        line = Check(rung=MAST, text="shorten the line or take a better one, or put its loss into the study")
        found.append(_Stated(key="feeder", title=title, change=change, checks=(line,)))
    other, turned = link, link
    for end in ENDS:
        told = built.end(end)
        antenna = link.antenna_a if end == "a" else link.antenna_b
        named = changed.named_antenna(study, link, told.antenna) if told.antenna else None
        if named is not None and named.name.casefold() != antenna.name.casefold():
            other = changed.with_antenna(
                other, end, replace(antenna, gain_dbi=named.gain_dbi, pattern=named.pattern, name=named.name)
            )
        hung = result.antennas
        if told.polarization is not None and hung is not None:
            plan = hung.a if end == "a" else hung.b
            if told.polarization != plan.polarization and "dual" not in (told.polarization, plan.polarization):
                turned = changed.with_polarization(turned, end, plan, told.polarization)
    for key, title, as_is, todo in (
        (
            "other antenna",
            "another antenna was put up than planned",
            other,
            "put up the antenna of the plan, or plan again",
        ),
        (
            "polarization",
            "the polarizations as mounted differ",
            turned,
            "turn one antenna (or its feed), and read again",
        ),
    ):
        if as_is is not link:
            outcome = changed.assessed(as_is, terrain, settings)
            if isinstance(outcome, Assessment):
                found.append(_changed(key, title, outcome.result, result, Check(rung=MAST, text=todo)))
    return tuple(one for one in found if one is not None and abs(one.change.a_db) >= WORTH_DB)


def _changed(key: str, title: str, new: LinkResult, planned: LinkResult, check: Check) -> _Stated | None:
    change = changed.change_of("", new, planned)
    return None if change is None else _Stated(key=key, title=title, change=change, checks=(check,))


def _causes(
    numbers: Numbers, stated: tuple[_Stated, ...], *, there: Judged, back: Judged, worse: bool
) -> tuple[tuple[Cause, ...], list[Check], list[str]]:
    """Causes, the likeliest first; what the crew wrote down leads where it brings the levels nearer."""
    notes: list[str] = []
    listed: list[Cause] = []
    checks: list[Check] = []
    if worse and "height" not in {one.key for one in stated}:
        listed.append(_LOWER)
        checks.append(_TAPE)
    for end, judged in (("A", there), ("B", back)):
        if abs(judged.stated_change_db) > SAME_POWER_DB:
            check = Check(rung=DESK, text=f"set power and modulation at {end} as planned, and read again")
            checks.append(check)
            listed.append(_power_set(end, judged, check))
    shift = [0.0, 0.0]
    offs = back.difference_db, there.difference_db
    for one in stated:
        steps = (one.change.a_db, one.change.b_db)
        nearer = _miss(offs, [old + step for old, step in zip(shift, steps, strict=True)]) < _miss(offs, shift)
        if nearer:
            shift = [old + step for old, step in zip(shift, steps, strict=True)]
            listed.append(_written(one))
            checks += one.checks
        else:
            notes.append(
                f"{one.title}: that should change the level by {steps[0]:+.1f} dB, and it did not; check what was written down"
            )
    told = any(_uneven(judged) or judged.check.swing_db >= SWING_HELD_DB for judged in (there, back))
    left = [None if off is None else off - part for off, part in zip(offs, shift, strict=True)]
    bands = back.check.band_db, there.check.band_db
    if told or any(off is not None and abs(off) > band for off, band in zip(left, bands, strict=True)):
        ranked, more = rank_causes(numbers, at_a=back, at_b=there, shift_a_db=shift[0], shift_b_db=shift[1])
        taken = {cause.key for cause in listed}
        listed += [cause for cause in ranked if cause.key not in taken]
        checks += more
    return tuple(listed), checks, notes


def _miss(offs: tuple[float | None, float | None], shift: list[float]) -> float:
    return sum(abs(off - part) for off, part in zip(offs, shift, strict=True) if off is not None)


def _uneven(judged: Judged) -> bool:
    return judged.read is not None and judged.read.imbalance_db >= IMBALANCE_DB


def _power_set(end: str, judged: Judged, check: Check) -> Cause:
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


def _written(one: _Stated) -> Cause:
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


def _path(planned: LinkResult, placed: Assessment | FellspanError | None) -> PathAsBuilt:
    if placed is None:
        return PathAsBuilt(
            verdict=None,
            planned_verdict=planned.verdict,
            confidence=None,
            missing_m=None,
            sentence="heights and places were not measured, or are as planned: the verdict on the path stands as planned",
            remeasured=False,
        )
    if isinstance(placed, FellspanError):
        return PathAsBuilt(
            verdict=None,
            planned_verdict=planned.verdict,
            confidence=None,
            missing_m=None,
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
            f"; {governing.shortfall_m:.1f} m are missing at {governing.shortfall_at_m / 1000.0:.2f} km from A for "
            f"{governing.criterion} ({governing.cause})"
        )
    return PathAsBuilt(
        verdict=result.verdict,
        planned_verdict=planned.verdict,
        confidence=result.confidence,
        missing_m=governing.shortfall_m,
        sentence=words,
        remeasured=True,
    )


def _is_worse(path: PathAsBuilt) -> bool:
    return path.verdict is not None and _ORDER.index(path.verdict) > _ORDER.index(path.planned_verdict)


def _holds(link: Link, built: AsBuilt, path: PathAsBuilt, judged: tuple[Judged, Judged]) -> tuple[str, ...]:
    """What stands against acceptance whatever the levels are."""
    found: list[str] = []
    if _is_worse(path):
        found.append(f"{path.sentence}: the level of today says nothing of the worst month")
    for one in judged:
        if one.read is not None and _uneven(one):
            low = f"chain {one.read.weakest} is {one.read.imbalance_db:.1f} dB under the best of the others"
            found.append(f"{one.check.direction}: {low}")
        if one.check.swing_db >= SWING_HELD_DB:
            found.append(
                f"{one.check.direction}: readings of different times lie {one.check.swing_db:.1f} dB apart; find out why first"
            )
    for end in ENDS:
        power = built.end(end).power_dbm
        if power is None:
            continue
        radio = replace(link.radio, power_dbm=power, power_per_chain_dbm=None, modulations=(), wanted=None)
        checks = power_checks(replace(link, radio=radio))
        check = None if checks is None else checks.a if end == "a" else checks.b
        if check is not None and check.is_breach:
            found.append(f"the power measured at {label(end)} breaks its rule: {check.sentence}")
    return tuple(found)


def _state_notes(built: AsBuilt) -> list[str]:
    notes = []
    if built.power_control is None:
        notes.append("the file does not say that power control was off")
    if built.adaptive_modulation == "on":
        notes.append("adaptive modulation was on: a radio may send with other power at another modulation")
    if built.modulation is None:
        notes.append("the file does not say which modulation was set; the planned one is taken")
    return notes


def _decision(directions: tuple[DirectionCheck, ...], holds: tuple[str, ...], causes: tuple[Cause, ...]) -> str:
    """One sentence for the top of the page."""
    if all(one.verdict == "accepted" for one in directions):
        if not holds:
            return "Accepted: both directions are within their band."
        return f"Not accepted, though both directions are within their band: {holds[0]}."
    parts = "; ".join(f"{one.direction} {one.verdict}: {one.why}" for one in directions)
    first = next((cause for cause in causes), None)
    if first is None:
        return f"{parts}."
    words = {
        "stated by the crew": "by what the crew wrote down",
        "fits well": "likeliest, and it fits well",
        "possible": "likeliest, but no more than possible",
        "cannot be told apart": "first of several that cannot be told apart",
    }[first.fit]
    return f"{parts}. First to look at ({words}): {first.title}."
