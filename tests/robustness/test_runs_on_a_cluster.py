"""A run on a real Dask scheduler with worker processes on loopback: the bytes of a local run, whatever becomes of a worker."""

import os
import signal
import socket
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from pathlib import Path

import fake_engine
import made_runs
import pytest
from made_server import served

pytest.importorskip("distributed")

CHUNK = 16
PLACES = 200
DASK = [sys.executable, "-W", "ignore", "-m", "dask"]
"""Dask's own commands warn of their own dependencies; ours are checked elsewhere."""


def free_port() -> int:
    with socket.socket() as listening:
        listening.bind(("127.0.0.1", 0))
        return int(listening.getsockname()[1])


@contextmanager
def running(*words: str, folder: Path, log: str, **more: str) -> Iterator[subprocess.Popen[bytes]]:
    environment = made_runs.environment(**more)
    environment.pop("PYTHONWARNINGS")
    with (folder / log).open("wb") as stream:
        process = subprocess.Popen([*DASK, *words], cwd=folder, env=environment, stdout=stream, stderr=stream)
        try:
            yield process
        finally:
            process.kill()
            process.wait()


@contextmanager
def cluster(
    folder: Path, *, fake: bool, workers: int = 2, **more: str
) -> Iterator[tuple[str, list[subprocess.Popen[bytes]]]]:
    """A scheduler and workers, each a process of its own without a nanny that would bring it back; the scheduler comes last."""
    address = f"tcp://127.0.0.1:{free_port()}"
    with ExitStack() as stack:
        scheduler = (
            "scheduler",
            "--host",
            "127.0.0.1",
            "--port",
            address.rsplit(":", 1)[1],
            "--no-dashboard",
            "--no-show",
        )
        first = stack.enter_context(running(*scheduler, folder=folder, log="scheduler.log"))
        preload = ("--preload", "fake_engine") if fake else ()
        started = [
            stack.enter_context(
                running(
                    "worker", address, "--no-nanny", "--nthreads", "1", "--no-dashboard", "--host", "127.0.0.1",
                    "--local-directory", str(folder / f"scratch{number}"), *preload,
                    folder=folder, log=f"worker{number}.log", **more,
                )
            )
            for number in range(workers)
        ]  # fmt: skip
        yield address, [*started, first]


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_a_scheduler_that_dies_is_told_and_the_run_ends_here_with_the_same_bytes(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=PLACES)
    with cluster(tmp_path, fake=True, **{fake_engine.SLOW: "0.3"}) as (address, processes):
        process = run_on(address, tmp_path, "out", fake=True)
        wait_for_chunks(tmp_path / "out" / "candidates.sqlite", 3, process)
        for one in reversed(processes):  # the scheduler is the last
            os.kill(one.pid, signal.SIGKILL)
        _, said = process.communicate(timeout=150)
        assert process.returncode == 2, said
        assert "the scheduler is gone" in said
    assert len(said.strip().splitlines()[-4:]) <= 4
    for out in ("out", "local"):
        done = made_runs.run_here(tmp_path, *made_runs.arguments(out, "--chunk", str(CHUNK)))
        assert done.returncode == 0, done.stderr
    assert made_runs.outputs(tmp_path / "out") == made_runs.outputs(tmp_path / "local")


def run_on(address: str, folder: Path, out: str, *, fake: bool) -> subprocess.Popen[str]:
    environment = made_runs.environment()
    environment.pop("PYTHONWARNINGS")
    return subprocess.Popen(
        made_runs.command(
            *made_runs.arguments(out, "--chunk", str(CHUNK), *(("--scheduler", address) if address else ())), fake=fake
        ),
        cwd=folder,
        env=environment,
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )


def chunks_in(store: Path) -> int:
    import sqlite3

    if not store.exists():
        return 0
    connection = sqlite3.connect(store, timeout=30.0)
    try:
        return int(connection.execute("SELECT COUNT(*) FROM chunk").fetchone()[0])
    finally:
        connection.close()


def wait_for_chunks(store: Path, count: int, process: subprocess.Popen[str]) -> int:
    """How many chunks there are once there are so many, or once the run has ended or takes too long."""
    deadline = time.monotonic() + 120.0
    while (found := chunks_in(store)) < count and time.monotonic() < deadline and process.poll() is None:
        pass
    return found


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_one_worker_is_killed_midway_and_the_bytes_are_those_of_a_local_run(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=PLACES)
    local = made_runs.run_here(tmp_path, *made_runs.arguments("local", "--chunk", str(CHUNK)))
    assert local.returncode == 0, local.stderr
    with cluster(tmp_path, fake=True, **{fake_engine.SLOW: "0.3"}) as (address, workers):
        process = run_on(address, tmp_path, "out", fake=True)
        before = wait_for_chunks(tmp_path / "out" / "candidates.sqlite", 4, process)
        os.kill(workers[0].pid, signal.SIGKILL)
        _, said = process.communicate(timeout=150)
        assert process.returncode == 0, said
    assert 4 <= before < 2 * PLACES // CHUNK
    assert made_runs.outputs(tmp_path / "out") == made_runs.outputs(tmp_path / "local")


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_an_interrupted_run_leaves_the_cluster_at_once_and_goes_on_here(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=PLACES)
    with cluster(tmp_path, fake=True, **{fake_engine.SLOW: "0.3"}) as (address, _):
        process = run_on(address, tmp_path, "out", fake=True)
        wait_for_chunks(tmp_path / "out" / "candidates.sqlite", 3, process)
        process.send_signal(signal.SIGINT)
        began = time.monotonic()
        _, said = process.communicate(timeout=60)
        # a busy machine gets some seconds more than the two that it takes
        assert time.monotonic() - began < 6.0
        assert process.returncode == 130, said
        kept = chunks_in(tmp_path / "out" / "candidates.sqlite") * CHUNK
        assert said == f"fellspan: stopped; {kept} of {2 * PLACES} pairs kept; the same command goes on\n"
    for out in ("out", "local"):
        done = made_runs.run_here(tmp_path, *made_runs.arguments(out, "--chunk", str(CHUNK)))
        assert done.returncode == 0, done.stderr
    assert made_runs.outputs(tmp_path / "out") == made_runs.outputs(tmp_path / "local")


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_the_real_engine_on_a_worker_gives_the_bytes_of_a_local_run(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=20)
    with cluster(tmp_path, fake=False, workers=1) as (address, _):
        good = run_on(address, tmp_path, "out", fake=False)
        _, said = good.communicate(timeout=120)
        assert good.returncode == 0, said
    real = run_on("", tmp_path, "local", fake=False)
    _, said = real.communicate(timeout=120)
    assert real.returncode == 0, said
    assert made_runs.outputs(tmp_path / "out") == made_runs.outputs(tmp_path / "local")


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_workers_read_a_raster_behind_a_url_and_refuse_another_one(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=20)
    (tmp_path / "bucket").mkdir()
    (tmp_path / "bucket" / "ground.tif").write_bytes((tmp_path / "ground.tif").read_bytes())
    (tmp_path / "other" / "bucket").mkdir(parents=True)
    data = (tmp_path / "ground.tif").read_bytes()
    (tmp_path / "other" / "bucket" / "ground.tif").write_bytes(data[:-4] + bytes(4))
    study = (tmp_path / "study.toml").read_text(encoding="utf-8")
    local = made_runs.run_here(tmp_path, *made_runs.arguments("local"), fake=False)
    assert local.returncode == 0, local.stderr
    with served(tmp_path) as server:
        store = {**server.s3_settings(), "no_proxy": "127.0.0.1"}
        for name, address in (("http", server.url("ground.tif")), ("s3", "s3://bucket/ground.tif")):
            (tmp_path / f"{name}.toml").write_text(study.replace('"ground.tif"', f'"{address}"'), encoding="utf-8")
        with cluster(tmp_path, fake=False, workers=2, **store) as (address, _):
            for name in ("http", "s3"):
                words = made_runs.arguments(name, "--scheduler", address)
                words[1] = f"{name}.toml"
                ran = made_runs.run_here(tmp_path, *words, fake=False, PYTHONWARNINGS="default", **store)
                assert ran.returncode == 0, ran.stderr
                assert made_runs.outputs(tmp_path / name) == made_runs.outputs(tmp_path / "local")
        # workers that read another bucket under the same name
        with (
            served(tmp_path / "other") as other,
            cluster(tmp_path, fake=False, workers=1, **other.s3_settings()) as (address, _),
        ):
            words = made_runs.arguments("elsewhere", "--scheduler", address)
            words[1] = "s3.toml"
            ran = made_runs.run_here(tmp_path, *words, fake=False, PYTHONWARNINGS="default", **store)
            assert ran.returncode == 2
            assert "this worker finds another raster at s3://bucket/ground.tif" in " ".join(ran.stderr.split())


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_no_scheduler_and_another_version_are_told(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=20)
    process = run_on(f"tcp://127.0.0.1:{free_port()}", tmp_path, "out", fake=True)
    _, said = process.communicate(timeout=60)
    assert process.returncode == 2
    assert "no Dask scheduler answers" in said
    (tmp_path / "another.py").write_text(
        "import fellspan\n\ndef dask_setup(worker):\n    fellspan.__version__ = '0.0.1'\n"
        "    from fellspan.runs import cluster\n    cluster.__version__ = '0.0.1'\n",
        encoding="utf-8",
    )
    with cluster(tmp_path, fake=True, workers=0) as (address, _):
        preload = ("--preload", str(tmp_path / "another.py"))
        with running("worker", address, "--no-nanny", "--no-dashboard", *preload, folder=tmp_path, log="w.log"):
            process = run_on(address, tmp_path, "out", fake=True)
            _, said = process.communicate(timeout=60)
    assert process.returncode == 2
    assert "has fellspan 0.0.1, and here it is" in said
