"""What people bring by mistake: at most four clear lines (wrapped) on standard error, exit code 2, and nothing else."""

import subprocess
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import rasterio
from made_studies import STUDY, A, B, run_command, unwrapped, write_ground, write_study
from rasterio.transform import Affine

from fellspan.cli import main


def sight(a: str = A, b: str = B, ground: str = "ground.tif", height: str = "30 m above ground") -> list[str]:
    heights = ["--height-a", height, "--height-b", height]
    return ["sight", a, b, "--ground", ground, "--frequency", "5.8 GHz", *heights, "--no-save"]


def study(text: str) -> Callable[[Path], list[str]]:
    def prepare(folder: Path) -> list[str]:
        return ["plan", str(write_study(folder, text))]

    return prepare


def no_crs(folder: Path) -> list[str]:
    write_ground(folder / "ground.tif", crs=None)
    return sight()


def hole(folder: Path) -> list[str]:
    write_ground(folder / "ground.tif", hole=True)
    return sight()


def text_as_raster(folder: Path) -> list[str]:
    (folder / "ground.tif").write_text("no raster at all\n", encoding="utf-8")
    return sight()


def truncated(folder: Path) -> list[str]:
    path = folder / "ground.tif"
    noise = np.random.default_rng(7).normal(10.0, 1.0, (400, 600)).astype(np.float32)
    profile = {
        "driver": "GTiff", "height": 400, "width": 600, "count": 1, "dtype": "float32", "crs": "EPSG:32623+3855",
        "transform": Affine(10.0, 0.0, 474_000.0, 0.0, -10.0, 3_997_000.0), "compress": "deflate",
    }  # fmt: skip
    with rasterio.open(path, "w", **profile) as raster:
        raster.write(noise, 1)
    raw = path.read_bytes()
    path.write_bytes(raw[: len(raw) // 10])
    return sight()


def off_the_raster(folder: Path) -> list[str]:
    write_ground(folder / "ground.tif")
    return sight(b="36.09000 N, 44.90000 W")


def on_good_ground(*arguments: str) -> Callable[[Path], list[str]]:
    def prepare(folder: Path) -> list[str]:
        write_ground(folder / "ground.tif")
        return list(arguments)

    return prepare


def empty_study(folder: Path) -> list[str]:
    (folder / "empty.toml").touch()
    return ["plan", str(folder / "empty.toml")]


def mixed_datums(folder: Path) -> list[str]:
    write_ground(folder / "other.tif", crs="EPSG:32623+5773")
    return ["plan", str(write_study(folder, STUDY.replace('"ground.tif"', '["ground.tif", "other.tif"]')))]


def site_datum(folder: Path) -> list[str]:
    text = STUDY.replace('height = "30 m above ground"', 'height = "60 m above sea level"\ndatum = "EGM96"', 1)
    return ["plan", str(write_study(folder, text))]


CASES: dict[str, tuple[Callable[[Path], list[str]], tuple[str, ...]]] = {
    "no CRS": (no_crs, ("ground.tif",)),
    "path off the raster": (off_the_raster, ("ground.tif", "km")),
    "hole in the middle": (hole, ("ground.tif", "km", "gaps")),
    "both points the same": (on_good_ground(*sight(b=A)), ("same place",)),
    "latitude 91": (on_good_ground(*sight(a="91.00000, -45.28000")), ("91", "-90 to 90")),
    "negative height": (on_good_ground(*sight(height="-3 m above ground")), ("-3 m above ground", "0 to 1000 m")),
    "height NaN": (on_good_ground(*sight(height="nan m above ground")), ("nan m above ground",)),
    "position NaN": (on_good_ground(*sight(a="nan, nan")), ("nan",)),
    "NaN in a study": (study(STUDY.replace('"5.8 GHz"', "nan")), ("trial.toml", "radio 'radio'", "nan")),
    "a text file named .tif": (text_as_raster, ("ground.tif",)),
    "a truncated TIFF": (truncated, ("ground.tif",)),
    "a 0-byte study": (empty_study, ("empty.toml", "empty")),
    "an unknown key": (study(STUDY.replace("threshold", "treshold")), ("'treshold'", "did you mean 'threshold'")),
    "an undefined site": (study(STUDY.replace('a = "West"', 'a = "Wset"')), ("'Wset'", "did you mean 'West'")),
    "mixed vertical datums": (mixed_datums, ("EGM96", "EGM2008")),
    "a site of another datum": (site_datum, ("West", "EGM96", "EGM2008")),
    "no frequency in a pipe": (on_good_ground("sight", A, B, "--ground", "ground.tif"), ("--frequency",)),
    "no such raster": (on_good_ground(*sight(ground="nothing.tif")), ("nothing.tif",)),
    "a study that is a folder": (on_good_ground("plan", "."), ("folder",)),
}


@pytest.mark.parametrize("case", CASES)
def test_four_lines_and_exit_code_2(
    case: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capfd: pytest.CaptureFixture[str]
) -> None:
    prepare, words = CASES[case]
    monkeypatch.chdir(tmp_path)
    arguments = prepare(tmp_path)
    capfd.readouterr()
    code = main.run(arguments)
    out, err = capfd.readouterr()
    assert code == 2, err
    assert 1 <= len(unwrapped(err).splitlines()) <= 4, err
    assert out == ""
    assert "Traceback" not in err
    for word in words:
        assert word in err, err


@pytest.mark.parametrize("case", ["hole in the middle", "a truncated TIFF", "an unknown key"])
def test_the_real_command_says_the_same(case: str, tmp_path: Path) -> None:
    """Libraries below Python may write to standard error by themselves; only a process of its own shows it."""
    arguments = CASES[case][0](tmp_path)
    done: subprocess.CompletedProcess[str] = run_command(*arguments, folder=tmp_path)
    assert done.returncode == 2
    assert 1 <= len(unwrapped(done.stderr).splitlines()) <= 4, done.stderr
    assert done.stdout == ""
