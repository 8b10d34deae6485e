"""Water of a study: read, refused, written again, and used by the plan; every key of its answer is explained."""

import dataclasses
import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from made_profiles import METRES_PER_DEGREE, link_of, profile_of

from fellspan.cli.layout import Ink
from fellspan.cli.link_page import link_lines
from fellspan.design.reflection_result import ReflectionResult
from fellspan.design.reflections import Water, find_reflections
from fellspan.errors import StudyError
from fellspan.exports.results_json import results_dict
from fellspan.links.assess import assess_profile
from fellspan.planning.plan import StudyPlan
from fellspan.planning.planner import plan_study
from fellspan.report.pages import render_pages
from fellspan.study.reading import load_study, read_study
from fellspan.study.writing import study_text
from fellspan.terrain.water_outlines import WaterFileError, read_outlines

ROOT = Path(__file__).resolve().parents[2]
SAMPLE = ROOT / "sample_terrain" / "tolmera.toml"
STUDY = """
[terrain]
ground = "ground.tif"

{water}

[[site]]
name = "A"
at = "36.05 N, 45.20 W"
height = "20 m above ground"

[[site]]
name = "B"
at = "36.05 N, 45.10 W"
height = "20 m above ground"

[[radio]]
name = "r"
frequency = "5.8 GHz"

[[link]]
name = "A - B"
a = "A"
b = "B"
radio = "r"
"""


def read(water: str, folder: Path) -> Any:
    (folder / "ground.tif").touch()
    return read_study(STUDY.format(water=water), path=folder / "s.toml")


def square(name: str, west: float, east: float, folder: Path, kind: str = "Polygon") -> Path:
    ring = [[west, -1.0], [east, -1.0], [east, 1.0], [west, 1.0], [west, -1.0]]
    shape = {"type": kind, "coordinates": [ring] if kind == "Polygon" else ring}
    feature = {"type": "Feature", "properties": {"anything": 7}, "geometry": shape}
    path = folder / name
    path.write_text(json.dumps({"type": "FeatureCollection", "features": [feature]}), encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def plan() -> StudyPlan:
    """The sample's sea links, in a sea with a tide."""
    study = load_study(SAMPLE)
    names = ("South Light - Ostrel Landing", "Harbour Office - Cape Light")
    links = tuple(link for link in study.links if link.name in names)
    return plan_study(dataclasses.replace(study, links=links, water_level_m=0.0, water_low_m=-0.6, water_high_m=0.8))


def test_levels_and_outlines_are_read_and_written_again(tmp_path: Path) -> None:
    square("lake.geojson", -45.2, -45.1, tmp_path)
    text = '[water]\nlevel = "1 ft"\nlow = "-0.6 m"\nhigh = "0.8 m"\noutlines = "lake.geojson"'
    study = read(text, tmp_path)
    assert study.water_level_m == pytest.approx(0.3048)
    assert (study.water_low_m, study.water_high_m) == (-0.6, 0.8)
    assert study.water_outlines == (tmp_path / "lake.geojson",)
    again = read_study(study_text(study, folder=tmp_path), path=tmp_path / "s.toml")
    for name in ("water_level_m", "water_low_m", "water_high_m", "water_outlines"):
        assert getattr(again, name) == getattr(study, name), name
    assert "[water]" not in study_text(read("", tmp_path), folder=tmp_path)


@pytest.mark.parametrize(
    ("water", "shown"),
    [
        ('level = "0 m"\nlow = "-1 m"', "high is missing"),
        ('low = "-1 m"\nhigh = "1 m"', "level is missing"),
        ('level = "2 m"\nlow = "-1 m"\nhigh = "1 m"', "level 2 m"),
        ('outlines = "none.geojson"', "none.geojson"),
        ("level = 3", "level"),
        ('tide = "1 m"', "tide"),
    ],
)
def test_what_does_not_fit_is_refused_by_name(water: str, shown: str, tmp_path: Path) -> None:
    with pytest.raises(StudyError) as caught:
        read(f"[water]\n{water}", tmp_path)
    assert shown in str(caught.value)
    assert "water" in str(caught.value)
    assert len(str(caught.value).splitlines()) <= 4


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("{", "not GeoJSON"),
        ('{"type": "Polygon"}', "features"),
        ('{"type": "FeatureCollection", "features": []}', "no features"),
        ('{"type": "FeatureCollection", "features": [{"type": "Feature", "geometry": null}]}', "no geometry"),
        ('{"type": "FeatureCollection", "features": [3]}', "feature 1"),
        (
            '{"type": "Feature", "geometry": {"type": "Polygon", "coordinates": [[[5e5, 1], [5e5, 2], [6e5, 2], [5e5, 1]]]}}',
            "600000",
        ),
        ('{"type": "Feature", "geometry": {"type": "Point", "coordinates": [1, 2]}}', "Point"),
        ('{"type": "Feature", "crs": {"name": "EPSG:32623"}}', "32623"),
    ],
)
def test_files_of_outlines_that_cannot_be_used(text: str, shown: str, tmp_path: Path) -> None:
    file = tmp_path / "lake.geojson"
    file.write_text(text, encoding="utf-8")
    with pytest.raises(WaterFileError, match=r"lake\.geojson") as caught:
        read_outlines((file,))
    assert shown in str(caught.value)
    assert len(str(caught.value).splitlines()) <= 4


def test_no_files_are_no_outlines() -> None:
    assert read_outlines(()) is None


def test_outlines_hold_across_180_degrees(tmp_path: Path) -> None:
    outlines = read_outlines((square("a.geojson", 179.0, 181.0, tmp_path),))
    assert outlines is not None
    found = outlines.inside(np.zeros(5), np.array([178.5, 179.5, -179.5, -178.5, 180.0]))
    assert found.tolist() == [False, True, True, False, True]


def test_a_lake_in_an_outline_lies_at_the_level_of_its_ground(tmp_path: Path) -> None:
    """A lake at 300 m that ripples in the raster, among rough hills; the sea level that the study states is not its own."""

    def ground(x: np.ndarray) -> np.ndarray:
        lake = 300.0 + 0.4 * np.sin(x / 9.0)
        return np.where((x > 3_000.0) & (x < 8_000.0), lake, 301.0 + 6.0 * np.sin(x / 37.0))

    profile = profile_of(10e3, ground, n=2001)
    link = link_of(profile, 60.0, 60.0)
    done = assess_profile(link, profile)

    def with_water(water: Water) -> ReflectionResult:
        return find_reflections(link, result=done.result, profile=done.profile, levels=done.levels, water=water)

    west, east = 3_000.0 / METRES_PER_DEGREE, 8_000.0 / METRES_PER_DEGREE
    outlines = read_outlines((square("lake.geojson", west, east, tmp_path),))
    found = with_water(Water(level_m=0.0, low_m=-5.0, high_m=5.0, outlines=outlines))
    main = next(point for point in found.points if point.name == "median")
    assert main.surface == "water"
    assert main.level_m == pytest.approx(300.0, abs=0.05)
    assert 3_000.0 <= main.from_m < main.at_m < main.to_m <= 8_000.0
    # the tide of the sea is not the lake's: it moves nothing
    still = with_water(Water(outlines=outlines))
    assert found.span_wavelengths == still.span_wavelengths
    assert found.span_wavelengths is not None
    assert not any(point.surface == "water" for point in with_water(Water()).points)


def test_the_sample_crosses_its_sea(plan: StudyPlan) -> None:
    for linked in plan.links:
        found = linked.reflections
        assert found is not None
        assert found.matters
        assert found.surface_material == "sea water"
        assert all(point.surface == "water" and point.level_m == 0.0 for point in found.points[:3])
        assert "The water between" in found.sentences[0]
        assert found.water_high_m == 0.8
        deepest = max(point.fade_db or 0.0 for point in found.points[:3])
        assert f"fades reach {deepest:.0f} dB" in " ".join(found.sentences)
        lines = "\n".join(link_lines(linked, ink=Ink(colours=False)))
        assert "Reflection" in lines
        assert all(len(line) <= 80 for line in lines.splitlines())


def test_the_page_of_a_link_shows_curves_and_words(plan: StudyPlan) -> None:
    page = next(text for name, text in render_pages(plan).items() if name.startswith("link-01"))
    section = page[page.index('<section class="reflections" id="reflections">') :]
    section = section[: section.index("</section>")]
    assert section.count('class="beam-view lobing"') == 2
    assert "The water between" in section
    assert "Deepest fade" in section
    assert "P.530-19" in section


def test_every_key_of_reflections_is_explained(plan: StudyPlan) -> None:
    text = (ROOT / "docs" / "results.md").read_text(encoding="utf-8")

    def keys(value: Any) -> set[str]:
        if isinstance(value, dict):
            return set(value).union(*(keys(inner) for inner in value.values()))
        return set().union(*(keys(inner) for inner in value)) if isinstance(value, list) else set()

    found = [link["reflections"] for link in results_dict(plan)["links"]]
    assert found[0]["points"][0]["amplitude"] > 0.0
    assert found[0]["points"][2]["k"] is None
    missing = sorted(key for key in keys(found) if f"`{key}`" not in text)
    assert not missing, missing
    json.dumps(found, allow_nan=False)


def test_a_study_without_water_says_nothing_of_it_on_the_first_page() -> None:
    study = load_study(SAMPLE)
    links = tuple(link for link in study.links if link.name == "Town Hall - North Landing")
    (linked,) = plan_study(dataclasses.replace(study, links=links)).links
    assert linked.reflections is not None
    assert not linked.reflections.matters
    assert "Reflection" not in "\n".join(link_lines(linked, ink=Ink(colours=False)))
