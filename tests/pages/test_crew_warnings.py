"""What a crew sheet, the short plan and the overview say of a link that must not be built or sent on as planned."""

import dataclasses
import math
import re
from html import unescape
from pathlib import Path

import pytest

from fellspan.cli.layout import Ink
from fellspan.cli.link_page import decision_lines
from fellspan.links.radio_words import breach_words
from fellspan.links.result import LinkResult
from fellspan.planning.plan import StudyPlan
from fellspan.planning.planner import plan_study
from fellspan.report.naming import crew_name
from fellspan.report.pages import render_pages
from fellspan.study.reading import load_study

STUDY = Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml"
OBSTRUCTED, CLEAR, OVER = "Harbour Office - Southdown Farm", "Beacon - School", "Harbour Office - Cape Light"
BELOW, MARGINAL = "Town Hall - North Landing", "Town Hall - School"
STOP = "NOT CLEAR AS PLANNED: do not install before the plan is changed"
WALK = "clear on bare ground only: walk the path first"
NO_LEVEL = "o acceptance level: the link is not expected to work as planned"
BREACH = "15.7 dB over power rule fcc-15.247-5g8"


@pytest.fixture(scope="module")
def plan() -> StudyPlan:
    study = load_study(STUDY)
    names = (OBSTRUCTED, CLEAR, OVER, BELOW, MARGINAL)
    return plan_study(
        dataclasses.replace(study, links=tuple(link for link in study.links if link.name in names)), horizons=False
    )


@pytest.fixture(scope="module")
def texts(plan: StudyPlan) -> dict[str, str]:
    return render_pages(plan)


def words(text: str) -> str:
    body = re.sub(r"<style.*?</style>", " ", text, flags=re.DOTALL)
    return " ".join(unescape(re.sub(r"<[^>]+>", " ", body)).split())


def result_of(plan: StudyPlan, name: str) -> LinkResult:
    return next(one.result for one in plan.links if one.result.name == name)


def both(plan: StudyPlan, texts: dict[str, str], name: str) -> list[str]:
    index = next(i for i, one in enumerate(plan.links) if one.result.name == name)
    return [words(texts[crew_name(index, name, end)]) for end in "ab"]


@pytest.mark.parametrize("name", [OBSTRUCTED, OVER, BELOW, MARGINAL])
def test_a_link_that_is_not_clear_is_stopped_over_everything_else(plan, texts, name) -> None:
    sentence = next(one for one in result_of(plan, name).reasons if one.startswith("Rais"))
    for text in both(plan, texts, name):
        assert text.index(STOP) < text.index(sentence) < text.index("Position, WGS 84")


@pytest.mark.parametrize("name", [OBSTRUCTED, OVER, BELOW])
def test_no_level_is_accepted_where_none_can_be_expected(plan, texts, name) -> None:
    for text in both(plan, texts, name):
        assert NO_LEVEL in text
        for band in ("accepted from", "Accept when", "band of 3 dB", "Both ways 15 to 25 dB low"):
            assert band not in text


def test_a_clear_link_has_its_band_and_no_banner(plan, texts) -> None:
    level = math.floor(result_of(plan, CLEAR).received_dbm.at_a * 10.0) / 10.0
    for text in both(plan, texts, CLEAR):
        assert f"accepted from {level - 3.0:.1f} to {level + 3.0:.1f} dBm".replace("-", "−") in text
        for line in ("Both ways 15 to 25 dB low", "One chain low", "Changes with tide or hour"):
            assert line in text
        assert STOP not in text
        assert WALK not in text
        assert NO_LEVEL not in text


def test_a_marginal_link_keeps_its_band(plan, texts) -> None:
    assert all("accepted from" in text and NO_LEVEL not in text for text in both(plan, texts, MARGINAL))


@pytest.mark.parametrize(
    ("changes", "said", "unsaid"),
    [
        ({"basis": "bare ground only"}, WALK, STOP),
        ({"basis": "bare ground only", "signal_verdict": "below"}, STOP, WALK),
        ({"signal_verdict": "below"}, "Signal below what is wanted", WALK),
    ],
)
def test_bare_ground_and_a_weak_signal_have_their_banners(plan, changes, said, unsaid) -> None:
    link = next(one for one in plan.links if one.result.name == CLEAR)
    changed = dataclasses.replace(link, result=dataclasses.replace(link.result, **changes))
    one = dataclasses.replace(plan, links=(changed,), interference=None)
    for text in both(one, render_pages(one), CLEAR):
        assert said in text
        assert unsaid not in text
        assert (NO_LEVEL in text) == ("signal_verdict" in changes)


def test_the_power_over_a_rule_is_forbidden_beside_the_power_to_set(plan, texts) -> None:
    for text in both(plan, texts, OVER):
        assert (
            "power rule fcc-15.247-5g8 allows at most 7.3 dBm with this antenna; "
            "planned 23.0 dBm is over it: do not transmit at it"
        ) in text
    assert not any("do not transmit at it" in text for text in both(plan, texts, OBSTRUCTED))


def test_the_order_of_work_keeps_the_rule_and_the_stop(plan, texts) -> None:
    for text in both(plan, texts, OVER):
        assert "Do not install before the plan is changed" in text
        assert "but never above the 7.3 dBm that the rule allows here" in text
        assert "at most 7.3 dBm (planned 23.0 dBm) here, at most 7.3 dBm (planned 23.0 dBm) there" in text
    for text in both(plan, texts, CLEAR):
        assert "Do not install" not in text
        assert "Fix the radios of both ends in the state above." in text
        assert "fellspan accept" in text


def test_the_band_is_for_the_power_that_the_rule_allows(plan) -> None:
    link = next(one for one in plan.links if one.result.name == OVER)
    changed = dataclasses.replace(link, result=dataclasses.replace(link.result, verdict="clear"))
    one = dataclasses.replace(plan, links=(changed,), interference=None)
    # 23.0 dBm planned, 7.3 dBm allowed at the other end: 15.7 dB less arrives
    level = math.floor((link.result.received_dbm.at_a - 15.7) * 10.0) / 10.0
    for text in both(one, render_pages(one), OVER):
        assert f"accepted from {level - 3.0:.1f} to {level + 3.0:.1f} dBm".replace("-", "−") in text


def test_a_breach_is_a_line_of_the_short_plan(plan) -> None:
    lines = decision_lines(result_of(plan, OVER), Ink(colours=False), most=6)
    assert f"  ! {BREACH}" in lines
    assert len(lines) <= 7
    assert any(line.startswith("  Raise A") for line in lines)
    assert not any("!" in line for line in decision_lines(result_of(plan, CLEAR), Ink(colours=False), most=6))


def test_a_breach_is_in_words_on_its_card_alone(texts) -> None:
    assert words(texts["index.html"]).count(f"! {BREACH}") == 1


def test_a_breach_at_one_end_names_it(plan) -> None:
    result = result_of(plan, OVER)
    kept = dataclasses.replace(result.power.b, breach_db=0.0)
    one = dataclasses.replace(result, power=dataclasses.replace(result.power, b=kept))
    assert breach_words(one) == "15.7 dB at A over power rule fcc-15.247-5g8"
