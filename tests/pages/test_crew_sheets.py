"""Crew sheets and horizon sketches in a real browser: one A4 page each, nothing asked of any network, readable on a phone."""

import dataclasses
import re
from html import unescape
from pathlib import Path
from xml.etree import ElementTree

import pytest

from fellspan.planning.plan import StudyPlan
from fellspan.planning.planner import plan_study
from fellspan.report.horizon_section import horizon_section
from fellspan.report.naming import crew_name
from fellspan.report.pages import render_pages
from fellspan.study.reading import load_study

STUDY = Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml"
# Obstructed, clear, over its power rule, with a signal too weak, and marginal.
NAMES = (
    "Harbour Office - Southdown Farm",
    "Beacon - School",
    "Harbour Office - Cape Light",
    "Town Hall - North Landing",
    "Town Hall - School",
)


@pytest.fixture(scope="module")
def plan() -> StudyPlan:
    study = load_study(STUDY)
    links = tuple(link for link in study.links if link.name in NAMES)
    return plan_study(dataclasses.replace(study, links=links), horizons=True)


@pytest.fixture(scope="module")
def folder(plan: StudyPlan, tmp_path_factory) -> Path:
    target = tmp_path_factory.mktemp("crews")
    for name, text in render_pages(plan).items():
        (target / name).write_text(text, encoding="utf-8")
    return target


def sheets(folder: Path) -> list[Path]:
    return sorted(folder.glob("crew-*.html"))


def words(path: Path) -> str:
    body = re.sub(r"<style.*?</style>", " ", path.read_text(encoding="utf-8"), flags=re.DOTALL)
    return " ".join(unescape(re.sub(r"<[^>]+>", " ", body)).split())


def pages_of(pdf: bytes) -> int:
    return len(re.findall(rb"/Type\s*/Page[^s]", pdf))


def test_every_sheet_prints_to_one_page_and_asks_nothing(watch, folder: Path) -> None:
    assert len(sheets(folder)) == 10
    watched = watch(1000, 800)
    for sheet in sheets(folder):
        watched.page.goto(sheet.as_uri())
        pdf = watched.page.pdf(format="A4", prefer_css_page_size=True)
        assert pages_of(pdf) == 1, sheet.name
    assert watched.requests == []
    assert watched.messages == []


@pytest.mark.parametrize("verdict", ["clear", "marginal"])
def test_a_sheet_over_its_power_rule_has_one_page_with_all_it_says_of_levels(watch, plan, tmp_path, verdict) -> None:
    link = next(one for one in plan.links if one.result.name == NAMES[2])
    changed = dataclasses.replace(link, result=dataclasses.replace(link.result, verdict=verdict))
    one = dataclasses.replace(plan, links=(changed,), interference=None)
    text = render_pages(one)[crew_name(0, NAMES[2], "a")]
    (tmp_path / "sheet.html").write_text(text, encoding="utf-8")
    watched = watch(1000, 800)
    watched.page.goto((tmp_path / "sheet.html").as_uri())
    assert "do not transmit at it" in words(tmp_path / "sheet.html")
    assert pages_of(watched.page.pdf(format="A4", prefer_css_page_size=True)) == 1


def test_sheets_with_hostile_names_print_to_one_page_and_show_them_as_text(watch, hostile) -> None:
    watched = watch(1000, 800)
    for sheet in sheets(hostile.folder):
        watched.page.goto(sheet.as_uri())
        assert pages_of(watched.page.pdf(format="A4", prefer_css_page_size=True)) == 1, sheet.name
        assert watched.page.evaluate("document.scripts.length") == 0
    assert watched.requests == []
    assert watched.messages == []


def test_no_sideways_scroll_on_a_phone(watch, folder: Path) -> None:
    watched = watch(390, 844)
    for page in [*sheets(folder), folder / "link-02-harbour-office-southdown-farm.html"]:
        watched.page.goto(page.as_uri())
        assert watched.page.evaluate("document.documentElement.scrollWidth") <= 390, page.name


def test_a_sheet_holds_what_the_crew_needs(folder: Path, plan: StudyPlan) -> None:
    link = next(one for one in plan.links if one.result.name == NAMES[0])
    index = plan.links.index(link)
    text = words(folder / crew_name(index, NAMES[0], "a"))
    end = link.result.ends.a
    for expected in (
        "36.03817 N, 45.15598 W",
        "36°02'17.42\" N, 45°09'21.54\" W",
        "EGM2008",
        end.height_as_given,
        f"{link.result.bearing_ab_deg:05.1f}°",
        "WMM-2025 for 2026-05-01",
        "church tower",
        "automatic power control off",
        "TRAP: the first side lobe",
        "nobody climbs near a live antenna",
        "Keep away while it transmits",
        "General public",
        "Level here, each chain, dBm",
    ):
        assert expected in text, expected


def test_the_side_lobe_trap_is_that_of_the_pattern(folder: Path, plan: StudyPlan) -> None:
    from fellspan.antennas.facts import facts_of

    link = next(one for one in plan.links if one.result.name == NAMES[0])
    assert link.link.antenna_a.pattern is not None
    facts = facts_of(link.link.antenna_a.pattern).azimuth
    assert facts.side_lobe_db is not None
    text = words(folder / crew_name(plan.links.index(link), NAMES[0], "a"))
    assert f"{facts.side_lobe_deg:.1f}° off, peaks like the beam but {-facts.side_lobe_db:.1f} dB lower" in text


def test_a_fixed_sector_is_told_to_stay_where_it_is(folder: Path, plan: StudyPlan) -> None:
    index = next(i for i, one in enumerate(plan.links) if one.result.name == NAMES[1])
    assert "Antenna stays at 140.0° true, tilt −3.50°, as planned: not at the other end" in words(
        folder / crew_name(index, NAMES[1], "a")
    )


def test_the_sketch_tells_a_hidden_site_and_says_all_in_words(plan: StudyPlan, folder: Path) -> None:
    link = next(one for one in plan.links if one.result.name == NAMES[0])
    view = horizon_section(link)[0]
    root = ElementTree.fromstring(str(view.markup))
    marks = [one for one in root.iter() if "far-site hidden" in one.get("class", "")]
    assert len(marks) == 1
    assert any("hidden by" in (one.text or "") for one in root.iter() if one.get("class") == "far-more")
    assert "church tower at 247.3° true, 4.4° left of the link" in view.caption
    assert view.caption in "".join(one.text or "" for one in root.iter() if one.tag.endswith("desc"))
    assert len([one for one in root.iter() if one.get("class") == "beam"]) == 2
    page = (folder / "link-02-harbour-office-southdown-farm.html").read_text(encoding="utf-8")
    assert "From A, <bdi>Harbour Office</bdi>" in page
    assert 'href="crew-02-harbour-office-southdown-farm-b.html"' in page


def test_without_skylines_the_sheet_says_how_to_have_them(plain) -> None:
    text = words(sheets(plain.folder)[0])
    assert "No skyline was worked out" in text
