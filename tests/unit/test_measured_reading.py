"""Measured files: what is read, what is refused and how it is said, and that the starter and every blank have their keys."""

import datetime as dt
import re
from pathlib import Path

import pytest

from fellspan.design.as_built import AsBuilt, Reading, level_read
from fellspan.errors import MeasuredFileError
from fellspan.links.site import Link
from fellspan.quantities import format_height
from fellspan.report.crew_work import BLANKS
from fellspan.study.measured_blank import blank_text
from fellspan.study.measured_reading import load_measured, read_measured
from fellspan.study.measured_schema import EndTable, MeasuredTable, ReadingTable
from fellspan.study.reading import load_study

STUDY = load_study(Path(__file__).resolve().parents[2] / "sample_terrain" / "tolmera.toml")
LINK: Link = next(link for link in STUDY.links if link.name == "Beacon - West Point")
WHOLE = """
[measured]
link = "beacon -  west point"
date = 2026-05-20
by = "N. N."
modulation = "64-qam 5/6"
power_control = "Off"
levels_are = "each chain"
band = "2 dB"

[a]
level_chains = ["-46.1 dBm", "-45.5 dBm"]
height = "16 ft above ground"
bearing = 280.5
bearing_is = "magnetic"
tilt = -3.6
power = "20 dBm"
power_is = "each chain"
at = "36.05936 N, 45.19309 W"

[[reading]]
at = "B"
level = "-42.7 dBm"
time = "23:30"

[[reading]]
at = "b"
level = "-44 dBm"
date = 2026-05-21
time = 01:30:00
water = "-0.3 m"
"""


def read(text: str, name: str = "m.toml") -> AsBuilt:
    return read_measured(text, LINK, path=Path(name))


def test_a_whole_file_is_read_into_si() -> None:
    built = read(WHOLE)
    assert built.link == LINK.name
    assert built.date == dt.date(2026, 5, 20)
    assert (built.power_control, built.modulation, built.band_db) == ("off", "64-QAM 5/6", 2.0)
    assert built.a.height_m == pytest.approx(16 * 0.3048)
    assert built.a.height_reference == "ground"
    # two chains of 20 dBm each: 10 log 2 more together
    assert built.a.power_dbm == pytest.approx(23.0103, abs=1e-4)
    assert built.a.position is not None
    assert [(one.chain, one.level_dbm) for one in built.at("a")] == [("1", -46.1), ("2", -45.5)]
    assert [one.hour for one in built.at("b")] == [23.5, 25.5]
    assert built.at("b")[1].water_m == -0.3


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (('band = "2 dB"', 'bnad = "2 dB"'), "m.toml, measured: unknown key 'bnad'"),
        (("[a]", "[c]"), "unknown table 'c'"),
        (('level = "-44 dBm"', 'level = "44 dBm"'), "reading 2, level: 44 dBm is more than any link receives"),
        (('level = "-44 dBm"', "level = -44"), "reading 2, level: -44 has no unit"),
        (('level = "-44 dBm"', 'level = "-44 dB"'), "'db' is not a unit of level"),
        (('bearing_is = "magnetic"', ""), "m.toml, a: bearing is given without its north"),
        (('bearing_is = "magnetic"', 'bearing_is = "grid"'), "allowed: true, magnetic"),
        (("bearing = 280.5", "bearing = 400"), "m.toml, a, bearing: 400"),
        (("16 ft above ground", "16 ft"), "a, height: height '16 ft' does not say above what"),
        (("64-qam 5/6", "1024-QAM"), "measured, modulation: '1024-QAM' is none of radio '5 GHz'"),
        (
            ("beacon -  west point", "Beacon - School"),
            "this file is of 'Beacon - School', not of 'Beacon - West Point'",
        ),
        (('time = "23:30"', 'time = "25:99"'), "reading 1 (25:99), time: '25:99' is no time of day"),
        (("36.05936 N", "96.05936 N"), "m.toml, a, at:"),
        (('at = "B"', 'at = "C"'), "reading 1 (23:30), at: 'c' is not allowed"),
        (('band = "2 dB"', "band = "), "not valid TOML"),
    ],
)
def test_what_is_wrong_is_said_with_its_key_in_a_few_lines(change: tuple[str, str], said: str) -> None:
    with pytest.raises(MeasuredFileError) as caught:
        read(WHOLE.replace(*change))
    message = str(caught.value)
    assert said in message
    assert len(message.splitlines()) <= 4


@pytest.mark.parametrize(
    ("text", "said"), [("", "is empty"), ("[measured]\n", "no level was read"), ("\0", "not valid TOML")]
)
def test_a_file_without_a_level_is_refused(text: str, said: str) -> None:
    with pytest.raises(MeasuredFileError, match=said):
        read(text)


def test_files_that_cannot_be_read_are_refused(tmp_path: Path) -> None:
    with pytest.raises(MeasuredFileError, match="there is no measured file"):
        load_measured(tmp_path / "none.toml", LINK)
    with pytest.raises(MeasuredFileError, match="is a folder"):
        load_measured(tmp_path, LINK)
    (tmp_path / "latin.toml").write_bytes(b'note = "\xe9"')
    with pytest.raises(MeasuredFileError, match="byte 9 is 0xe9"):
        load_measured(tmp_path / "latin.toml", LINK)


TABLE = """end,what,value,chain,time,water
,date,2026-05-20,,,
,power_control,off,,,
A,level,-46.1 dBm,1,14:00,
A,level,-45.5 dBm,2,14:00,
B,level,-42.7 dBm,,14:05,0.2 m
A,bearing,280.5,,,
A,bearing_is,magnetic,,,
B,height,10.2 m above ground,,,
"""


def test_a_table_holds_the_same() -> None:
    built = read(TABLE, "m.csv")
    assert built.power_control == "off"
    assert built.a.bearing_deg == 280.5
    assert built.b.height_m == 10.2
    assert [(one.end, one.chain, one.level_dbm, one.hour) for one in built.readings] == [
        ("a", "1", -46.1, 14.0),
        ("a", "2", -45.5, 14.0),
        ("b", None, -42.7, pytest.approx(14 + 5 / 60)),
    ]
    assert built.readings[2].water_m == 0.2


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (("-42.7 dBm", "-42.7"), "m.csv, row 6, level: level '-42.7' has no unit"),
        (("A,bearing,280.5", "A,bering,280.5"), "m.csv, row 7: 'bering' is nothing to measure of end A"),
        (("B,height", "C,height"), "row 9: end 'C' is neither A nor B"),
        (("end,what", "end,wath"), "row 1: unknown column 'wath'"),
        (("B,height,10.2 m above ground,,,", "A,bearing,12,,,"), "row 9: bearing stands twice, also in row 7"),
        (("10.2 m above ground,,,", "10.2 m,,,,,"), "row 9: 8 cells under 6 heads"),
    ],
)
def test_a_wrong_row_is_named(change: tuple[str, str], said: str) -> None:
    with pytest.raises(MeasuredFileError) as caught:
        read(TABLE.replace(*change), "m.csv")
    assert said in str(caught.value)
    assert len(str(caught.value).splitlines()) <= 4


def test_the_starter_has_every_key_and_reads_back_once_filled_in() -> None:
    text = blank_text(LINK)
    for table in (MeasuredTable, EndTable, ReadingTable):
        for key in table.model_fields:
            assert re.search(rf"^#? ?{key} =", text, re.MULTILINE), key
    built = read("\n".join(map(_filled_in, text.splitlines())))
    assert built.a.height_m == LINK.a.height_m
    assert built.modulation == LINK.radio.wanted
    assert len(built.readings) == 7
    with pytest.raises(MeasuredFileError, match="no level was read"):
        read(text)


def _filled_in(line: str) -> str:
    """A line of the starter with what is planned, or how a value is written, in the place of the blank."""
    found = re.match(r"# (\w+) = *(?:\"\"|\[\])? *# (.*)", line)
    if found is None:
        return line.removeprefix("# ") if line.startswith("# [[") else line
    key, words = found.groups()
    value = r"(\[.*\]|\"[^\"]*\"|-?\d[\d.-]*)"
    told = re.search(rf"(?:planned:|such as|left out:) {value}", words) or re.search(value, words)
    return f"{key} = {told[1] if told else chr(34) * 2}"


def test_no_figure_of_the_starter_can_pass_for_a_measured_one() -> None:
    text = blank_text(LINK)
    for line in text.splitlines():
        if found := re.match(r"#? ?(\w+) = *([^#]*)#", line):
            assert found[2].strip() in ("", '""', "[]"), line
            continue
        assert line.startswith(("#", "[", "link = ")) or not line
    with_figures = [
        line.partition(" # ")[2] for line in text.splitlines()[5:] if re.search(r"\d", line.partition(" # ")[2])
    ]
    for words in with_figures:
        assert re.search(r"planned:|such as|left out:|transmits|has \d chains", words), words
    height = format_height(LINK.a.height_m, LINK.a.height_reference)
    assert f'planned: "{height}"' in text
    for key in ("level", "height", "bearing", "date", "level_chains"):
        begun = re.sub(rf"(?m)^# ({key} =)", r"\1", text, count=1)
        with pytest.raises(MeasuredFileError) as caught:
            read(begun)
        assert len(str(caught.value).splitlines()) <= 4


def test_every_blank_of_the_crew_sheet_has_a_key() -> None:
    keys = {*MeasuredTable.model_fields, *EndTable.model_fields, *ReadingTable.model_fields}
    needed = {
        "Level here, each chain, dBm": ("level", "level_chains", "chain"),
        "Level there, each chain, dBm": ("level", "level_chains", "chain"),
        "Power shown, dBm; power control off?": ("power", "power_is", "power_control"),
        "Modulation set": ("modulation", "adaptive_modulation"),
        "Antenna centre, m above what": ("height",),
        "Roof or ground measured, m": ("roof", "ground"),
        "Bearing as built; true or magnetic?": ("bearing", "bearing_is"),
        "Tilt as built, up is +": ("tilt",),
        "Antenna, polarization, feeder loss": ("antenna", "polarization", "feeder_loss"),
        "Radio, serial numbers, position": ("radio", "serial", "at"),
        "Date, hour, weather, tide": ("date", "time", "weather", "water"),
        "Names, signature": ("by",),
    }
    assert set(needed) == set(BLANKS)
    assert {key for each in needed.values() for key in each} <= keys


def test_chains_add_up_in_power() -> None:
    readings = (Reading(end="a", level_dbm=-60.0, chain="1"), Reading(end="a", level_dbm=-60.0, chain="2"))
    both = level_read(readings, chains=2, each=False)
    assert both is not None
    # two equal powers are 3.0103 dB more than one
    assert both.level_dbm == pytest.approx(-56.9897, abs=1e-4)
    one = level_read(readings[:1], chains=2, each=False)
    assert one is not None
    assert one.level_dbm == pytest.approx(-56.9897, abs=1e-4)
    each = level_read((Reading(end="a", level_dbm=-60.0),), chains=2, each=True)
    assert each is not None
    assert each.level_dbm == pytest.approx(-56.9897, abs=1e-4)
    weak = level_read((*readings, Reading(end="a", level_dbm=-75.0, chain="3")), chains=3, each=False)
    assert weak is not None
    assert (weak.weakest, weak.imbalance_db) == ("3", 15.0)
