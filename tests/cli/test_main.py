"""The command itself: help, version, exit codes, what it imports, how it ends."""

import json
import subprocess
import sys
from pathlib import Path

import pytest
from made_studies import STUDY, run_command, unwrapped, write_study

from fellspan import __version__
from fellspan.cli import main

HEAVY = ("numpy", "rasterio", "pydantic", "pyproj", "scipy", "folium", "shapely", "jinja2", "rich")


def test_help_imports_nothing_heavy() -> None:
    code = (
        "import json, sys; from fellspan.cli.main import run; code = run(['--help']); "
        "print(json.dumps([code, sorted({name.split('.')[0] for name in sys.modules})]))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, timeout=60)
    exit_code, modules = json.loads(done.stdout.splitlines()[-1])
    assert exit_code == 0
    assert "typer" in modules
    assert not set(HEAVY) & set(modules)


def test_help_lists_the_commands(capsys: pytest.CaptureFixture[str]) -> None:
    assert main.run(["--help"]) == 0
    out = capsys.readouterr().out
    for command in ("sight", "plan", "terrain", "init"):
        assert f"  {command}" in out
    assert main.run([]) == 0
    assert capsys.readouterr().out == out


@pytest.mark.parametrize("command", ["sight", "plan", "terrain", "init"])
def test_each_command_has_plain_help(command: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main.run([command, "--help"]) == 0
    out = capsys.readouterr().out
    assert out.startswith("Usage: fellspan")
    assert "\x1b" not in out


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    assert main.run(["--version"]) == 0
    assert capsys.readouterr().out == f"fellspan {__version__}\n"


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["plam"], "plam"),
        (["plan"], "STUDY"),
        (["plan", "x.toml", "--requre", "clear"], "--requre"),
        (["plan", "x.toml", "--require", "good"], "--require"),
        (["sight", "--criteria", "p520"], "p520"),
        (["sight", "--gaps", "water"], "water"),
    ],
)
def test_wrong_calls_are_input_errors(arguments: list[str], words: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main.run(arguments) == 2
    err = capsys.readouterr().err
    assert words in err
    assert len(unwrapped(err).splitlines()) <= 4


def raising(error: BaseException) -> object:
    def command() -> None:
        raise error

    return command


@pytest.fixture
def broken(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Path:
    study = write_study(tmp_path)
    monkeypatch.chdir(tmp_path)
    return study


@pytest.mark.parametrize(
    ("error", "code", "words"),
    [
        (KeyboardInterrupt(), 130, "interrupted"),
        (PermissionError(13, "Permission denied", "x.tif"), 4, "x.tif"),
        (OSError(28, "No space left on device"), 4, "No space left"),
        (ZeroDivisionError("oh"), 3, "this is a bug in fellspan: ZeroDivisionError: oh"),
    ],
)
def test_endings(
    broken: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
    error: BaseException,
    code: int,
    words: str,
) -> None:
    def fail(*_: object, **__: object) -> None:
        raise error

    monkeypatch.delenv("FELLSPAN_DEBUG", raising=False)
    monkeypatch.setattr("fellspan.cli.running.plan_study", fail)
    assert main.run(["plan", str(broken)]) == code
    err = capsys.readouterr().err
    assert words in err
    assert len(unwrapped(err.strip()).splitlines()) <= 2
    assert "Traceback" not in err


def test_a_bug_shows_its_traceback_when_asked(
    broken: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def fail(*_: object, **__: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setenv("FELLSPAN_DEBUG", "1")
    monkeypatch.setattr("fellspan.cli.running.plan_study", fail)
    assert main.run(["plan", str(broken)]) == 3
    assert "Traceback" in capsys.readouterr().err


@pytest.mark.parametrize("arguments", [["plan", "trial.toml"], ["plan", "trial.toml", "--json"], ["--help"]])
def test_a_reader_that_leaves_is_no_error(tmp_path: Path, arguments: list[str]) -> None:
    write_study(tmp_path)
    with subprocess.Popen(
        [sys.executable, "-c", "from fellspan.cli.main import main; main()", *arguments],
        cwd=tmp_path,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
    ) as process:
        assert process.stdout is not None
        assert process.stderr is not None
        process.stdout.close()
        err = process.stderr.read()
        assert process.wait(timeout=60) == 0
    assert err == b""


def test_a_terminal_that_lacks_letters_shows_question_marks(tmp_path: Path) -> None:
    study = write_study(tmp_path, STUDY.replace("Trial", "Trial 長"))
    done = run_command("plan", str(study), folder=tmp_path, env={"PYTHONIOENCODING": "iso-8859-1"})
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith("Trial ?")
