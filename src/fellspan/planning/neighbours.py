"""Links of a study as neighbours: what they do to each other, and the cautions that follow for each of them.

Joins planned links with the terrain; works nothing out itself and writes nothing.
"""

from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

from fellspan.links.interference import study_interference
from fellspan.links.interference_result import StudyInterference
from fellspan.links.neighbour_words import receiver_caution
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
    return replace(plan, result=replace(plan.result, cautions=(*plan.result.cautions, *cautions)))


def _is_known(plan: LinkPlan) -> bool:
    received = plan.result.received_dbm
    return received.at_a is not None or received.at_b is not None
