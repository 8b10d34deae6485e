"""A margin or a level reads the same wherever it is printed: in sentences, rows, on pages, crew sheets and the terminal.

The sample, and links made to have margins that rounding to the nearest and rounding down tell apart, also below 0.
"""

import math
import re
from dataclasses import replace
from html import unescape
from pathlib import Path

import pytest

from fellspan.cli.layout import Ink
from fellspan.cli.page import page_lines
from fellspan.links.site import Link
from fellspan.links.words import decisive_margin_db, neighbours_take
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.planning.planner import plan_study
from fellspan.report.notebook import study_plan_html
from fellspan.report.pages import render_pages
from fellspan.study.reading import load_study

SAMPLE = Path(__file__).resolve().parents[2] / "sample_terrain" / "tolmera.toml"
NUMBER = r"([+-]?\d+\.\d)"
MADE_DB = (9.96, 7.04, 0.04, -0.04, -0.46, -30.44)
"""Margins without neighbours: the nearest tenth and the tenth below differ, or did where the sign changes."""


def down(value: float) -> str:
    """By decimal places, apart from the functions under test."""
    return f"{math.floor(round(value * 10.0, 6)) / 10.0 + 0.0:.1f}"


def with_margin(link: Link, *, now_db: float, margin_db: float, name: str) -> Link:
    """The link with so much loss in its branching that this margin is left, by a radio that says no availability wanted."""
    lossy = replace(link.antenna_a, branching_loss_db=link.antenna_a.branching_loss_db + now_db - margin_db)
    return replace(link, name=name, antenna_a=lossy, target_availability_percent=None)


def planned() -> StudyPlan:
    study = load_study(SAMPLE)
    crowd = [link for link in study.links if link.name in ("Beacon - West Point", "Town Hall - North Landing")]
    (school,) = (link for link in study.links if link.name == "Beacon - School")
    alone = plan_study(replace(study, links=(school,))).links[0].result
    assert alone.margin_db.at_b is not None
    f_hz = school.radio.frequency_hz
    made = [
        with_margin(
            replace(school, radio=replace(school.radio, frequency_hz=f_hz + 40e6 * n)),
            now_db=alone.margin_db.at_b - 20.0 * math.log10(1.0 + 40e6 * n / f_hz),
            margin_db=margin,
            name=f"Made {n}",
        )
        for n, margin in enumerate(MADE_DB)
    ]
    near = replace(made[4], name="Near", radio=replace(made[4].radio, frequency_hz=crowd[0].radio.frequency_hz))
    return plan_study(replace(study, links=(*crowd, *made, near)), horizons=False)


@pytest.fixture(scope="module")
def plan() -> StudyPlan:
    return planned()


@pytest.fixture(scope="module")
def pages(plan: StudyPlan) -> dict[str, str]:
    return {name: as_text(text) for name, text in render_pages(plan).items()}


def as_text(page: str) -> str:
    bare = re.sub(r"<(script|style|svg)\b.*?</\1>", " ", page, flags=re.DOTALL)
    return re.sub(r"\s+", " ", unescape(re.sub(r"<[^>]+>", " ", bare))).replace("−", "-")


def least(link: LinkPlan) -> tuple[str, str]:
    """Without neighbours and with, at the weaker end, as they are to be printed."""
    alone, left = link.result.margin_db, decisive_margin_db(link.result)
    return (
        down(min(alone.at_a or 0.0, alone.at_b or 0.0)),
        down(min(left.at_a or 0.0, left.at_b or 0.0)),
    )


def level_sentence(text: str) -> list[tuple[str, str, str]]:
    """Level at B, margin and what neighbours leave, of every sentence."""
    found = re.findall(
        rf"in clear air: {NUMBER} dBm (?:at both ends|at .*? dBm at .*?), (?:least )?margin of \S+ \d/\d {NUMBER} dB"
        rf"(?:, {NUMBER} dB with neighbours)?, [\d.]+ dB wanted",
        text,
    )
    return [(level, margin, left or margin) for level, margin, left in found]


def test_margins_of_the_plan_are_those_that_rounding_tells_apart(plan: StudyPlan) -> None:
    made = [link for link in plan.links if link.result.name.startswith("Made")]
    for link, wanted in zip(made, MADE_DB, strict=True):
        assert link.result.margin_db.at_b == pytest.approx(wanted, abs=0.02)
    assert sum(neighbours_take(link.result) for link in plan.links) >= 3


def test_sentences_on_pages_and_terminal_agree(plan: StudyPlan, pages: dict[str, str]) -> None:
    terminal = " ".join(" ".join(page_lines(plan, ink=Ink(colours=False))).split())
    told = level_sentence(terminal)
    on_pages = [one for name, text in pages.items() if name.startswith("link-") for one in level_sentence(text)]
    assert told == on_pages
    assert told == [(down(link.result.received_dbm.at_b or 0.0), *least(link)) for link in plan.links]


def test_rows_of_the_terminal_agree_with_its_sentences(plan: StudyPlan) -> None:
    lines = page_lines(plan, ink=Ink(colours=False))
    summary = re.findall(rf"^(Made \d|Near|Beacon - West Point) .* {NUMBER} dB(\*?)$", "\n".join(lines), re.MULTILINE)
    wanted = {link.result.name: link for link in plan.links}
    assert len(summary) == len(MADE_DB) + 2
    for name, margin, star in summary:
        alone, left = least(wanted[name])
        assert margin == left
        assert bool(star) == (alone != left)
    ends = re.findall(rf"Margin +{NUMBER} dB at A, {NUMBER} dB at B", " ".join(lines))
    assert ends == [
        (down(link.result.margin_db.at_a or 0.0), down(link.result.margin_db.at_b or 0.0)) for link in plan.links
    ]
    left_at = re.findall(rf"with neighbours {NUMBER} dB at A, {NUMBER} dB at B", " ".join(" ".join(lines).split()))
    taken = [decisive_margin_db(link.result) for link in plan.links if neighbours_take(link.result)]
    assert left_at == [(down(one.at_a or 0.0), down(one.at_b or 0.0)) for one in taken]


def test_tables_of_the_page_agree_with_its_sentences(plan: StudyPlan, pages: dict[str, str]) -> None:
    shown = [text for name, text in pages.items() if name.startswith("link-")]
    for link, text in zip(plan.links, shown, strict=True):
        result, left = link.result, decisive_margin_db(link.result)
        at_a, at_b = result.margin_db.at_a or 0.0, result.margin_db.at_b or 0.0
        sums = re.findall(rf" Margin {NUMBER} dB {NUMBER} dB", text)
        assert [(one.lstrip("+"), other.lstrip("+")) for one, other in sums] == [(down(at_b), down(at_a))]
        sums = re.findall(rf"Margin with neighbours {NUMBER} dB {NUMBER} dB", text)
        expected = [(down(left.at_b or 0.0), down(left.at_a or 0.0))] if neighbours_take(result) else []
        assert [(one.lstrip("+"), other.lstrip("+")) for one, other in sums] == expected
        level = down(result.received_dbm.at_b or 0.0)
        assert f"Received level {level} dBm" in text
        assert re.search(rf"\(wanted\) \S+ dBm \S+ dBm {re.escape(level)} dBm \+?{re.escape(down(at_b))} dB", text)
        for rest in re.findall(rf"margin left {NUMBER} dB", text):
            assert rest in (down(left.at_a or 0.0), down(left.at_b or 0.0))
        for told in re.findall(rf"leaves a margin of {NUMBER} dB", text):
            assert told in (down(left.at_a or 0.0), down(left.at_b or 0.0))


def test_reasons_of_a_verdict_agree_with_the_sentence(plan: StudyPlan) -> None:
    seen = 0
    for link in plan.links:
        assert link.result.signal is not None
        why = link.result.signal.verdict_reason
        alone, left = least(link)
        for margin, beside in re.findall(rf"margin {NUMBER} dB(?:, {NUMBER} dB with neighbours)?, 10 dB wanted", why):
            assert (margin, beside or margin) == (alone, left)
            seen += 1
        for beside in re.findall(rf"channel leave {NUMBER} dB of margin", why):
            assert beside == left
            seen += 1
    assert seen >= 6


def test_the_overview_and_a_notebook_show_the_margin_that_decides(plan: StudyPlan, pages: dict[str, str]) -> None:
    table = pages["index.html"]
    notebook = as_text(study_plan_html(plan))
    for link in plan.links:
        alone, left = least(link)
        told = f" {left} {alone} without neighbours" if alone != left else f" {left} "
        assert told in table, link.result.name
        level = f"{down(link.result.received_dbm.at_a or 0.0)} / {down(link.result.received_dbm.at_b or 0.0)}"
        assert level in table
        assert (f"{left} with neighbours, {alone} without" if alone != left else f" {left} ") in notebook
    assert "availability leaves neighbours out" in table


def test_crew_sheets_expect_the_level_of_the_page(plan: StudyPlan, pages: dict[str, str]) -> None:
    sheets = [text for name, text in pages.items() if name.startswith("crew-") and name.endswith("-a.html")]
    for link, text in zip(plan.links, sheets, strict=True):
        (level,) = re.findall(rf"Expected here \(A\) {NUMBER} dBm", text)
        assert level == down(link.result.received_dbm.at_a or 0.0)


def test_availability_says_that_it_leaves_neighbours_out(plan: StudyPlan, pages: dict[str, str]) -> None:
    terminal = " ".join(" ".join(page_lines(plan, ink=Ink(colours=False))).split())
    shown = [text for name, text in pages.items() if name.startswith("link-")]
    said = "neighbours on the channel are left out of it"
    crowded = 0
    for link, text in zip(plan.links, shown, strict=True):
        if not neighbours_take(link.result):
            assert said not in text
            continue
        sentences = [line for line in link.result.reasons if line.startswith("Available ")]
        assert all(said in line for line in sentences)
        assert text.count(said) == len(sentences) + (link.result.availability_percent.year is not None)
        crowded += len(sentences)
    assert crowded
    assert said in terminal
