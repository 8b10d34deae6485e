"""The radio side of a study file: keys to SI and back, and what is refused."""

import dataclasses
import datetime as dt
from pathlib import Path

import pytest

from fellspan.climate.given import GivenClimate
from fellspan.errors import StudyError
from fellspan.geodesy.position import Position
from fellspan.links.feeders import Feeder
from fellspan.links.radio import CoChannel, Modulation, Radio, Signature
from fellspan.links.rules import find_rule
from fellspan.links.site import Antenna, Channel, Diversity, Link, NoiseFloor, Site, Sway
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.study.reading import read_study
from fellspan.study.writing import study_text
from fellspan.terrain.sources import RasterSource

RADIO = Radio(
    name="backhaul",
    frequency_hz=11.4e9,
    power_per_chain_dbm=18.5,
    chains=2,
    dual_polarization=True,
    co_channel=CoChannel(canceller_db=20.0, required_ratio_db=24.5, antenna_discrimination_db=31.0),
    polarization="horizontal",
    bandwidth_hz=40e6,
    emission_class="D7W",
    power_control_db=10.0,
    duplex="frequency",
    frequency_a_hz=11.2e9,
    frequency_b_hz=11.69e9,
    usable_share=0.55,
    greatest_distance_m=20_000.0,
    noise_figure_db=5.5,
    implementation_loss_db=1.5,
    wanted="16-QAM",
    modulations=(
        Modulation(name="QPSK", threshold_dbm=-84.5, throughput_bps=60.5e6, power_dbm=21.0),
        Modulation(
            name="16-QAM",
            snr_db=18.5,
            throughput_bps=121e6,
            signature=Signature(width_hz=28.5e6, depth_db=24.0, delay_s=6.3e-9),
        ),
    ),
)
CLIMATE = GivenClimate(
    rain_rate_001_mm_h=31.5,
    monthly_rain_mm=(110.0, 95.0, 80.0, 70.0, 60.0, 45.0, 30.0, 40.0, 75.0, 110.0, 120.0, 125.5),
    monthly_temperature_c=(14.0, 14.0, 14.0, 15.0, 17.0, 19.0, 22.0, 23.0, 22.0, 20.0, 17.0, -1.5),
    dn1_n_per_km=-180.5,
    dn75=12.25,
    log_k=-3.25,
    terrain_roughness_m=12.0,
    gradient_median_n_per_km=-45.0,
    gradient_tail_n_per_km=10.0,
    temperature_c=17.5,
    total_pressure_hpa=1014.5,
    vapour_g_m3=11.5,
    rain_height_m=3100.0,
    altitude_m=40.0,
)
OWN_RULES = """
[[rule]]
id = "own-11"
authority = "Tolmera"
region = "Tolmera"
title = "Fixed links"
band = ["10.7 GHz", "11.7 GHz"]
eirp_max = "55 dBm"
citation = "Notice 4"
seen = "2026"
status = "rule text seen"
"""


def full_study(folder: Path) -> Study:
    harbour = Site(
        name="Harbour",
        position=Position(latitude_deg=36.04217, longitude_deg=-45.19876),
        height_m=12.0,
        noise_floors=(
            NoiseFloor(
                level_dbm=-92.5, bandwidth_hz=20e6, bearing_deg=120.0, width_deg=60.0, low_hz=5.7e9, high_hz=5.8e9
            ),
            NoiseFloor(level_dbm=-95.0),
        ),
        unusable_channels=(Channel(low_hz=11.2e9, high_hz=11.24e9, reason="a neighbour"),),
    )
    light = Site(name="Light", position=Position(latitude_deg=36.08862, longitude_deg=-45.17243), height_m=9.0)
    first = Antenna(
        name="dish",
        gain_dbi=34.0,
        feeder_loss_db=0.5,
        feeder=Feeder(kind="coaxial 13 mm", length_m=22.5, db_per_100_m=11.25),
        branching_loss_db=1.25,
        radome_wet_db=1.5,
        radome_iced_db=4.5,
        sway=Sway(azimuth_sigma_deg=0.3, elevation_sigma_deg=0.2, azimuth_offset_deg=-0.1, elevation_offset_deg=0.15),
        diversity=Diversity(spacing_m=8.5, gain_dbi=31.0, feeder_loss_db=2.0),
    )
    second = Antenna(name="dish", gain_dbi=34.0, feeder=Feeder(kind="waveguide 11 GHz", length_m=10.0))
    one = Link(
        name="one", a=harbour, b=light, radio=RADIO, antenna_a=first, antenna_b=second,
        target_availability_percent=99.995, power_rule=find_rule("fcc-15.407-5g8"),
    )  # fmt: skip
    turned = dataclasses.replace(RADIO, frequency_a_hz=11.69e9, frequency_b_hz=11.2e9)
    other = dataclasses.replace(one, name="other", a=light, b=harbour, radio=turned, power_rule=None)
    return Study(
        title="t",
        links=(one, other),
        terrain=TerrainInputs(ground=(RasterSource(path=folder / "fine"),)),
        date=dt.date(2026, 5, 1),
        path=folder / "study.toml",
        climate=CLIMATE,
        rain_edition="17",
        rain_reading="B",
        rules_file=folder / "own.toml",
        exposure_rule="fcc-1.1310",
    )


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "fine").touch()
    (tmp_path / "own.toml").write_text(OWN_RULES, encoding="utf-8")
    return tmp_path


def test_the_radio_side_comes_back_the_same(folder: Path) -> None:
    study = full_study(folder)
    back = read_study(study_text(study, folder=folder), path=folder / "study.toml")
    assert back == study
    assert back.links[1].radio.high_end == "A"


def test_a_radio_that_keeps_step_comes_back_the_same(folder: Path) -> None:
    study = full_study(folder)
    step = dataclasses.replace(RADIO, duplex="time", frequency_a_hz=None, frequency_b_hz=None, synchronised=True)
    study = dataclasses.replace(study, links=(dataclasses.replace(study.links[0], radio=step),))
    assert read_study(study_text(study, folder=folder), path=folder / "study.toml") == study


def test_every_field_of_the_radio_side_is_tried() -> None:
    """So that a field without a key shows: none of these keeps its default above."""
    for made in (RADIO, RADIO.co_channel, RADIO.modulations[1].signature, CLIMATE):
        assert made is not None
        kept = {
            field.name
            for field in dataclasses.fields(made)
            if getattr(made, field.name) == field.default
            and field.name not in ("threshold_dbm", "delay_s", "synchronised")
        }
        assert not kept


def text(folder: Path, *, radio: str = "", link: str = "", extra: str = "") -> str:
    return f"""
[terrain]
ground = "fine"
{extra}
[[site]]
name = "A"
at = "36.04217 N, 45.19876 W"
height = "12 m above ground"
[[site]]
name = "B"
at = "36.08862 N, 45.17243 W"
height = "12 m above ground"
[[link]]
name = "A - B"
a = "A"
b = "B"
radio = "r"
{link}
[[radio]]
name = "r"
frequency = "5.8 GHz"
{radio}
"""


def read(folder: Path, **parts: str) -> Study:
    return read_study(text(folder, **parts), path=folder / "study.toml")


def test_the_rule_of_the_study_is_for_links_that_name_none(folder: Path) -> None:
    rules = '[rules]\nfile = "own.toml"\nrule = "own-11"\n'
    study = read(folder, extra=rules)
    assert study.links[0].power_rule is not None
    assert study.links[0].power_rule.id == "own-11"
    study = read(folder, extra=rules, link='rule = "fcc-15.407-5g8"')
    assert study.links[0].power_rule is not None
    assert study.links[0].power_rule.id == "fcc-15.407-5g8"
    assert read(folder).links[0].power_rule is None


def test_temperatures_in_other_units(folder: Path) -> None:
    for given, wanted in (("59 F", 15.0), ("288.15 K", 15.0), ("15 C", 15.0)):
        study = read(folder, extra=f'[climate]\ntemperature = "{given}"\n')
        assert study.climate.temperature_c == pytest.approx(wanted)


@pytest.mark.parametrize(
    ("parts", "told"),
    [
        ({"extra": "[climate]\nrain_rate = 30\n"}, ("climate.rain_rate", "30 has no unit", "30 mm/h")),
        ({"extra": '[climate]\nrain_rate = "30 mm"\n'}, ("'30 mm': 'mm' is not a unit", "mm/h")),
        ({"extra": '[climate]\nrain_rate = "900 mm/h"\n'}, ("'900 mm/h' is out of range", "0 to 400")),
        ({"extra": "[climate]\nmonthly_rain = [1, 2]\n"}, ("climate.monthly_rain", "12 or more are needed")),
        ({"extra": f"[climate]\nmonthly_rain = {[1] * 12}\n"}, ("climate: monthly temperature is missing",)),
        ({"extra": "[climate]\ndn1 = 40\n"}, ("climate: dn1 is 40 N/km", "-2000 and 0")),
        ({"extra": "[climate]\ndn_1 = 40\n"}, ("unknown key 'dn_1'", "did you mean 'dn1'?")),
        ({"extra": '[signal]\nrain_edition = "18"\n'}, ("signal.rain_edition", "'18' is not allowed", "19, 17")),
        ({"extra": '[exposure]\nrule = "icnirp"\n'}, ("exposure.rule", "did you mean 'icnirp-2020'?")),
        ({"extra": '[rules]\nfile = "none.toml"\n'}, ("rules.file: there is no file 'none.toml'",)),
        ({"extra": '[rules]\nrule = "fcc-15.407-5g"\n'}, ("rules.rule: there is no power rule 'fcc-15.407-5g'",)),
        ({"link": 'rule = "x"'}, ("link 'A - B', rule: there is no power rule 'x'",)),
        ({"link": 'high_end = "a"'}, ("link 'A - B', high_end: radio 'r' has no pair",)),
        ({"link": 'target_availability = "100 %"'}, ("target_availability", "100")),
        ({"link": 'feeder_a = { kind = "coax", length = "3 m" }'}, ("feeder_a, kind", "'coax' is not allowed")),
        ({"link": 'feeder_a = { kind = "coaxial 13 mm" }'}, ("feeder_a: length is missing",)),
        ({"radio": 'channel_width = "40 MHz"\nemission = "QQQ"'}, ("radio 'r'", "QQQ")),
        ({"radio": 'usable_share = "0 %"'}, ("radio 'r', usable_share", "more than 0")),
        ({"radio": 'duplex = "frequency"'}, ("radio 'r': duplex is 'frequency' without a pair",)),
        ({"radio": '[[radio.modulation]]\nname = "QPSK"'}, ("modulation 'QPSK' has no threshold",)),
        (
            {"radio": '[[radio.modulation]]\nname = "QPSK"\nthreshold = "-80 dB"'},
            ("radio 'r', modulation 'QPSK', threshold", "'db' is not a unit of level"),
        ),
        (
            {"radio": '[[radio.modulation]]\nname = "QPSK"\nthroughput = "60 MB/s"'},
            ("modulation 'QPSK', throughput", "'MB/s' is not a unit of rate"),
        ),
    ],
)  # fmt: skip
def test_what_cannot_be_is_refused_by_name(folder: Path, parts: dict[str, str], told: tuple[str, ...]) -> None:
    with pytest.raises(StudyError) as raised:
        read(folder, **parts)
    for words in told:
        assert words in str(raised.value)
    assert str(raised.value).count("\n") < 4


def test_one_wrong_radio_of_many_links_is_one_problem(folder: Path) -> None:
    twice = 'high_end = "a"\n[[link]]\nname = "again"\na = "B"\nb = "A"\nradio = "r"'
    with pytest.raises(StudyError) as raised:
        read(folder, radio='duplex = "frequency"', link=twice)
    assert "wrong too" not in str(raised.value)


def test_spectrum_that_runs_backward_is_refused(folder: Path) -> None:
    wrong = text(folder).replace(
        'height = "12 m above ground"',
        'height = "12 m above ground"\nunusable = [{ low = "6 GHz", high = "5 GHz" }]',
        1,
    )
    with pytest.raises(StudyError, match=r"site 'A', unusable, number 1: low, 6 GHz, is not below high"):
        read_study(wrong, path=folder / "study.toml")
