"""Radios, feeders and receivers: what may be stated, what follows from it, and what is refused, with the value named."""

import math

import pytest
from signal_links import TABLE, radio, signal_over, working

from fellspan.errors import LinkError
from fellspan.links.feeders import FEEDER_CLASSES, Feeder, feeder_caution, feeder_db_per_100_m, feeder_run_loss_db
from fellspan.links.radio import CoChannel, Modulation, Radio, Signature
from fellspan.links.receivers import row_threshold_dbm, rows_of, wanted_index
from fellspan.links.signal_words import minutes_text, percent_text, rate_text
from fellspan.links.site import Antenna, Channel, Diversity, Link, NoiseFloor, Sway


def test_power_of_each_chain_makes_the_total() -> None:
    two = Radio(frequency_hz=5.8e9, power_per_chain_dbm=20.0, chains=2)
    assert two.power_dbm == pytest.approx(23.0103, abs=1e-4)  # 10 log 2 = 3.0103 (hand calculation)
    assert Radio(frequency_hz=5.8e9, power_dbm=23.0, power_per_chain_dbm=20.0, chains=2).power_dbm == 23.0
    with pytest.raises(LinkError, match=r"27 dBm.*20 dBm"):
        Radio(frequency_hz=5.8e9, power_dbm=27.0, power_per_chain_dbm=20.0, chains=2)


@pytest.mark.parametrize(
    ("fields", "text"),
    [
        ({"frequency_hz": 0.0}, "0 Hz"),
        ({"frequency_hz": math.nan}, "nan"),
        ({"duplex": "frequency"}, "without a pair"),
        ({"duplex": "frequency", "frequency_a_hz": 11.1e9, "frequency_b_hz": 11.6e9}, "11 GHz"),
        ({"frequency_a_hz": 11.1e9}, "duplex is 'time'"),
        ({"usable_share": 0.0}, "usable share 0"),
        ({"usable_share": 1.5}, "1.5"),
        ({"chains": 0}, "0 chains"),
        ({"greatest_distance_m": -5.0}, "-5 m"),
        ({"power_control_db": -1.0}, "-1 dB"),
        ({"noise_figure_db": math.inf}, "inf"),
        ({"wanted": "1024-QAM"}, "1024-QAM"),
        ({"modulations": (TABLE[0], TABLE[0])}, "4-QAM"),
        ({"modulations": (Modulation(name="bare"),)}, "bare"),
        ({"modulations": (Modulation(name="ratio", snr_db=9.0),), "noise_figure_db": None}, "ratio"),
    ],
)
def test_radios_that_cannot_be_are_refused(fields: dict[str, object], text: str) -> None:
    with pytest.raises(LinkError, match=text) as caught:
        radio(**fields)
    assert len(str(caught.value).splitlines()) <= 4


def test_other_impossible_figures_are_refused() -> None:
    for make, text in (
        (lambda: Signature(width_hz=0.0, depth_db=20.0), "0 Hz"),
        (lambda: Signature(width_hz=28e6, depth_db=-1.0), "-1 dB"),
        (lambda: Signature(width_hz=28e6, depth_db=20.0, delay_s=0.0), "0 s"),
        (lambda: Modulation(name="none", throughput_bps=0.0), "none"),
        (lambda: Modulation(name="odd", threshold_dbm=math.nan), "nan"),
        (lambda: CoChannel(canceller_db=-3.0), "-3 dB"),
        (lambda: Feeder(kind="coaxial 10 mm", length_m=-2.0), "-2 m"),
        (lambda: Feeder(kind="coaxial 10 mm", length_m=2.0, db_per_100_m=math.inf), "inf"),
        (lambda: NoiseFloor(level_dbm=math.inf), "inf"),
        (lambda: NoiseFloor(level_dbm=-90.0, bandwidth_hz=0.0), "0 Hz"),
        (lambda: NoiseFloor(level_dbm=-90.0, bearing_deg=400.0), "400"),
        (lambda: NoiseFloor(level_dbm=-90.0, width_deg=0.0), "0 degrees"),
        (lambda: NoiseFloor(level_dbm=-90.0, low_hz=6e9, high_hz=5e9), "6 to 5"),
        (lambda: Channel(low_hz=6e9, high_hz=5e9), "6 to 5"),
        (lambda: Sway(azimuth_sigma_deg=-0.1), "-0.1"),
        (lambda: Diversity(spacing_m=0.0), "0 m"),
        (lambda: Antenna(branching_loss_db=-1.0), "-1 dB"),
        (lambda: Antenna(radome_wet_db=math.nan), "nan"),
    ):
        with pytest.raises(LinkError, match=text):
            make()


@pytest.mark.parametrize("target", [0.0, 100.0, -5.0, math.nan])
def test_a_target_is_a_share_of_the_year(target: float) -> None:
    from made_profiles import link_of, profile_of

    link = link_of(profile_of(1e3))
    with pytest.raises(LinkError, match=f"{target:g} %"):
        Link(name="x", a=link.a, b=link.b, radio=link.radio, target_availability_percent=target)


def test_thresholds_follow_from_noise() -> None:
    made = radio(implementation_loss_db=2.0, modulations=(Modulation(name="qpsk", snr_db=10.0),))
    # kTB in 28 MHz is -99.503 dBm (definition, 290 K), and 6 + 10 + 2 dB.
    assert row_threshold_dbm(made, made.modulations[0]) == pytest.approx(-81.503, abs=1e-3)


def test_a_threshold_alone_is_one_row() -> None:
    plain = Radio(frequency_hz=5.8e9, threshold_dbm=-70.0)
    rows = rows_of(plain)
    assert len(rows) == 1
    assert wanted_index(plain, rows) == 0
    assert rows_of(Radio(frequency_hz=5.8e9)) == ()


def test_coaxial_cable_loses_what_the_trade_expects() -> None:
    # 100 m of 1/2 inch foam cable lose some 11 dB at 2.4 GHz, of 7/8 inch some 6 dB (common practice, no source).
    assert feeder_db_per_100_m("coaxial 13 mm", frequency_hz=2.4e9) == pytest.approx(11.5, abs=1.0)
    assert feeder_db_per_100_m("coaxial 22 mm", frequency_hz=2.4e9) == pytest.approx(6.3, abs=0.7)
    # 10 mm low-loss cable: some 22 dB at 2.4 GHz, 35 dB at 5.8 GHz (common practice, no source).
    assert feeder_db_per_100_m("coaxial 10 mm", frequency_hz=2.4e9) == pytest.approx(22.0, abs=1.5)
    assert feeder_db_per_100_m("coaxial 10 mm", frequency_hz=5.8e9) == pytest.approx(35.5, abs=1.5)


def test_feeders_grow_with_length_and_frequency_and_say_where_they_end() -> None:
    for kind, line in FEEDER_CLASSES.items():
        low = max(line.low_hz, 0.1e9)
        assert feeder_db_per_100_m(kind, frequency_hz=line.high_hz) > feeder_db_per_100_m(kind, frequency_hz=low)
        run = Feeder(kind=kind, length_m=20.0)
        assert feeder_run_loss_db(run, frequency_hz=low) == pytest.approx(
            2.0 * feeder_run_loss_db(Feeder(kind=kind, length_m=10.0), frequency_hz=low)
        )
        assert feeder_caution(run, frequency_hz=line.high_hz) is None
        assert kind in (feeder_caution(run, frequency_hz=line.high_hz * 1.1) or "")
    stated = Feeder(kind="coaxial 10 mm", length_m=50.0, db_per_100_m=20.0)
    assert feeder_run_loss_db(stated, frequency_hz=30e9) == 10.0
    assert feeder_caution(stated, frequency_hz=30e9) is None


def test_sway_costs_what_the_pattern_says_and_is_not_guessed_without_one() -> None:
    from fellspan.antennas.dishes import dish

    pattern = dish(diameter_m=1.2, frequency_hz=11e9)
    still, moved = Antenna(pattern=pattern), Antenna(pattern=pattern, sway=Sway(azimuth_sigma_deg=0.5))
    calm = signal_over(antenna_a=still, antenna_b=still).a_to_b
    shaken = signal_over(antenna_a=moved, antenna_b=still).a_to_b
    lost = working(shaken, "transmit_pointing").value
    assert lost is not None
    assert 0.2 < lost < 3.0
    assert (shaken.received_dbm or 0.0) == pytest.approx((calm.received_dbm or 0.0) - lost)
    bare = signal_over(antenna_a=Antenna(gain_dbi=38.0, sway=Sway(azimuth_sigma_deg=0.5))).a_to_b
    assert working(bare, "transmit_pointing").value is None


def test_words_never_hide_an_outage() -> None:
    assert percent_text(99.98466) == "99.984 %"
    assert percent_text(99.0) == "99 %"
    assert percent_text(99.9999) == "over 99.999 %"
    assert percent_text(42.37) == "42.3 %"
    assert minutes_text(0.5) == "under 5 minutes"
    assert minutes_text(80.64) == "81 minutes"
    assert minutes_text(600.0) == "10 hours"
    assert minutes_text(14400.0) == "10 days"
    assert rate_text(450e6) == "450 Mbit/s"
    assert rate_text(2.5e9) == "2.5 Gbit/s"
