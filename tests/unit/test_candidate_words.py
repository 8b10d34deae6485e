"""What files and page of a run over pairs say beside their numbers: a 0 that mends nothing, neighbours that are not counted."""

import csv
import html
import json
import math
from pathlib import Path

import made_runs
import numpy as np
import pytest

from fellspan.cli.main import run
from fellspan.exports import candidates_folder
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


WEATHER = '\n[climate]\nrain_rate = "30 mm/h"\n'


def trial(
    folder: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], *, climate: str = ""
) -> tuple[str, str, list[dict[str, str]]]:
    """Terminal, page and rows of a run with a target where no maps are installed."""
    made_runs.write_inputs(folder, places=12)
    text = made_runs.STUDY.replace("[candidates]\n", '[candidates]\ntarget_availability = "99.9 %"\n')
    (folder / "study.toml").write_text(text + climate, encoding="utf-8")
    monkeypatch.chdir(folder)
    monkeypatch.setattr("fellspan.climate.maps.MAP_PACKAGE", "a_package_that_is_not_there")
    monkeypatch.setattr(candidates_page, "shaded_relief", lambda *_, **__: None)
    assert run(made_runs.arguments()) == 0
    with (folder / "out" / "candidates.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    page = html.unescape((folder / "out" / "index.html").read_text(encoding="utf-8"))
    return " ".join(capsys.readouterr().out.split()), page, rows


def test_a_target_that_cannot_be_judged_is_told_with_what_to_set(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    terminal, page, rows = trial(tmp_path, monkeypatch, capsys)
    held = [row for row in rows if row["signal_verdict"] == "marginal"]
    assert held
    said = (
        f"The target cannot be judged for {len(held)} pairs, marginal at best: no rain rate is known, so no availability; "
        "set climate.rain_rate in the study, above 5 km climate.dn1 too, or install the maps: "
        '.venv/bin/pip install -e ".[climate]".'
    )
    assert said in terminal
    assert said in page
    assert {row["reason"] != "" for row in held} == {True}
    assert all("set climate.rain_rate" in row["reason"] for row in held)
    assert not any(row["reason"] for row in rows if row["signal_verdict"] == "below")
    summary = json.loads((tmp_path / "out" / "summary.json").read_text(encoding="utf-8"))
    assert summary["target_not_judged"]["pairs"] == len(held)


def test_a_target_that_can_be_judged_is_not_complained_of(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    terminal, page, rows = trial(tmp_path, monkeypatch, capsys, climate=WEATHER)
    assert "cannot be judged" not in terminal + page
    assert not any(row["reason"] for row in rows)
    assert any(row["signal_verdict"] == "meets" for row in rows)


def test_it_is_told_why_there_is_no_chosen_study(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(candidates_folder, "MOST_CHOSEN", 3)
    terminal, page, _ = trial(tmp_path, monkeypatch, capsys)
    assert not (tmp_path / "out" / "chosen.toml").exists()
    said = (
        "chosen.toml was not written: it would hold 11 links, and 3 are the most; run a part of the places (--places)"
    )
    assert said in terminal
    assert said in page.replace("<code>", "").replace("</code>", "").replace("<bdi>", "")
    assert "plan chosen.toml" not in terminal + page
    written = json.loads((tmp_path / "out" / "summary.json").read_text(encoding="utf-8"))
    assert written["chosen_not_written"].startswith("it would hold 11 links")


def test_a_note_that_begins_with_a_file_keeps_its_name(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    made_runs.write_inputs(tmp_path, places=2)
    text = (tmp_path / "places.csv").read_text(encoding="utf-8").replace("height\n", "height,owner\n", 1)
    (tmp_path / "places.csv").write_text(text, encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr(candidates_page, "shaded_relief", lambda *_, **__: None)
    assert run(made_runs.arguments()) == 0
    page = (tmp_path / "out" / "index.html").read_text(encoding="utf-8")
    assert '<li class="as-it-is"><bdi>places.csv: columns not used: owner</bdi>' in page
    assert "<li><bdi>Each pair is judged alone" in page
    assert ".candidates .cautions li.as-it-is::first-letter{text-transform:none}" in page
    assert "places.csv: columns not used: owner" in capsys.readouterr().out


def test_the_sentence_of_a_target_is_one() -> None:
    from types import SimpleNamespace

    from fellspan.links.signal_words import availability_sentence

    def said(met: bool | None) -> str:
        result = SimpleNamespace(
            availability_percent=SimpleNamespace(year=None, worst_month=None),
            minutes_per_year=None,
            target_availability_percent=99.9,
            target_met=met,
            notes=("no rain rate",),
        )
        return availability_sentence(result)  # type: ignore[arg-type]

    assert said(None).endswith("The target of 99.9 % of the year in each direction cannot be judged.")
    assert said(True).endswith("in each direction is met.")
    assert said(False).endswith("in each direction is not met.")


def told(
    folder: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], file: str, text: str
) -> str:
    """What a run says of a wrong file of hubs or places."""
    made_runs.write_inputs(folder, places=2)
    (folder / file).write_text(text, encoding="utf-8")
    monkeypatch.chdir(folder)
    assert run(made_runs.arguments()) == 2
    return " ".join(capsys.readouterr().err.split())


def test_an_antenna_of_a_row_is_told_with_its_file_and_row_once(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    two = made_runs.HUBS.replace("west,14 dBi", "west,24 dBi").replace("east,14 dBi", "east,25 dBi")
    said = told(tmp_path, monkeypatch, capsys, "hubs.csv", two)
    assert said.startswith(
        "fellspan: hubs.csv, row 3: the antenna would radiate more than it gets: 25.00 dBi, but beams"
    )
    assert said.endswith("wrong too: hubs.csv, row 4")
    assert "study.toml" not in said
    assert "antenna '" not in said


@pytest.mark.parametrize(
    ("header", "said"),
    [
        ("Ort;Breite;Länge;Höhe", "names no column that is known: 'Ort, Breite, Länge, Höhe' columns: name, latitude"),
        ("name;latitude;longitud;height", "unknown column 'longitud' did you mean 'longitude'?"),
        ("name;latitude;longitude;heigth", "unknown column 'heigth' did you mean 'height'?"),
    ],
)
def test_a_column_is_guessed_only_where_it_is_a_slip(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], header: str, said: str
) -> None:
    text = f"{header}\nA;36.08;-45.26;6 m above ground\n"
    assert said in told(tmp_path, monkeypatch, capsys, "places.csv", text)


def test_a_comma_that_may_part_thousands_is_told_as_such(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    rows = "A;36.08;-45.26;1,500 m above ground\nB;36.08;-45.25;6,5 m above ground\n"
    said = told(tmp_path, monkeypatch, capsys, "places.csv", f"name;latitude;longitude;height\n{rows}")
    assert "it may part thousands: write 1500, or 1.500 if it is a decimal" in said
    assert "row 3" not in said
