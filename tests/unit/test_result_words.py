"""What every view says of a result: one rule of rounding, and never 'clear' alone where trees and buildings are unknown."""

from dataclasses import replace

import pytest
from exports_made_plan import LENGTH_M, made_criterion, made_plan

from fellspan.links import words
from fellspan.links.verdicts import SightLine, reasons
from fellspan.report.wording import true_minus

MISSED = made_criterion(0, "ridge", (36.0, -45.0))


@pytest.mark.parametrize(
    ("value", "up", "down"),
    [(1.742, 1.8, 1.7), (2.0, 2.0, 2.0), (0.3, 0.3, 0.3), (30.96, 31.0, 30.9), (0.0, 0.0, 0.0), (-0.04, 0.0, -0.1)],
)
def test_missing_goes_up_and_spare_goes_down(value: float, up: float, down: float) -> None:
    assert (words.up_m(value), words.down_m(value)) == (up, down)
    assert not str(words.up_m(value)).startswith("-0.0")


@pytest.mark.parametrize(
    ("height", "said"),
    [(1.742, "1.8 m"), (100.0, "100.0 m"), (100.01, "not practical"), (11_273.4, "not practical"), (None, "cannot")],
)
def test_a_height_to_build_is_rounded_up_or_called_what_it_is(height: float | None, said: str) -> None:
    assert words.to_build(height) == said


def test_one_point_has_one_number_and_two_points_have_two() -> None:
    near = replace(MISSED, clearance_m=1.549, shortfall_m=4.46, shortfall_at_m=1_601.0)
    assert words.spare_m(near, length_m=LENGTH_M) == -4.5
    far = replace(near, shortfall_m=5.21, shortfall_at_m=2_400.0)
    assert words.is_two_points(far, length_m=LENGTH_M)
    assert words.spare_m(far, length_m=LENGTH_M) == -4.5
    assert words.spare_m(replace(near, met=True, clearance_m=7.77), length_m=LENGTH_M) == 1.7


@pytest.mark.parametrize("at_m", [1_600.0, 2_400.0])
def test_sentences_say_whether_the_most_is_missing_at_another_point(at_m: float) -> None:
    said = reasons(
        verdict="marginal",
        basis="surface raster",
        results=(replace(MISSED, shortfall_at_m=at_m, shortfall_m=4.51),),
        governing=0,
        sight=SightLine(cut_m=-1.0, at_m=1_600.0, cause="ridge"),
        raising=MISSED.extra_height_m,
        confidence=0.1,
        confidence_asked=0.9,
        ignored=(),
    )
    other = "The most is missing at another point: 4.6 m, 2.40 km from A, under rule 0."
    assert said[1] == (other if at_m == 2_400.0 else "4.6 m is missing there under rule 0.")


def test_clear_on_bare_ground_is_a_state_of_its_own() -> None:
    result = made_plan().links[0].result
    for verdict, basis, state in (
        ("clear", "bare ground only", "clear-bare"),
        ("clear", "surface raster", "clear"),
        ("clear", "surveyed", "clear"),
        ("marginal", "bare ground only", "marginal"),
        ("obstructed", "bare ground only", "obstructed"),
    ):
        assert words.state_of(replace(result, verdict=verdict, basis=basis)) == state
    assert "bare ground only" in words.STATE_WORDS["clear-bare"]


def test_only_quantities_get_a_true_minus() -> None:
    line = "Signal: -42.8 dBm at 'Pier -3' (-1.5 dB, tilt -0.4°), Beacon - West Point, link A-2, 3-4 m"
    assert (
        true_minus(line) == "Signal: −42.8 dBm at 'Pier -3' (−1.5 dB, tilt −0.4°), Beacon - West Point, link A-2, 3-4 m"
    )
