"""The best hub of each place as the links of a study file, for `fellspan plan` to look at in full.

Makes text; which pairs are chosen is the caller's business.
"""

import dataclasses
from collections.abc import Iterable
from pathlib import Path
from typing import Final

from fellspan.planning.inputs import Study
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
    links = tuple(link_of(candidates, hub, sector, place) for hub, sector, place in chosen)
    made = study_text(dataclasses.replace(study, links=links, title=f"{study.title}: chosen"), folder=folder)
    return f"# The best hub of each place, chosen by `fellspan candidates`.\n\n{made}"
