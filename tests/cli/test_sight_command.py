"""`fellspan sight`: positions however the shell split them, questions at a terminal, refusal in a pipe, the saved study."""

import json
import os
import pty
import re
import select
import subprocess
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest
from made_studies import A, B, run_command, unwrapped, write_ground

from fellspan.cli import main, sight_study
from fellspan.cli.sight_points import read_points
from fellspan.errors import FellspanError
from fellspan.quantities import AntennaHeight
from fellspan.study.reading import load_study

OPTIONS = (
    "--ground",
    "ground.tif",
    "--frequency",
    "5.8 GHz",
    "--height-a",
    "30 m above ground",
    "--height-b",
    "100 ft agl",
)


QUESTION_S = 60
"""How long each question may take on a busy machine."""


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    write_ground(tmp_path / "ground.tif")
    monkeypatch.chdir(tmp_path)
    return tmp_path


@dataclass(frozen=True)
class Done:
    returncode: int
    stdout: str
    stderr: str


@pytest.fixture
def run(folder: Path, capsys: pytest.CaptureFixture[str]) -> Callable[..., Done]:
    """The command inside this process, which is quick; standard input is no terminal here either."""

    def call(*arguments: str) -> Done:
        code = main.run(arguments)
        return Done(code, *capsys.readouterr())

    return call


@pytest.mark.parametrize(
    "words",
    [
        ["36.09,-45.28", "36.08,-45.25"],
        ["36.09", "-45.28", "36.08", "-45.25"],
        ["36.09,", "-45.28", "36.08,", "-45.25"],
        ["36.09,", "-45.28,", "36.08,", "-45.25"],
        ["36.09 N, 45.28 W", "36.08 N, 45.25 W"],
        ["36.09", "N", "45.28", "W", "36.08", "N", "45.25", "W"],
        ["36.09N", "45.28W", "36.08N", "45.25W"],
        ["36°05'24\"N 45°16'48\"W", "36°04'48\"N 45°15'00\"W"],
    ],
)
def test_two_positions_however_they_are_split(words: list[str]) -> None:
    points = [point.position for point in read_points(words, crs=None)]
    found = [(round(p.latitude_deg, 9), round(p.longitude_deg, 9)) for p in points]
    assert found == [(36.09, -45.28), (36.08, -45.25)]


@pytest.mark.parametrize("words", [["-33.1,18.2"], ["-33.1", "18.2"], ["-33.1,", "18.2"]])
def test_one_position(words: list[str]) -> None:
    (point,) = read_points(words, crs=None)
    assert (point.position.latitude_deg, point.position.longitude_deg) == (-33.1, 18.2)


@pytest.mark.parametrize("words", [["here", "there"], ["36.1", "-45.2", "36.2"], ["95,10", "36,10"]])
def test_what_is_no_pair_is_refused(words: list[str]) -> None:
    with pytest.raises(FellspanError) as caught:
        read_points(words, crs=None)
    assert words[0][:2] in str(caught.value)


@pytest.mark.parametrize(
    "points", [(A, B), ("36.09000,-45.28000", "36.09000,-45.25000"), ("36.09000", "-45.28000", "36.09000", "-45.25000")]
)
def test_clear_sight_is_said_and_saved(folder: Path, run: Callable[..., Done], points: tuple[str, ...]) -> None:
    done = run("sight", *points, *OPTIONS, "--study", "two.toml")
    assert done.returncode == 0, done.stderr
    assert "CLEAR ON BARE GROUND ONLY" in done.stdout
    assert "two.toml" in done.stderr
    (link,) = load_study(folder / "two.toml").links
    assert link.b.height_m == pytest.approx(30.48)
    again = run("plan", "two.toml")
    assert again.stdout.split("A - B")[1] == done.stdout.split("A - B")[1]


def test_southern_latitudes_are_no_options(folder: Path) -> None:
    done = run_command("sight", "-33.10000,18.20000", "-33.20000,18.30000", *OPTIONS, folder=folder)
    assert done.returncode == 2
    assert "no data" in done.stderr
    assert "33." in done.stderr


def test_saved_studies_are_never_overwritten(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for _ in range(2):
        assert main.run(["sight", A, B, *OPTIONS]) == 0
    assert len(list(folder.glob("sight-*.toml"))) == 2
    kept = folder / "mine.toml"
    kept.write_text("mine", encoding="utf-8")
    assert main.run(["sight", A, B, *OPTIONS, "--study", "mine.toml"]) == 2
    assert kept.read_text(encoding="utf-8") == "mine"
    assert "mine.toml exists" in capsys.readouterr().err


def test_nothing_is_saved_when_not_wanted_or_not_planned(folder: Path) -> None:
    assert main.run(["sight", A, B, *OPTIONS, "--no-save"]) == 0
    assert main.run(["sight", A, A, *OPTIONS]) == 2
    assert list(folder.glob("*.toml")) == []


def test_json_alone_on_standard_output(run: Callable[..., Done]) -> None:
    done = run("sight", A, B, *OPTIONS, "--json")
    assert json.loads(done.stdout)["links"][0]["verdict"] == "clear"


def test_a_surface_raster_is_another_basis(run: Callable[..., Done]) -> None:
    options = ["--surface", *OPTIONS[1:]]
    done = run("sight", A, B, *options, "--no-save")
    assert "CLEAR, by a raster of the surface" in done.stdout


def test_a_pipe_is_told_all_that_is_missing(run: Callable[..., Done]) -> None:
    done = run("sight", A)
    assert done.returncode == 2
    assert len(unwrapped(done.stderr).splitlines()) <= 4
    for words in ("the position of B", "--ground or --surface", "--frequency", "--height-a", "--height-b"):
        assert words in done.stderr
    assert done.stdout == ""


def test_a_height_above_nothing_is_refused_in_a_pipe(run: Callable[..., Done]) -> None:
    done = run("sight", A, B, *OPTIONS[:4], "--height-a", "12 m", "--height-b", "9 m agl")
    assert done.returncode == 2
    assert "--height-a '12 m' does not say above what" in done.stderr


@pytest.mark.parametrize("answer", ["roof", "above roof", "r", "the roof", "3 m above roof", "roof + 3 m"])
def test_above_what_takes_a_word_or_a_whole_height(monkeypatch: pytest.MonkeyPatch, answer: str) -> None:
    monkeypatch.setattr(sight_study, "can_ask", lambda: True)
    monkeypatch.setattr(sight_study, "ask", lambda question, read: read(answer))
    height = sight_study._with_reference("B", AntennaHeight(height_m=3.0, reference=None), "3 m")
    assert (height.height_m, height.reference) == (3.0, "roof")


def test_equipment_gives_level_and_margin(folder: Path, run: Callable[..., Done]) -> None:
    equipment = ("--power", "200 mW", "--gain-a", "25 dBi", "--gain-b", "19 dBi", "--threshold", "-72 dBm")
    done = run("sight", A, B, *OPTIONS, *equipment, "--study", "full.toml")
    assert done.returncode == 0, done.stderr
    # 23.01 + 25 + 19 - 116.35 dB of free space over 2.70 km at 5.8 GHz (P.525-5, equation 4), and a trace of the air
    level = re.search(r"Received +(-[0-9.]+) dBm at A", done.stdout)
    margin = re.search(r"Margin +([0-9.]+) dB at A", done.stdout)
    assert level is not None
    assert margin is not None
    assert float(level[1]) == pytest.approx(-49.34, abs=0.1)
    assert float(margin[1]) == pytest.approx(22.66, abs=0.1)
    (link,) = load_study(folder / "full.toml").links
    assert (link.antenna_a.gain_dbi, link.antenna_b.gain_dbi, link.radio.threshold_dbm) == (25.0, 19.0, -72.0)
    alike = run("sight", A, B, *OPTIONS, "--gain", "25 dBi", "--study", "alike.toml")
    assert alike.returncode == 0, alike.stderr
    assert load_study(folder / "alike.toml").links[0].antenna_b.gain_dbi == 25.0


@pytest.mark.parametrize(
    ("option", "word"),
    [
        (("--threshold", "72 dBm"), "did you mean '-72 dBm'"),
        (("--power", "61 dBm"), "60 dBm"),
        (("--unit", "feet"), "us-ft"),
    ],
)
def test_equipment_that_cannot_be_meant_is_refused(
    run: Callable[..., Done], option: tuple[str, str], word: str
) -> None:
    done = run("sight", A, B, *OPTIONS, *option, "--no-save")
    assert done.returncode == 2
    assert word in done.stderr
    assert len(unwrapped(done.stderr).splitlines()) <= 4


def test_what_a_raster_leaves_out_can_be_said(folder: Path, run: Callable[..., Done]) -> None:
    write_ground(folder / "bare.tif", crs="EPSG:32623")
    options = ("--ground", "bare.tif", *OPTIONS[2:], "--unit", "ft", "--datum", "EGM96", "--error", "1.5 m")
    done = run("sight", A, B, *options, "--study", "said.toml")
    assert done.returncode == 0, done.stderr
    assert "ground at 3.0 m" in done.stdout  # 10 ft
    (raster,) = load_study(folder / "said.toml").terrain.ground
    assert (raster.vertical_unit, raster.vertical_datum, raster.error_m) == ("ft", "EGM96", 1.5)


def test_cover_obstacles_and_survey_are_taken_in(folder: Path, run: Callable[..., Done]) -> None:
    write_ground(folder / "trees.tif", crs="EPSG:32623")
    (folder / "masts.csv").write_text(
        "name,kind,latitude_deg,longitude_deg,height_m,radius_m\nold mast,building,36.09000,-45.26500,45,2\n",
        encoding="utf-8",
    )
    cover = ("--cover", "trees.tif:tree", "--obstacles", "masts.csv:building")
    done = run("sight", A, B, *OPTIONS, *cover, "--study", "covered.toml")
    assert done.returncode == 0, done.stderr
    assert "BARE GROUND" not in done.stdout
    assert "old mast cuts the sight line" in " ".join(done.stdout.split())
    terrain = load_study(folder / "covered.toml").terrain
    assert terrain.cover[0].kind == "tree"
    assert terrain.obstacles[0].complete == ("building",)
    for option, name in (("--cover", "no.tif:tree"), ("--obstacles", "no.csv"), ("--survey", "no.csv")):
        refused = run("sight", A, B, *OPTIONS, option, name, "--no-save")
        assert (refused.returncode, f"{option}: there is no file 'no." in refused.stderr) == (2, True)


def test_questions_at_a_terminal(folder: Path) -> None:
    """The raster comes first and must cover the points; wrong answers are asked again; 'above what' takes a whole height."""
    answers = [
        ("Elevation raster", "nothing.tif"),
        ("Elevation raster", "far.tif"),
        ("Elevation raster", "ground.tif"),
        ("Bare ground, or", "g"),
        ("Position of B", "36.09000 N, 44.00000 W"),
        ("Position of B", B),
        ("Frequency", "5.8"),
        ("Frequency", "5.8 GHz"),
        ("height at A", "30 m above ground"),
        ("height at B", "3 m"),
        ("above what", "3 m"),
        ("above what", "3 m above roof"),
        ("Roof at B", "27 m"),
    ]
    write_ground(folder / "far.tif", crs="EPSG:32624+3855")
    code, shown = converse(folder, ["sight", A, "--study", "asked.toml"], answers)
    assert code == 0, shown
    assert "has no unit" in shown
    assert "no file 'nothing.tif'" in shown
    assert "no data at 36.09000" in shown
    assert "in far.tif" in shown
    assert "in ground.tif" in shown
    assert [
        line for line in re.sub("\x1b.[0-9]*m|\r", "", shown).splitlines() if len(line) > 80 and "/" not in line
    ] == []
    assert "CLEAR" in shown
    (link,) = load_study(folder / "asked.toml").links
    assert (link.b.height_m, link.b.height_reference, link.b.roof_m) == (3.0, "roof", 27.0)


def converse(folder: Path, arguments: list[str], answers: list[tuple[str, str]]) -> tuple[int, str]:
    """Run the command on a terminal of its own; each answer is typed when its question has been shown."""
    master, slave = pty.openpty()
    command = [sys.executable, "-c", "from fellspan.cli.main import main; main()", *arguments]
    with subprocess.Popen(command, cwd=folder, stdin=slave, stdout=slave, stderr=slave, close_fds=True) as process:
        os.close(slave)
        try:
            return _talk(process, master, answers)
        finally:
            process.kill()  # a question nobody answers would keep it, and this test, for ever
            os.close(master)


def _talk(process: "subprocess.Popen[bytes]", master: int, answers: list[tuple[str, str]]) -> tuple[int, str]:
    shown, seen = "", 0
    for question, answer in answers:
        deadline = time.monotonic() + QUESTION_S
        while question not in shown[seen:]:
            shown += _read(master, deadline)
        seen = len(shown)
        os.write(master, f"{answer}\n".encode())
    deadline = time.monotonic() + QUESTION_S
    while part := _read(master, deadline):
        shown += part
    return process.wait(timeout=QUESTION_S), shown


def _read(master: int, deadline: float) -> str:
    ready, _, _ = select.select([master], [], [], max(0.0, deadline - time.monotonic()))
    assert ready, "the command went silent"
    try:
        return os.read(master, 65536).decode()
    except OSError:  # how a terminal says that the other side has gone
        return ""
