"""Plans one link after another, here or shared between processes; and how the links of a study are judged.

A link that cannot be assessed is a failure and does not stop the others.
"""

from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Any

from fellspan.antennas.catalogue import Catalogue, load_catalogue
from fellspan.design.heights import design_heights
from fellspan.design.heights_result import HeightSettings
from fellspan.design.reflections import Water, find_reflections
from fellspan.design.survey_list import survey_list
from fellspan.errors import FellspanError
from fellspan.links.assess import AssessSettings, assess_in_full
from fellspan.links.site import Link
from fellspan.planning.agreement import one_voice
from fellspan.planning.horizons import with_horizons
from fellspan.planning.inputs import Study
from fellspan.planning.outfits import equipment_of
from fellspan.planning.plan import LinkFailure, LinkPlan
from fellspan.planning.processes import MANY, shared_work
from fellspan.planning.slips import explained
from fellspan.planning.water import water_of
from fellspan.planning.what_if import ages_of, what_if_of
from fellspan.terrain.terrain import Terrain


@dataclass(frozen=True, slots=True, kw_only=True)
class Asked:
    """What is to be planned, and what is wanted besides."""

    study: Study
    heights: HeightSettings
    horizons: bool
    equipment: bool
    what_if: bool


class _Desk:
    """What planning a link needs: opened once, used for many."""

    def __init__(self, asked: Asked, terrain: Terrain) -> None:
        self.asked, self.terrain = asked, terrain
        self.settings, self.water = settings_of(asked.study), water_of(asked.study)
        self.catalogue = load_catalogue(asked.study.antenna_catalogue) if asked.equipment else None
        # A closer look at the terrain must change nothing of the plans: it has one of its own.
        self.closer = open_terrain(asked.study) if asked.what_if else None
        self.ages = ages_of(self.closer) if self.closer is not None else None

    def plan(self, link: Link) -> LinkPlan | LinkFailure:
        """One link, with its horizons where they are asked."""
        outcome = _plan_link(
            link,
            self.terrain,
            self.settings,
            self.water,
            self.asked.heights,
            growth_years=self.asked.study.growth_years,
            catalogue=self.catalogue,
        )
        if self.asked.horizons and isinstance(outcome, LinkPlan):
            return with_horizons(outcome, self.terrain)
        return outcome


def planned_links(asked: Asked, terrain: Terrain, *, processes: int) -> Iterator[LinkPlan | LinkFailure]:
    """Every link of the study planned, in order; shared between processes, with what pages work with (`what_if`) as well."""
    links = asked.study.links
    if processes < 2 or len(links) < MANY:
        desk = _Desk(replace(asked, what_if=False), terrain)
        yield from (desk.plan(link) for link in links)
        return
    for link, sent in zip(
        links, shared_work(_open, _planned, asked, count=len(links), processes=processes), strict=True
    ):
        if isinstance(sent, LinkFailure):
            yield replace(sent, link=link)
        else:
            # Arrays that travelled may be written to again until their holders are made anew.
            yield replace(sent, link=link, profile=replace(sent.profile), levels=replace(sent.levels))


def _open(asked: Asked) -> _Desk:
    return _Desk(asked, open_terrain(asked.study))


def _planned(desk: _Desk, number: int) -> LinkPlan | LinkFailure:
    """In another process: a link planned, sent without the link itself, which the other side has."""
    nobody: Any = None
    outcome = desk.plan(desk.asked.study.links[number])
    if isinstance(outcome, LinkPlan) and desk.closer is not None:
        looked = what_if_of(outcome.link, outcome.profile, desk.closer, ages=desk.ages)
        return replace(outcome, what_if=looked, link=nobody)
    return replace(outcome, link=nobody)


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
