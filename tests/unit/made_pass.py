"""Two valleys with a ridge between them and one pass in it: the ground on which a relay is sought. In open ocean, invented."""

from pathlib import Path

import numpy as np
from made_terrain import NORTH, WEST, at, raster

from fellspan.links.criteria import Criterion
from fellspan.links.radio import Radio
from fellspan.links.site import Link, Site
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.terrain.sources import RasterSource

CELL_M = 50.0
ROWS, COLUMNS = 24, 32
PASS_ROW = 6
"""Row of the saddle, well north of the straight path."""
CRITERIA = (Criterion(name="0.6 F1 at k = 4/3", k=4.0 / 3.0, fraction=0.6, source="common practice, no source"),)


def ground_with_pass() -> np.ndarray:
    """A ridge of 120 m along the middle column, a saddle of 30 m at `PASS_ROW`, rough ground of a few metres elsewhere."""
    rows, columns = np.mgrid[0:ROWS, 0:COLUMNS].astype(np.float64)
    ridge = 120.0 * np.exp(-(((columns - 15.5) / 2.0) ** 2))
    saddle = 1.0 - 0.75 * np.exp(-(((rows - PASS_ROW) / 1.3) ** 2))
    rough = np.random.default_rng(7).normal(0.0, 0.7, (ROWS, COLUMNS))
    return 5.0 + ridge * saddle + rough


def link_over(*, west_row: float = 15.0, east_row: float = 15.0) -> Link:
    """A link from the western valley to the eastern one, cut by the ridge."""
    ends = [
        Site(name=name, position=at(column * CELL_M, row * CELL_M), height_m=8.0)
        for name, column, row in (("West", 3.3, west_row + 0.4), ("East", 28.6, east_row + 0.2))
    ]
    return Link(name="West - East", a=ends[0], b=ends[1], radio=Radio(name="radio", frequency_hz=5.8e9))


def study_with_pass(folder: Path, *, heights: np.ndarray | None = None, link: Link | None = None) -> Study:
    """A study of that link over that ground, written into `folder`; heights are taken as exact."""
    import datetime as dt

    file = raster(folder / "ground.tif", ground_with_pass() if heights is None else heights, cell_m=CELL_M)
    return Study(
        title="A ridge with a pass",
        links=(link_over() if link is None else link,),
        terrain=TerrainInputs(ground=(RasterSource(path=file, error_m=0.0),)),
        date=dt.date(2026, 5, 1),
        criteria=CRITERIA,
        path=folder / "study.toml",
    )


def cell_centre(row: int, column: int) -> tuple[float, float]:
    """Easting and northing of a cell's centre."""
    return WEST + (column + 0.5) * CELL_M, NORTH - (row + 0.5) * CELL_M
