"""Small rasters on the WGS 84 UTM grid of zone 23 N for terrain tests, in open ocean west of its central meridian."""

from pathlib import Path

import numpy as np
import rasterio
from affine import Affine
from numpy.typing import NDArray
from pyproj import Transformer

from fellspan.geodesy.position import Position

WEST, NORTH = 474_000.0, 3_997_000.0
TO_DEGREES = Transformer.from_crs("EPSG:32623", "EPSG:4326", always_xy=True)
TO_GRID = Transformer.from_crs("EPSG:4326", "EPSG:32623", always_xy=True)


def at(east_m: float, south_m: float) -> Position:
    """A position so far east and south of the rasters' corner."""
    longitude, latitude = TO_DEGREES.transform(WEST + east_m, NORTH - south_m)
    return Position(latitude_deg=latitude, longitude_deg=longitude)


def lonlat(east_m: float, south_m: float) -> tuple[float, float]:
    """As `at`, as longitude and latitude."""
    position = at(east_m, south_m)
    return position.longitude_deg, position.latitude_deg


def raster(
    path: Path,
    heights: NDArray[np.floating] | float,
    *,
    size: tuple[int, int] = (300, 600),
    cell_m: float = 10.0,
    nodata: float | None = -9999.0,
    crs: str = "EPSG:32623+3855",
) -> Path:
    """Write heights, rows from the north, or one height everywhere."""
    data = np.full(size, heights, dtype=np.float32) if np.isscalar(heights) else np.asarray(heights, dtype=np.float32)
    profile = {
        "driver": "GTiff",
        "height": data.shape[0],
        "width": data.shape[1],
        "count": 1,
        "dtype": "float32",
        "crs": crs,
        "transform": Affine(cell_m, 0.0, WEST, 0.0, -cell_m, NORTH),
        "nodata": nodata,
    }
    with rasterio.open(path, "w", **profile) as file:
        file.write(data, 1)
    return path
