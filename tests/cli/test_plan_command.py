"""`fellspan plan`: page, JSON, exit codes, chosen links, failures."""

import csv
import json
from pathlib import Path
from typing import Any

import pytest
from made_studies import STUDY, unwrapped, write_ground, write_study

from fellspan.cli import figures, main
from fellspan.exports.results_json import results_dict
from fellspan.planning.planner import plan_study
from fellspan.study.reading import load_study

SECOND = """
[[site]]
name = "Offshore"
at = "36.09000 N, 44.00000 W"
height = "30 m above ground"

[[link]]
name = "West - Offshore"
a = "West"
b = "Offshore"
radio = "radio"
"""


def run(*arguments: object) -> int:
    return main.run([str(argument) for argument in arguments])


@pytest.fixture
def clear_study(tmp_path: Path) -> Path:
    return write_study(tmp_path)


@pytest.fixture
def cut_study(tmp_path: Path) -> Path:
    return write_study(tmp_path, hill_m=60.0)


def test_page_of_a_clear_link(clear_study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("plan", clear_study) == 0
    out, err = capsys.readouterr()
    assert err == ""
    lines = out.splitlines()
    assert lines[0] == "Trial"
    assert any(line.startswith("CLEAR") for line in lines[:6])
    assert "at 5.8 GHz" in lines[4]
    assert "36.09000 N, 45.28000 W" in out
    assert "magnetic" in out
    assert "dBm at A" in out
    assert max(map(len, lines)) <= 80
    assert "\x1b" not in out


def test_page_of_a_cut_link_says_what_clears_it(cut_study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("plan", cut_study) == 0
    out = capsys.readouterr().out
    (result,) = plan_study(load_study(cut_study)).links
    criterion = result.result.clearance[result.result.governing]
    assert any(line.startswith("OBSTRUCTED") for line in out.splitlines()[:6])
    assert "A alone" in out
    assert "both" in out
    assert f"{figures.up(criterion.shortfall_m)} short" in out
    assert criterion.cause in " ".join(out.split())


def test_json_is_what_the_api_returns(clear_study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("plan", clear_study, "--json") == 0
    printed: Any = json.loads(capsys.readouterr().out)
    assert printed == json.loads(json.dumps(results_dict(plan_study(load_study(clear_study)))))
    assert printed["links"][0]["verdict"] == "clear"


AS_SURFACE = STUDY.replace('ground = "ground.tif"', 'surface = "ground.tif"')


@pytest.mark.parametrize(
    ("text", "hill_m", "required", "code"),
    [
        (AS_SURFACE, 0.0, "clear", 0),
        (STUDY, 0.0, "clear", 1),  # clear on bare ground only is not clear
        (STUDY, 0.0, "clear-bare-ground", 0),
        (STUDY, 0.0, "marginal", 0),
        (AS_SURFACE, 60.0, "clear", 1),
        (STUDY, 60.0, "clear-bare-ground", 1),
        (STUDY, 60.0, "marginal", 1),
    ],
)
def test_required_verdict_sets_the_exit_code(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], text: str, hill_m: float, required: str, code: int
) -> None:
    assert run("plan", write_study(tmp_path, text, hill_m=hill_m), "--require", required) == code
    said = f"fellspan: --require {required} is not reached by West - East ("
    assert capsys.readouterr().err.startswith(said) == (code == 1)


def four_links(folder: Path) -> Path:
    """A study of four links over the same two places."""
    (head, link) = STUDY.split("[[link]]")
    links = ["[[link]]" + link.replace("West - East", f"Link {number}") for number in range(4)]
    return write_study(folder, head + "\n".join(links))


def test_many_links_get_a_table_and_their_decisions(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    study = four_links(tmp_path)
    assert run("plan", study) == 0
    brief = capsys.readouterr().out
    assert "dBm at A" not in brief
    assert "--full" in brief
    assert max(map(len, brief.splitlines())) <= 80
    table, neighbours, *decisions = brief.split("\n\n")[1:7]
    assert neighbours.startswith("Neighbours\n  Worst pair: ")
    assert table.count("clear on bare ground only") == len(decisions) == 4
    for text in decisions:
        assert 4 <= len(text.splitlines()) <= 6
        assert "CLEAR ON BARE GROUND ONLY" in text
        assert "Basis: bare ground only" in text
    assert run("plan", study, "--full") == 0
    assert capsys.readouterr().out.count("dBm at A") == 4
    assert run("plan", study, "--link", "Link 2") == 0
    assert "dBm at A" in capsys.readouterr().out


def test_no_view_calls_a_link_on_bare_ground_clear_alone(clear_study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    out_dir = clear_study.parent / "report"
    assert run("plan", clear_study, "--out", out_dir) == 0
    assert "\nCLEAR ON BARE GROUND ONLY: " in capsys.readouterr().out
    (row,) = csv.DictReader((out_dir / "links.csv").read_text(encoding="utf-8").splitlines())
    assert (row["verdict"], row["state"]) == ("clear", "clear on bare ground only")
    assert '"state": "clear on bare ground only"' in (out_dir / "links.geojson").read_text(encoding="utf-8")
    assert "<styleUrl>#clear-bare</styleUrl>" in (out_dir / "links.kml").read_text(encoding="utf-8")
    overview = (out_dir / "index.html").read_text(encoding="utf-8")
    assert '<span class="total clear"><b>0</b> clear</span>' in overview
    assert '<span class="total clear-bare"><b>1</b> clear on bare ground only</span>' in overview
    assert '<span class="verdict clear"' not in overview
    assert '<span class="verdict clear-bare"><b aria-hidden="true">(✓)</b> Clear on bare ground only' in overview
    assert '"s": "clear-bare"' in overview  # what the map's script draws its line by


def test_a_signal_through_an_obstruction_is_no_good_news(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    loud = STUDY.replace('threshold = "-75 dBm"', 'threshold = "-120 dBm"')
    study = write_study(tmp_path, loud, hill_m=60.0)
    assert run("plan", study, "--out", tmp_path / "report") == 0
    out = capsys.readouterr().out
    assert "MEETS" not in out
    assert "but through an obstruction" in out
    (page,) = (tmp_path / "report").glob("link-01*.html")
    assert "but through an obstruction" in page.read_text(encoding="utf-8")


def test_a_failed_link_does_not_stop_the_others(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    study = write_study(tmp_path, STUDY + SECOND)
    assert run("plan", study) == 2
    out, err = capsys.readouterr()
    assert "West - East" in out
    assert "not planned" in out
    assert "West - Offshore" in err
    assert "ground.tif" in err
    assert len(unwrapped(err).splitlines()) <= 4
    assert max(map(len, out.splitlines())) <= 80
    assert run("plan", study, "--require", "clear") == 1


def test_one_link_alone(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    study = write_study(tmp_path, STUDY + SECOND)
    assert run("plan", study, "--link", "West - East") == 0
    assert "Offshore" not in capsys.readouterr().out
    assert run("plan", study, "--link", "West - Eats") == 2
    err = capsys.readouterr().err
    assert "'West - Eats'" in err
    assert "did you mean 'West - East'" in err


def test_names_that_terminals_would_obey_are_defused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    hostile = "Ev\\u001b[31mil" + "長い名前" * 20
    study = write_study(tmp_path, STUDY.replace('"West - East"', f'"{hostile}"') + SECOND)
    run("plan", study)
    out, _ = capsys.readouterr()
    assert "\x1b" not in out
    assert "長い名前" in out


def test_the_files_a_plan_rests_on_are_stamped(clear_study: Path) -> None:
    plan = plan_study(load_study(clear_study))
    assert [(file.role, file.name) for file in plan.files] == [("study", "trial.toml"), ("ground", "ground.tif")]
    assert all(len(file.sha256) == 64 for file in plan.files)
    before = plan.files[1].sha256
    write_ground(clear_study.parent / "ground.tif", hill_m=1.0)
    assert plan_study(load_study(clear_study)).files[1].sha256 != before


def test_progress_is_told_link_by_link(clear_study: Path) -> None:
    told: list[tuple[int, int, str]] = []
    plan_study(load_study(clear_study), progress=lambda *args: told.append(args))
    assert told == [(0, 1, "West - East"), (1, 1, "")]


def test_the_step_of_the_study_is_used(clear_study: Path) -> None:
    text = clear_study.read_text(encoding="utf-8").replace(
        'ground = "ground.tif"', 'ground = "ground.tif"\nstep = "7 m"'
    )
    clear_study.write_text(text, encoding="utf-8")
    (link,) = plan_study(load_study(clear_study)).links
    assert link.result.step_m == pytest.approx(7.0, rel=0.01)


def test_a_report_goes_into_its_folder(clear_study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    out_dir = clear_study.parent / "report"
    assert run("plan", clear_study, "--out", out_dir) == 0
    assert json.loads((out_dir / "results.json").read_text(encoding="utf-8"))["links"][0]["verdict"] == "clear"
    assert (out_dir / "index.html").exists()
    assert f"report: {out_dir / 'index.html'}" in capsys.readouterr().out


def test_a_report_that_cannot_be_written_is_exit_code_4(clear_study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    target = clear_study.parent / "taken"
    target.write_text("mine", encoding="utf-8")
    assert run("plan", clear_study, "--out", target) == 4
    err = capsys.readouterr().err
    assert str(target) in err
    assert len(unwrapped(err).splitlines()) <= 4
    assert target.read_text(encoding="utf-8") == "mine"


def test_a_target_is_refused_before_anything_is_printed_or_left_there(
    clear_study: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    foreign = clear_study.parent / "mine"
    foreign.mkdir()
    (foreign / "index.html").write_text("mine", encoding="utf-8")
    (clear_study.parent / "file").touch()
    for target, word in ((foreign, "not written by Fellspan"), (clear_study.parent / "file", "is a file")):
        assert run("plan", clear_study, "--out", target) == 4
        out, err = capsys.readouterr()
        assert out == ""
        assert word in err
    assert [path.name for path in foreign.iterdir()] == ["index.html"]


def test_one_link_does_not_replace_a_report_of_others(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    study, out_dir = four_links(tmp_path), tmp_path / "report"
    assert run("plan", study, "--out", out_dir) == 0
    before = {path.name for path in out_dir.iterdir()}
    capsys.readouterr()
    assert run("plan", study, "--link", "Link 2", "--out", out_dir) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert "also holds 'Link 0', 'Link 1', 'Link 3', which --link leaves out" in unwrapped(err)
    assert {path.name for path in out_dir.iterdir()} == before
    assert run("plan", study, "--link", "Link 2", "--out", tmp_path / "alone") == 0
    assert run("plan", study, "--link", "Link 2", "--out", tmp_path / "alone") == 0
    # Links that a study has lost leave the report, and that is said.
    capsys.readouterr()
    assert run("plan", write_study(tmp_path), "--out", out_dir) == 0
    assert "'Link 2' and 1 more, not planned now: removed from it" in unwrapped(capsys.readouterr().err)


def test_a_run_that_fails_says_that_the_old_report_stands(
    clear_study: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    out_dir = clear_study.parent / "report"
    assert run("plan", clear_study, "--out", out_dir) == 0
    capsys.readouterr()
    (clear_study.parent / "ground.tif").write_text("no raster", encoding="utf-8")
    assert run("plan", clear_study, "--out", out_dir) == 2
    assert f"the earlier report in '{out_dir}' stands as it was" in unwrapped(capsys.readouterr().err)
    assert (out_dir / "index.html").exists()


def test_no_report_when_no_link_could_be_planned(clear_study: Path) -> None:
    text = clear_study.read_text(encoding="utf-8").replace("45.25000 W", "44.00000 W")
    clear_study.write_text(text, encoding="utf-8")
    assert run("plan", clear_study, "--out", clear_study.parent / "report") == 2
    assert not (clear_study.parent / "report").exists()


def test_links_left_out_are_missed_as_neighbours(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    study = Path(__file__).resolve().parents[2] / "sample_terrain" / "tolmera.toml"
    assert main.run(["plan", str(study), "--link", "Beacon - School"]) == 0
    shown = " ".join(capsys.readouterr().out.split())
    assert "neighbours: 9 other links of this study were left out" in shown
    assert "rows for a link 'Beacon - West Point'" not in shown
