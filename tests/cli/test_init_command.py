"""`fellspan init`: writes a starter or the schema, and never over a file."""

import json
from pathlib import Path

import pytest
from made_studies import unwrapped, write_ground

from fellspan.cli import main
from fellspan.study.reading import load_study


def test_starter_is_written_and_reads(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main.run(["init", str(tmp_path)]) == 0
    path = tmp_path / "study.toml"
    assert str(path) in capsys.readouterr().out
    (tmp_path / "terrain").mkdir()
    write_ground(tmp_path / "terrain" / "ground.tif")
    assert load_study(path).links[0].name == "Harbour - North Light"


def test_a_named_file_and_the_schema(tmp_path: Path) -> None:
    assert main.run(["init", str(tmp_path / "harbour.toml")]) == 0
    assert main.run(["init", str(tmp_path), "--schema"]) == 0
    assert (
        json.loads((tmp_path / "fellspan-study.schema.json").read_text(encoding="utf-8"))["title"]
        == "Fellspan study file"
    )
    assert (tmp_path / "harbour.toml").exists()


@pytest.mark.parametrize("schema", [False, True])
def test_nothing_is_overwritten(tmp_path: Path, capsys: pytest.CaptureFixture[str], schema: bool) -> None:
    path = tmp_path / ("fellspan-study.schema.json" if schema else "study.toml")
    path.write_text("mine", encoding="utf-8")
    assert main.run(["init", str(tmp_path), *(["--schema"] if schema else [])]) == 2
    assert path.read_text(encoding="utf-8") == "mine"
    assert f"{path} exists" in unwrapped(capsys.readouterr().err)


def test_odd_places_are_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main.run(["init", str(tmp_path / "study.txt")]) == 2
    assert main.run(["init", str(tmp_path / "none" / "study.toml")]) == 2
    err = capsys.readouterr().err
    assert "does not end in .toml" in err
    assert "there is no folder" in err
    assert list(tmp_path.iterdir()) == []
