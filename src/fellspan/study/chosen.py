"""The best hub of each place as the links of a study file, for `fellspan plan` to look at in full.

Makes text; which pairs are chosen is the caller's business.
"""

import dataclasses
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Final

from fellspan.links.site import Link
from fellspan.planning.inputs import Study
from fellspan.planning.relay_channels import own_channels_hz
from fellspan.screening.pairs import Candidates
from fellspan.screening.single import link_of
from fellspan.study.writing import study_text

MOST_CHOSEN: Final = 500
"""More links than this are no longer looked at in full one by one."""


def chosen_text(study: Study, candidates: Candidates, chosen: Iterable[tuple[int, int, int]], *, folder: Path) -> str:
    """A study file of the pairs `chosen` (hub, sector, place), to stand in `folder`.

    Raises
    ------
    StudyError
        A hub and a place bear the same name, which a study file cannot say.
    """
    pairs = tuple(chosen)
    links = tuple(link_of(candidates, hub, sector, place) for hub, sector, place in pairs)
    links, said = _on_channels(links, [sector for _, sector, _ in pairs])
    made = study_text(dataclasses.replace(study, links=links, title=f"{study.title}: chosen"), folder=folder)
    return f"# The best hub of each place, chosen by `fellspan candidates`.\n{said}\n{made}"


def _on_channels(links: tuple[Link, ...], sectors: Sequence[int]) -> tuple[tuple[Link, ...], str]:
    """The links of each sector on a channel of its own, where the band of the rule has room; and what the file says of it."""
    first = {sector: link for link, sector in zip(reversed(links), reversed(sectors), strict=True)}
    in_order = list(dict.fromkeys(sectors))
    if len(in_order) < 2:
        return links, ""
    channels = own_channels_hz([first[sector] for sector in in_order])
    if channels is None:
        return links, (
            "# All links stand on one channel, as they were judged, and planning counts what sectors do to each other:\n"
            "# give the links of each sector a `frequency` of their own.\n"
        )
    of_sector = dict(zip(in_order, channels, strict=True))
    judged_hz = links[0].radio.frequency_hz
    moved = tuple(
        dataclasses.replace(link, radio=dataclasses.replace(link.radio, frequency_hz=of_sector[sector]))
        for link, sector in zip(links, sectors, strict=True)
    )
    return moved, (
        f"# Pairs were judged at {judged_hz / 1e9:g} GHz. Here each sector has a channel of its own in the band of the rule,\n"
        "# so that sectors do not disturb each other: change each `frequency` to what is free on the ground.\n"
    )
