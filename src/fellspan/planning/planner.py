"""Plans a study: opens its terrain once, assesses each link, and notes which files the plan rests on.

One link that cannot be assessed does not stop the others. Reads no study file and writes nothing.
"""

from collections.abc import Callable, Iterator
from dataclasses import replace
from typing import Final

from fellspan import __version__
from fellspan.antennas.catalogue import Catalogue, load_catalogue
from fellspan.design.heights import design_heights
from fellspan.design.heights_result import HeightSettings
from fellspan.design.reflections import Water, find_reflections
from fellspan.design.survey_list import survey_list
from fellspan.errors import FellspanError
from fellspan.links.assess import AssessSettings, assess_in_full
from fellspan.links.site import Link
from fellspan.planning.agreement import one_voice
from fellspan.planning.far_away import far_cautions
from fellspan.planning.horizons import with_horizons
from fellspan.planning.inputs import Study
from fellspan.planning.neighbours import neighbours_of, with_cautions
from fellspan.planning.outfits import equipment_of
from fellspan.planning.plan import LinkFailure, LinkPlan, StudyPlan
from fellspan.planning.slips import explained
from fellspan.planning.stamp import input_files
from fellspan.planning.water import water_of
from fellspan.planning.what_if import ages_of, what_if_of
from fellspan.terrain.survey import link_key
from fellspan.terrain.terrain import Terrain

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
) -> StudyPlan:
    """Assess every link of a study.

    `heights` says how antenna heights are searched; `horizons` adds skylines for aiming, `equipment` the antennas of the
    catalogue compared on each link, `what_if` the points that could govern at other heights, which pages work with.

    Raises
    ------
    TerrainError
        The terrain cannot be opened; what is wrong on the path of one link is that link's failure instead.
    """
    settings = settings_of(study)
    water = water_of(study)
    catalogue = load_catalogue(study.antenna_catalogue) if equipment else None
    planned: list[LinkPlan] = []
    failures: list[LinkFailure] = []
    with open_terrain(study) as terrain:
        for done, link in enumerate(study.links):
            if progress is not None:
                progress(done, len(study.links), link.name)
            outcome = _plan_link(
                link, terrain, settings, water, heights, growth_years=study.growth_years, catalogue=catalogue
            )
            if isinstance(outcome, LinkPlan):
                planned.append(with_horizons(outcome, terrain) if horizons else outcome)
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
        if what_if:
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


def settings_of(study: Study) -> AssessSettings:
    """How the links of a study are judged."""
    return AssessSettings(
        preset=study.preset,
        criteria=study.criteria,
        median_k=study.median_k,
        confidence=study.confidence,
        date=study.date,
        step_m=study.terrain.step_m,
        climate=study.climate,
        rain_edition=study.rain_edition,
        rain_reading=study.rain_reading,
        exposure_rule=study.exposure_rule,
    )


def open_terrain(study: Study) -> Terrain:
    """The terrain of a study, trees grown; close it, or use it in a `with` block."""
    inputs = study.terrain
    return Terrain.open(
        ground=inputs.ground,
        surface=inputs.surface,
        cover=inputs.cover,
        obstacles=inputs.obstacles,
        survey=inputs.survey,
        gaps=inputs.gaps,
        sea_level_m=inputs.sea_level_m,
        growth_years=study.growth_years,
    )


def _plan_link(
    link: Link,
    terrain: Terrain,
    settings: AssessSettings,
    water: Water,
    heights: HeightSettings,
    *,
    growth_years: float,
    catalogue: Catalogue | None,
) -> LinkPlan | LinkFailure:
    try:
        assessment = assess_in_full(link, terrain=terrain, settings=settings)
        answer, confidence = design_heights(link, assessment, settings, heights=heights, growth_years=growth_years)
    except FellspanError as error:
        return LinkFailure(link=link, error=explained(error, link, terrain))
    result = one_voice(assessment.result, answer, confidence)
    profile, levels = assessment.profile, assessment.levels
    return LinkPlan(
        link=link,
        result=result,
        profile=profile,
        levels=levels,
        reflections=find_reflections(link, result=result, profile=profile, levels=levels, water=water),
        heights=answer,
        confidence=confidence,
        survey=survey_list(result, profile, levels),
        equipment=None if catalogue is None else equipment_of(link, assessment, settings, catalogue=catalogue),
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
