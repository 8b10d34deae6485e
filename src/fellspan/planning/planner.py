"""Plans a study: opens its terrain once, assesses each link, and notes which files the plan rests on.

One link that cannot be assessed does not stop the others. Reads no study file and writes nothing.
"""

from collections.abc import Callable, Iterator
from dataclasses import replace
from typing import Final

from fellspan import __version__
from fellspan.design.heights_result import HeightSettings
from fellspan.planning.far_away import far_cautions
from fellspan.planning.inputs import Study
from fellspan.planning.linkwise import Asked, open_terrain, planned_links, settings_of
from fellspan.planning.neighbours import neighbours_of, with_cautions
from fellspan.planning.plan import LinkFailure, LinkPlan, StudyPlan
from fellspan.planning.stamp import input_files
from fellspan.planning.what_if import ages_of, what_if_of
from fellspan.terrain.survey import link_key
from fellspan.terrain.terrain import Terrain

__all__ = ["Progress", "open_terrain", "plan_study", "settings_of"]

_AS_USUAL: Final = HeightSettings()

Progress = Callable[[int, int, str], None]
"""Called with the number of links done, the number of all, and the name of the one in hand."""


def plan_study(
    study: Study,
    *,
    progress: Progress | None = None,
    heights: HeightSettings = _AS_USUAL,
    horizons: bool = False,
    equipment: bool = False,
    what_if: bool = False,
    processes: int = 1,
) -> StudyPlan:
    """Assess every link of a study.

    `heights` says how antenna heights are searched; `horizons` adds skylines for aiming, `equipment` the antennas of the
    catalogue compared on each link, `what_if` the points that could govern at other heights, which pages work with.
    `processes` above 1 shares many links between so many processes, where no raster overlaps another; the answers are the
    same. A script that asks for it must stand behind `if __name__ == "__main__":`.

    Raises
    ------
    TerrainError
        The terrain cannot be opened; what is wrong on the path of one link is that link's failure instead.
    """
    asked = Asked(study=study, heights=heights, horizons=horizons, equipment=equipment, what_if=what_if)
    with open_terrain(study) as terrain:
        planned: list[LinkPlan] = []
        failures: list[LinkFailure] = []
        # What is said of a path names the seams met before it: with seams, one process goes from link to link.
        alone = any(len(stack.files) > 1 for stack in terrain.layers.stacks)
        for done, outcome in enumerate(planned_links(asked, terrain, processes=1 if alone else processes)):
            if progress is not None:
                progress(done, len(study.links), outcome.link.name)
            if isinstance(outcome, LinkPlan):
                planned.append(outcome)
            else:
                failures.append(outcome)
        interference = neighbours_of(planned, failures, terrain, median_k=study.median_k)
        cautions = (
            *study.notes,
            *terrain.notes,
            *_unused_survey(study, terrain),
            *_left_out_neighbours(study),
            *far_cautions(terrain.listed, study.links),
        )
        if what_if and any(plan.what_if is None for plan in planned):
            # Last, so that a closer look at the terrain changes nothing of the plan.
            ages = ages_of(terrain)
            planned = [
                replace(plan, what_if=what_if_of(plan.link, plan.profile, terrain, ages=ages)) for plan in planned
            ]
    if progress is not None:
        progress(len(study.links), len(study.links), "")
    return StudyPlan(
        study=study,
        links=with_cautions(planned, interference),
        failures=tuple(failures),
        files=input_files(study),
        version=__version__,
        cautions=tuple(dict.fromkeys(cautions)),
        interference=interference,
    )


def _left_out_neighbours(study: Study) -> Iterator[str]:
    """A link that is planned alone has no neighbours in this run, but it will have them on the mast."""
    if study.links_left_out:
        count = len(study.links_left_out)
        yield (
            f"neighbours: {count} other {'link' if count == 1 else 'links'} of this study {'was' if count == 1 else 'were'} "
            "left out, so what they do to the signal is not counted here; plan the whole study for that"
        )


def _unused_survey(study: Study, terrain: Terrain) -> Iterator[str]:
    """Survey rows that name a link which the study does not have would be lost without a word."""
    keys = {link_key(name) for name in (*(link.name for link in study.links), *study.links_left_out)}
    for name in terrain.survey_links:
        if link_key(name) not in keys:
            yield f"survey: rows for a link '{name}', which this study does not have, were not used"
