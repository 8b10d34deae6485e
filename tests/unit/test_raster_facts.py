"""Facts about rasters: what is stated, what is measured, what is guessed."""

import dataclasses
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
import rasterio.warp
from affine import Affine

from fellspan.errors import RasterError
from fellspan.terrain.error_model import default_error_m
from fellspan.terrain.inspect import datum_conflict, inspect_raster, inspect_seams
from fellspan.terrain.sources import CoverSource, RasterSource

WEST, NORTH = 480_000.0, 3_992_000.0


def write(path: Path, cells: Any, *, cell: float = 10.0, at: tuple[float, float] = (0.0, 0.0), **options: Any) -> Path:
    cells = np.asarray(cells)
    transform = Affine(cell, 0.0, WEST + at[0], 0.0, -cell, NORTH - at[1])
    profile = {"driver": "GTiff", "count": 1, "dtype": cells.dtype.name, "crs": "EPSG:32623", "transform": transform}
    path.parent.mkdir(parents=True, exist_ok=True)
    with rasterio.open(path, "w", height=cells.shape[0], width=cells.shape[1], **profile | options) as dataset:
        dataset.write(cells, 1)
    return path


def hills(side: int, *, cell: float) -> np.ndarray:
    """Smooth ground with slopes up to about 30 degrees."""
    x, y = np.meshgrid(*(np.arange(side) * cell,) * 2)
    ground = 200.0 + 40.0 * np.sin(x / 140.0) * np.cos(y / 190.0) + 6.0 * np.sin((x + 2.0 * y) / 31.0)
    return ground.astype(np.float32)


def with_town(ground: np.ndarray, *, cell: float) -> np.ndarray:
    """The ground with 12 m houses, one in each 50 m square."""
    town, side = ground.copy(), max(2, round(12.0 / cell))
    step = round(50.0 / cell)
    for row in range(0, ground.shape[0] - side, step):
        for column in range(0, ground.shape[1] - side, step):
            town[row : row + side, column : column + side] = ground[row, column] + 9.0
    return town


def test_facts_of_a_plain_raster(tmp_path: Path) -> None:
    cells = hills(300, cell=10.0)
    cells[:30, :60] = -9999.0
    path = write(tmp_path / "hills.tif", cells, nodata=-9999.0, crs="EPSG:32623+5773", tiled=True)
    fact = inspect_raster(RasterSource(path=path))
    assert (fact.name, fact.role, fact.files, fact.driver) == ("hills.tif", "ground", 1, "GTiff")
    assert (fact.columns, fact.rows, fact.dtype, fact.blocks) == (300, 300, "float32", "256 x 256")
    # UTM near the middle of its zone: scale 0.9996, so a 10 m cell is 10.004 m on the ground
    assert (fact.cell_x_m, fact.cell_y_m) == pytest.approx((10.004, 10.004), abs=1e-3)
    assert (fact.unit, fact.vertical_datum) == ("metres", "EGM96 height")
    assert fact.gap_percent == pytest.approx(100 * 30 * 60 / 300**2)
    valid = cells[cells > -9999.0]
    assert (fact.lowest_m, fact.highest_m) == pytest.approx((valid.min(), valid.max()))
    assert fact.read_percent == 100.0
    assert (fact.error_m, fact.looks_like, fact.slow_because) == (2.0, "bare ground", None)
    with rasterio.open(path) as dataset:
        west, south, east, north = rasterio.warp.transform_bounds(dataset.crs, "EPSG:4326", *dataset.bounds)
    assert (fact.west_deg, fact.south_deg, fact.east_deg, fact.north_deg) == pytest.approx(
        (west, south, east, north), abs=1e-6
    )
    assert any("gaps" in caution for caution in fact.cautions)
    assert dataclasses.asdict(fact)["name"] == "hills.tif"


@pytest.mark.parametrize("cell", [1.0, 2.0, 5.0])
def test_roofs_make_it_look_like_a_surface_model(tmp_path: Path, cell: float) -> None:
    ground = hills(400, cell=cell)
    bare = inspect_raster(RasterSource(path=write(tmp_path / "g.tif", ground, cell=cell)))
    town = inspect_raster(RasterSource(path=write(tmp_path / "s.tif", with_town(ground, cell=cell), cell=cell)))
    assert (bare.looks_like, town.looks_like) == ("bare ground", "surface model")
    assert any("declared as bare ground" in caution for caution in town.cautions)
    declared = inspect_raster(RasterSource(path=tmp_path / "s.tif", role="surface"))
    assert not any("declared as" in caution for caution in declared.cautions)
    misdeclared = inspect_raster(RasterSource(path=tmp_path / "g.tif", role="surface"))
    assert any("declared as a surface model" in caution for caution in misdeclared.cautions)


@pytest.mark.parametrize("grain", [1.0, 2.0])
def test_stairs_of_rounded_heights_are_not_taken_for_walls(tmp_path: Path, grain: float) -> None:
    stairs = np.round(hills(400, cell=1.0) / grain).astype(np.int16)
    path = write(tmp_path / "g.tif", stairs, cell=1.0)
    with rasterio.open(path, "r+") as dataset:
        dataset.scales = (grain,)
    assert inspect_raster(RasterSource(path=path)).looks_like == "bare ground"


def test_rough_grass_in_fine_cells_is_bare_ground(tmp_path: Path) -> None:
    grass = hills(400, cell=0.5) + np.random.default_rng(3).normal(0.0, 0.15, (400, 400)).astype(np.float32)
    path = write(tmp_path / "g.tif", grass, cell=0.5)
    assert inspect_raster(RasterSource(path=path)).looks_like == "bare ground"


@pytest.mark.parametrize(("cell", "height"), [(30.0, 1.0), (1.0, 0.0)])
def test_coarse_cells_and_level_ground_tell_nothing(tmp_path: Path, cell: float, height: float) -> None:
    cells = with_town(hills(200, cell=cell), cell=cell) * np.float32(height)
    assert inspect_raster(RasterSource(path=write(tmp_path / "g.tif", cells, cell=cell))).looks_like == "unclear"


def test_a_large_raster_is_read_in_part_and_says_so(tmp_path: Path) -> None:
    cells = np.tile(hills(300, cell=10.0), (10, 11))
    cells[:, :1650] = -1.0
    fact = inspect_raster(RasterSource(path=write(tmp_path / "g.tif", cells, nodata=-1.0, tiled=True)))
    assert 1.0 < fact.read_percent < 20.0
    assert fact.gap_percent == pytest.approx(50.0, abs=7.0)


def test_slow_layouts_are_said_with_a_remedy(tmp_path: Path) -> None:
    wide = np.zeros((8, 5000), np.int16)
    fact = inspect_raster(RasterSource(path=write(tmp_path / "wide.tif", wide, blockysize=1)))
    assert fact.slow_because is not None
    assert "strips of 1 x 5000" in fact.slow_because
    assert fact.remedy is not None
    assert "TILED=YES" in fact.remedy
    assert "wide.tif" in fact.remedy
    tiled = write(tmp_path / "t.tif", wide, tiled=True, blockxsize=256, blockysize=16)
    assert inspect_raster(RasterSource(path=tiled)).slow_because is None


def test_what_is_not_stated_is_said(tmp_path: Path) -> None:
    path = write(tmp_path / "g.tif", hills(50, cell=10.0))
    fact = inspect_raster(RasterSource(path=path))
    assert (fact.unit, fact.vertical_datum) == (None, None)
    text = " ".join(fact.cautions)
    for part in ("unit not stated", "datum not stated", "no nodata value"):
        assert part in text
    declared = RasterSource(path=path, vertical_unit="ft", vertical_datum="port datum", error_m=1.5)
    fact = inspect_raster(declared)
    assert (fact.unit, fact.vertical_datum, fact.error_m, fact.error_source) == (
        "feet",
        "port datum",
        1.5,
        "as declared",
    )
    assert fact.highest_m == pytest.approx(hills(50, cell=10.0).max() * 0.3048, rel=1e-6)


@pytest.mark.parametrize(
    ("crs", "cell", "said"),
    [
        ("EPSG:23030", 1.0, "10 m only"),  # ED50 by three parameters: 10 m in the EPSG data set
        ("EPSG:23030", 25.0, None),
        ("EPSG:32630", 1.0, None),
        ("+proj=tmerc +ellps=bessel +lon_0=-3", 25.0, "not known"),
    ],
)
def test_a_loose_horizontal_datum_is_said(tmp_path: Path, crs: str, cell: float, said: str | None) -> None:
    path = write(tmp_path / "g.tif", hills(50, cell=cell), cell=cell, crs=crs)
    cautions = [text for text in inspect_raster(RasterSource(path=path)).cautions if "horizontal datum" in text]
    assert len(cautions) == (said is not None)
    assert said is None or said in cautions[0]


def test_a_folder_is_told_as_one(tmp_path: Path) -> None:
    whole = hills(300, cell=10.0)
    for column in range(3):
        part = whole[:, column * 100 : column * 100 + 100]
        write(tmp_path / "tiles" / f"{column}.tif", part, at=(column * 1000.0, 0.0))
    fact = inspect_raster(RasterSource(path=tmp_path / "tiles"))
    single = inspect_raster(RasterSource(path=write(tmp_path / "w.tif", whole)))
    assert (fact.name, fact.files) == ("tiles", 3)
    assert (fact.west_deg, fact.east_deg) == pytest.approx((single.west_deg, single.east_deg), abs=1e-6)
    assert (fact.lowest_m, fact.highest_m) == pytest.approx((single.lowest_m, single.highest_m))


def test_extent_across_the_antimeridian_runs_on(tmp_path: Path) -> None:
    transform = Affine(0.01, 0.0, 179.0, 0.0, -0.01, 1.0)
    path = write(tmp_path / "g.tif", np.zeros((100, 200), np.int16), crs="EPSG:4326", transform=transform)
    fact = inspect_raster(RasterSource(path=path))
    assert (fact.west_deg, fact.east_deg) == pytest.approx((179.0, 181.0))


def test_cover_has_no_datum_and_no_look(tmp_path: Path) -> None:
    path = write(tmp_path / "c.tif", np.full((60, 60), 20, np.uint8), crs="EPSG:32623+5773")
    fact = inspect_raster(CoverSource(path=path, kind="tree"))
    assert (fact.role, fact.looks_like, fact.vertical_datum) == ("cover", "unclear", None)
    assert not any("datum" in caution for caution in fact.cautions)


def test_a_raster_that_is_all_gap_has_no_heights(tmp_path: Path) -> None:
    path = write(tmp_path / "g.tif", np.full((60, 60), -1.0, np.float32), nodata=-1.0)
    fact = inspect_raster(RasterSource(path=path))
    assert (fact.gap_percent, fact.lowest_m, fact.highest_m) == (100.0, None, None)
    assert (fact.looks_like, fact.abrupt_percent) == ("unclear", None)


def test_a_file_that_cannot_serve_is_refused(tmp_path: Path) -> None:
    with pytest.raises(RasterError, match="coordinate reference system"):
        inspect_raster(RasterSource(path=write(tmp_path / "g.tif", hills(50, cell=10.0), crs=None)))


def test_seams_are_measured_and_not_raised(tmp_path: Path) -> None:
    fine = RasterSource(path=write(tmp_path / "f.tif", np.full((300, 300), 50.0, np.float32), cell=10.0))
    far = RasterSource(path=write(tmp_path / "x.tif", np.full((50, 50), 9.0, np.float32), at=(90_000.0, 0.0)))
    feet = RasterSource(path=write(tmp_path / "c.tif", np.full((80, 80), 164.0, np.float32), cell=30.0))
    (seam,) = inspect_seams([fine, far, feet], role="ground")
    assert (seam.first, seam.second, seam.median_m) == ("f.tif", "c.tif", pytest.approx(114.0))
    assert seam.points == 25
    assert seam.is_refused
    assert inspect_seams([fine, far], role="ground") == ()


def test_datums_that_differ_are_told(tmp_path: Path) -> None:
    facts = [
        inspect_raster(RasterSource(path=write(tmp_path / name, hills(50, cell=10.0), crs=crs)))
        for name, crs in (("a.tif", "EPSG:32623+5773"), ("b.tif", "EPSG:32623+3855"), ("c.tif", "EPSG:32623"))
    ]
    assert "a.tif" in str(datum_conflict(facts))
    assert datum_conflict([facts[0], facts[2]]) is None


@pytest.mark.parametrize(
    ("cell", "role", "error"),
    [
        (0.5, "ground", 0.3),  # common practice, no source
        (10.0, "ground", 2.0),  # common practice, no source
        (30.0, "ground", 5.0),  # SRTM: 90 % error 5.6 to 9.0 m by continent (JPL, 2006; from memory) over 1.645
        (90.0, "surface", 5.0),
        (900.0, "ground", 15.0),  # common practice, no source
        (1.0, "surface", 0.5),
        (1.0, "cover", 1.0),
        (30.0, "cover", 6.0),  # from memory
    ],
)
def test_default_errors(cell: float, role: Any, error: float) -> None:
    assert default_error_m(cell, role) == error


@pytest.mark.parametrize(("floor", "is_told"), [(200.0, True), (0.0, False)])
def test_holes_of_zero_amid_high_land_are_told_and_a_sea_is_not(tmp_path: Path, floor: float, is_told: bool) -> None:
    """High land with two holes filled with 0; and an island with a sea around it and a lagoon near its level."""
    cells = hills(200, cell=10.0) - 200.0 + floor
    if floor:
        cells[40:44, 50:60] = 0.0
        cells[100:103, 100:103] = 0.0
        cells[150, 150] = 0.0  # one cell alone is an accident
    else:
        cells[cells < 3.0] = 0.0
    cautions = inspect_raster(RasterSource(path=write(tmp_path / "zeros.tif", cells))).cautions
    told = [text for text in cautions if "exactly 0" in text]
    assert bool(told) == is_told
    if told:
        assert told[0].startswith("49 cells of exactly 0 lie in 2 holes amid land of 202 m")
