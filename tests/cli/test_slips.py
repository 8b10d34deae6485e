"""Longitude typed first, and paths across half the Earth: the answer names the slip, in `sight` and in `plan`."""

from pathlib import Path

import pytest
from made_studies import STUDY, unwrapped, write_ground

from fellspan.cli import main

OPTIONS = ("--ground", "ground.tif", "--frequency", "5.8 GHz", "--height-a", "30 m above ground")
GOOD_A, GOOD_B = "36.09,-45.28", "36.09,-45.25"
SWAPPED_A, SWAPPED_B = "-45.28,36.09", "-45.25,36.09"


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    write_ground(tmp_path / "ground.tif")
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.mark.parametrize(
    ("a", "b", "whose", "is_absurd"),
    [
        (SWAPPED_A, GOOD_B, "'A'", True),
        (GOOD_A, SWAPPED_B, "'B'", True),
        (SWAPPED_A, SWAPPED_B, "'A' and 'B'", False),
    ],
)
def test_sight_names_the_swapped_end(
    folder: Path, capsys: pytest.CaptureFixture[str], a: str, b: str, whose: str, is_absurd: bool
) -> None:
    code = main.run(("sight", a, b, *OPTIONS, "--height-b", "30 m above ground", "--no-save"))
    told = unwrapped(capsys.readouterr().err)
    assert code == 2
    assert f"with latitude and longitude of {whose} swapped the path would be 2.7 km long: latitude comes first" in told
    assert ("which no radio link spans" in told) is is_absurd
    assert len(told.strip().splitlines()) <= 4


def test_a_far_path_between_right_positions_is_called_absurd_only(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    code = main.run(("sight", GOOD_A, "40.5,-40.5", *OPTIONS, "--height-b", "30 m above ground", "--no-save"))
    told = unwrapped(capsys.readouterr().err)
    assert code == 2
    assert "km long, which no radio link spans" in told
    assert "swapped" not in told


def test_just_off_the_raster_nothing_is_suspected(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    code = main.run(("sight", GOOD_A, "36.2,-45.28", *OPTIONS, "--height-b", "30 m above ground", "--no-save"))
    told = unwrapped(capsys.readouterr().err)
    assert code == 2
    assert "add a raster that covers the stretch" in told
    assert "swapped" not in told
    assert "no radio link" not in told


def test_plan_names_the_swapped_site(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    study = STUDY.replace("36.09000 N, 45.25000 W", "45.25000 S, 36.09000 E")
    (folder / "study.toml").write_text(study, encoding="utf-8")
    assert main.run(("plan", "study.toml")) == 2
    assert "with latitude and longitude of 'East' swapped the path would be 2.7 km long" in capsys.readouterr().err
