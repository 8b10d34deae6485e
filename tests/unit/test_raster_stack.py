"""Several rasters as one: order, fall-through, folders, the antimeridian, seams, datums, threads."""

from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from affine import Affine

from fellspan.errors import SeamError, TerrainError, VerticalDatumError
from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.position import Position
from fellspan.terrain import handles
from fellspan.terrain.sources import RasterSource
from fellspan.terrain.stack import RasterStack

UTM = "EPSG:32623"
WEST, NORTH = 480_000.0, 3_992_000.0
A = Position(latitude_deg=36.03, longitude_deg=-45.215)
B = Position(latitude_deg=36.06, longitude_deg=-45.18)


def write(path: Path, cells: Any, *, cell: float = 10.0, at: tuple[float, float] = (0.0, 0.0), **options: Any) -> Path:
    """A UTM raster, its upper left corner `at` metres east and south of a fixed point."""
    cells = np.asarray(cells, dtype=np.float32)
    transform = Affine(cell, 0.0, WEST + at[0], 0.0, -cell, NORTH - at[1])
    profile = {"driver": "GTiff", "count": 1, "dtype": "float32", "crs": UTM, "transform": transform, "nodata": -1.0}
    path.parent.mkdir(parents=True, exist_ok=True)
    with rasterio.open(path, "w", height=cells.shape[0], width=cells.shape[1], **profile | options) as dataset:
        dataset.write(cells, 1)
    return path


def open_stack(*sources: Any) -> RasterStack:
    return RasterStack.open(
        [source if isinstance(source, RasterSource) else RasterSource(path=source) for source in sources],
        role="ground",
    )


def along(path: GeodesicPath, count: int = 400) -> np.ndarray:
    return np.linspace(0.0, path.length_m, count)


LINE = GeodesicPath.between(A, B)


def test_the_finest_answers_first_and_nodata_falls_through(tmp_path: Path) -> None:
    hole = np.full((1000, 1000), 10.0)
    hole[:, 300:500] = -1.0
    fine = write(tmp_path / "fine.tif", hole, cell=5.0)
    coarse = write(tmp_path / "coarse.tif", np.full((300, 300), 11.0), cell=30.0)
    stack = open_stack(coarse, fine)
    assert stack.names == ("fine.tif", "coarse.tif")
    assert stack.cell_m == pytest.approx(5.0, rel=1e-3)
    got = stack.sample(LINE, along(LINE))
    assert set(got.source.tolist()) == {0, 1}
    assert np.abs(got.value_m - np.where(got.source == 0, 10.0, 11.0)).max() < 1e-9
    # 2 m up to 12 m cells, 5 m in the SRTM class: the documented defaults
    assert (got.sigma_m == np.where(got.source == 0, 2.0, 5.0)).all()


def test_equally_fine_rasters_keep_the_order_declared(tmp_path: Path) -> None:
    first = write(tmp_path / "z.tif", np.full((500, 500), 3.0), cell=10.3)
    second = write(tmp_path / "a.tif", np.full((500, 500), 3.2), cell=10.0)
    stack = open_stack(first, second)
    assert stack.names == ("z.tif", "a.tif")
    assert (stack.sample(LINE, along(LINE)).source == 0).all()


def test_stated_error_replaces_the_default(tmp_path: Path) -> None:
    stack = open_stack(RasterSource(path=write(tmp_path / "a.tif", np.full((500, 500), 3.0)), error_m=0.7))
    assert stack.sample(LINE, [10.0]).sigma_m.tolist() == [0.7]


def test_where_nobody_has_data_is_a_gap(tmp_path: Path) -> None:
    stack = open_stack(write(tmp_path / "a.tif", np.full((50, 50), 3.0)))
    got = stack.sample(LINE, along(LINE))
    assert (got.source == -1).all()
    assert np.isnan(got.value_m).all()
    assert stack.cell_along(LINE) == stack.cell_m


def test_a_folder_of_tiles_is_one_raster(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(handles, "_KEPT_OPEN", 3)
    whole = np.random.default_rng(2).normal(100.0, 5.0, (600, 600)).astype(np.float32)
    folder = tmp_path / "tiles"
    for row in range(6):
        for column in range(6):
            part = whole[row * 100 : row * 100 + 100, column * 100 : column * 100 + 100]
            write(folder / f"t{row}{column}.tif", part, at=(column * 1000.0, row * 1000.0))
    (folder / "readme.txt").write_text("not a raster", encoding="utf-8")
    (folder / "t00.tfw").write_text("10", encoding="utf-8")
    write(tmp_path / "whole.tif", whole)
    tiled, single = open_stack(folder), open_stack(tmp_path / "whole.tif")
    assert len(tiled.names) == 36
    got, expected = tiled.sample(LINE, along(LINE, 3000)), single.sample(LINE, along(LINE, 3000))
    assert len(set(got.source.tolist())) > 4
    # only within half a cell of a tile's edge may they differ: there each tile holds its own edge cell
    same = np.abs(got.value_m - expected.value_m) < 1e-9
    assert 0.95 < same.mean() < 1.0
    assert np.isfinite(got.value_m).all()


def test_tiles_in_folders_inside_are_found_and_told_apart(tmp_path: Path) -> None:
    for name in ("north", "south"):
        write(tmp_path / "tiles" / name / "dtm.tif", np.full((500, 500), 3.0))
    stack = open_stack(tmp_path / "tiles")
    assert stack.names == ("north/dtm.tif", "south/dtm.tif")


def test_a_folder_without_rasters_is_refused(tmp_path: Path) -> None:
    (tmp_path / "notes.txt").write_text("x", encoding="utf-8")
    with pytest.raises(TerrainError, match="holds no raster"):
        open_stack(tmp_path)


def globe(path: Path, west: float, width_deg: int, *, value: Any = None) -> Path:
    """One-degree cells between 10 S and 10 N, each holding its own longitude east of Greenwich in 0..360."""
    centres = (west + np.arange(width_deg) + 0.5) % 360.0
    cells = np.broadcast_to(centres if value is None else value, (20, width_deg)).astype(np.float32)
    transform = Affine(1.0, 0.0, west, 0.0, -1.0, 10.0)
    profile = {"driver": "GTiff", "count": 1, "dtype": "float32", "crs": "EPSG:4326", "transform": transform}
    with rasterio.open(path, "w", height=20, width=width_deg, **profile) as dataset:
        dataset.write(cells, 1)
    return path


@pytest.mark.parametrize("west", [0.0, -180.0, -360.0, 170.0])
@pytest.mark.parametrize("eastward", [True, False])
def test_paths_cross_the_antimeridian_whichever_way_longitudes_are_counted(
    tmp_path: Path, west: float, eastward: bool
) -> None:
    raster = globe(tmp_path / "g.tif", west, 360 if west != 170.0 else 30)
    ends = [Position(latitude_deg=-3.0, longitude_deg=v) for v in (175.0, -176.0)]
    line = GeodesicPath.between(*(ends if eastward else reversed(ends)))
    distance = along(line, 500)
    _, longitude = line.positions(distance)
    got = open_stack(raster).sample(line, distance)
    assert np.isfinite(got.value_m).all()
    # clamped in the outer half cell of a raster that ends on the antimeridian: half a degree at most
    assert np.abs(got.value_m - longitude % 360.0).max() <= 0.5 + 1e-5


def test_two_rasters_meet_at_the_antimeridian(tmp_path: Path) -> None:
    east, west = globe(tmp_path / "e.tif", 170.0, 10), globe(tmp_path / "w.tif", -180.0, 10)
    ends = (Position(latitude_deg=2.0, longitude_deg=172.0), Position(latitude_deg=2.0, longitude_deg=-172.0))
    line = GeodesicPath.between(*ends)
    got = open_stack(east, west).sample(line, along(line, 500))
    _, longitude = line.positions(along(line, 500))
    assert np.array_equal(got.source, (longitude > 180.0).astype(np.int16))


def test_a_mercator_raster_is_read_right_up_to_its_own_seam(tmp_path: Path) -> None:
    """Coordinates jump by the whole width there, and nothing may be interpolated across."""
    half = 20037508.342789244
    cells = np.broadcast_to(np.arange(400, dtype=np.float32) + 0.5, (100, 400))
    transform = Affine(2 * half / 400, 0.0, -half, 0.0, -1e5, 5e6)
    profile = {"driver": "GTiff", "count": 1, "dtype": "float32", "crs": "EPSG:3857", "transform": transform}
    with rasterio.open(tmp_path / "m.tif", "w", height=100, width=400, **profile) as dataset:
        dataset.write(cells, 1)
    ends = (Position(latitude_deg=2.0, longitude_deg=177.0), Position(latitude_deg=3.0, longitude_deg=-177.0))
    line = GeodesicPath.between(*ends)
    distance = along(line, 5000)
    _, longitude = line.positions(distance)
    column = ((longitude + 180.0) % 360.0) / 360.0 * 400.0
    got = open_stack(tmp_path / "m.tif").sample(line, distance)
    assert np.abs(got.value_m - np.clip(column, 0.5, 399.5)).max() < 0.05


@pytest.mark.parametrize("crs", ["EPSG:4269", "EPSG:4326"])
def test_datum_shifts_that_fold_longitudes_do_no_harm(tmp_path: Path, crs: str) -> None:
    transform = Affine(0.01, 0.0, 179.0, 0.0, -0.01, 52.5)
    centres = np.broadcast_to(179.005 + 0.01 * np.arange(200), (100, 200))
    profile = {"driver": "GTiff", "count": 1, "dtype": "float64", "crs": crs, "transform": transform}
    with rasterio.open(tmp_path / "n.tif", "w", height=100, width=200, **profile) as dataset:
        dataset.write(centres, 1)
    ends = (Position(latitude_deg=52.0, longitude_deg=179.2), Position(latitude_deg=52.1, longitude_deg=-179.2))
    line = GeodesicPath.between(*ends)
    _, longitude = line.positions(along(line, 3000))
    got = open_stack(tmp_path / "n.tif").sample(line, along(line, 3000))
    assert np.abs(got.value_m - longitude).max() < 0.05 * 0.01


def test_a_step_within_the_errors_is_measured_and_said(tmp_path: Path) -> None:
    fine = write(tmp_path / "fine.tif", np.full((600, 600), 50.0), cell=10.0)
    coarse = write(tmp_path / "coarse.tif", np.full((300, 300), 54.0), cell=30.0)
    stack = open_stack(fine, coarse)
    assert not any("overlap" in note for note in stack.notes)
    (seam,) = stack.sample(LINE, along(LINE)).seams
    assert (seam.first, seam.second) == ("fine.tif", "coarse.tif")
    assert (seam.median_m, seam.p95_m) == pytest.approx((4.0, 4.0), abs=1e-9)
    assert seam.points == 64
    assert any("4.0 m higher" in note for note in stack.notes)


@pytest.mark.parametrize("step", [-18.0, 18.0])
def test_a_step_beyond_the_errors_is_refused(tmp_path: Path, step: float) -> None:
    fine = write(tmp_path / "fine.tif", np.full((600, 600), 50.0), cell=10.0)
    coarse = write(tmp_path / "coarse.tif", np.full((300, 300), 50.0 + step), cell=30.0)
    with pytest.raises(SeamError, match=r"18\.0 m") as caught:
        open_stack(fine, coarse).sample(LINE, along(LINE))
    # three times the root of 2^2 + 5^2
    assert "16.2 m" in str(caught.value)
    assert len(str(caught.value).splitlines()) <= 4
    open_stack(fine, RasterSource(path=coarse, error_m=6.0)).sample(LINE, along(LINE))


def test_noise_without_a_bias_is_no_reason_to_refuse(tmp_path: Path) -> None:
    noise = np.random.default_rng(4).normal(50.0, 25.0, (300, 300))
    fine = write(tmp_path / "fine.tif", np.full((600, 600), 50.0), cell=10.0)
    (seam,) = open_stack(fine, write(tmp_path / "c.tif", noise, cell=30.0)).sample(LINE, along(LINE)).seams
    assert seam.p95_m > seam.allowed_m
    assert not seam.is_refused


def test_overlapping_tiles_of_one_folder_count_too(tmp_path: Path) -> None:
    write(tmp_path / "tiles" / "a.tif", np.full((600, 300), 50.0))
    write(tmp_path / "tiles" / "b.tif", np.full((600, 450), 50.0), at=(1500.0, 0.0))
    stack = open_stack(tmp_path / "tiles")
    (seam,) = stack.sample(LINE, along(LINE)).seams
    assert seam.siblings
    assert seam.median_m == 0.0
    assert not any("overlap" in note for note in stack.notes)
    write(tmp_path / "tiles" / "b.tif", np.full((600, 450), 60.0), at=(1500.0, 0.0))
    with pytest.raises(SeamError, match=r"a\.tif and b\.tif disagree by 10\.0 m"):
        open_stack(tmp_path / "tiles").sample(LINE, along(LINE))


def test_rasters_side_by_side_have_no_seam_to_report(tmp_path: Path) -> None:
    west = write(tmp_path / "w.tif", np.full((600, 200), 50.0))
    east = write(tmp_path / "e.tif", np.full((600, 400), 90.0), at=(2000.0, 0.0))
    got = open_stack(west, east).sample(LINE, along(LINE))
    assert set(got.source.tolist()) == {0, 1}
    assert got.seams == ()


def test_different_vertical_datums_are_never_mixed(tmp_path: Path) -> None:
    one = write(tmp_path / "one.tif", np.full((50, 50), 1.0), crs="EPSG:32623+5773")
    two = write(tmp_path / "two.tif", np.full((50, 50), 1.0), crs="EPSG:32623+3855")
    assert open_stack(one).vertical_datum == "EGM96 height"
    with pytest.raises(VerticalDatumError) as caught:
        open_stack(one, two)
    for part in ("EGM96 height", "EGM2008 height", "one.tif", "two.tif", "state it with datum"):
        assert part in str(caught.value)
    assert open_stack(one, RasterSource(path=two, vertical_datum="EGM 96")).vertical_datum == "EGM96 height"


def test_ellipsoidal_heights_are_a_datum_of_their_own(tmp_path: Path) -> None:
    transform = Affine(0.001, 0.0, -45.3, 0.0, -0.001, 36.1)
    raster = write(tmp_path / "e.tif", np.full((50, 50), 1.0), crs="EPSG:4979", transform=transform)
    stack = open_stack(raster)
    assert stack.vertical_datum is not None
    assert stack.vertical_datum.startswith("ellipsoid")
    assert any("not above sea level" in note for note in stack.notes)
    with pytest.raises(VerticalDatumError):
        open_stack(raster, write(tmp_path / "o.tif", np.full((50, 50), 1.0), crs="EPSG:32623+5773"))


def test_what_is_not_stated_is_noted(tmp_path: Path) -> None:
    notes = open_stack(write(tmp_path / "a.tif", np.full((50, 50), 1.0))).notes
    assert any("a.tif" in note and "unit not stated, taken as metres" in note for note in notes)
    assert any("a.tif" in note and "datum not stated" in note for note in notes)
    declared = RasterSource(path=tmp_path / "a.tif", vertical_unit="m", vertical_datum="local mean sea level")
    assert open_stack(declared).notes == ()


def test_an_empty_stack_is_refused() -> None:
    with pytest.raises(TerrainError, match="no ground raster"):
        open_stack()


def test_threads_read_what_one_thread_reads(tmp_path: Path) -> None:
    rng = np.random.default_rng(6)
    fine = write(tmp_path / "f.tif", rng.normal(100.0, 2.0, (600, 600)), tiled=True, blockxsize=64, blockysize=64)
    coarse = write(tmp_path / "c.tif", rng.normal(100.0, 2.0, (300, 300)), cell=30.0, compress="deflate")
    stack = open_stack(fine, coarse)
    lines = [GeodesicPath.between(A, Position(latitude_deg=36.06, longitude_deg=-45.21 + i * 0.001)) for i in range(40)]
    alone = [stack.sample(line, along(line)).value_m for line in lines]
    with ThreadPoolExecutor(8) as pool:
        for _ in range(3):
            together = list(pool.map(lambda line: stack.sample(line, along(line)).value_m, lines))
            assert all(np.array_equal(a, b) for a, b in zip(alone, together, strict=True))
    stack.close()
    assert np.array_equal(stack.sample(lines[0], along(lines[0])).value_m, alone[0])


def test_cell_along_a_path_is_that_of_the_finest_raster_it_touches(tmp_path: Path) -> None:
    fine = write(tmp_path / "fine.tif", np.full((200, 200), 50.0), cell=2.0, at=(4000.0, 4000.0))
    coarse = write(tmp_path / "coarse.tif", np.full((300, 300), 50.0), cell=30.0)
    stack = open_stack(fine, coarse)
    assert stack.cell_m == pytest.approx(2.0, rel=1e-3)
    assert stack.cell_along(LINE) == pytest.approx(30.0, rel=2e-3)


def test_cells_of_degrees_are_measured_where_the_path_runs(tmp_path: Path) -> None:
    transform = Affine(1 / 60, 0.0, -50.0, 0.0, -1 / 60, 80.0)
    raster = write(tmp_path / "g.tif", np.full((4800, 600), 5.0), crs="EPSG:4326", transform=transform)
    stack = open_stack(raster)
    # one minute of longitude at 36 N: 1855.3 m (equator) * cos 36 ~ 1502 m
    assert stack.cell_along(LINE) == pytest.approx(1503.0, rel=2e-3)
    assert stack.cell_m == pytest.approx(1423.0, rel=2e-3)
