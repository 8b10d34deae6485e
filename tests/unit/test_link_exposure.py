"""Exposure distances by direction: from the pattern and the feeder, the stricter rule, and what is not known left open."""

import dataclasses
import math

import pytest

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.dishes import dish
from fellspan.links.exposure import DISH_NOTE, ExposureResult, exposure, sector_gains
from fellspan.links.site import Antenna

FREQUENCY_HZ = 5.8e9
DISH = dish(frequency_hz=FREQUENCY_HZ, diameter_m=0.6)


def known(antenna: Antenna, **changed: object) -> ExposureResult:
    asked = {"frequency_hz": FREQUENCY_HZ, "power_dbm": 23.0} | changed
    result = exposure(antenna, **asked)  # type: ignore[arg-type]
    assert result is not None
    return result


# r = sqrt(EIRP/(4 pi S)) to 10 W/m2, the general-public limit of ICNIRP 2020 and of 47 CFR 1.1310 at 2 GHz and above;
# distances by hand from that definition.
@pytest.mark.parametrize(("eirp_dbm", "distance_m"), [(36, 0.178), (48, 0.709), (53, 1.26), (82, 35.5)])
def test_with_the_gain_alone_the_distance_is_that_of_free_space(eirp_dbm: float, distance_m: float) -> None:
    result = known(Antenna(gain_dbi=eirp_dbm - 23.0))
    assert result.public.front_m == pytest.approx(distance_m, rel=3e-3)
    assert (result.public.beside_m, result.public.behind_m) == (None, None)
    assert result.public.largest_m == result.public.front_m
    assert result.occupational.front_m == pytest.approx(result.public.front_m / math.sqrt(5.0))
    assert "on every side" in result.sentence
    assert result.dish_near_field is None


def test_a_dish_needs_most_room_in_front_and_its_side_and_back_follow_its_pattern() -> None:
    result = known(Antenna(pattern=DISH))
    gains = sector_gains(DISH)
    front, beside, behind = result.public.front_m, result.public.beside_m, result.public.behind_m
    assert beside is not None
    assert behind is not None
    assert front > beside > 0.0
    assert front > behind > 0.0
    assert gains.beside_dbi is not None
    assert gains.behind_dbi is not None
    assert 20.0 * math.log10(front / beside) == pytest.approx(gains.front_dbi - gains.beside_dbi)
    assert gains.front_dbi == pytest.approx(DISH.peak_gain_dbi, abs=0.01)
    for azimuth in (75.0, 90.0, 105.0):
        assert gains.beside_dbi >= float(DISH.gain_dbi(azimuth, 0.0)) - 1e-9
        assert gains.beside_dbi >= float(DISH.gain_dbi(0.0, 90.0)) - 1e-9
    assert gains.behind_dbi >= float(DISH.gain_dbi(180.0, 0.0)) - 1e-9
    assert "beside" in result.sentence


def test_the_feeder_counts_and_six_db_double_the_distance() -> None:
    plain = known(Antenna(pattern=DISH))
    fed = known(Antenna(pattern=DISH, feeder_loss_db=20.0 * math.log10(2.0)))
    assert fed.public.front_m == pytest.approx(plain.public.front_m / 2.0)
    assert fed.eirp_dbm == pytest.approx(23.0 - 20.0 * math.log10(2.0) + DISH.peak_gain_dbi, abs=0.01)


def test_an_omni_needs_the_same_room_beside_and_behind() -> None:
    omni = from_data_sheet(
        name="omni", frequency_hz=FREQUENCY_HZ, gain_dbi=9.0, azimuth_width_deg=None, elevation_width_deg=12.0
    )
    result = known(Antenna(pattern=omni))
    assert result.public.beside_m == pytest.approx(result.public.front_m, rel=1e-6)
    assert result.public.behind_m == pytest.approx(result.public.front_m, rel=1e-6)


def test_a_beam_tilted_out_of_the_front_shows_in_the_largest() -> None:
    tilted = dataclasses.replace(
        DISH, co_amplitude=lambda az, el: DISH.co_amplitude(az, el + math.radians(40.0)), name="squinting"
    )
    result = known(Antenna(pattern=tilted))
    assert result.public.largest_m == pytest.approx(known(Antenna(pattern=DISH)).public.front_m, rel=1e-3)
    assert result.public.front_m < 0.3 * result.public.largest_m
    assert "greatest gain" in result.sentence


def test_cross_polar_power_counts_too() -> None:
    leaky = dataclasses.replace(DISH, cross_amplitude=DISH.co_amplitude)
    ratio = known(Antenna(pattern=leaky)).public.front_m / known(Antenna(pattern=DISH)).public.front_m
    assert ratio == pytest.approx(math.sqrt(2.0), rel=1e-3)


# General-public limits at 900 MHz: ICNIRP 2020 f/200 = 4.5 W/m2, 47 CFR 1.1310 f/1500 mW/cm2 = 6.0 W/m2.
def test_the_stricter_rule_decides_and_is_named() -> None:
    antenna = Antenna(gain_dbi=13.0)
    both = known(antenna, frequency_hz=900e6)
    assert (both.public.rule, both.public.limit_w_m2, both.public.averaging_min) == (
        "icnirp-2020",
        pytest.approx(4.5),
        30.0,
    )
    other = known(antenna, frequency_hz=900e6, rule="fcc-1.1310")
    assert (other.public.rule, other.public.limit_w_m2) == ("fcc-1.1310", pytest.approx(6.0))
    assert other.occupational.averaging_min == 6.0
    assert other.public.front_m < both.public.front_m
    assert "47 CFR 1.1310" in other.sentence
    assert other.sources[0] == "fcc-1-1310"


def test_sources_are_entries_of_the_registry() -> None:
    from fellspan.propagation import SOURCES

    assert set(known(Antenna(pattern=DISH)).sources) <= set(SOURCES)


def test_no_figure_where_one_is_missing() -> None:
    assert exposure(Antenna(), frequency_hz=FREQUENCY_HZ, power_dbm=23.0) is None
    assert exposure(Antenna(gain_dbi=math.nan), frequency_hz=FREQUENCY_HZ, power_dbm=23.0) is None
    for unset in (None, math.nan):
        assert exposure(Antenna(gain_dbi=23.0), frequency_hz=FREQUENCY_HZ, power_dbm=unset) is None
    # 47 CFR 1.1310 ends at 100 GHz.
    assert exposure(Antenna(gain_dbi=23.0), frequency_hz=120e9, power_dbm=23.0, rule="fcc-1.1310") is None
    assert exposure(Antenna(gain_dbi=23.0), frequency_hz=120e9, power_dbm=23.0) is not None


def test_the_near_field_of_a_dish_is_marked_as_unconfirmed_and_decides_nothing() -> None:
    # P 0.2 W, D 0.6 m, 5.8 GHz: at the mouth 2.829 W/m2, by hand from 4 P/A (FCC OET Bulletin 65, from memory).
    result = known(Antenna(pattern=DISH), power_dbm=10.0 * math.log10(200.0))
    assert result.dish_near_field is not None
    assert result.dish_near_field.surface_w_m2 == pytest.approx(2.829, abs=1e-3)
    assert result.dish_near_field.public_m == 0.0
    assert result.public.front_m > 1.0
    assert result.dish_near_field.note == DISH_NOTE
    assert "unconfirmed" in DISH_NOTE
    assert any("near field" in note for note in result.notes)
    strong = known(Antenna(pattern=DISH), power_dbm=45.0).dish_near_field
    assert strong is not None
    assert strong.public_m > strong.occupational_m > 0.0


def test_people_read_distances_rounded_up() -> None:
    result = known(Antenna(gain_dbi=13.0))
    assert result.public.front_m == pytest.approx(0.178, abs=1e-3)
    assert "0.2 m on every side" in result.sentence
