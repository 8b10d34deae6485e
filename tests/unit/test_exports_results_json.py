"""results.json, schema 1: the keys are pinned, it round-trips, holds no NaN, and every key is documented."""

import dataclasses
import json
import math
from pathlib import Path
from typing import Any

import pytest
from exports_made_plan import made_link, made_plan

from fellspan.exports.results_json import (
    ResultsFileError,
    link_result_dict,
    link_result_from_dict,
    results_dict,
    results_text,
)
from fellspan.planning.plan import LinkPlan

TOP = ["schema", "fellspan", "study", "files", "cautions", "links", "failures", "interference"]
STUDY = [
    "title",
    "planner",
    "revision",
    "date",
    "file",
    "preset",
    "median_k",
    "confidence",
    "growth_years",
    "notes",
]
LINK_KEYS = [
    "name",
    "a",
    "b",
    "verdict",
    "signal_verdict",
    "basis",
    "confidence",
    "confidence_asked",
    "reasons",
    "cautions",
    "distance_m",
    "bearing_ab_deg",
    "bearing_ba_deg",
    "tilt_ab_deg",
    "tilt_ba_deg",
    "frequency_hz",
    "polarization",
    "median_k",
    "ends",
    "clearance",
    "governing",
    "ignored",
    "losses_db",
    "received_dbm",
    "margin_db",
    "wanted_margin_db",
    "magnetic_model",
    "step_m",
    "sources",
    "vertical_datum",
]
PROMISED_CRITERION = {
    "criterion",
    "k",
    "required_fraction",
    "worst_fraction",
    "worst_at_m",
    "cause",
    "extra_height_m",
    "probability",
}


def keys_of(value: Any) -> set[str]:
    if isinstance(value, dict):
        return set(value).union(*(keys_of(inner) for inner in value.values()))
    return set().union(*(keys_of(inner) for inner in value)) if isinstance(value, list) else set()


def test_the_keys_of_schema_1_are_pinned_in_their_order() -> None:
    found = results_dict(made_plan())
    assert list(found) == TOP
    assert found["schema"] == 1
    assert found["fellspan"] == "0.1.0"
    assert list(found["study"]) == STUDY
    assert list(found["files"][0]) == ["role", "name", "modified", "size", "sha256"]
    assert list(found["failures"][0]) == ["name", "a", "b", "error", "what", "details"]
    link = found["links"][0]
    assert list(link)[: len(LINK_KEYS)] == LINK_KEYS
    assert set(link["clearance"][0]) >= PROMISED_CRITERION
    assert link["clearance"][0]["extra_height_m"] == {"a": 7.5, "b": None, "both": 4.5}
    assert list(link["losses_db"])[:2] == ["free_space", "diffraction"]
    assert list(link["received_dbm"]) == list(link["margin_db"]) == ["at_a", "at_b"]
    assert (link["a"], link["b"]) == ("Quay", "Tower")


def test_a_result_round_trips_through_the_text_of_the_file() -> None:
    linked = made_link(name='Håbour – «β» "quoted"\n\ud800')
    read = json.loads(results_text(made_plan(linked)))
    assert link_result_from_dict(read["links"][0]) == linked.result


def test_the_text_is_the_same_each_time_and_ends_with_a_newline() -> None:
    text = results_text(made_plan())
    assert text == results_text(made_plan())
    assert text.endswith("}\n")
    assert "\r" not in text


def test_what_is_not_finite_becomes_null() -> None:
    linked = made_link()
    worst = dataclasses.replace(linked.result.clearance[0], worst_fraction=math.inf, k=-math.inf, probability=math.nan)
    result = dataclasses.replace(linked.result, clearance=(worst,), tilt_ab_deg=math.nan)
    spoilt = LinkPlan(link=linked.link, result=result, profile=linked.profile, levels=linked.levels)
    text = results_text(made_plan(spoilt))
    assert "NaN" not in text
    assert "Infinity" not in text
    link = json.loads(text)["links"][0]
    assert link["tilt_ab_deg"] is None
    assert [link["clearance"][0][key] for key in ("worst_fraction", "k", "probability")] == [None, None, None]


def test_keys_of_a_later_version_are_skipped() -> None:
    result = made_link().result
    assert link_result_from_dict({**link_result_dict(result), "phase_of_the_moon": 0.3}) == result


@pytest.mark.parametrize(
    ("key", "value", "shown"),
    [("verdict", "perhaps", "verdict"), ("distance_m", "far", "distance_m"), ("ends", None, "ends")],
)
def test_a_spoilt_entry_is_refused_by_name(key: str, value: object, shown: str) -> None:
    entry = link_result_dict(made_link().result) | {key: value}
    with pytest.raises(ResultsFileError, match=shown) as caught:
        link_result_from_dict(entry)
    assert "Quay - Tower" in str(caught.value)
    assert len(str(caught.value).splitlines()) <= 4


def test_a_missing_key_is_refused_by_name() -> None:
    entry = link_result_dict(made_link().result)
    del entry["distance_m"]
    with pytest.raises(ResultsFileError, match="distance_m"):
        link_result_from_dict(entry)


def test_every_key_is_explained_in_the_docs() -> None:
    page = (Path(__file__).resolve().parents[2] / "docs" / "results.md").read_text(encoding="utf-8")
    missing = sorted(key for key in keys_of(results_dict(made_plan())) if f"`{key}`" not in page)
    assert not missing, missing
