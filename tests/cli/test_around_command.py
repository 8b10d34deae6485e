"""`fellspan around`: the decision first, 80 columns, a study's site or a position, files, JSON, refusals in four lines."""

import json
from pathlib import Path

import pytest
from made_studies import STUDY, A, run_command, unwrapped, write_study

ALONE = ("around", A, "--ground", "ground.tif", "--height", "12 m above ground", "--frequency", "5.8 GHz")
NEAR = ("--radius", "1500 m")


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    made = tmp_path_factory.mktemp("around")
    write_study(made, hill_m=60.0)
    return made


def test_the_decision_comes_first_and_the_page_fits_80_columns(folder: Path) -> None:
    run = run_command("around", "West", "--study", "trial.toml", *NEAR, "--other-height", "7.5 m", folder=folder)
    assert (run.returncode, run.stderr) == (0, "")
    lines = run.stdout.splitlines()
    assert max(map(len, lines)) <= 80
    assert run.stdout.isascii()
    assert lines[0] == "West"
    assert lines[1].startswith("With a mast of 7.5 m at the other end,")
    for words in ("30.0 m above ground", "5.8 GHz", "0.6 F1", "bare ground only", "7.5 m", "NW", "site walk decides"):
        assert words in run.stdout, words
    assert "..." not in run.stdout


def test_a_position_with_options_says_the_same_as_json(folder: Path) -> None:
    page, numbers = (run_command(*ALONE, "--radius", "3 km", *more, folder=folder) for more in ((), ("--json",)))
    assert page.returncode == numbers.returncode == 0, numbers.stderr
    found = json.loads(numbers.stdout)["around"]
    assert f"{int(found['shares'][1] * 100)} %" in page.stdout.splitlines()[1]
    assert len(found["sectors"]) == 8
    assert found["other_height_m"] == 10.0
    # the ridge of 60 m stands to the east
    by_name = {item["sector"]: item["shares"][1] for item in found["sectors"]}
    assert by_name["E"] < 0.7 < by_name["W"]


def test_the_files_are_written_and_said(folder: Path) -> None:
    run = run_command(*ALONE, *NEAR, "--cell", "60 m", "--out", "seen", folder=folder)
    assert run.returncode == 0, run.stderr
    assert run.stdout.splitlines()[-1] == "map: seen/index.html (4 files)"
    names = {path.name for path in (folder / "seen").iterdir()}
    assert names == {"index.html", "heights.tif", "contours.geojson", "around.json"}


def own_height(text: str, *links: str) -> str:
    """The study with a height of the site (or none), and more links with heights of their own at West."""
    first, rest = STUDY.split('height = "30 m above ground"\n', 1)
    more = "".join(
        f'[[link]]\nname = "More {n}"\na = "West"\nb = "East"\nheight_a = "{height}"\nradio = "radio"\nantenna = "dish"\n'
        for n, height in enumerate(links)
    )
    linked = 'name = "West - East"\n'
    at = f'{linked}height_a = "5 m above ground"\n'
    return first + (f'height = "{text}"\n' if text else "") + rest.replace(linked, at) + more


@pytest.mark.parametrize(
    ("own", "links", "height", "words"),
    [
        ("12 m above ground", (), "12.0 m above ground", "site 'West' in own.toml; link 'West - East' has 5.0 m above ground"),
        ("12 m above ground", ("7 m above ground",), "12.0 m above ground", "(1 more differ too)"),
        ("", ("8 m above ground", "8 m above ground"), "8.0 m above ground", "2 of its 3 links in own.toml, such as 'More 0'"),
        ("", (), "5.0 m above ground", "its link in own.toml"),
    ],
)  # fmt: skip
def test_a_site_stands_at_its_own_height_and_it_is_said_whose_it_is(
    folder: Path, tmp_path: Path, own: str, links: tuple[str, ...], height: str, words: str
) -> None:
    write_study(tmp_path, hill_m=60.0)
    (tmp_path / "own.toml").write_text(own_height(own, *links), encoding="utf-8")
    ask = ("around", "West", "--study", "own.toml", *NEAR, "--cell", "60 m")
    run = run_command(*ask, "--out", "seen", folder=tmp_path)
    assert run.returncode == 0, run.stderr
    said = " ".join(run.stdout.split())
    assert f"antenna {height}," in said
    assert words in said
    page = (tmp_path / "seen" / "index.html").read_text(encoding="utf-8")
    assert "Antenna height from <bdi>" in page
    typed = json.loads(run_command(*ask, "--height", "9 m above ground", "--json", folder=tmp_path).stdout)["around"]
    assert (typed["antenna_m"], typed["above"], typed["height_from"]) == (9.0, "ground", "--height")


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("around", A), "around still needs: --ground or --surface"),
        ((*ALONE[:-1], "blue"), "blue"),
        (("around", A, "--ground", "ground.tif", "--height", "12 m", "--frequency", "5.8 GHz"), "above what"),
        (("around", "Nowhere", "--study", "trial.toml"), "'East', 'West'"),
        (("around", "West", "--study", "trial.toml", "--ground", "ground.tif"), "--ground cannot stand beside"),
        (("around", A, "--study", "trial.toml"), "--height"),
        ((*ALONE, "--radius", "0 m"), "radius 0 m"),
        ((*ALONE, "--criteria", "all"), "--criteria 'all'"),
        ((*ALONE, "--other-height", "2 km"), "2000"),
        ((*ALONE, "--radius", "900 km"), "radius 900 km"),
        ((*ALONE, "--other-height", "0 m"), "--other-height '0 m'"),
        ((*ALONE, "--cell", "0 m"), "--cell '0 m'"),
        (("around", "10 N, 10 E", *ALONE[2:]), "no data"),
        ((*ALONE, "--out", "trial.toml"), "is a file"),
    ],
)
def test_refusals_are_short_and_name_the_value(folder: Path, arguments: tuple[str, ...], words: str) -> None:
    run = run_command(*arguments, folder=folder)
    assert run.returncode in (2, 4), run.stdout
    assert run.stdout == ""
    assert words in run.stderr
    assert "Traceback" not in run.stderr
    assert len(unwrapped(run.stderr).splitlines()) <= 4
