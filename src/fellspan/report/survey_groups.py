"""The survey list of a whole study as it is walked: every site once, then each path from A to B.

The points and their names are those of survey.csv and of the pages of the links. Shows what design listed and computes nothing.
"""

from dataclasses import dataclass

from fellspan.design.survey_list import SurveyPoint, label_of
from fellspan.geodesy.coordinates import format_position
from fellspan.geodesy.position import Position
from fellspan.planning.plan import StudyPlan
from fellspan.report import wording
from fellspan.report.naming import page_name

SITES = "Sites"


@dataclass(frozen=True, slots=True, kw_only=True)
class WalkedPoint:
    """One point in words; a site that several links share has a label for each."""

    labels: tuple[str, ...]
    place: str
    where: str
    stands_there: str
    verify: str


@dataclass(frozen=True, slots=True, kw_only=True)
class SurveyGroup:
    """Points that are walked together; `page` leads to the link, '' for the sites."""

    name: str
    page: str
    rows: tuple[WalkedPoint, ...]


def survey_groups(plan: StudyPlan) -> tuple[SurveyGroup, ...]:
    """Sites first, then the paths in the order of the study; groups without points are left out."""
    sites: dict[tuple[str, str], list[tuple[str, str]]] = {}
    paths: list[SurveyGroup] = []
    for number, link in enumerate(plan.links, start=1):
        name = link.result.name
        length_m = link.profile.length_m
        rows = []
        for point in sorted(link.survey, key=lambda one: (one.from_a_m, one.rank)):
            label = label_of(number, point.rank)
            if point.highest_top_m is None and point.spare_m is None:
                end = "A" if point.from_a_m < length_m / 2.0 else "B"
                sites.setdefault((point.stands_there, _place(point)), []).append((label, f"{name} ({end})"))
                continue
            rows.append(
                WalkedPoint(
                    labels=(label,),
                    place=_place(point),
                    where=f"{wording.kilometres(point.from_a_m, length_m=length_m)} km",
                    stands_there=point.stands_there,
                    verify=point.verify,
                )
            )
        if rows:
            paths.append(SurveyGroup(name=name, page=page_name(number - 1, name), rows=tuple(rows)))
    met = tuple(
        WalkedPoint(
            labels=tuple(label for label, _ in found),
            place=place,
            where="site",
            stands_there=what.removeprefix("site "),
            verify=f"position, ground and antenna height: {', '.join(ends for _, ends in found)}",
        )
        for (what, place), found in sites.items()
    )
    return (*((SurveyGroup(name=SITES, page="", rows=met),) if met else ()), *paths)


def _place(point: SurveyPoint) -> str:
    return format_position(Position(latitude_deg=point.latitude_deg, longitude_deg=point.longitude_deg))
