"""Obstacle and survey files that are broken, huge or malicious: four clear lines each, never anything else."""

import contextlib
import json
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from fellspan.errors import FellspanError, ObstacleFileError, SurveyFileError
from fellspan.terrain.obstacle_files import ATTRIBUTES, read_obstacles
from fellspan.terrain.survey import COLUMNS, read_survey

HEAD = b"latitude_deg,longitude_deg,height_m\n"


def feature(kind: str, coordinates: str) -> bytes:
    """One feature, 5 m high, with coordinates that need not be right."""
    geometry = f'{{"type": "{kind}", "coordinates": {coordinates}}}'
    return f'{{"type": "Feature", "geometry": {geometry}, "properties": {{"height_m": 5}}}}'.encode()


POINT = {"type": "Point", "coordinates": [-45.2, 36.0]}

BROKEN = {
    "empty.csv": b"",
    "blank.csv": b" \n \n",
    "zeros.csv": b"\0" * 4096,
    "binary.csv": bytes(range(256)) * 16,
    "latin.csv": HEAD + "36,-45,5é".encode("latin-1"),
    "utf16.csv": "latitude_deg,longitude_deg,height_m\n36,-45,5\n".encode("utf-16"),
    "quote.csv": HEAD + b'36,-45,"5\n' * 50,
    "control.csv": HEAD + b"36,-45,\x1b[2J5\n",
    "wide.csv": HEAD + b"36,-45,5" + b"," * 10_000 + b"7\n",
    "longfield.csv": HEAD + b"36,-45," + b"9" * 300_000 + b"\n",
    "huge.csv": HEAD + b"36,-45,1e999\n",
    "image.csv": b"\x89PNG\r\n\x1a\n" + b"\x01" * 64,
    "deepwkt.csv": b"wkt,height_m\n" + b"GEOMETRYCOLLECTION(" * 5000 + b",5\n",
    "empty.geojson": b"",
    "list.geojson": b"[1, 2, 3]",
    "null.geojson": b"null",
    "cut.geojson": b'{"type": "FeatureCollection", "features": [{"type": "Fea',
    "deep.geojson": b"[" * 100_000 + b"]" * 100_000,
    "digits.geojson": b'{"type": "FeatureCollection", "features": [' + b"9" * 10_000 + b"]}",
    "nofeatures.geojson": b'{"type": "FeatureCollection", "features": {"a": 1}}',
    "strings.geojson": b'{"type": "FeatureCollection", "features": ["a", "b"]}',
    "properties.geojson": json.dumps({"type": "Feature", "geometry": POINT, "properties": [1]}).encode(),
    "nogeometry.geojson": b'{"type": "Feature", "geometry": null, "properties": {"height_m": 5}}',
    "numbers.geojson": b'{"type": "Feature", "geometry": {"type": "Point", "coordinates": "x"}, "properties": {}}',
    "nan.geojson": feature("Point", "[NaN, 36]"),
    "metres.geojson": feature("Point", "[5e5, 4e6]"),
    "crs.geojson": b'{"type": "FeatureCollection", "crs": {"properties": {"name": "EPSG:32623"}}, "features": []}',
    "collection.geojson": b'{"type": "Feature", "geometry": {"type": "GeometryCollection", "geometries": []}}',
    "onepoint.geojson": feature("LineString", "[[1, 2]]"),
    "openring.geojson": feature("Polygon", "[[[1, 2], [3, 4], [5, 6]]]"),
    "flat.geojson": feature("Polygon", "[[[1, 2], [3, 4], [1, 2], [1, 2]]]"),
}


def check(error: FellspanError, name: str) -> None:
    message = str(error)
    assert name in message
    assert message.count("\n") <= 3
    assert len(message) < 700
    assert all(letter.isprintable() or letter == "\n" for letter in message)
    assert error.exit_code == 2


@pytest.mark.parametrize("name", sorted(BROKEN))
def test_a_broken_obstacle_file_is_one_clear_message(tmp_path: Path, name: str) -> None:
    file = tmp_path / name
    file.write_bytes(BROKEN[name])
    with pytest.raises(ObstacleFileError) as caught:
        read_obstacles(file)
    check(caught.value, name)


@pytest.mark.parametrize("name", sorted(name for name in BROKEN if name.endswith(".csv")))
def test_a_broken_survey_file_is_one_clear_message(tmp_path: Path, name: str) -> None:
    file = tmp_path / name
    file.write_bytes(BROKEN[name])
    with pytest.raises(SurveyFileError) as caught:
        read_survey(file)
    check(caught.value, name)


def test_names_cannot_command_a_terminal(tmp_path: Path) -> None:
    file = tmp_path / "named.csv"
    file.write_text(
        'latitude_deg,longitude_deg,height_m,name,source\n36,-45,5,"\x1b[2Jmast\u202e\nx",\x07me\n', encoding="utf-8"
    )
    ((mast,), _, _) = read_obstacles(file)
    assert mast.name.isprintable()
    assert mast.source.isprintable()
    assert "mast" in mast.name


def test_a_folder_is_no_file(tmp_path: Path) -> None:
    with pytest.raises(ObstacleFileError, match="cannot be read"):
        read_obstacles(tmp_path)
    with pytest.raises(SurveyFileError, match="cannot be read"):
        read_survey(tmp_path)


cell = st.one_of(st.text(max_size=12), st.floats().map(str), st.integers(-400, 400).map(str), st.just(""))
places = ("latitude_deg", "longitude_deg", "wkt", *ATTRIBUTES)
fuzz = settings(
    max_examples=150, deadline=None, derandomize=True, suppress_health_check=[HealthCheck.function_scoped_fixture]
)


@given(data=st.data())
@fuzz
def test_any_table_is_read_or_refused(tmp_path: Path, data: st.DataObject) -> None:
    columns, read = data.draw(st.sampled_from([(places, read_obstacles), (COLUMNS, read_survey)]))
    head = data.draw(st.lists(st.sampled_from(columns), min_size=1, max_size=6, unique=True))
    rows = data.draw(st.lists(st.lists(cell, min_size=1, max_size=len(head)), max_size=4))
    text = "\n".join([",".join(head), *(",".join(row) for row in rows)])
    file = tmp_path / "fuzz.csv"
    file.write_text(text, encoding="utf-8", errors="replace")
    with contextlib.suppress(FellspanError):
        read(file)


json_values = st.recursive(
    st.none() | st.booleans() | st.floats() | st.integers(-(10**30), 10**30) | st.text(max_size=8),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=6), inner, max_size=3),
    max_leaves=8,
)
coordinates = st.recursive(
    st.lists(st.floats(-200, 200) | json_values, max_size=3), lambda inner: st.lists(inner, max_size=4), max_leaves=8
)


@given(
    kind=st.sampled_from(["Point", "LineString", "Polygon", "MultiPolygon", "MultiPoint", "Blob"]),
    where=coordinates,
    properties=st.dictionaries(st.sampled_from(ATTRIBUTES), json_values, max_size=5) | json_values,
)
@fuzz
def test_any_feature_is_read_or_refused(tmp_path: Path, kind: str, where: object, properties: object) -> None:
    data = {"type": "Feature", "geometry": {"type": kind, "coordinates": where}, "properties": properties}
    file = tmp_path / "fuzz.geojson"
    file.write_text(json.dumps(data), encoding="utf-8")
    with contextlib.suppress(FellspanError):
        read_obstacles(file)
