"""What a notebook shows of results: the decision, the numbers and the drawing, escaped and with nothing fetched."""

import base64
import re
import subprocess
import sys
from dataclasses import replace
from html import unescape

import pytest
from defusedxml import ElementTree
from exports_made_plan import made_link, made_plan
from IPython.core.formatters import DisplayFormatter

from fellspan import LinkResult, showing
from fellspan.links.words import STATE_WORDS, state_of

ATTACK = "</td><script>alert(1)</script> & \"'"


@pytest.fixture(scope="module")
def plan():
    return made_plan(made_link(), made_link(name=ATTACK))


def shown(value) -> str:
    """As IPython's own formatter asks for it."""
    formats, _ = DisplayFormatter().format(value)
    assert "text/plain" in formats
    return formats["text/html"]


def words(html: str) -> str:
    return " ".join(unescape(re.sub(r"<[^>]+>", " ", html)).split())


def test_a_result_shows_its_decision_and_numbers(plan):
    result = plan.links[0].result
    text = words(shown(result))
    assert text.startswith(f"{result.name} : {STATE_WORDS[state_of(result)].capitalize()}")
    assert f"{result.confidence_asked:.0%}".replace("%", " %") in text
    for figure in (
        "Length",
        "Bearing A to B",
        "Governing criterion",
        "Level at A, at B",
        "Margin at A, at B",
        "Available",
    ):
        assert figure in text


def test_a_planned_link_shows_its_profile_as_a_picture_of_its_own(plan):
    html = shown(plan.links[0])
    picture = re.search(r'<img src="data:image/svg\+xml;base64,([^"]+)" alt="([^"]+)"', html)
    root = ElementTree.fromstring(base64.b64decode(picture[1]))
    assert root.find("{http://www.w3.org/2000/svg}title").text == f"Path profile of {plan.links[0].result.name}"
    assert plan.links[0].result.ends.a.site in unescape(picture[2])
    assert "<style" not in re.sub(r"base64,[^\"]+", "", html)


def test_a_study_shows_a_row_for_each_link_and_what_failed(plan):
    html = shown(plan)
    rows = re.findall(r"<tr><th scope=\"row\"[^>]*>(.*?)</th>", html)
    assert [unescape(row) for row in rows] == [link.result.name for link in plan.links]
    for failure in plan.failures:
        assert failure.error.what in unescape(html)


def test_hostile_names_are_text(plan):
    for value in (plan, plan.links[1], plan.links[1].result):
        html = shown(value)
        assert "<script" not in html
        assert ATTACK in unescape(re.sub(r"</?b>", "", html))
        kinds = set(re.findall(r"<([a-z]+)", html))
        assert kinds <= {"div", "p", "b", "br", "table", "thead", "tbody", "tr", "th", "td", "img"}


def test_nothing_is_fetched(plan):
    for value in (plan, plan.links[0], plan.links[0].result):
        assert re.findall(r'(?:src|href)="(?!data:)', shown(value)) == []


def test_where_nobody_can_write_html_the_repr_stands(plan, monkeypatch):
    monkeypatch.setattr(showing, "_find_writers", None)
    assert plan.links[0].result._repr_html_() is None
    formats, _ = DisplayFormatter().format(plan.links[0].result)
    assert "text/html" not in formats
    assert isinstance(plan.links[0].result, LinkResult)
    assert repr(replace(plan.links[0].result)).startswith("LinkResult(name=")


def test_importing_a_result_imports_no_drawing():
    code = "import sys; from fellspan import LinkResult, StudyPlan; sys.exit('fellspan.report' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
