"""A link as built against its plan: works out what the engine must say of changes, and joins verdict, causes and rows.

Reads no measured file and writes nothing.
"""

from dataclasses import replace

from fellspan.design.acceptance import in_ladder_order, rank_causes
from fellspan.design.acceptance_built import built_checks
from fellspan.design.acceptance_directions import IMBALANCE_DB, SAME_POWER_DB, SWING_HELD_DB, Judged, judge
from fellspan.design.acceptance_hypotheses import DESK, ENDS, MAST, Change, Check, Numbers, label
from fellspan.design.acceptance_result import AcceptanceResult, Cause, PathAsBuilt
from fellspan.design.as_built import AsBuilt
from fellspan.errors import FellspanError
from fellspan.links.assess import Assessment, AssessSettings
from fellspan.links.radiated import power_checks
from fellspan.links.result import LinkResult
from fellspan.links.site import Link
from fellspan.planning import as_built_links as changed
from fellspan.planning.accepting_words import (
    LOWER,
    TAPE,
    Stated,
    decision,
    is_worse,
    path_as_built,
    power_set,
    state_notes,
    written,
)
from fellspan.planning.inputs import Study
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.planning.planner import settings_of
from fellspan.terrain.terrain import Terrain

NO_LEVEL = "the link is not expected to work as planned, so the plan has no level to accept by"
WORTH_DB = 0.7
"""What the crew wrote down counts as a cause from this change on (our own figure)."""


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
    path = path_as_built(result, placed)
    causes, checks, notes = _causes(numbers, stated, there=there, back=back, worse=is_worse(path))
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
        decision=decision(directions, holds, causes),
        holds=holds,
        directions=directions,
        built=built_checks(numbers, as_built_amsl_m=levels),
        path=path,
        causes=causes,
        next_steps=in_ladder_order(checks),
        notes=(*notes, *state_notes(built)),
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
) -> tuple[Stated, ...]:
    """What was written down and changes the level: heights and places, lines, antennas, polarizations."""
    link, result = planned.link, planned.result
    found: list[Stated | None] = []
    if isinstance(placed, Assessment):
        found.append(_changed("height", LOWER.title, placed.result, result, TAPE))
    _, lost = changed.stated_line(link, built)
    if lost:
        change = Change(words="", a_db=-lost, b_db=-lost)
        title = (
            "feeders as measured lose more than planned" if lost > 0.0 else "feeders as measured lose less than planned"
        )
        line = Check(rung=MAST, text="shorten the line or take a better one, or put its loss into the study")
        found.append(Stated(key="feeder", title=title, change=change, checks=(line,)))
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


def _changed(key: str, title: str, new: LinkResult, planned: LinkResult, check: Check) -> Stated | None:
    change = changed.change_of("", new, planned)
    return None if change is None else Stated(key=key, title=title, change=change, checks=(check,))


def _causes(
    numbers: Numbers, stated: tuple[Stated, ...], *, there: Judged, back: Judged, worse: bool
) -> tuple[tuple[Cause, ...], list[Check], list[str]]:
    """Causes, the likeliest first; what the crew wrote down leads where it brings the levels nearer."""
    notes: list[str] = []
    listed: list[Cause] = []
    checks: list[Check] = []
    if worse and "height" not in {one.key for one in stated}:
        listed.append(LOWER)
        checks.append(TAPE)
    for end, judged in (("A", there), ("B", back)):
        if abs(judged.stated_change_db) > SAME_POWER_DB:
            check = Check(rung=DESK, text=f"set power and modulation at {end} as planned, and read again")
            checks.append(check)
            listed.append(power_set(end, judged, check))
    shift = [0.0, 0.0]
    offs = back.difference_db, there.difference_db
    for one in stated:
        steps = (one.change.a_db, one.change.b_db)
        nearer = _miss(offs, [old + step for old, step in zip(shift, steps, strict=True)]) < _miss(offs, shift)
        if nearer:
            shift = [old + step for old, step in zip(shift, steps, strict=True)]
            listed.append(written(one))
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


def _holds(link: Link, built: AsBuilt, path: PathAsBuilt, judged: tuple[Judged, Judged]) -> tuple[str, ...]:
    """What stands against acceptance whatever the levels are."""
    found: list[str] = []
    if is_worse(path):
        found.append(f"{path.sentence}: the level of today says nothing of the worst month")
    elif path.remeasured and path.verdict is None:
        found.append(path.sentence)
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
