"""The skyline over the sample's ground against a walk of one's own: raster read whole, geodesics of pyproj, a round Earth.

Shares no code with the skyline, nor with the made land of the other test.
"""

from pathlib import Path

import numpy as np
import pytest
import rasterio
from pyproj import Geod, Transformer

from fellspan.links.skyline import skyline
from fellspan.study.reading import load_study
from fellspan.terrain.fan import Fan
from fellspan.terrain.terrain import Terrain

SAMPLE = Path(__file__).resolve().parents[2] / "sample_terrain"
STUDY = load_study(SAMPLE / "tolmera.toml")
K = 4.0 / 3.0
RADIUS_M = K * 6_371_000.0  # Rec. ITU-R P.452: mean radius of the Earth 6371 km


@pytest.mark.parametrize(
    ("site", "bearing_deg"), [("Town Hall", 300.0), ("Harbour Office", 255.0), ("South Light", 60.0)]
)
def test_angles_over_the_sample_equal_a_walk_of_ones_own_at_20_bearings(site: str, bearing_deg: float) -> None:
    with rasterio.open(SAMPLE / "tolmera_ground.tif") as file:
        heights = file.read(1) * file.scales[0] + file.offsets[0]
        to_grid = Transformer.from_crs("EPSG:4326", "EPSG:32623", always_xy=True)
        west, north, cell = file.transform.c, file.transform.f, file.transform.a

    def ground(longitude: np.ndarray, latitude: np.ndarray) -> np.ndarray:
        """Between the centres of cells by hand; the sea where the raster ends."""
        x, y = to_grid.transform(longitude, latitude)
        column, row = (np.asarray(x) - west) / cell - 0.5, (north - np.asarray(y)) / cell - 0.5
        c, r = np.floor(column).astype(int), np.floor(row).astype(int)
        good = (c >= 0) & (r >= 0) & (c < heights.shape[1] - 1) & (r < heights.shape[0] - 1)
        c, r = np.where(good, c, 0), np.where(good, r, 0)
        u, v = column - c, row - r
        upper = heights[r, c] * (1 - u) + heights[r, c + 1] * u
        lower = heights[r + 1, c] * (1 - u) + heights[r + 1, c + 1] * u
        return np.where(good, upper * (1 - v) + lower * v, 0.0)

    place = next(end for link in STUDY.links for end in (link.a, link.b) if end.name == site).position
    antenna_m = float(ground(np.array([place.longitude_deg]), np.array([place.latitude_deg]))[0]) + 12.0
    with Terrain.open(ground=STUDY.terrain.ground, gaps="sea") as terrain:
        seen = skyline(Fan(terrain, place), antenna_amsl_m=antenna_m, bearing_deg=bearing_deg, k=K)
    chosen = np.linspace(0, seen.offset_deg.size - 1, 20).astype(int)
    distance = np.arange(0.5, 15_000.0, 0.5)
    wanted = []
    for offset in seen.offset_deg[chosen]:
        longitude, latitude, _ = Geod(ellps="WGS84").fwd(
            np.full(distance.shape, place.longitude_deg),
            np.full(distance.shape, place.latitude_deg),
            np.full(distance.shape, bearing_deg + offset),
            distance,
        )
        turn, level = distance / RADIUS_M, RADIUS_M + ground(longitude, latitude)
        up = level * np.cos(turn) - (RADIUS_M + antenna_m)
        wanted.append(float(np.degrees(np.arctan2(up, level * np.sin(turn))).max()))
    assert np.ptp(wanted) > 0.5  # a flat line would prove nothing
    np.testing.assert_allclose(seen.elevation_deg[chosen], wanted, atol=0.01, rtol=0.0)
