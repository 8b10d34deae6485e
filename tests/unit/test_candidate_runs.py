"""A run over pairs: which pairs, in which chunks; stopped and gone on with; what its files say. The engine is a fake one."""

import csv
import json
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path

import fake_engine
import made_runs
import numpy as np
import pytest
from numpy.typing import NDArray

from fellspan.cli.main import run as run_command
from fellspan.geodesy import geodesic
from fellspan.report import candidates_page
from fellspan.runs import local, store, work
from fellspan.runs.listing import PairList
from fellspan.screening.pairs import SiteColumns

MANY = 3 * 40


def columns(latitude: NDArray[np.float64], longitude: NDArray[np.float64]) -> SiteColumns:
    count = latitude.size
    return SiteColumns(
        name=tuple(f"s{n:04d}" for n in range(count)),
        latitude_deg=latitude,
        longitude_deg=longitude,
        height_m=np.full(count, 6.0),
        height_reference=np.zeros(count, dtype=np.int8),
        roof_m=np.full(count, np.nan),
    )


@pytest.mark.parametrize(("south", "west", "wide"), [(36.0, -45.3, 0.4), (-0.2, 179.8, 0.4), (88.9, -180.0, 1.0)])
def test_pairs_within_the_distances_are_those_of_the_geodesic(south: float, west: float, wide: float) -> None:
    rng = np.random.default_rng(3)
    hubs = columns(rng.uniform(south, south + wide, 5), (rng.uniform(west, west + wide, 5) + 180.0) % 360.0 - 180.0)
    places = columns(rng.uniform(south, south + wide, 300), (rng.uniform(west, west + wide, 300) + 180) % 360.0 - 180.0)
    far = geodesic.inverse_many(
        hubs.latitude_deg[:, None], hubs.longitude_deg[:, None], places.latitude_deg, places.longitude_deg
    ).distance_m
    for least, most in (
        (0.0, np.inf),
        (2_000.0, 15_000.0),
        (float(far[1, 7]), float(far[2, 11])),
        (0.0, float(far.max()) - 1e-3),
    ):
        listed = PairList(hubs=hubs, places=places, min_distance_m=least, max_distance_m=most, chunk_pairs=97)
        chunks = list(listed.chunks())
        found = {(h, p) for chunk in chunks for h, p in zip(chunk.hub.tolist(), chunk.place.tolist(), strict=True)}
        assert found == set(zip(*(axis.tolist() for axis in np.nonzero((far >= least) & (far <= most))), strict=True))
        assert sum(chunk.hub.size for chunk in chunks) == len(found)
        assert all(chunk.hub.size == 97 for chunk in chunks[:-1])
        count = listed.count()
        assert (count.pairs, count.chunks) == (len(found), len(chunks))


def test_listed_pairs_alone_are_judged_and_in_one_order() -> None:
    rng = np.random.default_rng(4)
    hubs, places = (columns(rng.uniform(36.0, 36.1, 4), rng.uniform(-45.2, -45.1, 4)) for _ in range(2))
    hub, place = np.array([0, 0, 2, 3], dtype=np.int64), np.array([1, 3, 0, 2], dtype=np.int64)
    one, again = (PairList(hubs=hubs, places=places, listed=(hub, place)) for _ in range(2))
    chunk = next(one.chunks())
    assert sorted(zip(chunk.hub.tolist(), chunk.place.tolist(), strict=True)) == [(0, 1), (0, 3), (2, 0), (3, 2)]
    assert one.count().digest == again.count().digest
    assert one.count().digest != PairList(hubs=hubs, places=places).count().digest


@pytest.fixture
def inputs(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setattr(work, "screen_pairs", fake_engine.screen_pairs)
    monkeypatch.setattr(work, "BATCH_PAIRS", 7)
    monkeypatch.setattr(candidates_page, "shaded_relief", lambda *_, **__: None)  # has tests of its own, and takes long
    made_runs.write_inputs(tmp_path, places=40)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def go(*more: str, out: str = "out") -> int:
    return run_command(made_runs.arguments(out, "--chunk", "16", *more))


def rows_of(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def test_the_files_hold_every_pair_once_in_order(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert go() == 0
    out = inputs / "out"
    rows = rows_of(out / "candidates.csv")
    pairs = [(row["hub"], row["place"]) for row in rows]
    assert pairs == sorted(pairs)
    assert len(set(pairs)) == len(pairs) == 2 * 40
    assert {row["status"] for row in rows} == {"done", "gap", "refused"}
    assert all(row["verdict"] and row["margin_at_hub_db"] for row in rows if row["status"] == "done")
    assert all(row["gap_from_m"] == "10.0" and not row["verdict"] for row in rows if row["status"] == "gap")
    refused = [row for row in rows if row["status"] == "refused"]
    assert all(row["reason"].startswith("'=cmd") for row in refused)  # no spreadsheet runs it
    assert {row["sector"] for row in rows if row["hub"] == "South" and row["status"] == "done"} == {"east", "west"}
    none_helps = [row for row in rows if row["raising_the_place_helps"] == "no"]
    assert none_helps
    assert all(row["extra_at_place_m"] == "" for row in none_helps)
    lines = json.loads((out / "candidates.geojson").read_text(encoding="utf-8"))["features"]
    assert [(line["properties"]["hub"], line["properties"]["place"]) for line in lines] == pairs
    assert all(line["geometry"]["type"] == "LineString" for line in lines)
    for line, row in zip(lines, rows, strict=True):
        said = line["properties"]
        assert said.get("status", "done") == row["status"]
        for name in ("state", "basis", "signal_verdict", "sector"):
            assert said.get(name, "") == row[name]
        for name in ("distance_m", "worst_fraction", "extra_at_place_m", "extra_for_confidence_m"):
            assert said.get(name) == (float(row[name]) if row[name] else None)
        assert None not in said.values()
    page = capsys.readouterr().out
    assert max(map(len, page.splitlines())) <= 80
    assert "80 pairs judged" in page


def test_the_store_can_be_read_by_its_words(inputs: Path) -> None:
    go()
    with sqlite3.connect(inputs / "out" / "candidates.sqlite") as connection:
        connection.row_factory = sqlite3.Row
        found = connection.execute("SELECT * FROM pair ORDER BY hub, place").fetchall()
        assert connection.execute("PRAGMA integrity_check").fetchone()[0] == "ok"
    connection.close()
    rows = rows_of(inputs / "out" / "candidates.csv")
    for stored, row in zip(found, rows, strict=True):
        for word in ("hub", "place", "status", "verdict", "basis", "signal_verdict"):
            assert (stored[word] or "") == row[word]
        assert stored["distance_m"] == pytest.approx(float(row["distance_m"]), abs=0.051)


def test_best_hubs_are_ranked_by_path_then_signal_then_margin(inputs: Path) -> None:
    go("--best", "2")
    rows = rows_of(inputs / "out" / "candidates.csv")
    best = rows_of(inputs / "out" / "best.csv")
    states = ["clear", "clear on bare ground only", "marginal", "obstructed", ""]
    signals = ["meets", "marginal", "below", ""]

    def key(row: dict[str, str]) -> tuple[int, int, float, float]:
        margin = min(float(row[f"margin_at_{end}_db"] or "-inf") for end in ("hub", "place"))
        return states.index(row["state"]), signals.index(row["signal_verdict"]), -margin, float(row["distance_m"])

    expected = []
    for place in sorted({row["place"] for row in rows}):
        ranked = sorted((row for row in rows if row["place"] == place), key=key)
        expected += [(place, str(rank), row["hub"]) for rank, row in enumerate(ranked[:2], start=1)]
    assert [(row["place"], row["rank"], row["hub"]) for row in best] == expected
    drawn = json.loads((inputs / "out" / "best.geojson").read_text(encoding="utf-8"))["features"]
    shown = [[line["properties"][key] for key in ("place", "rank", "hub")] for line in drawn]
    assert [[place, str(rank), hub] for place, rank, hub in shown] == [list(row) for row in expected]
    before = (inputs / "out" / "best.geojson").read_bytes()
    assert go("--best", "2", "--lines", "best") == 0
    assert not (inputs / "out" / "candidates.geojson").exists()
    assert (inputs / "out" / "best.geojson").read_bytes() == before
    said = json.loads((inputs / "out" / "summary.json").read_text(encoding="utf-8"))
    first = [row for row in best if row["rank"] == "1"]
    assert said["places_by_best_state"]["clear"] == sum(row["state"] == "clear" for row in first)
    assert said["by_status"] == {
        word: sum(row["status"] == word for row in rows) for word in ("done", "gap", "same place", "refused")
    }
    assert sum(hub["pairs"] for hub in said["hubs"]) == 80


def test_places_out_of_reach_are_listed_as_such(inputs: Path) -> None:
    assert go("--max-distance", "1.2 km") == 0
    best = rows_of(inputs / "out" / "best.csv")
    assert {row["place"] for row in best} == {f"place {n:05d}" for n in range(40)}
    alone = [row for row in best if row["rank"] == ""]
    assert alone
    assert all(row["status"] == "no hub in reach" for row in alone)


class Enough(Exception):
    """Stands for whatever ends a process."""


def test_a_run_that_was_stopped_goes_on_and_ends_with_the_same_bytes(
    inputs: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    go(out="whole")
    whole = made_runs.outputs(inputs / "whole")
    keep, calls = store.Store.commit, []

    def commit(self: store.Store, *both: object) -> None:
        if len(calls) % 3 == 2:
            calls.append("stopped")
            raise KeyboardInterrupt
        calls.append("kept")
        keep(self, *both)  # type: ignore[arg-type]

    monkeypatch.setattr(store.Store, "commit", commit)
    endings = [go() for _ in range(3)]
    assert endings == [130, 130, 0]
    assert calls.count("kept") == 5  # 80 pairs in chunks of 16: none is worked on twice
    assert made_runs.outputs(inputs / "out") == whole


def test_threads_and_batches_do_not_show_in_the_files(inputs: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    go("--threads", "1", out="one")
    go("--threads", "3", out="three")
    assert made_runs.outputs(inputs / "one") == made_runs.outputs(inputs / "three")
    monkeypatch.setattr(work, "BATCH_PAIRS", 1000)
    go("--chunk", "50", out="large")
    small, large = made_runs.outputs(inputs / "one"), made_runs.outputs(inputs / "large")
    assert small == large


CHANGES = [
    ("places.csv", "6 m above ground", "7 m above ground", (), "places places.csv changed"),
    ("hubs.csv", "14 dBi", "15 dBi", (), "hubs hubs.csv changed"),
    ("study.toml", "20 dBm", "21 dBm", (), "study study.toml changed"),
    ("ground.tif", "", "", (), "ground ground.tif changed"),
    ("study.toml", "", "", ("--max-distance", "2 km"), "--max-distance was inf m and is 2000 m"),
    ("study.toml", "", "", ("--place-height", "9 m above ground"), "--place-height was not given and is 9.0 m above ground"),
    ("study.toml", "", "", ("--chunk", "17"), "--chunk was 16 and is 17"),
]  # fmt: skip


@pytest.mark.parametrize(("name", "was", "now", "more", "said"), CHANGES, ids=[said for *_, said in CHANGES])
def test_a_changed_input_is_noticed_and_refused_unless_fresh(
    inputs: Path, name: str, was: str, now: str, more: tuple[str, ...], said: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert go() == 0
    before = made_runs.outputs(inputs / "out")
    path = inputs / name
    if was:
        path.write_text(path.read_text(encoding="utf-8").replace(was, now), encoding="utf-8")
    elif name == "ground.tif":
        with path.open("ab") as stream:
            stream.write(b"\0")
    capsys.readouterr()
    assert go(*more) == 2
    message = capsys.readouterr().err
    assert said in " ".join(message.split())
    assert "--fresh" in message
    assert len(message.splitlines()) <= 4
    assert made_runs.outputs(inputs / "out") == before
    assert go(*more, "--fresh") == 0


def test_another_version_of_the_engine_is_another_input(
    inputs: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    go()
    monkeypatch.setattr("fellspan.runs.inputs.__version__", "9.9.9")
    assert go() == 2
    assert "Fellspan was 0.1.0 and is 9.9.9" in capsys.readouterr().err


def test_foreign_files_are_left_alone(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    out = inputs / "out"
    out.mkdir()
    (out / "best.csv").write_text("mine", encoding="utf-8")
    assert go() == 4
    assert "best.csv' is there already" in capsys.readouterr().err
    (out / "best.csv").unlink()
    (out / "candidates.sqlite").write_text(
        "mine, and long enough to be looked at as a file of a database", encoding="utf-8"
    )
    for more in ((), ("--fresh",)):
        assert go(*more) in (2, 4)
        assert (out / "candidates.sqlite").read_text(encoding="utf-8").startswith("mine")
    with sqlite3.connect(inputs / "other.sqlite") as other:
        other.execute("CREATE TABLE mine (a)")
    other.close()
    (inputs / "other.sqlite").replace(out / "candidates.sqlite")
    for more in ((), ("--fresh",)):
        assert go(*more) == 2
        assert "was not written by a run" in capsys.readouterr().err


def test_a_store_of_another_layout_is_refused(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert go() == 0
    path = inputs / "out" / "candidates.sqlite"
    with closing(sqlite3.connect(path)) as connection:
        connection.execute("PRAGMA user_version = 1")
    before = path.read_bytes()
    capsys.readouterr()
    assert go() == 2
    said = " ".join(capsys.readouterr().err.split())
    assert "candidates.sqlite' was written by another version of Fellspan (layout 1, this one knows 2)" in said
    assert "--fresh starts anew" in said
    assert path.read_bytes() == before
    assert go("--fresh") == 0


def test_a_damaged_store_is_told_and_started_anew(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    go()
    whole = made_runs.outputs(inputs / "out")
    path = inputs / "out" / "candidates.sqlite"
    data = path.read_bytes()
    path.write_bytes(data[:4096] + b"\xff" * (len(data) - 4096))
    assert go() == 4
    message = capsys.readouterr().err
    assert "damaged" in message
    assert "--fresh" in message
    assert go("--fresh") == 0
    assert made_runs.outputs(inputs / "out") == whole


def test_a_full_disk_ends_with_what_is_finished_kept(
    inputs: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    go(out="whole")
    connect = store._connected

    def small(path: Path) -> sqlite3.Connection:
        connection = connect(path)
        pages = connection.execute("PRAGMA page_count").fetchone()[0]
        if pages:  # the new store, which may grow by one page: SQLite then answers as on a full disk
            connection.execute(f"PRAGMA max_page_count = {pages + 1}")
        return connection

    monkeypatch.setattr(store, "_connected", small)
    assert go() == 4
    message = capsys.readouterr().err
    assert "the disk is full" in message
    assert len(message.splitlines()) <= 4
    monkeypatch.setattr(store, "_connected", connect)
    with store.Store.open(inputs / "out" / "candidates.sqlite") as kept:
        assert 0 < len(kept.finished()) < 5
    assert go() == 0
    assert made_runs.outputs(inputs / "out") == made_runs.outputs(inputs / "whole")


def test_two_runs_at_once_in_one_folder_are_refused(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    from fellspan.runs.run import locked

    with locked(inputs / "out"):
        assert go() == 2
    assert "another run is at work" in capsys.readouterr().err
    assert go() == 0


def test_an_error_of_a_thread_ends_the_run_and_its_threads(
    inputs: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    from fellspan.errors import RasterError

    def fails(*_: object, **__: object) -> None:
        raise RasterError("ground.tif cannot be read", "copy it again")

    monkeypatch.setattr(work, "screen_pairs", fails)
    assert go() == 2
    assert "ground.tif cannot be read" in capsys.readouterr().err
    import threading

    assert not [thread for thread in threading.enumerate() if thread.name.startswith("fellspan")]


def test_no_pair_in_reach_is_told(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert go("--min-distance", "90 km") == 2
    assert "no pair of a hub and a place" in capsys.readouterr().err
    assert not (inputs / "out").exists()


def test_json_prints_what_the_summary_file_holds(inputs: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert go("--json") == 0
    assert capsys.readouterr().out == (inputs / "out" / "summary.json").read_text(encoding="utf-8")


def test_threads_take_only_a_few_chunks_ahead() -> None:
    taken: list[int] = []

    def jobs() -> Iterator[tuple[object, object]]:
        for number in range(100):
            taken.append(number)
            yield number, number

    done = local.work_here(jobs(), tell=lambda _: None, threads=2)  # type: ignore[arg-type]
    with pytest.raises(AttributeError):
        next(done)  # the jobs are none; only how many were taken counts
    assert len(taken) == 4
