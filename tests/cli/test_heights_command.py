"""`fellspan heights`: for a study's link and for two points; page, JSON, limits, costs, and what it refuses."""

import json
from pathlib import Path
from typing import Any

import pytest
from made_studies import A, B, unwrapped, write_ground, write_study

from fellspan.cli import main


def run(*arguments: object) -> int:
    return main.run([str(argument) for argument in arguments])


def two_points(folder: Path, *more: object) -> tuple[object, ...]:
    return ("heights", A, B, "--ground", write_ground(folder / "ground.tif"), "--frequency", "5.8 GHz", *more)


def answer(capsys: pytest.CaptureFixture[str]) -> dict[str, Any]:
    found: dict[str, Any] = json.loads(capsys.readouterr().out)["links"][0]["heights"]
    return found


def test_the_page_of_a_study_leads_with_the_decision_within_80_columns(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run("heights", write_study(tmp_path)) == 0
    lines = capsys.readouterr().out.splitlines()
    assert lines[1].startswith(("High enough as planned", "Not high enough as planned"))
    assert max(map(len, lines)) <= 80
    assert any(line.split()[:2] == ["equal", "heights"] for line in lines)
    assert any("structural engineer" in line for line in lines)


def test_two_points_need_no_heights(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(*two_points(tmp_path, "--json")) == 0
    heights = answer(capsys)
    assert heights["planned"]["a_m"] == pytest.approx(10.0)
    assert [option["kind"] for option in heights["options"]][:2] == ["a alone", "b alone"]
    assert not list(tmp_path.glob("sight-*"))  # asks a question, saves nothing


def test_the_options_reach_the_search(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    more = ("--step", "2.5 m", "--limit-a", "3 m to 40 m", "--cost-per-metre", "4,1", "--years", "7", "--json")
    assert run(*two_points(tmp_path, *more)) == 0
    heights = answer(capsys)
    assert heights["step_m"] == 2.5
    assert heights["growth_years"] == 7.0
    by_kind = {option["kind"]: option for option in heights["options"]}
    for kind in ("equal", "least total", "least cost"):
        build = by_kind[kind]["build"]
        assert build["a_m"] % 2.5 == pytest.approx(0.0, abs=1e-6) or build["a_m"] % 2.5 == pytest.approx(2.5, abs=1e-6)
        assert build["a_m"] >= 3.0
    cheap = by_kind["least cost"]
    assert cheap["cost"] == pytest.approx(4.0 * cheap["build"]["a_m"] + cheap["build"]["b_m"])


@pytest.mark.parametrize(
    ("more", "shown"),
    [
        (("--cost-per-metre", "dear"), "dear"),
        (("--years", "-3"), "-3"),
        (("--limit-a", "30 m to 3 m"), "30 to 3"),
        (("--step", "0 m"), "0 m"),
    ],
)
def test_what_makes_no_sense_is_refused_by_value(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], more: tuple[str, str], shown: str
) -> None:
    assert run(*two_points(tmp_path, *more)) == 2
    error = capsys.readouterr().err
    assert shown in error
    assert len(unwrapped(error.strip()).splitlines()) <= 4


def test_an_unknown_link_is_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("heights", write_study(tmp_path), "--link", "Nowhere") == 2
    assert "Nowhere" in capsys.readouterr().err


def test_what_a_study_says_itself_cannot_be_typed_beside_it(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("heights", write_study(tmp_path), "--frequency", "5 GHz", "--roof-a", "9 m") == 2
    assert "--frequency, --roof-a cannot stand beside a study" in capsys.readouterr().err


def test_the_command_speaks_under_its_own_name(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    words = [str(word) for word in two_points(tmp_path)]
    at = words.index("--frequency")
    assert run(*words[:at], *words[at + 2 :]) == 2
    assert "heights still needs: --frequency" in capsys.readouterr().err
