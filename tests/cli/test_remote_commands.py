"""Commands on rasters behind URLs: what they print and write is what they do for the file; refusals; a changed one noticed."""

import json
from collections.abc import Iterator
from pathlib import Path

import made_runs
import made_studies
import pytest
from made_server import Served, served
from made_studies import A, B

from fellspan.cli.main import run

HEIGHTS = ("--height-a", "20 m above ground", "--height-b", "20 m above ground", "--frequency", "5.8 GHz")


@pytest.fixture
def server(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Served]:
    monkeypatch.setenv("no_proxy", "127.0.0.1")
    made_studies.write_ground(tmp_path / "ground.tif", hill_m=60.0)
    (tmp_path / "study.toml").write_text(made_studies.STUDY, encoding="utf-8")
    with served(tmp_path) as state:
        for name, value in state.s3_settings().items():
            monkeypatch.setenv(name, value)
        yield state


def study_with(folder: Path, address: str, name: str = "remote.toml", *, extra: str = "") -> str:
    text = (folder / "study.toml").read_text(encoding="utf-8")
    (folder / name).write_text(text.replace('"ground.tif"', f'"{address}"{extra}'), encoding="utf-8")
    return name


def spoken(*words: str, capsys: pytest.CaptureFixture[str]) -> tuple[int, str, str]:
    code = run(list(words))
    said = capsys.readouterr()
    return code, said.out, said.err


def test_terrain_and_sight_say_the_same_of_a_url(
    server: Served, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(server.folder)
    for words in (
        ("terrain", "GROUND"),
        ("sight", A, B, "--ground", "GROUND", *HEIGHTS),
    ):
        local = spoken(*("ground.tif" if word == "GROUND" else word for word in words), capsys=capsys)
        assert local[0] in (0, 1), local[2]
        assert len(local[1].splitlines()) > 5
        there = spoken(*(server.url("ground.tif") if word == "GROUND" else word for word in words), capsys=capsys)
        assert there[:2] == local[:2]
    saved = (server.folder / there[2].split()[3].rstrip(",")).read_text(encoding="utf-8")
    assert f'ground = "{server.url("ground.tif")}"' in saved
    # the store's bucket is a folder of the server
    (server.folder / "bucket").mkdir()
    (server.folder / "bucket" / "ground.tif").write_bytes((server.folder / "ground.tif").read_bytes())
    assert spoken("terrain", "s3://bucket/ground.tif", capsys=capsys) == spoken("terrain", "ground.tif", capsys=capsys)


def test_plan_on_a_url_gives_the_numbers_of_the_file_and_stamps_the_address(
    server: Served, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(server.folder)
    study_with(server.folder, server.url("ground.tif"))
    for study, out in (("study.toml", "local"), ("remote.toml", "remote")):
        code, _, err = spoken("plan", study, "--out", out, capsys=capsys)
        assert (code in (0, 1), err) == (True, "")
    local, remote = (
        json.loads((server.folder / out / "results.json").read_text(encoding="utf-8")) for out in ("local", "remote")
    )
    assert remote["links"] == local["links"]
    (ground,) = (file for file in remote["files"] if file["role"] == "ground")
    assert ground["name"] == server.url("ground.tif")
    assert ground["sha256"].startswith("server:")
    assert ground["size"] == (server.folder / "ground.tif").stat().st_size
    (server.folder / "bucket").mkdir()
    (server.folder / "bucket" / "ground.tif").write_bytes((server.folder / "ground.tif").read_bytes())
    study_with(server.folder, "s3://bucket/ground.tif", "s3.toml")
    assert spoken("plan", "s3.toml", "--out", "s3", capsys=capsys)[2] == ""
    page = (server.folder / "s3" / "index.html").read_text(encoding="utf-8")
    assert "s3://bucket/ground.tif" in page
    assert "size not stated" in page
    assert server.url("ground.tif") in (server.folder / "remote" / "index.html").read_text(encoding="utf-8")


def test_candidates_on_a_url_give_the_bytes_of_the_file_and_refuse_to_go_on_with_another(
    server: Served, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = made_runs.write_inputs(server.folder, places=12)
    monkeypatch.chdir(folder)
    ground = (folder / "ground.tif").read_bytes()
    (folder / "bucket").mkdir()
    (folder / "bucket" / "ground.tif").write_bytes(ground)
    addresses = {"study": "", "http": server.url("ground.tif"), "s3": "s3://bucket/ground.tif"}
    for name, address in addresses.items():
        words = made_runs.arguments(name)
        words[1] = study_with(folder, address, f"{name}.toml") if address else "study.toml"
        code, _, err = spoken(*words, capsys=capsys)
        assert code == 0, err
    local = made_runs.outputs(folder / "study")
    assert made_runs.outputs(folder / "http") == local
    assert made_runs.outputs(folder / "s3") == local
    for name in ("http", "s3"):
        where = "ground.tif" if name == "http" else "bucket/ground.tif"
        (folder / where).write_bytes(ground[:-4] + b"\0\0\x80\x3f")  # the height of the last cell
        words = made_runs.arguments(name)
        words[1] = f"{name}.toml"
        code, _, err = spoken(*words, capsys=capsys)
        assert code == 2
        assert f"holds a run with other inputs: ground {addresses[name]} changed" in " ".join(err.split())


@pytest.mark.parametrize(
    ("address", "words"),
    [
        ("HTTP/none.tif", "there is nothing at HTTP/none.tif"),
        ("HTTP/study.toml", "HTTP/study.toml is not a raster"),
        ("http://127.0.0.1:1/ground.tif", "cannot be reached"),
        ("htp://127.0.0.1/ground.tif", "the scheme 'htp' is unknown"),
    ],
)
def test_refusals_of_every_command_are_short_and_exit_2(
    server: Served, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], address: str, words: str
) -> None:
    monkeypatch.chdir(server.folder)
    here = server.url("")[:-1]
    address, words = address.replace("HTTP", here), words.replace("HTTP", here)
    study_with(server.folder, address)
    for command in (
        ("terrain", address),
        ("sight", A, B, "--ground", address, *HEIGHTS),
        ("plan", "remote.toml", "--out", "out"),
        ("relay", "remote.toml"),
    ):
        code, _, err = spoken(*command, capsys=capsys)
        assert code == 2, command
        assert words in " ".join(err.split())
        assert len(err.splitlines()) <= 4
        assert "Traceback" not in err
        assert "bug" not in err
    assert not (server.folder / "out").exists()


def test_files_that_are_no_rasters_are_not_fetched(
    server: Served, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.chdir(server.folder)
    address = server.url("masts.csv")
    study_with(server.folder, "ground.tif", extra=f'\nobstacles = "{address}"')
    for words in (
        ("plan", "remote.toml"),
        ("sight", A, B, "--ground", "ground.tif", "--obstacles", address, *HEIGHTS),
    ):
        code, _, err = spoken(*words, capsys=capsys)
        assert code == 2
        assert f"'{address}' is a URL, and of these only rasters are read" in " ".join(err.split())
    assert server.asked() == []
