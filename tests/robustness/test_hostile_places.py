"""Whatever bytes a file of hubs, places or pairs holds, it reads or is refused in four lines; nothing else comes out."""

import contextlib
import tempfile
from pathlib import Path

import pytest
from hypothesis import HealthCheck, example, given, settings
from hypothesis import strategies as st

from fellspan.errors import FellspanError
from fellspan.study.places import read_hubs, read_places

SUFFIXES = ("csv", "geojson", "kml", "txt", "kmz")
HOSTILE = (
    "36.05123", "-45.20123", "6 m above ground", "1e999", "nan", "-inf", "9" * 400, "=1+1", "\x00", "\u202e", '"', "12 m", "N",
    "36,05", "",
)  # fmt: skip
COLUMNS = (
    "name", "latitude", "longitude", "height", "position", "x", "y", "roof", "sector", "gain", "bearing", "crs", "any",
)  # fmt: skip
CELL = st.one_of(st.text(max_size=12), st.sampled_from(HOSTILE))
HEADER = st.lists(st.sampled_from(COLUMNS), min_size=1, max_size=7, unique=True)
INFINITE = (
    b'{"type": "FeatureCollection", "features": [{"geometry": {"type": "Point", "coordinates": [1e999, 0]}, '
    b'"properties": {"name": "a", "height": "1 m agl"}}]}'
)
NO_NUMBER = b"<kml><Placemark><name>a</name><Point><coordinates>nan,1</coordinates></Point></Placemark></kml>"


def told(data: bytes, suffix: str) -> None:
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / f"places.{suffix}"
        path.write_bytes(data)
        for read in (read_places, read_hubs):
            try:
                found = read(path)
            except FellspanError as error:
                lines = str(error).splitlines()
                assert 1 <= len(lines) <= 4
                assert all(line.isprintable() for line in lines)
            else:
                sites = found.sites
                assert len(set(sites.name)) == len(sites.name) == sites.latitude_deg.size > 0
                assert all(name.isprintable() and 0 < len(name) <= 120 for name in sites.name)
                assert (abs(sites.latitude_deg) <= 90.0).all()
                assert (sites.height_m == sites.height_m).all()


@settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow], derandomize=True)
@given(data=st.binary(max_size=300), suffix=st.sampled_from(SUFFIXES))
@example(data=INFINITE, suffix="geojson")
@example(data=NO_NUMBER, suffix="kml")
@example(data=b"<kml>" * 50_000, suffix="kml")
def test_any_bytes(data: bytes, suffix: str) -> None:  # fmt: skip
    told(data, suffix)


@settings(max_examples=200, deadline=None, suppress_health_check=[HealthCheck.too_slow], derandomize=True)
@given(header=HEADER, rows=st.lists(st.lists(CELL, max_size=8), max_size=5), mark=st.sampled_from([",", ";", "\t"]))
def test_any_table(header: list[str], rows: list[list[str]], mark: str) -> None:
    lines = [mark.join(header), *(mark.join(row) for row in rows)]
    told("\n".join(lines).encode("utf-8", "surrogatepass"), "csv")


def test_a_file_that_may_not_be_read_is_told(tmp_path: Path) -> None:
    path = tmp_path / "places.csv"
    with pytest.raises(FellspanError, match="no file of places"):
        read_places(path)
    path.symlink_to(path)  # a link to itself
    with pytest.raises(FellspanError, match="cannot be read"), contextlib.nullcontext():
        read_places(path)
