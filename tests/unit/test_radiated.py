"""What an end radiates against its power rule and the exposure limits: which power, which losses, and what is said."""

import dataclasses
import json

import pytest
from exports_made_plan import made_link, made_plan

from fellspan.exports.results_json import link_result_from_dict, results_text
from fellspan.geodesy.position import Position
from fellspan.links.feeders import Feeder
from fellspan.links.radiated import exposure_pair, highest_power_dbm, power_cautions, power_checks
from fellspan.links.rules import find_rule
from fellspan.links.site import Antenna, Link, Modulation, Radio, Site

ROW = "fcc-15.407-5g8"  # 30 dBm at the port, 1 dB less for each dB of gain over 6 dBi: 47 CFR 15.407(a)(3)
RADIO = Radio(frequency_hz=5.8e9, power_dbm=23.0, bandwidth_hz=40e6)


def made(radio: Radio = RADIO, *, a: Antenna | None = None, b: Antenna | None = None, rule: str | None = ROW) -> Link:
    ends = [
        Site(name=name, position=Position(latitude_deg=36.0 + 0.02 * index, longitude_deg=-45.2), height_m=10.0)
        for index, name in enumerate("ab")
    ]
    return Link(
        name="l", a=ends[0], b=ends[1], radio=radio, power_rule=None if rule is None else find_rule(rule),
        antenna_a=a or Antenna(gain_dbi=16.0), antenna_b=b or Antenna(gain_dbi=10.0),
    )  # fmt: skip


def test_each_end_is_held_with_its_own_antenna() -> None:
    checks = power_checks(made())
    assert checks is not None
    assert (checks.a.highest_setting_dbm, checks.a.breach_db) == (pytest.approx(20.0), pytest.approx(3.0))
    assert (checks.b.highest_setting_dbm, checks.b.breach_db) == (pytest.approx(26.0), 0.0)
    (told,) = power_cautions(checks)
    assert told.startswith(f"Power at A: Limit by row {ROW}")
    assert "3.0 dB over it; confirm with your regulator." in told


def test_alike_ends_are_told_once_and_no_rule_says_nothing() -> None:
    panel = Antenna(gain_dbi=19.0)
    (told,) = power_cautions(power_checks(made(a=panel, b=panel)))
    assert told.startswith("Power at both ends: ")
    assert power_checks(made(rule=None)) is None
    assert power_cautions(None) == ()


def test_a_row_that_cannot_serve_is_told_too() -> None:
    (told,) = power_cautions(power_checks(made(dataclasses.replace(RADIO, frequency_hz=11e9))))
    assert "its band is" in told


def test_the_modulation_with_the_most_power_counts_whatever_is_wanted() -> None:
    rows = (
        Modulation(name="slow", threshold_dbm=-85.0),
        Modulation(name="fast", threshold_dbm=-65.0, power_dbm=18.0),
    )
    assert highest_power_dbm(dataclasses.replace(RADIO, modulations=rows, wanted="fast")) == 23.0
    assert highest_power_dbm(dataclasses.replace(RADIO, power_dbm=None, modulations=rows, wanted="fast")) == 18.0
    assert highest_power_dbm(dataclasses.replace(RADIO, power_dbm=None)) is None


def test_every_loss_up_to_the_antenna_lowers_what_is_radiated() -> None:
    lossy = Antenna(
        gain_dbi=16.0,
        feeder_loss_db=1.0,
        branching_loss_db=0.5,
        feeder=Feeder(kind="coaxial 13 mm", length_m=10.0, db_per_100_m=15.0),
    )
    checks, pair = power_checks(made(a=lossy)), exposure_pair(made(a=lossy), rule="stricter")
    assert checks is not None
    assert checks.a.eirp_dbm == pytest.approx(23.0 + 16.0 - 3.0)
    assert pair is not None
    assert pair.a is not None
    assert pair.a.eirp_dbm == pytest.approx(36.0)


def test_a_pair_of_frequencies_is_held_each_at_its_own_end() -> None:
    radio = dataclasses.replace(RADIO, duplex="frequency", frequency_a_hz=5.75e9, frequency_b_hz=5.95e9)
    checks, pair = power_checks(made(radio)), exposure_pair(made(radio), rule="icnirp-2020")
    assert checks is not None
    assert checks.a.reason == ""
    assert "its band is" in checks.b.reason
    assert pair is not None
    assert pair.a is not None
    assert pair.b is not None
    assert (pair.a.frequency_hz, pair.b.frequency_hz) == (5.75e9, 5.95e9)


def test_where_neither_power_nor_gain_is_known_there_is_no_distance() -> None:
    unknown = Antenna()
    assert exposure_pair(made(a=unknown, b=unknown), rule="stricter") is None
    half = exposure_pair(made(a=unknown), rule="stricter")
    assert half is not None
    assert half.a is None
    assert half.b is not None


def test_both_come_back_from_results_json() -> None:
    plan = made_link()
    link = made()
    result = dataclasses.replace(plan.result, power=power_checks(link), exposure=exposure_pair(link, rule="fcc-1.1310"))
    text = results_text(made_plan(dataclasses.replace(plan, result=result)))
    assert link_result_from_dict(json.loads(text)["links"][0]) == result
