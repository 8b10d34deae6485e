"""What files and page of a run over pairs say beside their numbers: a 0 that mends nothing, neighbours that are not counted."""

import json
import math
from pathlib import Path

import made_runs
import numpy as np
import pytest

from fellspan.cli.main import run
from fellspan.exports.candidates import CANDIDATE_COLUMNS, CandidateTable
from fellspan.report import candidates_page
from fellspan.report.candidates_page import _heights, _sure_heights
from fellspan.runs.summary import STATE_CODES, PairRow
from fellspan.screening.pairs import PATH_VERDICTS
from fellspan.study.screening_study import load_screening


def test_no_height_to_add_is_told_apart_from_not_sure_enough(tmp_path: Path) -> None:
    made_runs.write_inputs(tmp_path, places=1)
    screening = load_screening(tmp_path / "study.toml", hubs=tmp_path / "hubs.csv", places=tmp_path / "places.csv")
    table = CandidateTable(screening.candidates)
    at = CANDIDATE_COLUMNS.index("raising_the_place_helps")
    blank = dict.fromkeys(PairRow._fields) | {"hub": 0, "place": 0, "status": 0, "state": 0}

    def said(verdict: str, meets_m: float | None, sure_m: float | None) -> str:
        heights = {"extra_at_place_m": meets_m, "extra_for_confidence_m": sure_m}
        return table.cells(PairRow(**blank | {"verdict": PATH_VERDICTS.index(verdict)} | heights))[at]

    assert said("marginal", 0.0, 0.0) == "not known"
    assert said("marginal", 0.0, math.inf) == said("obstructed", 3.0, math.inf) == "not sure enough"
    assert said("clear", 0.0, 0.0) == ""
    assert said("marginal", 0.0, 1.25) == said("obstructed", 9.0, 9.5) == "yes"
    assert said("obstructed", math.inf, math.inf) == "no"
    assert said("marginal", None, None) == ""


def test_the_page_does_too() -> None:
    marginal, clear, obstructed = (STATE_CODES.index(word) for word in ("marginal", "clear", "obstructed"))
    meets = np.array([0.0, 0.0, 1.21, np.inf, np.nan, 0.0])
    sure = np.array([0.0, 0.0, 1.51, np.inf, np.nan, np.inf])
    state = np.array([marginal, clear, marginal, obstructed, clear, marginal], dtype=np.int8)
    assert _heights(meets) == [0.0, 0.0, 1.3, "no", None, 0.0]
    assert _sure_heights(meets, sure, state) == ["some", 0.0, 1.6, "no", None, "unsure"]


def test_terminal_page_and_summary_say_that_neighbours_are_not_counted(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    made_runs.write_inputs(tmp_path, places=2)
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr(candidates_page, "shaded_relief", lambda *_, **__: None)
    assert run(made_runs.arguments()) == 0
    said = "Each pair is judged alone: radios that share a channel, sectors of one hub among them, are not counted here"
    assert said in " ".join(capsys.readouterr().out.split()).replace("! ", "")
    assert any(note.startswith(said) for note in json.loads((tmp_path / "out" / "summary.json").read_text())["notes"])
    page = (tmp_path / "out" / "index.html").read_text(encoding="utf-8")
    assert said in page
    assert "0 of 2 places have at least one clear hub." in page
