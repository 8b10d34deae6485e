"""Antenna levels from what a user states, own buildings, roof edges and parapets."""

import numpy as np
import pytest
from made_profiles import link_of, obstacle, profile_of

from fellspan.errors import LinkError, VerticalDatumError
from fellspan.links.assess import Assessment, assess_profile
from fellspan.links.own_building import standing, with_nodes
from fellspan.terrain.profile import PathProfile


def _assess(profile: PathProfile, a: object = 10.0, b: object = 10.0) -> Assessment:
    return assess_profile(link_of(profile, a, b), profile)  # type: ignore[arg-type]


def _mention(assessment: Assessment, text: str) -> bool:
    return any(text in caution for caution in assessment.result.cautions)


def test_height_above_ground_stands_on_the_raster() -> None:
    end = _assess(profile_of(2000.0, 120.0), 12.0).result.ends.a
    assert (end.ground_m, end.antenna_amsl_m, end.antenna_agl_m, end.roof_m) == (120.0, 132.0, 12.0, None)
    assert end.height_as_given == "12 m above ground"


def test_height_above_sea_level() -> None:
    end = _assess(profile_of(2000.0, 120.0), {"height_m": 150.0, "height_reference": "sea"}).result.ends.a
    assert (end.antenna_amsl_m, end.antenna_agl_m) == (150.0, 30.0)


def test_below_ground_is_refused_with_the_values() -> None:
    with pytest.raises(LinkError, match=r"110\.0 m .*120\.0 m"):
        _assess(profile_of(2000.0, 120.0), {"height_m": 110.0, "height_reference": "sea"})


def test_measured_ground_replaces_the_raster() -> None:
    profile = profile_of(2000.0, 120.0, sigma_m=3.0)
    assessment = _assess(profile, {"height_m": 12.0, "ground_amsl_m": 123.0})
    assert assessment.result.ends.a.antenna_amsl_m == 135.0
    assert assessment.profile.ground_m[0] == 123.0
    assert profile.ground_m[0] == 120.0
    assert not _mention(assessment, "raster says")


def test_measured_ground_far_off_the_raster_draws_a_caution() -> None:
    profile = profile_of(2000.0, 120.0, sigma_m=3.0)
    assessment = _assess(profile, 10.0, {"height_m": 12.0, "ground_amsl_m": 130.0})
    assert _mention(assessment, "Ground at 'Birch' is given as 130.0 m, the raster says 120.0 m")


def test_other_datum_is_refused() -> None:
    profile = profile_of(2000.0, vertical_datum="Tolmera 1974")
    same = {"height_m": 50.0, "height_reference": "sea", "vertical_datum": "TOLMERA-1974"}
    assert _assess(profile, same).result.ends.a.antenna_amsl_m == 50.0
    with pytest.raises(VerticalDatumError, match=r"EGM96.*Tolmera 1974"):
        _assess(profile, same | {"vertical_datum": "EGM96"})


def test_one_datum_in_two_spellings_is_one() -> None:
    profile = profile_of(2000.0, vertical_datum="EGM2008 height")
    sea: dict[str, object] = {"height_m": 50.0, "height_reference": "sea", "vertical_datum": "EGM2008"}
    assert _assess(profile, sea).result.ends.a.antenna_amsl_m == 50.0
    feet = profile_of(2000.0, vertical_datum="NAVD88 height (ftUS)")
    assert _assess(feet, sea | {"vertical_datum": "NAVD 88"}).result.ends.a.antenna_amsl_m == 50.0


@pytest.mark.parametrize(
    "site", [{"height_m": 50.0, "height_reference": "sea"}, {"height_m": 9.0, "ground_amsl_m": 2.0}]
)
def test_height_above_sea_level_over_ellipsoidal_terrain_is_refused(site: dict[str, object]) -> None:
    datum = "ellipsoid of WGS 84"
    profile = profile_of(2000.0, vertical_datum=datum)
    with pytest.raises(VerticalDatumError, match=r"'Birch'.*ellipsoid \('ellipsoid of WGS 84'\)"):
        _assess(profile, 10.0, site)
    assert _assess(profile, 10.0, site | {"vertical_datum": datum}).result.ends.b.antenna_agl_m > 0.0
    assert _assess(profile, 10.0, 10.0).result.ends.b.antenna_agl_m == 10.0


def test_datum_that_nobody_states_draws_a_caution() -> None:
    profile = profile_of(2000.0)
    sea = {"height_m": 50.0, "height_reference": "sea", "vertical_datum": "Tolmera 1974"}
    assert _mention(_assess(profile, sea), "vertical datum of the terrain is not stated")
    assert not _mention(_assess(profile), "datum")


ROOF: dict[str, object] = {"height_m": 3.0, "height_reference": "roof"}


def test_roof_from_the_site_the_outline_or_the_cover() -> None:
    bare = profile_of(2000.0, 100.0)
    outline = profile_of(2000.0, 100.0, obstacles=(obstacle("Mill", 0.0, 20.0, 9.0, ground_m=100.0),))
    cover = profile_of(2000.0, 100.0, cover=lambda d: np.where(d < 8.0, 7.0, 0.0), kind="building")
    assert _assess(bare, ROOF | {"roof_m": 6.0}).result.ends.a.antenna_amsl_m == 109.0
    assert _assess(outline, ROOF).result.ends.a.antenna_amsl_m == 112.0
    assert _assess(outline, ROOF | {"roof_m": 6.0}).result.ends.a.antenna_amsl_m == 109.0
    assert _assess(cover, ROOF).result.ends.a.antenna_amsl_m == 110.0


def test_cover_of_unknown_kind_serves_as_a_roof_with_a_caution() -> None:
    cover = profile_of(2000.0, 100.0, cover=lambda d: np.where(d < 8.0, 7.0, 0.0), kind="other")
    assessment = _assess(cover, ROOF)
    assert assessment.result.ends.a.antenna_amsl_m == 110.0
    assert _mention(assessment, "taken as its roof")


@pytest.mark.parametrize("kind", ["tree", "none"])
def test_unknown_roof_is_refused_with_a_remedy(kind: str) -> None:
    cover = 7.0 if kind == "tree" else 0.0
    profile = profile_of(2000.0, 100.0, cover=lambda d: np.where(d < 8.0, cover, 0.0), kind="tree")
    with pytest.raises(LinkError, match=r"'Alder'.*roof") as caught:
        _assess(profile, ROOF)
    assert "state the roof height" in str(caught.value)


def test_surface_raster_alone_is_the_roof() -> None:
    profile = profile_of(2000.0, 110.0, ground_is_bare=False)
    assessment = _assess(profile, ROOF | {"roof_m": 8.0}, 5.0)
    end = assessment.result.ends.a
    assert (end.ground_m, end.roof_m, end.antenna_amsl_m) == (102.0, 8.0, 113.0)
    assert _mention(assessment, "roof of 'Alder' was read from a surface raster")
    assert _mention(assessment, "'Birch' stands on a surface raster")


def test_own_outline_does_not_block_but_trees_over_it_do() -> None:
    mill = obstacle("Mill", 0.0, 40.0, 12.0)
    profile = profile_of(2000.0, cover=lambda d: np.where((d >= 20) & (d <= 24), 15.0, 0.0), obstacles=(mill,))
    result = _assess(profile, 5.0, 20.0).result
    (left,) = result.ignored
    assert (left.end, left.what, left.from_m, left.to_m, left.height_m) == ("A", "Mill", 0.0, 40.0, 12.0)
    assert result.clearance[0].cause == "trees, 15 m"
    assert 20.0 <= result.clearance[0].worst_at_m <= 24.0


def test_antenna_below_its_own_building_draws_a_caution() -> None:
    profile = profile_of(2000.0, obstacles=(obstacle("Mill", 1960.0, 2000.0, 12.0),))
    assessment = _assess(profile, 20.0, 5.0)
    assert _mention(
        assessment,
        "antenna of 'Birch', 5.0 m above ground, is 7.0 m below the top of what stands at its own spot (Mill)",
    )
    among_trees = _assess(profile_of(2000.0, cover=12.0), 8.0, 20.0)
    assert _mention(
        among_trees, "'Alder', 8.0 m above ground, is 4.0 m below the top of what stands at its own spot (trees)"
    )
    assert not _mention(among_trees, "'Birch'")
    assert assessment.result.ignored[0].end == "B"


def test_a_building_next_door_blocks() -> None:
    profile = profile_of(2000.0, obstacles=(obstacle("Mill", 4.0, 40.0, 12.0),))
    result = _assess(profile, 5.0, 5.0).result
    assert result.verdict == "obstructed"
    assert result.clearance[0].cause == "Mill"
    assert result.ignored == ()


def test_without_an_outline_cover_within_10_m_is_left_out_and_no_more() -> None:
    profile = profile_of(2000.0, cover=lambda d: np.where(d <= 16.0, 9.0, 0.0), kind="building")
    stands = standing(profile)
    at = profile.distance_m
    assert np.all(stands.cover_m[at <= 10.0] == 0.0)
    assert np.all(stands.cover_m[(at > 10.0) & (at <= 16.0)] == 9.0)
    assert (stands.ignored[0].what, stands.ignored[0].to_m) == ("building", 10.0)


def test_ground_is_never_left_out() -> None:
    profile = profile_of(2000.0, lambda d: np.where((d > 2.0) & (d < 9.0), 30.0, 0.0))
    assert standing(profile).surface_m.max() == 30.0
    assert _assess(profile, 5.0, 5.0).result.verdict == "obstructed"


def test_parapet_is_checked_as_an_obstacle() -> None:
    profile = profile_of(2000.0, obstacles=(obstacle("Mill", 0.0, 20.0, 9.0),))
    roof = ROOF | {"roof_edge_m": 6.5, "parapet_m": 1.2}
    free = _assess(profile, roof, {"height_m": 12.0})
    assert "parapet at A" in [item.name for item in free.profile.obstacles]
    index = int(np.flatnonzero(free.profile.distance_m == 6.5)[0])
    assert free.levels.surface_m[index] == pytest.approx(10.2)
    assert free.levels.distance_m.shape == free.profile.distance_m.shape
    np.testing.assert_array_equal(free.levels.distance_m, free.profile.distance_m)
    low = _assess(profile, roof | {"height_m": 1.0}, {"height_m": 12.0})
    assert low.result.verdict == "obstructed"
    assert "parapet at A cuts the sight line by 0.2 m at 6 m from A" in low.result.reasons[0]
    assert _mention(low, "0.2 m below the top of its own parapet")
    assert _mention(low, "outline in the data ends at 20.0 m")


def test_roof_edge_without_a_parapet_and_at_the_other_end() -> None:
    profile = profile_of(2000.0)
    roof = ROOF | {"height_m": 0.2, "roof_m": 9.0, "roof_edge_m": 30.0}
    result = _assess(profile, 4.0, roof).result
    assert result.clearance[0].cause == "roof edge of B"
    assert result.clearance[0].worst_at_m == 1970.0


def test_roof_edge_beyond_the_other_end_is_refused() -> None:
    profile = profile_of(200.0)
    with pytest.raises(LinkError, match="200 m lies beyond the other end"):
        _assess(profile, ROOF | {"roof_m": 9.0, "roof_edge_m": 200.0})


def test_nodes_are_interpolated_and_never_doubled() -> None:
    profile = profile_of(100.0, lambda d: d / 10.0, n=11)
    more = with_nodes(profile, (5.0, 20.0, 99.0))
    assert more.distance_m.size == 13
    assert np.all(np.diff(more.distance_m) > 0.0)
    np.testing.assert_allclose(more.ground_m, more.distance_m / 10.0)


def test_nodes_across_the_antimeridian() -> None:
    profile = profile_of(200.0, n=3, longitude_deg=np.array([179.999, -180.0, -179.999]))
    more = with_nodes(profile, (50.0, 150.0))
    np.testing.assert_allclose(np.abs(more.longitude_deg), [179.999, 179.9995, 180.0, 179.9995, 179.999])


def test_a_path_of_two_samples_gets_a_middle() -> None:
    assert _assess(profile_of(12.0, n=2)).levels.distance_m.tolist() == [0.0, 6.0, 12.0]


def test_antenna_on_the_ground_sees_but_has_no_room_for_the_zone() -> None:
    valley = profile_of(2000.0, lambda d: -d * (2000.0 - d) / 2e4)
    assert _assess(valley, 0.0, 0.0).result.verdict == "marginal"
