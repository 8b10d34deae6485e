"""Ways to a false 'clear' through terrain data: each was open once, and each must stay shut.

Numbers without a source are the rules of docs/terrain.md, our own.
"""

import dataclasses
import datetime as dt
from pathlib import Path

import numpy as np
import pytest
from made_terrain import at, raster

from fellspan.errors import SeamError, SurveyFileError, TerrainError, TerrainGapError, VerticalDatumError
from fellspan.links.assess import assess_in_full
from fellspan.links.result import LinkResult
from fellspan.links.site import Link, Radio, Site
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.planning.planner import plan_study
from fellspan.terrain.profile import MEASURED_TOP, PathProfile
from fellspan.terrain.sources import CoverSource, ObstacleSource, RasterSource, SurveySource
from fellspan.terrain.survey import read_survey
from fellspan.terrain.terrain import Terrain
from fellspan.terrain.units import is_ellipsoidal

A, B = at(300.0, 1500.0), at(5700.0, 1500.0)
NAME = "Mole - Point"
SIZE = (300, 600)


def link_of(name: str = NAME, mast_m: float = 40.0) -> Link:
    ends = [Site(name=end, position=where, height_m=mast_m) for end, where in (("Mole", A), ("Point", B))]
    return Link(name=name, a=ends[0], b=ends[1], radio=Radio(frequency_hz=5.8e9))


def written(file: Path, *rows: str) -> Path:
    file.write_text("\n".join(rows) + "\n", encoding="utf-8")
    return file


def hill(file: Path, *, west: int = 250, east: int = 350, top_m: float = 200.0) -> Path:
    """Flat ground at 10 m with a ridge of 200 m across the path, 2.2 to 3.2 km from A."""
    heights = np.full(SIZE, 10.0)
    heights[:, west:east] = top_m
    return raster(file, heights)


def index_at(profile: PathProfile, distance_m: float) -> int:
    return int(np.argmin(np.abs(profile.distance_m - distance_m)))


def notes_with(profile: PathProfile, words: str) -> list[str]:
    return [note for note in profile.notes if words in note]


def assessed(**terrain: object) -> tuple[LinkResult, PathProfile]:
    with Terrain.open(**terrain) as opened:
        found = assess_in_full(link_of(), terrain=opened)
    return found.result, found.profile


# Surveys


@pytest.mark.parametrize("columns", ["ground_m,top_m", "ground_m", "top_m"])
def test_two_points_far_apart_do_not_erase_the_hill_between_them(tmp_path: Path, columns: str) -> None:
    heights = ",".join("10" for _ in columns.split(","))
    survey = written(
        tmp_path / "walk.csv",
        f"link,distance_m,{columns},profile",
        f"{NAME},0,{heights},P",
        f"{NAME},5390,{heights},P",
    )
    result, profile = assessed(ground=hill(tmp_path / "hill.tif"), survey=survey)
    assert profile.surface_m.max() >= 200.0
    assert not (profile.measured[(profile.distance_m > 60.0) & (profile.distance_m < 5300.0)] == MEASURED_TOP).any()
    assert (result.verdict, result.basis) == ("obstructed", "bare ground only")
    (note,) = notes_with(profile, "between them")
    assert "survey file 'walk.csv', row 2 and row 3: the line over the 5390 m" in note
    assert "measured up to 50 m only" in note


def test_the_line_between_far_points_may_only_raise(tmp_path: Path) -> None:
    """A survey of 120 m at both ends says that something may stand there; the raster's 200 m stand all the same."""
    survey = written(
        tmp_path / "walk.csv",
        "link,distance_m,ground_m,top_m,profile",
        f"{NAME},1000,90,120,P",
        f"{NAME},5000,90,120,P",
    )
    with Terrain.open(ground=hill(tmp_path / "hill.tif"), survey=survey) as terrain:
        profile = terrain.profile(a=A, b=B, name=NAME)
        fine = terrain.refine(profile, [(1900.0, 2300.0)], step_m=0.5)
    for one in (profile, fine):
        before, on = index_at(one, 1900.0), index_at(one, 2700.0)
        assert (one.ground_m[before], one.surface_m[before]) == (pytest.approx(90.0), pytest.approx(120.0))
        assert (one.ground_m[on], one.surface_m[on]) == (pytest.approx(200.0), pytest.approx(200.0))
        assert (one.measured[before], one.measured[on]) == (0, 0)


def test_a_radius_of_kilometres_does_not_make_one_point_a_survey(tmp_path: Path) -> None:
    place = at(3000.0, 1500.0)
    survey = written(
        tmp_path / "walk.csv",
        "latitude_deg,longitude_deg,ground_m,top_m,radius_m",
        f"{place.latitude_deg},{place.longitude_deg},10,10,4000",
    )
    result, profile = assessed(ground=hill(tmp_path / "hill.tif"), survey=survey)
    assert profile.surface_m.max() >= 200.0
    assert result.verdict == "obstructed"
    measured = profile.distance_m[profile.measured == MEASURED_TOP]
    assert measured.max() - measured.min() == pytest.approx(100.0, abs=1.0)
    (note,) = notes_with(profile, "a radius of 4000 m")
    assert "row 2" in note


def test_a_dense_survey_still_replaces_the_raster_and_says_how_far_it_departs(tmp_path: Path) -> None:
    rows = [f"{NAME},{s},10,10,P" for s in range(0, 5350, 50)]
    survey = written(tmp_path / "walk.csv", "link,distance_m,ground_m,top_m,profile", *rows)
    with Terrain.open(ground=hill(tmp_path / "hill.tif"), survey=survey) as terrain:
        profile = terrain.profile(a=A, b=B, name=NAME)
    assert profile.surface_m.max() == pytest.approx(10.0)
    (note,) = notes_with(profile, "below the ground raster")
    assert "survey file 'walk.csv', row " in note
    assert "ground 190.0 m below" in note
    place_km = float(note.split(" at ")[1].split(" km")[0])
    assert 2.2 <= place_km <= 3.2


@pytest.mark.parametrize(("off_m", "said"), [(5.0, False), (7.0, True), (-5.0, False), (-7.0, True)])
def test_a_survey_within_three_errors_of_the_raster_is_not_remarked(tmp_path: Path, off_m: float, said: bool) -> None:
    """Raster 2 m, survey 0.1 m: three standard errors are 6.01 m."""
    ground = RasterSource(path=raster(tmp_path / "flat.tif", 50.0), error_m=2.0)
    survey = written(tmp_path / "walk.csv", "link,distance_m,ground_m", f"{NAME},1000,{50.0 + off_m}")
    with Terrain.open(ground=ground, survey=survey) as terrain:
        profile = terrain.profile(a=A, b=B, name=NAME)
    found = notes_with(profile, f"ground 7.0 m {'above' if off_m > 0 else 'below'} the ground raster at 0.99")
    found += notes_with(profile, f"ground 7.0 m {'above' if off_m > 0 else 'below'} the ground raster at 1.00")
    assert bool(found) is said
    assert bool(notes_with(profile, "the ground raster")) is said


def test_a_top_without_ground_does_not_lower_the_ground_unsaid(tmp_path: Path) -> None:
    survey = written(tmp_path / "walk.csv", "link,distance_m,top_m", f"{NAME},2700,60")
    with Terrain.open(ground=hill(tmp_path / "hill.tif"), survey=survey) as terrain:
        profile = terrain.profile(a=A, b=B, name=NAME)
    assert profile.ground_m[index_at(profile, 2700.0)] == pytest.approx(60.0)
    (note,) = notes_with(profile, "the ground is lowered")
    assert "row 2: top 140.0 m below the ground raster" in note


def test_surveyed_trees_far_lower_than_the_canopy_raster_are_remarked(tmp_path: Path) -> None:
    ground = RasterSource(path=raster(tmp_path / "flat.tif", 50.0), error_m=0.3)
    cover = CoverSource(path=raster(tmp_path / "wood.tif", 25.0), kind="tree", error_m=2.0)
    survey = written(tmp_path / "walk.csv", "link,distance_m,ground_m,top_m,kind", f"{NAME},1000,50,56,tree")
    with Terrain.open(ground=ground, cover=cover, survey=survey) as terrain:
        profile = terrain.profile(a=A, b=B, name=NAME)
    (note,) = notes_with(profile, "what the rasters say")
    assert "top 19.0 m below" in note


# Obstacles and surveys


def obstacle_rows(file: Path, *things: tuple[str, str, float, float, float]) -> Path:
    """Name, kind, metres east of the corner, radius and height of each."""
    rows = ["name,kind,latitude_deg,longitude_deg,radius_m,height_m"]
    for name, kind, east, radius, height in things:
        place = at(east, 1500.0)
        rows.append(f"{name},{kind},{place.latitude_deg},{place.longitude_deg},{radius},{height}")
    return written(file, *rows)


@pytest.mark.parametrize("spacing_m", [1000, 50, 5])
def test_a_listed_mast_outlives_any_survey(tmp_path: Path, spacing_m: int) -> None:
    """A 60 m mast of kind other, 2.5 km from A, between or beside surveyed points."""
    rows = [f"{NAME},{s},10,10,P" for s in range(2000, 3001, spacing_m)]
    survey = written(tmp_path / "walk.csv", "link,distance_m,ground_m,top_m,profile", *rows)
    things = obstacle_rows(tmp_path / "things.csv", ("mast", "other", 2800.0, 1.0, 60.0))
    result, profile = assessed(ground=raster(tmp_path / "flat.tif", 10.0), obstacles=things, survey=survey)
    assert profile.surface_m.max() == pytest.approx(70.0)
    assert result.verdict == "obstructed"
    assert not notes_with(profile, "left out")


def test_a_building_goes_only_where_its_own_spot_was_measured_and_is_named(tmp_path: Path) -> None:
    """Points every 50 m: one stands at 'looked at', while 'between' lies 25 m from the nearest."""
    rows = [f"{NAME},{s},10,12,P" for s in range(2000, 3001, 50)]
    survey = written(tmp_path / "walk.csv", "link,distance_m,ground_m,top_m,profile", *rows)
    things = obstacle_rows(
        tmp_path / "things.csv",
        ("looked at", "building", 2500.0, 4.0, 30.0),
        ("between", "building", 2825.0, 4.0, 30.0),
    )
    with Terrain.open(ground=raster(tmp_path / "flat.tif", 10.0), obstacles=things, survey=survey) as terrain:
        profile = terrain.profile(a=A, b=B, name=NAME)
    assert profile.surface_m[index_at(profile, 2200.0)] == pytest.approx(12.0)
    assert profile.surface_m[index_at(profile, 2525.0)] == pytest.approx(40.0)
    (note,) = notes_with(profile, "left out")
    assert "building 'looked at' (things.csv) at 2.20" in note
    assert "survey file 'walk.csv', row 6" in note


# Rasters


def test_a_surface_below_the_ground_all_along_is_refused_with_both_names(tmp_path: Path) -> None:
    """Ground in feet declared as metres: 60 m becomes 197, and every tree sinks."""
    ground = raster(tmp_path / "ground.tif", 197.0)
    surface = raster(tmp_path / "surface.tif", 75.0)
    with (
        Terrain.open(ground=ground, surface=surface) as terrain,
        pytest.raises(SeamError, match=r"surface surface\.tif lies 122\.0 m below ground ground\.tif") as caught,
    ):
        terrain.profile(a=A, b=B)
    assert "unit or datum" in str(caught.value)
    assert str(caught.value).count("\n") <= 3


@pytest.mark.parametrize(("share", "said"), [(0.02, False), (0.20, True)])
def test_a_surface_below_the_ground_on_a_part_is_noted(tmp_path: Path, share: float, said: bool) -> None:
    top = np.full(SIZE, 60.0)
    top[:, 300 : 300 + int(540 * share)] = 20.0
    surface = RasterSource(path=raster(tmp_path / "surface.tif", top), error_m=0.5)
    ground = RasterSource(path=raster(tmp_path / "ground.tif", 50.0), error_m=0.5)
    with Terrain.open(ground=ground, surface=surface) as terrain:
        profile = terrain.profile(a=A, b=B)
    found = notes_with(profile, "surface.tif lies below ground.tif")
    assert bool(found) is said
    if said:
        assert "20 % of this path, by 30.0 m" in found[0]
    assert profile.surface_m.min() == pytest.approx(50.0)


def test_trees_alone_do_not_make_the_surface_known(tmp_path: Path) -> None:
    ground = raster(tmp_path / "ground.tif", 10.0)
    flat = raster(tmp_path / "cover.tif", 0.0)
    grown = hill(tmp_path / "surface.tif", top_m=22.0)
    things = obstacle_rows(tmp_path / "things.csv", ("shed", "building", 2500.0, 4.0, 3.0))
    trees, houses = CoverSource(path=flat, kind="tree"), CoverSource(path=flat, kind="building")

    def known(**more: object) -> tuple[bool, list[str]]:
        with Terrain.open(ground=ground, **more) as terrain:
            profile = terrain.profile(a=A, b=B)
        return profile.surface_is_known, notes_with(profile, "not in the data")

    is_known, (note,) = known(cover=trees)
    assert not is_known
    assert note.startswith("buildings are not in the data")
    is_known, (note,) = known(cover=houses)
    assert (is_known, note.startswith("trees are not in the data")) == (False, True)
    is_known, (note,) = known(cover=trees, obstacles=things)  # a list of some buildings is not a list of all
    assert (is_known, note.startswith("buildings are not")) == (False, True)
    for data in (
        {"cover": [trees, houses]},
        {"cover": CoverSource(path=flat, kind="other")},
        {"cover": trees, "obstacles": ObstacleSource(path=things, complete=("building",))},
        {"surface": grown, "cover": trees},
    ):
        assert known(**data) == (True, []), data
    with pytest.raises(TerrainError, match=r"'things\.csv' cannot be complete for kind 'other'"):
        known(cover=trees, obstacles=ObstacleSource(path=things, complete=("other",)))


# Gaps, sea and datums


def holed(file: Path, *, west_m: float, east_m: float, west: int = 200, east: int = 300) -> Path:
    """One level on each side of a hole, 1.7 to 2.7 km from A."""
    heights = np.full(SIZE, west_m)
    heights[:, east:] = east_m
    heights[:, west:east] = -9999.0
    return raster(file, heights)


@pytest.mark.parametrize(("west_m", "east_m"), [(80.0, 80.0), (2.0, 80.0), (80.0, 2.0), (-40.0, 2.0)])
def test_a_hole_beside_high_ground_is_not_flooded(tmp_path: Path, west_m: float, east_m: float) -> None:
    ground = RasterSource(path=holed(tmp_path / "holed.tif", west_m=west_m, east_m=east_m), error_m=1.0)
    with Terrain.open(ground=ground, gaps="sea") as terrain:
        with pytest.raises(TerrainGapError) as caught:
            terrain.profile(a=A, b=B, name=NAME)
        (profile,) = terrain.profiles([(A, B)])
    assert "not taken as sea: beside it, at" in str(caught.value)
    high = next(level for level in (west_m, east_m) if abs(level) > 10.0)
    assert f"the ground is {high:.1f} m, and the sea 0 m" in str(caught.value)
    assert str(caught.value).count("\n") <= 3
    (gap,) = profile.gaps
    assert gap.reason.startswith("not taken as sea")


@pytest.mark.parametrize(("shore_m", "filled"), [(7.9, True), (8.1, False)])
def test_a_hole_between_low_shores_is_sea(tmp_path: Path, shore_m: float, filled: bool) -> None:
    """5 m and three standard errors of 1 m: 8 m."""
    ground = RasterSource(path=holed(tmp_path / "holed.tif", west_m=shore_m, east_m=1.0), error_m=1.0)
    with Terrain.open(ground=ground, gaps="sea") as terrain:
        (profile,) = terrain.profiles([(A, B)])
        if filled:
            fine = terrain.refine(profile, [(1690.0, 1720.0)], step_m=0.5)
            assert np.isfinite(fine.ground_m).all()
    assert (not profile.gaps) is filled


def test_a_raster_that_ends_before_the_site_is_not_sea_unless_the_end_is_surveyed(tmp_path: Path) -> None:
    ground = holed(tmp_path / "ends.tif", west_m=2.0, east_m=-9999.0)
    with Terrain.open(ground=ground, gaps="sea") as terrain:
        with pytest.raises(TerrainGapError, match=r"reaches the path's end B, where the ground must be known"):
            terrain.profile(a=A, b=B, name=NAME)
        with pytest.raises(TerrainGapError, match=r"end A and B"):
            terrain.profile(a=at(3000.0, 1500.0), b=B)
    with Terrain.open(ground=ground, gaps="sea") as terrain:
        length = terrain.profiles([(A, B)])[0].length_m
    survey = written(tmp_path / "pier.csv", "link,distance_m,ground_m", f"{NAME},{length:.2f},3.5")
    with Terrain.open(ground=ground, gaps="sea", survey=survey) as terrain:
        profile = terrain.profile(a=A, b=B, name=NAME)
    assert profile.ground_m[-1] == pytest.approx(3.5)
    assert profile.ground_m[index_at(profile, 4000.0)] == 0.0


def test_sea_is_not_filled_in_among_ellipsoidal_heights(tmp_path: Path) -> None:
    ground = RasterSource(path=raster(tmp_path / "g.tif", 50.0, crs="EPSG:32623"), vertical_datum="WGS 84 ellipsoid")
    with pytest.raises(VerticalDatumError, match="WGS 84 ellipsoid") as caught:
        Terrain.open(ground=ground, gaps="sea")
    assert "sea" in str(caught.value)
    with Terrain.open(ground=ground) as terrain:
        profile = terrain.profile(a=A, b=B)
    assert is_ellipsoidal(profile.vertical_datum)
    assert notes_with(profile, "not above sea level")


@pytest.mark.parametrize(
    ("datum", "expected"),
    [
        ("ellipsoid of WGS 84", True),
        ("WGS84 ellipsoidal height", True),
        ("WGS 84", True),
        ("Ellipsoid (metre)", True),
        ("EPSG:4979", True),
        ("EGM2008 height", False),
        ("EGM96", False),
        ("NAVD88 height", False),
        (None, False),
    ],
)
def test_which_datums_are_ellipsoids(datum: str | None, expected: bool) -> None:
    assert is_ellipsoidal(datum) is expected


# Growth and names


def test_surveyed_trees_grow_or_it_is_said_that_they_do_not(tmp_path: Path) -> None:
    ground = raster(tmp_path / "flat.tif", 50.0)
    survey = written(
        tmp_path / "walk.csv",
        "link,distance_m,ground_m,top_m,top_above_ground_m,kind,growth_m_per_year",
        f"{NAME},1000,50,70,,tree,0.4",
        f"{NAME},2000,,,20,tree,0.4",
        f"{NAME},3000,50,70,,tree,",
        f"{NAME},4000,50,50,,tree,0.4",
    )
    with Terrain.open(ground=ground, survey=survey, growth_years=10.0) as terrain:
        profile = terrain.profile(a=A, b=B, name=NAME)
    for distance, top in ((1000.0, 74.0), (2000.0, 74.0), (3000.0, 70.0), (4000.0, 50.0)):
        assert profile.surface_m[index_at(profile, distance)] == pytest.approx(top)
    (note,) = notes_with(profile, "no growth_m_per_year")
    assert "row 4: 1 surveyed tree tops" in note
    with Terrain.open(ground=ground, survey=survey) as terrain:
        profile = terrain.profile(a=A, b=B, name=NAME)
    assert profile.surface_m[index_at(profile, 1000.0)] == pytest.approx(70.0)
    assert not notes_with(profile, "growth")


def test_growth_belongs_to_trees(tmp_path: Path) -> None:
    file = written(tmp_path / "walk.csv", "link,distance_m,top_m,kind,growth_m_per_year", "x,5,9,building,0.3")
    with pytest.raises(SurveyFileError, match=r"growth_m_per_year 0\.3"):
        read_survey(file)


@pytest.mark.parametrize("spelling", ["mole - POINT", "Mole  -  Point", "Mole - Point"])
def test_a_link_spelt_with_other_letters_is_one_link_for_survey_and_study(tmp_path: Path, spelling: str) -> None:
    survey = written(tmp_path / "walk.csv", "link,distance_m,ground_m,top_m", f"{spelling},1000,10,30", "Other,5,1,1")
    study = Study(
        title="t",
        date=dt.date(2026, 5, 1),
        terrain=TerrainInputs(
            ground=(RasterSource(path=raster(tmp_path / "flat.tif", 10.0)),), survey=(SurveySource(path=survey),)
        ),
        links=(link_of(),),
    )
    plan = plan_study(study)
    assert not plan.failures
    assert plan.links[0].profile.surface_m.max() == pytest.approx(30.0)
    unused = [caution for caution in plan.cautions if "which this study does not have" in caution]
    assert len(unused) == 1
    assert "'Other'" in unused[0]
    missing = plan_study(dataclasses.replace(study, links=(link_of("Elsewhere"),)))
    assert len([caution for caution in missing.cautions if "does not have" in caution]) == 2
