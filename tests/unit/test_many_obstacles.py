"""Crossings and what stands beside paths: for many paths at once as for each of them alone, all over the Earth."""

import numpy as np
import pytest
import shapely

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.position import Position
from fellspan.terrain.alongpath import nodes_for
from fellspan.terrain.beside import BESIDE_M, beside, passed_by, tops_m
from fellspan.terrain.many_obstacles import ManyObstacles, Starts, Touched
from fellspan.terrain.obstacles import Obstacle, ObstacleIndex, crossings_of

CENTRES = {"mid-latitudes": (36.05, -45.2), "antimeridian": (-17.0, 180.0), "far north": (83.0, 20.0)}


def scene(place: str, *, seed: int) -> tuple[list[Obstacle], list[GeodesicPath]]:
    """Shapes of every kind within some kilometres of a place, and paths among them."""
    random = np.random.default_rng(seed)
    latitude, longitude = CENTRES[place]
    degree = 1.0 / 111_000.0
    east = degree / np.cos(np.radians(latitude))

    def near(reach_m: float, count: int) -> np.ndarray:
        away = random.uniform(-reach_m, reach_m, (count, 2))
        return np.column_stack((longitude + away[:, 0] * east, latitude + away[:, 1] * degree))

    def named(number: int, shape: object, **options: object) -> Obstacle:
        given = {
            "name": f"thing {number}",
            "kind": "other",
            "rule": "level",
            "source": "test",
            "height_m": 9.0,
        } | options
        return Obstacle(shape=shape, **given)  # type: ignore[arg-type]

    obstacles: list[Obstacle] = []
    for number, spot in enumerate(near(4000.0, 90).tolist()):
        angle = np.sort(random.uniform(0.0, 2.0 * np.pi, 7))
        size = random.uniform(10.0, 400.0, 7)
        ring = np.column_stack((spot[0] + size * np.cos(angle) * east, spot[1] + size * np.sin(angle) * degree))
        if number % 3 == 0:
            obstacles.append(named(number, shapely.Polygon(ring)))
        elif number % 3 == 1:
            obstacles.append(named(number, shapely.Point(*spot), radius_m=float(size[0])))
        else:
            line = shapely.LineString(np.vstack((spot, ring[0], ring[3])))
            obstacles.append(named(number, line, width_m=5.0, rule="span", sag_m=2.0))
    corners = near(0.0, 1)[0] + np.column_stack(
        (
            2500.0 * east * np.cos(np.linspace(0.0, 2.0 * np.pi, 200)),
            2500.0 * degree * np.sin(np.linspace(0.0, 2.0 * np.pi, 200)),
        )
    )
    hole = near(0.0, 1)[0] + 0.6 * (corners - near(0.0, 1)[0])
    obstacles.append(named(900, shapely.Polygon(corners, [hole]), kind="tree"))
    paths = []
    for a, b in zip(near(6000.0, 40).tolist(), near(6000.0, 40).tolist(), strict=True):
        ends = (Position(latitude_deg=spot[1], longitude_deg=(spot[0] + 180.0) % 360.0 - 180.0) for spot in (a, b))
        paths.append(GeodesicPath.between(*ends))
    return obstacles, paths


def starts_of(paths: list[GeodesicPath]) -> Starts:
    return Starts(
        latitude_deg=np.array([path.a.latitude_deg for path in paths]),
        longitude_deg=np.array([path.a.longitude_deg for path in paths]),
        bearing_deg=np.array([path.bearing_ab_deg for path in paths]),
        length_m=np.array([path.length_m for path in paths]),
    )


def touched_by(index: ManyObstacles, paths: list[GeodesicPath], *, within_m: float) -> Touched:
    nodes = nodes_for(max(path.length_m for path in paths))
    places = [path.positions(np.linspace(0.0, path.length_m, nodes)) for path in paths]
    latitude, longitude = np.array([place[0] for place in places]), np.array([place[1] for place in places])
    found = index.touching(longitude, latitude, within_m=within_m)
    return index.laid(starts_of(paths), *found)


@pytest.mark.parametrize("place", sorted(CENTRES))
def test_crossings_of_many_paths_are_those_of_each(place: str) -> None:
    obstacles, paths = scene(place, seed=1)
    index, one = ManyObstacles(obstacles), ObstacleIndex(obstacles)
    found = index.crossed(touched_by(index, paths, within_m=4.0), starts_of(paths))
    count = 0
    for number, path in enumerate(paths):
        alone = one.crossings(path)
        count += len(alone)
        assert [crossing.obstacle.name for crossing in found.get(number, [])] == [item.obstacle.name for item in alone]
        for crossing, item in zip(found.get(number, []), alone, strict=True):
            assert crossing.from_m == pytest.approx(item.from_m, abs=1e-6)
            assert crossing.to_m == pytest.approx(item.to_m, abs=1e-6)
            assert crossing.nearest_m == pytest.approx(item.nearest_m, abs=1e-6)
            assert (crossing.supports is None) == (item.supports is None)
            if crossing.supports is not None and item.supports is not None:
                np.testing.assert_allclose(crossing.supports, item.supports, atol=1e-6)
    assert count > 100


@pytest.mark.parametrize("place", sorted(CENTRES))
def test_what_stands_beside_many_paths_is_what_stands_beside_each(place: str) -> None:
    obstacles, paths = scene(place, seed=2)
    index, one = ManyObstacles(obstacles), ObstacleIndex(obstacles)
    starts = starts_of(paths)
    touched = touched_by(index, paths, within_m=BESIDE_M)

    def ground_at(latitude: object, longitude: object) -> np.ndarray:
        return 40.0 * np.sin(3000.0 * np.asarray(latitude)) + np.cos(2000.0 * np.radians(np.asarray(longitude)))

    passed = passed_by(touched, index.obstacles, index.crossed(touched, starts), starts.length_m)
    tops = tops_m(passed, starts, ground_at=ground_at, growth_years=0.0)
    every = {
        (item.path, item.obstacle.name): (item.along_m, item.offset_m, top)
        for item, top in zip(passed, tops, strict=True)
    }
    count = 0
    for number, path in enumerate(paths):
        near = one.near(path)
        alone = beside(near, crossings_of(near, path), path, ground_at=ground_at, growth_years=0.0)
        assert {name for which, name in every if which == number} == {item.name for item in alone}
        for item in alone:
            assert every[number, item.name] == pytest.approx((item.at_m, item.offset_m, item.top_amsl_m), abs=1e-4)
        count += len(alone)
    assert count > 20


def test_only_those_deep_enough_in_the_zone_where_so_much_is_asked() -> None:
    obstacles, paths = scene("mid-latitudes", seed=3)
    index, starts = ManyObstacles(obstacles), starts_of(paths)
    touched = touched_by(index, paths, within_m=BESIDE_M)
    crossed = index.crossed(touched, starts)
    every = passed_by(touched, index.obstacles, crossed, starts.length_m)
    few = passed_by(touched, index.obstacles, crossed, starts.length_m, most_share=0.4)
    assert [(item.path, item.share) for item in few] == [(item.path, item.share) for item in every if item.share < 0.4]
    assert 0 < len(few) < len(every)
