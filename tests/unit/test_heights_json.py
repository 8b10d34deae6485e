"""Heights and confidence in results.json: every key stands in the docs, and nothing is infinite."""

import dataclasses
import json
from pathlib import Path
from typing import Any

from exports_made_plan import made_plan
from made_profiles import link_of, obstacle, profile_of

from fellspan.design.heights import design_heights
from fellspan.design.heights_result import HeightSettings, Limits
from fellspan.design.survey_list import survey_list
from fellspan.exports.results_json import results_text
from fellspan.links.assess import AssessSettings, assess_profile
from fellspan.planning.plan import LinkPlan


def designed(heights: HeightSettings) -> LinkPlan:
    profile = profile_of(8e3, 0.0, n=401, obstacles=(obstacle("mill", 3_000.0, 3_020.0, 30.0),), sigma_m=1.0)
    link = link_of(profile, 20.0, 20.0)
    made = assess_profile(link, profile, AssessSettings())
    answer, confidence = design_heights(link, made, AssessSettings(), heights=heights)
    return LinkPlan(
        link=link,
        result=made.result,
        profile=made.profile,
        levels=made.levels,
        heights=answer,
        confidence=confidence,
        survey=survey_list(made.result, made.profile, made.levels),
    )


def keys_of(value: Any) -> set[str]:
    if isinstance(value, dict):
        return set(value).union(*(keys_of(inner) for inner in value.values()))
    return set().union(*(keys_of(inner) for inner in value)) if isinstance(value, list) else set()


def test_every_key_of_heights_and_confidence_is_explained() -> None:
    plan = made_plan(designed(HeightSettings(cost_a_per_m=2.0)))
    link = json.loads(results_text(plan))["links"][0]
    page = (Path(__file__).resolve().parents[2] / "docs" / "results.md").read_text(encoding="utf-8")
    missing = sorted(key for key in keys_of([link["heights"], link["confidence_along_path"]]) if f"`{key}`" not in page)
    assert not missing, missing
    assert {option["kind"] for option in link["heights"]["options"]} >= {"equal", "least cost"}


def test_heights_that_cannot_be_are_null() -> None:
    low = Limits(high_m=5.0)
    plan = made_plan(designed(HeightSettings(limits_a=low, limits_b=low)))
    text = results_text(plan)
    assert "Infinity" not in text
    link = json.loads(text)["links"][0]
    assert all(option["build"] is None for option in link["heights"]["options"])


def test_a_plan_without_design_says_null() -> None:
    linked = dataclasses.replace(designed(HeightSettings()), heights=None, confidence=None)
    link = json.loads(results_text(made_plan(linked)))["links"][0]
    assert link["heights"] is None
    assert link["confidence_along_path"] is None
