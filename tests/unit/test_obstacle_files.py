"""Obstacle files: what is read from CSV and GeoJSON, how high it then stands, and what is refused."""

import json
from pathlib import Path

import numpy as np
import pytest
from made_terrain import at, lonlat, raster

from fellspan.errors import ObstacleFileError
from fellspan.terrain.obstacle_files import read_obstacles
from fellspan.terrain.profile import PathProfile
from fellspan.terrain.terrain import Terrain
from fellspan.vocabulary import COVER_KINDS

A, B = at(500.0, 1500.0), at(5500.0, 1500.0)


def csv_file(tmp_path: Path, *rows: str) -> Path:
    file = tmp_path / "things.csv"
    file.write_text("\n".join(rows) + "\n", encoding="utf-8")
    return file


def geojson_file(tmp_path: Path, *features: tuple[str, object, dict[str, object]]) -> Path:
    data = {
        "type": "FeatureCollection",
        "features": [
            {"type": "Feature", "geometry": {"type": kind, "coordinates": where}, "properties": properties}
            for kind, where, properties in features
        ],
    }
    file = tmp_path / "things.geojson"
    file.write_text(json.dumps(data), encoding="utf-8")
    return file


@pytest.fixture
def hill(tmp_path: Path) -> Path:
    """Ground that rises 0.1 m a metre to the east, from 0."""
    return raster(tmp_path / "hill.tif", np.tile((np.arange(600) + 0.5) * 1.0, (300, 1)))


def profile_over(hill: Path, obstacles: Path, **options: float) -> PathProfile:
    with Terrain.open(ground=hill, obstacles=obstacles, **options) as terrain:
        return terrain.profile(a=A, b=B)


def square(east: float, south: float, half: float) -> list[list[tuple[float, float]]]:
    corners = [(-half, -half), (half, -half), (half, half), (-half, half), (-half, -half)]
    return [[lonlat(east + x, south + y) for x, y in corners]]


def test_a_building_has_a_level_roof_from_the_highest_ground_under_it(tmp_path: Path, hill: Path) -> None:
    file = geojson_file(
        tmp_path, ("Polygon", square(2000.0, 1500.0, 20.0), {"name": "Mill", "kind": "building", "height_m": 9.0})
    )
    profile = profile_over(hill, file)
    inside = profile.obstacle_index == 0
    (mill,) = profile.obstacles
    assert mill.to_m - mill.from_m == pytest.approx(40.0, abs=0.1)
    assert np.ptp(profile.surface_m[inside]) < 1e-9
    assert mill.top_amsl_m == pytest.approx(0.1 * 2020.0 + 9.0, abs=0.02)
    assert profile.surface_m[inside][0] == pytest.approx(mill.top_amsl_m)
    assert mill.height_m == pytest.approx(9.0 + 4.0, abs=0.05)  # on the low side
    assert (profile.cover_kind[inside] == COVER_KINDS.index("building")).all()
    assert (mill.name, mill.source, mill.sigma_m) == ("Mill", "things.geojson", 1.0)


def test_an_outline_without_a_kind_is_a_building_and_a_wood_follows_the_ground(tmp_path: Path, hill: Path) -> None:
    file = geojson_file(
        tmp_path,
        ("Polygon", square(1000.0, 1500.0, 10.0), {"height_m": 5}),
        ("Polygon", square(2000.0, 1500.0, 100.0), {"kind": "tree", "height_m": 12, "growth_m_per_year": 0.3}),
    )
    profile = profile_over(hill, file, growth_years=10.0)
    kinds = [thing.kind for thing in profile.obstacles]
    assert kinds == ["building", "tree"]
    wood = profile.obstacle_index == 1
    assert wood.sum() > 30
    assert profile.cover_m[wood] == pytest.approx(15.0)
    assert np.ptp(profile.surface_m[wood]) == pytest.approx(20.0, abs=0.5)
    assert profile.obstacles[1].growth_m_per_year == 0.3
    assert profile.sigma_m[wood][0] == pytest.approx(np.hypot(2.0, profile.sigma_m[profile.cover_m == 0.0][0]))


def test_a_top_above_sea_level_needs_no_ground(tmp_path: Path, hill: Path) -> None:
    (lon_1, lat_1), (lon_2, lat_2) = lonlat(3000.0, 1000.0), lonlat(3000.0, 2000.0)
    file = csv_file(
        tmp_path,
        "wkt,envelope,top_amsl_m,width_m,error_m",
        f'"LINESTRING ({lon_1} {lat_1}, {lon_2} {lat_2})",ship,340,200,2',
    )
    profile = profile_over(hill, file)
    (ship,) = profile.obstacles
    inside = profile.obstacle_index == 0
    assert (ship.name, ship.kind) == ("ship", "other")
    assert profile.surface_m[inside] == pytest.approx(340.0)
    assert profile.sigma_m[inside] == pytest.approx(2.0)
    assert ship.to_m - ship.from_m == pytest.approx(200.0, abs=0.5)


def test_an_envelope_holds_its_own_height_and_follows_the_road(tmp_path: Path, hill: Path) -> None:
    (lon_1, lat_1), (lon_2, lat_2) = lonlat(3000.0, 1000.0), lonlat(3000.0, 2000.0)
    file = csv_file(tmp_path, "wkt,envelope,width_m", f'"LINESTRING ({lon_1} {lat_1}, {lon_2} {lat_2})",road 5.5 m,8')
    profile = profile_over(hill, file)
    inside = profile.obstacle_index == 0
    assert profile.cover_m[inside] == pytest.approx(5.5)
    assert profile.obstacles[0].name == "road 5.5 m"


@pytest.mark.parametrize(("sag", "expected"), [("", 0.0), ("4", 4.0)])
def test_a_power_line_hangs_between_the_tops_of_its_supports(
    tmp_path: Path, hill: Path, sag: str, expected: float
) -> None:
    """Supports 200 m apart on a diagonal that meets the path in its middle; chord, then chord less sag."""
    (lon_1, lat_1), (lon_2, lat_2) = lonlat(2900.0, 1400.0), lonlat(3100.0, 1600.0)
    file = csv_file(
        tmp_path,
        "wkt,envelope,heights_m,sag_m",
        f'"LINESTRING ({lon_1} {lat_1}, {lon_2} {lat_2})",power line,20;30,{sag}',
    )
    profile = profile_over(hill, file)
    (line,) = profile.obstacles
    middle = int(np.argmin(np.abs(profile.distance_m - 0.5 * (line.from_m + line.to_m))))
    chord = 0.5 * (290.0 + 20.0 + 310.0 + 30.0)
    assert profile.surface_m[middle] == pytest.approx(chord - expected, abs=0.1)
    assert line.to_m - line.from_m == pytest.approx(2.0**0.5, abs=0.02)  # 1 m wide where not said


def test_a_line_that_calls_itself_a_power_line_spans_a_valley(tmp_path: Path) -> None:
    """Supports on two rims at 100 m, the valley floor at 0: the wire stays up, a road's envelope goes down."""
    heights = np.full((300, 600), 100.0)
    heights[145:155, :] = 0.0
    valley = raster(tmp_path / "valley.tif", heights)
    (lon_1, lat_1), (lon_2, lat_2) = lonlat(3000.0, 1300.0), lonlat(3000.0, 1700.0)
    tops = []
    for envelope in ("power line", "road"):
        file = csv_file(
            tmp_path, "wkt,envelope,height_m", f'"LINESTRING ({lon_1} {lat_1}, {lon_2} {lat_2})",{envelope},12'
        )
        tops.append(profile_over(valley, file).obstacles[0].top_amsl_m)
    assert tops == [pytest.approx(112.0), pytest.approx(12.0)]


def test_a_line_whose_support_stands_off_the_raster_hangs_from_the_ground_below(tmp_path: Path, hill: Path) -> None:
    (lon_1, lat_1), (lon_2, lat_2) = lonlat(3000.0, 1400.0), lonlat(3000.0, 4000.0)
    file = csv_file(tmp_path, "wkt,name,height_m", f'"LINESTRING ({lon_1} {lat_1}, {lon_2} {lat_2})",power line,12')
    profile = profile_over(hill, file)
    assert profile.obstacles[0].top_amsl_m == pytest.approx(312.0, abs=0.2)
    assert any("support of power line is not known" in note for note in profile.notes)


def test_sag_is_a_parabola_along_the_span(tmp_path: Path, hill: Path) -> None:
    """A line along the path, level supports at 400 m above sea: the quarter point hangs by three quarters of the sag."""
    (lon_1, lat_1), (lon_2, lat_2) = lonlat(2000.0, 1500.0), lonlat(2400.0, 1500.0)
    file = csv_file(
        tmp_path,
        "wkt,name,tops_amsl_m,sag_m,width_m",
        f'"LINESTRING ({lon_1} {lat_1}, {lon_2} {lat_2})",wire,400 400,12,10',
    )
    profile = profile_over(hill, file)
    quarter = int(np.argmin(np.abs(profile.distance_m - 1600.0)))
    assert profile.surface_m[quarter] == pytest.approx(400.0 - 0.75 * 12.0, abs=0.2)


def test_points_take_a_radius_and_rows_a_default_name(tmp_path: Path, hill: Path) -> None:
    place = at(2000.0, 1500.0)
    file = csv_file(
        tmp_path,
        "# measured from the quay",
        "Latitude_deg;longitude_deg;kind;height_m;note",
        f"{place.latitude_deg};{place.longitude_deg};tree;14;leaning",
        "",
    )
    profile = profile_over(hill, file)
    (tree,) = profile.obstacles
    assert tree.name == "tree row 3"
    assert tree.to_m - tree.from_m == pytest.approx(4.0, abs=0.01)


def test_a_multi_polygon_is_several_and_holes_are_open(tmp_path: Path, hill: Path) -> None:
    ring, hole = square(2000.0, 1500.0, 100.0)[0], square(2000.0, 1500.0, 50.0)[0]
    far = square(4000.0, 1500.0, 10.0)
    file = geojson_file(tmp_path, ("MultiPolygon", [[ring, hole[::-1]], far], {"height_m": 3, "name": "court"}))
    spans = [round(thing.to_m - thing.from_m) for thing in profile_over(hill, file).obstacles]
    assert spans == [50, 50, 20]


def test_a_crossed_outline_is_mended_with_a_note(tmp_path: Path) -> None:
    bow = [[lonlat(0, 0), lonlat(100, 100), lonlat(100, 0), lonlat(0, 100), lonlat(0, 0)]]
    obstacles, _, notes = read_obstacles(geojson_file(tmp_path, ("Polygon", bow, {"height_m": 3})))
    assert len(obstacles) == 2
    assert "feature 1: the outline crosses itself" in notes[0]


def test_heights_in_coordinates_are_not_used_silently(tmp_path: Path) -> None:
    file = geojson_file(tmp_path, ("Point", [*lonlat(0, 0), 55.0], {"height_m": 3}))
    obstacles, _, notes = read_obstacles(file)
    assert obstacles[0].height_m == 3.0
    assert "ignored" in notes[0]
    obstacles, _, notes = read_obstacles(csv_file(tmp_path, "wkt,height_m", '"POINT Z (1 2 55)",3'))
    assert obstacles[0].height_m == 3.0
    assert "things.csv" in notes[0]


def test_where_the_cover_raster_is_higher_it_stays(tmp_path: Path, hill: Path) -> None:
    file = geojson_file(tmp_path, ("Polygon", square(2000.0, 1500.0, 20.0), {"kind": "building", "height_m": 2}))
    cover = raster(tmp_path / "cover.tif", 15.0)
    with Terrain.open(ground=hill, cover=cover, obstacles=file) as terrain:
        profile = terrain.profile(a=A, b=B)
    assert (profile.obstacle_index == -1).all()
    assert len(profile.obstacles) == 1
    assert profile.surface_is_known


def test_obstacles_alone_do_not_make_the_surface_known(tmp_path: Path, hill: Path) -> None:
    file = geojson_file(tmp_path, ("Polygon", square(2000.0, 1500.0, 20.0), {"height_m": 2}))
    assert not profile_over(hill, file).surface_is_known


POINT = "latitude_deg,longitude_deg,"


@pytest.mark.parametrize(
    ("rows", "said"),
    [
        ((POINT + "hight_m", "36,-45,5"), ["row 1", "hight_m", "did you mean 'height_m'"]),
        ((POINT + "height_m,height_m", "36,-45,5,5"), ["height_m", "twice"]),
        ((POINT + "height_m", "91,-45,5"), ["row 2", "latitude_deg 91", "-90 to 90"]),
        ((POINT + "height_m", "36,-45,nan"), ["row 2", "height_m nan"]),
        ((POINT + "height_m", "36,-45,-1"), ["height_m -1", "0 to 2000"]),
        ((POINT + "height_m", "36,-45,5 m"), ["'5 m'", "without a unit"]),
        ((POINT + "height_m", '36,-45,"5,5"'), ["'5,5'", "point"]),
        ((POINT + "height_m", "36,-45,5,6"), ["row 2", "4 values for 3 columns"]),
        ((POINT + "height_m", "36,,5"), ["row 2", "no place"]),
        ((POINT + "name", "36,-45,mast"), ["row 2", "no height"]),
        ((POINT + "height_m,top_amsl_m", "36,-45,5,6"), ["height_m and top_amsl_m"]),
        ((POINT + "height_m,kind", "36,-45,5,house"), ["house", "building, tree, other"]),
        ((POINT + "height_m,kind", "36,-45,5,bilding"), ["bilding", "did you mean 'building'"]),
        ((POINT + "height_m,width_m", "36,-45,5,3"), ["width_m", "lines"]),
        ((POINT + "envelope", "36,-45,crane"), ["no height"]),
        (("wkt,height_m", "POINT (1 2,5"), ["row 2"]),
        (("wkt,height_m", '"POINT EMPTY",5'), ["row 2", "empty"]),
        (("wkt,height_m", '"POINT (500000 3990000)",5'), ["500000", "metres?"]),
        (("wkt,heights_m", '"LINESTRING (1 2, 3 4)",5;6;7'), ["3 values for 2 points"]),
    ],
)
def test_a_wrong_row_is_named_with_value_and_remedy(tmp_path: Path, rows: tuple[str, ...], said: list[str]) -> None:
    with pytest.raises(ObstacleFileError) as caught:
        read_obstacles(csv_file(tmp_path, *rows))
    message = str(caught.value)
    assert "things.csv" in message
    assert message.count("\n") <= 3
    for part in said:
        assert part in message


@pytest.mark.parametrize(
    ("properties", "said"),
    [
        ({"height": 5}, ["feature 1", "'height'", "height_m"]),
        ({"height_m": "tall"}, ["feature 1", "tall"]),
        ({"height_m": [5]}, ["feature 1", "height_m"]),
        ({"height_m": True}, ["feature 1", "True"]),
    ],
)
def test_a_wrong_property_is_named(tmp_path: Path, properties: dict[str, object], said: list[str]) -> None:
    with pytest.raises(ObstacleFileError) as caught:
        read_obstacles(geojson_file(tmp_path, ("Point", lonlat(0, 0), properties)))
    for part in said:
        assert part in str(caught.value)


def test_a_missing_file_is_named(tmp_path: Path) -> None:
    with pytest.raises(ObstacleFileError, match=r"none\.csv"):
        read_obstacles(tmp_path / "none.csv")


def test_there_and_back_cross_the_same_and_a_batch_equals_single_paths(tmp_path: Path, hill: Path) -> None:
    rng = np.random.default_rng(8)
    places = rng.uniform((2980.0, 1480.0), (3020.0, 1520.0), (8, 2))
    shapes = [("Polygon", square(x, y, 25.0), {"height_m": 7}) for x, y in places]
    places = rng.uniform((500.0, 1500.0), (5000.0, 1508.0), (9, 2))
    shapes += [("Point", lonlat(x, y), {"height_m": 20, "radius_m": 9}) for x, y in places]
    file = geojson_file(tmp_path, *shapes)
    with Terrain.open(ground=hill, obstacles=file) as terrain:
        there, back = terrain.profiles([(A, B), (B, A)])
        single = terrain.profile(a=A, b=B)
    assert len(there.obstacles) > 8
    length = there.length_m
    mirrored = sorted((length - thing.to_m, length - thing.from_m, thing.top_amsl_m) for thing in back.obstacles)
    found = sorted((thing.from_m, thing.to_m, thing.top_amsl_m) for thing in there.obstacles)
    assert np.allclose(np.array(found), np.array(mirrored), atol=2e-3)
    assert np.array_equal(single.surface_m, there.surface_m)
    assert single.obstacles == there.obstacles
