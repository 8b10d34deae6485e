"""What the README shows is what the command prints, and trying it leaves nothing behind."""

import re
import shlex
from pathlib import Path

import pytest

from fellspan.cli import main

ROOT = Path(__file__).resolve().parents[2]


def test_the_first_use_prints_what_is_shown(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    shown = re.search(r"```sh\n\.venv/bin/fellspan (sight .*?)```\n\n((?: {4}[^\n]*\n)+)", text, re.DOTALL)
    assert shown is not None
    monkeypatch.chdir(ROOT)
    before = {path.name for path in ROOT.iterdir()}
    assert main.run(shlex.split(shown[1].replace("\\\n", " "))) == 0
    printed = capsys.readouterr().out
    assert re.sub(r"(?m)^ {4}", "", shown[2]) in printed
    assert "dBm at A" in printed
    assert {path.name for path in ROOT.iterdir()} == before


def test_the_comparison_of_antennas_prints_what_is_shown(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    shown = re.search(r"```sh\n\.venv/bin/fellspan (equip .*?)```\n\n((?: {4}[^\n]*\n|\n)+)", text, re.DOTALL)
    assert shown is not None
    monkeypatch.chdir(ROOT)
    assert main.run(shlex.split(shown[1].replace("\\\n", " "))) == 0
    assert re.sub(r"(?m)^ {4}", "", shown[2]).rstrip() in capsys.readouterr().out


def test_the_first_use_of_getting_started_runs(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    text = (ROOT / "docs" / "getting-started.md").read_text(encoding="utf-8")
    shown = re.search(r"    fellspan (sight (?:.*\\\n)+.*\n)", text)
    assert shown is not None
    monkeypatch.chdir(ROOT)
    assert main.run([*shlex.split(shown[1].replace("\\\n", " ")), "--no-save"]) == 0
    assert "BARE GROUND" not in capsys.readouterr().out


@pytest.mark.parametrize("command", ["candidates", "around"])
def test_what_is_shown_of_many_links_is_printed(
    command: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    shown = re.search(rf"```sh\n\.venv/bin/fellspan ({command} .*?)```\n\n((?: {{4}}[^\n]*\n|\n)+)", text, re.DOTALL)
    assert shown is not None
    words = shlex.split(shown[1].replace("\\\n", " "))
    words[words.index("--out") + 1] = str(tmp_path / "out")
    monkeypatch.chdir(ROOT)
    assert main.run(words) == 0
    assert re.sub(r"(?m)^ {4}", "", shown[2]).strip() in capsys.readouterr().out
