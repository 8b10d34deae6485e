"""Rough hills with a link across them that no single hop crosses: the ground for relays on rasters too large for one sweep."""

import datetime as dt
from pathlib import Path

import numpy as np
from made_terrain import at, raster
from numpy.typing import NDArray
from scipy.ndimage import gaussian_filter

from fellspan.links.criteria import Criterion
from fellspan.links.radio import Radio
from fellspan.links.site import Link, Site
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.planning.planner import settings_of
from fellspan.planning.relay_hops import End, screen_hop
from fellspan.screening.pairs import HEIGHT_REFERENCES, SiteColumns
from fellspan.terrain.sources import RasterSource
from fellspan.terrain.terrain import Terrain

CRITERIA = (Criterion(name="0.6 F1 at k = 4/3", k=4.0 / 3.0, fraction=0.6, source="common practice, no source"),)


def hills(side: int, *, seed: int = 5, height_m: float = 300.0) -> NDArray[np.float64]:
    """A square of ground from 0 m: valleys and ridges of several widths, and half a metre of roughness."""
    rng = np.random.default_rng(seed)
    ground = np.zeros((side, side))
    for width, part in ((side / 8, 1.0), (side / 20, 0.45), (side / 60, 0.12)):
        wave = gaussian_filter(rng.normal(size=ground.shape), width, mode="wrap")
        ground += part * wave / wave.std()
    ground -= ground.min()
    return ground * height_m / ground.max() + rng.normal(0.0, 0.5, ground.shape)


def study_over(
    folder: Path, heights: NDArray[np.float64], a: tuple[float, float], b: tuple[float, float], *, cell_m: float
) -> Study:
    """A study of one link between two places, in cells east and south of the corner."""
    file = raster(folder / "hills.tif", heights, cell_m=cell_m)
    west, east = (
        Site(name=name, position=at(x * cell_m, y * cell_m), height_m=8.0)
        for name, (x, y) in (("West", a), ("East", b))
    )
    return Study(
        title="Hills",
        links=(Link(name="West - East", a=west, b=east, radio=Radio(name="radio", frequency_hz=5.8e9)),),
        terrain=TerrainInputs(ground=(RasterSource(path=file, error_m=0.0),)),
        date=dt.date(2026, 5, 1),
        criteria=CRITERIA,
        path=folder / "study.toml",
    )


def columns_at(rows: NDArray[np.int64], columns: NDArray[np.int64], *, cell_m: float, mast_m: float) -> SiteColumns:
    """Places at the middles of cells."""
    places = [
        at((column + 0.5) * cell_m, (row + 0.5) * cell_m)
        for row, column in zip(rows.tolist(), columns.tolist(), strict=True)
    ]
    count = len(places)
    return SiteColumns(
        name=tuple(f"{row}/{column}" for row, column in zip(rows.tolist(), columns.tolist(), strict=True)),
        latitude_deg=np.array([place.latitude_deg for place in places]),
        longitude_deg=np.array([place.longitude_deg for place in places]),
        height_m=np.full(count, mast_m),
        height_reference=np.full(count, HEIGHT_REFERENCES.index("ground"), dtype=np.int8),
        roof_m=np.full(count, np.nan),
    )


def clear_of_one(study: Study, terrain: Terrain, places: SiteColumns, end: End) -> NDArray[np.bool_]:
    """Whether the hop from an end to each place is clear, judged by itself: no sweep has a say."""
    hop = screen_hop(
        study.links[0], end=end, places=places, terrain=terrain, settings=settings_of(study), margin_db=0.0
    )
    return hop.clear


def clear_of_both(study: Study, terrain: Terrain, places: SiteColumns) -> NDArray[np.bool_]:
    """The same for both ends."""
    return clear_of_one(study, terrain, places, "a") & clear_of_one(study, terrain, places, "b")
