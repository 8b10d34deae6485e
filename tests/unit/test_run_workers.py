"""What a worker of a run refuses, and what is told where there can be none. The engine is a fake one."""

import sys
from dataclasses import replace
from pathlib import Path

import fake_engine
import made_runs
import pytest

from fellspan.cli.main import run as run_command
from fellspan.errors import RunError
from fellspan.runs import work
from fellspan.runs.inputs import files_alike
from fellspan.runs.listing import PairList
from fellspan.study.screening_study import load_screening


@pytest.fixture
def inputs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setattr(work, "screen_pairs", fake_engine.screen_pairs)
    made_runs.write_inputs(tmp_path, places=40)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_a_worker_that_finds_other_files_or_is_another_version_refuses(inputs: Path) -> None:
    found = load_screening(inputs / "study.toml", hubs=inputs / "hubs.csv", places=inputs / "places.csv")
    pairs = PairList(hubs=found.candidates.hubs, places=found.candidates.places)
    files = files_alike(found.study)
    assert [Path(name).name for name, _ in files] == ["ground.tif"]
    job = work.job_of(next(pairs.chunks()), found.candidates, study=found.study, run="one", files=files)
    try:
        assert work.work(job).hub.size == 80
        with pytest.raises(RunError, match=r"bytes, and the run rests on one with"):
            work.work(replace(job, run="two", files=((files[0][0], files[0][1] + 1),)))
        with pytest.raises(RunError, match="cannot read"):
            work.work(replace(job, run="three", files=(("/nowhere/ground.tif", 1),)))
        with pytest.raises(RunError, match=r"this worker runs Fellspan 0\.1\.0, and the run was started by 7\.0"):
            work.work(replace(job, version="7.0"))
    finally:
        work.close_terrain()


def test_dask_that_is_not_installed_is_told(
    inputs: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setitem(sys.modules, "distributed", None)
    assert run_command(made_runs.arguments("out", "--scheduler", "tcp://127.0.0.1:1")) == 2
    assert '.venv/bin/pip install -e ".[cluster]"' in " ".join(capsys.readouterr().err.split())
