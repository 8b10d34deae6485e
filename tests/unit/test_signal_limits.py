"""Limits of the signal: no rain no loss, longer is worse, margin helps, both ways alike, duplex, trees once, throughput."""

import itertools
from dataclasses import replace

import numpy as np
import pytest
from made_profiles import mirrored, profile_of
from signal_links import CLIMATE, SIGNATURE, TABLE, outage, over, radio, result_of, signal_of, signal_over, working

from fellspan.climate import CLIMATE_KEYS
from fellspan.climate.given import GivenClimate
from fellspan.links.assess import AssessSettings, assess_profile
from fellspan.links.radio import CoChannel
from fellspan.links.site import Antenna, Channel, Diversity, NoiseFloor
from fellspan.propagation import (
    annual_from_worst_month_geographic_percent,
    annual_from_worst_month_percent,
    fade_exceeded_percent,
    multipath_occurrence_detailed_percent,
    multipath_occurrence_percent,
    multipath_occurrence_quick_percent,
    rain_loss_001_db,
    rain_percent,
)


def climate(**changes: object) -> GivenClimate:
    return replace(CLIMATE, **changes)  # type: ignore[arg-type]


def test_no_rain_no_rain_loss() -> None:
    profile = profile_of(20e3)
    there = signal_of(result_of(over(profile), profile, climate=climate(rain_rate_001_mm_h=0.0))).a_to_b
    assert there.rain_001_db == 0.0
    assert [row.year.rain for row in there.modulations if row.year is not None] == [0.0, 0.0, 0.0]


def test_rain_is_what_the_physics_says() -> None:
    there = signal_over().a_to_b
    loss = rain_loss_001_db(20e3, rain_rate_001_mm_h=40.0, frequency_hz=11e9, polarization="vertical", edition="19")
    assert there.rain_001_db == pytest.approx(loss)
    row = there.modulations[1]
    assert row.year is not None
    assert row.margin_db is not None
    assert row.year.rain == pytest.approx(rain_percent(row.margin_db, loss_001_db=loss, frequency_hz=11e9))


def test_availability_falls_with_length() -> None:
    shares = [signal_over(length).availability_percent.year for length in (4e3, 8e3, 16e3, 24e3, 32e3, 48e3)]
    for nearer, farther in itertools.pairwise(shares):
        assert nearer is not None
        assert farther is not None
        assert farther < nearer


def test_more_power_means_less_outage_by_every_cause() -> None:
    before = None
    for power in (10.0, 13.0, 16.0, 20.0):
        row = signal_over(30e3, equipment=radio(power_dbm=power)).a_to_b.modulations[1]
        assert row.year is not None
        assert row.worst_month is not None
        now = (row.year.rain, row.year.multipath, row.worst_month.rain, row.worst_month.multipath)
        assert None not in now
        if before is not None:
            assert all(new < old for new, old in zip(now, before, strict=True))  # type: ignore[operator]
        before = now


def test_a_worst_month_is_no_better_than_the_year() -> None:
    for row in signal_over(40e3).a_to_b.modulations:
        assert row.year is not None
        assert row.worst_month is not None
        for cause in ("rain", "multipath", "diffraction", "total"):
            assert getattr(row.worst_month, cause) >= getattr(row.year, cause)


def test_path_loss_is_the_same_from_either_end() -> None:
    profile = profile_of(30e3, lambda d: 40.0 * np.sin(d / 3e3) ** 2 + 1e-3 * d)
    there = result_of(over(profile, height_m=(50.0, 30.0)), profile)
    turned = mirrored(profile)
    back = result_of(over(turned, height_m=(30.0, 50.0)), turned)
    assert there.losses_db.diffraction > 1.0
    for kind in ("free_space", "diffraction", "vegetation", "gases", "rain_001"):
        assert getattr(there.losses_db, kind) == pytest.approx(getattr(back.losses_db, kind), rel=1e-9, abs=1e-9)
    assert signal_of(there).a_to_b.received_dbm == pytest.approx(signal_of(there).b_to_a.received_dbm, abs=1e-9)
    assert signal_of(there).availability_percent.year == pytest.approx(
        signal_of(back).availability_percent.year, abs=1e-9
    )


def test_one_frequency_gives_both_directions_the_same_numbers() -> None:
    signal = signal_over(30e3)
    one, other = signal.a_to_b, signal.b_to_a
    assert [row.margin_db for row in one.modulations] == pytest.approx([row.margin_db for row in other.modulations])
    assert one.availability_percent == other.availability_percent
    assert signal.availability_percent.year == pytest.approx(one.availability_percent.year)


def test_a_pair_of_frequencies_differs_only_where_they_enter() -> None:
    equipment = radio(duplex="frequency", frequency_hz=11e9, frequency_a_hz=10.7e9, frequency_b_hz=11.3e9)
    signal = signal_over(30e3, equipment=equipment)
    low, high = signal.a_to_b, signal.b_to_a
    assert equipment.high_end == "B"
    assert (low.frequency_hz, high.frequency_hz) == (10.7e9, 11.3e9)
    assert low.power_dbm == high.power_dbm
    # 20 log(11.3 / 10.7) = 0.4739 dB (hand calculation)
    more = (working(high, "free_space").value or 0.0) - (working(low, "free_space").value or 0.0)
    assert more == pytest.approx(0.4739, abs=1e-4)
    assert (high.rain_001_db or 0.0) > (low.rain_001_db or 0.0)
    years = (low.availability_percent.year, high.availability_percent.year, signal.availability_percent.year)
    assert None not in years
    assert years[2] < min(years[:2])  # type: ignore[type-var,operator]
    turned = signal_over(30e3, equipment=replace(equipment, frequency_a_hz=11.3e9, frequency_b_hz=10.7e9))
    assert turned.b_to_a.received_dbm == pytest.approx(low.received_dbm)
    assert turned.a_to_b.availability_percent.year == pytest.approx(high.availability_percent.year)


def test_modulations_run_from_robust_to_fast_whatever_their_order() -> None:
    for rows in itertools.permutations(TABLE):
        there = signal_over(30e3, equipment=radio(modulations=rows)).a_to_b
        assert [row.name for row in there.modulations] == ["4-QAM", "64-QAM", "256-QAM"]
        assert there.wanted == "4-QAM"
        outages = [outage(there, row.name) for row in there.modulations]
        assert outages == sorted(outages)
        margins = [row.margin_db for row in there.modulations]
        assert margins == sorted(margins, reverse=True)  # type: ignore[type-var]


def test_the_wanted_modulation_is_the_one_that_is_judged() -> None:
    profile = profile_of(30e3)
    for name, row in zip(("4-QAM", "64-QAM", "256-QAM"), TABLE, strict=True):
        result = result_of(over(profile, equipment=radio(wanted=name)), profile)
        there = signal_of(result).a_to_b
        assert result.modulation == there.wanted == name
        assert result.margin_db.at_b == pytest.approx((result.received_dbm.at_b or 0.0) - (row.threshold_dbm or 0.0))
        assert there.availability_percent.year == pytest.approx(100.0 - outage(there, name))
        assert there.minutes_per_year == pytest.approx(outage(there, name) / 100.0 * 525_960.0)  # 365.25 days


def test_mean_throughput_lies_between_the_rates() -> None:
    for length in (5e3, 20e3, 40e3):
        there = signal_over(length, equipment=radio(usable_share=0.5)).a_to_b
        best = there.modulations[0].availability_percent.year
        assert there.throughput_mean_bps is not None
        assert best is not None
        assert 25e6 * best / 100.0 <= there.throughput_mean_bps <= 150e6
        carried = [row.carried_percent for row in there.modulations]
        assert None not in carried
        assert sum(carried) == pytest.approx(best)  # type: ignore[arg-type]


def test_a_level_that_is_short_is_down_all_the_time_and_says_so() -> None:
    profile = profile_of(20e3)
    result = result_of(over(profile, equipment=radio(power_dbm=-60.0)), profile)
    signal = signal_of(result)
    assert signal.availability_percent.year == 0.0
    assert signal.dominant_cause == "level"
    assert result.signal_verdict == "below"
    assert any("short even in clear air" in reason for reason in result.reasons)


@pytest.mark.parametrize("edition", ["P.530-19", "P.530-17 detailed", "P.530-17 quick"])
def test_the_edition_follows_what_the_climate_gives(edition: str) -> None:
    profile = profile_of(40e3)
    ends = {"a_amsl_m": 60.0, "b_amsl_m": 60.0}
    if edition == "P.530-19":
        given = climate(log_k=-5.0, dn75=15.0)
        expected = multipath_occurrence_percent(
            40e3, frequency_hz=11e9, mean_ground_amsl_m=0.0, log_k=-5.0, dn75=15.0, **ends
        )
    elif edition == "P.530-17 detailed":
        given = CLIMATE
        expected = multipath_occurrence_detailed_percent(
            40e3, frequency_hz=11e9, dn1_n_per_km=-200.0, terrain_roughness_m=30.0, **ends
        )
    else:
        given = GivenClimate(rain_rate_001_mm_h=40.0, dn1_n_per_km=-200.0)
        expected = multipath_occurrence_quick_percent(40e3, frequency_hz=11e9, dn1_n_per_km=-200.0, **ends)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("fellspan.climate.maps.MAP_PACKAGE", "a_package_that_is_not_there")
        signal = signal_of(result_of(over(profile), profile, climate=given))
    assert signal.editions.multipath == edition
    assert signal.a_to_b.multipath_occurrence_percent == pytest.approx(expected)
    row = signal.a_to_b.modulations[0]
    assert row.worst_month is not None
    assert row.margin_db is not None
    worst = fade_exceeded_percent(row.margin_db, occurrence_percent=expected)
    assert row.worst_month.multipath == pytest.approx(worst)
    assert row.year is not None
    if edition == "P.530-19":
        annual = annual_from_worst_month_percent(worst)
    else:
        annual = annual_from_worst_month_geographic_percent(worst, distance_m=40e3, latitude_deg=0.0)
    assert row.year.multipath == pytest.approx(annual)


def test_rain_edition_and_reading_are_chosen_and_named() -> None:
    profile = profile_of(50e3)  # beyond 30 km the editions part
    link = over(profile, height_m=200.0, equipment=radio(frequency_hz=23e9))
    new, old = (signal_of(result_of(link, profile, rain_edition=edition)) for edition in ("19", "17"))
    assert (new.editions.rain, old.editions.rain) == ("P.530-19", "P.530-17")
    assert new.a_to_b.rain_001_db != old.a_to_b.rain_001_db
    read = signal_of(result_of(link, profile, rain_reading="B"))
    assert read.editions.rain_reading == "B"
    shares = [one.a_to_b.modulations[0].year for one in (new, read)]
    assert shares[0] != shares[1]


def test_without_maps_and_figures_the_availability_is_null_and_the_keys_are_named() -> None:
    profile = profile_of(20e3)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("fellspan.climate.maps.MAP_PACKAGE", "a_package_that_is_not_there")
        result = assess_profile(over(profile, target_availability_percent=99.9), profile, AssessSettings()).result
    signal = signal_of(result)
    assert signal.availability_percent.year is None
    assert signal.editions.rain is None
    assert signal.target_met is None
    assert result.signal_verdict == "marginal"  # margin is there, the target cannot be judged
    text = "\n".join(signal.notes)
    assert CLIMATE_KEYS["rain_rate_001_mm_h"].key in text
    assert CLIMATE_KEYS["dn1_n_per_km"].key in text
    assert any(reason.startswith("Availability is not computed: no rain rate") for reason in result.reasons)


def test_with_maps_nothing_need_be_given() -> None:
    pytest.importorskip("itur")
    profile = profile_of(20e3)
    signal = signal_of(assess_profile(over(profile), profile, AssessSettings()).result)
    assert signal.availability_percent.year is not None
    assert any("itur" in figure.provenance for figure in signal.climate)


# Noise, channels, timing, diversity, cross polarization, radomes


def test_noise_floor_raises_the_threshold_where_it_looks() -> None:
    profile = profile_of(20e3)  # B lies east of A, so B looks west
    plain = over(profile)
    floor = NoiseFloor(level_dbm=-93.503, bandwidth_hz=28e6, bearing_deg=270.0, width_deg=60.0)
    noisy = replace(plain, b=replace(plain.b, noise_floors=(floor,)))
    quiet, loud = (signal_of(result_of(link, profile)) for link in (plain, noisy))
    # kTB in 28 MHz with 6 dB is -93.503 dBm: as much again is 3.01 dB (definition).
    assert loud.a_to_b.threshold_degradation_db == pytest.approx(3.0103, abs=1e-3)
    assert loud.b_to_a.threshold_degradation_db == 0.0
    for before, after in zip(quiet.a_to_b.modulations, loud.a_to_b.modulations, strict=True):
        assert after.threshold_dbm == pytest.approx(before.threshold_dbm + 3.0103, abs=1e-3)
        assert after.received_dbm == before.received_dbm
    away = replace(plain, b=replace(plain.b, noise_floors=(replace(floor, bearing_deg=90.0),)))
    assert signal_of(result_of(away, profile)).a_to_b.threshold_degradation_db == 0.0
    half = replace(plain, b=replace(plain.b, noise_floors=(replace(floor, bandwidth_hz=56e6),)))
    assert 1.7 < signal_of(result_of(half, profile)).a_to_b.threshold_degradation_db < 1.8  # 10 log(1.5) = 1.76


def test_unusable_channel_and_timing_are_named_and_fail_the_signal() -> None:
    profile = profile_of(20e3)
    plain = over(profile)
    assert result_of(plain, profile).signal_verdict == "meets"
    radar = Channel(low_hz=11.01e9, high_hz=11.1e9, reason="radar")
    blocked = result_of(replace(plain, b=replace(plain.b, unusable_channels=(radar,))), profile)
    assert blocked.signal_verdict == "below"
    assert any(caution.startswith("Channel: 11 GHz") and "radar" in caution for caution in blocked.cautions)
    beside = replace(radar, low_hz=11.015e9)  # the channel ends at 11.014 GHz
    assert result_of(replace(plain, b=replace(plain.b, unusable_channels=(beside,))), profile).signal_verdict == "meets"
    late = result_of(over(profile, equipment=radio(greatest_distance_m=15e3)), profile)
    assert late.signal_verdict == "below"
    assert any(caution.startswith("Timing: the path is 20.00 km long") for caution in late.cautions)


def test_the_target_decides_with_the_margin() -> None:
    profile = profile_of(30e3)
    share = signal_of(result_of(over(profile), profile)).a_to_b.availability_percent.year
    assert share is not None
    for target, met, verdict in (
        (share - 1e-4, True, "meets"),
        (share + 1e-5, False, "marginal"),
        (99.9999999, False, "below"),
    ):
        result = result_of(over(profile, target_availability_percent=target), profile)
        assert signal_of(result).target_met is met
        assert result.signal_verdict == verdict
    short = result_of(over(profile, target_availability_percent=share - 1e-4, wanted_margin_db=80.0), profile)
    assert short.signal_verdict == "below"


def test_a_second_antenna_and_a_better_signature_help() -> None:
    table = tuple(replace(row, signature=SIGNATURE) for row in TABLE)
    equipment = radio(frequency_hz=6e9, modulations=table)
    one = Antenna(gain_dbi=38.0)
    two = replace(one, diversity=Diversity(spacing_m=10.0))
    alone = signal_over(50e3, equipment=equipment, height_m=120.0, antenna_a=one, antenna_b=one)
    helped = signal_over(50e3, equipment=equipment, height_m=120.0, antenna_a=one, antenna_b=two)
    flat = signal_over(50e3, equipment=radio(frequency_hz=6e9), height_m=120.0)
    for name in ("4-QAM", "64-QAM"):
        assert outage(helped.a_to_b, name) < outage(alone.a_to_b, name)
        assert outage(helped.b_to_a, name) == outage(alone.b_to_a, name)  # the second antenna is at B
        assert outage(flat.a_to_b, name) < outage(alone.a_to_b, name)
    assert any("selective fading is not counted" in note for note in flat.notes)


def test_co_channel_polarizations_cost_and_a_canceller_helps() -> None:
    def total(stated: CoChannel | None) -> float:
        return outage(signal_over(40e3, equipment=radio(co_channel=stated, dual_polarization=True)).a_to_b, "256-QAM")

    assert total(None) < total(CoChannel(canceller_db=20.0)) < total(CoChannel())


def test_wet_radomes_count_in_rain_and_iced_ones_are_said() -> None:
    dry = Antenna(gain_dbi=38.0)
    wet = replace(dry, radome_wet_db=2.0, radome_iced_db=5.0)
    before = signal_over(30e3, antenna_a=dry, antenna_b=dry)
    after = signal_over(30e3, antenna_a=wet, antenna_b=wet)
    first, second = before.a_to_b.modulations[1], after.a_to_b.modulations[1]
    assert first.received_dbm == second.received_dbm
    assert first.year is not None
    assert second.year is not None
    assert (second.year.rain or 0.0) > (first.year.rain or 0.0)
    assert second.year.multipath == first.year.multipath
    assert any("both radomes iced" in note for note in after.notes)


def test_ranges_left_are_named_and_there_is_still_a_result() -> None:
    profile = profile_of(80e3)
    result = result_of(over(profile, height_m=400.0), profile)
    assert any(caution.startswith("Rain: path length 80 km") for caution in result.cautions)
    assert signal_of(result).availability_percent.year is not None
    far = signal_of(result).a_to_b
    assert "60 km" in working(far, "rain_001").note
    near = result_of(over(profile_of(6e3)), profile_of(6e3), climate=climate(log_k=-5.0, dn75=15.0))
    assert any(caution.startswith("Multipath: path length 6 km") for caution in near.cautions)
    high = result_of(over(profile_of(1e3), equipment=radio(frequency_hz=180e9)), profile_of(1e3))
    assert any("180 GHz" in caution and caution.startswith("Rain") for caution in high.cautions)
