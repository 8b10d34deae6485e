"""`fellspan equip`: decision first in 80 columns; a study, two points or a distance; JSON, a page, refusals in four lines."""

import dataclasses
import json
from pathlib import Path

import pytest
from made_studies import STUDY, A, B, run_command, unwrapped, write_ground

from fellspan.cli import main
from fellspan.design.equip_result import EquipResult, EquipRow, Reach, WindLoad
from fellspan.design.wind import DRAG

RADIO = ("--frequency", "5.8 GHz", "--power", "20 dBm", "--threshold", "-75 dBm")
FREE = ("equip", "--distance", "12 km", *RADIO)
SMALL = ("--antennas", "dish 0.3 m; dish 0.6 m", "--antennas", "panel 5 GHz, 4 x 4")
CLIMATE = """
[climate]
rain_rate = "40 mm/h"
dn1 = -200
terrain_roughness = "20 m"
"""


@pytest.fixture
def study(tmp_path: Path) -> Path:
    write_ground(tmp_path / "ground.tif")
    path = tmp_path / "trial.toml"
    path.write_text(STUDY, encoding="utf-8")
    return path


def test_the_decision_comes_first_and_the_page_fits_80_columns(study: Path) -> None:
    run = run_command("equip", study.name, "--wind", "45 m/s", "--sway", "0.3", folder=study.parent)
    assert (run.returncode, run.stderr) == (0, "")
    lines = run.stdout.splitlines()
    assert max(map(len, lines)) <= 80
    assert run.stdout.isascii()
    assert lines[0].startswith("West - East")
    assert "the smallest that meets a margin of 10 dB" in " ".join(lines[1:4])
    for words in (
        "spare",
        "wind N",
        "off aim costs",
        "sway",
        "N m about a support",
        "Far field",
        "Reach",
        "structural engineer",
    ):
        assert words in run.stdout, words


@pytest.mark.slow
def test_levels_are_those_of_plan_with_the_antenna_in_the_study(study: Path) -> None:
    run = run_command("equip", study.name, *SMALL, "--no-reach", "--json", folder=study.parent)
    assert run.returncode == 0, run.stderr
    rows = json.loads(run.stdout)["equipment"]["rows"]
    assert {row["antenna"] for row in rows} == {"dish 0.3 m", "dish 0.6 m", "panel 5 GHz, 4 x 4"}
    for row in rows:
        hung = STUDY.replace('gain = "25 dBi"', f'model = "{row["antenna"]}"')
        study.write_text(hung, encoding="utf-8")
        planned = json.loads(run_command("plan", study.name, "--json", folder=study.parent).stdout)["links"][0]
        assert row["received_dbm"]["at_b"] == pytest.approx(planned["received_dbm"]["at_b"], abs=1e-9)
        assert row["margin_db"]["at_a"] == pytest.approx(planned["margin_db"]["at_a"], abs=1e-9)
        assert row["signal_verdict"] == planned["signal_verdict"]
        assert row["reach"] is None


def test_a_study_antenna_can_be_named_beside_those_of_the_catalogue(study: Path) -> None:
    run = run_command(
        "equip",
        study.name,
        "--antennas",
        "dish",
        "--antennas",
        "dish 0.6 m",
        "--no-reach",
        "--json",
        folder=study.parent,
    )
    rows = json.loads(run.stdout)["equipment"]["rows"]
    own = next(row for row in rows if row["antenna"] == "dish")
    assert (own["peak_gain_dbi"], own["mass_kg"], own["kind"]) == (25.0, None, "gain only")


def test_two_points_need_no_study(study: Path) -> None:
    run = run_command("equip", A, B, "--ground", "ground.tif", *RADIO, *SMALL, "--json", folder=study.parent)
    assert run.returncode == 0, run.stderr
    result = json.loads(run.stdout)["equipment"]
    assert result["distance_m"] == pytest.approx(2703, abs=10)
    assert result["path_verdict"] is not None
    assert not list(study.parent.glob("sight-*.toml"))


def test_a_distance_needs_no_terrain_and_is_free_space(tmp_path: Path) -> None:
    run = run_command(*FREE, "--antennas", "dish 0.6 m", "--json", folder=tmp_path)
    assert run.returncode == 0, run.stderr
    result = json.loads(run.stdout)["equipment"]
    row = result["rows"][0]
    # Free space over 12 km at 5.8 GHz: 129.29 dB (20 log 4 pi d f / c); the air takes about 0.1 dB.
    expected = 20.0 + 2.0 * row["peak_gain_dbi"] - 129.29
    assert row["received_dbm"]["at_a"] == pytest.approx(expected, abs=0.2)
    assert result["path_verdict"] is None
    assert row["availability_percent"]["year"] is None


def test_a_rule_is_kept_and_told(tmp_path: Path) -> None:
    loud = ("equip", "--distance", "12 km", "--frequency", "2.44 GHz", "--power", "30 dBm", "--threshold", "-75 dBm")
    run = run_command(
        *loud, "--channel", "20 MHz", "--rule", "fcc-15.247-2g4-ptp", "--antennas", "grid dish 0.9 m", folder=tmp_path
    )
    assert run.returncode == 0, run.stderr
    assert "lowered by" in run.stdout
    assert "confirm with your" in run.stdout


def test_out_writes_one_page_that_needs_nothing_else(tmp_path: Path) -> None:
    run = run_command(*FREE, *SMALL, "--out", "equip.html", folder=tmp_path)
    assert run.returncode == 0, run.stderr
    assert [path.name for path in tmp_path.iterdir()] == ["equip.html"]
    text = (tmp_path / "equip.html").read_text(encoding="utf-8")
    assert "Margin against distance" in text
    assert "http://" not in text.replace("http://www.w3.org/2000/svg", "")
    assert "https://" not in text


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("equip",), "equip needs a link"),
        (("equip", "--distance", "12 km"), "--frequency, --power, --threshold"),
        (("equip", "trial.toml", "--link", "West - Est"), "'West - Est'"),
        (("equip", "trial.toml", "--radio", "raido"), "'raido'"),
        (("equip", "trial.toml", "--antennas", "dish 7 m"), "'dish 7 m'"),
        (("equip", "trial.toml", "--frequency", "6 GHz"), "'6 GHz'"),
        (("equip", "trial.toml", "--end", "c"), "'c'"),
        ((*FREE, "--wind", "45"), "wind '45'"),
        ((*FREE, "--wind", "900 m/s"), "900 m/s"),
        ((*FREE, "--sway", "80"), "80"),
        ((*FREE, "--rule", "no-such-row"), "no-such-row"),
        ((*FREE, "--target", "120"), "120"),
        (("equip", "trial.toml", "--distance", "2 km"), "--distance"),
        (("equip", "--distance", "0 m", *RADIO), "'0 m'"),
    ],
)
def test_bad_input_is_refused_in_four_lines_with_the_value(
    study: Path,
    arguments: tuple[str, ...],
    words: str,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.chdir(study.parent)
    assert main.run(arguments) == 2
    told = capsys.readouterr()
    assert words in told.err
    assert len(unwrapped(told.err).splitlines()) <= 4
    assert "Traceback" not in told.err
    assert told.out == ""


def test_a_target_of_the_study_counts_rain(study: Path) -> None:
    study.write_text(STUDY + CLIMATE, encoding="utf-8")
    run = run_command("equip", study.name, *SMALL, "--target", "99.99", "--no-reach", "--json", folder=study.parent)
    assert run.returncode == 0, run.stderr
    result = json.loads(run.stdout)["equipment"]
    assert result["target_availability_percent"] == 99.99
    assert all(row["availability_percent"]["year"] is not None for row in result["rows"])


def test_the_page_on_equipment_names_every_key() -> None:
    text = (Path(__file__).parents[2] / "docs" / "equip.md").read_text(encoding="utf-8")
    for kind in (EquipResult, EquipRow, WindLoad, Reach):
        for field in dataclasses.fields(kind):
            assert f"`{field.name}`" in text, field.name


def test_the_page_on_equipment_names_every_option() -> None:
    text = (Path(__file__).parents[2] / "docs" / "equip.md").read_text(encoding="utf-8")
    for shape, drag in DRAG.items():
        assert f"{drag.coefficient}" in text, shape
    for option in (
        "--antennas",
        "--radio",
        "--target",
        "--margin",
        "--rule",
        "--end",
        "--wind",
        "--arm",
        "--sway",
        "--off-aim",
    ):
        assert option in text, option


def test_power_that_the_rule_took_is_told_and_not_asked_back(capsys: pytest.CaptureFixture[str]) -> None:
    sample = Path(__file__).resolve().parents[2] / "sample_terrain" / "tolmera.toml"
    words = ["equip", str(sample), "--link", "Harbour Office - Cape Light", "--antennas", "dish 0.6 m"]
    assert main.run(words) == 0
    shown = " ".join(capsys.readouterr().out.split())
    assert "with the power lowered by 15.7 dB to what the power rule allows" in shown
    assert "dB more (shorter feeder" in shown
