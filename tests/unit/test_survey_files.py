"""Surveyed points and profiles: what they replace, how far, and what is refused."""

from pathlib import Path

import numpy as np
import pytest
from made_terrain import at, raster

from fellspan.errors import SurveyFileError, TerrainGapError
from fellspan.geodesy.geodesic import WGS84_GEOD, GeodesicPath
from fellspan.terrain.profile import MEASURED_GROUND, MEASURED_NOTHING, MEASURED_TOP, PathProfile
from fellspan.terrain.sources import CoverSource, RasterSource
from fellspan.terrain.survey import read_survey
from fellspan.terrain.terrain import Terrain
from fellspan.vocabulary import COVER_KINDS

A, B = at(500.0, 1500.0), at(5500.0, 1500.0)
NAME = "Mole - Point"


def survey_file(tmp_path: Path, *rows: str) -> Path:
    file = tmp_path / "walk.csv"
    file.write_text("\n".join(rows) + "\n", encoding="utf-8")
    return file


@pytest.fixture
def terrain_files(tmp_path: Path) -> dict[str, object]:
    """Ground at 50 m, wood of 10 m everywhere."""
    return {
        "ground": RasterSource(path=raster(tmp_path / "ground.tif", 50.0), error_m=3.0),
        "cover": CoverSource(path=raster(tmp_path / "wood.tif", 10.0), kind="tree", error_m=4.0),
    }


def surveyed(files: dict[str, object], survey: Path, *, name: str | None = NAME, **more: object) -> PathProfile:
    with Terrain.open(**files, survey=survey, **more) as terrain:
        return terrain.profile(a=A, b=B, name=name)


def near(profile: PathProfile, distance_m: float) -> int:
    return int(np.argmin(np.abs(profile.distance_m - distance_m)))


def test_a_profile_by_link_and_distance_replaces_the_raster_between_its_points(
    tmp_path: Path, terrain_files: dict[str, object]
) -> None:
    file = survey_file(
        tmp_path,
        "link,distance_m,ground_m,top_m,kind,profile,error_m",
        f"{NAME},1000,40,40,,P1,0.05",
        f"{NAME},1050,44,56,tree,P1,0.05",
        f"{NAME},1100,48,48,,P1,0.05",
    )
    profile = surveyed(terrain_files, file)
    for distance, ground, top in (
        (1000.0, 40.0, 40.0),
        (1025.0, 42.0, 48.0),
        (1050.0, 44.0, 56.0),
        (1075.0, 46.0, 52.0),
    ):
        i = near(profile, distance)
        s = profile.distance_m[i]
        assert profile.ground_m[i] == pytest.approx(ground + 0.08 * (s - distance), abs=1e-6)
        assert profile.surface_m[i] == pytest.approx(top, abs=1.0)
    inside = (profile.distance_m >= 1000.0) & (profile.distance_m <= 1100.0)
    assert (profile.measured[inside] == MEASURED_TOP).all()
    assert {profile.sources[i] for i in profile.source[inside]} == {"survey: walk.csv"}
    assert profile.sigma_m[inside] == pytest.approx(0.05)
    outside = ~((profile.distance_m >= 999.98) & (profile.distance_m <= 1100.02))
    assert (profile.measured[outside] == MEASURED_NOTHING).all()
    assert profile.surface_m[outside] == pytest.approx(60.0)
    assert profile.cover_kind[near(profile, 1050.0)] == COVER_KINDS.index("tree")
    assert {1000.0, 1050.0, 1100.0} <= set(profile.distance_m.tolist())


def test_rows_of_another_link_do_not_count(tmp_path: Path, terrain_files: dict[str, object]) -> None:
    file = survey_file(tmp_path, "link,distance_m,ground_m", "Other,1000,40")
    profile = surveyed(terrain_files, file)
    assert (profile.measured == MEASURED_NOTHING).all()
    assert (surveyed(terrain_files, file, name=None).measured == MEASURED_NOTHING).all()
    assert (surveyed(terrain_files, file, name="oTHER").measured != MEASURED_NOTHING).any()
    with Terrain.open(**terrain_files, survey=file) as terrain:
        assert terrain.survey_links == ("Other",)


def test_a_single_point_speaks_for_half_a_cell_or_its_radius(tmp_path: Path, terrain_files: dict[str, object]) -> None:
    file = survey_file(
        tmp_path,
        "link,distance_m,ground_m,radius_m",
        f"{NAME},1000,41,",
        f"{NAME},2002.5,42,30",
        f"{NAME},2052.5,43,30",
    )
    profile = surveyed(terrain_files, file)
    told = np.isin(profile.ground_m, (41.0, 42.0, 43.0))
    spans = profile.distance_m[told & (profile.ground_m == 41.0)]
    assert (spans.min(), spans.max()) == (pytest.approx(995.0, abs=0.01), pytest.approx(1005.0, abs=0.01))
    forty_two = profile.distance_m[profile.ground_m == 42.0]
    assert (forty_two.min(), forty_two.max()) == (pytest.approx(1972.5, abs=0.01), pytest.approx(2027.5, abs=5.1))
    assert profile.ground_m[near(profile, 2040.0)] == 43.0  # the nearer point speaks
    # Ground alone: the wood stays on it, and its error with it.
    i = near(profile, 1000.0)
    assert profile.surface_m[i] == pytest.approx(51.0)
    assert profile.measured[i] == MEASURED_GROUND
    assert profile.sigma_m[i] == pytest.approx(np.hypot(0.1, 4.0))


def test_positions_count_within_ten_metres_or_their_radius(tmp_path: Path, terrain_files: dict[str, object]) -> None:
    path = GeodesicPath.between(A, B)
    rows = ["latitude_deg,longitude_deg,ground_m,top_m,radius_m,note"]
    for along, across, top, radius in ((1000.0, 9.9, 71, ""), (2000.0, 10.1, 72, ""), (3000.0, 24.0, 73, 25)):
        lon, lat, back = WGS84_GEOD.fwd(A.longitude_deg, A.latitude_deg, path.bearing_ab_deg, along)
        lon, lat, _ = WGS84_GEOD.fwd(lon, lat, back - 90.0, across)
        rows.append(f"{lat:.9f},{lon:.9f},50,{top},{radius},spruce {top}")
    profile = surveyed(terrain_files, survey_file(tmp_path, *rows), name=None)
    tops = set(np.round(profile.surface_m, 3).tolist())
    assert {71.0, 73.0} <= tops
    assert 72.0 not in tops
    assert any(note == "surveyed at 1.000 km: spruce 71 (walk.csv)" for note in profile.notes)
    assert np.abs(profile.distance_m - 3000.0).min() < 1e-3


def test_a_profile_of_positions_follows_the_path_whichever_way_it_was_walked(
    tmp_path: Path, terrain_files: dict[str, object]
) -> None:
    rows = ["latitude_deg,longitude_deg,ground_m,top_m,profile"]
    path = GeodesicPath.between(A, B)
    for along, ground in ((1080.0, 30.0), (1050.0, 20.0), (1000.0, 40.0)):
        latitude, longitude = path.positions(along)
        rows.append(f"{latitude:.9f},{longitude:.9f},{ground},{ground},walked")
    profile = surveyed(terrain_files, survey_file(tmp_path, *rows))
    i = near(profile, 1025.0)
    assert profile.ground_m[i] == pytest.approx(40.0 - 0.4 * (profile.distance_m[i] - 1000.0), abs=0.01)
    assert profile.ground_m.min() == pytest.approx(20.0, abs=1e-3)


def test_a_measured_profile_closes_a_gap_of_the_raster(tmp_path: Path) -> None:
    heights = np.full((300, 600), 50.0)
    heights[:, 200:208] = -9999.0  # 1500 to 1580 m from A
    ground = raster(tmp_path / "holed.tif", heights)
    rows = [f"{NAME},1490,50,P", f"{NAME},1540,20,P", f"{NAME},1590,50,P"]
    profile = surveyed({"ground": ground}, survey_file(tmp_path, "link,distance_m,ground_m,profile", *rows))
    assert not profile.gaps
    assert profile.ground_m[near(profile, 1540.0)] == pytest.approx(20.0)
    # With its middle point left out the line is too long to stand for ground that nobody knows.
    file = survey_file(tmp_path, "link,distance_m,ground_m,profile", rows[0], rows[2])
    with pytest.raises(TerrainGapError, match=r"from 1\.50 km to 1\.58 km"):
        surveyed({"ground": ground}, file)


def test_a_top_alone_sets_the_surface_and_keeps_the_ground(tmp_path: Path, terrain_files: dict[str, object]) -> None:
    file = survey_file(tmp_path, "link,distance_m,top_m", f"{NAME},1000,75", f"{NAME},2000,45")
    profile = surveyed(terrain_files, file)
    i, j = near(profile, 1000.0), near(profile, 2000.0)
    assert (profile.ground_m[i], profile.surface_m[i], profile.measured[i]) == (50.0, 75.0, MEASURED_TOP)
    # A top below the raster's ground: the raster is wrong there.
    assert (profile.ground_m[j], profile.surface_m[j]) == (45.0, 45.0)


def test_a_height_above_unmeasured_ground_is_cover_only(tmp_path: Path, terrain_files: dict[str, object]) -> None:
    file = survey_file(tmp_path, "link,distance_m,top_above_ground_m,error_m", f"{NAME},1000,14,0.5")
    profile = surveyed(terrain_files, file)
    i = near(profile, 1000.0)
    assert profile.surface_m[i] == pytest.approx(64.0)
    assert profile.measured[i] == MEASURED_NOTHING
    assert profile.sigma_m[i] == pytest.approx(np.hypot(3.0, 0.5))
    assert profile.cover_kind[i] == COVER_KINDS.index("tree")


def test_a_survey_removes_buildings_of_a_file_but_not_what_moves(
    tmp_path: Path, terrain_files: dict[str, object]
) -> None:
    place, other = at(2000.0, 1500.0), at(3000.0, 1500.0)
    obstacles = tmp_path / "things.csv"
    obstacles.write_text(
        "latitude_deg,longitude_deg,radius_m,height_m,kind,envelope\n"
        f"{place.latitude_deg},{place.longitude_deg},20,30,building,\n"
        f"{other.latitude_deg},{other.longitude_deg},20,30,other,crane\n",
        encoding="utf-8",
    )
    file = survey_file(
        tmp_path,
        "latitude_deg,longitude_deg,ground_m,top_m,radius_m",
        *(f"{p.latitude_deg},{p.longitude_deg},50,55,40" for p in (place, other)),
    )
    profile = surveyed(terrain_files, file, obstacles=obstacles)
    i, j = near(profile, 1500.0), near(profile, 2500.0)
    assert (profile.surface_m[i], profile.obstacle_index[i], profile.measured[i]) == (55.0, -1, MEASURED_TOP)
    assert profile.surface_m[j] == pytest.approx(80.0)
    assert profile.measured[j] == MEASURED_GROUND
    assert profile.obstacles[profile.obstacle_index[j]].name == "crane"


def test_refining_a_surveyed_profile_keeps_the_survey(tmp_path: Path, terrain_files: dict[str, object]) -> None:
    file = survey_file(
        tmp_path, "link,distance_m,ground_m,top_m,profile", f"{NAME},1000,40,40,P", f"{NAME},1050,60,60,P"
    )
    with Terrain.open(**terrain_files, survey=file) as terrain:
        profile = terrain.profile(a=A, b=B, name=NAME)
        fine = terrain.refine(profile, [(1000.0, 1050.0)], step_m=0.15)
    inside = (fine.distance_m >= 1000.0) & (fine.distance_m <= 1050.0)
    assert inside.sum() > 300
    assert (fine.measured[inside] == MEASURED_TOP).all()
    assert fine.ground_m[inside] == pytest.approx(40.0 + 0.4 * (fine.distance_m[inside] - 1000.0), abs=1e-9)


def test_rows_beyond_the_end_are_said(tmp_path: Path, terrain_files: dict[str, object]) -> None:
    file = survey_file(tmp_path, "link,distance_m,ground_m", f"{NAME},1000,40", f"{NAME},5100,41", f"{NAME},6000,42")
    profile = surveyed(terrain_files, file)
    (note,) = [note for note in profile.notes if "beyond" in note]
    assert "walk.csv', row 3: distance_m 5100" in note
    assert "2 such rows" in note


@pytest.mark.parametrize(
    ("rows", "said"),
    [
        (("link,distance,ground_m", "x,1,2"), ["unknown column 'distance'", "distance_m"]),
        (("link,distance_m,ground_m", "x,,2"), ["row 2", "no complete place"]),
        (("link,distance_m,ground_m", "x,-5,2"), ["row 2", "-5"]),
        (("latitude_deg,longitude_deg,link,distance_m,ground_m", "1,2,x,5,2"), ["both a position and a distance"]),
        (("link,distance_m,ground_m", "x,5,"), ["nothing measured"]),
        (("link,distance_m,ground_m,top_m", "x,5,40,12"), ["top_m 12", "ground_m 40"]),
        (("link,distance_m,top_m,top_above_ground_m", "x,5,40,12"), ["both top_m and top_above_ground_m"]),
        (("link,distance_m,ground_m", "x,5,inf"), ["ground_m inf"]),
        (("link,distance_m,ground_m,error_m", "x,5,1,-2"), ["error_m -2"]),
        (("link,distance_m,ground_m,profile", "x,5,1,P", "x,5,1,P"), ["row 3", "does not rise"]),
        (("link,distance_m,ground_m,kind", "x,5,1,hedge"), ["hedge", "tree"]),
        (("link,distance_m,ground_m,growth_m_per_year", "x,5,1,0.3"), ["growth_m_per_year 0.3", "kind tree"]),
        (("link,distance_m,ground_m", "x,5,1,7"), ["row 2", "'7'"]),
    ],
)
def test_a_wrong_row_is_named(tmp_path: Path, rows: tuple[str, ...], said: list[str]) -> None:
    with pytest.raises(SurveyFileError) as caught:
        read_survey(survey_file(tmp_path, *rows))
    assert "walk.csv" in str(caught.value)
    assert str(caught.value).count("\n") <= 3
    for part in said:
        assert part in str(caught.value)


def test_the_default_error_is_a_decimetre(tmp_path: Path) -> None:
    """0.1 m: common practice, no source."""
    (row,) = read_survey(survey_file(tmp_path, "link,distance_m,ground_m", "x,5,1")).rows
    assert row.error_m == 0.1
