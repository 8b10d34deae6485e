"""GDAL's viewshed and the sweep's sight line over one raster, brought to the same cells."""

import shutil
import subprocess
from pathlib import Path

import numpy as np
import rasterio

from fellspan.design.sweep import HeightField, height_field
from fellspan.geodesy.position import Position
from fellspan.geodesy.transforms import transformer
from fellspan.links.criteria import Criterion
from fellspan.links.site import Site
from fellspan.terrain.terrain import Terrain

SITE_M, OTHER_M = 20.0, 10.0
VIEWSHED = shutil.which("gdal_viewshed")


def viewshed(file: Path, *, out: Path, x: float, y: float, radius_m: float, k: float) -> np.ndarray:
    """Cells that GDAL sees, and the same bend of the ray: GDAL's coefficient is for a sphere of the ellipsoid's long radius."""
    curve = 0.0 if np.isinf(k) else 6_378_137.0 / (k * 6_371_000.0)
    options = ["-oz", SITE_M, "-tz", OTHER_M, "-md", radius_m, "-cc", curve]
    command = [str(VIEWSHED), "-q", "-ox", str(x), "-oy", str(y), *map(str, options), str(file), str(out)]
    subprocess.run(command, check=True)
    with rasterio.open(out) as dataset:
        seen = dataset.read(1) > 0
        return np.asarray(seen)


def swept(file: Path, *, x: float, y: float, radius_m: float, k: float) -> HeightField:
    longitude, latitude = transformer("EPSG:32623", "EPSG:4326").transform(x, y)
    site = Site(name="A", position=Position(latitude_deg=latitude, longitude_deg=longitude), height_m=SITE_M)
    rule = Criterion(name="sight", k=k, fraction=0.0, source="the sight line alone")
    with Terrain.open(ground=file) as terrain:
        return height_field(terrain, site=site, frequency_hz=6e9, criteria=[rule], radius_m=radius_m)


def compared(
    field: HeightField, seen: np.ndarray, file: Path, radius_m: float
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """What the sweep and GDAL see, on the cells of the file, and which of these both were asked for."""
    with rasterio.open(file) as dataset:
        shift = ~dataset.transform @ (field.transform @ (0.0, 0.0))
    needed = np.full(seen.shape, np.nan)
    away = np.full(seen.shape, np.inf)
    column, row = round(shift[0]), round(shift[1])
    rows, columns = field.shape
    top, left = max(row, 0), max(column, 0)
    bottom, right = min(row + rows, seen.shape[0]), min(column + columns, seen.shape[1])
    part = slice(top - row, bottom - row), slice(left - column, right - column)
    needed[top:bottom, left:right] = field.needed_m[part]
    away[top:bottom, left:right] = field.distance_m[part]
    return needed <= OTHER_M, seen, np.isfinite(needed) & (away < 0.997 * radius_m)
