"""A run that is told to stop does so at once, in order or not: what is committed stays, and the same command goes on."""

import os
import re
import signal
import sqlite3
import subprocess
import time
from collections.abc import Callable
from contextlib import closing
from pathlib import Path

import fake_engine
import made_runs
import pytest

from fellspan.cli.stopping import PATIENCE_S

CHUNK, PAIRS = 16, 2 * 120
AT_ONCE_S = 2.0
"""And a process on a busy machine needs some more to be heard."""
BUSY_S = 4.0


def start(folder: Path, *more: str, seconds: float, fake: bool = True) -> subprocess.Popen[str]:
    """A run whose chunks take so long each; where they take for ever, its threads cannot end in order."""
    return subprocess.Popen(
        made_runs.command(*made_runs.arguments("out", "--chunk", str(CHUNK), "--threads", "2", *more), fake=fake),
        cwd=folder,
        env=made_runs.environment(**{fake_engine.SLOW: str(seconds), fake_engine.BEGUN: str(folder / "begun")}),
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )


def once(there: Callable[[], bool], process: subprocess.Popen[str]) -> None:
    deadline = time.monotonic() + 60.0
    while not there():
        assert process.poll() is None, process.communicate()
        assert time.monotonic() < deadline
        os.sched_yield()


def pairs_kept(folder: Path) -> int:
    """Pairs in the store; each chunk whole."""
    with closing(sqlite3.connect(folder / "out" / "candidates.sqlite", timeout=30.0)) as connection:
        assert connection.execute("PRAGMA integrity_check").fetchone()[0] == "ok"
        chunks = connection.execute("SELECT COALESCE(SUM(pairs), 0) FROM chunk").fetchone()[0]
        assert connection.execute("SELECT COUNT(*) FROM result").fetchone()[0] == chunks
        return int(chunks)


def stopped(process: subprocess.Popen[str], *signals: int) -> tuple[str, float]:
    """What it says, and how long it takes to end from the last signal on."""
    for number in signals:
        process.send_signal(number)
        began = time.monotonic()
        if number is not signals[-1]:
            process.poll()
    out, said = process.communicate(timeout=60.0)
    assert process.returncode == 130, said
    assert out == ""
    return said, time.monotonic() - began


def store_of(folder: Path) -> Path:
    return folder / "out" / "candidates.sqlite"


@pytest.mark.slow
@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
@pytest.mark.parametrize("seconds", [0.3, 60.0])
def test_it_ends_soon_keeps_what_is_whole_and_goes_on(tmp_path: Path, number: int, seconds: float) -> None:
    made_runs.write_inputs(tmp_path, places=PAIRS // 2)
    first = start(tmp_path, seconds=seconds)
    once(lambda: (tmp_path / "begun").exists() and (seconds > 1.0 or pairs_kept(tmp_path) > 0), first)
    said, took_s = stopped(first, number)
    assert took_s < PATIENCE_S + AT_ONCE_S + BUSY_S
    kept = pairs_kept(tmp_path)
    # A chunk kept at the very moment may not be counted yet; never is more told than is kept.
    told = re.fullmatch(rf"fellspan: stopped; (\d+) of {PAIRS} pairs kept; the same command goes on\n", said)
    assert told is not None, said
    assert kept - CHUNK <= int(told[1]) <= kept
    assert (kept == 0) == (seconds > 1.0)
    assert not [path for path in (tmp_path / "out").iterdir() if path.name.endswith((".part", "-journal"))]
    done = made_runs.run_here(tmp_path, *made_runs.arguments("out", "--chunk", str(CHUNK)))
    assert done.returncode == 0, done.stderr
    assert pairs_kept(tmp_path) == PAIRS


def test_a_second_signal_ends_it_at_once(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=PAIRS // 2)
    process = start(tmp_path, "--fresh", seconds=60.0)
    once((tmp_path / "begun").exists, process)
    process.send_signal(signal.SIGINT)
    # Two that come together are one: send until it is heard twice.
    began = time.monotonic()
    while process.poll() is None:
        process.send_signal(signal.SIGINT)
        os.sched_yield()
    _, said = process.communicate()
    # One that comes when the command has ended in order, and Python winds up, ends Python itself.
    assert process.returncode in (130, -signal.SIGINT)
    assert said == f"fellspan: stopped; 0 of {PAIRS} pairs kept; without --fresh it goes on\n"
    assert time.monotonic() - began < PATIENCE_S


@pytest.mark.slow
def test_before_the_run_and_while_files_are_written(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=PAIRS // 2)
    (tmp_path / "places.csv").unlink()
    os.mkfifo(tmp_path / "places.csv")  # whoever reads it waits
    reading = start(tmp_path, seconds=0.0)
    with (tmp_path / "places.csv").open("w", encoding="utf-8"):
        said, _ = stopped(reading, signal.SIGINT)
        assert said.endswith("fellspan: stopped before any pair was judged\n")
        assert not (tmp_path / "out").exists()
    (tmp_path / "places.csv").unlink()
    made_runs.write_inputs(tmp_path, places=10 * PAIRS // 2)
    writing = start(tmp_path, seconds=0.0)
    once(lambda: bool(list((tmp_path / "out").glob(".*.part"))) if (tmp_path / "out").exists() else False, writing)
    said, _ = stopped(writing, signal.SIGINT)
    assert said == "fellspan: stopped; all 2 400 pairs kept; the same command writes the files\n"
    assert sorted(path.name for path in (tmp_path / "out").iterdir()) == [".fellspan-run.lock", "candidates.sqlite"]
