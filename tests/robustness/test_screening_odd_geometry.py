"""Odd places on odd rasters: whatever hypothesis thinks of, a batch answers as planning does and never ends the run."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import rasterio
from affine import Affine
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from made_screening import assert_as_planned, candidates, every_pair, hills, one_by_one
from pyproj import Transformer

from fellspan.screening.pairs import SiteColumns
from fellspan.screening.screen import screen_pairs
from fellspan.terrain.terrain import Terrain

SIZE = (120, 160)


def odd_raster(folder: Path, kind: str) -> tuple[Path, Affine, str]:
    """Rotated, of oblong cells, in degrees across the antimeridian, or in feet far north."""
    placing = {
        "rotated": (
            Affine.translation(474_000, 3_997_000) @ Affine.rotation(-30.0) @ Affine.scale(10.0, -10.0),
            "EPSG:32623",
        ),
        "oblong": (Affine(25.0, 0.0, 474_000, 0.0, -6.0, 3_997_000), "EPSG:32623"),
        "antimeridian": (Affine(1e-4, 0.0, 179.992, 0.0, -1e-4, -16.0), "EPSG:4326"),
        "far north": (Affine(12.0, 0.0, 400_000, 0.0, -12.0, 8_900_000), "EPSG:32633"),
    }
    transform, crs = placing[kind]
    file = folder / f"{kind.replace(' ', '_')}.tif"
    if not file.exists():
        ground = hills(SIZE, seed=3, height_m=20.0).astype(np.float32)
        ground[60:64, 80:90] = -9999.0
        profile = {"driver": "GTiff", "height": SIZE[0], "width": SIZE[1], "count": 1, "dtype": "float32", "crs": crs}
        with rasterio.open(file, "w", **profile, transform=transform, nodata=-9999.0) as out:
            out.write(ground, 1)
    return file, transform, crs


@pytest.mark.slow
@pytest.mark.parametrize("kind", ["rotated", "oblong", "antimeridian", "far north"])
@settings(max_examples=4, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture], derandomize=True)
@given(
    spots=st.lists(
        st.tuples(st.floats(-4.0, SIZE[1] + 4.0), st.floats(-4.0, SIZE[0] + 4.0), st.floats(0.0, 60.0)),
        min_size=3,
        max_size=5,
    )
)
def test_batches_answer_as_planning_does(tmp_path: Path, kind: str, spots: list[tuple[float, float, float]]) -> None:
    file, transform, crs = odd_raster(tmp_path, kind)
    column, row, height = np.array(spots).T
    # Not along the very edge: there a micrometre decides whether a path lies on the raster.
    column, row = column + 0.013 + 0.002 * np.arange(column.size), row + 0.017 - 0.003 * np.arange(row.size)
    x, y = (
        transform.a * column + transform.b * row + transform.c,
        transform.d * column + transform.e * row + transform.f,
    )
    longitude, latitude = Transformer.from_crs(crs, "EPSG:4326", always_xy=True).transform(x, y)
    longitude = (np.asarray(longitude) + 180.0) % 360.0 - 180.0

    def some(which: slice, letter: str) -> SiteColumns:
        count = height[which].size
        return SiteColumns(
            name=tuple(f"{letter}{number}" for number in range(count)),
            latitude_deg=np.asarray(latitude)[which],
            longitude_deg=longitude[which],
            height_m=height[which],
            height_reference=np.zeros(count, dtype=np.int8),
            roof_m=np.full(count, np.nan),
        )

    made = candidates(some(slice(0, 1), "H"), some(slice(1, None), "P"))
    hub, place = every_pair(made)
    with Terrain.open(ground=file) as terrain:
        found = screen_pairs(made, hub=hub, place=place, terrain=terrain)
        planned = one_by_one(made, hub, place, terrain)
    apart = found.status != 2  # planning refuses what stands at one place, in words of its own
    np.testing.assert_array_equal(planned.status[~apart], 3)
    if apart.all():
        assert_as_planned(found, planned)


def test_a_path_along_the_very_edge_does_not_end_the_run(tmp_path: Path) -> None:
    file, transform, crs = odd_raster(tmp_path, "oblong")
    x, y = np.full(3, transform.c), transform.f + transform.e * np.array([0.0, 79.5, 100.0])
    longitude, latitude = Transformer.from_crs(crs, "EPSG:4326", always_xy=True).transform(x, y)
    sites = SiteColumns(
        name=("H0", "P0", "P1"),
        latitude_deg=np.asarray(latitude),
        longitude_deg=np.asarray(longitude),
        height_m=np.full(3, 48.0),
        height_reference=np.zeros(3, dtype=np.int8),
        roof_m=np.full(3, np.nan),
    )
    made = candidates(sites, sites)
    made = candidates(sites, sites, sectors=tuple(replace(one, hub=0) for one in made.sectors[:1]))
    with Terrain.open(ground=file) as terrain:
        found = screen_pairs(made, hub=np.zeros(2, dtype=np.int64), place=np.array([1, 2]), terrain=terrain)
    assert set(found.status.tolist()) <= {0, 1}


@pytest.mark.parametrize(
    "crs", ["EPSG:32623", "EPSG:3035", "+proj=ortho +lat_0=36 +lon_0=-45", "+proj=stere +lat_0=90"]
)
def test_positions_that_no_projection_reaches_are_the_status_of_their_pairs(tmp_path: Path, crs: str) -> None:
    x, y = Transformer.from_crs("EPSG:4326", crs, always_xy=True).transform(-45.2, 36.05)
    profile = {"driver": "GTiff", "height": SIZE[0], "width": SIZE[1], "count": 1, "dtype": "float32", "crs": crs}
    with rasterio.open(
        tmp_path / "one.tif", "w", **profile, transform=Affine(200.0, 0.0, x - 16_000.0, 0.0, -200.0, y + 12_000.0)
    ) as out:
        out.write(hills(SIZE, seed=3, height_m=20.0).astype(np.float32), 1)
    latitude = np.array([36.05, 36.051, -45.2, 36.05, -36.05, 89.99, -89.99, 36.05, 3.0])
    longitude = np.array([-45.2, -45.199, 36.0464, 45.19, 134.8, 0.0, 0.0, 44.8, -45.2])
    count = latitude.size
    sites = SiteColumns(
        name=tuple(f"S{i}" for i in range(count)),
        latitude_deg=latitude,
        longitude_deg=longitude,
        height_m=np.full(count, 60.0),
        height_reference=np.zeros(count, dtype=np.int8),
        roof_m=np.full(count, np.nan),
    )
    made = candidates(sites, sites)
    made = candidates(sites, sites, sectors=tuple(replace(made.sectors[0], hub=i) for i in range(count)))
    with Terrain.open(ground=tmp_path / "one.tif") as terrain:
        found = screen_pairs(
            made, hub=np.array([0] * (count - 1) + [2]), place=np.arange(1, count + 1) % count, terrain=terrain
        )
    assert found.status.tolist()[0] == 0
    assert set(found.status.tolist()[1:]) <= {1, 3}
