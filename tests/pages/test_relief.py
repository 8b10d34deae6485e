"""The relief stands where its raster does, whatever the raster's grid, and stays small."""

import base64

import numpy as np
import pytest
import rasterio
from pyproj import Transformer
from rasterio.io import MemoryFile
from rasterio.transform import Affine
from synthetic_plans import north_up

from fellspan.report.relief import SEA_COLOUR, MapWindow, open_rasters, shaded_relief
from fellspan.terrain.sources import RasterSource


def _decoded(relief):
    kind, data = relief.url.split(",")
    assert kind == "data:image/jpeg;base64"
    with MemoryFile(base64.b64decode(data)) as memory, memory.open() as file:
        return file.read().astype(float)


def _write(path, heights, *, crs, transform, **more):
    with rasterio.open(
        path, "w", driver="GTiff", width=heights.shape[1], height=heights.shape[0], count=1, dtype=heights.dtype.name,
        crs=crs, transform=transform, nodata=-9999, **more,
    ) as file:  # fmt: skip
        file.write(heights, 1)
    return path


def _mesa(shape, row, column):
    """Sea with one flat-topped hill, 20 by 20 cells."""
    heights = np.zeros(shape, dtype="float32")
    heights[row - 10 : row + 10, column - 10 : column + 10] = 100.0
    return heights


def _land_middle(relief):
    """Middle of what is not sea, as shares of the picture's width and height."""
    picture = _decoded(relief)
    land = np.abs(picture - np.array(SEA_COLOUR)[:, None, None]).sum(axis=0) > 20
    rows, columns = np.nonzero(land)
    return (columns.mean() + 0.5) / land.shape[1], (rows.mean() + 0.5) / land.shape[0]


def _expected(longitude, latitude, window):
    mercator = Transformer.from_crs("EPSG:4326", "EPSG:3857", always_xy=True)
    _, y = mercator.transform(0.0, latitude)
    _, south = mercator.transform(0.0, window.south_deg)
    _, north = mercator.transform(0.0, window.north_deg)
    return (longitude - window.west_deg) / (window.east_deg - window.west_deg), (north - y) / (north - south)


WINDOW = MapWindow(west_deg=-45.30, south_deg=35.98, east_deg=-45.10, north_deg=36.12)


# rasterio warns that a JPEG read back has no georeference; that is so
unplaced = pytest.mark.filterwarnings("ignore::rasterio.errors.NotGeoreferencedWarning")


def _at(transform, column, row):
    return (
        transform.a * column + transform.b * row + transform.c,
        transform.d * column + transform.e * row + transform.f,
    )


@unplaced
@pytest.mark.parametrize("grid", ["geographic", "utm", "rotated", "geographic tiles"])
def test_land_is_drawn_where_it_is(tmp_path, grid):
    if grid.startswith("geographic"):
        crs, transform = "EPSG:4326", north_up(-45.30, 36.12, 0.0005, 0.0005)
        heights = _mesa((280, 400), 100, 240)
        place = _at(transform, 240, 100)
    else:
        turn = np.radians(20.0 if grid == "rotated" else 0.0)
        along, across = 40.0 * np.cos(turn), 40.0 * np.sin(turn)
        crs, transform = "EPSG:32623", Affine(along, across, 474_000.0, across, -along, 3_994_000.0)
        heights = _mesa((400, 400), 130, 200)
        place = Transformer.from_crs(crs, "EPSG:4326", always_xy=True).transform(*_at(transform, 200, 130))
    if grid == "geographic tiles":
        _write(tmp_path / "west.tif", heights[:, :240], crs=crs, transform=transform)
        _write(tmp_path / "east.tif", heights[:, 240:], crs=crs, transform=north_up(-45.18, 36.12, 0.0005, 0.0005))
        path = tmp_path
    else:
        path = _write(tmp_path / "one.tif", heights, crs=crs, transform=transform)
    relief = shaded_relief(open_rasters([RasterSource(path=path)]), WINDOW, pixels=500, gaps_are_sea=True)
    # a hundredth of the picture is 5 pixels, a quarter of the hill
    assert _land_middle(relief) == pytest.approx(_expected(*place, WINDOW), abs=0.01)


@unplaced
@pytest.mark.parametrize("turn", [0.0, -360.0])
@pytest.mark.parametrize("grid", ["across", "utm", "world"])
def test_land_is_drawn_across_the_antimeridian(tmp_path, grid, turn):
    window = MapWindow(west_deg=179.8 + turn, south_deg=-17.1, east_deg=180.2 + turn, north_deg=-16.9)
    place = 180.08 + turn, -17.0
    if grid == "across":
        heights, crs, transform = _mesa((200, 400), 100, 280), "EPSG:4326", north_up(179.8, -16.9, 0.001, 0.001)
    elif grid == "utm":
        east, north = Transformer.from_crs("EPSG:4326", "EPSG:32701", always_xy=True).transform(-179.92, -17.0)
        heights, crs = _mesa((200, 400), 100, 280), "EPSG:32701"
        transform = north_up(east - 28_000, north + 10_000, 100, 100)
    else:
        heights, crs, transform = np.zeros((100, 36_000), "int16"), "EPSG:4326", north_up(-180.0, -16.5, 0.01, 0.01)
        heights[45:55, 0:10] = 100
        place = 180.05 + turn, -17.0
    path = _write(tmp_path / "a.tif", heights, crs=crs, transform=transform, compress="deflate")
    relief = shaded_relief(open_rasters([RasterSource(path=path)]), window, pixels=500, gaps_are_sea=True)
    assert _land_middle(relief) == pytest.approx(_expected(*place, window), abs=0.015)


def test_a_rough_land_still_makes_a_small_picture(tmp_path):
    rough = np.random.default_rng(3).uniform(0.0, 300.0, (1400, 2000)).astype("float32")
    path = _write(tmp_path / "rough.tif", rough, crs="EPSG:4326", transform=north_up(-45.3, 36.12, 0.0001, 0.0001))
    relief = shaded_relief(open_rasters([RasterSource(path=path)]), WINDOW, pixels=1200, most_bytes=120_000)
    assert len(relief.url) <= 120_100
    assert relief.rasters == ("rough.tif",)


def test_no_data_in_the_window_is_no_relief(tmp_path):
    nothing, transform = np.full((50, 50), -9999.0, "float32"), north_up(-45.3, 36.12, 0.001, 0.001)
    path = _write(tmp_path / "a.tif", nothing, crs="EPSG:4326", transform=transform)
    rasters = open_rasters([RasterSource(path=path), RasterSource(path=tmp_path / "missing.tif")])
    assert len(rasters) == 1
    assert shaded_relief(rasters, WINDOW) is None
    assert shaded_relief([], WINDOW) is None


def test_a_raster_too_large_to_read_is_left_out_and_named_unless_it_has_overviews(tmp_path, monkeypatch):
    monkeypatch.setattr("fellspan.report.relief.MOST_CELLS", 100_000)
    heights, transform = _mesa((1400, 2000), 500, 1000), north_up(-45.3, 36.12, 0.0001, 0.0001)
    path = _write(tmp_path / "large.tif", heights, crs="EPSG:4326", transform=transform)
    relief = shaded_relief(open_rasters([RasterSource(path=path)]), WINDOW, pixels=200)
    assert (relief.url, relief.rasters, relief.left_out) == ("", (), ("large.tif",))
    with rasterio.open(path, "r+") as file:
        file.build_overviews([2, 4, 8], rasterio.enums.Resampling.average)
    relief = shaded_relief(open_rasters([RasterSource(path=path)]), WINDOW, pixels=200)
    assert (relief.rasters, relief.left_out) == (("large.tif",), ())
