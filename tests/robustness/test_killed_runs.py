"""A run that is killed at any moment loses nothing, doubles nothing, and ends with the bytes of one that was not."""

import random
import signal
import sqlite3
import subprocess
import time
from pathlib import Path

import fake_engine
import made_runs
import pytest

PAIRS, CHUNK = 2 * 400, 16
MOMENTS = 20
SLOW = {fake_engine.SLOW: "0.08"}


def start(folder: Path, out: str, **more: str) -> subprocess.Popen[bytes]:
    return subprocess.Popen(
        made_runs.command(*made_runs.arguments(out, "--chunk", str(CHUNK)), fake=True),
        cwd=folder,
        env=made_runs.environment(**more),
        stdin=subprocess.DEVNULL,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )


def chunks_kept(store: Path) -> set[int]:
    """Finished chunks, after whatever a killed writer left behind is rolled back; each with all its pairs."""
    if not store.exists():
        return set()
    connection = sqlite3.connect(store)
    try:
        assert connection.execute("PRAGMA integrity_check").fetchone()[0] == "ok"
        kept = {number for (number,) in connection.execute("SELECT id FROM chunk")}
        assert connection.execute("SELECT COUNT(*) FROM result").fetchone()[0] == len(kept) * CHUNK
        return kept
    finally:
        connection.close()


@pytest.mark.slow
@pytest.mark.timeout(1200)
def test_killed_at_twenty_random_moments_the_bytes_are_the_same(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=PAIRS // 2)
    began = time.monotonic()
    assert start(tmp_path, "whole", **SLOW).wait(timeout=200) == 0
    length_s = time.monotonic() - began
    whole = made_runs.outputs(tmp_path / "whole")
    lot, store = random.Random(20), tmp_path / "out" / "candidates.sqlite"
    kept: set[int] = set()
    killed = grew = 0
    for _ in range(10 * MOMENTS):
        process = start(tmp_path, "out", **SLOW)
        try:
            # from before the store is made to after the last chunk, when files are written
            process.wait(timeout=lot.uniform(0.1, 1.15) * length_s)
            grew += kept != chunks_kept(store)
            for path in (tmp_path / "out").iterdir():
                path.unlink()
            kept = set()
            continue
        except subprocess.TimeoutExpired:
            process.send_signal(signal.SIGKILL)
            process.wait()
        killed += 1
        now = chunks_kept(store)
        assert kept <= now, "a chunk that was there is lost"
        grew += kept != now
        kept = now
        if killed == MOMENTS:
            break
    assert killed == MOMENTS
    assert grew >= 5, "the moments fell where nothing was being done"
    assert start(tmp_path, "out").wait(timeout=200) == 0
    assert made_runs.outputs(tmp_path / "out") == whole
    assert sorted(path.name for path in (tmp_path / "out").iterdir()) == sorted(
        path.name for path in (tmp_path / "whole").iterdir()
    )


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_two_runs_at_once_and_an_interrupted_one(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=PAIRS // 2)
    first = start(tmp_path, "out", **{fake_engine.SLOW: "2"})
    store = tmp_path / "out" / "candidates.sqlite"
    try:
        deadline = time.monotonic() + 60.0
        while not store.exists() and time.monotonic() < deadline:
            pass
        second = made_runs.run_here(tmp_path, *made_runs.arguments("out", "--chunk", str(CHUNK)))
        assert second.returncode == 2
        assert "another run is at work" in second.stderr
    finally:
        first.send_signal(signal.SIGINT)
        assert first.wait(timeout=60) == 130
    assert not [path for path in (tmp_path / "out").iterdir() if path.name.endswith((".part", "-journal"))]
    assert len(chunks_kept(store)) < PAIRS // CHUNK
    assert made_runs.run_here(tmp_path, *made_runs.arguments("out", "--chunk", str(CHUNK))).returncode == 0
    assert len(chunks_kept(store)) == PAIRS // CHUNK
