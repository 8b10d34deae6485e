"""What decides the signal verdict is said, and every range that a figure leaves is named, whatever else is missing."""

import math
from dataclasses import replace

import numpy as np
import pytest
from made_profiles import profile_of
from signal_links import CLIMATE, over, radio, result_of, signal_of, working

from fellspan.climate import assembling
from fellspan.climate.given import GivenClimate
from fellspan.links.result import AtEnds, LinkResult
from fellspan.links.signal_verdict import TREES, judged
from fellspan.links.site import Antenna, Channel, Link, NoiseFloor
from fellspan.links.verdicts import signal_verdict

GAIN_DB = 38.0


def reason(link: Link, length_m: float = 20e3) -> tuple[str | None, str]:
    result = result_of(link, profile_of(length_m))
    return result.signal_verdict, signal_of(result).verdict_reason


def test_a_verdict_that_nothing_holds_down_says_so() -> None:
    link = over(profile_of(20e3))
    assert reason(link) == ("meets", "the margin wanted is there")
    assert reason(replace(link, target_availability_percent=90.0)) == (
        "meets",
        "margin and availability wanted are there",
    )
    assert reason(replace(link, radio=radio(power_dbm=None))) == (None, "")


@pytest.mark.parametrize("tenths", [0.02, 0.08])
def test_a_margin_far_short_is_told_as_the_sentence_of_the_level_tells_it(tenths: float) -> None:
    margin = AtEnds(at_a=-30.0 - tenths, at_b=-29.0)
    assert judged(margin, wanted_db=10.0, trees=False, holds=())[1] == "margin -30.1 dB, 10 dB wanted"


def test_a_short_margin_is_never_told_as_what_is_wanted() -> None:
    link = over(profile_of(20e3))
    result = result_of(link, profile_of(20e3))
    assert result.margin_db.at_a is not None
    least = min(result.margin_db.at_a, result.margin_db.at_b or math.inf)
    verdict, why = reason(replace(link, wanted_margin_db=least + 0.01))
    assert verdict == "marginal"
    assert why.endswith(f" dB, {least + 0.01:g} dB wanted")
    assert least - 0.1 < float(why.split()[1]) < least + 0.01
    _, why = judged(AtEnds(at_a=9.97, at_b=12.0), wanted_db=10.0, trees=False, holds=())
    assert why == "margin 9.9 dB, 10 dB wanted"


def test_trees_in_the_zone_are_the_reason_where_the_margin_is_ample() -> None:
    profile = profile_of(10e3, cover=lambda d: np.where(np.abs(d - 5e3) <= 30.0, 14.0, 0.0), n=2001)
    result = result_of(over(profile, height_m=20.0, target_availability_percent=90.0), profile)
    least = min(result.margin_db.at_a or 0.0, result.margin_db.at_b or 0.0)
    assert least > result.wanted_margin_db + 3.0
    assert result.signal_verdict == "marginal"
    assert signal_of(result).verdict_reason == TREES


def test_timing_and_channel_go_before_what_is_merely_marginal() -> None:
    link = over(profile_of(20e3), equipment=radio(greatest_distance_m=15e3), wanted_margin_db=20.0)
    radar = Channel(low_hz=11.0e9, high_hz=11.1e9)
    link = replace(link, b=replace(link.b, unusable_channels=(radar,)))
    verdict, why = reason(link)
    assert verdict == "below"
    assert why == f"the path is longer than the timing of the radio allows; its channel is unusable at '{link.b.name}'"


def test_a_missed_target_names_direction_and_shares() -> None:
    link = over(profile_of(30e3), target_availability_percent=99.9999999)
    share = signal_of(result_of(link, profile_of(30e3))).a_to_b.availability_percent.year
    assert share is not None
    verdict, why = reason(link, 30e3)
    assert verdict == "below"
    assert "of the year A to B, 100 % wanted" in why or "of the year A to B, 99.9999999 % wanted" in why
    near = replace(link, target_availability_percent=share + 1e-5)
    verdict, why = reason(near, 30e3)
    assert verdict == "marginal"
    assert "which 3 dB more margin would reach" in why


def test_reason_and_verdict_are_of_one_mind() -> None:
    """Whatever decides, the verdict is the worst of margin, trees and what else holds it down."""
    profile = profile_of(10e3, cover=lambda d: np.where(np.abs(d - 5e3) <= 30.0, 14.0, 0.0), n=2001)
    for wanted in (5.0, 30.0, 34.0, 60.0):
        result = result_of(over(profile, height_m=20.0, wanted_margin_db=wanted), profile)
        assert result.signal_verdict == signal_verdict(result.margin_db, wanted_db=wanted, trees=True)
        why = signal_of(result).verdict_reason
        assert (TREES in why) == (result.signal_verdict == "marginal")


@pytest.mark.parametrize(("low_ghz", "high_ghz"), [(10.98, 10.99), (11.01, 11.05), (10.9, 11.1), (None, 10.99)])
def test_a_noise_floor_counts_in_every_channel_that_it_touches(low_ghz: float | None, high_ghz: float) -> None:
    """The channel is 28 MHz wide about 11 GHz; noise in its edge is noise in it."""
    floor = NoiseFloor(
        level_dbm=-93.503, bandwidth_hz=28e6, low_hz=None if low_ghz is None else low_ghz * 1e9, high_hz=high_ghz * 1e9
    )
    link = over(profile_of(20e3))
    noisy = replace(link, b=replace(link.b, noise_floors=(floor,)))
    there = signal_of(result_of(noisy, profile_of(20e3))).a_to_b
    # kTB in 28 MHz with 6 dB is -93.503 dBm: as much again is 3.01 dB (definition).
    assert there.threshold_degradation_db == pytest.approx(3.0103, abs=1e-3)


def test_a_noise_floor_beside_the_channel_does_not_count() -> None:
    link = over(profile_of(20e3))
    for low, high in ((10.9e9, 10.985e9), (11.015e9, 11.1e9)):
        floor = NoiseFloor(level_dbm=-60.0, low_hz=low, high_hz=high)
        noisy = replace(link, b=replace(link.b, noise_floors=(floor,)))
        assert signal_of(result_of(noisy, profile_of(20e3))).a_to_b.threshold_degradation_db == 0.0


def _cautions(length_m: float, *, frequency_hz: float = 11e9, given: GivenClimate = CLIMATE) -> tuple[str, ...]:
    return _result(length_m, frequency_hz=frequency_hz, given=given).cautions


def _result(length_m: float, *, frequency_hz: float = 11e9, given: GivenClimate = CLIMATE) -> LinkResult:
    profile = profile_of(length_m)
    result = result_of(
        over(profile, height_m=400.0, equipment=radio(frequency_hz=frequency_hz)), profile, climate=given
    )
    assert result.received_dbm.at_b is not None  # there is still a result
    return result


def test_rain_out_of_range_is_named_though_multipath_is_not_computed(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(assembling, "maps_available", lambda: False)
    rain_only = GivenClimate(rain_rate_001_mm_h=40.0)
    result = _result(80e3, given=rain_only)
    assert signal_of(result).availability_percent.year is None
    assert any(caution.startswith("Rain: path length 80 km") for caution in result.cautions)


def test_multipath_out_of_range_is_named_though_rain_is_not_computed(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(assembling, "maps_available", lambda: False)
    found = _cautions(6e3, given=GivenClimate(log_k=-5.0, dn75=15.0))
    assert any(caution.startswith("Multipath: path length 6 km") for caution in found)


@pytest.mark.parametrize("newer", [True, False])
def test_multipath_below_the_least_frequency_for_the_length_is_named(newer: bool) -> None:
    """Not below about 15/d GHz: Rec. ITU-R P.530-19, section 2.3.1. 0.9 GHz over 16 km is 14.4 GHz km, over 17 km 15.3."""
    given = replace(CLIMATE, log_k=-5.0, dn75=15.0) if newer else CLIMATE
    words = "Multipath: path length times frequency 14.4 GHz km"
    found = [caution for caution in _cautions(16e3, frequency_hz=0.9e9, given=given) if caution.startswith(words)]
    assert len(found) == 1
    assert ("edition -17 too" in found[0]) != newer
    assert not any("times frequency" in caution for caution in _cautions(17e3, frequency_hz=0.9e9, given=given))


def test_multipath_of_edition_17_above_the_band_it_was_fitted_in_is_named() -> None:
    assert any(
        caution.startswith("Multipath: frequency 80 GHz") and "edition -17 too" in caution
        for caution in _cautions(6e3, frequency_hz=80e9)
    )
    assert not any(caution.startswith("Multipath") for caution in _cautions(6e3))


def test_more_rain_outage_than_the_law_spans_is_a_caution() -> None:
    """Equations (34) to (36) of P.530-19 are for 0.001 to 1 % of the year."""
    profile = profile_of(30e3)
    weak = Antenna(gain_dbi=32.0)
    link = over(profile, equipment=radio(frequency_hz=38e9, wanted="4-QAM"), antenna_a=weak, antenna_b=weak)
    result = result_of(link, profile)
    row = signal_of(result).a_to_b.modulations[0]
    assert row.year is not None
    assert (row.year.rain or 0.0) > 1.0
    assert any(caution.startswith("Rain: percentage of the year") for caution in result.cautions)


def test_the_worst_month_and_both_ways_carry_their_workings() -> None:
    result = result_of(over(profile_of(20e3)), profile_of(20e3))
    signal = signal_of(result)
    there = signal.a_to_b
    name = there.modulations[1].name
    worst = there.modulations[1].worst_month
    assert worst is not None
    rain = working(there, f"rain_outage_worst_month:{name}")
    year = rain.inputs[0].value
    assert isinstance(year, float)
    # P.530-19, equation (24): pw = 2.85 p^0.87 in its span.
    assert rain.value == worst.rain == pytest.approx(2.85 * year**0.87)
    assert working(there, f"diffraction_outage_worst_month:{name}").value == worst.diffraction
    found = {one.key: one for one in signal.workings}
    assert found["availability_both_ways"].value == signal.availability_percent.year
    assert found["availability_worst_month_both_ways"].value == signal.availability_percent.worst_month
    causes = {one.label: one.value for one in found["availability_both_ways"].inputs}
    assert signal.availability_percent.year == pytest.approx(
        100.0 - sum(float(causes[cause] or 0.0) for cause in ("rain", "multipath", "low k"))
    )
    assert causes["outage"] == signal.minutes_per_year
    assert "one frequency" in found["availability_both_ways"].formula


def test_the_radiated_power_shows_its_terms() -> None:
    antenna = Antenna(gain_dbi=GAIN_DB, feeder_loss_db=1.5, branching_loss_db=0.7)
    there = signal_of(result_of(over(profile_of(20e3), antenna_a=antenna), profile_of(20e3))).a_to_b
    eirp = working(there, "eirp")
    assert sum(float(one.value or 0.0) for one in eirp.inputs) == pytest.approx(eirp.value)
    assert eirp.value == pytest.approx(15.0 - 1.5 - 0.7 + GAIN_DB)


def test_editions_name_the_one_that_the_worst_month_of_rain_goes_by() -> None:
    far = signal_of(result_of(over(profile_of(20e3)), profile_of(20e3)))
    assert far.editions.worst_month == "P.2001-6 for multipath, P.530-19 for rain"
    new = signal_of(_result(20e3, given=replace(CLIMATE, log_k=-5.0, dn75=15.0)))
    assert new.editions.worst_month == "P.530-19"


def test_no_cause_is_named_for_an_outage_below_what_the_laws_tell_apart() -> None:
    profile = profile_of(1e3)
    result = result_of(over(profile, equipment=radio(frequency_hz=5.8e9)), profile)
    text = next(one for one in result.reasons if one.startswith("Available"))
    assert "under 5 minutes out)" in text
