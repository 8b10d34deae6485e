"""CSV, GeoJSON, KML and GPX: readable by others whatever the names hold, and right at the antimeridian."""

import csv
import io
import json
import xml.etree.ElementTree as ET
from dataclasses import replace

import numpy as np
import pytest
import shapely
from exports_made_plan import LENGTH_M, made_link, made_plan

from fellspan.exports.geo import links_geojson
from fellspan.exports.kml import NAMESPACE, links_kml
from fellspan.exports.places import Place, split_at_antimeridian
from fellspan.exports.survey import GPX_NAMESPACE, survey_csv, survey_gpx, survey_points
from fellspan.exports.tables import LINK_COLUMNS, links_csv, profile_csv, profile_name
from fellspan.exports.text import csv_cell, utf8
from fellspan.planning.plan import StudyPlan

HOSTILE = [
    "</name><script>alert(1)</script>",
    "]]> & <!-- \" ' &amp; <![CDATA[",
    '=HYPERLINK("http://x.example","y")',
    "null \x00 bell \x07 lone \ud800 not a character ￾",
    "Ærøskøbing Ω 港 🏝 \u202e right to left",
    "two\nlines\tand a tab",
    "",
]


def hostile_plan(text: str) -> StudyPlan:
    return made_plan(made_link(name=text, a=text, b=text + "2", cause=text), title=text, failed=text)


def rows_of(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text, newline="")))


@pytest.mark.parametrize("text", HOSTILE)
def test_hostile_names_leave_every_format_readable(text: str) -> None:
    plan = hostile_plan(text)
    kml = ET.fromstring(links_kml(plan).encode("utf-8"))
    names = [element.text or "" for element in kml.iter(f"{{{NAMESPACE}}}name")]
    kept = "".join(letter for letter in text if letter in "\n\t" or (letter.isprintable() or letter == "\u202e"))
    assert kept.replace("￾", "") in names
    assert kml.find(".//{*}script") is None
    points = survey_points(plan)
    gpx = ET.fromstring(survey_gpx(points, title=text).encode("utf-8"))
    assert len(gpx.findall(f"{{{GPX_NAMESPACE}}}wpt")) == len(points)
    collection = json.loads(links_geojson(plan).encode("utf-8"))
    assert collection["features"][-1]["properties"]["link"] == text
    for table in (links_csv(plan), survey_csv(points), profile_csv(plan.links[0])):
        for row in csv.reader(io.StringIO(table.encode("utf-8").decode("utf-8"), newline="")):
            for cell in row:
                assert not cell.startswith(("=", "@", "\t", "\r", "+"))
                if cell.startswith("-"):
                    float(cell)


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@SUM(A1)", "\t=1", "\r=1", "\n=1", "  =1", "＝1", "-2 m wall"])
def test_a_cell_from_a_user_never_starts_a_formula(text: str) -> None:
    assert csv_cell(text) == "'" + text


def test_numbers_stay_numbers_and_what_is_undefined_stays_empty() -> None:
    assert [csv_cell(value) for value in (-1.5, 0, 3, float("nan"), float("inf"), None, True)] == [
        "-1.5",
        "0",
        "3",
        "",
        "",
        "",
        "yes",
    ]


def test_links_csv_has_a_row_a_link_with_its_numbers_and_one_for_a_failure() -> None:
    rows = rows_of(links_csv(made_plan()))
    assert list(rows[0]) == list(LINK_COLUMNS)
    assert len(rows) == 2
    first, failed = rows
    assert first["name"] == "Quay - Tower"
    assert float(first["distance_m"]) == LENGTH_M
    assert float(first["extra_height_a_m"]) == 7.5
    assert first["extra_height_b_m"] == ""
    assert float(first["tilt_ba_deg"]) == -0.16
    assert float(first["b_antenna_amsl_m"]) == 37.5
    assert first["page"] == "link-01-quay-tower.html"
    assert failed["verdict"] == "not assessed"
    assert "3.21 km" in failed["reason"]


def test_the_profile_table_holds_every_sample_and_each_criterion() -> None:
    linked = made_link()
    rows = rows_of(profile_csv(linked))
    assert len(rows) == linked.profile.distance_m.size
    worst = rows[40]
    assert worst["cover_kind"] == "tree"
    assert worst["obstacle"] == "lime tree"
    assert float(worst["surface_m"]) == 30.0
    for index in (0, 1):
        need = float(worst[f"need_m (rule {index})"])
        assert need == pytest.approx(float(linked.levels.need_m[index, 40]), abs=5e-4)
    assert profile_name(3, "Quay - Tower") == "profile-04-quay-tower.csv"
    assert profile_name(0, "港") == "profile-01.csv"


def test_geojson_follows_the_standard_and_puts_things_where_they_are() -> None:
    collection = json.loads(links_geojson(made_plan()))
    assert collection["type"] == "FeatureCollection"
    assert "crs" not in collection
    shapes = {}
    for feature in collection["features"]:
        assert set(feature) == {"type", "geometry", "properties"}
        shape = shapely.from_geojson(json.dumps(feature["geometry"]))
        assert shape.is_valid
        assert not shape.has_z
        assert -45.21 < shape.bounds[0] < -45.1  # longitude first
        shapes.setdefault(feature["properties"]["what"], []).append((shape, feature["properties"]))
    assert set(shapes) == {"site", "path", "governing point", "obstruction"}
    assert len(shapes["site"]) == 2
    point, properties = shapes["governing point"][0]
    assert properties["governs"] is True
    assert (point.y, point.x) == pytest.approx((36.054, -45.2 + 0.4 * 0.0427), abs=1e-7)
    stretch, properties = shapes["obstruction"][0]
    assert stretch.geom_type == "LineString"
    ends = np.array(stretch.coords)
    assert (ends[0, 0] + 45.2) / 0.0427 * LENGTH_M == pytest.approx(1_500.0, abs=0.02)
    assert (ends[-1, 0] + 45.2) / 0.0427 * LENGTH_M == pytest.approx(1_720.0, abs=0.02)
    assert properties["cause"] == "lime tree"


def test_geojson_and_kml_cut_a_path_at_the_antimeridian() -> None:
    plan = made_plan(made_link(longitude_deg=179.98))
    path = next(f for f in json.loads(links_geojson(plan))["features"] if f["properties"]["what"] == "path")
    assert path["geometry"]["type"] == "MultiLineString"
    west, east = path["geometry"]["coordinates"]
    assert west[0][0] == pytest.approx(179.98)
    assert west[-1][0] == 180.0
    assert east[0][0] == -180.0
    assert west[-1][1] == east[0][1] == pytest.approx(36.05 + 0.01 * 0.02 / 0.0427, abs=1e-6)
    for line in (west, east):
        longitudes = [position[0] for position in line]
        assert max(longitudes) - min(longitudes) < 1.0
    kml = ET.fromstring(links_kml(plan))
    lines = kml.findall(f".//{{{NAMESPACE}}}MultiGeometry/{{{NAMESPACE}}}LineString")
    assert len(lines) == 2


def _place(longitude: float) -> Place:
    return Place(distance_m=0.0, latitude_deg=10.0, longitude_deg=longitude, ray_amsl_m=5.0)


@pytest.mark.parametrize(
    ("line", "parts"),
    [
        ((10.0, 11.0, 12.0), [[10.0, 11.0, 12.0]]),
        ((179.0, -179.0), [[179.0, 180.0], [-180.0, -179.0]]),
        ((-179.0, 179.0), [[-179.0, -180.0], [180.0, 179.0]]),
        ((179.0, -180.0, -179.0), [[179.0, 180.0], [-180.0, -179.0]]),
        ((-179.0, -180.0, 179.0), [[-179.0, -180.0], [180.0, 179.0]]),
        ((178.0, 179.0, -179.0, 179.0), [[178.0, 179.0, 180.0], [-180.0, -179.0, -180.0], [180.0, 179.0]]),
    ],
)
def test_lines_are_cut_exactly_at_180(line: tuple[float, ...], parts: list[list[float]]) -> None:
    cut = split_at_antimeridian(tuple(_place(longitude) for longitude in line))
    assert [[place.longitude_deg for place in part] for part in cut] == parts


def test_kml_rays_stand_above_sea_level_less_the_bulge() -> None:
    linked = made_link()
    kml = ET.fromstring(links_kml(made_plan(linked)))
    assert kml.tag == f"{{{NAMESPACE}}}kml"
    line = kml.find(f".//{{{NAMESPACE}}}LineString")
    assert line is not None
    assert line.findtext(f"{{{NAMESPACE}}}altitudeMode") == "absolute"
    coordinates = [
        tuple(map(float, triple.split(","))) for triple in (line.findtext(f"{{{NAMESPACE}}}coordinates") or "").split()
    ]
    assert coordinates[0] == (-45.2, 36.05, 28.0)
    assert coordinates[-1][2] == 37.5
    middle = min(coordinates, key=lambda triple: abs(triple[1] - 36.055))
    bulge = 2_000.0**2 / (2.0 * 4.0 / 3.0 * 6371e3)
    assert middle[2] == pytest.approx(28.0 + 9.5 / 2 - bulge, abs=0.11)


def test_the_survey_list_ranks_joins_and_says_how_high_a_top_may_be() -> None:
    plan = made_plan(made_link(), made_link(name="second"))
    points = survey_points(plan)
    first = [point for point in points if point.link == "Quay - Tower"]
    assert [point.rank for point in first] == list(range(1, len(first) + 1))
    worst = first[0]
    levels = plan.links[0].levels
    spare = float((levels.available_m[40] - levels.need_m[:, 40]).min())
    assert worst.label == "L01-01"
    assert worst.from_a_m == 1_600.0
    assert worst.spare_m == pytest.approx(spare)
    assert worst.highest_top_m == pytest.approx(30.0 + spare)
    assert worst.verify.count(";") == 4  # two criteria, each with governing point and obstruction; and trees not listed
    assert [point.stands_there for point in first[-2:]] == ["site Quay", "site Tower"]
    assert all(point.spare_m is None for point in first[-2:])
    assert [point.label for point in points][len(first) :] == [f"L02-{rank:02d}" for rank in range(1, len(first) + 1)]


def test_survey_points_apart_are_ranked_by_the_least_spare_height() -> None:
    linked = made_link()
    far = replace(linked.result.clearance[1], worst_at_m=3_000.0, obstructions=())
    result = replace(linked.result, clearance=(far, linked.result.clearance[0]), governing=1)
    points = survey_points(made_plan(replace(linked, result=result)))
    points = tuple(point for point in points if "governing" in point.verify)
    assert [point.from_a_m for point in points[:2]] == [1_600.0, 3_000.0]
    spares = [point.spare_m for point in points[:2]]
    assert spares[0] is not None
    assert spares[1] is not None
    assert spares[0] < 0.0 < spares[1]


def test_gpx_has_named_waypoints_with_the_ground_as_elevation() -> None:
    points = survey_points(made_plan())
    gpx = ET.fromstring(survey_gpx(points, title="T"))
    assert gpx.get("version") == "1.1"
    waypoint = gpx.find(f"{{{GPX_NAMESPACE}}}wpt")
    assert waypoint is not None
    assert [child.tag.split("}")[1] for child in waypoint] == ["ele", "name", "desc"]  # the order the schema asks for
    assert float(waypoint.get("lat", "")) == pytest.approx(36.054)
    assert waypoint.findtext(f"{{{GPX_NAMESPACE}}}ele") == "8.00"
    assert "Nothing may stand above" in (waypoint.findtext(f"{{{GPX_NAMESPACE}}}desc") or "")


def test_lone_surrogates_do_not_stop_the_encoder() -> None:
    assert utf8("a\ud800b") == "a?b"
