"""`fellspan candidates` with the real engine and terrain: what it prints and writes, and that a pair's result is its plan's."""

import csv
import json
import os
import subprocess
import sys
from pathlib import Path

import made_runs
import pytest
from made_studies import unwrapped

from fellspan.cli.main import run
from fellspan.planning.planner import plan_study
from fellspan.report import candidates_page
from fellspan.study.reading import load_study

SAMPLE = Path(__file__).resolve().parents[2] / "sample_terrain"


def rows_of(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


@pytest.fixture
def inputs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    made_runs.write_inputs(tmp_path, places=12)
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr(candidates_page, "shaded_relief", lambda *_, **__: None)  # has tests of its own, and takes long
    return tmp_path


@pytest.mark.slow
def test_a_chosen_pair_has_the_numbers_of_its_plan(inputs: Path) -> None:
    assert run(made_runs.arguments()) == 0
    first = {row["place"]: row for row in rows_of(inputs / "out" / "best.csv") if row["rank"] == "1"}
    plan = plan_study(load_study(inputs / "out" / "chosen.toml"))
    assert len(plan.links) >= 5
    for linked in plan.links:
        result, row = linked.result, first[linked.result.b]
        assert result.name == f"{row['hub']} - {row['place']}"
        assert (result.verdict, result.signal_verdict, result.basis) == (
            row["verdict"], row["signal_verdict"], row["basis"],
        )  # fmt: skip
        assert result.distance_m == pytest.approx(float(row["distance_m"]), abs=0.051)
        assert result.clearance[result.governing].worst_fraction == pytest.approx(
            float(row["worst_fraction"]), abs=6e-4
        )
        assert result.received_dbm.at_b == pytest.approx(float(row["received_at_place_dbm"]), abs=0.006)
        assert result.margin_db.at_a == pytest.approx(float(row["margin_at_hub_db"]), abs=0.006)


def test_listed_pairs_alone(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (inputs / "pairs.csv").write_text("hub,place\nNorth,place 00003\nSouth,place 00001\n", encoding="utf-8")
    assert run(made_runs.arguments("out", "--pairs", "pairs.csv", "--json")) == 0
    assert json.loads(capsys.readouterr().out)["pairs"] == 2
    assert [(row["hub"], row["place"]) for row in rows_of(inputs / "out" / "candidates.csv")] == [
        ("North", "place 00003"),
        ("South", "place 00001"),
    ]


def test_a_gap_and_one_place_are_the_status_of_their_pairs(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    text = (inputs / "places.csv").read_text(encoding="utf-8")
    more = "off the raster,36.07000,-45.10000,6 m above ground\nat the hub,36.08500,-45.26000,6 m above ground\n"
    (inputs / "places.csv").write_text(text + more, encoding="utf-8")
    assert run(made_runs.arguments()) == 0
    rows = {(row["hub"], row["place"]): row for row in rows_of(inputs / "out" / "candidates.csv")}
    gap = rows["South", "off the raster"]
    assert gap["status"] == "gap"
    assert float(gap["gap_from_m"]) > 0.0
    assert rows["North", "at the hub"]["status"] == "same place"
    page = capsys.readouterr().out
    assert "over a gap in the terrain" in page
    assert "at one and the same place" in page


WRONG = [
    (("--radio", "none"), "there is no radio named 'none'"),
    (("--place-antenna", "horn"), "there is no antenna named 'horn'"),
    (("--place-height", "6 m"), "does not say above what"),
    (("--min-distance", "5 km", "--max-distance", "2 km"), "5000 m, is not below the greatest, 2000 m"),
    (("--max-distance", "far"), "--max-distance: 'far'"),
    (("--place-height", "6"), "--place-height: length '6' has no unit"),
    (("--lines", "some"), "--lines 'some' is not allowed"),
    (("--best", "0"), "'--best'"),
    (("--scheduler", "nowhere"), "nowhere"),
]  # fmt: skip


@pytest.mark.parametrize(("more", "said"), WRONG, ids=[" ".join(more) for more, _ in WRONG])
def test_a_wrong_wish_is_told(
    inputs: Path, more: tuple[str, ...], said: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(made_runs.arguments("out", *more)) == 2
    message = capsys.readouterr().err
    assert said in " ".join(message.split())
    assert len(unwrapped(message).splitlines()) <= 4


STUDIES = [
    ("[candidates]", "[candidates]\nradyo = 'x'", "radyo"),
    ('antenna_place = "dish"', 'antenna_place = "dash"', "there is no antenna named 'dash'"),
    ("[[antenna]]", '[[radio]]\nname = "b"\nfrequency = "6 GHz"\n\n[[antenna]]', "several radios"),
    ('ground = "ground.tif"', 'ground = "none.tif"', "none.tif"),
]  # fmt: skip


@pytest.mark.parametrize(("was", "now", "said"), STUDIES, ids=[said for *_, said in STUDIES])
def test_a_wrong_study_is_told(inputs: Path, was: str, now: str, said: str, capsys: pytest.CaptureFixture[str]) -> None:
    path = inputs / "study.toml"
    path.write_text(path.read_text(encoding="utf-8").replace(was, now), encoding="utf-8")
    assert run(made_runs.arguments()) == 2
    message = capsys.readouterr().err
    assert said in " ".join(message.split())
    assert "study.toml" in message
    assert len(unwrapped(message).splitlines()) <= 4


HUBS = [
    ("14 dBi,90,7,25 dB,180", "14 dBi,90,,25 dB,180", "row 2: elevation_width is missing"),
    ("14 dBi,90,7,25 dB,180", "14 dBi,90,7,,180", "row 2: front_to_back is missing"),
    ("14 dBi,90,7,25 dB,180", "14 dBi,90,7,25 dB,400", "row 2: bearing '400' is not 0 to 360 degrees"),
    ("14 dBi,90,7,25 dB,180", "14,90,7,25 dB,180", "row 2: gain"),
]


@pytest.mark.parametrize(("was", "now", "said"), HUBS, ids=[said for *_, said in HUBS])
def test_a_wrong_sector_is_told_with_its_row(
    inputs: Path, was: str, now: str, said: str, capsys: pytest.CaptureFixture[str]
) -> None:
    path = inputs / "hubs.csv"
    path.write_text(path.read_text(encoding="utf-8").replace(was, now), encoding="utf-8")
    assert run(made_runs.arguments()) == 2
    message = capsys.readouterr().err
    assert f"hubs.csv, {said}" in message
    assert len(unwrapped(message).splitlines()) <= 4


def test_a_study_without_links_is_refused_by_plan_as_before(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(["plan", "study.toml"]) == 2
    assert "there is no [[site]] table" in capsys.readouterr().err


@pytest.mark.slow
def test_two_threads_that_start_together_give_the_bytes_of_one(inputs: Path) -> None:
    environment = {name: value for name, value in made_runs.environment().items() if name != "PYTHONWARNINGS"}
    for threads in ("1", "2"):
        done = subprocess.run(
            made_runs.command(*made_runs.arguments(threads, "--threads", threads, "--chunk", "3"), fake=False),
            cwd=inputs, env=environment, capture_output=True, check=False, timeout=120,
        )  # fmt: skip
        assert done.returncode == 0, done.stderr
    one, two = made_runs.outputs(inputs / "1"), made_runs.outputs(inputs / "2")
    assert one == two
    if "itur" in sys.modules or os.environ.get("CI"):
        assert all(row["availability_percent"] for row in rows_of(inputs / "2" / "candidates.csv"))


@pytest.mark.slow
def test_the_sample_network_runs(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert (
        run(
            [
                "candidates", str(SAMPLE / "tolmera.toml"), "--hubs", str(SAMPLE / "hubs.csv"),
                "--places", str(SAMPLE / "places.csv"), "--out", str(tmp_path / "network"),
            ]
        )
        == 0
    )  # fmt: skip
    page = capsys.readouterr().out
    assert max(map(len, page.splitlines())) <= 80
    said = json.loads((tmp_path / "network" / "summary.json").read_text(encoding="utf-8"))
    assert said["places"] == 60
    assert said["by_status"]["done"] == said["pairs"]
    assert all(said["by_state"][state] for state in ("clear", "marginal", "obstructed"))
    assert 10 < said["places_clear_and_signal_meets"] < 50


def test_progress_says_rate_and_time_left() -> None:
    from fellspan.cli.candidates_run import duration_words, progress_text

    # 300 of 1000 were there, 200 more took 20 s: 10 a second, 500 left
    assert (
        progress_text(1000, 300, 200, seconds=20.0) == "judging [##########..........] 500/1000 pairs, 10/s, 50 s left"
    )
    assert progress_text(1000, 300, 0, seconds=0.0).endswith("300/1000 pairs")
    assert [duration_words(s) for s in (40.2, 600.0, 12_000.0)] == ["40 s", "10 min", "3 h 20 min"]
