"""Geodesic paths: the antimeridian, the poles, identical points, continuity, and what is refused."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fellspan.geodesy.geodesic import GeodesicPath, destination, inverse, inverse_many, normalized_bearing_deg
from fellspan.geodesy.position import Position


def at(latitude_deg: float, longitude_deg: float) -> Position:
    return Position(latitude_deg=latitude_deg, longitude_deg=longitude_deg)


latitudes = st.floats(-90.0, 90.0)
longitudes = st.floats(-180.0, 179.999999)


def test_identical_points_have_no_length_and_no_bearing() -> None:
    for place in (at(36.0, -45.2), at(90.0, 0.0), at(-12.0, -180.0)):
        line = inverse(place, place)
        assert (line.distance_m, line.bearing_ab_deg, line.bearing_ba_deg) == (0.0, 0.0, 0.0)
        latitude, longitude = GeodesicPath.between(place, place).positions([0.0, 0.0])
        assert latitude == pytest.approx([place.latitude_deg] * 2, abs=1e-12)
        assert longitude == pytest.approx([place.longitude_deg] * 2, abs=1e-9)


def test_the_same_meridian_written_twice_is_one_point() -> None:
    assert inverse(at(10.0, 180.0), at(10.0, -180.0)).distance_m == 0.0


def test_bearing_at_b_looks_back_to_a() -> None:
    line = inverse(at(36.0, -45.2), at(37.0, -45.2))
    assert line.bearing_ab_deg == pytest.approx(0.0, abs=1e-12)
    assert line.bearing_ba_deg == pytest.approx(180.0, abs=1e-12)
    there = inverse(at(36.0, -45.2), at(36.3, -44.9))
    back = inverse(at(36.3, -44.9), at(36.0, -45.2))
    assert (there.bearing_ba_deg, there.bearing_ab_deg) == pytest.approx((back.bearing_ab_deg, back.bearing_ba_deg))


@pytest.mark.parametrize("east", [True, False])
def test_paths_over_the_antimeridian_run_on(east: bool) -> None:
    ends = at(10.0, 179.9), at(10.2, -179.9)
    path = GeodesicPath.between(*(ends if east else ends[::-1]))
    assert path.length_m < 32e3
    latitude, longitude = path.positions(np.linspace(0.0, path.length_m, 101))
    steps = np.diff(longitude)
    assert (steps > 0.0).all() if east else (steps < 0.0).all()
    assert longitude[-1] == pytest.approx(180.1 if east else -180.1, abs=1e-9)
    assert latitude[[0, -1]] == pytest.approx([10.0, 10.2] if east else [10.2, 10.0], abs=1e-10)


def test_path_past_the_pole_keeps_turning_one_way() -> None:
    path = GeodesicPath.between(at(89.99, 10.0), at(89.98, -175.0))
    distance_m = np.linspace(0.0, path.length_m, 1001)
    latitude, longitude = path.positions(distance_m)
    exact_latitude, exact_longitude = path.positions(distance_m, exact=True)
    assert inverse_many(latitude, longitude, exact_latitude, exact_longitude).distance_m.max() < 1e-6
    assert np.abs(np.diff(longitude)).max() < 10.0
    assert np.sign(np.diff(longitude)).tolist() in ([1.0] * 1000, [-1.0] * 1000)
    assert latitude.max() > 89.998


def test_path_over_the_pole_itself() -> None:
    path = GeodesicPath.between(at(80.0, 10.0), at(80.0, -170.0))
    latitude, longitude = path.positions([0.0, path.length_m / 4, path.length_m / 2, path.length_m])
    assert latitude == pytest.approx([80.0, 85.0, 90.0, 80.0], abs=0.01)
    assert longitude[[0, 1, 3]] == pytest.approx([10.0, 10.0, 190.0], abs=1e-9)


def test_path_a_hair_west_of_the_pole_turns_west() -> None:
    path = GeodesicPath.towards(at(46.15, -70.85), 359.999999999999, 1.99e7)
    _, longitude = path.positions(np.linspace(0.0, path.length_m, 2001))
    assert longitude.min() == pytest.approx(-250.85, abs=1e-6)
    assert longitude.max() == pytest.approx(-70.85, abs=1e-6)


def test_longitude_at_the_pole_end_is_the_exact_one() -> None:
    path = GeodesicPath.between(at(90.0, 0.0), at(14.0, 2.0))
    distance_m = np.linspace(0.0, path.length_m, 41)
    assert path.positions(distance_m)[1] == pytest.approx(path.positions(distance_m, exact=True)[1], abs=1e-9)


def test_path_from_the_pole() -> None:
    path = GeodesicPath.between(at(90.0, 0.0), at(89.9, 40.0))
    latitude, longitude = path.positions([path.length_m / 2, path.length_m])
    assert latitude == pytest.approx([89.95, 89.9], abs=1e-6)
    assert longitude == pytest.approx([40.0, 40.0], abs=1e-9)


@settings(max_examples=150, deadline=None, derandomize=True)
@given(latitudes, longitudes, latitudes, longitudes)
def test_series_stays_within_a_millimetre(lat_a: float, lon_a: float, lat_b: float, lon_b: float) -> None:
    path = GeodesicPath.between(at(lat_a, lon_a), at(lat_b, lon_b))
    distance_m = np.linspace(0.0, path.length_m, 41)
    latitude, longitude = path.positions(distance_m)
    exact_latitude, exact_longitude = path.positions(distance_m, exact=True)
    assert inverse_many(latitude, longitude, exact_latitude, exact_longitude).distance_m.max() < 1e-3
    assert np.all(np.abs(longitude - path.a.longitude_deg) <= 181.0)


@settings(max_examples=100, deadline=None, derandomize=True)
@given(latitudes, longitudes, latitudes, longitudes)
def test_distance_is_the_same_from_either_end(lat_a: float, lon_a: float, lat_b: float, lon_b: float) -> None:
    there, back = inverse(at(lat_a, lon_a), at(lat_b, lon_b)), inverse(at(lat_b, lon_b), at(lat_a, lon_a))
    assert there.distance_m == pytest.approx(back.distance_m, abs=1e-6)
    assert 0.0 <= there.bearing_ab_deg < 360.0
    assert 0.0 <= there.bearing_ba_deg < 360.0


def test_positions_take_any_shape_and_order() -> None:
    path = GeodesicPath.between(at(36.0, -45.2), at(36.3, -44.9))
    distance_m = np.array([[path.length_m, 0.0, 10.0], [20e3, 5.0, 1e3]])
    latitude, longitude = path.positions(distance_m)
    assert latitude.shape == longitude.shape == (2, 3)
    one_by_one = [path.positions(d) for d in distance_m.flat]
    assert latitude.ravel() == pytest.approx([float(p[0]) for p in one_by_one], abs=1e-13)
    assert longitude.ravel() == pytest.approx([float(p[1]) for p in one_by_one], abs=1e-13)
    assert path.positions([])[0].shape == (0,)
    read_only = np.linspace(0.0, 100.0, 5)
    read_only.flags.writeable = False
    assert path.positions(read_only)[0].shape == path.positions(read_only, exact=True)[0].shape == (5,)


@pytest.mark.parametrize("bad", [-1.0, 1e9, np.nan, np.inf])
def test_distances_off_the_path_are_refused(bad: float) -> None:
    path = GeodesicPath.between(at(36.0, -45.2), at(36.3, -44.9))
    with pytest.raises(ValueError, match="path runs from 0"):
        path.positions([0.0, bad])


def test_towards_agrees_with_between() -> None:
    path = GeodesicPath.towards(at(36.0, -45.2), -30.0, 12_345.0)
    other = GeodesicPath.between(path.a, path.b)
    assert path.bearing_ab_deg == 330.0
    assert other.length_m == pytest.approx(12_345.0, abs=1e-7)
    assert other.bearing_ba_deg == pytest.approx(path.bearing_ba_deg, abs=1e-8)
    assert destination(path.a, 330.0, 12_345.0) == path.b
    with pytest.raises(ValueError, match="length_m"):
        GeodesicPath.towards(path.a, 0.0, 3e7)


def test_inverse_many_broadcasts_and_passes_nan_on() -> None:
    got = inverse_many([[36.0], [np.nan]], -45.2, 36.5, [-45.0, -45.1, -45.2])
    assert got.distance_m.shape == got.bearing_ab_deg.shape == (2, 3)
    assert np.isnan(got.distance_m[1]).all()
    assert np.isnan(got.bearing_ba_deg[1]).all()
    assert got.distance_m[0, 2] == inverse(at(36.0, -45.2), at(36.5, -45.2)).distance_m


def test_bearings_never_read_360() -> None:
    assert normalized_bearing_deg([-1e-15, 360.0, 720.5, -90.0]).tolist() == [0.0, 0.0, 0.5, 270.0]


def test_paths_are_values() -> None:
    one, two = (GeodesicPath.between(at(36.0, -45.2), at(36.3, -44.9)) for _ in range(2))
    assert one == two
    assert hash(one) == hash(two)
