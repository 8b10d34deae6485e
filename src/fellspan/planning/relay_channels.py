"""What is left of a relay's margin where its hops share one channel, and where the other links of the study are on the air.

Each hop is judged on a channel of its own; this tells what that is worth. Joins planned hops as neighbours, works out no level.
"""

import dataclasses
from collections.abc import Sequence
from typing import TYPE_CHECKING, Final

from fellspan.planning.inputs import Study
from fellspan.planning.neighbours import neighbours_of
from fellspan.planning.plan import LinkPlan
from fellspan.planning.planner import plan_study
from fellspan.planning.relay_result import ChannelUse

if TYPE_CHECKING:
    from fellspan.terrain.terrain import Terrain

MOST_OTHERS: Final = 40
"""Other links of a study that are planned for this; of a study with more, none are."""


def other_links(study: Study, link_name: str) -> tuple[LinkPlan, ...] | None:
    """The other links of the study, planned; None where they are too many."""
    others = tuple(link for link in study.links if link.name != link_name)
    if len(others) > MOST_OTHERS:
        return None
    if not others:
        return ()
    return plan_study(dataclasses.replace(study, links=others, links_left_out=())).links


def channel_use(
    hops: Sequence[LinkPlan], others: Sequence[LinkPlan] | None, terrain: "Terrain", *, median_k: float
) -> ChannelUse | None:
    """Least margin of the hops on one channel, and of each hop on the link's channel beside the study's other links.

    None where the levels of the hops are not known.
    """
    shared = _least(hops, (), terrain, median_k=median_k)
    if shared is None:
        return None
    beside: float | None = None
    if others:
        each = [_least((hop,), others, terrain, median_k=median_k) for hop in hops]
        known = [one[0] for one in each if one is not None]
        beside = min(known) if known else None
    return ChannelUse(
        shared_db=shared[0], shared_at=shared[1], beside_study_db=beside, others_counted=others is not None
    )


def _least(
    hops: Sequence[LinkPlan], others: Sequence[LinkPlan], terrain: "Terrain", *, median_k: float
) -> tuple[float, str] | None:
    """The least margin that is left at an end of the hops, and which site that is."""
    found = neighbours_of((*hops, *others), (), terrain, median_k=median_k)
    if found is None:
        return None
    left = [
        (one.effective_margin_db, one.site)
        for hop in hops
        for one in found.at(hop.result.name)
        if one.effective_margin_db is not None
    ]
    return min(left) if left else None
