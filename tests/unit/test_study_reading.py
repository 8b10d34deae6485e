"""Reading study files: what they say arrives in SI, and what is wrong is named with its place, value and remedy."""

import datetime as dt
from collections.abc import Callable
from pathlib import Path

import pytest

from fellspan.errors import StudyError
from fellspan.planning.inputs import Study
from fellspan.study.reading import load_study

GOOD = """
[study]
title = "Strait of Tolmera"
planner = "Planning desk"
revision = "3"
date = 2026-05-01
growth_years = 5

[terrain]
ground = ["fine.tif", { path = "coarse.tif", unit = "ft", datum = "EGM96", error = "3 m", band = 2 }]
surface = "surface.tif"
cover = [{ path = "trees.tif", kind = "tree", growth = "0.3 m per year", error = "2 m" }]
obstacles = "obstacles.csv"
survey = ["survey.csv"]
gaps = "sea"
sea_level = "-0.5 m"
step = "2 m"

[criteria]
preset = "sixty-percent"
gradient = -39
confidence = "95 %"

[[site]]
name = "Harbour"
at = "36.04217 N, 45.19876 W"
height = "10 ft above roof"
roof = "9 m"
roof_edge = "2 m"
parapet = "1 m"

[[site]]
name = "North Light"
latitude = 36.08862
longitude = -45.17243
height = "140 m above sea level"
ground = "128.4 m"
datum = "EGM96"

[[radio]]
name = "backhaul"
frequency = "5.8 GHz"
power = "200 mW"
threshold = "-72 dBm"
polarization = "horizontal"

[[antenna]]
name = "dish"
gain = "28 dBi"

[[link]]
name = "Harbour - North Light"
a = "Harbour"
b = "North Light"
radio = "backhaul"
antenna = "dish"
feeder_loss_b = "1.5 dB"
wanted_margin = "15 dB"
height_a = "6 m above ground"
"""
FILES = ("fine.tif", "coarse.tif", "surface.tif", "trees.tif", "obstacles.csv", "survey.csv")


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    for name in FILES:
        (tmp_path / name).touch()
    return tmp_path


def load(folder: Path, text: str) -> Study:
    path = folder / "strait.toml"
    path.write_text(text, encoding="utf-8")
    return load_study(path)


def refused(folder: Path, text: str) -> list[str]:
    with pytest.raises(StudyError) as caught:
        load(folder, text)
    lines = str(caught.value).splitlines()
    assert 1 <= len(lines) <= 4
    assert all(line.strip() for line in lines)
    return lines


def test_values_arrive_in_si(folder: Path) -> None:
    study = load(folder, GOOD)
    assert (study.title, study.planner, study.revision, study.date) == (
        "Strait of Tolmera", "Planning desk", "3", dt.date(2026, 5, 1),
    )  # fmt: skip
    assert (study.growth_years, study.preset, study.criteria, study.confidence) == (5.0, "sixty-percent", (), 0.95)
    assert study.median_k == pytest.approx(1.3305, abs=5e-5)  # ITU-R P.834 relation, hand calculation for -39 N/km
    assert study.notes == ()
    assert study.path == folder / "strait.toml"
    (link,) = study.links
    assert (link.radio.frequency_hz, link.radio.threshold_dbm, link.radio.polarization) == (5.8e9, -72.0, "horizontal")
    assert link.radio.power_dbm == pytest.approx(23.0103, abs=1e-4)
    assert (link.antenna_a.gain_dbi, link.antenna_a.feeder_loss_db, link.antenna_b.feeder_loss_db) == (28.0, 0.0, 1.5)
    assert link.wanted_margin_db == 15.0


def test_terrain_paths_are_relative_to_the_study(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(folder.parent)
    terrain = load(folder, GOOD).terrain
    fine, coarse = terrain.ground
    assert (fine.path, fine.role, fine.vertical_unit, fine.band) == (folder / "fine.tif", "ground", None, 1)
    assert (coarse.vertical_unit, coarse.vertical_datum, coarse.error_m, coarse.band) == ("ft", "EGM96", 3.0, 2)
    assert terrain.surface[0].role == "surface"
    assert (terrain.cover[0].kind, terrain.cover[0].growth_m_per_year, terrain.cover[0].error_m) == ("tree", 0.3, 2.0)
    assert terrain.obstacles[0].path == folder / "obstacles.csv"
    assert terrain.survey[0].path == folder / "survey.csv"
    assert (terrain.gaps, terrain.sea_level_m, terrain.step_m) == ("sea", -0.5, 2.0)


def test_sites_and_heights_of_one_link(folder: Path) -> None:
    (link,) = load(folder, GOOD).links
    assert (link.a.height_m, link.a.height_reference) == (6.0, "ground")
    assert (link.a.roof_edge_m, link.a.parapet_m) == (None, None)  # the roof's edge stays with the roof
    assert (link.b.height_m, link.b.height_reference, link.b.ground_amsl_m) == (140.0, "sea", 128.4)
    assert (link.b.position.latitude_deg, link.b.position.longitude_deg) == (36.08862, -45.17243)
    (unchanged,) = load(folder, GOOD.replace('height_a = "6 m above ground"', "")).links
    assert unchanged.a.height_m == pytest.approx(3.048)
    assert (unchanged.a.height_reference, unchanged.a.roof_m, unchanged.a.roof_edge_m) == ("roof", 9.0, 2.0)


def test_easting_and_northing(folder: Path) -> None:
    text = GOOD.replace('at = "36.04217 N, 45.19876 W"', 'easting = 482100.0\nnorthing = 3988400.0\ncrs = "EPSG:32623"')
    position = load(folder, text).links[0].a.position
    assert position.latitude_deg == pytest.approx(36.04, abs=0.01)
    assert position.longitude_deg == pytest.approx(-45.2, abs=0.01)


def test_own_rules_and_the_flat_earth(folder: Path) -> None:
    text = GOOD.replace('preset = "sixty-percent"', 'rules = [{ name = "flat", k = inf, fraction = 0.3 }]')
    (rule,) = load(folder, text).criteria
    assert (rule.name, rule.k, rule.fraction) == ("flat", float("inf"), 0.3)


def test_url_rasters_are_left_to_the_raster_library(folder: Path) -> None:
    study = load(folder, GOOD.replace('"surface.tif"', '"/vsicurl/https://tiles.example/surface.tif"'))
    assert study.terrain.surface[0].path == "/vsicurl/https://tiles.example/surface.tif"


def test_coarse_position_is_noted(folder: Path) -> None:
    study = load(folder, GOOD.replace("36.04217 N, 45.19876 W", "36.04 N, 45.20 W"))
    assert len(study.notes) == 1
    assert study.notes[0].startswith("site 'Harbour'")


def test_stamp_and_criteria_have_defaults(folder: Path) -> None:
    start, rest = GOOD.index("[criteria]"), GOOD.index("[[site]]")
    study = load(folder, GOOD[:start] + GOOD[rest:])
    assert (study.preset, study.median_k, study.confidence) == ("p530-temperate", 4.0 / 3.0, 0.9)


Change = Callable[[str], str]


def swap(old: str, new: str) -> Change:
    return lambda text: text.replace(old, new)


WRONG: dict[str, tuple[Change, list[str]]] = {
    "empty": (lambda _: "", ["strait.toml", "empty"]),
    "blank": (lambda _: "\n \n", ["empty"]),
    "no toml": (swap("growth_years = 5", "growth_years = = 5"), ["strait.toml", "line 7"]),
    "unknown key": (swap("wanted_margin", "wanted_margn"), ["wanted_margn", "did you mean 'wanted_margin'"]),
    "mistyped needed key": (swap("frequency", "frequncy"), ["'frequncy'", "did you mean 'frequency'"]),
    "unknown table": (swap("[[site]]", "[[sites]]"), ["unknown table 'sites'", "did you mean 'site'"]),
    "unknown key in a raster": (swap("band = 2", "bnd = 2"), ["terrain.ground, number 2", "'bnd'", "'band'"]),
    "no frequency": (swap('frequency = "5.8 GHz"', ""), ["radio 'backhaul'", "frequency is missing", "5.8 GHz"]),
    "bare frequency": (swap('"5.8 GHz"', "5.8"), ["radio 'backhaul', frequency", "5.8 has no unit", '"5.8 GHz"']),
    "wrong unit": (swap('"5.8 GHz"', '"5.8 m"'), ["'5.8 m'", "GHz"]),
    "bare height": (swap('"10 ft above roof"', "10"), ["site 'Harbour', height", "10 has no unit"]),
    "height above nothing": (swap('"10 ft above roof"', '"10 ft"'), ["'10 ft' does not say above what"]),
    "negative height": (swap("10 ft above", "-10 ft above"), ["-10 ft above roof", "0 to 1000 m"]),
    "nan height": (swap('"10 ft above roof"', "nan"), ["nan has no unit"]),
    "nan growth": (swap("growth_years = 5", "growth_years = nan"), ["study.growth_years", "nan", "finite"]),
    "nan k": (swap("gradient = -39", "median_k = nan"), ["criteria.median_k", "nan"]),
    "zero k": (swap("gradient = -39", "median_k = 0"), ["criteria.median_k", "k = 0"]),
    "two k": (swap("gradient = -39", "gradient = -39\nmedian_k = 1.3"), ["median_k and gradient are both given"]),
    "confidence over one": (swap('"95 %"', "95"), ["criteria.confidence", "95", "%"]),
    "unknown preset": (swap("sixty-percent", "sixty"), ["'sixty'", "did you mean 'sixty-percent'", "p530-tropical"]),
    "undefined site": (
        swap('b = "North Light"', 'b = "Nort Light"'),
        ["link 'Harbour - North Light', b", "'Nort Light'", "did you mean 'North Light'", "Harbour, North Light"],
    ),
    "a sign lost": (
        swap('threshold = "-72 dBm"', 'threshold = "72 dBm"'),
        ["radio 'backhaul', threshold", "'72 dBm' is above -20 dBm", "did you mean '-72 dBm'"],
    ),
    "a power of a broadcaster": (swap('power = "200 mW"', 'power = "23 kW"'), ["'23 kW' is 74 dBm", "60 dBm (1 kW)"]),
    "undefined radio": (swap('radio = "backhaul"', 'radio = "fronthaul"'), ["'fronthaul'", "backhaul"]),
    "undefined antenna": (swap('antenna = "dish"', 'antenna_b = "yagi"'), ["antenna_b", "'yagi'", "dish"]),
    "same site twice": (swap('b = "North Light"', 'b = "Harbour"'), ["both ends are the site 'Harbour'"]),
    "duplicate name": (swap('name = "North Light"', 'name = "Harbour"'), ["site 'Harbour'", "2 times", "wrong too"]),
    "latitude 91": (swap("36.04217 N", "91.04217 N"), ["site 'Harbour', position", "91.04217"]),
    "no position": (swap('at = "36.04217 N, 45.19876 W"', ""), ["site 'Harbour'", "no position"]),
    "half a position": (swap("longitude = -45.17243", ""), ["site 'North Light'", "longitude is missing"]),
    "easting without crs": (
        swap('at = "36.04217 N, 45.19876 W"', "easting = 1.0\nnorthing = 2.0"),
        ["need their coordinate system", "crs ="],
    ),
    "no height": (
        swap('height = "140 m above sea level"', ""),
        ["site 'North Light'", "no antenna height", "height_b"],
    ),
    "parapet without edge": (
        lambda text: text.replace('roof_edge = "2 m"', "").replace("height_a", "#"),
        ["parapet 1 m", "'Harbour'"],
    ),
    "missing raster": (swap("surface.tif", "surfaces.tif"), ["terrain.surface", "'surfaces.tif'", "looked for at"]),
    "no raster": (
        lambda text: text[: text.index("ground =")] + text[text.index("cover =") :],
        ["terrain", "neither ground nor surface"],
    ),
    "no terrain": (
        lambda text: text[: text.index("[terrain]")] + text[text.index("[criteria]") :],
        ["there is no [terrain] table"],
    ),
    "no link": (lambda text: text[: text.index("[[link]]")], ["there is no [[link]] table", "fellspan init"]),
    "link as table": (swap("[[link]]", "[link]"), ["link", "[[link]]"]),
    "title a number": (swap('"Strait of Tolmera"', "7"), ["study.title", "7", "string"]),
    "bad date": (swap("2026-05-01", '"1 May"'), ["study.date", "'1 May'", "2026-05-01"]),
    "tiles without credit": (
        lambda text: text + '[map]\ntiles_url = "https://tiles.example/{z}/{x}/{y}.png"\n',
        ["tiles_credit"],
    ),
    "tiles of no form": (lambda text: text + '[map]\ntiles_url = "ftp://x"\n', ["map.tiles_url", "'ftp://x'", "{z}"]),
    "unknown gaps": (swap('"sea"', '"water"'), ["terrain.gaps", "'water'", "allowed: error, sea"]),
}


@pytest.mark.parametrize("case", WRONG)
def test_what_is_wrong_is_said(folder: Path, case: str) -> None:
    change, expected = WRONG[case]
    text = change(GOOD)
    assert text != GOOD
    message = "\n".join(refused(folder, text))
    for words in expected:
        assert words in message, message
    assert "strait.toml" in message.splitlines()[0]


def test_the_places_of_the_others_are_named(folder: Path) -> None:
    text = (
        GOOD.replace('"5.8 GHz"', "5.8").replace("growth_years = 5", "growth_years = -5").replace("fine.tif", "f.tif")
    )
    lines = refused(folder, text)
    assert len(lines) <= 4
    assert "growth_years" in lines[0] or "frequency" in lines[0]
    assert lines[-1].strip() in ("wrong too: radio 'backhaul', frequency", "wrong too: study.growth_years")


def test_a_long_list_of_places_is_cut_and_counted(folder: Path) -> None:
    sites = "".join(f'[[site]]\nname = "Place {number} of many"\nat = "nowhere"\n' for number in range(12))
    lines = refused(folder, GOOD + sites)
    assert len(lines) <= 4
    assert lines[0].startswith("strait.toml, site 'Place 0 of many', position")
    assert lines[-1].strip().startswith("wrong too: site 'Place 1 of many', position; site 'Place 2 of many', position")
    assert lines[-1].endswith("; and 7 more")


def test_a_file_that_is_none(tmp_path: Path) -> None:
    for path, words in ((tmp_path / "none.toml", "there is no study file"), (tmp_path, "is a folder")):
        with pytest.raises(StudyError, match=words):
            load_study(path)
    (tmp_path / "image.toml").write_bytes(b"\x89PNG\r\n\xff\xfe")
    with pytest.raises(StudyError, match="0x89"):
        load_study(tmp_path / "image.toml")


def test_byte_order_mark_is_no_obstacle(folder: Path) -> None:
    (folder / "strait.toml").write_bytes(b"\xef\xbb\xbf" + GOOD.encode())
    assert load_study(folder / "strait.toml").title == "Strait of Tolmera"
