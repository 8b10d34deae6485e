"""Geodesics against published inverse-problem values and against PROJ itself."""

import math

import numpy as np
import pyproj
import pytest

from fellspan.geodesy.geodesic import GeodesicPath, destination, inverse, inverse_many
from fellspan.geodesy.position import Position


def at(latitude_deg: float, longitude_deg: float) -> Position:
    return Position(latitude_deg=latitude_deg, longitude_deg=longitude_deg)


# C. F. F. Karney's random test lines for WGS 84, as published with GeographicLib 2.1 (test_geodesic.py, testcases):
# latitude, longitude, azimuth at A; latitude, longitude, azimuth at B; distance m
KARNEY_LINES = [
    (35.60777, -139.44815, 111.098748429560326, -11.17491, -69.95921, 129.289270889708762, 8935244.5604818305),
    (55.52454, 106.05087, 22.020059880982801, 77.03196, 197.18234, 109.112041110671519, 4105086.1713924406),
    (-21.97856, 142.59065, -32.44456876433189, 41.84138, 98.56635, -41.84359951440466, 8394328.894657671),
    (-66.99028, 112.2363, 173.73491240878403, -12.70631, 285.90344, 2.512956620913668, 11150344.2312080241),
    (-17.42761, 173.34268, -159.033557661192928, -15.84784, 5.93557, -20.787484651536988, 16076603.1631180673),
    (32.84994, 48.28919, 150.492927788121982, -56.28556, 202.29132, 48.113449399816759, 16727068.9438164461),
    (-68.82867, -74.28391, 93.774347763114881, -50.63005, -8.36685, 34.65564085411343, 3956936.926063544),
    (-19.79938, -174.47484, 71.167275780171533, -11.99349, -154.35109, 65.589099775199228, 2319004.8601169389),
    (-87.85331, 85.66836, -65.120313040242748, 66.48646, 16.09921, -4.888658719272296, 17286615.3147144645),
    (-41.22777, 122.32875, 14.285113402275739, -7.57291, 130.37946, 10.805303085187369, 3812686.035106021),
]


@pytest.mark.parametrize("line", KARNEY_LINES)
def test_inverse_gives_karneys_lines(line: tuple[float, ...]) -> None:
    lat_a, lon_a, azimuth_a, lat_b, lon_b, azimuth_b, distance_m = line
    got = inverse(at(lat_a, lon_a), at(lat_b, lon_b))
    # published to 1e-10 m and 1e-15 degree; 1e-6 m and 1e-10 degree leave room for another compiler
    assert got.distance_m == pytest.approx(distance_m, abs=1e-6)
    assert got.bearing_ab_deg == pytest.approx(azimuth_a % 360.0, abs=1e-10)
    assert got.bearing_ba_deg == pytest.approx((azimuth_b + 180.0) % 360.0, abs=1e-10)


@pytest.mark.parametrize("line", KARNEY_LINES)
def test_destination_and_path_reach_karneys_far_end(line: tuple[float, ...]) -> None:
    lat_a, lon_a, azimuth_a, lat_b, lon_b, _, distance_m = line
    end = destination(at(lat_a, lon_a), azimuth_a, distance_m)
    assert inverse(end, at(lat_b, lon_b)).distance_m < 1e-6
    latitude, longitude = GeodesicPath.between(at(lat_a, lon_a), at(lat_b, lon_b)).positions(distance_m)
    assert float(latitude) == pytest.approx(lat_b, abs=1e-10)
    assert (float(longitude) - lon_b) % 360.0 == pytest.approx(0.0, abs=1e-10) or (
        float(longitude) - lon_b
    ) % 360.0 == pytest.approx(360.0, abs=1e-10)


# GeographicLib 2.1, test_geodesic.py: GeodSolve0, 4, 6, 9, 10, 11, 29, 33; distances as rounded there
@pytest.mark.parametrize(
    ("a", "b", "distance_m", "tolerance_m"),
    [
        ((40.6, -73.8), (49.01666667, 2.55), 5853226.0, 0.5),
        ((36.493349428792, 0.0), (36.49334942879201, 0.0000008), 0.072, 0.5e-3),
        ((88.202499451857, 0.0), (-88.202499451857, 179.981022032992859592), 20003898.214, 0.5e-3),
        ((56.320923501171, 0.0), (-56.320923501171, 179.664747671772880215), 19993558.287, 0.5e-3),
        ((52.784459512564, 0.0), (-52.784459512563990912, 179.634407464943777557), 19991596.095, 0.5e-3),
        ((48.522876735459, 0.0), (-48.52287673545898293, 179.599720456223079643), 19989144.774, 0.5e-3),
        ((0.0, 179.0), (0.0, -179.0), 222639.0, 0.5),
        ((0.0, 0.0), (0.0, 179.0), 19926189.0, 0.5),
    ],
)
def test_published_hard_cases(
    a: tuple[float, float], b: tuple[float, float], distance_m: float, tolerance_m: float
) -> None:
    assert inverse(at(*a), at(*b)).distance_m == pytest.approx(distance_m, abs=tolerance_m)
    assert inverse(at(*b), at(*a)).distance_m == pytest.approx(distance_m, abs=tolerance_m)


def test_quarter_meridian() -> None:
    # length of the WGS 84 meridian quadrant, 10 001 965.729 m (from memory; NIMA TR8350.2 gives the same series)
    assert inverse(at(0.0, 10.0), at(90.0, 10.0)).distance_m == pytest.approx(10001965.729, abs=1e-3)


def test_path_points_follow_proj() -> None:
    geod = pyproj.Geod(ellps="WGS84")
    rng = np.random.default_rng(20)
    for length_m in (30.0, 5e3, 57e3, 2e5, 2e6, 1.2e7):
        for _ in range(10):
            a = at(float(np.degrees(np.arcsin(rng.uniform(-1, 1)))), float(rng.uniform(-180, 180)))
            path = GeodesicPath.towards(a, float(rng.uniform(0, 360)), length_m)
            distance_m = rng.uniform(0.0, length_m, 200)
            latitude, longitude = path.positions(distance_m)
            lon, lat, _ = geod.fwd(
                np.full(200, a.longitude_deg),
                np.full(200, a.latitude_deg),
                np.full(200, path.bearing_ab_deg),
                distance_m,
            )
            assert inverse_many(latitude, longitude, lat, lon).distance_m.max() < 2e-6  # contract: 1 mm


def test_distance_follows_proj_on_random_pairs() -> None:
    rng = np.random.default_rng(21)
    lat_a, lat_b = rng.uniform(-90, 90, (2, 500))
    lon_a, lon_b = rng.uniform(-180, 180, (2, 500))
    got = inverse_many(lat_a, lon_a, lat_b, lon_b)
    for i in range(0, 500, 50):
        ab, ba, distance_m = pyproj.Geod(ellps="WGS84").inv(lon_a[i], lat_a[i], lon_b[i], lat_b[i])
        assert got.distance_m[i] == pytest.approx(distance_m, abs=1e-8)
        assert math.isclose(got.bearing_ab_deg[i], ab % 360.0, abs_tol=1e-10)
        assert math.isclose(got.bearing_ba_deg[i], ba % 360.0, abs_tol=1e-10)
