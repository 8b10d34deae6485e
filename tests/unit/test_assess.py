"""The whole assessment: A-B equals B-A, extra heights, looking closer, refusals."""

import dataclasses

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from made_profiles import link_of, mirrored, obstacle, profile_of

from fellspan.errors import LinkError, TerrainGapError
from fellspan.links.assess import AssessSettings, assess, assess_in_full, assess_profile
from fellspan.links.criteria import Criterion
from fellspan.links.site import Link, Site
from fellspan.terrain.profile import Gap, PathProfile


def rough(seed: int, length_m: float = 12e3, *, n: int = 401, relief_m: float = 60.0) -> PathProfile:
    rng = np.random.default_rng(seed)
    ground = np.cumsum(rng.normal(0.0, 1.0, n))
    ground = (ground - ground.min()) / np.ptp(ground) * relief_m + 20.0
    trees = np.where(rng.random(n) < 0.2, rng.uniform(3.0, 18.0, n), 0.0)
    return profile_of(length_m, lambda d: ground, n=n, cover=lambda d: trees, sigma_m=1.5)


def turned(link: Link) -> Link:
    return dataclasses.replace(link, a=link.b, b=link.a, antenna_a=link.antenna_b, antenna_b=link.antenna_a)


ROOF = {"height_m": 2.0, "height_reference": "roof", "roof_m": 9.0, "roof_edge_m": 4.5, "parapet_m": 0.8}


@pytest.mark.parametrize("seed", range(6))
def test_from_b_to_a_is_the_mirror_of_a_to_b(seed: int) -> None:
    profile = rough(seed)
    link = link_of(profile, dict(ROOF), 25.0, power_dbm=20.0, gain_dbi=20.0, threshold_dbm=-75.0)
    there = assess_profile(link, profile).result
    back = assess_profile(turned(link), mirrored(profile)).result
    length = profile.length_m
    assert (there.verdict, there.basis, there.governing) == (back.verdict, back.basis, back.governing)
    assert there.confidence == pytest.approx(back.confidence, abs=1e-9)
    assert there.losses_db.diffraction == pytest.approx(back.losses_db.diffraction, abs=1e-9)
    assert there.received_dbm.at_a == pytest.approx(back.received_dbm.at_b, abs=1e-9)
    assert there.tilt_ab_deg == pytest.approx(back.tilt_ba_deg, abs=1e-9)
    assert there.bearing_ab_deg == pytest.approx(back.bearing_ba_deg, abs=1e-9)
    assert len(there.ignored) == len(back.ignored)
    for one, other in zip(there.clearance, back.clearance, strict=True):
        assert one.worst_fraction == pytest.approx(other.worst_fraction, abs=1e-9)
        assert one.worst_at_m == pytest.approx(length - other.worst_at_m, abs=1e-6)
        assert one.shortfall_m == pytest.approx(other.shortfall_m, abs=1e-9)
        assert one.extra_height_m.a == pytest.approx(other.extra_height_m.b, abs=1e-6)
        assert one.extra_height_m.b == pytest.approx(other.extra_height_m.a, abs=1e-6)
        assert one.extra_height_m.both == pytest.approx(other.extra_height_m.both, abs=1e-9)
        assert one.cause == other.cause.replace("at B", "at A")
        assert len(one.obstructions) == len(other.obstructions)
        for ours, theirs in zip(one.obstructions, reversed(other.obstructions), strict=True):
            assert ours.from_m == pytest.approx(length - theirs.to_m, abs=1e-6)
            assert ours.cuts_sight == theirs.cuts_sight


@settings(max_examples=40, deadline=None, derandomize=True)
@given(
    st.integers(0, 10_000),
    st.floats(0.5, 40.0),
    st.floats(0.5, 40.0),
    st.floats(0.0, 1.0),
    st.sampled_from([4.0 / 3.0, 0.6, 1.0, float("inf")]),
)
def test_adding_the_extra_height_meets_the_criterion_exactly(
    seed: int, a_m: float, b_m: float, fraction: float, k: float
) -> None:
    profile = rough(seed)
    rule = AssessSettings(criteria=(Criterion(name="rule", k=k, fraction=fraction, source="made"),))
    before = assess_profile(link_of(profile, a_m, b_m), profile, rule).result.clearance[0]
    extra = before.extra_height_m
    if before.met:
        assert (extra.a, extra.b, extra.both) == (0.0, 0.0, 0.0)
        return
    for add_a, add_b in ((extra.a, 0.0), (0.0, extra.b), (extra.both, extra.both)):
        if add_a is None or add_b is None or max(add_a, add_b) > 1e5:
            continue
        after = assess_profile(link_of(profile, a_m + add_a, b_m + add_b), profile, rule)
        margin = after.levels.available_m - after.levels.need_m[0]
        assert margin.min() == pytest.approx(0.0, abs=1e-6)
        assert after.result.clearance[0].met


def test_levels_stand_on_the_samples_of_the_profile() -> None:
    profile = rough(3)
    whole = assess_profile(link_of(profile, dict(ROOF), dict(ROOF)), profile)
    np.testing.assert_array_equal(whole.levels.distance_m, whole.profile.distance_m)
    assert whole.profile.distance_m.size == profile.distance_m.size + 2
    for row, item in enumerate(whole.result.clearance):
        index = int(np.argmin(np.abs(whole.levels.distance_m - item.worst_at_m)))
        assert whole.levels.available_m[index] == item.available_m
        need = item.surface_m + item.bulge_m + item.required_m
        assert whole.levels.need_m[row, index] == pytest.approx(need, abs=1e-9)


class SharpTerrain:
    """A terrain with a needle that the default step misses; hands out profiles as the real one does."""

    def __init__(self, ripple_m: float = 0.0) -> None:
        self.ripple_m = ripple_m
        self.windows: tuple[tuple[float, float], ...] = ()
        self.step_m = 0.0
        self.asked: tuple[float | None, str | None] = (None, None)

    def _at(self, distance: np.ndarray) -> PathProfile:
        made = profile_of(8000.0, n=distance.size, cell_m=20.0)
        fields = {name: getattr(made, name) for name in made.__slots__}
        ground = 30.0 - np.abs(distance - 3003.0) * 0.2 + self.ripple_m * np.cos(2.0 * np.pi * distance / 20.0)
        return PathProfile(**(fields | {"distance_m": distance, "ground_m": ground, "surface_m": ground.copy()}))

    def profile(self, *, a: object, b: object, step_m: float | None = None, name: str | None = None) -> PathProfile:
        self.asked = (step_m, name)
        return self._at(np.linspace(0.0, 8000.0, 801))

    def refine(self, profile: PathProfile, windows: tuple[tuple[float, float], ...], *, step_m: float) -> PathProfile:
        self.windows, self.step_m = windows, step_m
        more = [np.arange(from_m, to_m, step_m) for from_m, to_m in windows]
        return self._at(np.unique(np.concatenate((profile.distance_m, *more))))


def test_the_worst_minima_are_looked_at_again() -> None:
    terrain = SharpTerrain()
    link = link_of(
        profile_of(8000.0), {"height_m": 40.0, "height_reference": "sea"}, {"height_m": 40.0, "height_reference": "sea"}
    )
    rough_look = assess_profile(link, terrain.profile(a=None, b=None)).result.clearance[0]
    result = assess(link, terrain=terrain)  # type: ignore[arg-type]
    assert rough_look.surface_m == pytest.approx(29.4)
    assert result.clearance[0].surface_m == pytest.approx(30.0, abs=0.2 * 1.25)
    assert result.clearance[0].surface_m >= 29.9
    assert terrain.step_m == pytest.approx(20.0 / 16.0)
    assert any(from_m <= 3003.0 <= to_m for from_m, to_m in terrain.windows)
    assert all(one[1] < two[0] for one, two in zip(terrain.windows, terrain.windows[1:], strict=False))
    whole = assess_in_full(link, terrain=terrain)  # type: ignore[arg-type]
    assert whole.profile.distance_m.shape == whole.levels.distance_m.shape


def test_the_terrain_is_asked_with_the_step_and_the_name_of_the_link() -> None:
    terrain = SharpTerrain()
    assess(link_of(profile_of(8000.0)), terrain=terrain, settings=AssessSettings(step_m=7.0))  # type: ignore[arg-type]
    assert terrain.asked == (7.0, "Alder - Birch")


def test_windows_that_touch_become_one() -> None:
    terrain = SharpTerrain(ripple_m=3.0)  # a minimum at every other sample
    assess(link_of(profile_of(8000.0), 640.0, 640.0), terrain=terrain)  # type: ignore[arg-type]
    assert terrain.windows
    assert all(one[1] < two[0] for one, two in zip(terrain.windows, terrain.windows[1:], strict=False))
    assert max(to_m - from_m for from_m, to_m in terrain.windows) > 20.0


def test_the_same_place_twice_is_refused() -> None:
    link = link_of(profile_of(8000.0))
    here = Site(name="Birch", position=link.a.position, height_m=10.0)
    with pytest.raises(LinkError, match="'Alder' and 'Birch' are the same place"):
        assess(dataclasses.replace(link, b=here), terrain=SharpTerrain())  # type: ignore[arg-type]


def test_a_gap_is_refused_with_the_stretch() -> None:
    gap = Gap(from_m=3210.0, to_m=4070.0, raster="made_dtm.tif")
    profile = profile_of(8000.0, gaps=(gap,))
    with pytest.raises(TerrainGapError, match=r"3\.21 km to 4\.07 km of 'Alder - Birch'"):
        assess_profile(link_of(profile), profile)
    holed = profile_of(8000.0, lambda d: np.where(np.abs(d - 4000.0) < 100.0, np.nan, 0.0))
    with pytest.raises(TerrainGapError, match=r"3\.9\d km to 4\.\d\d km"):
        assess_profile(link_of(holed), holed)


@pytest.mark.parametrize(
    ("field", "value"), [("confidence", 1.0), ("confidence", 0.0), ("median_k", 0.0), ("median_k", float("nan"))]
)
def test_settings_that_mean_nothing_are_refused(field: str, value: float) -> None:
    with pytest.raises(LinkError, match=f"{value:g}"):
        AssessSettings(**{field: value})  # type: ignore[arg-type]


def test_isolated_and_extended_are_told_apart_on_the_profile() -> None:
    knife = profile_of(30e3, lambda d: np.where(np.abs(d - 12e3) < 200.0, 120.0, 0.0))
    plain = profile_of(30e3, 20.0)
    assert assess_profile(link_of(knife, 60.0, 60.0), knife).result.clearance[1].required_fraction == 0.0
    assert assess_profile(link_of(plain, 60.0, 60.0), plain).result.clearance[1].required_fraction == 0.3


def test_a_link_along_one_roof() -> None:
    hall = profile_of(60.0, obstacles=(obstacle("Hall", 0.0, 60.0, 8.0),))
    roof = {"height_m": 3.0, "height_reference": "roof"}
    result = assess_profile(link_of(hall, roof, roof, frequency_hz=60e9), hall).result
    assert result.verdict == "clear"
    assert [item.end for item in result.ignored] == ["A"]
