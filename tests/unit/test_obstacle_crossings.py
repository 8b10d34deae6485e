"""Crossings of obstacles against geometry worked out another way: in a UTM projection with the path as a dense line."""

from pathlib import Path

import numpy as np
import pytest
import shapely
from made_terrain import TO_DEGREES, TO_GRID, at, raster
from pyproj import Geod

from fellspan.errors import ObstacleFileError
from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.position import Position
from fellspan.terrain.alongpath import along_across
from fellspan.terrain.obstacle_shapes import simple_parts
from fellspan.terrain.obstacles import Obstacle, ObstacleIndex
from fellspan.terrain.tables import Fields
from fellspan.terrain.terrain import Terrain

GEOD = Geod(ellps="WGS84")


def obstacle(shape: object, **options: object) -> Obstacle:
    given = {"name": "thing", "kind": "other", "rule": "level", "source": "test", "height_m": 5.0} | options
    return Obstacle(shape=shape, **given)


def spans(obstacles: list[Obstacle], a: Position, b: Position) -> list[tuple[float, float]]:
    crossings = ObstacleIndex(obstacles).crossings(GeodesicPath.between(a, b))
    return [(crossing.from_m, crossing.to_m) for crossing in crossings]


def test_along_and_across_undo_a_walk_along_and_to_the_side() -> None:
    rng = np.random.default_rng(7)
    for _ in range(20):
        a = Position(latitude_deg=rng.uniform(-80, 80), longitude_deg=rng.uniform(-180, 180))
        bearing, length = rng.uniform(0, 360), rng.uniform(200.0, 60_000.0)
        path = GeodesicPath.towards(a, bearing, length)
        along, across = rng.uniform(-0.2, 1.2, 50) * length, rng.uniform(-20_000.0, 20_000.0, 50)
        latitude, longitude = [], []
        for s, t in zip(along, across, strict=True):
            lon, lat, back = GEOD.fwd(a.longitude_deg, a.latitude_deg, bearing, s)
            lon, lat, _ = GEOD.fwd(lon, lat, back + 180.0 + 90.0, t)
            latitude.append(lat)
            longitude.append(lon)
        found_along, found_across = along_across(path, np.array(latitude), np.array(longitude))
        assert np.abs(found_along - along).max() < 1e-3
        assert np.abs(found_across - across).max() < 1e-3


def test_outlines_agree_with_utm_geometry_to_a_decimetre_on_50_km() -> None:
    rng = np.random.default_rng(11)
    checked = 0
    for _ in range(12):
        start = rng.uniform((0.0, 0.0), (20_000.0, 20_000.0))
        a = at(*start)
        b = at(*(start + rng.uniform((30_000.0, -5_000.0), (45_000.0, 30_000.0))))
        path = GeodesicPath.between(a, b)
        latitude, longitude = path.positions(np.linspace(0.0, path.length_m, 2001), exact=True)
        line = shapely.LineString(np.column_stack(TO_GRID.transform(longitude, latitude)))
        for share in rng.uniform(0.05, 0.95, 8):
            middle = line.interpolate(share, normalized=True)
            corners = middle.coords[0] + rng.uniform(-80.0, 80.0, (5, 2))
            outline = shapely.MultiPoint(corners).convex_hull
            common = outline.intersection(line)
            if common.length < 1.0:
                continue
            ends = np.array(common.coords)[[0, -1]]
            ends_lon, ends_lat = TO_DEGREES.transform(*ends.T)
            expected = [
                GEOD.inv(a.longitude_deg, a.latitude_deg, lon, lat)[2]
                for lon, lat in zip(ends_lon, ends_lat, strict=True)
            ]
            edge = shapely.segmentize(outline, 5.0).exterior  # straight in UTM is not quite straight in degrees
            degrees = np.column_stack(TO_DEGREES.transform(*np.array(edge.coords).T))
            (span,) = spans([obstacle(shapely.Polygon(degrees), kind="building")], a, b)
            assert span == pytest.approx(sorted(expected), abs=0.1)
            checked += 1
    assert checked > 60


def test_a_disc_is_crossed_along_its_chord() -> None:
    path = GeodesicPath.towards(at(0.0, 0.0), 75.0, 30_000.0)
    lon, lat, back = GEOD.fwd(path.a.longitude_deg, path.a.latitude_deg, 75.0, 21_000.0)
    lon, lat, _ = GEOD.fwd(lon, lat, back - 90.0, 3.0)
    ((start, stop),) = spans([obstacle(shapely.Point(lon, lat), radius_m=5.0)], path.a, path.b)
    assert (start, stop) == (pytest.approx(20_996.0, abs=1e-3), pytest.approx(21_004.0, abs=1e-3))
    assert spans([obstacle(shapely.Point(lon, lat), radius_m=2.9)], path.a, path.b) == []


def test_a_disc_over_an_end_is_cut_at_the_end() -> None:
    a, b = at(0.0, 0.0), at(1000.0, 0.0)
    shape = shapely.Point(a.longitude_deg, a.latitude_deg)
    ((start, stop),) = spans([obstacle(shape, radius_m=8.0)], a, b)
    assert (start, stop) == (0.0, pytest.approx(8.0, abs=1e-6))
    behind = GEOD.fwd(a.longitude_deg, a.latitude_deg, 270.0, 50.0)
    assert spans([obstacle(shapely.Point(behind[:2]), radius_m=8.0)], a, b) == []


def test_a_band_at_an_angle_is_as_long_as_its_width_over_the_sine() -> None:
    a, b = at(0.0, 1000.0), at(4000.0, 1000.0)
    first, last = at(1000.0, 0.0), at(3000.0, 2000.0)
    shape = shapely.LineString([(first.longitude_deg, first.latitude_deg), (last.longitude_deg, last.latitude_deg)])
    ((start, stop),) = spans([obstacle(shape, width_m=6.0, rule="follow")], a, b)
    assert stop - start == pytest.approx(6.0 / np.sin(np.radians(45.0)), abs=0.05)
    assert 0.5 * (start + stop) == pytest.approx(2000.0, rel=1e-3)  # the grid's scale


def test_a_concave_outline_is_crossed_twice() -> None:
    corners = [
        (1000, 900),
        (1300, 900),
        (1300, 1100),
        (1200, 1100),
        (1200, 950),
        (1100, 950),
        (1100, 1100),
        (1000, 1100),
    ]
    degrees = [(at(*c).longitude_deg, at(*c).latitude_deg) for c in corners]
    found = spans([obstacle(shapely.Polygon(degrees))], at(0.0, 1000.0), at(2000.0, 1000.0))
    assert [round(stop - start) for start, stop in found] == [100, 100]


@pytest.mark.parametrize("first_longitude", [179.9995, -180.0005])
def test_an_outline_across_the_antimeridian_is_found_from_both_sides(first_longitude: float) -> None:
    ring = [(first_longitude, 9.999), (-179.9995, 9.999), (-179.9995, 10.001), (first_longitude, 10.001)]
    fields = Fields(where="test", values={}, error=ObstacleFileError)
    (shape,) = simple_parts(shapely.Polygon(ring), fields, [])
    west = Position(latitude_deg=10.0, longitude_deg=179.99)
    east = Position(latitude_deg=10.0, longitude_deg=-179.99)
    width = GEOD.inv(179.9995, 10.0, -179.9995, 10.0)[2]
    for a, b in ((west, east), (east, west)):
        ((start, stop),) = spans([obstacle(shape)], a, b)
        assert stop - start == pytest.approx(width, abs=0.05)
        assert 0.5 * (start + stop) == pytest.approx(0.5 * GEOD.inv(179.99, 10.0, -179.99, 10.0)[2], abs=0.05)


def test_outlines_of_any_numbers_across_the_antimeridian_stay_closed() -> None:
    random = np.random.default_rng(12)
    fields = Fields(where="test", values={}, error=ObstacleFileError)
    for _ in range(50):
        angle = np.sort(random.uniform(0.0, 2.0 * np.pi, 5))
        longitude = (180.0 + 1e-3 * np.cos(angle) + 180.0) % 360.0 - 180.0
        (shape,) = simple_parts(shapely.Polygon(np.column_stack((longitude, 50.0 + 1e-3 * np.sin(angle)))), fields, [])
        assert np.ptp(shapely.get_coordinates(shape)[:, 0]) < 0.003


def test_an_outline_round_a_pole_is_refused() -> None:
    fields = Fields(where="test", values={}, error=ObstacleFileError)
    with pytest.raises(ObstacleFileError, match="goes round a pole"):
        simple_parts(shapely.Polygon([(-120.0, 89.0), (0.0, 89.0), (120.0, 89.0)]), fields, [])


def test_beside_the_pole() -> None:
    a, b = Position(latitude_deg=89.9, longitude_deg=10.0), Position(latitude_deg=89.9, longitude_deg=170.0)
    path = GeodesicPath.between(a, b)
    latitude, longitude = path.positions(np.array([0.4 * path.length_m]))
    shape = shapely.Point((longitude[0] + 180.0) % 360.0 - 180.0, latitude[0])
    ((start, stop),) = spans([obstacle(shape, radius_m=20.0)], a, b)
    assert (start, stop) == pytest.approx((0.4 * path.length_m - 20.0, 0.4 * path.length_m + 20.0), abs=0.05)


def test_many_obstacles_and_a_large_one_are_quick_to_search() -> None:
    rng = np.random.default_rng(3)
    places = np.array([(at(x, y).longitude_deg, at(x, y).latitude_deg) for x, y in rng.uniform(0, 30_000, (3000, 2))])
    angles = np.linspace(0.0, 2.0 * np.pi, 20_000, endpoint=False)
    wood = shapely.Polygon(places[0] + 0.05 * np.column_stack((np.cos(angles), np.sin(angles))))
    index = ObstacleIndex([obstacle(shapely.Point(place), radius_m=90.0) for place in places] + [obstacle(wood)])
    path = GeodesicPath.between(at(0.0, 3000.0), at(30_000.0, 28_000.0))
    along, across = along_across(path, places[:, 1], places[:, 0])
    near = (np.abs(across) < 90.0) & (along > 0.0) & (along < path.length_m)
    crossed = [crossing for crossing in index.crossings(path) if crossing.obstacle.radius_m]
    assert len(crossed) == int(near.sum()) > 10


def test_a_thin_obstacle_between_two_samples_is_not_missed(tmp_path: Path) -> None:
    ground = raster(tmp_path / "ground.tif", 20.0)
    rng = np.random.default_rng(5)
    rows = ["latitude_deg,longitude_deg,radius_m,height_m,name"]
    a, b = at(500.0, 1500.0), at(5500.0, 1500.0)
    path = GeodesicPath.between(a, b)
    distances = np.sort(rng.uniform(10.0, path.length_m - 10.0, 25))
    latitude, longitude = path.positions(distances)
    rows += [f"{la:.9f},{lo:.9f},0.05,30,mast {i}" for i, (la, lo) in enumerate(zip(latitude, longitude, strict=True))]
    file = tmp_path / "masts.csv"
    file.write_text("\n".join(rows), encoding="utf-8")
    with Terrain.open(ground=ground, obstacles=file) as terrain:
        profile = terrain.profile(a=a, b=b, step_m=250.0)
    assert [thing.name for thing in profile.obstacles] == [f"mast {i}" for i in range(25)]
    for number, distance in enumerate(distances):
        inside = profile.obstacle_index == number
        assert profile.surface_m[inside].max() == pytest.approx(50.0)
        assert np.abs(profile.distance_m[inside] - distance).max() < 0.06
        beside = np.abs(profile.distance_m - distance)
        assert ((beside > 0.05) & (beside < 0.1) & (profile.cover_m == 0.0)).sum() >= 2  # the step shows


def test_a_long_edge_is_straight_in_longitude_and_latitude() -> None:
    """A line along the parallel of 36.05 N, 20 degrees long, is met where the path has that latitude."""
    a, b = Position(latitude_deg=36.0, longitude_deg=-45.3), Position(latitude_deg=36.1, longitude_deg=-45.1)
    path = GeodesicPath.between(a, b)
    distance = np.linspace(0.0, path.length_m, 200_001)
    expected = np.interp(36.05, path.positions(distance)[0], distance)
    line = shapely.LineString([(-55.0, 36.05), (-35.0, 36.05)])
    ((start, stop),) = spans([obstacle(line, width_m=1.0, rule="follow")], a, b)
    assert 0.5 * (start + stop) == pytest.approx(expected, abs=0.1)
