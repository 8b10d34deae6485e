"""Files of hubs, places and pairs: every way to write them reads to the same, and every fault is told with its row."""

import json
from pathlib import Path

import numpy as np
import pytest

from fellspan.errors import FellspanError, SitesFileError
from fellspan.quantities import AntennaHeight
from fellspan.screening.pairs import HEIGHT_REFERENCES
from fellspan.study.places import PlaceFile, read_hubs, read_pairs, read_places

SIX = AntennaHeight(height_m=6.0, reference="ground")


def made(folder: Path, text: str | bytes, name: str = "places.csv") -> Path:
    path = folder / name
    path.write_bytes(text if isinstance(text, bytes) else text.encode("utf-8"))
    return path


def spots(file: PlaceFile) -> list[tuple[str, float, float, float, str]]:
    sites = file.sites
    return [
        (name, round(y, 6), round(x, 6), height, HEIGHT_REFERENCES[code])
        for name, y, x, height, code in zip(
            sites.name, sites.latitude_deg, sites.longitude_deg, sites.height_m, sites.height_reference, strict=True
        )
    ]


CSV = """name,latitude,longitude,height
Nether Farm,36.04217,-45.19876,6 m above ground
Alder,36.05000,-45.20000,3 m above roof
"""
DECIMAL_COMMAS = """name;latitude;longitude;height
Nether Farm;36,04217;-45,19876;6 m above ground
Alder;36,05000;-45,20000;3 m above roof
"""
POSITIONS = """name,position,height_m,height_above
Nether Farm,"36.04217 N, 45.19876 W",6,ground
# left out
Alder,"36.05000, -45.20000",3,above roof
"""
BOTH = [("Alder", 36.05, -45.2, 3.0, "roof"), ("Nether Farm", 36.04217, -45.19876, 6.0, "ground")]
FEATURES = {
    "type": "FeatureCollection",
    "features": [
        {
            "type": "Feature",
            "geometry": {"type": "Point", "coordinates": [-45.19876, 36.04217, 12.0]},
            "properties": {"name": "Nether Farm", "height": "6 m above ground", "Latitude": "12", "note": None},
        },
        {
            "type": "Feature",
            "geometry": {"type": "Point", "coordinates": [-45.20000, 36.05000]},
            "properties": {"name": "Alder", "height": "3 m above roof"},
        },
    ],
}
KML = """<?xml version="1.0" encoding="UTF-8"?>
<kml xmlns="http://www.opengis.net/kml/2.2"><Document><Folder>
<Placemark><name>Nether Farm</name><ExtendedData><Data name="height"><value>6 m above ground</value></Data></ExtendedData>
<Point><coordinates>-45.19876,36.04217,0</coordinates></Point></Placemark>
<Placemark><name>Alder</name><ExtendedData><SchemaData><SimpleData name="height">3 m above roof</SimpleData></SchemaData>
</ExtendedData><Point><coordinates> -45.20000,36.05000 </coordinates></Point></Placemark>
</Folder></Document></kml>"""


@pytest.mark.parametrize(
    ("name", "text"),
    [
        ("places.csv", CSV),
        ("places.csv", "\ufeff" + CSV),
        ("places.csv", CSV.replace("\n", "\r\n")),
        ("places.txt", CSV.replace(",", ";")),
        ("places.tsv", CSV.replace(",", "\t")),
        ("places.csv", CSV.replace("latitude,longitude", "Lat,LNG").replace("name", "Place")),
        ("places.csv", DECIMAL_COMMAS),
        ("places.csv", POSITIONS),
        ("places.geojson", json.dumps(FEATURES)),
        ("places.json", json.dumps(FEATURES)),
        ("places.kml", KML),
        ("places.xml", KML),
    ],
)  # fmt: skip
def test_every_way_to_write_places_reads_to_the_same(tmp_path: Path, name: str, text: str) -> None:
    assert spots(read_places(made(tmp_path, text, name))) == BOTH


def test_easting_and_northing_need_a_system(tmp_path: Path) -> None:
    # EPSG:32623 482100 3988400 from memory of the sample's grid; only that it is read as such counts here
    path = made(tmp_path, "name,x,y,height\nA,482100.0,3988400.0,6 m above ground\n")
    sites = read_places(path, crs="EPSG:32623").sites
    assert 36.0 < sites.latitude_deg[0] < 36.1
    assert -45.3 < sites.longitude_deg[0] < -45.1
    with pytest.raises(SitesFileError, match="--crs EPSG"):
        read_places(path)


def test_a_height_for_all_counts_where_none_is_stated(tmp_path: Path) -> None:
    path = made(
        tmp_path, "name,latitude,longitude,height,roof\nA,36.04217,-45.2,,\nB,36.05217,-45.2,3 m above roof,8 m\n"
    )
    sites = read_places(path, height=SIX).sites
    assert sites.height_m.tolist() == [6.0, 3.0]
    assert np.isnan(sites.roof_m[0])
    assert sites.roof_m[1] == 8.0


ROW = "A,36.04217,-45.19876,6 m above ground\n"
HEAD = "name,latitude,longitude,height\n"

AT_361 = json.dumps(
    {"features": [{"geometry": {"type": "Point", "coordinates": [-45.0, 361.0]}, "properties": {"name": "A"}}]}
)

WRONG = [
    ("p.csv", b"", "is empty", ""),
    ("p.csv", HEAD, "holds no places", ""),
    ("p.csv", "shape,colour\nround,red\n", "names no column that is known", "shape"),
    ("p.csv", HEAD.replace("height", "hieght") + ROW, "unknown column", "hieght"),
    ("p.csv", HEAD.replace("latitude,longitude", "latitude,lat") + ROW, "stands there twice", "latitude"),
    ("p.csv", HEAD + ROW + ROW, "row 3: place 'A' stands in row 2 too", "A"),
    ("p.csv", HEAD + ROW.replace("36.04217", "95.04217"), "row 2", "95.04217"),
    ("p.csv", HEAD + ROW.replace("36.04217", "north"), "row 2", "north"),
    ("p.csv", HEAD + ROW.replace("36.04217", ""), "latitude is missing", "A"),
    ("p.csv", HEAD + ROW.replace("36.04217,-45.19876", ","), "no position is given", "A"),
    ("p.csv", HEAD + ROW.replace(" above ground", ""), "does not say above what", "6 m"),
    ("p.csv", HEAD + ROW.replace("6 m above ground", "6"), "has no unit", "6"),
    ("p.csv", HEAD + ROW.replace("6 m above ground", ""), "no antenna height", "--place-height"),
    ("p.csv", HEAD + ROW.replace("6 m above ground", "6 m above moon"), "moon", "6 m above moon"),
    ("p.csv", HEAD + ROW.replace("A,", ","), "there is no name", ""),
    ("p.csv", HEAD + ROW.replace("A,", "A" * 200 + ","), "200 letters", ""),
    ("p.csv", HEAD + ROW.replace("\n", ",more\n"), "5 values for 4 columns", "more"),
    ("p.csv", HEAD + '"A,36.0', "row", ""),
    ("p.csv", "name,latitude,longitude,height,roof\n" + ROW.replace("\n", ",high\n"), "roof", "high"),
    ("p.csv", (HEAD + ROW.replace("A,", "Caf\u00e9,")).encode("cp1252"), "not UTF-8 text, at", "Caf\u00e9"),
    ("p.csv", (HEAD + ROW).encode("utf-16"), "UTF-16", ""),
    ("p.csv", b"name\0latitude\n", "not a text file", ""),
    ("p.csv", b"\x00\x10\xff\xfe raster", "not a text file", ""),
    ("p.csv", HEAD + ROW.replace("36.04217", "36,04217"), "a decimal comma? Write numbers with a point", "5 values"),
    ("p.csv", HEAD.replace("height", "height,bearing") + ROW, "--hubs and --places the wrong way round", "bearing"),
    ("p.xlsx", b"PK\x03\x04 and so on", "ZIP", ""),
    ("p.kmz", b"PK\x03\x04 and so on", "zipped KML", ""),
    ("p.json", "{", "not JSON", ""),
    ("p.json", "[" * 100_000, "not", ""),
    ("p.json", "[]", "FeatureCollection", ""),
    ("p.json", json.dumps({"features": [{"geometry": {"type": "LineString", "coordinates": []}}]}), "feature 1", "LineString"),
    ("p.json", json.dumps({"features": [{"geometry": {"type": "Point", "coordinates": ["a"]}}]}), "feature 1", ""),
    ("p.json", json.dumps({"features": [7]}), "feature 1", ""),
    ("p.json", json.dumps({"crs": {"properties": {"name": "EPSG:2056"}}, "features": []}), "EPSG:2056", "2056"),
    ("p.json", AT_361, "feature 1", "361"),
    ("p.kml", "<kml><Placemark>", "not KML", ""),
    ("p.kml", "<gpx></gpx>", "first element is <gpx>", "gpx"),
    ("p.kml", "<kml><Placemark><name>L</name><LineString/></Placemark></kml>", "placemark 1 'L': a LineString", "L"),
    ("p.kml", "<kml><Placemark><Point><coordinates>1</coordinates></Point></Placemark></kml>", "placemark 1", "1"),
    ("p.kml", '<!DOCTYPE kml [<!ENTITY a "aaaa"><!ENTITY b "&a;&a;&a;&a;">]><kml>&b;</kml>', "defines entities", ""),
    ("p.kml", '<!DOCTYPE kml [<!ENTITY x SYSTEM "file:///etc/passwd">]><kml>&x;</kml>', "defines entities", ""),
]  # fmt: skip


@pytest.mark.parametrize(("name", "text", "said", "value"), WRONG, ids=[f"{n}: {s}" for n, _, s, _ in WRONG])
def test_what_is_wrong_is_told_in_four_lines_with_its_place(
    tmp_path: Path, name: str, text: str | bytes, said: str, value: str
) -> None:
    with pytest.raises(FellspanError) as caught:
        read_places(made(tmp_path, text, name))
    message = str(caught.value)
    assert said in message
    assert value in message
    assert name in message.splitlines()[0]
    assert len(message.splitlines()) <= 4
    assert max(map(len, message.splitlines())) < 240


def test_all_wrong_rows_are_told_at_once(tmp_path: Path) -> None:
    rows = "".join(f"P{n},36.0{n:03d}x,-45.2,6 m above ground\n" for n in range(40))
    with pytest.raises(
        SitesFileError, match=r"(?s)row 2: .*write latitude first.*row 3: .*wrong too: row 4, .* and \d+ more"
    ):
        read_places(made(tmp_path, HEAD + rows))
    different = f"A,36.1x,-45.2,6 m above ground\nB,36.1000,-45.2000,\n{rows}"
    with pytest.raises(
        SitesFileError, match=r"(?s)row 2: .*row 3: .*row 4: .*wrong too: row 5, .* and \d+ more"
    ) as caught:
        read_places(made(tmp_path, HEAD + different))
    assert len(str(caught.value).splitlines()) == 4


def test_missing_files_and_folders_are_told(tmp_path: Path) -> None:
    for path in (tmp_path, tmp_path / "none.csv"):
        with pytest.raises(SitesFileError, match=r"folder|no file"):
            read_places(path)


def test_hostile_names_stay_on_one_line_and_are_kept(tmp_path: Path) -> None:
    path = made(
        tmp_path,
        HEAD
        + '"=HYPERLINK(""x"")",36.04217,-45.19876,6 m above ground\n"two\nlines\x1b[31m",36.1,-45.19876,6 m above ground\n',
    )
    names = read_places(path).sites.name
    assert names == ('=HYPERLINK("x")', "two lines [31m")


def test_doubts_are_noted(tmp_path: Path) -> None:
    text = HEAD.replace("\n", ",phone\n") + "".join(f"P{n},36.{n},-45.2,6 m above ground,12\n" for n in range(1, 9))
    notes = read_places(made(tmp_path, text + "Q,36.1,-45.2,6 m above ground,12\n")).notes
    assert any("columns not used: phone" in note for note in notes)
    assert any("P1" in note and "coarse" in note for note in notes)
    assert any("more places have coarse positions" in note for note in notes)
    assert any("stand at the same position" in note for note in notes)


HUBS = (
    "name,latitude,longitude,height,sector,antenna,bearing\n"
    "North,36.0853,-45.2601,25 m above ground,,dish,10\n"
    "South,36.0653,-45.2551,25 m above ground,east,dish,90\n"
    "South,36.0653,-45.2551,25 m above ground,west,dish,270\n"
)


def test_rows_of_one_hub_are_its_sectors(tmp_path: Path) -> None:
    file = read_hubs(made(tmp_path, HUBS))
    assert file.sites.name == ("North", "South")
    assert [(sector.hub, sector.name) for sector in file.sectors] == [(0, ""), (1, "east"), (1, "west")]
    unnamed = read_hubs(made(tmp_path, HUBS.replace("east", "").replace("west", "")))
    assert [sector.name for sector in unnamed.sectors] == ["", "", "2"]


@pytest.mark.parametrize(
    ("was", "now", "said"),
    [
        ("west", "east", "row 4: sector 'east' of hub 'South' stands in row 3 too"),
        ("36.0653,-45.2551,25 m above ground,west", "36.0654,-45.2551,25 m above ground,west", "36.0654"),
        ("25 m above ground,west", "20 m above ground,west", "20 m above ground"),
    ],
)
def test_sectors_that_contradict_each_other_are_refused(tmp_path: Path, was: str, now: str, said: str) -> None:
    with pytest.raises(SitesFileError) as caught:
        read_hubs(made(tmp_path, HUBS.replace(was, now)))
    assert said in str(caught.value)


def test_listed_pairs_are_looked_up_and_sorted(tmp_path: Path) -> None:
    hubs, places = read_hubs(made(tmp_path, HUBS, "h.csv")).sites, read_places(made(tmp_path, CSV)).sites
    text = "hub,place\nSouth,Alder\nNorth,Nether Farm\nNorth,Alder\n"
    hub, place, _ = read_pairs(made(tmp_path, text, "pairs.csv"), hubs=hubs, places=places)
    assert list(zip(hub.tolist(), place.tolist(), strict=True)) == [(0, 0), (0, 1), (1, 0)]
    for wrong, said in (
        ("North,Elsewhere\n", "Elsewhere"),
        ("Nord,Alder\n", r"(?s)'Nord'.*did you mean 'North'\?"),
        ("South,Alder\n", "stands in row 2 too"),
        (",Alder\n", "hub is missing"),
    ):
        with pytest.raises(SitesFileError, match=said):
            read_pairs(made(tmp_path, text + wrong, "pairs.csv"), hubs=hubs, places=places)
    with pytest.raises(SitesFileError, match="CSV"):
        read_pairs(made(tmp_path, "{}", "pairs.json"), hubs=hubs, places=places)


GOOD = "Alder,36.05000,-45.20000,6 m agl\n"


@pytest.mark.parametrize(("count", "lines"), [(2, 2), (3, 3), (4, 4), (40, 4)])
def test_the_first_three_wrong_rows_are_told_with_what_is_wrong(tmp_path: Path, count: int, lines: int) -> None:
    wrong = ("B,36.05000,-45.20000,6 flagons agl", "C,north,-45.2,6 m agl", ",36.05000,-45.20000,6 m agl")
    rows = [*wrong, *(f"D{n},36.05000,-45.20000,2 km agl" for n in range(40))][:count]
    with pytest.raises(SitesFileError) as raised:
        read_places(made(tmp_path, HEAD + GOOD + "".join(f"{row}\n" for row in rows)))
    told = str(raised.value).splitlines()
    assert lines <= len(told) <= 4
    assert told[0].startswith("places.csv, row 3: 'B': ")
    assert "flagons" in told[0]
    assert any(line.strip().startswith("row 4: 'C': ") for line in told[1:])
    if count > 2:
        assert any(line.strip().startswith("row 5: there is no name") for line in told[1:])
    if count > 3:
        assert told[3].strip().startswith("wrong too: row 6")
    if count == 40:
        assert " and " in told[3]
        assert told[3].endswith(" more")


def test_a_multipoint_of_one_point_is_that_point(tmp_path: Path) -> None:
    def of(*points: list[float]) -> str:
        features = [
            {
                "type": "Feature",
                "geometry": {"type": "MultiPoint", "coordinates": points},
                "properties": {"name": "Alder", "height": "3 m above roof"},
            }
        ]
        return json.dumps({"type": "FeatureCollection", "features": features})

    assert spots(read_places(made(tmp_path, of([-45.2, 36.05]), "places.geojson"))) == BOTH[:1]
    for points in ((), ([-45.2, 36.05], [-45.1, 36.05])):
        with pytest.raises(SitesFileError, match="a MultiPoint stands where a Point belongs"):
            read_places(made(tmp_path, of(*points), "places.geojson"))


def test_heights_of_files_with_semicolons_have_decimal_commas(tmp_path: Path) -> None:
    head = "name;latitude;longitude;height;roof_m\n"
    file = read_places(made(tmp_path, head + "Alder;36,05000;-45,20000;7,5 m above roof;4,25\n"))
    assert spots(file) == [("Alder", 36.05, -45.2, 7.5, "roof")]
    assert file.sites.roof_m.tolist() == [4.25]
    with pytest.raises(SitesFileError):  # 1.5 or 1500?
        read_places(made(tmp_path, head + "Alder;36,05000;-45,20000;1,500 ft agl;\n"))
    with pytest.raises(SitesFileError):
        read_places(made(tmp_path, HEAD + 'Alder,36.05000,-45.20000,"7,5 m agl"\n'))


def test_sectors_of_files_with_semicolons_have_decimal_commas(tmp_path: Path) -> None:
    text = "name;latitude;longitude;height;gain;bearing\nNorth;36,05000;-45,20000;20 m agl;16,5 dBi;12,5\n"
    row = read_hubs(made(tmp_path, text)).sectors[0].row
    assert (row.text("gain"), row.text("bearing")) == ("16.5 dBi", "12.5")
