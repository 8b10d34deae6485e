"""Write the sample's rasters, obstacles and survey anew: `python sample_terrain/make_sample.py [FOLDER]`.

Everything comes from one seed, so a second run writes the same heights. The place is invented and lies in open ocean.
Only the study file beside this script is written by hand.
"""

import sys
from pathlib import Path

import network
import numpy as np
import rasterio
import relief
import town
from numpy.typing import NDArray
from rasterio import Affine
from rasterio.crs import CRS

SEED = 2026
GROUND_SCALE_M, COVER_SCALE_M = 0.1, 0.1
GROUND_NODATA, COVER_NODATA = -32768, 255


def ground_counts(seed: int = SEED) -> NDArray[np.int16]:
    """Bare ground as stored: counts of 0.1 m above sea level."""
    return np.round(relief.make_ground(seed) / GROUND_SCALE_M).astype(np.int16)


def tree_counts(ground: NDArray[np.int16], seed: int = SEED) -> NDArray[np.uint8]:
    """Tree heights as stored: counts of 0.1 m above ground, in steps of 0.5 m."""
    trees_m = relief.make_trees(seed, ground.astype(np.float64) * GROUND_SCALE_M)
    return (np.round(trees_m / 0.5) * 5).astype(np.uint8)


def write_raster(
    path: Path,
    counts: NDArray[np.int16] | NDArray[np.uint8],
    *,
    cell_m: float,
    crs: CRS,
    nodata: int,
    scale: float,
    unit: str | None,
    what: str,
) -> None:
    """Write one tiled, compressed GeoTIFF whose heights are counts * scale, in metres."""
    profile = {
        "driver": "GTiff",
        "height": counts.shape[0],
        "width": counts.shape[1],
        "count": 1,
        "dtype": counts.dtype.name,
        "crs": crs,
        "transform": Affine(cell_m, 0.0, relief.EAST_M, 0.0, -cell_m, relief.NORTH_M),
        "nodata": nodata,
        "tiled": True,
        "blockxsize": 256,
        "blockysize": 256,
        "compress": "deflate",
        "predictor": 2,
        "zlevel": 9,
    }
    with rasterio.open(path, "w", **profile) as raster:
        raster.descriptions = (what,)
        raster.scales, raster.offsets = (scale,), (0.0,)
        if unit is not None:
            raster.units = (unit,)
        raster.write(counts, 1)
    with rasterio.open(path) as raster:
        if raster.scales != (scale,):
            raise RuntimeError(f"{path.name} lost its scale")


def write_sample(folder: Path, seed: int = SEED) -> None:
    """Write every file of the sample but the study."""
    ground = ground_counts(seed)
    trees = tree_counts(ground, seed)
    write_raster(
        folder / "tolmera_ground.tif",
        ground,
        cell_m=relief.GROUND_CELL_M,
        crs=CRS.from_string("EPSG:32623+3855"),
        nodata=GROUND_NODATA,
        scale=GROUND_SCALE_M,
        unit=None,  # the vertical part of the CRS says metres; set after it, GDAL 3.10 loses the scale
        what="bare ground above sea level",
    )
    write_raster(
        folder / "tolmera_trees.tif",
        trees,
        cell_m=relief.COVER_CELL_M,
        crs=CRS.from_epsg(32623),
        nodata=COVER_NODATA,
        scale=COVER_SCALE_M,
        unit="m",
        what="trees above ground",
    )
    (folder / "buildings.geojson").write_text(town.buildings_geojson(seed), encoding="utf-8", newline="\n")
    (folder / "obstacles.csv").write_text(town.obstacles_csv(), encoding="utf-8", newline="\n")
    survey = town.survey_csv(ground.astype(np.float64) * GROUND_SCALE_M, trees.astype(np.float64) * COVER_SCALE_M, seed)
    (folder / "survey.csv").write_text(survey, encoding="utf-8", newline="\n")
    write_network(folder, ground, trees, seed)


def write_network(folder: Path, ground: NDArray[np.int16], trees: NDArray[np.uint8], seed: int = SEED) -> None:
    """Write the tables of hubs and places, from the heights as stored."""
    heights = ground.astype(np.float64) * GROUND_SCALE_M, trees.astype(np.float64) * COVER_SCALE_M
    (folder / "hubs.csv").write_text(network.hubs_csv(), encoding="utf-8", newline="\n")
    (folder / "places.csv").write_text(network.places_csv(*heights, seed), encoding="utf-8", newline="\n")


if __name__ == "__main__":
    target = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).resolve().parent
    write_sample(target)
