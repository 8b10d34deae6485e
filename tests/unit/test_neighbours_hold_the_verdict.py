"""A link whose margin goes to its neighbours must not be told that its signal meets what is wanted."""

from dataclasses import replace
from pathlib import Path

import pytest

from fellspan.links.interference_result import InterferenceResult
from fellspan.links.result import LinkResult
from fellspan.planning.neighbours import held_by_neighbours
from fellspan.planning.planner import plan_study
from fellspan.study.reading import load_study

SAMPLE = Path(__file__).resolve().parents[2] / "sample_terrain" / "tolmera.toml"


@pytest.fixture(scope="module")
def clear() -> LinkResult:
    study = load_study(SAMPLE)
    links = tuple(link for link in study.links if link.name == "Beacon - School")
    (planned,) = plan_study(replace(study, links=links)).links
    assert planned.result.signal_verdict == "meets"
    return planned.result


def heard(left_db: float | None) -> InterferenceResult:
    return InterferenceResult(
        link="Beacon - School",
        site="School",
        end="B",
        frequency_hz=5.795e9,
        carrier_dbm=-66.0,
        noise_dbm=-95.0,
        noise_figure_is_assumed=False,
        interferers=(),
        weaker=0,
        interference_dbm=-70.0,
        c_i_db=4.0,
        threshold_degradation_db=25.0,
        margin_db=18.0,
        effective_margin_db=left_db,
    )


@pytest.mark.parametrize(("left_db", "verdict"), [(12.0, "meets"), (8.0, "marginal"), (-7.0, "below"), (None, "meets")])
def test_the_margin_that_neighbours_leave_decides(clear: LinkResult, left_db: float | None, verdict: str) -> None:
    held = held_by_neighbours(clear, [heard(left_db)])
    assert held.signal_verdict == verdict
    assert held.signal is not None
    if verdict != "meets":
        assert f"neighbours on the same channel leave {left_db:.1f} dB" in held.signal.verdict_reason


def test_neighbours_never_lift_a_verdict(clear: LinkResult) -> None:
    below = replace(clear, signal_verdict="below")
    assert held_by_neighbours(below, [heard(30.0)]) is below


def test_a_plan_says_what_neighbours_leave_of_the_margin() -> None:
    study = load_study(SAMPLE)
    crowded = tuple(
        replace(link, radio=replace(link.radio, frequency_hz=5.755e9)) if link.radio.duplex == "time" else link
        for link in study.links
        if link.name in ("Beacon - West Point", "Harbour Office - Southdown Farm", "Harbour Office - Cape Light")
    )
    plans = plan_study(replace(study, links=crowded)).links
    told = [plan for plan in plans if any(" dB with neighbours, " in words for words in plan.result.reasons)]
    assert told
    for plan in told:
        left = plan.result.margin_with_neighbours_db
        assert left is not None
        assert left != plan.result.margin_db
        available = [words for words in plan.result.reasons if words.startswith("Available ")]
        assert all("neighbours on the channel are left out of it" in words for words in available)
    assert any("neighbours" in caution.lower() for plan in told for caution in plan.result.cautions)
