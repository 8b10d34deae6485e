"""Skylines against a calculation that shares nothing with them: rasters read whole, a fine walk, circles for the Earth."""

import json
import math
from functools import lru_cache
from pathlib import Path

import numpy as np
import pytest
import rasterio
from made_terrain import NORTH, TO_GRID, WEST, at, lonlat, raster
from pyproj import Geod

from fellspan.links.skyline import skyline
from fellspan.terrain.fan import Fan
from fellspan.terrain.sources import CoverSource
from fellspan.terrain.terrain import Terrain

K = 4.0 / 3.0
RADIUS_M = K * 6_371_000.0  # Rec. ITU-R P.452: mean radius of the Earth 6371 km
HERE = (1_000.0, 1_500.0)
ANTENNA_M = 62.0
HOUSE = (2_400.0, 1_460.0, 2_440.0, 1_640.0)  # east and south of two corners, m
HOUSE_M = 60.0


def _land(folder: Path) -> tuple[Path, Path]:
    """Hills with rough faces on 10 m cells, and woods of trees in blocks of 5 m."""
    rng = np.random.default_rng(7)
    row, column = np.mgrid[0:300, 0:600]
    east, south = 10.0 * column, 10.0 * row
    hills = sum(
        top * np.exp(-(((east - x) / wide) ** 2) - ((south - y) / wide) ** 2)
        for x, y, top, wide in (
            (3000, 1400, 60, 300),
            (4200, 900, 120, 500),
            (5200, 2100, 95, 350),
            (2000, 2000, 25, 150),
        )
    )
    ground = raster(folder / "ground.tif", 30.0 + hills + rng.normal(0.0, 0.6, hills.shape))
    trees = np.zeros((600, 1200))
    for _ in range(40):
        y, x = rng.integers(0, 560), rng.integers(300, 1160)
        trees[y : y + rng.integers(8, 40), x : x + rng.integers(8, 40)] = rng.uniform(6.0, 18.0)
    return ground, raster(folder / "trees.tif", trees, cell_m=5.0)


def _house(folder: Path) -> Path:
    west, north, east, south = HOUSE
    ring = [lonlat(*corner) for corner in ((west, north), (east, north), (east, south), (west, south), (west, north))]
    feature = {
        "type": "Feature",
        "properties": {"name": "granary", "kind": "building", "height_m": HOUSE_M},
        "geometry": {"type": "Polygon", "coordinates": [ring]},
    }
    path = folder / "houses.geojson"
    path.write_text(json.dumps({"type": "FeatureCollection", "features": [feature]}))
    return path


@lru_cache(maxsize=2)
def _read(path: Path) -> np.ndarray:
    with rasterio.open(path) as file:
        return file.read(1).astype(float)


def _bilinear(path: Path, x: np.ndarray, y: np.ndarray, cell_m: float) -> np.ndarray:
    """Between the centres of cells, by hand."""
    data = _read(path)
    column, row = (x - WEST) / cell_m - 0.5, (NORTH - y) / cell_m - 0.5
    c, r = np.floor(column).astype(int), np.floor(row).astype(int)
    good = (c >= 0) & (r >= 0) & (c < data.shape[1] - 1) & (r < data.shape[0] - 1)
    c, r = np.where(good, c, 0), np.where(good, r, 0)
    u, v = column - c, row - r
    value = (
        data[r, c] * (1 - u) * (1 - v)
        + data[r, c + 1] * u * (1 - v)
        + data[r + 1, c] * (1 - u) * v
        + data[r + 1, c + 1] * u * v
    )
    return np.where(good, value, np.nan)


def _angle(distance_m: np.ndarray, height_m: np.ndarray) -> np.ndarray:
    """Elevation on a circle of radius k a, without the short form for small angles."""
    turn = distance_m / RADIUS_M
    across = (RADIUS_M + height_m) * np.sin(turn)
    up = (RADIUS_M + height_m) * np.cos(turn) - (RADIUS_M + ANTENNA_M)
    return np.degrees(np.arctan2(up, across))


def _independent(ground: Path, trees: Path, bearing_deg: float, *, house: bool) -> float:
    start = at(*HERE)
    distance = np.arange(0.1, 4_900.0, 0.1)
    longitude, latitude, _ = Geod(ellps="WGS84").fwd(
        np.full(distance.shape, start.longitude_deg),
        np.full(distance.shape, start.latitude_deg),
        np.full(distance.shape, bearing_deg),
        distance,
    )
    x, y = TO_GRID.transform(longitude, latitude)
    land, cover = _bilinear(ground, x, y, 10.0), _bilinear(trees, x, y, 5.0)
    cover[distance <= 10.0] = 0.0
    top = land + cover
    if house:
        east, south = x - WEST, NORTH - y
        inside = (east >= HOUSE[0]) & (east <= HOUSE[2]) & (south >= HOUSE[1]) & (south <= HOUSE[3])
        if inside.any():
            under = np.flatnonzero(inside)
            # one level top, from the highest ground at its two edges and its middle
            level = land[[under[0], under[len(under) // 2], under[-1]]].max() + HOUSE_M
            top[inside] = np.maximum(top[inside], level)
    lost = np.flatnonzero(np.isnan(top))
    seen = _angle(distance, top)[: lost[0] if lost.size else None]
    return float(seen.max())


@pytest.mark.parametrize("house", [False, True])
def test_angles_equal_an_independent_calculation_at_20_bearings(tmp_path: Path, house: bool) -> None:
    ground, trees = _land(tmp_path)
    houses = _house(tmp_path) if house else None
    with Terrain.open(ground=ground, cover=CoverSource(path=trees, kind="tree"), obstacles=houses) as terrain:
        seen = skyline(Fan(terrain, at(*HERE)), antenna_amsl_m=ANTENNA_M, bearing_deg=92.0, k=K)
    chosen = np.linspace(0, seen.offset_deg.size - 1, 20).astype(int)
    wanted = [_independent(ground, trees, 92.0 + seen.offset_deg[i], house=house) for i in chosen]
    assert np.ptp(wanted) > 0.5  # a flat line would prove nothing
    np.testing.assert_allclose(seen.elevation_deg[chosen], wanted, atol=0.01, rtol=0.0)
    if house:
        assert "granary" in [mark.what for mark in seen.landmarks]


def test_the_horizon_of_open_sea_is_where_geometry_has_it(tmp_path: Path) -> None:
    ground = raster(tmp_path / "sea.tif", 0.0)
    with Terrain.open(ground=ground, gaps="sea") as terrain:
        seen = skyline(Fan(terrain, at(3_000.0, 1_500.0)), antenna_amsl_m=10.0, bearing_deg=0.0, k=K)
    # dip of the horizon, acos(R / (R + h)) (textbook geometry); it lies sqrt(2 R h) = 13.03 km away
    dip = math.degrees(math.acos(RADIUS_M / (RADIUS_M + 10.0)))
    np.testing.assert_allclose(seen.elevation_deg, -dip, atol=0.001)
    np.testing.assert_allclose(seen.distance_m, math.sqrt(2.0 * RADIUS_M * 10.0), rtol=0.05)
    assert seen.landmarks == ()


def test_rasters_that_end_end_the_ray_and_it_is_said(tmp_path: Path) -> None:
    ground = raster(tmp_path / "flat.tif", 5.0)
    with Terrain.open(ground=ground) as terrain:
        seen = skyline(Fan(terrain, at(3_000.0, 1_500.0)), antenna_amsl_m=20.0, bearing_deg=90.0, k=K)
    assert seen.reach_m[seen.offset_deg.size // 2] == pytest.approx(2_995.0, abs=15.0)
    assert any("rasters end before 15 km on 100 % of the rays" in note for note in seen.notes)


def test_the_own_building_is_left_out_and_a_narrow_mast_is_not_missed(tmp_path: Path) -> None:
    ground = raster(tmp_path / "flat.tif", 5.0)
    west, north = 2_990.0, 1_490.0
    ring = [lonlat(west + x, north + y) for x, y in ((0, 0), (20, 0), (20, 20), (0, 20), (0, 0))]
    shapes = [
        ({"name": "own", "kind": "building", "height_m": 30.0}, {"type": "Polygon", "coordinates": [ring]}),
        (
            {"name": "chimney", "kind": "other", "height_m": 40.0, "radius_m": 0.5},
            {"type": "Point", "coordinates": lonlat(4_500.0, 1_503.0)},
        ),
    ]
    features = [{"type": "Feature", "properties": facts, "geometry": shape} for facts, shape in shapes]
    path = tmp_path / "things.geojson"
    path.write_text(json.dumps({"type": "FeatureCollection", "features": features}))
    with Terrain.open(ground=ground, obstacles=path) as terrain:
        seen = skyline(Fan(terrain, at(3_000.0, 1_500.0)), antenna_amsl_m=20.0, bearing_deg=90.0, k=K)
    assert [mark.what for mark in seen.landmarks] == ["chimney"]
    mark = seen.landmarks[0]
    assert mark.distance_m == pytest.approx(1_500.0, abs=3.0)
    assert mark.elevation_deg == pytest.approx(math.degrees(math.atan(25.0 / 1_500.0)), abs=0.01)
