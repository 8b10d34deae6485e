"""Causes by name, verdicts, basis, sentences and cautions."""

import dataclasses
import datetime as dt
import re

import numpy as np
import pytest
from made_profiles import link_of, obstacle, profile_of

from fellspan.links.assess import AssessSettings, assess_profile
from fellspan.links.budget import sea_share
from fellspan.links.criteria import Criterion
from fellspan.links.result import AtEnds, LinkResult
from fellspan.links.site import Antenna
from fellspan.links.verdicts import signal_verdict
from fellspan.terrain.profile import PathProfile

SIXTY = AssessSettings(preset="sixty-percent")


def _result(
    profile: PathProfile, a: object = 10.0, b: object = 10.0, settings: AssessSettings = SIXTY, **link: object
) -> LinkResult:
    return assess_profile(link_of(profile, a, b, **link), profile, settings).result  # type: ignore[arg-type]


def ridge(top_m: float, at_m: float = 4200.0, width_m: float = 300.0):  # type: ignore[no-untyped-def]
    return lambda d: top_m * np.exp(-(((d - at_m) / width_m) ** 2))


def between(from_m: float, to_m: float, height_m: float):  # type: ignore[no-untyped-def]
    return lambda d: np.where((d >= from_m) & (d <= to_m), height_m, 0.0)


@pytest.mark.parametrize(
    ("profile", "heights", "cause"),
    [
        (profile_of(10e3, ridge(60.0)), 20.0, "ground at 60 m"),
        (profile_of(10e3, ridge(60.0), ground_is_bare=False), 20.0, "surface at 60 m"),
        (profile_of(10e3, 5.0, cover=between(4000, 4100, 14.0)), 15.0, "trees, 14 m"),
        (profile_of(10e3, 5.0, cover=between(4000, 4100, 7.5), kind="building"), 9.0, "building, 7.5 m"),
        (profile_of(10e3, 5.0, cover=between(4000, 4100, 14.0), kind="other"), 15.0, "cover, 14 m"),
        (profile_of(10e3, ridge(60.0), cover=between(4100, 4300, 14.0)), 20.0, "ground at 60 m and trees, 14 m"),
        (profile_of(10e3, 5.0, obstacles=(obstacle("Crane 2", 4000, 4010, 40.0, ground_m=5.0),)), 20.0, "Crane 2"),
        (profile_of(60e3, 0.4), 30.0, "Earth bulge over the sea"),
        (
            profile_of(10e3, ridge(60.0)),
            67.5,
            "ground at 60 m",
        ),  # 0.5 m short with a bulge of 1.4 m: the ridge is to blame
        (profile_of(60e3, 70.0), 30.0, "Earth bulge"),
        (profile_of(60e3, 3.0, source="sea level"), 30.0, "Earth bulge over the sea"),
        (profile_of(2e3, 0.0), 30.0, "sea"),
    ],
)
def test_cause_by_name(profile: PathProfile, heights: float, cause: str) -> None:
    assert _result(profile, heights, heights).clearance[0].cause == cause


def test_obstructed_says_what_cuts_where_and_what_height_clears_it() -> None:
    result = _result(profile_of(10e3, ridge(60.0)), 20.0, 20.0)
    assert result.verdict == "obstructed"
    # 60 m - 20 m + a bulge of 4.2 km * 5.8 km / (2 * 4/3 * 6371 km) = 41.43 m, rounded up: it is missing
    assert result.reasons[0] == "Obstructed: ground at 60 m cuts the sight line by 41.5 m at 4.20 km from A."
    extra = result.clearance[0].extra_height_m
    assert extra.both is not None
    assert result.reasons[2] == f"Raise both by {np.ceil(extra.both):.0f} m, to be clear with 90 % confidence."
    (stretch,) = result.clearance[0].obstructions
    assert stretch.from_m < 4200.0 < stretch.to_m
    assert stretch.cuts_sight
    assert any("power lines" in caution and "local codes" in caution for caution in result.cautions)


def test_marginal_when_only_the_zone_is_cut() -> None:
    result = _result(profile_of(10e3, ridge(60.0)), 64.0, 64.0)
    assert result.verdict == "marginal"
    assert result.reasons[0].startswith(
        "Marginal: the sight line is free, but ground at 60 m at 4.20 km from A leaves 0.23 F1"
    )
    assert not result.clearance[0].obstructions[0].cuts_sight


def test_marginal_when_only_the_confidence_fails() -> None:
    profile = profile_of(10e3, ridge(60.0), sigma_m=5.0)
    result = _result(profile, 70.0, 70.0)
    assert result.clearance[0].met
    assert result.verdict == "marginal"
    spare = result.clearance[0].clearance_m - result.clearance[0].required_m
    assert 0.0 < spare < 5.0
    assert f"{100 * result.confidence:.0f}"[:2] in result.reasons[0]
    assert "(90 % asked)" in result.reasons[0]
    assert _result(profile, 80.0, 80.0).verdict == "clear"


def test_errors_of_the_ground_an_antenna_stands_on_move_both() -> None:
    # 8 m masts on flat ground known to 6 m: the ground within a cell of a mast rises and falls with it
    profile = profile_of(10e3, lambda d: -50.0 * np.sin(np.pi * d / 10e3), sigma_m=6.0, cell_m=1500.0)
    assert _result(profile, 8.0, 8.0).confidence > 0.99


def test_no_height_at_the_ends_is_offered_beyond_usual_masts() -> None:
    result = _result(profile_of(10e3, ridge(400.0)), 20.0, 20.0)
    assert "relay" in result.reasons[2]
    assert "Raise A" not in " ".join(result.reasons)


def test_the_height_said_makes_it_clear_with_the_confidence_asked() -> None:
    rule = AssessSettings(criteria=(Criterion(name="rule", k=4 / 3, fraction=0.6, source="made"),), confidence=0.95)
    profile = profile_of(10e3, ridge(60.0), sigma_m=3.0)
    low = _result(profile, 55.0, 55.0, rule)
    found = re.fullmatch(
        r"Raise A by (\d+) m, or B by (\d+) m, or both by (\d+) m, to be clear .* 95 %.*", low.reasons[2]
    )
    assert found is not None
    a, b, both = (float(text) for text in found.groups())
    for add_a, add_b in ((a, 0.0), (0.0, b), (both, both)):
        assert _result(profile, 55.0 + add_a, 55.0 + add_b, rule).verdict == "clear"
        assert _result(profile, 53.5 + add_a, 53.5 + add_b, rule).verdict != "clear"


def test_stretches_that_the_raster_cannot_tell_apart_are_one() -> None:
    rows = profile_of(
        10e3, 5.0, cover=lambda d: np.where((d > 4000) & (d < 4200) & (d % 20 < 10), 20.0, 0.0), cell_m=30.0
    )
    assert len(_result(rows, 15.0, 15.0).clearance[0].obstructions) == 1
    two = profile_of(
        10e3, 5.0, cover=lambda d: between(4000, 4100, 20.0)(d) + between(4200, 4300, 20.0)(d), cell_m=30.0
    )
    assert len(_result(two, 15.0, 15.0).clearance[0].obstructions) == 2
    crane = obstacle("Crane 2", 4130.0, 4130.0, 40.0, ground_m=5.0)
    beside = profile_of(10e3, 5.0, cover=between(4000, 4100, 20.0), cell_m=30.0, obstacles=(crane,))
    assert [item.cause for item in _result(beside, 15.0, 15.0).clearance[0].obstructions] == ["trees, 20 m", "Crane 2"]


def test_clear_on_bare_ground_says_so_first() -> None:
    result = _result(profile_of(5e3), 60.0, 60.0)
    assert result.verdict == "clear"
    assert result.basis == "bare ground only"
    assert result.reasons[0].startswith("Clear on bare ground only: every criterion is met with over 99.9 % confidence")
    assert any("trees and buildings are not in the data" in reason for reason in result.reasons)


def test_bare_ground_names_the_kind_that_the_data_lack() -> None:
    note = "buildings are not in the data: the surface counts as not known"
    result = _result(profile_of(5e3, notes=(note,)), 60.0, 60.0)
    assert "Basis: bare ground only; buildings are not in the data (but for" in " ".join(result.reasons)


def test_basis() -> None:
    assert _result(profile_of(5e3, surface_is_known=True)).basis == "surface raster"
    assert _result(profile_of(5e3, ground_is_bare=False)).basis == "surface raster"
    assert _result(profile_of(5e3, measured=2)).basis == "surveyed"
    assert _result(profile_of(5e3, measured=1)).basis == "bare ground only"


def test_surveyed_asks_for_the_samples_that_an_unlisted_tree_could_reach() -> None:
    valley = lambda d: -80.0 * np.sin(np.pi * d / 5e3)  # noqa: E731
    at = profile_of(5e3, valley).distance_m
    near_ends = np.where(np.minimum(at, 5e3 - at) < 800.0, 2, 0).astype(np.int8)
    too_near = np.where(np.minimum(at, 5e3 - at) < 100.0, 2, 0).astype(np.int8)
    assert _result(profile_of(5e3, valley, measured=0)).basis == "bare ground only"
    made = profile_of(5e3, valley, cover=between(2300, 2700, 68.0))  # listed cover is no unlisted tree
    for measured, basis in ((near_ends, "surveyed"), (too_near, "bare ground only")):
        fields = {name: getattr(made, name) for name in made.__slots__}
        assert _result(PathProfile(**(fields | {"measured": measured}))).basis == basis


def test_typed_parapet_is_no_survey() -> None:
    roof = {"height_m": 3.0, "height_reference": "roof", "roof_m": 9.0, "roof_edge_m": 30.0, "parapet_m": 1.0}
    deep = profile_of(5e3, lambda d: np.where((d < 5.0) | (d > 4995.0), 0.0, -90.0))
    assert _result(deep, roof, 20.0).basis == "bare ground only"


@pytest.mark.parametrize(
    ("margin", "verdict"), [(10.0, "meets"), (9.99, "marginal"), (7.0, "marginal"), (6.99, "below")]
)
def test_signal_verdict_on_the_lesser_margin(margin: float, verdict: str) -> None:
    assert signal_verdict(AtEnds(at_a=margin, at_b=40.0), wanted_db=10.0) == verdict
    assert signal_verdict(AtEnds(at_a=40.0, at_b=margin), wanted_db=10.0) == verdict
    assert signal_verdict(AtEnds(at_a=None, at_b=margin), wanted_db=10.0) is None


def test_level_by_hand() -> None:
    profile = profile_of(10e3, lambda d: -200.0 * np.sin(np.pi * d / 10e3))
    result = _result(profile, 30.0, 30.0, frequency_hz=2.4e9, power_dbm=20.0, gain_dbi=15.0, threshold_dbm=-80.0)
    # 2.4 GHz over 10 km: 120.052 dB (hand calculation from the exact form of P.525)
    assert result.losses_db.free_space == pytest.approx(120.052, abs=5e-4)
    assert result.losses_db.diffraction == 0.0
    assert result.received_dbm == AtEnds(at_a=result.received_dbm.at_b, at_b=result.received_dbm.at_b)
    # Gases at 2.4 GHz: some 0.007 dB/km (Rec. ITU-R P.676-12).
    assert result.losses_db.gases == pytest.approx(0.07, abs=0.02)
    assert result.received_dbm.at_b == pytest.approx(20 + 15 + 15 - 120.052 - result.losses_db.gases, abs=5e-4)
    assert result.margin_db.at_a == pytest.approx(80 - 70.052 - result.losses_db.gases, abs=5e-4)
    assert result.signal_verdict == "marginal"


def test_an_absurd_length_draws_a_caution() -> None:
    far = _result(profile_of(310e3), 3000.0, 3000.0)
    assert any(caution.startswith("The path is 310 km long") for caution in far.cautions)
    assert not any("km long" in caution for caution in _result(profile_of(290e3), 3000.0, 3000.0).cautions)


def test_feeders_at_both_ends_are_lost() -> None:
    profile = profile_of(5e3)
    link = link_of(profile, power_dbm=20.0, gain_dbi=15.0)
    lossy = dataclasses.replace(
        link, antenna_a=Antenna(gain_dbi=15.0, feeder_loss_db=1.5), antenna_b=Antenna(gain_dbi=15.0, feeder_loss_db=0.7)
    )
    before, after = (assess_profile(item, profile).result.received_dbm.at_a for item in (link, lossy))
    assert before is not None
    assert after == pytest.approx(before - 2.2, abs=1e-9)


def test_sea_share_counts_length_not_samples() -> None:
    made = profile_of(1000.0, n=11)
    fields = {name: getattr(made, name) for name in made.__slots__}
    distance = np.array([0.0, 10.0, 20.0, 30.0, 40.0, 50.0, 60.0, 70.0, 80.0, 500.0, 1000.0])
    source = np.array([0, 0, 0, 0, 0, 0, 0, 0, 0, 1, 1], dtype=np.int16)
    sources = ("made_dtm.tif", "sea level")
    profile = PathProfile(**(fields | {"distance_m": distance, "source": source, "sources": sources}))
    assert sea_share(profile) == pytest.approx(0.71, abs=1e-9)
    assert sea_share(made) == 0.0


def test_a_tree_round_the_antenna_itself_cuts_the_sight_line() -> None:
    profile = profile_of(5e3, obstacles=(obstacle("Old oak", 0.0, 0.0, 15.0, kind="tree"),))
    result = _result(profile, 10.0, 60.0)
    assert result.reasons[0] == "Obstructed: Old oak cuts the sight line by 5.0 m at 0 m from A."
    extra = result.clearance[0].extra_height_m
    assert (extra.a, extra.b, extra.both) == (pytest.approx(5.0), None, pytest.approx(5.0))


def test_unknown_equipment_gives_no_level() -> None:
    result = _result(profile_of(5e3), power_dbm=20.0)
    assert (result.received_dbm.at_a, result.margin_db.at_b, result.signal_verdict) == (None, None, None)
    no_threshold = _result(profile_of(5e3), power_dbm=20.0, gain_dbi=20.0)
    assert no_threshold.received_dbm.at_a is not None
    assert no_threshold.margin_db.at_a is None
    assert any("no threshold" in reason for reason in no_threshold.reasons)


def test_trees_are_taken_as_opaque_and_that_is_said() -> None:
    trees = _result(profile_of(10e3, 5.0, cover=between(4000, 4300, 25.0)), 15.0, 15.0)
    bare = _result(profile_of(10e3, 5.0), 15.0, 15.0)
    assert trees.losses_db.diffraction > bare.losses_db.diffraction + 6.0
    assert any("opaque" in caution for caution in trees.cautions)
    assert not any("opaque" in caution for caution in bare.cautions)


def test_tilt_falls_below_level_by_half_the_angle_of_the_path() -> None:
    result = _result(profile_of(50e3), 100.0, 100.0)
    # 50 km / (2 * 4/3 * 6371 km) = 2.943 mrad = 0.1686 degrees (hand calculation)
    assert result.tilt_ab_deg == pytest.approx(-0.16863, abs=5e-5)
    up = _result(profile_of(5e3), 10.0, 110.0)
    assert up.tilt_ab_deg == pytest.approx(np.degrees(0.02) - 0.01686, abs=5e-4)
    assert up.tilt_ba_deg == pytest.approx(-np.degrees(0.02) - 0.01686, abs=5e-4)


@pytest.mark.parametrize(
    ("frequency_hz", "length_m", "text"),
    [
        (1.4e9, 5e3, "about 2 GHz and up"),
        (18e9, 5e3, "above about 13 GHz"),
        (20e6, 5e3, "outside the range of Rec. ITU-R P.526-16"),
        (6e9, 210e3, "18 to 200 km"),
    ],
)
def test_ranges_that_are_left_draw_a_caution(frequency_hz: float, length_m: float, text: str) -> None:
    result = _result(profile_of(length_m), 80.0, 80.0, AssessSettings(), frequency_hz=frequency_hz)
    assert any(text in caution for caution in result.cautions)
    assert not any(text in caution for caution in _result(profile_of(20e3), 80.0, 80.0, AssessSettings()).cautions)


def test_notes_of_the_profile_are_passed_on() -> None:
    assert "Seam of 0.4 m at 2 km." in _result(profile_of(5e3, notes=("Seam of 0.4 m at 2 km.",))).cautions


def test_own_criteria_replace_the_preset() -> None:
    own = (
        Criterion(name="ours", k=float("inf"), fraction=0.5, source="house rule"),
        Criterion(name="duct", k=-3.0, fraction=0.5, source="house rule"),
    )
    result = _result(profile_of(20e3), 50.0, 50.0, AssessSettings(criteria=own))
    assert [item.criterion for item in result.clearance] == ["ours", "duct"]
    assert result.clearance[0].k is None
    assert result.clearance[0].bulge_m == 0.0
    assert result.governing == 0


def test_magnetic_bearing_for_the_date_and_a_caution_outside_the_model() -> None:
    profile = profile_of(5e3)
    dated = _result(profile, settings=AssessSettings(date=dt.date(2026, 5, 1)))
    end = dated.ends.a
    assert end.declination_deg is not None
    assert end.magnetic_bearing_deg == pytest.approx((dated.bearing_ab_deg - end.declination_deg) % 360.0)
    assert dated.magnetic_model is not None
    old = _result(profile, settings=AssessSettings(date=dt.date(1999, 5, 1)))
    assert old.ends.a.magnetic_bearing_deg is None
    assert any("1999" in caution for caution in old.cautions)
    assert _result(profile).ends.a.magnetic_bearing_deg is None
