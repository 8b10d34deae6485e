"""Nothing that stands in the way may be left out so that a link reads 'clear': made paths that once were."""

import dataclasses
from statistics import NormalDist

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from made_profiles import link_of, mirrored, obstacle, profile_of

from fellspan.links.assess import Assessment, AssessSettings, assess_profile
from fellspan.links.own_building import standing
from fellspan.links.uncertainty import clearance_errors_m
from fellspan.terrain.profile import BesidePath, PathProfile

SIXTY = AssessSettings(preset="sixty-percent")
ROOF: dict[str, object] = {"height_m": 2.0, "height_reference": "roof"}


def _assess(
    profile: PathProfile, a: object = 10.0, b: object = 10.0, settings: AssessSettings = SIXTY, **link: object
) -> Assessment:
    return assess_profile(link_of(profile, a, b, **link), profile, settings)  # type: ignore[arg-type]


def _with(profile: PathProfile, **changes: object) -> PathProfile:
    fields = {field.name: getattr(profile, field.name) for field in dataclasses.fields(profile)}
    return PathProfile(**(fields | changes))  # type: ignore[arg-type]


@pytest.mark.parametrize("kind", ["building", "other"])
@pytest.mark.parametrize("turned", [False, True])
def test_a_block_on_the_quay_that_the_antenna_stands_on_stays(kind: str, turned: bool) -> None:
    quay = obstacle("Quay", 700.0, 3000.0, 2.0) if turned else obstacle("Quay", 0.0, 2300.0, 2.0)
    at_m = 2100.0 if turned else 900.0
    profile = profile_of(
        3000.0, cover=lambda d: np.where(np.abs(d - at_m) < 20.0, 60.0, 0.0), kind=kind, obstacles=(quay,)
    )
    result = _assess(profile, 12.0, 12.0).result
    assert result.verdict == "obstructed"
    assert result.clearance[0].cause == ("building, 60 m" if kind == "building" else "cover, 60 m")
    assert [item.height_m for item in result.ignored] == [2.0]


def test_an_outline_takes_raster_cover_out_up_to_its_own_height_and_the_error_of_the_raster() -> None:
    hall = obstacle("Hall", 0.0, 60.0, 9.0)
    for sigma_m, height_m, left_out in ((0.2, 9.9, True), (0.2, 10.2, False), (2.0, 12.9, True), (9.0, 14.2, False)):
        profile = profile_of(
            2000.0,
            cover=lambda d, height_m=height_m: np.where(d <= 40.0, height_m, 0.0),
            kind="building",
            obstacles=(hall,),
            sigma_m=sigma_m,
        )
        assert bool(standing(profile).surface_m.max() == 0.0) is left_out, (sigma_m, height_m)


def test_what_the_own_building_hid_stays_an_obstacle() -> None:
    hall, shed = obstacle("Hall", 0.0, 60.0, 9.0), obstacle("Shed", 30.0, 80.0, 7.0)
    stands = standing(profile_of(2000.0, obstacles=(hall, shed), n=2001))
    at = profile_of(2000.0, n=2001).distance_m
    assert np.all(stands.surface_m[(at >= 30.0) & (at <= 80.0)] == 7.0)
    assert stands.surface_m[at < 30.0].max() == 0.0


def test_below_the_own_roof_is_never_clear() -> None:
    # 2 m above a 60 m roof that reaches 450 m ahead, the other end far below: the ray leaves through the roof
    block = obstacle("Terminal", 0.0, 450.0, 60.0)
    result = _assess(profile_of(3000.0, obstacles=(block,)), ROOF, 20.0).result
    assert result.verdict == "marginal"
    assert result.reasons[0] == (
        "Marginal: every criterion is met, but the sight line passes 4.4 m below the top of Terminal 450 m in front of A, "
        "on its own building, whose roof edge lies 450 m ahead."
    )
    # 62 - 42 * 0.15 = 55.70 m over the edge, 0.07 m of bulge: 4.37 m missing, 4.37 / 0.85 = 5.1 m at A (hand calculation)
    assert result.reasons[2].startswith("Raise A by 6 m, or B by 30 m, or both by 5 m")
    assert _assess(profile_of(3000.0, obstacles=(block,)), ROOF | {"height_m": 7.2}, 20.0).result.verdict == "clear"
    assert _assess(profile_of(3000.0, obstacles=(block,)), ROOF, 62.0).result.verdict == "clear"


def test_below_the_own_roof_at_the_other_end() -> None:
    block = obstacle("Terminal", 2550.0, 3000.0, 60.0)
    result = _assess(profile_of(3000.0, obstacles=(block,)), 20.0, ROOF).result
    assert result.verdict == "marginal"
    assert "450 m in front of B, on its own building, whose roof edge lies 450 m ahead" in result.reasons[0]


def test_a_mast_beside_its_own_building_is_clear_only_above_it() -> None:
    mill = profile_of(2000.0, obstacles=(obstacle("Mill", 0.0, 40.0, 12.0),))
    assert _assess(mill, 9.0, 20.0).result.verdict == "marginal"
    assert _assess(mill, 13.0, 20.0).result.verdict == "clear"


def test_an_antenna_below_a_roof_of_its_own_is_told_so() -> None:
    mill = profile_of(2000.0, obstacles=(obstacle("Mill", 0.0, 40.0, 12.0),))
    result = _assess(mill, ROOF | {"roof_m": 6.0}, 20.0).result
    assert result.verdict == "marginal"
    told = " ".join(result.cautions)
    assert (
        "antenna of 'Alder', 8.0 m above ground, is 4.0 m below the top of what stands at its own spot (Mill)" in told
    )
    assert "roof of 'Alder' is given as 6 m above ground, the outline there (Mill) is 12.0 m high" in told
    assert "roof of" not in " ".join(_assess(mill, ROOF | {"roof_m": 12.5}, 20.0).result.cautions)


@pytest.mark.parametrize(
    ("roof_m", "sigma_m", "verdict"),
    # Allowed above the 12 m that the data hold: 1 m and two standard errors
    [
        (12.9, 0.0, "clear"),
        (13.2, 0.0, "marginal"),
        (13.9, 0.5, "clear"),
        (14.2, 0.5, "marginal"),
        (40.0, 0.5, "marginal"),
    ],
)
@pytest.mark.parametrize("outline", [True, False])
@pytest.mark.parametrize("turned", [False, True])
def test_a_typed_roof_above_the_building_in_the_data_is_never_clear(
    roof_m: float, sigma_m: float, verdict: str, outline: bool, turned: bool
) -> None:
    if outline:
        profile = profile_of(2000.0, obstacles=(obstacle("Mill", 0.0, 40.0, 12.0),), sigma_m=sigma_m)
    else:
        house = lambda d: np.where(d <= 6.0, 12.0, 0.0)  # noqa: E731
        profile = profile_of(2000.0, cover=house, kind="building", sigma_m=sigma_m)
    ends = [ROOF | {"roof_m": roof_m, "height_m": 6.0}, 30.0]
    name = "Birch" if turned else "Alder"
    if turned:
        profile, ends = mirrored(profile), ends[::-1]
    result = _assess(profile, *ends).result
    assert result.verdict == verdict
    words = (
        f"the roof of '{name}' is given as {roof_m:g} m above ground, and what stands there in the data is 12.0 m high"
    )
    assert (words in result.reasons[0]) is (verdict == "marginal")


@pytest.mark.parametrize(("roof_m", "said"), [(59.0, False), (61.0, True)])
def test_a_tall_typed_roof_where_the_data_hold_no_building_draws_a_caution(roof_m: float, said: bool) -> None:
    result = _assess(profile_of(2000.0), ROOF | {"roof_m": roof_m}, 30.0).result
    words = f"The roof of 'Alder' is given as {roof_m:g} m above ground, and the data hold no building there"
    assert (words in " ".join(result.cautions)) is said
    assert result.verdict == "clear"


def test_on_a_slope_the_roof_is_level_and_not_as_high_as_its_downhill_wall() -> None:
    # ground falls 10 m under a building whose top is level at 112 m; its greatest height above ground is 22 m
    mill = dataclasses.replace(obstacle("Mill", 0.0, 50.0, 22.0), top_amsl_m=112.0)
    profile = profile_of(2000.0, lambda d: 100.0 - np.clip(d, 0.0, 50.0) / 5.0, obstacles=(mill,))
    assert _assess(profile, ROOF, 30.0).result.ends.a.antenna_amsl_m == pytest.approx(114.0)


def test_within_ten_metres_only_unlisted_cover_that_nobody_measured_is_left_out() -> None:
    cover = lambda d: np.where((d >= 3.0) & (d <= 9.0), 25.0, 0.0)  # noqa: E731
    plain = profile_of(2000.0, cover=cover, n=2001)
    assert _assess(plain, 30.0, 30.0).result.verdict == "clear"
    assert _assess(plain, 10.0, 30.0).result.verdict == "marginal"
    assert "left out because A stands there" in _assess(plain, 10.0, 30.0).result.reasons[0]
    surveyed = _with(plain, measured=np.where(plain.cover_m > 0.0, 2, 0).astype(np.int8))
    assert _assess(surveyed, 10.0, 30.0).result.verdict == "obstructed"
    # raster cover over the outline of the house next door is that house, however it is listed
    house = profile_of(2000.0, cover=cover, n=2001, kind="building", obstacles=(obstacle("House", 2.0, 30.0, 4.0),))
    assert _assess(house, 10.0, 30.0).result.verdict == "obstructed"


def test_on_a_short_path_no_more_than_a_tenth_counts_as_the_own_spot() -> None:
    profile = profile_of(40.0, cover=lambda d: np.where((d > 5.0) & (d < 8.0), 20.0, 0.0), n=401)
    assert _assess(profile, 6.0, 6.0, frequency_hz=60e9).result.verdict == "obstructed"


def test_a_long_outline_does_not_stand_in_for_a_survey() -> None:
    for reach_m, basis in ((80.0, "surveyed"), (1500.0, "bare ground only")):
        made = profile_of(3000.0, obstacles=(obstacle("Quay", 0.0, reach_m, 2.0),), n=3001)
        at = made.distance_m
        profile = _with(made, measured=np.where(at > reach_m, 2, 0).astype(np.int8))
        assert _assess(profile, 15.0, 15.0).result.basis == basis


def _beside(at_m: float, offset_m: float, top_m: float) -> BesidePath:
    return BesidePath(name="Crane 2", kind="other", at_m=at_m, offset_m=offset_m, top_amsl_m=top_m, source="made.csv")


@pytest.mark.parametrize(
    ("offset_m", "top_m", "verdict", "said"),
    [
        # F1 at mid-path of 10 km at 6 GHz is 11.18 m, 0.6 of it 6.71 m; ray at 60 m less 1.47 m of bulge (hand calculation)
        (4.0, 90.0, "marginal", "inside the required part of the first zone"),
        (4.0, 53.2, "marginal", "inside the required part of the first zone"),  # zone begins 5.38 m below the ray
        (4.0, 53.0, "clear", "inside the first zone"),
        (6.6, 90.0, "marginal", "inside the required part of the first zone"),
        (6.8, 90.0, "clear", "inside the first zone"),
        (6.8, 49.0, "clear", None),
        (11.3, 90.0, "clear", None),
        (4.0, float("nan"), "marginal", "its height above sea level not known"),
    ],
)
def test_what_stands_beside_the_path_counts_by_its_zone(
    offset_m: float, top_m: float, verdict: str, said: str | None
) -> None:
    profile = _with(profile_of(10e3), beside=(_beside(5000.0, offset_m, top_m),))
    result = _assess(profile, 60.0, 60.0).result
    assert result.verdict == verdict
    told = [text for text in result.cautions if "Crane 2" in text]
    if said is None:
        assert told == []
        return
    assert f"Crane 2 stands {offset_m:.1f} m beside the path at 5.00 km" in told[0]
    assert said in told[0]
    assert ("Crane 2" in result.reasons[0]) is (verdict == "marginal")


def test_the_height_said_lifts_the_zone_over_what_stands_beside() -> None:
    profile = _with(profile_of(10e3), beside=(_beside(5000.0, 4.0, 57.0),))
    # missing: 57 - (60 - 1.47 - 5.38) = 3.85 m at mid-path
    assert "Raise A by 8 m, or B by 8 m, or both by 4 m" in " ".join(_assess(profile, 60.0, 60.0).result.reasons)
    assert _assess(profile, 64.0, 64.0).result.verdict == "clear"


@pytest.mark.parametrize(
    ("a", "b", "sigma_m"),
    [
        # mid-path: sqrt(s^2 + s^2/4 + s^2/4) with both ends on the raster, s alone where both are known
        ({"height_m": 30.0}, {"height_m": 30.0}, 5.0 * np.sqrt(1.5)),
        ({"height_m": 30.0, "ground_amsl_m": 0.0}, {"height_m": 30.0}, 5.0 * np.sqrt(1.25)),
        ({"height_m": 30.0, "height_reference": "sea"}, {"height_m": 30.0, "ground_amsl_m": 0.0}, 5.0),
        ({"height_m": 24.0, "height_reference": "roof", "roof_m": 6.0}, {"height_m": 30.0}, 5.0 * np.sqrt(1.5)),
    ],
)
def test_the_ground_under_the_antennas_is_wrong_too(a: dict[str, object], b: dict[str, object], sigma_m: float) -> None:
    ridge = profile_of(4000.0, lambda d: 20.0 * np.exp(-(((d - 2000.0) / 100.0) ** 2)), sigma_m=5.0, cell_m=30.0)
    rule = _assess(ridge, a, b).result.clearance[0]
    z = (rule.clearance_m - rule.required_m) / sigma_m
    assert rule.worst_at_m == pytest.approx(2000.0)
    assert rule.probability == pytest.approx(NormalDist().cdf(z), abs=2e-3)


def test_simulated_errors_of_raster_and_antennas_give_the_probability_said() -> None:
    """One draw for the ridge and one for each end: the share of worlds in which the criterion holds."""
    profile = profile_of(4000.0, lambda d: 20.0 * np.exp(-(((d - 1200.0) / 60.0) ** 2)), sigma_m=4.0, cell_m=30.0)
    rule = _assess(profile, 27.0, 27.0).result.clearance[0]
    rng = np.random.default_rng(11)
    errors = rng.normal(0.0, 4.0, (3, 200_000))
    margin = rule.clearance_m - rule.required_m
    held = np.mean(margin + 0.7 * errors[0] + 0.3 * errors[1] - errors[2] >= 0.0)
    assert rule.probability == pytest.approx(held, abs=0.01)


def test_errors_cancel_where_the_antenna_stands_and_no_farther_than_one_cell() -> None:
    profile = profile_of(3000.0, sigma_m=4.0, cell_m=30.0, n=3001)
    errors = clearance_errors_m(profile, standing(profile), a_error_m=4.0, b_error_m=4.0)
    assert errors[0] == errors[-1] == 0.0
    assert np.all(np.diff(errors[:31]) > 0.0)
    # one cell away nothing is shared any more: sqrt(1 + 0.99^2 + 0.01^2) of the error
    assert errors[30] == pytest.approx(4.0 * np.sqrt(1.0 + 0.99**2 + 0.01**2))
    np.testing.assert_allclose(errors, errors[::-1], atol=1e-9)
    survey = _with(
        profile, source=np.where(profile.distance_m < 5.0, 1, 0).astype(np.int16), sources=("a", "survey: b")
    )
    apart = clearance_errors_m(survey, standing(survey), a_error_m=0.1, b_error_m=4.0)
    assert apart[6] > 4.0


def test_a_typed_parapet_moves_with_the_antenna_above_it() -> None:
    roof = ROOF | {"roof_m": 9.0, "roof_edge_m": 4.0, "parapet_m": 1.5}
    profile = profile_of(2000.0, lambda d: -40.0 * np.sin(np.pi * d / 2000.0), sigma_m=5.0, cell_m=30.0)
    assert _assess(profile, roof, 12.0).result.confidence > 0.9


def test_trees_in_the_zone_hold_the_signal_verdict() -> None:
    wood = profile_of(10e3, 5.0, cover=lambda d: np.where(np.abs(d - 5000.0) < 150.0, 12.0, 0.0))
    radio: dict[str, object] = {"power_dbm": 30.0, "gain_dbi": 30.0, "threshold_dbm": -80.0}
    result = _assess(wood, 18.0, 18.0, **radio).result
    assert result.margin_db.at_a is not None
    assert result.margin_db.at_a > 20.0
    assert result.signal_verdict == "marginal"
    assert any("Trees in the required zone" in reason for reason in result.reasons)
    house = _with(wood, cover_kind=np.where(wood.cover_m > 0.0, 1, 0).astype(np.int8))
    assert _assess(house, 18.0, 18.0, **radio).result.signal_verdict == "meets"
    assert _assess(wood, 40.0, 40.0, **radio).result.signal_verdict == "meets"


SPANS = st.tuples(st.integers(0, 900), st.integers(0, 600), st.integers(1, 60))
AT_AN_END = st.tuples(st.sampled_from(["from A", "from B", "anywhere"]), SPANS)


def _lies(where: str, from_m: float, long_m: float) -> tuple[float, float]:
    if where == "from A":
        return 0.0, long_m
    if where == "from B":
        return 1000.0 - long_m, 1000.0
    return from_m, min(from_m + long_m, 1000.0)


@settings(max_examples=300, deadline=None, derandomize=True)
@given(
    listed=st.lists(st.tuples(AT_AN_END, st.sampled_from(["building", "tree", "other"])), max_size=3),
    spots=st.lists(AT_AN_END, max_size=3),
    kind=st.sampled_from(["building", "tree", "other"]),
    measured=st.sampled_from([0, 2]),
    heights=st.tuples(st.integers(1, 70), st.integers(1, 70)),
    on_roof=st.booleans(),
)
def test_no_ray_that_passes_below_anything_is_clear(
    listed: list[tuple[tuple[str, tuple[int, int, int]], str]],
    spots: list[tuple[str, tuple[int, int, int]]],
    kind: str,
    measured: int,
    heights: tuple[int, int],
    on_roof: bool,
) -> None:
    obstacles = tuple(
        obstacle(f"item {number}", *_lies(where, from_m, long_m), height_m, kind=what)
        for number, ((where, (from_m, long_m, height_m)), what) in enumerate(listed)
    )

    def cover(distance_m: np.ndarray) -> np.ndarray:
        high = np.zeros(distance_m.shape)
        for where, (from_m, long_m, height_m) in spots:
            low, far = _lies(where, from_m, long_m)
            high = np.where((distance_m >= low) & (distance_m <= far), np.maximum(high, height_m), high)
        return high

    profile = profile_of(1000.0, cover=cover, kind=kind, obstacles=obstacles, measured=measured, n=201)
    a: object = {"height_m": heights[0], "height_reference": "roof", "roof_m": 5.0} if on_roof else heights[0]
    whole = _assess(profile, a, heights[1])
    levels = whole.levels
    below = profile.surface_m + levels.bulge_m[0] - levels.available_m > 1e-6
    if below.any():
        assert whole.result.verdict != "clear"
    assert np.all((whole.levels.surface_m == profile.surface_m) | (standing(profile).left_out_m == profile.surface_m))
