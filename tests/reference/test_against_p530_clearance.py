"""Clearance rules of Rec. ITU-R P.530-19, section 2.2.2.1, tried through the whole assessment.

The example's heights were worked out by hand from the Recommendation's equations (F1 and k exceeded 99.9 %, bulge
d1 d2 / (12.742 k)): 6 GHz, a flat obstacle level with both mast feet at mid-path.
"""

import numpy as np
import pytest

from fellspan.links.clearance import need_m
from fellspan.links.criteria import criteria_for, worst_month_k

HAND = [
    # km, fraction of F1, at the median k, height of the ray above the obstacle, m (hand calculation)
    (30.0, 1.0, True, 32.59),
    (30.0, 0.0, False, 26.21),
    (30.0, 0.3, False, 32.01),
    (30.0, 0.6, False, 37.81),
    (50.0, 1.0, True, 61.76),
    (50.0, 0.0, False, 61.68),
    (50.0, 0.3, False, 69.17),
    (50.0, 0.6, False, 76.66),
]


@pytest.mark.parametrize(("length_km", "fraction", "median", "height_m"), HAND)
def test_height_above_a_mid_path_obstacle(length_km: float, fraction: float, median: bool, height_m: float) -> None:
    distance = np.array([0.0, 0.5, 1.0]) * length_km * 1000.0
    k = 4.0 / 3.0 if median else worst_month_k(length_km * 1000.0)
    need = need_m(np.zeros(3), distance, k=k, fraction=fraction, frequency_hz=6e9)
    # 0.02 m: the hand values carry two decimals and the printed constant 17.3 instead of 17.3146
    assert need[1] == pytest.approx(height_m, abs=0.02)
    assert need[0] == 0.0
    assert need[2] == 0.0


@pytest.mark.parametrize(
    ("preset", "length_km", "extended", "expected"),
    [
        # fractions by the steps of section 2.2.2.1
        ("p530-temperate", 50.0, False, [1.0, 0.0]),
        ("p530-temperate", 50.0, True, [1.0, 0.3]),
        ("p530-tropical", 50.0, True, [1.0, 0.6]),
        ("p530-tropical", 30.0, True, [1.0]),  # no rule up to about 30 km: step 1 only
        ("sixty-percent", 50.0, True, [0.6]),  # common practice, no source
    ],
)
def test_fractions_of_the_presets(preset: str, length_km: float, extended: bool, expected: list[float]) -> None:
    criteria = criteria_for(preset, distance_m=length_km * 1000.0, median_k=1.4, extended=extended)  # type: ignore[arg-type]
    assert [criterion.fraction for criterion in criteria] == expected
    if preset != "sixty-percent":
        assert criteria[0].k == 1.4
    if len(criteria) == 2:
        assert criteria[1].k == pytest.approx(0.7953, abs=5e-5)  # P.530-19 equation (4) at 50 km, hand calculation


def test_tropical_path_of_30_km_says_that_there_is_no_rule() -> None:
    (only,) = criteria_for("p530-tropical", distance_m=30e3)
    assert "no tropical rule" in only.note
    assert "30 km" in only.note


def test_short_path_says_that_the_curve_begins_at_18_km() -> None:
    assert "18 km" in criteria_for("p530-temperate", distance_m=10e3)[1].note
    assert "18 km" not in criteria_for("p530-temperate", distance_m=19e3)[1].note
