"""Antennas in a study file: data-sheet numbers and pattern files become patterns, mountings arrive, faults are named."""

import math
from pathlib import Path

import pytest

from fellspan.errors import StudyError
from fellspan.links.site import Aim
from fellspan.planning.inputs import Study
from fellspan.planning.stamp import input_files
from fellspan.study.reading import read_study
from fellspan.study.writing import study_text

BASE = """
[terrain]
ground = "ground.tif"

[[site]]
name = "Hub"
at = "36.04217 N, 45.19876 W"
height = "20 m above ground"

[[site]]
name = "Farm"
at = "36.06217 N, 45.19876 W"
height = "8 m above ground"

[[site]]
name = "Quay"
at = "36.05217 N, 45.22876 W"
height = "8 m above ground"

[[radio]]
name = "radio"
frequency = "5.8 GHz"

[[link]]
name = "Hub - Farm"
a = "Hub"
b = "Farm"
radio = "radio"
antenna_a = "sector"

[[link]]
name = "Hub - Quay"
a = "Hub"
b = "Quay"
radio = "radio"
antenna_a = "sector"
feeder_loss_a = "1 dB"
"""

SHEET = """
[[antenna]]
name = "sector"
gain = "16 dBi"
azimuth_width = 90
elevation_width = 7
front_to_back = "28 dB"
bearing = 330
tilt = -1.5
polarization = "slant-45"
roll = 2
"""


def study_of(folder: Path, antenna: str, base: str = BASE) -> Study:
    (folder / "ground.tif").touch()
    return read_study(base + antenna, path=folder / "study.toml")


def pattern_csv(*, frequency: str = "5.8 GHz") -> str:
    """Two cosine-shaped cuts, 9 dBi at the peak, 40 dB of floor."""
    rows = [f"# frequency: {frequency}", "plane,angle_deg,gain_dbi"]
    for plane in ("azimuth", "elevation"):
        for angle in range(-180, 180, 2):
            front = max(math.cos(math.radians(min(abs(angle) * 1.5, 90.0))), 0.01)
            rows.append(f"{plane},{angle},{9.0 + 20.0 * math.log10(front):.2f}")
    return "\n".join(rows) + "\n"


def refused(folder: Path, antenna: str, *words: str) -> None:
    with pytest.raises(StudyError) as caught:
        study_of(folder, antenna)
    text = str(caught.value)
    assert len(text.splitlines()) <= 4
    for word in words:
        assert word in text, text


def test_data_sheet_numbers_become_a_pattern_shared_by_the_links(tmp_path: Path) -> None:
    study = study_of(tmp_path, SHEET)
    first, second = (link.antenna_a for link in study.links)
    assert first.pattern is not None
    assert first.pattern is second.pattern
    assert first.pattern.frequency_hz == 5.8e9
    assert first.peak_gain_dbi == 16.0
    assert first.pattern.gain_dbi(45.0, 0.0) == pytest.approx(16.0 - 3.0103, abs=0.01)
    assert first.mounting == Aim(bearing_deg=330.0, tilt_deg=-1.5, polarization="slant-45", roll_deg=2.0)
    assert (first.feeder_loss_db, second.feeder_loss_db) == (0.0, 1.0)


@pytest.mark.parametrize("width", ["", "azimuth_width = 360"])
def test_without_an_azimuth_width_it_is_an_omni(tmp_path: Path, width: str) -> None:
    study = study_of(tmp_path, f'[[antenna]]\nname = "sector"\ngain = "9 dBi"\nelevation_width = 12\n{width}\n')
    pattern = study.links[0].antenna_a.pattern
    assert pattern is not None
    assert pattern.gain_dbi(180.0, 0.0) == pytest.approx(9.0, abs=0.01)


def test_a_pattern_file_is_read_relative_to_the_study_and_stamped(tmp_path: Path) -> None:
    (tmp_path / "own").mkdir()
    (tmp_path / "own" / "panel.csv").write_text(pattern_csv(), encoding="utf-8")
    study = study_of(tmp_path, '[[antenna]]\nname = "sector"\npattern = "own/panel.csv"\n')
    antenna = study.links[0].antenna_a
    assert antenna.pattern is not None
    assert antenna.peak_gain_dbi == pytest.approx(9.0)
    assert antenna.mounting is None
    assert [file.name for file in input_files(study) if file.role == "antenna pattern"] == ["panel.csv"]
    assert study.notes == ()


def test_a_pattern_of_another_frequency_is_used_with_a_note(tmp_path: Path) -> None:
    (tmp_path / "panel.csv").write_text(pattern_csv(frequency="3.5 GHz"), encoding="utf-8")
    study = study_of(tmp_path, '[[antenna]]\nname = "sector"\npattern = "panel.csv"\n')
    assert study.notes == ("antenna 'sector': its pattern was measured at 3.5 GHz and is used at 5.8 GHz",)


@pytest.mark.parametrize("antenna", [SHEET, '[[antenna]]\nname = "sector"\ngain = "20 dBi"\ntilt = 3\n'])
def test_writing_and_reading_give_the_same_antennas(tmp_path: Path, antenna: str) -> None:
    study = study_of(tmp_path, antenna)
    again = read_study(study_text(study, folder=tmp_path), path=tmp_path / "study.toml")
    assert again.links == study.links
    assert (again.links[0].antenna_a.pattern is None) == (study.links[0].antenna_a.pattern is None)


def test_a_model_of_the_catalogue_is_made_at_the_frequency_of_the_radio(tmp_path: Path) -> None:
    study = study_of(tmp_path, '[[antenna]]\nname = "sector"\nmodel = "Dish 0.6 m"\n')
    antenna = study.links[0].antenna_a
    assert antenna.pattern is not None
    assert antenna.pattern.frequency_hz == 5.8e9
    # 0.55 (pi D / lambda)^2 (antenna textbooks)
    assert antenna.peak_gain_dbi == pytest.approx(
        10 * math.log10(0.55 * (math.pi * 0.6 * 5.8e9 / 299792458) ** 2), abs=0.05
    )
    assert read_study(study_text(study, folder=tmp_path), path=tmp_path / "study.toml").links == study.links


def test_models_of_an_own_catalogue_are_found_and_the_file_is_stamped(tmp_path: Path) -> None:
    (tmp_path / "own.toml").write_text(
        '[[antenna]]\nname = "shed dish"\nkind = "dish"\nlowest = "5 GHz"\nhighest = "6 GHz"\ndiameter = "0.75 m"\n'
        'aperture_efficiency = 0.5\ncross_polar_db = 30.0\nwidth = "0.75 m"\nheight = "0.75 m"\nmass_kg = 12.0\n'
        "frontal_area_m2 = 0.46\n",
        encoding="utf-8",
    )
    tables = '[antennas]\ncatalogue = "own.toml"\n\n[[antenna]]\nname = "sector"\nmodel = "shed dish"\n'
    study = study_of(tmp_path, tables)
    assert study.links[0].antenna_a.pattern is not None
    assert study.antenna_catalogue == tmp_path / "own.toml"
    assert [file.name for file in input_files(study) if file.role == "antennas"] == ["own.toml"]
    again = read_study(study_text(study, folder=tmp_path), path=tmp_path / "study.toml")
    assert (again.links, again.antenna_catalogue) == (study.links, study.antenna_catalogue)


def test_a_catalogue_that_is_not_there_is_named(tmp_path: Path) -> None:
    tables = '[antennas]\ncatalogue = "own.toml"\n\n[[antenna]]\nname = "sector"\nmodel = "dish 0.6 m"\n'
    refused(tmp_path, tables, "antennas.catalogue", "there is no file 'own.toml'")


def test_a_pattern_file_survives_writing(tmp_path: Path) -> None:
    (tmp_path / "panel.csv").write_text(pattern_csv(), encoding="utf-8")
    study = study_of(tmp_path, '[[antenna]]\nname = "sector"\npattern = "panel.csv"\nbearing = 10\n')
    text = study_text(study, folder=tmp_path)
    assert 'pattern = "panel.csv"' in text
    assert read_study(text, path=tmp_path / "study.toml").links == study.links


@pytest.mark.parametrize(
    ("keys", "words"),
    [
        ('gain = "16 dBi"\nmodel = "dish 0.6 m"', ("antenna 'sector'", "gain is given beside model")),
        ('pattern = "a.csv"\nmodel = "dish 0.6 m"', ("model and pattern are both given",)),
        ('model = "dish 0.61 m"', ("antenna 'sector'", "no antenna 'dish 0.61 m'", "dish 0.6 m")),
        ('model = "omni 450 MHz, 2 elements"', ("antenna 'sector'", "not for 5.8 GHz", "0.45 to 0.47 GHz")),
        ("elevation_width = 7", ("gain is missing",)),
        ('gain = "16 dBi"\nazimuth_width = 90', ("elevation_width is missing",)),
        ('gain = "16 dBi"\nazimuth_width = 90\nelevation_width = 7', ("antenna 'sector'", "front-to-back")),
        ('gain = "40 dBi"\nazimuth_width = 90\nelevation_width = 7\nfront_to_back = "28 dB"', ("more than it gets",)),
        ('gain = "16 dBi"\nazimut_width = 90', ("unknown key 'azimut_width'", "did you mean 'azimuth_width'")),
        ('pattern = "missing.csv"', ("antenna 'sector', pattern", "there is no file 'missing.csv'", "relative")),
        ('gain = "16 dBi"\nbearing = 400', ("antenna 'sector', bearing", "400")),
        ('gain = "16 dBi"\npolarization = "diagonal"', ("'diagonal' is not allowed", "slant+45")),
        ('gain = "16 dBi"\ntilt = "3 deg"', ("antenna 'sector', tilt",)),
    ],
)
def test_what_is_wrong_is_named(tmp_path: Path, keys: str, words: tuple[str, ...]) -> None:
    refused(tmp_path, f'[[antenna]]\nname = "sector"\n{keys}\n', *words)


def test_a_bad_pattern_file_is_named_with_its_line(tmp_path: Path) -> None:
    (tmp_path / "panel.csv").write_text(pattern_csv().replace("azimuth,0,9.00", "azimuth,0,loud"), encoding="utf-8")
    refused(
        tmp_path,
        '[[antenna]]\nname = "sector"\npattern = "panel.csv"\n',
        "antenna 'sector'",
        "panel.csv, line 93",
        "loud",
    )
