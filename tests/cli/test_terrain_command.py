"""`fellspan terrain`: readable at 80 columns, JSON as the API has it, bad files told beside good ones."""

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from affine import Affine
from made_studies import unwrapped

from fellspan.cli.terrain_command import terrain_command


def write(path: Path, cells: Any, **options: Any) -> str:
    cells = np.asarray(cells, dtype=np.float32)
    transform = Affine(10.0, 0.0, 480_000.0, 0.0, -10.0, 3_992_000.0)
    profile = {"driver": "GTiff", "count": 1, "dtype": "float32", "crs": "EPSG:32623", "transform": transform}
    with rasterio.open(path, "w", height=cells.shape[0], width=cells.shape[1], **profile | options) as dataset:
        dataset.write(cells, 1)
    return str(path)


def hills(step: float = 0.0) -> np.ndarray:
    return np.add.outer(np.arange(120.0), np.arange(90.0)) / 10.0 + step


def test_a_page_tells_what_the_raster_holds(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    raster = write(tmp_path / "hills.tif", hills(), nodata=-1.0, crs="EPSG:32623+5773")
    assert terrain_command([raster]) == 0
    shown = capsys.readouterr()
    assert shown.err == ""
    assert all(len(line) <= 80 for line in shown.out.splitlines())
    for part in (
        "hills.tif",
        "90 x 120 of 10.00 m x 10.00 m on the ground",
        "EGM96 height",
        "vertical unit  metres",
        "heights        0.0 m to 20.8 m",
        "gaps           none",
        "assumed error  2 m",
        "bare ground",
        " N to ",
        " W to ",
    ):
        assert part in shown.out


def test_several_are_compared_where_they_overlap(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    one, two = write(tmp_path / "one.tif", hills()), write(tmp_path / "two.tif", hills(20.0))
    assert terrain_command([one, two]) == 0
    text = " ".join(capsys.readouterr().out.split())
    assert "where one.tif and two.tif overlap, the second is 20.0 m higher in the median" in text
    assert "planning would refuse them together" in text


def test_a_bad_file_is_told_and_the_good_one_shown(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    bad = tmp_path / "bad.tif"
    bad.write_text("no raster", encoding="utf-8")
    assert terrain_command([str(bad), write(tmp_path / "good.tif", hills())]) == 2
    shown = capsys.readouterr()
    assert "good.tif" in shown.out
    assert shown.err.startswith("fellspan: bad.tif is not a raster")
    assert len(unwrapped(shown.err).splitlines()) <= 4


def test_datums_that_differ_are_an_error_after_the_facts(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    one = write(tmp_path / "one.tif", hills(), crs="EPSG:32623+5773")
    two = write(tmp_path / "two.tif", hills(), crs="EPSG:32623+3855")
    assert terrain_command([one, two]) == 2
    shown = capsys.readouterr()
    assert "one.tif" in shown.out
    assert "two.tif" in shown.out
    assert "different vertical datums" in shown.err


def test_json_is_what_the_api_returns(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    one, two = write(tmp_path / "one.tif", hills()), write(tmp_path / "two.tif", np.full((9, 9), -1.0), nodata=-1.0)
    assert terrain_command([one, two], as_json=True, role="surface") == 0
    told = json.loads(capsys.readouterr().out)
    assert [raster["name"] for raster in told["rasters"]] == ["one.tif", "two.tif"]
    assert told["rasters"][0]["role"] == "surface"
    assert told["rasters"][1]["lowest_m"] is None
    assert told["seams"] == []
    assert told["errors"] == []


def test_control_characters_of_a_file_name_do_not_reach_the_terminal(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    # a bell, since typer itself takes colours out where nobody watches
    assert terrain_command([write(tmp_path / "a\ab.tif", hills()), str(tmp_path / "c\ad.tif")]) == 2
    shown = capsys.readouterr()
    assert "a b.tif" in shown.out
    assert "c d.tif" in shown.err
    assert "\a" not in shown.out + shown.err
