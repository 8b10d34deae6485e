"""Fresnel clearance for every one of 4000 x 4000 cells against GDAL's viewshed, which asks for sight only, in the same run.

Both read the same raster of 64 MB; ours keeps two threads busy, GDAL's one. Machine code is made, or loaded, before the clock
starts. Absolute figures are printed (pytest -s).
"""

import subprocess
import time
from pathlib import Path

import numpy as np
import pytest
from gdal_viewshed import OTHER_M, SITE_M, VIEWSHED, compared, swept, viewshed
from made_relief import SOUTH_M, WEST_M, relief_m, write_relief

from fellspan.design import sweep as sweeping
from fellspan.geodesy.position import Position
from fellspan.geodesy.transforms import transformer
from fellspan.links.criteria import Criterion
from fellspan.links.site import Site
from fellspan.terrain.plates import in_threads
from fellspan.terrain.rays import rays_around
from fellspan.terrain.surroundings import Surroundings
from fellspan.terrain.terrain import Terrain

pytestmark = [pytest.mark.bench, pytest.mark.skipif(VIEWSHED is None, reason="gdal_viewshed is not installed")]

SIDE, CELL_M, RADIUS_M, K = 4000, 9.5, 19_000.0, 4 / 3
X, Y = WEST_M + (SIDE / 2 + 0.5) * CELL_M, SOUTH_M + (SIDE / 2 + 0.5) * CELL_M
RULE = Criterion(name="0.6 F1", k=K, fraction=0.6, source="common practice")
KERNEL_RATIO, WHOLE_RATIO = 1.0, 2.0
TURNS = 7


@pytest.fixture(scope="module")
def relief(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return write_relief(tmp_path_factory.mktemp("sweep") / "relief.tif", relief_m(SIDE), cell_m=CELL_M)


def seconds(work: object) -> float:
    begun = time.perf_counter()
    assert callable(work)
    work()
    return time.perf_counter() - begun


def test_every_cell_for_the_price_of_a_viewshed(relief: Path, tmp_path: Path) -> None:
    longitude, latitude = transformer("EPSG:32623", "EPSG:4326").transform(X, Y)
    at = Position(latitude_deg=latitude, longitude_deg=longitude)
    site = Site(name="A", position=at, height_m=SITE_M)
    options = ["-q", "-ox", X, "-oy", Y, "-oz", SITE_M, "-tz", OTHER_M, "-md", RADIUS_M, "-cc", 0.75]
    command = [str(VIEWSHED), *map(str, options), str(relief), str(tmp_path / "seen.tif")]
    with Terrain.open(ground=relief) as terrain:

        def whole(radius_m: float = RADIUS_M) -> sweeping.HeightField:
            return sweeping.height_field(terrain, site=site, frequency_hz=5.8e9, criteria=[RULE], radius_m=radius_m)

        whole(300.0)
        antenna = sweeping.site_level_m(terrain, site)
        rays = rays_around(at, reach_m=RADIUS_M, step_m=CELL_M, apart_m=CELL_M)
        around = Surroundings(terrain, rays)
        samples = around.samples(0, 48)
        level = np.empty((48, rays.count), dtype=np.float32)
        rules = sweeping._rules([RULE], 5.8e9)

        def kernel() -> None:
            """All rays, 48 at a time, as the sweep does; the heights of the first stand in for the others'."""

            def work(first: int) -> None:
                part = slice(0, min(48, rays.held - first))
                heights = samples.ground_m[part], samples.surface_m[part], samples.has_cover
                sweeping._sweep(around, *heights, antenna, rules, level[part])

            in_threads(work, range(0, rays.held, 48))

        times: dict[str, list[float]] = {"gdal": [], "kernel": [], "whole": []}
        for _ in range(TURNS):
            times["gdal"].append(seconds(lambda: subprocess.run(command, check=True)))
            times["kernel"].append(seconds(kernel))
            times["whole"].append(seconds(whole))
    best = {name: min(taken) for name, taken in times.items()}
    print(
        f"\n{rays.held} rays of {rays.count}: gdal_viewshed {best['gdal']:.3f} s; kernel {best['kernel']:.3f} s "
        f"({best['kernel'] / best['gdal']:.2f}); whole job {best['whole']:.3f} s ({best['whole'] / best['gdal']:.2f})"
    )
    assert best["kernel"] <= KERNEL_RATIO * best["gdal"]
    assert best["whole"] <= WHOLE_RATIO * best["gdal"]


def test_sixteen_million_cells_see_what_gdal_sees(relief: Path, tmp_path: Path) -> None:
    seen = viewshed(relief, out=tmp_path / "seen.tif", x=X, y=Y, radius_m=RADIUS_M, k=K)
    ours, gdals, both = compared(swept(relief, x=X, y=Y, radius_m=RADIUS_M, k=K), seen, relief, RADIUS_M)
    same = (ours == gdals)[both].mean()
    print(f"\nagreement on {both.sum()} cells: {100 * same:.3f} %; seen {100 * gdals[both].mean():.1f} %")
    assert same >= 0.99
