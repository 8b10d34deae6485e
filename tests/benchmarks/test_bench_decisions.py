"""What all decisions on one link cost: a 20 km path over 10 m cells, from the raster file to the survey list."""

import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import rasterio
from rasterio.transform import Affine

from fellspan.design.heights import design_heights
from fellspan.design.heights_result import HeightSettings
from fellspan.design.reflections import Water, find_reflections
from fellspan.design.survey_list import survey_list
from fellspan.geodesy.position import Position
from fellspan.links.assess import AssessSettings, assess_in_full
from fellspan.links.site import Link, Radio, Site
from fellspan.terrain.sources import RasterSource
from fellspan.terrain.terrain import Terrain

CELL_M, WIDE, TALL = 10.0, 2_400, 600
COSTS = HeightSettings(cost_a_per_m=90.0, cost_b_per_m=120.0, cost_per_section=200.0)


def land(folder: Path) -> Path:
    """Hills to both sides of a bay: enough to govern, to be unsure about, and to mirror."""
    rng = np.random.default_rng(7)
    across = np.arange(WIDE) * CELL_M
    hills = 30.0 + np.cumsum(rng.normal(0.0, 0.7, WIDE)) + 12.0 * np.sin(across / 900.0)
    bay = (across > 9_000.0) & (across < 15_000.0)
    ground = np.where(bay, 0.0, np.maximum(hills, 1.0))
    block = ground[None, :] + np.where(bay, 0.0, rng.normal(0.0, 0.3, (TALL, WIDE)))
    path = folder / "bay.tif"
    with rasterio.open(
        path, "w", driver="GTiff", width=WIDE, height=TALL, count=1, dtype="float32", crs="EPSG:32623",
        transform=Affine(CELL_M, 0.0, 480_000.0, 0.0, -CELL_M, 3_993_000.0), tiled=True,
    ) as made:  # fmt: skip
        made.write(block.astype(np.float32), 1)
    return path


def fastest(action: Callable[[], object], times: int = 7) -> float:
    taken = []
    for _ in range(times):
        start = time.perf_counter()
        action()
        taken.append(time.perf_counter() - start)
    return min(taken)


@pytest.mark.bench
def test_all_decisions_on_a_link_of_20_km(tmp_path: Path) -> None:
    """All together against drawing 2.4 million normal numbers, some 25 ms: twelve times that is the 0.3 s allowed."""
    raster = RasterSource(path=land(tmp_path), error_m=2.0)
    places = [Position(latitude_deg=36.0545, longitude_deg=lon) for lon in (-45.2105, -44.9885)]
    ends = [Site(name=name, position=place, height_m=25.0) for name, place in zip("AB", places, strict=True)]
    link = Link(name="A - B", a=ends[0], b=ends[1], radio=Radio(frequency_hz=5.8e9))
    settings = AssessSettings()
    with Terrain.open(ground=(raster,)) as terrain:
        made = assess_in_full(link, terrain=terrain, settings=settings)
        result, profile, levels = made.result, made.profile, made.levels
        assert abs(result.distance_m - 20e3) < 100.0
        assert profile.cell_m == pytest.approx(CELL_M, rel=0.01)
        water = Water(level_m=0.0, low_m=-1.0, high_m=1.0)
        found = find_reflections(link, result=result, profile=profile, levels=levels, water=water)
        assert found.matters
        split = {
            "profile, clearance, signal": lambda: assess_in_full(link, terrain=terrain, settings=settings),
            "heights and confidence": lambda: design_heights(link, made, settings, heights=COSTS),
            "reflections": lambda: find_reflections(link, result=result, profile=profile, levels=levels, water=water),
            "survey list": lambda: survey_list(result, profile, levels),
        }
        taken = {name: fastest(action) for name, action in split.items()}
    bare = fastest(lambda: np.random.default_rng(1).standard_normal((240, 10_000)))
    whole = sum(taken.values())
    for name, seconds in taken.items():
        print(f"{1e3 * seconds:7.1f} ms  {100.0 * seconds / whole:5.1f} %  {name}")
    print(f"{1e3 * whole:7.1f} ms  together; 2.4 million normal numbers {1e3 * bare:.1f} ms")
    assert whole < 12.0 * bare
