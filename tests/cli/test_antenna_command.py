"""`fellspan antenna`: facts in 80 columns, a page that needs nothing else, diagrams as files, and refusals in four lines."""

import json
import math
import xml.etree.ElementTree as ET
from pathlib import Path

import pytest
from made_studies import run_command, unwrapped

DISH = ("antenna", "dish 0.6 m", "--frequency", "5.8 GHz")


def write_pattern(path: Path, *, frequency: str = "5.8 GHz") -> Path:
    rows = [f"# frequency: {frequency}", "# name: bread-tin panel", "plane,angle_deg,gain_dbi"]
    for plane in ("azimuth", "elevation"):
        for angle in range(-180, 180, 2):
            front = max(math.cos(math.radians(min(abs(angle) * 1.5, 90.0))), 0.01)
            rows.append(f"{plane},{angle},{9.0 + 20.0 * math.log10(front):.2f}")
    path.write_text("\n".join(rows) + "\n", encoding="utf-8")
    return path


def test_facts_fit_80_columns_and_say_what_is_asked(tmp_path: Path) -> None:
    run = run_command(*DISH, "--height", "30 m", "--tilt", "-4", folder=tmp_path)
    assert (run.returncode, run.stderr) == (0, "")
    assert max(len(line) for line in run.stdout.splitlines()) <= 80
    assert run.stdout.isascii()
    for words in (
        "Gain", "dBi at 5.8 GHz", "wide at half power", "first side lobe", "Front to back", "Cross-polar", "Far field",
        "Efficiency", "Size", "Mass", "Frontal area", "Pattern from", "Footprint", "30 m above flat ground",
    ):  # fmt: skip
        assert words in run.stdout, words
    assert list(tmp_path.iterdir()) == []


def test_the_list_names_every_antenna_and_each_can_be_asked_for(tmp_path: Path) -> None:
    run = run_command("antenna", "--list", folder=tmp_path)
    assert run.returncode == 0
    assert "dish 0.6 m" in run.stdout
    assert max(len(line) for line in run.stdout.splitlines()) <= 80
    listed = json.loads(run_command("antenna", "--list", "--json", folder=tmp_path).stdout)["antennas"]
    assert len(listed) == len(run.stdout.splitlines()) - 1
    for antenna in listed:
        assert antenna["name"] in run.stdout
        assert antenna["lowest_hz"] < antenna["highest_hz"]


def test_json_holds_the_same_facts(tmp_path: Path) -> None:
    run = run_command(*DISH, "--height", "30 m", "--tilt", "-4", "--json", folder=tmp_path)
    (dish,) = json.loads(run.stdout)["antennas"]
    assert dish["frequency_hz"] == 5.8e9
    # G = efficiency (pi D / lambda)^2 with 0.55, as the catalogue states: 28.6 dBi
    assert dish["peak_gain_dbi"] == pytest.approx(
        10 * math.log10(0.55 * (math.pi * 0.6 * 5.8e9 / 299792458) ** 2), abs=0.05
    )
    assert dish["azimuth"]["half_power_deg"] == pytest.approx(5.6, abs=0.3)
    assert dish["far_field_m"] == pytest.approx(2 * 0.6**2 * 5.8e9 / 299792458)
    outline = dish["footprint"]["outlines"][0]
    assert outline["level_db"] == -3.0
    lower = 4.0 + 0.5 * dish["elevation"]["half_power_deg"]
    assert outline["near_m"] == pytest.approx(30.0 / math.tan(math.radians(lower)), rel=0.01)


def test_a_page_and_its_diagrams_stand_alone(tmp_path: Path) -> None:
    run = run_command(
        *DISH,
        "--compare",
        "sector 5 GHz, 90 degrees",
        "--height",
        "30 m",
        "--tilt",
        "-4",
        "--out",
        "seen",
        folder=tmp_path,
    )
    assert (run.returncode, run.stderr) == (0, "")
    assert "page: seen/antenna.html" in run.stdout
    names = {path.name for path in (tmp_path / "seen").iterdir()}
    assert names == {
        "antenna.html", "azimuth.svg", "elevation.svg", "azimuth-close.svg", "elevation-close.svg", "footprint-1.svg",
        "footprint-2.svg",
    }  # fmt: skip
    page = (tmp_path / "seen" / "antenna.html").read_text(encoding="utf-8")
    assert "http://" not in page.replace("http://www.w3.org/2000/svg", "")
    assert "https://" not in page
    for name in names - {"antenna.html"}:
        drawing = ET.parse(tmp_path / "seen" / name).getroot()
        space = "{http://www.w3.org/2000/svg}"
        assert drawing.tag == f"{space}svg"
        assert drawing.find(f"{space}title") is not None
        assert (drawing.findtext(f"{space}desc") or "").strip()
        assert "prefers-color-scheme:dark" in (drawing.findtext(f"{space}style") or "")


def test_an_html_name_is_the_page_and_the_diagrams_take_its_name(tmp_path: Path) -> None:
    run = run_command("antenna", "omni 5 GHz, 12 elements", "--out", "omni.html", folder=tmp_path)
    assert run.returncode == 0
    names = {path.name for path in tmp_path.iterdir()}
    assert names == {
        "omni.html", "omni-azimuth.svg", "omni-elevation.svg", "omni-azimuth-close.svg", "omni-elevation-close.svg",
    }  # fmt: skip
    assert "the same all around" in run.stdout


@pytest.mark.parametrize("by_option", [True, False])
def test_a_pattern_file_serves_as_an_antenna(tmp_path: Path, by_option: bool) -> None:
    write_pattern(tmp_path / "tin.csv")
    run = run_command("antenna", *(("--file",) if by_option else ()), "tin.csv", folder=tmp_path)
    assert run.returncode == 0, run.stderr
    assert run.stdout.startswith("bread-tin panel\n")
    assert "9.0 dBi at 5.8 GHz" in run.stdout


def test_a_pattern_file_may_have_any_name_and_a_missing_one_is_no_antenna_name(tmp_path: Path) -> None:
    write_pattern(tmp_path / "tin.txt")
    run = run_command("antenna", "--file", "tin.txt", folder=tmp_path)
    assert run.stdout.startswith("bread-tin panel\n"), run.stderr
    gone = run_command("antenna", "--file", "gone.txt", folder=tmp_path)
    assert (gone.returncode, gone.stderr) == (
        2,
        "fellspan: cannot read pattern file gone.txt: No such file or directory\n",
    )


def test_an_own_catalogue_is_looked_up_too(tmp_path: Path) -> None:
    (tmp_path / "own.toml").write_text(
        '[[antenna]]\nname = "shed dish"\nkind = "dish"\nlowest = "5 GHz"\nhighest = "6 GHz"\ndiameter = "0.75 m"\n'
        'aperture_efficiency = 0.5\ncross_polar_db = 30.0\nwidth = "0.75 m"\nheight = "0.75 m"\nmass_kg = 12.0\n'
        "frontal_area_m2 = 0.46\n",
        encoding="utf-8",
    )
    run = run_command("antenna", "shed dish", "--catalogue", "own.toml", folder=tmp_path)
    assert run.returncode == 0, run.stderr
    assert "12 kg" in run.stdout


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((), ("no antenna is named", "--list")),
        (("dish 0.61 m",), ("no antenna 'dish 0.61 m'", "dish 0.6 m")),
        (("dish 0.6 m", "--frequency", "2.4 GHz"), ("not for 2.4 GHz", "4.9 to 86 GHz")),
        (("dish 0.6 m", "--frequency", "fast"), ("fast",)),
        (("dish 0.6 m", "--height", "0 m"), ("height 0 m", "10000")),
        (("dish 0.6 m", "--height", "30 m", "--tilt", "20"), ("meets no ground", "tilt it down")),
        (("missing.csv",), ("missing.csv",)),
        (("tin.csv", "--frequency", "11 GHz"), ("tin.csv", "leave --frequency out")),
        (("dish 0.6 m", *("--compare", "dipole") * 6), ("7 antennas", "6 at most")),
        (("dish 0.6 m", "--catalogue", "nowhere.toml"), ("nowhere.toml",)),
    ],
)
def test_refusals_are_short_and_name_the_remedy(
    tmp_path: Path, arguments: tuple[str, ...], words: tuple[str, ...]
) -> None:
    write_pattern(tmp_path / "tin.csv")
    run = run_command("antenna", *arguments, folder=tmp_path)
    assert (run.returncode, run.stdout) == (2, "")
    assert len(unwrapped(run.stderr).splitlines()) <= 4
    assert "Traceback" not in run.stderr
    for word in words:
        assert word in run.stderr, run.stderr


def test_a_folder_that_cannot_be_made_is_exit_code_4(tmp_path: Path) -> None:
    (tmp_path / "file").touch()
    run = run_command(*DISH, "--out", "file/inside", folder=tmp_path)
    assert run.returncode == 4
    assert "cannot write" in run.stderr


def test_antennas_are_compared_at_a_frequency_that_all_of_them_cover(tmp_path: Path) -> None:
    names = ("dish 0.6 m", "--compare", "grid dish 0.6 m")
    told = json.loads(run_command("antenna", *names, "--json", folder=tmp_path).stdout)
    listed = json.loads(run_command("antenna", "--list", "--json", folder=tmp_path).stdout)["antennas"]
    bands = {one["name"]: (one["lowest_hz"], one["highest_hz"]) for one in listed}
    frequencies = {one["frequency_hz"] for one in told["antennas"]}
    assert len(frequencies) == 1
    assert all(bands[one["name"]][0] <= one["frequency_hz"] <= bands[one["name"]][1] for one in told["antennas"])
    alone = json.loads(run_command("antenna", "dish 0.6 m", "--json", folder=tmp_path).stdout)["antennas"][0]
    assert alone["frequency_hz"] not in frequencies


def test_antennas_without_a_common_frequency_are_told_not_to_compare(tmp_path: Path) -> None:
    listed = json.loads(run_command("antenna", "--list", "--json", folder=tmp_path).stdout)["antennas"]
    low = min(listed, key=lambda one: one["highest_hz"])["name"]
    high = max(listed, key=lambda one: one["lowest_hz"])["name"]
    run = run_command("antenna", low, "--compare", high, "--out", "page.html", folder=tmp_path)
    assert run.returncode == 0, run.stderr
    words = "gains and beams do not compare"
    assert words in " ".join(run.stdout.split())
    assert words in (tmp_path / "page.html").read_text(encoding="utf-8")
    assert words not in run_command("antenna", high, folder=tmp_path).stdout
