"""The coordination sheet: designators of emissions as published, both directions, safe cells, and no row on guesses."""

import csv
import dataclasses
import io
import math
import re
from pathlib import Path

import pytest
from exports_made_plan import made_link, made_plan

from fellspan.antennas.dishes import dish
from fellspan.errors import LinkError, QuantityError
from fellspan.exports.coordination import COORDINATION_COLUMNS, GAIN_ONLY, coordination_csv
from fellspan.exports.folder import report_files, write_folder
from fellspan.links.antenna_gains import antennas_of
from fellspan.links.emission import emission_designator, necessary_bandwidth
from fellspan.links.site import Aim, Antenna, Radio
from fellspan.planning.plan import LinkPlan

DISH = dish(frequency_hz=5.8e9, diameter_m=0.6)


# Examples of the ITU Radio Regulations, Appendix 1, section I, from memory.
@pytest.mark.parametrize(
    ("bandwidth_hz", "written"),
    [
        (0.002, "H002"), (0.1, "H100"), (25.3, "25H3"), (400.0, "400H"), (2.4e3, "2K40"), (6e3, "6K00"), (12.5e3, "12K5"),
        (180.4e3, "180K"), (180.5e3, "181K"), (180.6e3, "181K"), (1.25e6, "1M25"), (2e6, "2M00"), (10e6, "10M0"),
        (202e6, "202M"), (5.65e9, "5G65"),
    ],
)  # fmt: skip
def test_bandwidths_are_written_as_the_radio_regulations_show(bandwidth_hz: float, written: str) -> None:
    assert necessary_bandwidth(bandwidth_hz) == written


@pytest.mark.parametrize(
    ("bandwidth_hz", "written"),
    [
        (999.0, "999H"), (999.6, "1K00"), (9.996e3, "10K0"), (99.96e3, "100K"), (999.6e3, "1M00"), (999.6e6, "1G00"),
        (0.9996, "1H00"), (1.0, "1H00"), (1e3, "1K00"), (2.16e9, "2G16"), (28e6, "28M0"), (20e6 / 3.0, "6M67"), (999e9, "999G"),
    ],
)  # fmt: skip
def test_rounding_carries_into_the_next_place_and_letter(bandwidth_hz: float, written: str) -> None:
    assert necessary_bandwidth(bandwidth_hz) == written


def test_every_bandwidth_reads_back_to_three_figures() -> None:
    factor = {"H": 1.0, "K": 1e3, "M": 1e6, "G": 1e9}
    for step in range(4000):
        bandwidth = 10.0 ** (step / 4000.0 * 11.9)
        written = necessary_bandwidth(bandwidth)
        assert re.fullmatch(r"(?=.{4}$)[1-9][0-9]*[HKMG][0-9]*", written), (bandwidth, written)
        (letter,) = re.findall("[HKMG]", written)
        assert float(written.replace(letter, ".")) * factor[letter] == pytest.approx(bandwidth, rel=5.01e-3)


@pytest.mark.parametrize("bandwidth_hz", [0.0, -1.0, 0.0004, 1e12, math.nan, math.inf])
def test_a_bandwidth_that_cannot_be_written_is_refused(bandwidth_hz: float) -> None:
    with pytest.raises(QuantityError, match="bandwidth"):
        necessary_bandwidth(bandwidth_hz)
    with pytest.raises(LinkError, match="radio 'five'"):
        Radio(frequency_hz=5.8e9, bandwidth_hz=bandwidth_hz, name="five")


def test_designators_join_width_and_class() -> None:
    # ITU Radio Regulations, Appendix 1, and trade practice for digital radio, broadcasting and voice, from memory.
    assert emission_designator(40e6, "D7W") == "40M0D7W"
    assert emission_designator(16e3, "f3e") == "16K0F3E"
    assert emission_designator(180e3, "F3EGN") == "180KF3EGN"
    assert emission_designator(100.0, "A1AAN") == "100HA1AAN"


@pytest.mark.parametrize(
    "emission_class", ["", "D7", "D7WE", "D7WET9", "Z7W", "D5W", "D7Z", "D7WIT", "D7WEA", "D 7W", "=1+1"]
)
def test_a_class_with_an_unknown_symbol_is_refused(emission_class: str) -> None:
    with pytest.raises(QuantityError, match="class of emission") as caught:
        emission_designator(40e6, emission_class)
    assert repr(emission_class) in str(caught.value)
    with pytest.raises(LinkError, match="class of emission"):
        Radio(frequency_hz=5.8e9, emission_class=emission_class)


def powered(
    name: str = "Quay - Tower",
    *,
    a: Antenna | None = None,
    b: Antenna | None = None,
    power_dbm: float | None = 20.0,
    bandwidth_hz: float | None = 40e6,
    emission_class: str | None = "D7W",
    sites: tuple[str, str] = ("Quay", "Tower"),
) -> LinkPlan:
    planned = made_link(name=name, a=sites[0], b=sites[1])
    radio = Radio(frequency_hz=5.8e9, power_dbm=power_dbm, bandwidth_hz=bandwidth_hz, emission_class=emission_class)
    link = dataclasses.replace(
        planned.link,
        radio=radio,
        antenna_a=Antenna(name="dish", pattern=DISH, feeder_loss_db=1.5) if a is None else a,
        antenna_b=Antenna(name="panel", gain_dbi=19.0) if b is None else b,
    )
    result = planned.result
    antennas = antennas_of(
        link,
        bearings_deg=(result.bearing_ab_deg, result.bearing_ba_deg),
        tilts_deg=(result.tilt_ab_deg, result.tilt_ba_deg),
    )
    return dataclasses.replace(planned, link=link, result=dataclasses.replace(result, antennas=antennas))


def rows_of(*links: LinkPlan) -> list[dict[str, str]]:
    text = coordination_csv(made_plan(*links))
    assert text is not None
    return list(csv.DictReader(io.StringIO(text, newline="")))


def test_each_direction_has_its_row_with_its_own_power_and_aim() -> None:
    there, back = rows_of(powered())
    assert (there["direction"], back["direction"]) == ("A to B", "B to A")
    assert (
        (there["transmit_site"], there["receive_site"])
        == ("Quay", "Tower")
        == (back["receive_site"], back["transmit_site"])
    )
    assert float(there["eirp_dbm"]) == pytest.approx(20.0 - 1.5 + DISH.peak_gain_dbi, abs=1e-3)
    assert float(back["eirp_dbm"]) == pytest.approx(39.0, abs=1e-3)
    assert (there["emission_designator"], there["necessary_bandwidth"]) == ("40M0D7W", "40M0")
    assert float(there["transmit_azimuth_true_deg"]) == pytest.approx(73.9)
    assert float(back["transmit_azimuth_true_deg"]) == pytest.approx(253.9)
    assert float(there["transmit_elevation_deg"]) == pytest.approx(0.12, abs=1e-3)
    assert float(back["path_elevation_deg"]) == pytest.approx(-0.16, abs=1e-3)
    assert (there["transmit_pattern"], back["transmit_pattern"]) == (DISH.source, GAIN_ONLY)
    assert there["transmit_polarization"] == "vertical"
    for column in ("ground_amsl_m", "antenna_agl_m", "antenna_amsl_m", "latitude_dms", "gain_dbi"):
        assert there[f"transmit_{column}"] == back[f"receive_{column}"]
    assert there["horizontal_datum"] == "WGS 84"
    assert there["vertical_datum"] == "EGM2008"


def test_coordinates_stand_in_degrees_and_in_degrees_minutes_seconds() -> None:
    there = rows_of(powered())[0]
    for axis, sign in (("latitude", 1.0), ("longitude", -1.0)):
        match = re.fullmatch(r"([0-9]+)°([0-9]{2})'([0-9]{2}\.[0-9]+)\" [NSEW]", there[f"transmit_{axis}_dms"])
        assert match is not None
        degrees = int(match[1]) + int(match[2]) / 60.0 + float(match[3]) / 3600.0
        assert sign * degrees == pytest.approx(float(there[f"transmit_{axis}_deg"]), abs=2e-6)


def test_an_antenna_off_its_path_radiates_less_along_it_than_at_its_best() -> None:
    off = Antenna(name="dish", pattern=DISH, mounting=Aim(bearing_deg=78.9))
    there = rows_of(powered(a=off))[0]
    assert float(there["eirp_toward_receiver_dbm"]) < float(there["eirp_dbm"]) - 3.0
    assert (float(there["transmit_azimuth_true_deg"]), float(there["path_azimuth_true_deg"])) == (78.9, 73.9)


def test_a_bearing_is_never_shown_as_360() -> None:
    there = rows_of(powered(a=Antenna(gain_dbi=20.0, mounting=Aim(bearing_deg=359.9999))))[0]
    assert float(there["transmit_azimuth_true_deg"]) == 0.0


def test_what_the_study_leaves_out_stays_empty() -> None:
    there = rows_of(powered(bandwidth_hz=None))[0]
    assert (there["bandwidth_hz"], there["necessary_bandwidth"], there["emission_designator"]) == ("", "", "")
    there = rows_of(powered(emission_class=None))[0]
    assert (there["necessary_bandwidth"], there["emission_designator"]) == ("40M0", "")


def test_no_row_without_power_or_gain_and_no_file_without_a_row(tmp_path: Path) -> None:
    silent = powered(power_dbm=None)
    unknown = powered(b=Antenna())
    assert coordination_csv(made_plan(silent, unknown)) is None
    assert coordination_csv(made_plan()) is None
    assert {row["link"] for row in rows_of(silent, powered("second"))} == {"second"}
    assert "coordination.csv" not in report_files(made_plan(silent))
    names = write_folder(made_plan(powered()), tmp_path)
    assert "coordination.csv" in names
    assert names[-1] == "results.json"
    write_folder(made_plan(silent), tmp_path)
    assert not (tmp_path / "coordination.csv").exists()


@pytest.mark.parametrize("text", ["=1+1", "@SUM(A1)", "+1", "-1", "two\nlines", "lone \ud800", "null \x00"])
def test_names_from_users_start_no_formula(text: str) -> None:
    named = powered(text, a=Antenna(name=text, gain_dbi=20.0), sites=(text, text + "2"))
    for row in csv.reader(io.StringIO((coordination_csv(made_plan(named)) or "").encode("utf-8").decode(), newline="")):
        for cell in row:
            assert not cell.startswith(("=", "@", "+", "\t", "\r"))
            if cell.startswith("-"):
                float(cell)


def test_the_page_explains_every_column() -> None:
    page = (Path(__file__).parents[2] / "docs" / "results.md").read_text(encoding="utf-8")
    section = page.split("## coordination.csv", 1)[1].split("\n## ", 1)[0]
    for column in COORDINATION_COLUMNS:
        plain = re.sub("^(transmit|receive)_(?!site)", "..._", column)
        assert f"`{plain}`" in section, column
