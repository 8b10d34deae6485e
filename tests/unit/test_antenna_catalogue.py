"""The catalogue: every generic antenna builds over its range and holds its energy; the user's own are taken or refused."""

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from fellspan.antennas.catalogue import CatalogueAntenna, load_catalogue
from fellspan.antennas.sphere import directivity_dbi
from fellspan.errors import AntennaError

CATALOGUE = load_catalogue()

# Plausible gains, dBi: common practice, no source.
PLAUSIBLE = {
    "dish": (18.0, 56.0),
    "yagi": (8.5, 17.0),
    "omni": (3.0, 13.0),
    "panel": (10.0, 30.0),
    "sheet": (10.0, 21.0),
    "dipole": (1.5, 2.2),
    "patch": (4.0, 9.0),
}


@pytest.mark.parametrize("antenna", CATALOGUE.antennas, ids=lambda antenna: antenna.name)
def test_every_entry_builds_over_its_range(antenna: CatalogueAntenna) -> None:
    low, high = PLAUSIBLE[antenna.kind]
    for frequency in (antenna.lowest_hz, 0.5 * (antenna.lowest_hz + antenna.highest_hz), antenna.highest_hz):
        pattern = antenna.pattern(frequency)
        assert pattern.name == antenna.name
        assert low <= pattern.peak_gain_dbi <= high
        assert pattern.efficiency is not None
        assert 0.3 < pattern.efficiency <= 1.0
        assert np.isfinite(pattern.gain_dbi(12.0, -3.0))
        # What is shown as its size radiates: the aperture of the outer size could hold the gain, with room for edges.
        area = antenna.width_m * antenna.height_m * 4.0 * np.pi * (frequency / 299_792_458.0) ** 2
        if antenna.kind in ("dish", "panel", "sheet"):
            assert pattern.peak_gain_dbi < 10.0 * np.log10(area) + 1.0
    assert antenna.mass_kg > 0.0
    if antenna.kind in ("panel", "sheet"):
        assert antenna.frontal_area_m2 == pytest.approx(antenna.width_m * antenna.height_m, rel=0.05)


@pytest.mark.slow
@pytest.mark.parametrize("antenna", CATALOGUE.antennas, ids=lambda antenna: antenna.name)
def test_every_entry_holds_its_energy(antenna: CatalogueAntenna) -> None:
    for frequency in (antenna.lowest_hz, antenna.highest_hz):
        pattern = antenna.pattern(frequency)
        assert pattern.peak_gain_dbi <= directivity_dbi(pattern) + 0.05


def test_the_bands_are_covered() -> None:
    for ghz in (0.46, 0.868, 0.915, 2.45, 3.5, 5.2, 5.8, 7.5, 11.0, 18.0, 23.0, 26.0, 38.0, 60.0, 74.0, 80.0):
        assert CATALOGUE.covering(ghz * 1e9), ghz
    kinds = {antenna.kind for antenna in CATALOGUE.antennas}
    assert kinds == set(PLAUSIBLE)


def test_names_are_found_as_people_write_them() -> None:
    assert CATALOGUE.find("  Dish  0.6 M ").name == "dish 0.6 m"
    with pytest.raises(AntennaError, match=r"'dish 0\.7 m'") as caught:
        CATALOGUE.find("dish 0.7 m")
    assert "did you mean 'dish 0." in str(caught.value)


def test_a_frequency_outside_the_range_is_refused() -> None:
    with pytest.raises(AntennaError, match=r"dish 0\.6 m' is not for 2\.4 GHz") as caught:
        CATALOGUE.find("dish 0.6 m", 2.4e9)
    assert "4.9 to 86 GHz" in str(caught.value)
    assert "grid dish" in str(caught.value)
    with pytest.raises(AntennaError, match=r"is not for 2\.4 GHz"):
        CATALOGUE.find("dish 0.6 m").pattern(2.4e9)


GOOD = """
[[antenna]]
name = "our dish"
kind = "dish"
lowest = "5 GHz"
highest = "6 GHz"
diameter = "2 ft"
width = "0.7 m"
height = "0.7 m"
mass_kg = 8.0
frontal_area_m2 = 0.4
"""


def test_users_add_their_own(tmp_path: Path) -> None:
    (tmp_path / "panel.csv").write_text(
        "# frequency: 5.8 GHz\nplane,angle_deg,gain_dbi\n"
        + "\n".join(
            f"{plane},{angle},{10.0 - 0.3 * min(abs(angle), 80)}"
            for plane in ("azimuth", "elevation")
            for angle in range(-180, 180)
        ),
        encoding="utf-8",
    )
    (tmp_path / "mine.toml").write_text(
        GOOD
        + GOOD.replace("our dish", "our panel")
        .replace('"dish"', '"file"')
        .replace('diameter = "2 ft"', 'path = "panel.csv"'),
        encoding="utf-8",
    )
    catalogue = load_catalogue(tmp_path / "mine.toml")
    assert catalogue.names[: len(CATALOGUE.names)] == CATALOGUE.names
    dish = catalogue.find("our dish", 5.8e9)
    assert dish.source == "mine.toml"
    assert dish.pattern(5.8e9).size_m == pytest.approx(0.6096)
    panel = catalogue.find("our panel").pattern(5.2e9)
    assert (panel.name, panel.frequency_hz, panel.peak_gain_dbi) == ("our panel", 5.2e9, 10.0)


@pytest.mark.parametrize(
    ("text", "told"),
    [
        (GOOD.replace("diameter", "diametre"), "unknown key 'diametre'; did you mean 'diameter'|'diameter' is missing"),
        (GOOD + 'colour = "red"\n', "'our dish': unknown key 'colour'"),
        (GOOD.replace('diameter = "2 ft"\n', ""), "'diameter' is missing"),
        (GOOD.replace('"dish"', '"mirror"'), "kind 'mirror'"),
        (GOOD.replace('"2 ft"', "0.6"), "diameter = 0.6"),
        (GOOD.replace('"2 ft"', '"2 stones"'), "2 stones"),
        (GOOD.replace("8.0", "-8.0"), "mass_kg = -8.0"),
        (GOOD.replace('"5 GHz"', '"7 GHz"'), "above highest"),
        (GOOD + GOOD, "stands twice"),
        (GOOD.replace("our dish", "Dish 0.6 m"), "stands twice"),
        (GOOD.replace("[[antenna]]", "[antenna]"), "double brackets"),
        (GOOD.replace("[[antenna]]", "[[aerial]]"), "unknown key 'aerial'"),
        (GOOD.replace('"dish"', '"dish'), "not valid TOML"),
    ],
)
def test_bad_entries_are_refused_by_file_and_name(tmp_path: Path, text: str, told: str) -> None:
    (tmp_path / "mine.toml").write_text(text, encoding="utf-8")
    with pytest.raises(AntennaError, match=told) as caught:
        load_catalogue(tmp_path / "mine.toml")
    assert "mine.toml" in str(caught.value)
    assert len(str(caught.value).splitlines()) <= 4


def test_impossible_values_name_file_and_entry(tmp_path: Path) -> None:
    (tmp_path / "mine.toml").write_text(GOOD + "aperture_efficiency = 0.99\n", encoding="utf-8")
    with pytest.raises(AntennaError, match=r"mine\.toml, antenna 'our dish'"):
        load_catalogue(tmp_path / "mine.toml").find("our dish").pattern(5.8e9)
    with pytest.raises(AntennaError, match=r"none\.toml"):
        load_catalogue(tmp_path / "none.toml")


def test_reading_a_pattern_needs_no_validation_library() -> None:
    code = "import sys, fellspan.antennas.catalogue, fellspan.antennas.dishes; sys.exit('pydantic' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
