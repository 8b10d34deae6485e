"""One raster, sampled: against rasterio's own reading and SciPy's own interpolation at the same points."""

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from affine import Affine
from rasterio.enums import ColorInterp
from rasterio.warp import transform as rasterio_transform
from scipy.ndimage import map_coordinates

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.position import Position
from fellspan.terrain.placing import PathPlacing
from fellspan.terrain.sources import CoverSource, RasterSource
from fellspan.terrain.stack import RasterStack, StackSample

UTM = "EPSG:32623"
CONIC = "+proj=lcc +lat_1=35 +lat_2=37 +lat_0=36 +lon_0=-44 +ellps=WGS84 +units=m"
POLAR = "EPSG:3413"
LONGITUDE_LATITUDE = "EPSG:4326"
A = Position(latitude_deg=36.03, longitude_deg=-45.23)
B = Position(latitude_deg=36.07, longitude_deg=-45.17)


def grid_around(crs: str, *, cells: int, cell: float, turn_deg: float = 0.0, stretch: float = 1.0) -> Affine:
    """A geotransform whose middle is the middle of A and B; `stretch` makes cells higher than wide."""
    (x,), (y,) = rasterio_transform(LONGITUDE_LATITUDE, crs, [-45.2], [36.05])
    shape = Affine.rotation(turn_deg) @ Affine.scale(cell, -cell * stretch)
    return Affine.translation(x, y) @ shape @ Affine.translation(-cells / 2, -cells / 2)


def write(path: Path, cells: np.ndarray, *, crs: str | None = UTM, transform: Affine, **options: Any) -> Path:
    profile = {"driver": "GTiff", "count": 1, "dtype": cells.dtype.name, "crs": crs, "transform": transform} | options
    with rasterio.open(path, "w", height=cells.shape[0], width=cells.shape[1], **profile) as dataset:
        dataset.write(cells, 1)
    return path


def sample(path: Path, distance_m: np.ndarray | None = None, **declared: Any) -> StackSample:
    line = GeodesicPath.between(A, B)
    stack = RasterStack.open([RasterSource(path=path, **declared)], role="ground")
    try:
        return stack.sample(line, np.linspace(0.0, line.length_m, 701) if distance_m is None else distance_m)
    finally:
        stack.close()


def sample_at(path: Path, column: Any, row: Any, **declared: Any) -> StackSample:
    """Sample at places in cells, by way of latitude and longitude."""
    with rasterio.open(path) as dataset:
        x, y = (np.asarray(v) for v in dataset.transform @ (np.asarray(column, float), np.asarray(row, float)))
        longitude, latitude = rasterio_transform(dataset.crs, LONGITUDE_LATITUDE, x.ravel(), y.ravel())
    stack = RasterStack.open([RasterSource(path=path, **declared)], role="ground")
    try:
        return stack.sample_positions(latitude, longitude)
    finally:
        stack.close()


def exact_cells(transform: Affine, crs: str, distance_m: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Columns and rows of points on the path A-B, each solved alone with rasterio's PROJ."""
    latitude, longitude = GeodesicPath.between(A, B).positions(distance_m, exact=True)
    x, y = rasterio_transform(LONGITUDE_LATITUDE, crs, longitude, latitude)
    return ~transform @ (np.array(x), np.array(y))


GRIDS = {
    "UTM": (UTM, {"cell": 10.0}),
    "geographic": (LONGITUDE_LATITUDE, {"cell": 0.0001}),
    "conic": (CONIC, {"cell": 10.0, "stretch": 1.3}),
    "polar": (POLAR, {"cell": 12.0}),
    "rotated": (UTM, {"cell": 10.0, "turn_deg": 31.0}),
}


@pytest.mark.parametrize("grid", GRIDS)
def test_heights_equal_scipys_interpolation_at_exact_positions(tmp_path: Path, grid: str) -> None:
    crs, shape = GRIDS[grid]
    transform = grid_around(crs, cells=1400, **shape)
    rng = np.random.default_rng(3)
    cells = rng.normal(0.0, 1.0, (1400, 1400)).astype(np.float32).cumsum(axis=0).cumsum(axis=1) / 400.0
    path = write(tmp_path / "t.tif", cells.astype(np.float32), crs=crs, transform=transform, tiled=True)
    distance = np.linspace(0.0, GeodesicPath.between(A, B).length_m, 701)
    column, row = exact_cells(transform, crs, distance)
    expected = map_coordinates(cells, (row - 0.5, column - 0.5), order=1)
    got = sample(path, distance)
    assert (got.source == 0).all()
    # slope of these fields is under 1 m a cell, so 0.05 cell is under 0.05 m
    assert np.abs(got.value_m - expected).max() < 0.05


@pytest.mark.parametrize("grid", GRIDS)
def test_positions_are_right_to_a_twentieth_of_a_cell(tmp_path: Path, grid: str) -> None:
    """A raster that holds its own column numbers tells where a sample fell."""
    crs, shape = GRIDS[grid]
    transform = grid_around(crs, cells=1400, **shape)
    numbers = np.arange(1400, dtype=np.float64) + 0.5
    columns = np.broadcast_to(numbers, (1400, 1400))
    distance = np.linspace(0.0, GeodesicPath.between(A, B).length_m, 2001)
    expected = exact_cells(transform, crs, distance)
    for cells, exact in ((columns, expected[0]), (columns.T, expected[1])):
        path = write(tmp_path / "t.tif", np.ascontiguousarray(cells), crs=crs, transform=transform)
        assert np.abs(sample(path, distance).value_m - exact).max() <= 0.05


@pytest.mark.parametrize(
    ("crs", "cell"), [(UTM, 1.0), (CONIC, 1.0), (POLAR, 1.0), (LONGITUDE_LATITUDE, 1e-5), ("EPSG:3857", 1.0)]
)
@pytest.mark.parametrize("bearing_deg", [0.0, 47.0, 90.0, 200.0])
def test_long_paths_over_fine_cells_keep_their_place(crs: str, cell: float, bearing_deg: float) -> None:
    line = GeodesicPath.towards(A, bearing_deg, 57_000.0)
    distance = np.sort(np.random.default_rng(5).uniform(0.0, line.length_m, 5000))
    latitude, longitude = line.positions(distance, exact=True)
    x, y = (np.array(v) for v in rasterio_transform(LONGITUDE_LATITUDE, crs, longitude, latitude))
    wkt = rasterio.crs.CRS.from_user_input(crs).to_wkt(version="WKT2_2019")
    at_x, at_y = PathPlacing(line, distance).in_crs(wkt, cell=cell)
    assert np.hypot(at_x - x, at_y - y).max() <= 0.05 * cell


def test_at_cell_centres_it_is_what_rasterio_samples(tmp_path: Path) -> None:
    rng = np.random.default_rng(7)
    cells = rng.integers(-50, 900, (90, 130)).astype(np.int16)
    transform = grid_around(UTM, cells=100, cell=10.0, turn_deg=-12.0, stretch=0.7)
    path = write(tmp_path / "t.tif", cells, transform=transform)
    column, row = rng.integers(0, 130, 300) + 0.5, rng.integers(0, 90, 300) + 0.5
    with rasterio.open(path) as dataset:
        theirs = [v[0] for v in dataset.sample(zip(*(transform @ (column, row)), strict=True))]
    assert np.abs(sample_at(path, column, row).value_m - theirs).max() < 1e-3


@pytest.mark.parametrize(
    "layout",
    [
        {"tiled": True, "blockxsize": 128, "blockysize": 128, "compress": "deflate"},
        {"tiled": True, "blockxsize": 1024, "blockysize": 2560},
        {"tiled": False, "blockysize": 1, "compress": "deflate"},
        {"tiled": False, "blockysize": 37, "compress": "lzw"},
        {"tiled": False, "blockysize": 1400, "compress": "deflate"},
    ],
)
def test_how_a_file_is_cut_into_blocks_changes_nothing(tmp_path: Path, layout: dict[str, Any]) -> None:
    cells = np.random.default_rng(9).normal(200.0, 40.0, (1400, 1400)).astype(np.float32)
    transform = grid_around(UTM, cells=1400, cell=10.0, turn_deg=20.0)
    whole = sample(write(tmp_path / "a.tif", cells, transform=transform, tiled=True))
    cut = sample(write(tmp_path / "b.tif", cells, transform=transform, **layout))
    assert np.array_equal(whole.value_m, cut.value_m)


def test_outer_half_cell_holds_the_edge_and_beyond_is_a_gap(tmp_path: Path) -> None:
    cells = np.arange(12, dtype=np.float32).reshape(3, 4)
    path = write(tmp_path / "t.tif", cells, transform=grid_around(UTM, cells=4, cell=10.0))
    got = sample_at(path, [0.01, 0.5, 3.99, 3.99, -0.01, 4.01, 2.0], [0.01, 0.5, 0.01, 2.99, 1.0, 1.0, 3.01])
    assert got.value_m[:4] == pytest.approx([0.0, 0.0, 3.0, 11.0], abs=1e-4)
    assert np.isnan(got.value_m[4:]).all()
    assert (got.source[4:] == -1).all()
    assert np.isnan(got.sigma_m[4:]).all()


@pytest.mark.parametrize(
    ("nodata", "dtype"), [(-9999, "int16"), (-9999.0, "float32"), (np.nan, "float64"), (0, "uint8")]
)
def test_nodata_is_a_gap_up_to_the_edge_of_its_cell_and_weighs_nothing_beside(
    tmp_path: Path, nodata: float, dtype: str
) -> None:
    cells = np.full((5, 5), 100).astype(dtype)
    cells[2, 2] = nodata
    path = write(tmp_path / "t.tif", cells, transform=grid_around(UTM, cells=5, cell=10.0), nodata=nodata)
    got = sample_at(path, [1.9, 2.1, 2.5, 2.9, 3.1], [2.5] * 5)
    assert got.value_m[[0, 4]] == pytest.approx([100.0, 100.0], abs=1e-9)
    assert np.isnan(got.value_m[1:4]).all()


@pytest.mark.parametrize("driver", ["GTiff", "ENVI"])
@pytest.mark.parametrize("lowest", [-3.4028234663852886e38, -998.7])
def test_nodata_of_many_digits_is_found_in_float32_cells(tmp_path: Path, lowest: float, driver: str) -> None:
    cells = np.array([[5.0, lowest], [5.0, 5.0]], dtype=np.float32)
    path = write(
        tmp_path / "t.tif", cells, transform=grid_around(UTM, cells=2, cell=10.0), nodata=lowest, driver=driver
    )
    assert np.isnan(sample_at(path, [1.5], [0.5]).value_m[0])


@pytest.mark.parametrize("habit", [-9999, -32767, -32768])
def test_undeclared_nodata_is_no_height(tmp_path: Path, habit: int) -> None:
    cells = np.full((4, 4), 60, dtype=np.int16)
    cells[1, 1] = habit
    path = write(tmp_path / "t.tif", cells, transform=grid_around(UTM, cells=4, cell=10.0))
    got = sample_at(path, [1.5, 2.5], [1.5, 2.5])
    assert np.isnan(got.value_m[0])
    assert got.value_m[1] == pytest.approx(60.0)


def test_blocks_that_a_sparse_file_never_stored_are_gaps_not_sea_level(tmp_path: Path) -> None:
    path = tmp_path / "t.tif"
    transform = grid_around(UTM, cells=256, cell=10.0)
    shape = {"height": 256, "width": 256, "count": 1, "dtype": "float32", "crs": UTM, "transform": transform}
    options = {"driver": "GTiff", "tiled": True, "blockxsize": 128, "blockysize": 128, "SPARSE_OK": True}
    with rasterio.open(path, "w", **shape, **options) as dataset:
        dataset.write(np.full((128, 128), 7.0, np.float32), 1, window=((0, 128), (0, 128)))
    got = sample_at(path, [60.5, 200.5], [60.5, 200.5])
    assert got.value_m[0] == 7.0
    assert np.isnan(got.value_m[1])


def test_stored_zeros_are_sea_level_not_gaps(tmp_path: Path) -> None:
    path = write(tmp_path / "t.tif", np.zeros((64, 64), np.float32), transform=grid_around(UTM, cells=64, cell=10.0))
    assert sample_at(path, [20.5], [20.5]).value_m[0] == 0.0


@pytest.mark.parametrize("internal", [True, False])
def test_a_mask_makes_gaps(tmp_path: Path, internal: bool) -> None:
    path = tmp_path / "t.tif"
    cells = np.full((1, 6, 6), 50, np.int16)
    transform = grid_around(UTM, cells=6, cell=10.0)
    mask = np.full((6, 6), 255, np.uint8)
    mask[3, 3] = 0
    shape = {"height": 6, "width": 6, "count": 1, "dtype": "int16", "crs": UTM, "transform": transform}
    with rasterio.Env(GDAL_TIFF_INTERNAL_MASK=internal), rasterio.open(path, "w", driver="GTiff", **shape) as dataset:
        dataset.write(cells)
        dataset.write_mask(mask)
    got = sample_at(path, [2.5, 3.5], [2.5, 3.5])
    assert got.value_m[0] == 50.0
    assert np.isnan(got.value_m[1])


def test_an_alpha_band_makes_gaps(tmp_path: Path) -> None:
    path = tmp_path / "t.tif"
    transform = grid_around(UTM, cells=6, cell=10.0)
    shape = {"height": 6, "width": 6, "count": 2, "dtype": "uint16", "crs": UTM, "transform": transform}
    with rasterio.open(path, "w", driver="GTiff", **shape) as dataset:
        dataset.colorinterp = (ColorInterp.gray, ColorInterp.alpha)
        dataset.write(np.full((6, 6), 80, np.uint16), 1)
        alpha = np.full((6, 6), 65535, np.uint16)
        alpha[4, 4] = 0
        dataset.write(alpha, 2)
    got = sample_at(path, [1.5, 4.5], [1.5, 4.5])
    assert got.value_m[0] == 80.0
    assert np.isnan(got.value_m[1])


def test_scale_offset_and_unit_apply_in_this_order(tmp_path: Path) -> None:
    path = write(tmp_path / "t.tif", np.full((4, 4), 120, np.int16), transform=grid_around(UTM, cells=4, cell=10.0))
    with rasterio.open(path, "r+") as dataset:
        dataset.scales, dataset.offsets, dataset.units = (0.5,), (10.0,), ("ft",)
    # (120 * 0.5 + 10) ft of 0.3048 m (international foot, exact)
    assert sample_at(path, [1.7], [1.7]).value_m[0] == pytest.approx(70 * 0.3048, abs=1e-9)
    assert sample_at(path, [1.7], [1.7], vertical_unit="m").value_m[0] == pytest.approx(70.0, abs=1e-9)
    # US survey foot: 1200/3937 m exactly (NIST SP 811, appendix B)
    assert sample_at(path, [1.7], [1.7], vertical_unit="us-ft").value_m[0] == pytest.approx(70 * 1200 / 3937, abs=1e-9)


@pytest.mark.parametrize("driver", ["GTiff", "ENVI"])
def test_feet_of_the_crs_are_found(tmp_path: Path, driver: str) -> None:
    """GDAL passes them on as the unit of the band for some formats and not for others."""
    # EPSG:6360 is NAVD88 height in US survey feet
    cells = np.full((4, 4), 100.0, np.float32)
    path = write(
        tmp_path / "t.tif", cells, crs="EPSG:32623+6360", transform=grid_around(UTM, cells=4, cell=10.0), driver=driver
    )
    stack = RasterStack.open([RasterSource(path=path)], role="ground")
    assert stack.vertical_datum is not None
    assert "NAVD88" in stack.vertical_datum
    assert sample_at(path, [1.5], [1.5]).value_m[0] == pytest.approx(100 * 1200 / 3937, abs=1e-6)


def test_another_band_is_read_when_asked(tmp_path: Path) -> None:
    path = tmp_path / "t.tif"
    shape = {"height": 4, "width": 4, "count": 2, "dtype": "float32", "crs": UTM}
    with rasterio.open(path, "w", driver="GTiff", transform=grid_around(UTM, cells=4, cell=10.0), **shape) as dataset:
        dataset.write(np.stack([np.full((4, 4), 1.0, np.float32), np.full((4, 4), 2.0, np.float32)]))
    assert sample_at(path, [1.5], [1.5], band=2).value_m[0] == 2.0


def test_cover_may_be_taller_than_nothing_and_keeps_its_own_default_error(tmp_path: Path) -> None:
    path = write(tmp_path / "c.tif", np.full((9, 9), 18, np.uint8), transform=grid_around(UTM, cells=9, cell=10.0))
    stack = RasterStack.open([CoverSource(path=path, kind="tree")], role="cover")
    got = stack.sample_positions([36.05], [-45.2])
    assert got.value_m[0] == 18.0
    assert got.sigma_m[0] == 3.0
    assert stack.vertical_datum is None


def test_a_point_path_and_no_points_are_legal(tmp_path: Path) -> None:
    path = write(
        tmp_path / "c.tif", np.full((900, 900), 18, np.uint8), transform=grid_around(UTM, cells=900, cell=10.0)
    )
    stack = RasterStack.open([RasterSource(path=path)], role="ground")
    assert stack.sample(GeodesicPath.between(A, A), [0.0]).value_m.tolist() == [18.0]
    assert stack.sample(GeodesicPath.between(A, B), []).value_m.size == 0
    assert stack.cell_along(GeodesicPath.between(A, A)) == pytest.approx(10.0, rel=2e-3)
