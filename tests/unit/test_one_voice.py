"""The verdict, its confidence and the heights it asks for are those of the closer look, wherever that is less sure."""

from dataclasses import replace
from pathlib import Path

import pytest

from fellspan.links.assess import assess_in_full
from fellspan.planning.agreement import one_voice
from fellspan.planning.plan import LinkPlan
from fellspan.planning.planner import open_terrain, plan_study, settings_of
from fellspan.study.reading import load_study

SAMPLE = Path(__file__).resolve().parents[2] / "sample_terrain" / "tolmera.toml"


@pytest.fixture(scope="module")
def planned() -> dict[str, LinkPlan]:
    return {plan.result.name: plan for plan in plan_study(load_study(SAMPLE)).links}


def test_sentence_and_heights_ask_for_the_same(planned: dict[str, LinkPlan]) -> None:
    for name, plan in planned.items():
        words = " ".join(plan.result.reasons)
        assert plan.heights is not None
        lowest = plan.heights.option("a alone")
        if "Raise A by " not in words or lowest is None or lowest.build is None:
            continue
        more = float(words.split("Raise A by ")[1].split(" m")[0])
        assert plan.heights.planned.a_m + more == pytest.approx(lowest.build.a_m), name
    assert any("Raise A by " in " ".join(plan.result.reasons) for plan in planned.values())


def test_no_link_is_clear_that_its_heights_call_too_low(planned: dict[str, LinkPlan]) -> None:
    for name, plan in planned.items():
        assert plan.heights is not None
        if plan.result.verdict == "clear":
            assert plan.heights.planned_holds, name


def test_draws_that_are_less_sure_take_the_clear_away(planned: dict[str, LinkPlan]) -> None:
    study = load_study(SAMPLE)
    name = "Beacon - School"
    (link,) = (link for link in study.links if link.name == name)
    with open_terrain(study) as terrain:
        quick = assess_in_full(link, terrain=terrain, settings=settings_of(study)).result
    plan = planned[name]
    assert plan.heights is not None
    assert plan.confidence is not None
    assert quick.verdict == "clear"
    unsure = one_voice(quick, plan.heights, replace(plan.confidence, all_hold=0.8))
    assert unsure.verdict == "marginal"
    assert unsure.confidence == 0.8
    assert unsure.reasons[0].startswith("Marginal: every criterion is met on the heights in the data, but with 80 %")
    sure = one_voice(quick, plan.heights, replace(plan.confidence, all_hold=0.95))
    assert sure.verdict == "clear"
    assert "95 % confidence" in sure.reasons[0]


def test_the_own_roof_is_not_asked_for_with_a_confidence() -> None:
    """Roof and antenna move together: a low mast on a wide roof must not send the far end to a hundred metres."""
    study = load_study(SAMPLE)
    (link,) = (link for link in study.links if link.name == "Town Hall - School")
    low = replace(link, a=replace(link.a, height_m=1.5))
    (plan,) = plan_study(replace(study, links=(low,), growth_years=0.0)).links
    assert plan.heights is not None
    option = plan.heights.option("b alone")
    assert option is not None
    assert option.build is not None
    assert option.build.b_m <= 8.0
