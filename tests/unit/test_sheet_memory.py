"""Cells in memory: no more of a raster than paths cross, whatever the step, and all of it given back when asked."""

import sys
from pathlib import Path

import numpy as np
import pytest
import rasterio
from affine import Affine
from made_screening import candidates, every_pair, ground_file, sites
from made_terrain import NORTH, WEST

import fellspan.screening.batch as batch
from fellspan.links.assess import AssessSettings
from fellspan.screening.batch import Batch, Setting
from fellspan.screening.columns import Columns
from fellspan.screening.screen import _ways, screen_pairs
from fellspan.terrain.terrain import Terrain


@pytest.mark.skipif(sys.platform != "linux", reason="elsewhere the system may keep what it was given back")
def test_tiles_are_given_back_to_the_system(tmp_path: Path) -> None:
    made = candidates(sites("H", 1, seed=1, height_m=30.0), sites("P", 4, seed=2))
    hub, place = every_pair(made)
    with Terrain.open(ground=ground_file(tmp_path)) as terrain:
        screen_pairs(made, hub=hub, place=place, terrain=terrain)
        sheet = terrain.many.stacks[0].sheet(0)
        assert sheet is not None
        assert sheet.tiles_read > 0
        column, row = np.array([300.5]), np.array([150.5])
        before = sheet.heights(column, row)
        sheet.forget()
        assert sheet.tiles_read == 0
        assert sheet.heights(column, row) == 0.0  # the very memory, and not a copy
        sheet.read_near(column, row, reach=1.0)
        assert sheet.heights(column, row) == before


def empty_raster(folder: Path, side: int) -> Path:
    """Cells of 1 m, of which none is written."""
    path = folder / "empty.tif"
    options = {"driver": "GTiff", "width": side, "height": side, "count": 1, "dtype": "float32", "crs": "EPSG:32623"}
    transform = Affine(1.0, 0.0, WEST, 0.0, -1.0, NORTH)
    with rasterio.open(path, "w", **options, transform=transform, tiled=True, SPARSE_OK=True, nodata=-9999.0):
        return path


def test_a_step_of_the_studys_does_not_read_more_than_paths_cross(tmp_path: Path) -> None:
    read = []
    for step in (None, 200.0):
        extent = (7000.0, 7000.0)
        made = candidates(
            sites("H", 1, seed=1, extent_m=extent),
            sites("P", 1, seed=2, extent_m=extent),
            settings=AssessSettings(step_m=step),
        )
        with Terrain.open(ground=empty_raster(tmp_path, 8000)) as terrain:
            screen_pairs(made, hub=np.zeros(1, int), place=np.zeros(1, int), terrain=terrain)
            sheet = terrain.many.stacks[0].sheet(0)
            assert sheet is not None
            read.append(sheet.tiles_read)
    assert read[0] > 10
    assert read[1] <= read[0] + 2


def test_parts_go_by_cells_where_the_step_is_long(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(batch, "NEAR_SAMPLES", 3000)
    parts = []
    for step in (None, 100.0):
        made = candidates(sites("H", 1, seed=3), sites("P", 20, seed=4), settings=AssessSettings(step_m=step))
        hub, place = every_pair(made)
        with Terrain.open(ground=ground_file(tmp_path)) as terrain:
            nobody = np.zeros(20, dtype=np.bool_)
            setting = Setting(
                candidates=made, many=terrain.many, vertical_datum=None, wrong_hubs=nobody, wrong_places=nobody
            )
            columns = Columns(hub, place)
            _ways(setting, columns)
            blocks = Batch(setting, columns, np.arange(hub.size)).blocks()
        parts.append(max(columns.distance_m[part].sum() for block in blocks for part in block))
    assert parts[1] < 1.5 * parts[0]
