"""Power rules: settings, breaches, limits of the check, and that a row gives no number where it must not."""

import dataclasses
import itertools
import math
import random

import pytest

from fellspan.errors import RuleError
from fellspan.links.rule_types import BackOff, Density, EirpFall, PowerRule
from fellspan.links.rules import check_power, find_rule, load_rules, rules_at

ROW = PowerRule(
    id="tolmera-5g8",
    authority="Tolmera Radio Office",
    region="Tolmera",
    title="5.8 GHz",
    low_hz=5.725e9,
    high_hz=5.875e9,
    citation="Invented order 7",
    seen="2026-05-01",
    status="rule text seen",
    eirp_max_dbm=36.0,
)


def asked(rule: PowerRule = ROW, **changed: object) -> dict[str, object]:
    return {"frequency_hz": 5.8e9, "bandwidth_hz": 20e6, "power_dbm": 20.0, "gain_dbi": 23.0} | changed


def test_a_setting_at_the_limit_keeps_it_and_one_over_it_is_a_breach_by_that_much() -> None:
    kept = check_power(ROW, **asked(power_dbm=13.0))  # type: ignore[arg-type]
    assert (kept.breach_db, kept.is_breach, kept.eirp_dbm) == (0.0, False, 36.0)
    assert "over it" not in kept.sentence
    assert check_power(ROW, **asked(power_dbm=3.0)).breach_db == 0.0  # type: ignore[arg-type]
    broken = check_power(ROW, **asked(power_dbm=13.01))  # type: ignore[arg-type]
    assert broken.breach_db == pytest.approx(0.01)
    assert broken.is_breach
    assert "0.1 dB over it" in broken.sentence
    assert broken.sentence.endswith("confirm with your regulator.")
    assert "row tolmera-5g8" in broken.sentence


def test_the_sentence_never_rounds_a_limit_up() -> None:
    check = check_power(find_rule("fcc-15.247-2g4-ptp"), **asked(frequency_hz=2.44e9, gain_dbi=23.0))  # type: ignore[arg-type]
    assert check.highest_setting_dbm == pytest.approx(30.0 - 17.0 / 3.0)
    assert "24.3 dBm at most at the radio" in check.sentence


def test_a_feeder_lets_a_limit_of_eirp_be_set_higher_but_not_one_of_conducted_power() -> None:
    assert check_power(ROW, **asked(), feeder_loss_db=2.0).highest_setting_dbm == pytest.approx(15.0)  # type: ignore[arg-type]
    port = dataclasses.replace(ROW, eirp_max_dbm=None, conducted_max_dbm=13.0)
    with_feeder = check_power(port, **asked(), feeder_loss_db=2.0)  # type: ignore[arg-type]
    assert with_feeder.highest_setting_dbm == pytest.approx(13.0)
    assert with_feeder.allowed_eirp_dbm == pytest.approx(36.0)
    assert with_feeder.eirp_dbm == pytest.approx(41.0)


def test_without_a_setting_there_is_a_limit_but_no_breach() -> None:
    for unset in (None, math.nan):
        check = check_power(ROW, **asked(power_dbm=unset))  # type: ignore[arg-type]
        assert check.highest_setting_dbm == pytest.approx(13.0)
        assert (check.breach_db, check.eirp_dbm, check.is_breach) == (None, None, False)


@pytest.mark.parametrize(
    ("rule", "changed", "word"),
    [
        ({}, {"frequency_hz": 5.6e9}, "5725 to 5875 MHz"),
        ({}, {"frequency_hz": 5.73e9}, "a channel of 20 MHz at 5730 MHz"),
        ({}, {"frequency_hz": math.nan}, "band"),
        ({}, {"gain_dbi": None}, "gain"),
        ({}, {"gain_dbi": math.nan}, "gain"),
        ({}, {"feeder_loss_db": -1.0}, "feeder"),
        ({}, {"feeder_loss_db": math.nan}, "feeder"),
        ({"densities": (Density(power_dbm=10.0, per_hz=1e6, of="eirp"),)}, {"bandwidth_hz": None}, "density"),
        ({"densities": (Density(power_dbm=10.0, per_hz=1e6, of="eirp"),)}, {"bandwidth_hz": 0.0}, "density"),
        ({"status": "unconfirmed"}, {}, "unconfirmed"),
        ({"place": "indoors"}, {}, "indoor"),
        ({"place": "not fixed outdoors"}, {}, "fixed outdoor"),
        ({"place": "fixed outdoors"}, {"fixed_outdoors": False}, "fixed outdoor"),
        ({"use": "fixed point-to-point"}, {"point_to_point": False}, "point-to-point"),
        ({"gain_min_dbi": 30.0}, {}, "at least 30 dBi"),
        ({"eirp_max_dbm": None}, {}, "no limit"),
    ],
)
def test_no_number_where_the_row_cannot_serve(rule: dict, changed: dict, word: str) -> None:  # type: ignore[type-arg]
    check = check_power(dataclasses.replace(ROW, **rule), **asked(**changed))  # type: ignore[arg-type]
    numbers = (check.allowed_eirp_dbm, check.allowed_conducted_dbm, check.highest_setting_dbm, check.breach_db)
    assert numbers == (None, None, None, None)
    assert word in check.reason
    assert check.sentence.startswith("No limit from row tolmera-5g8: ")
    assert check.reason in check.sentence


def test_a_channel_may_touch_the_edges_of_the_band() -> None:
    assert check_power(ROW, **asked(frequency_hz=5.735e9)).reason == ""  # type: ignore[arg-type]
    assert check_power(ROW, **asked(frequency_hz=5.7349e9)).reason != ""  # type: ignore[arg-type]


def test_whatever_the_row_the_highest_setting_keeps_every_limit_and_a_tenth_more_breaks_one() -> None:
    draw = random.Random(7)
    for row, _ in itertools.product(load_rules(), range(20)):
        gain, feeder, width = draw.uniform(30.0, 52.0), draw.uniform(0.0, 5.0), draw.uniform(5e6, 80e6)
        case = {"frequency_hz": (row.low_hz + row.high_hz) / 2, "bandwidth_hz": min(width, row.high_hz - row.low_hz)}
        case |= {"gain_dbi": gain, "feeder_loss_db": feeder, "peak_to_average_db": draw.uniform(0.0, 10.0)}
        case |= {"fixed_outdoors": "indoors" != row.place != "not fixed outdoors"}
        first = check_power(row, power_dbm=None, **case)  # type: ignore[arg-type]
        if first.highest_setting_dbm is None:
            assert first.reason
            continue
        kept = check_power(row, power_dbm=first.highest_setting_dbm, **case)  # type: ignore[arg-type]
        assert kept.breach_db == 0.0
        assert kept.eirp_dbm is not None
        assert kept.allowed_eirp_dbm is not None
        assert kept.eirp_dbm <= kept.allowed_eirp_dbm + 1e-9
        if row.conducted_max_dbm is not None:
            assert kept.allowed_conducted_dbm is not None
            assert first.highest_setting_dbm <= kept.allowed_conducted_dbm + 1e-9
        broken = check_power(row, power_dbm=first.highest_setting_dbm + 0.1, **case)  # type: ignore[arg-type]
        assert broken.breach_db == pytest.approx(0.1)


def test_more_gain_never_allows_more_power() -> None:
    for row in load_rules():
        settings = [
            check_power(
                row, frequency_hz=(row.low_hz + row.high_hz) / 2, bandwidth_hz=20e6, power_dbm=None, gain_dbi=gain
            ).highest_setting_dbm
            for gain in range(30, 51)
        ]
        known = [setting for setting in settings if setting is not None]
        if row.eirp_fall is None:
            assert known == sorted(known, reverse=True)


def test_slopes_hold_between_their_ends() -> None:
    back_off = BackOff(above_dbi=6.0, lower_by_db=1.0, for_each_db=3.0)
    assert [back_off.reduction_db(gain) for gain in (0.0, 6.0, 7.5)] == pytest.approx([0.0, 0.0, 0.5])
    fall = EirpFall(below_dbi=51.0, lower_by_db=2.0, for_each_db=1.0, floor_dbm=40.0)
    assert [fall.limit_dbm(82.0, gain) for gain in (60.0, 51.0, 50.5, 30.0, 0.0)] == [82.0, 82.0, 81.0, 40.0, 40.0]


def test_an_unknown_row_is_named_with_the_nearest_ones() -> None:
    with pytest.raises(RuleError, match=r"'fcc-15.247-2g4-p2p'") as caught:
        find_rule("fcc-15.247-2g4-p2p")
    assert "'fcc-15.247-2g4-ptp'" in str(caught.value)
    with pytest.raises(RuleError, match=r"docs/rules\.md"):
        find_rule("zzzz")
    assert str(caught.value).count("\n") <= 3


def test_rows_of_a_frequency_are_found() -> None:
    at_60 = [row.id for row in rules_at(58.32e9, bandwidth_hz=2.16e9)]
    assert at_60[0] == "fcc-15.255-60-ptp"
    assert "ecc-0901-60" in at_60
    assert "ecc-0901-60" not in [row.id for row in rules_at(64e9, bandwidth_hz=1e8)]
    assert rules_at(11e9) == ()
