"""Writing a study and reading it back gives the same study; starter and schema agree with the reader."""

import dataclasses
import datetime as dt
import json
import tomllib
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fellspan.errors import StudyError
from fellspan.geodesy.position import Position
from fellspan.links.criteria import Criterion
from fellspan.links.site import Antenna, Link, Radio, Site
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.study.json_schema import study_json_schema, study_json_schema_text
from fellspan.study.reading import read_study
from fellspan.study.starter import starter_text
from fellspan.study.writing import quoted, study_text
from fellspan.terrain.sources import CoverSource, ObstacleSource, RasterSource, SurveySource
from fellspan.vocabulary import CriteriaPreset, LengthUnit, Polarization

HARBOUR = Site(
    name='Harbour "old" \\ quay',
    position=Position(latitude_deg=36.04217, longitude_deg=-45.19876),
    height_m=3.048,
    height_reference="roof",
    roof_m=9.0,
    roof_edge_m=2.0,
    parapet_m=1.0,
)
LIGHT = Site(
    name="North Light",
    position=Position(latitude_deg=-0.1 - 0.2, longitude_deg=179.99999),
    height_m=140.0,
    height_reference="sea",
    ground_amsl_m=-12.4,
    vertical_datum="EGM96",
)
RADIO = Radio(name="backhaul", frequency_hz=5.8e9, power_dbm=23.0, threshold_dbm=-72.5, polarization="horizontal")


def full_study(folder: Path) -> Study:
    dish = Antenna(name="dish", gain_dbi=28.0, feeder_loss_db=1.5)
    first = Link(name="first", a=HARBOUR, b=LIGHT, radio=RADIO, antenna_a=dish, wanted_margin_db=15.0)
    low = dataclasses.replace(HARBOUR, height_m=6.0, height_reference="ground", roof_edge_m=None, parapet_m=None)
    bare = Radio(name="street", frequency_hz=60.48e9 + 1.0)
    second = Link(name="second", a=LIGHT, b=low, radio=bare, antenna_b=Antenna(name="unknown panel"))
    return Study(
        title="Strait\tof\nTolmera",
        planner="Ä. Planner",
        revision="3",
        date=dt.date(2026, 5, 1),
        growth_years=5.0,
        preset="sixty-percent",
        median_k=1.3305084745762712,
        confidence=0.95,
        tiles_url="https://tiles.example/{z}/{x}/{y}.png",
        tiles_credit="Their owner",
        path=folder / "study.toml",
        links=(first, second),
        terrain=TerrainInputs(
            ground=(
                RasterSource(path=folder / "fine", role="ground"),
                RasterSource(
                    path="/vsicurl/https://a/b.tif", vertical_unit="ft", vertical_datum="EGM96", error_m=3.0, band=2
                ),
            ),
            surface=(RasterSource(path=folder.parent / "elsewhere.tif", role="surface"),),
            cover=(CoverSource(path=folder / "trees.tif", kind="tree", error_m=2.0, growth_m_per_year=0.3),),
            obstacles=(
                ObstacleSource(path=folder / "obstacles.csv", complete=("building", "tree")),
                ObstacleSource(path=folder / "survey.csv"),
            ),
            survey=(SurveySource(path=folder / "survey.csv"),),
            gaps="sea",
            sea_level_m=-0.5,
            step_m=2.5,
        ),
    )


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    home = tmp_path / "study"
    (home / "fine").mkdir(parents=True)
    for path in (tmp_path / "elsewhere.tif", home / "trees.tif", home / "obstacles.csv", home / "survey.csv"):
        path.touch()
    return home


def test_a_full_study_comes_back_the_same(folder: Path) -> None:
    study = full_study(folder)
    text = study_text(study, folder=folder)
    assert read_study(text, path=folder / "study.toml") == study


def test_a_coarse_position_stays_coarse_and_a_fine_one_fine(folder: Path) -> None:
    fine = Site(name="fine", position=Position(latitude_deg=36.1, longitude_deg=-45.25), height_m=9.0)
    link = Link(name="l", a=fine, b=dataclasses.replace(fine, name="coarse"), radio=RADIO)
    terrain = TerrainInputs(ground=(RasterSource(path=folder / "fine"),))
    notes = ("site 'coarse': the latitude is coarse",)
    study = Study(title="t", links=(link,), terrain=terrain, date=dt.date(2026, 5, 1), notes=notes)
    text = study_text(study, folder=folder)
    assert 'at = "36.10000 N, 45.25000 W"' in text
    assert 'at = "36.1 N, 45.25 W"' in text
    (note,) = read_study(text, path=folder / "s.toml").notes
    assert note.startswith("site 'coarse'")


def test_own_rules_come_back(folder: Path) -> None:
    rules = tuple(
        Criterion(name=f"k {k}", k=k, fraction=0.6, source="rule of the study file")
        for k in (float("inf"), -2.0, 4 / 3)
    )
    study = dataclasses.replace(full_study(folder), criteria=rules, preset="p530-temperate")
    assert read_study(study_text(study, folder=folder), path=folder / "study.toml") == study


@given(text=st.text(st.characters(exclude_categories=["Cs"])))
def test_any_text_survives_quoting(text: str) -> None:
    assert tomllib.loads(f"key = {quoted(text)}") == {"key": text}


@given(
    latitude=st.floats(-90, 90).filter(lambda value: value == 0.0 or abs(value) >= 1e-4),
    longitude=st.floats(-179.9999, 179.9999).filter(lambda value: value == 0.0 or abs(value) >= 1e-4),
    height=st.integers(0, 10**6).map(lambda value: value / 1000),
    frequency=st.integers(30_000_000, 300_000_000_000).map(float),
)
def test_any_numbers_survive(latitude: float, longitude: float, height: float, frequency: float) -> None:
    here = Path(__file__).parent
    site = Site(name="a", position=Position(latitude_deg=latitude, longitude_deg=longitude), height_m=height)
    link = Link(name="l", a=site, b=dataclasses.replace(LIGHT, name="b"), radio=Radio(frequency_hz=frequency))
    terrain = TerrainInputs(ground=(RasterSource(path=here),))
    study = Study(title="t", links=(link,), terrain=terrain, date=dt.date(2026, 1, 2), path=here / "s.toml")
    back = read_study(study_text(study, folder=here), path=here / "s.toml")
    assert back.links == study.links
    assert back.terrain == study.terrain


def test_one_name_for_two_things_is_refused(folder: Path) -> None:
    study = full_study(folder)
    moved = dataclasses.replace(LIGHT, position=Position(latitude_deg=1.0, longitude_deg=2.0))
    for change in ({"b": moved}, {"radio": dataclasses.replace(RADIO, power_dbm=1.0)}):
        links = (study.links[0], dataclasses.replace(study.links[0], name="third", **change))
        with pytest.raises(StudyError, match="are called"):
            study_text(dataclasses.replace(study, links=links), folder=folder)


def test_links_may_use_one_radio_on_channels_of_their_own(folder: Path) -> None:
    study = full_study(folder)
    own = dataclasses.replace(RADIO, frequency_hz=5.745e9)
    links = (*study.links, dataclasses.replace(study.links[0], name="third", radio=own))
    text = study_text(dataclasses.replace(study, links=links), folder=folder)
    assert text.count(f'name = "{RADIO.name}"') == 1
    back = read_study(text, path=folder / "again.toml")
    assert [link.radio.frequency_hz for link in back.links] == [link.radio.frequency_hz for link in links]


def test_the_starter_reads(tmp_path: Path) -> None:
    (tmp_path / "terrain").mkdir()
    (tmp_path / "terrain" / "ground.tif").touch()
    study = read_study(starter_text(date=dt.date(2026, 5, 1)), path=tmp_path / "study.toml")
    assert study.date == dt.date(2026, 5, 1)
    assert study.links[0].a.height_reference == "roof"
    assert study.notes == ()


def test_every_key_of_the_starter_is_one_of_the_schema() -> None:
    keys = set()
    for line in starter_text(date=dt.date(2026, 5, 1)).splitlines():
        stripped = line.lstrip("# ")
        if " = " in stripped and stripped.split(" = ")[0].isidentifier():
            keys.add(stripped.split(" = ")[0])
    schema = study_json_schema()
    known = {key for table in schema["$defs"].values() for key in table.get("properties", {})}
    assert keys <= known
    assert {"frequency", "wanted_margin", "cover", "tiles_url", "parapet"} <= keys


def test_the_schema_takes_its_choices_from_the_vocabulary() -> None:
    text = study_json_schema_text()
    schema = json.loads(text)
    assert "draft/2020-12" in schema["$schema"]
    assert schema["additionalProperties"] is False
    for literal in (CriteriaPreset, LengthUnit, Polarization):
        for word in literal.__args__:
            assert f'"{word}"' in text
    ground = schema["$defs"]["TerrainTable"]["properties"]["ground"]
    assert [form.get("type") for form in ground["anyOf"]] == ["string", None, "array"]
    assert schema["$defs"]["RadioTable"]["properties"]["frequency"]["type"] == "string"
    assert "frequency" in schema["$defs"]["RadioTable"]["required"]
