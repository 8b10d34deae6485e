"""Relief made from a seed for tests of everything around a place: rough like land, in a projected system, and no real place."""

from pathlib import Path

import numpy as np
import rasterio
from affine import Affine

CRS = "EPSG:32623"
WEST_M, SOUTH_M = 460_000.0, 4_010_000.0
ROUGHNESS = 2.2
"""Power by which waves fall off; about that of eroded hills (from memory)."""


def relief_m(side: int, *, seed: int = 5, spread_m: float = 150.0) -> np.ndarray:
    """Heights of `side` by `side` cells, m: 500 m and a standard deviation of `spread_m`."""
    waves = np.fft.rfft2(np.random.default_rng(seed).standard_normal((side, side)))
    length = np.hypot(np.fft.fftfreq(side)[:, None], np.fft.rfftfreq(side)[None])
    length[0, 0] = 1.0
    waves *= length**-ROUGHNESS
    waves[0, 0] = 0.0
    heights = np.fft.irfft2(waves, (side, side))
    return (500.0 + spread_m / heights.std() * heights).astype(np.float32)


def write_relief(
    path: Path, heights: np.ndarray, *, cell_m: float, crs: str = CRS, nodata: float | None = None
) -> Path:
    """A tiled raster of heights with its lower left corner at `WEST_M`, `SOUTH_M`."""
    rows, columns = heights.shape
    transform = Affine(cell_m, 0.0, WEST_M, 0.0, -cell_m, SOUTH_M + rows * cell_m)
    layout = {"tiled": True, "blockxsize": 256, "blockysize": 256, "nodata": nodata}
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        height=rows,
        width=columns,
        count=1,
        dtype=heights.dtype,
        crs=crs,
        transform=transform,
        **layout,
    ) as dataset:
        dataset.write(heights, 1)
    return path
