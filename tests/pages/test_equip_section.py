"""Compared equipment on the page of a link: decision, ranking and chart as on a page of its own, only where there is one."""

import dataclasses
import re
from html import unescape
from pathlib import Path

import pytest

from fellspan.links.safety import safety_lines
from fellspan.planning.plan import StudyPlan
from fellspan.planning.planner import plan_study
from fellspan.report.equip_page import cells, render_equip_page
from fellspan.report.pages import render_pages
from fellspan.study.reading import load_study

STUDY = Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml"
NAME = "Beacon - West Point"
TABLE = re.compile(r'<table class="ranked">.*?</table>', re.DOTALL)
CHART = re.compile(r'<svg[^>]*class="[^"]*\breach\b.*?</svg>', re.DOTALL)


@pytest.fixture(scope="module")
def plan() -> StudyPlan:
    study = load_study(STUDY)
    links = tuple(one for one in study.links if one.name == NAME)
    return plan_study(dataclasses.replace(study, links=links), equipment=True)


def link_page(plan: StudyPlan) -> str:
    return list(render_pages(plan).values())[1]


def test_the_section_shows_decision_ranking_and_reach(plan: StudyPlan) -> None:
    result = plan.links[0].equipment
    assert result is not None
    html, alone = link_page(plan), render_equip_page(result)
    section = html[html.index('<section class="equipment" id="equipment">') :]
    section = section[: section.index("</section>")]
    text = unescape(section)
    assert "<h2>Equipment</h2>" in text
    assert f"{result.decision[:1].upper()}{result.decision[1:]}" in text
    assert "Wind" not in text
    for row in result.rows:
        windless = "".join(f"<td>{cell}</td>" for cell in (*cells(row)[:8], *cells(row)[10:]))
        assert f"{row.rank}. <bdi>{row.antenna}</bdi>{' ✓' if row.meets else ''}</th>{windless}</tr>" in text
    assert TABLE.findall(section) == TABLE.findall(alone) != []
    assert CHART.findall(section) == CHART.findall(alone)
    assert len(CHART.findall(section)) == 2
    assert not any(line in text for line in safety_lines())


def test_a_link_without_a_comparison_has_no_section(plan: StudyPlan) -> None:
    bare = dataclasses.replace(plan, links=(dataclasses.replace(plan.links[0], equipment=None),))
    assert "<h2>Equipment</h2>" not in link_page(bare)
