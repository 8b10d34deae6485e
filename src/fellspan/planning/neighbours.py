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
from fellspan.links.verdicts import signal_verdict
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
    """The links, those that neighbours harm with a caution more."""
    if found is None:
        return tuple(planned)
    return tuple(_with_cautions(plan, found) for plan in planned)


def _with_cautions(plan: LinkPlan, found: StudyInterference) -> LinkPlan:
    cautions = [caution for one in found.at(plan.result.name) if (caution := receiver_caution(one)) is not None]
    if not cautions:
        return plan
    receivers = found.at(plan.result.name)
    held = held_by_neighbours(plan.result, receivers)
    reasons = (*held.reasons, *_left_words(receivers))
    return replace(plan, result=replace(held, reasons=reasons, cautions=(*plan.result.cautions, *cautions)))


def _left_words(receivers: Sequence[InterferenceResult]) -> tuple[str, ...]:
    """What of the margin told above is left beside the neighbours, at the worse end."""
    known = [one for one in receivers if one.effective_margin_db is not None and one.margin_db is not None]
    if not known:
        return ()
    worst = min(known, key=lambda one: one.effective_margin_db or 0.0)
    words = (
        f"Neighbours on the same channel are not in that margin: they leave {worst.effective_margin_db:.1f} dB at "
        f"'{worst.site}', and availability falls with it."
    )
    return (words,)


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
    why = f"neighbours on the same channel leave {least:.1f} dB of margin, {result.wanted_margin_db:g} dB wanted"
    signal = result.signal
    if signal is not None:
        signal = replace(signal, verdict_reason="; ".join(word for word in (why, signal.verdict_reason) if word))
    return replace(result, signal_verdict=verdict, signal=signal)


def _is_known(plan: LinkPlan) -> bool:
    received = plan.result.received_dbm
    return received.at_a is not None or received.at_b is not None
