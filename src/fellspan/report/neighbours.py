"""What pages show of neighbours: rows for the overview and for one link. Shows the plan and computes none of it."""

from dataclasses import dataclass
from typing import Final

from fellspan.links.interference_result import InterferenceResult, Interferer, PathStatus
from fellspan.links.result import AtEnds, LinkResult
from fellspan.links.words import decisive_margin_db, neighbours_take
from fellspan.planning.plan import StudyPlan

MOST_ROWS: Final = 40
"""Receivers that the overview lists."""
MOST_OF_LINK: Final = 5
"""Interferers that the page of a link lists for each of its receivers."""
PATH_WORDS: Final[dict[PathStatus, str]] = {
    "terrain": "over the terrain",
    "same site": "at one site",
    "no terrain": "free space: the terrain has a gap there",
    "free space": "free space, without terrain",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class NeighboursView:
    """What a template shows; `rows` and `harm` only of receivers that hear another link, the worst first."""

    worst: str | None
    rows: tuple[InterferenceResult, ...]
    more: int
    harm: tuple[tuple[InterferenceResult, Interferer], ...]
    warnings: tuple[str, ...]
    notes: tuple[str, ...]
    path_words: dict[PathStatus, str]


def left_by_neighbours(result: LinkResult) -> AtEnds | None:
    """The margin that neighbours leave at both ends; None where they take nothing that is seen of it."""
    return decisive_margin_db(result) if neighbours_take(result) else None


def neighbours_view(plan: StudyPlan, link: str | None = None) -> NeighboursView | None:
    """The view of the whole study, or of one link; None where nothing was worked out."""
    found = plan.interference
    if found is None:
        return None
    heard = [one for one in (found.receivers if link is None else found.at(link)) if one.interferers]
    warnings = found.warnings
    if link is not None:
        names = {
            *(pair.site for pair in found.near if link in (pair.link, pair.other_link)),
            *(pair.site for pair in found.high_low if link in (pair.high_link, pair.low_link)),
        }
        warnings = tuple(line for line in warnings if f"'{link}'" in line or any(f"'{name}'" in line for name in names))
    return NeighboursView(
        worst=found.worst if link is None else None,
        rows=tuple(heard[:MOST_ROWS] if link is None else heard),
        more=max(len(heard) - MOST_ROWS, 0) if link is None else 0,
        harm=() if link is None else tuple((one, each) for one in heard for each in one.interferers[:MOST_OF_LINK]),
        warnings=warnings,
        notes=found.notes,
        path_words=PATH_WORDS,
    )
