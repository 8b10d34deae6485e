"""Links of a study as neighbours: what they do to each other, and the cautions that follow for each of them.

Joins planned links with the terrain; works nothing out itself and writes nothing.
"""

from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

from fellspan.links.interference import study_interference
from fellspan.links.interference_result import InterferenceResult, StudyInterference
from fellspan.links.neighbour_words import receiver_caution
from fellspan.links.result import AtEnds, LinkResult
from fellspan.links.signal_verdict import worse_of
from fellspan.links.signal_words import (
    AVAILABLE_BEGINS,
    LEFT_OUT_NOTE,
    LEVEL_BEGINS,
    availability_sentence,
    level_sentence,
    wanted_words,
)
from fellspan.links.site import Link
from fellspan.links.verdicts import signal_verdict
from fellspan.links.words import decisive_margin_db, down_db, least_db, neighbours_take
from fellspan.planning.plan import LinkFailure, LinkPlan

if TYPE_CHECKING:
    from fellspan.terrain.terrain import Terrain


def neighbours_of(
    planned: Sequence[LinkPlan], failures: Sequence[LinkFailure], terrain: "Terrain", *, median_k: float
) -> StudyInterference | None:
    """What the links do to each other; None where fewer than two have their power and both gains stated."""
    if sum(_is_known(plan) for plan in planned) < 2:
        return None
    return study_interference(
        [(plan.link, plan.result) for plan in planned],
        terrain=terrain,
        median_k=median_k,
        not_planned=[failure.link.name for failure in failures],
    )


def with_cautions(planned: Sequence[LinkPlan], found: StudyInterference | None) -> tuple[LinkPlan, ...]:
    """The links with the margin that neighbours leave; those that they harm with a caution more."""
    if found is None:
        return tuple(planned)
    return tuple(_with_cautions(plan, found) for plan in planned)


def _with_cautions(plan: LinkPlan, found: StudyInterference) -> LinkPlan:
    receivers = found.at(plan.result.name)
    cautions = [caution for one in receivers if (caution := receiver_caution(one)) is not None]
    result = with_what_is_left(plan.link, held_by_neighbours(plan.result, receivers), receivers, harmed=bool(cautions))
    return replace(plan, result=replace(result, cautions=(*result.cautions, *cautions)))


def with_what_is_left(
    link: Link, result: LinkResult, receivers: Sequence[InterferenceResult], *, harmed: bool
) -> LinkResult:
    """The result with the margin that neighbours leave, and its sentences with it.

    Availability leaves neighbours out, and says so where they take what is seen of the margin, or where the link is `harmed`
    by what cannot be told as a margin.
    """
    left = {one.end: one.effective_margin_db for one in receivers if one.effective_margin_db is not None}
    if left:
        margin = AtEnds(at_a=left.get("A", result.margin_db.at_a), at_b=left.get("B", result.margin_db.at_b))
        result = replace(result, margin_with_neighbours_db=margin)
    if result.signal is None or not (harmed or neighbours_take(result)):
        return result
    signal = replace(
        result.signal,
        notes=(*result.signal.notes, LEFT_OUT_NOTE),
        verdict_reason=result.signal.verdict_reason.replace(_short(result), _short(result, with_neighbours=True)),
    )
    level = level_sentence(
        link,
        received_dbm=result.received_dbm,
        margin_db=result.margin_db,
        wanted=signal.a_to_b.wanted,
        left_db=result.margin_with_neighbours_db,
    )
    reasons = tuple(
        level
        if level is not None and line.startswith(LEVEL_BEGINS)
        else availability_sentence(signal, neighbours=True)
        if line.startswith(AVAILABLE_BEGINS)
        else line
        for line in result.reasons
    )
    return replace(result, signal=signal, reasons=reasons)


def _short(result: LinkResult, *, with_neighbours: bool = False) -> str:
    """The margin as the reason of a verdict tells it."""
    least, left = least_db(result.margin_db) or 0.0, least_db(decisive_margin_db(result))
    return wanted_words(least, left if with_neighbours else None, wanted_db=result.wanted_margin_db)


def held_by_neighbours(result: LinkResult, receivers: Sequence[InterferenceResult]) -> LinkResult:
    """The result with its signal verdict held down to the margin that neighbours leave, and the reason for it."""
    left = [one.effective_margin_db for one in receivers if one.effective_margin_db is not None]
    if not left or result.signal_verdict is None:
        return result
    least = min(left)
    verdict = worse_of(
        result.signal_verdict, signal_verdict(AtEnds(at_a=least, at_b=least), wanted_db=result.wanted_margin_db)
    )
    if verdict == result.signal_verdict:
        return result
    why = (
        f"neighbours on the same channel leave {down_db(least):.1f} dB of margin, {result.wanted_margin_db:g} dB wanted"
    )
    signal = result.signal
    if signal is not None:
        rest = [word for word in signal.verdict_reason.split("; ") if word and word != _short(result)]
        signal = replace(signal, verdict_reason="; ".join((why, *rest)))
    return replace(result, signal_verdict=verdict, signal=signal)


def _is_known(plan: LinkPlan) -> bool:
    received = plan.result.received_dbm
    return received.at_a is not None or received.at_b is not None
