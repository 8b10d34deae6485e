"""Files that are no rasters, broken ones and unplaced ones: a few clear lines, never GDAL's traceback or log."""

import random
import subprocess
import sys
import warnings
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from affine import Affine
from rasterio.control import GroundControlPoint
from rasterio.errors import NotGeoreferencedWarning
from rasterio.rpc import RPC

from fellspan.errors import FellspanError, RasterError
from fellspan.terrain.sources import RasterSource
from fellspan.terrain.stack import RasterStack

TRANSFORM = Affine(10.0, 0.0, 480_000.0, 0.0, -10.0, 3_992_000.0)


def write(path: Path, *, shape: tuple[int, int] = (300, 300), **options: Any) -> Path:
    profile: dict[str, Any] = {"driver": "GTiff", "count": 1, "dtype": "float32", "crs": "EPSG:32623"}
    profile |= {"transform": TRANSFORM} | options
    rng = np.random.default_rng(1)
    cells = rng.normal(100.0, 30.0, (profile["count"], *shape)).astype(profile["dtype"])
    with warnings.catch_warnings():
        # these files are made to be unplaced
        warnings.simplefilter("ignore", NotGeoreferencedWarning)
        with rasterio.open(path, "w", height=shape[0], width=shape[1], **profile) as dataset:
            dataset.write(cells)
    return path


def refused(path: Path | str, capfd: pytest.CaptureFixture[str], **declared: Any) -> str:
    """The message with which the path is refused, on opening or on reading its far corner."""
    with pytest.raises(RasterError) as caught:
        read_corner(path, **declared)
    message = str(caught.value)
    assert len(message.splitlines()) <= 4
    assert all(len(line) < 260 for line in message.splitlines())
    assert Path(path).name in message
    assert capfd.readouterr() == ("", "")
    return message


def read_corner(path: Path | str, **declared: Any) -> float:
    stack = RasterStack.open([RasterSource(path=path, **declared)], role="ground")
    try:
        # the last cells of 300 by 300 from TRANSFORM's corner
        return float(stack.sample_positions([36.0468], [-45.1893]).value_m[0])
    finally:
        stack.close()


def height_or_error(path: Path) -> float | FellspanError:
    try:
        return read_corner(path)
    except FellspanError as error:
        return error


def test_the_corner_that_these_tests_read_is_on_the_raster(tmp_path: Path) -> None:
    assert np.isfinite(read_corner(write(tmp_path / "t.tif")))


def test_a_missing_file(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    assert "there is no raster file" in refused(tmp_path / "nowhere.tif", capfd)


def test_a_text_file_named_tif(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "letter.tif"
    path.write_text("Dear sir, the elevation is 12 m.\n" * 50, encoding="utf-8")
    assert "is not a raster" in refused(path, capfd)


def test_an_empty_file(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "empty.tif"
    path.touch()
    assert "0 bytes" in refused(path, capfd)


@pytest.mark.parametrize("layout", [{"compress": "deflate"}, {}, {"tiled": True, "blockxsize": 64, "blockysize": 64}])
@pytest.mark.parametrize("kept", [0.02, 0.5, 0.98])
def test_a_truncated_tiff(tmp_path: Path, capfd: pytest.CaptureFixture[str], layout: Any, kept: float) -> None:
    path = write(tmp_path / "cut.tif", **layout)
    whole = path.read_bytes()
    path.write_bytes(whole[: int(len(whole) * kept)])
    refused(path, capfd)


def test_noise_in_the_middle_of_a_file_is_an_error_or_a_height_but_never_a_crash(tmp_path: Path) -> None:
    whole = bytearray(
        write(tmp_path / "t.tif", compress="deflate", tiled=True, blockxsize=64, blockysize=64).read_bytes()
    )
    rng = random.Random(11)
    outcomes = set()
    for number in range(60):
        broken = bytearray(whole)
        for _ in range(20):
            broken[rng.randrange(len(broken) if number % 2 else 800)] = rng.randrange(256)
        path = tmp_path / f"noise{number}.tif"
        path.write_bytes(broken)
        outcome = height_or_error(path)
        if isinstance(outcome, FellspanError):
            assert len(str(outcome).splitlines()) <= 4
            outcomes.add("refused")
        else:
            assert np.isnan(outcome) or -12_000.0 < outcome < 9_500.0
            outcomes.add("read")
    assert outcomes == {"refused", "read"}


def test_no_crs(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    message = refused(write(tmp_path / "bare.tif", crs=None), capfd)
    assert "no coordinate reference system" in message
    assert "gdal_edit.py -a_srs" in message


def test_a_local_crs(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    local = 'LOCAL_CS["site grid",UNIT["metre",1]]'
    assert "without a place on Earth" in refused(write(tmp_path / "local.tif", crs=local), capfd)


def test_depths(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    # EPSG:5715 is mean sea level depth, counted downwards
    assert "depth downwards" in refused(write(tmp_path / "sea.tif", crs="EPSG:32623+5715"), capfd)


def test_ground_control_points_only(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    points = [GroundControlPoint(r, c, -45.2 + c / 1e4, 36.1 - r / 1e4) for r in (0, 300) for c in (0, 300)]
    path = write(tmp_path / "gcp.tif", transform=Affine.identity(), crs="EPSG:4326", gcps=points)
    assert "ground control points" in refused(path, capfd)


def test_a_camera_model_only(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    row = [0.0] * 20
    model = RPC(
        height_off=0.0,
        height_scale=500.0,
        lat_off=36.0,
        lat_scale=0.1,
        line_den_coeff=[1.0, *row[1:]],
        line_num_coeff=[0.0, 0.0, -1.0, *row[3:]],
        line_off=150.0,
        line_scale=150.0,
        long_off=-45.0,
        long_scale=0.1,
        samp_den_coeff=[1.0, *row[1:]],
        samp_num_coeff=[0.0, 1.0, *row[2:]],
        samp_off=150.0,
        samp_scale=150.0,
    )
    path = write(tmp_path / "rpc.tif", transform=Affine.identity(), crs=None)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", NotGeoreferencedWarning)
        with rasterio.open(path, "r+") as dataset:
            dataset.rpcs = model
    assert "camera model" in refused(path, capfd)


def test_a_crs_but_no_geotransform(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    assert "does not say where" in refused(write(tmp_path / "nowhere.tif", transform=Affine.identity()), capfd)


def test_degrees_declared_as_metres_of_a_far_projection(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    far = Affine(1e6, 0.0, 1e12, 0.0, -1e6, 1e12)
    assert "does not lie on Earth" in refused(write(tmp_path / "far.tif", transform=far), capfd)


def test_a_picture(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    path = write(tmp_path / "shade.tif", count=3, dtype="uint8", photometric="RGB")
    assert "picture" in refused(path, capfd)


@pytest.mark.parametrize("band", [0, -1, 2])
def test_a_band_that_is_not_there(tmp_path: Path, capfd: pytest.CaptureFixture[str], band: int) -> None:
    message = refused(write(tmp_path / "t.tif"), capfd, band=band)
    assert f"no band {band}" in message
    assert "1 to 1" in message


def test_a_unit_that_is_no_length(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    path = write(tmp_path / "rad.tif")
    with rasterio.open(path, "r+") as dataset:
        dataset.units = ("dBm",)
    message = refused(path, capfd)
    assert "'dBm'" in message
    assert 'unit = "m"' in message
    assert np.isfinite(read_corner(path, vertical_unit="m"))


def test_complex_numbers(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    assert "complex" in refused(write(tmp_path / "c.tif", dtype="complex64"), capfd)


def test_heights_that_nothing_on_earth_has_are_gaps(tmp_path: Path) -> None:
    path = write(tmp_path / "t.tif")
    with rasterio.open(path, "r+") as dataset:
        dataset.write(np.full((300, 300), 1e20, np.float32), 1)
    assert np.isnan(read_corner(path))


def test_nothing_but_our_message_reaches_standard_error(tmp_path: Path) -> None:
    """In a process of its own: under pytest the log lines of rasterio go elsewhere."""
    path = write(tmp_path / "t.tif", compress="deflate", tiled=True, blockxsize=64, blockysize=64)
    whole = bytearray(path.read_bytes())
    whole[len(whole) // 3 : -100] = bytes(len(whole) - 100 - len(whole) // 3)
    path.write_bytes(whole)
    program = (
        "import sys\n"
        "from fellspan.errors import RasterError\n"
        "from fellspan.terrain.inspect import inspect_raster\n"
        "from fellspan.terrain.sources import RasterSource\n"
        "for path in sys.argv[1:]:\n"
        "    try:\n"
        "        inspect_raster(RasterSource(path=path))\n"
        "    except RasterError:\n"
        "        print('refused')\n"
    )
    text = tmp_path / "letter.tif"
    text.write_text("no raster", encoding="utf-8")
    done = subprocess.run(
        [sys.executable, "-c", program, str(path), str(text)], capture_output=True, text=True, check=True
    )
    assert done.stdout.split() == ["refused", "refused"]
    assert done.stderr == ""


def test_one_broken_tile_of_a_folder_is_named(tmp_path: Path, capfd: pytest.CaptureFixture[str]) -> None:
    write(tmp_path / "a.tif")
    (tmp_path / "b.tif").write_bytes(b"II*\x00")
    with pytest.raises(RasterError, match=r"b\.tif"):
        RasterStack.open([RasterSource(path=tmp_path)], role="ground")
    assert capfd.readouterr() == ("", "")


def test_strange_names_are_opened_as_they_are(tmp_path: Path) -> None:
    folder = tmp_path / "Höhen & mehr"
    folder.mkdir()
    assert np.isfinite(read_corner(write(folder / "gel ände#1.tif")))
