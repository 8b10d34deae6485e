"""Heights, doubt and the survey list on the pages of a link: what is drawn and told is what design found."""

import dataclasses
import re
from html import unescape
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest

from fellspan.design.survey_list import label_of
from fellspan.links.words import down_m
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.planning.planner import plan_study
from fellspan.report.pages import render_pages
from fellspan.report.profile_drawing import draw_profile
from fellspan.report.section import FULL, NARROW, PANEL, prepare
from fellspan.report.wording import probability
from fellspan.study.reading import load_study

STUDY = Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml"
NAME = "Harbour Office - Southdown Farm"


@pytest.fixture(scope="module")
def plan() -> StudyPlan:
    study = load_study(STUDY)
    return plan_study(dataclasses.replace(study, links=tuple(one for one in study.links if one.name == NAME)))


@pytest.fixture(scope="module")
def link(plan: StudyPlan) -> LinkPlan:
    return plan.links[0]


@pytest.fixture(scope="module")
def html(plan: StudyPlan) -> str:
    return list(render_pages(plan).values())[1]


def outline(svg: str, class_: str) -> np.ndarray:
    """Corners of a path of straight pieces, relative steps added up."""
    part = next(one for one in ElementTree.fromstring(svg).iter() if one.get("class") == class_)
    steps = np.array(re.findall(r"-?\d*\.?\d+", part.get("d", "")), dtype=np.float64).reshape(-1, 2)
    return np.cumsum(steps, axis=0) if "l" in part.get("d", "") else steps


@pytest.mark.parametrize("sheet", [FULL, NARROW], ids=["full", "narrow"])
def test_the_band_is_as_wide_as_the_clearance_is_unsure(link: LinkPlan, sheet) -> None:
    assert link.confidence is not None
    svg = draw_profile(link, uid="p", sheet=sheet)
    assert "error of the data, 5 to 95 %" in svg
    shape = outline(svg, "doubt")
    turn = int(np.argmax(shape[:, 0])) + 1
    upper, lower = shape[:turn], shape[turn:][::-1]
    # Where two corners fall on one place they are one, so the edges are compared over even steps.
    x = np.linspace(sheet.left, sheet.right, 801)[1:-1]
    drawn = np.interp(x, lower[:, 0], lower[:, 1]) - np.interp(x, upper[:, 0], upper[:, 1])
    band = link.confidence.band
    at = band.distance_m[-1] * (x - sheet.left) / (sheet.right - sheet.left)
    y = prepare(link, sheet, plot_top=0.0).y
    # 1.645 standard errors to either side: 5 and 95 % of a normal law.
    wanted = 2.0 * 1.644854 * np.interp(at, band.distance_m, band.sigma_m) * y.px_per_unit
    # Places are drawn to a tenth of a unit, and steep edges are far from both their neighbours.
    assert np.median(wanted) > 5.0
    assert np.median(np.abs(drawn - wanted)) < 0.25


def test_no_band_stands_on_the_small_panels_nor_where_nothing_is_known(link: LinkPlan) -> None:
    for svg in (
        draw_profile(link, uid="p", sheet=PANEL),
        draw_profile(dataclasses.replace(link, confidence=None), uid="p", sheet=FULL),
    ):
        assert 'class="doubt"' not in svg
        assert "error of the data" not in svg


def test_the_words_of_the_drawing_tell_how_sure_the_clearance_is(link: LinkPlan) -> None:
    assert link.confidence is not None
    band, worst = link.confidence.band, link.result.clearance[link.result.governing].worst_at_m
    index = int(np.argmin(np.abs(np.array(band.distance_m) - worst)))
    svg = draw_profile(link, uid="p", sheet=FULL)
    assert f"known to ±{1.644854 * band.sigma_m[index]:.1f} m in 90 % of cases" in svg


def test_every_survey_point_stands_on_the_page_under_the_name_it_has_in_the_table(link: LinkPlan, html: str) -> None:
    section = html[html.index('class="survey"') :]
    section = section[: section.index("</section>")]
    rows = re.findall(r'<tr>\s*<th scope="row" class="num">(.*?)</tr>', section, flags=re.DOTALL)
    assert len(rows) == len(link.survey) > 4
    for row, point in zip(rows, link.survey, strict=True):
        words = " ".join(unescape(re.sub(r"<[^>]+>", " ", row)).split())
        assert words.startswith(label_of(1, point.rank))
        assert point.stands_there in words
        if point.highest_top_m is not None:
            assert f"{down_m(point.highest_top_m):.1f} m".replace("-", "−") in words
    assert "Tops are those in 5 years" in section


def test_a_probability_short_of_what_is_asked_does_not_read_as_if_it_reached_it() -> None:
    assert [probability(share) for share in (0.896, 0.9, 0.29, 0.0099, 0.9951)] == [
        "89 %",
        "90 %",
        "29 %",
        "< 1 %",
        "> 99 %",
    ]


CHART = """() => {
  const svg = document.querySelector("section.heights svg.heights"), frame = svg.getBoundingClientRect();
  const box = part => { const one = part.getBoundingClientRect();
    return [one.left - frame.left, one.top - frame.top, one.right - frame.left, one.bottom - frame.top]; };
  const texts = Array.from(svg.querySelectorAll("text"));
  const cells = Array.from(document.querySelectorAll("section.heights tbody tr"));
  return {
    size: [frame.width, frame.height], page: [document.documentElement.scrollWidth, window.innerWidth],
    axis: texts.filter(part => part.matches(".axis")).map(part => [part.textContent, box(part)]),
    notes: texts.filter(part => part.matches(".note")).map(part => [part.textContent, box(part)]),
    planned: box(svg.querySelector(".planned-pair")),
    built: Array.from(svg.querySelectorAll(".built-pair")).map(box),
    rows: cells.map(row => [row.querySelector("th").innerText, row.querySelector("[data-label='To build']").innerText]),
    letters: Math.min(...texts.map(part => part.getBoundingClientRect().height)),
  };
}"""


def _middle(box: list[float]) -> tuple[float, float]:
    return 0.5 * (box[0] + box[2]), 0.5 * (box[1] + box[3])


def _scale(marks: list[tuple[float, float]], at: float) -> float:
    """Value at a place, by the first and the last figure of an axis."""
    (p0, v0), (p1, v1) = marks[0], marks[-1]
    return v0 + (at - p0) / (p1 - p0) * (v1 - v0)


@pytest.mark.browser
@pytest.mark.parametrize("width", [1280, 390])
def test_the_chart_of_heights_in_a_browser(
    plan: StudyPlan, link: LinkPlan, html: str, tmp_path: Path, watch, width: int
) -> None:
    assert link.heights is not None
    (tmp_path / "link.html").write_text(html, encoding="utf-8")
    opened = watch(width, 900)
    opened.page.goto((tmp_path / "link.html").as_uri())
    seen = opened.page.evaluate(CHART)
    assert opened.requests == []
    assert opened.messages == []
    assert seen["page"][0] <= seen["page"][1]
    for _, box in seen["axis"] + seen["notes"]:
        assert box[0] >= -1.0
        assert box[2] <= seen["size"][0] + 1.0
    figures = [(float(text), _middle(box)) for text, box in seen["axis"] if re.fullmatch(r"\d+", text)]
    low = max(place[1] for _, place in figures)
    across = sorted((place[0], value) for value, place in figures if abs(place[1] - low) < 2.0)
    up = sorted((place[1], value) for value, place in figures if abs(place[1] - low) >= 2.0)
    built = {(option.build.a_m, option.build.b_m) for option in link.heights.options if option.build}
    found = {
        tuple(round(_scale(marks, at), 0) for marks, at in zip((across, up), _middle(box), strict=True))
        for box in seen["built"]
    }
    assert found == built
    x, y = _middle(seen["planned"])
    assert _scale(across, x) == pytest.approx(link.heights.planned.a_m, abs=0.3)
    assert _scale(up, y) == pytest.approx(link.heights.planned.b_m, abs=0.3)
    told = [text for _, text in seen["rows"]]
    assert told == [
        f"{option.build.a_m:.1f} / {option.build.b_m:.1f} m" for option in link.heights.options if option.build
    ]
    boxes = [box for _, box in seen["notes"]]
    for index, one in enumerate(boxes):
        for other in boxes[index + 1 :]:
            overlap = min(one[2], other[2]) - max(one[0], other[0]), min(one[3], other[3]) - max(one[1], other[1])
            assert min(overlap) < 2.5, (seen["notes"][index], other)
    assert seen["letters"] >= 9.0
