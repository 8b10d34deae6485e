"""What is left of a relay's margin where its hops share one channel or other links are on the air; channels for each hop.

Each hop is judged on a channel of its own; this tells what that is worth. Joins planned hops as neighbours, works out no level.
"""

import dataclasses
from collections.abc import Sequence
from typing import TYPE_CHECKING, Final

from fellspan.links.receivers import blocked
from fellspan.links.site import Link
from fellspan.planning.inputs import Study
from fellspan.planning.neighbours import neighbours_of
from fellspan.planning.plan import LinkPlan
from fellspan.planning.planner import plan_study
from fellspan.planning.relay_result import ChannelUse

if TYPE_CHECKING:
    from fellspan.terrain.terrain import Terrain

MOST_OTHERS: Final = 40
"""Other links of a study that are planned for this; of a study with more, none are."""


APART_WIDTHS: Final = (1.5, 1.0)
"""How far channels of hops are set apart, in channel widths, the first that fits (our own rule)."""
_MOST_STEPS: Final = 20


def own_channels_hz(hops: Sequence[Link]) -> tuple[float, ...] | None:
    """A channel for each hop within the band of the link's power rule, Hz, the first hop on the link's own.

    None where no such channels are known: no rule whose text was seen, no channel width, a pair of frequencies, a noise floor
    that holds for a part of the band only, or no room in the band beside what the sites cannot use.
    """
    radio, rule = hops[0].radio, hops[0].power_rule
    width = radio.bandwidth_hz
    if rule is None or rule.status != "rule text seen" or width is None or radio.duplex != "time":
        return None
    floors = [floor for hop in hops for site in (hop.a, hop.b) for floor in site.noise_floors]
    if any(floor.low_hz is not None or floor.high_hz is not None for floor in floors):
        return None
    if not rule.holds_for(radio.frequency_hz, width):
        return None
    for apart in APART_WIDTHS:
        step = apart * width
        steps = [side * number * step for number in range(1, _MOST_STEPS + 1) for side in (1, -1)]
        left = [radio.frequency_hz + by for by in steps if rule.holds_for(radio.frequency_hz + by, width)]
        found = [radio.frequency_hz]
        for hop in hops[1:]:
            free = next(
                (
                    at
                    for at in left
                    if at not in found and not any(blocked(site, radio, frequency_hz=at) for site in (hop.a, hop.b))
                ),
                None,
            )
            if free is not None:
                found.append(free)
        if len(found) == len(hops):
            return tuple(found)
    return None


def on_own_channels(hops: Sequence[Link]) -> tuple[Link, ...]:
    """The hops on channels of their own; as they are where none are known."""
    channels = own_channels_hz(hops)
    if channels is None:
        return tuple(hops)
    return tuple(
        dataclasses.replace(hop, radio=dataclasses.replace(hop.radio, frequency_hz=at))
        for hop, at in zip(hops, channels, strict=True)
    )


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
