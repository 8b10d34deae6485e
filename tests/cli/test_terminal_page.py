"""The terminal page of the sample: 80 columns, plain, the decisions of the overview, and margins that own up to neighbours."""

import re
from pathlib import Path

import pytest

from fellspan.cli.layout import WIDTH, Ink, columns_of
from fellspan.cli.page import page_lines
from fellspan.links.radio_words import THROUGH, verdict_why
from fellspan.links.words import STATE_WORDS
from fellspan.planning.plan import StudyPlan
from fellspan.planning.planner import plan_study
from fellspan.report.overview import overview_view
from fellspan.study.reading import load_study


@pytest.fixture(scope="module")
def plan() -> StudyPlan:
    return plan_study(load_study(Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml"))


@pytest.mark.parametrize("brief", [True, False])
def test_no_line_is_wider_than_the_terminal_and_colours_change_no_word(plan: StudyPlan, brief: bool) -> None:
    plain = page_lines(plan, ink=Ink(colours=False), brief=brief)
    assert max(map(columns_of, plain)) <= WIDTH
    assert not [line for line in plain if "\x1b" in line or line != line.rstrip()]
    inked = page_lines(plan, ink=Ink(colours=True), brief=brief)
    assert [re.sub(r"\x1b\[\d+m", "", line).rstrip() for line in inked] == plain


def test_no_figure_is_cut(plan: StudyPlan) -> None:
    lines = page_lines(plan, ink=Ink(colours=False))
    start = [index for index, line in enumerate(lines) if line.startswith("  Modulation ")]
    assert len(start) == len(plan.links)
    for index in start:
        for line in lines[index : index + 8]:
            assert "..." not in line


def test_terminal_and_overview_say_the_same(plan: StudyPlan) -> None:
    lines = page_lines(plan, ink=Ink(colours=False), brief=True)
    for link, row in zip(plan.links, overview_view(plan).rows, strict=True):
        line = next(line for line in lines if line.startswith(link.result.name))
        assert STATE_WORDS[row.state] in line
        if verdict_why(link.result) == THROUGH:
            assert line.endswith(" -"), "a margin past an obstruction is nothing to rely on"
            continue
        assert line.split()[-2] == row.margin.text.replace("−", "-")
        assert line.endswith("*") == bool(row.alone)
    assert any(line.endswith("*") for line in lines)
    assert "  * what neighbours on the same channel leave of it" in lines
    assert any(verdict_why(link.result) == THROUGH for link in plan.links)


def test_a_hub_carries_no_better_signal_than_its_worst_link(plan: StudyPlan) -> None:
    signals = {hub.site: hub.signal for hub in overview_view(plan).hubs}
    assert signals["Harbour Office"] == "through an obstruction"
    assert signals["Beacon"] == "meets"


def test_a_short_page_tells_no_throughput_without_its_level(plan: StudyPlan) -> None:
    short = page_lines(plan, ink=Ink(colours=False), brief=True)
    blocks = "\n".join(short).split("\n\n")
    assert all("Signal at" in block for block in blocks if "Mean throughput" in block)
    assert any("Mean throughput" in reason for link in plan.links for reason in link.result.reasons)
