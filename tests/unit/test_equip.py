"""Equipment compared: levels are those of planning, the ranking keeps its policy, the sentence says who falls short and why."""

from dataclasses import replace

import pytest
from made_benches import CATALOGUE, DISHES, ELEVEN, FIVE, Bench
from signal_links import CLIMATE

from fellspan.antennas.mounting import pointing_loss
from fellspan.design.equip_words import runner_up
from fellspan.design.offers import Offer, offers_named
from fellspan.errors import AntennaError, LinkError
from fellspan.links.radio import Modulation
from fellspan.links.rules import find_rule
from fellspan.links.site import Antenna, Sway

SAME = pytest.approx


@pytest.mark.parametrize("polarization", ["vertical", "horizontal"])
@pytest.mark.parametrize("ends", ["ab", "a", "b"])
def test_each_level_is_that_of_planning(polarization, ends):
    lossy = Antenna(gain_dbi=30.0, feeder_loss_db=1.5, radome_wet_db=2.0)
    bench = Bench(
        antenna_a=lossy, antenna_b=Antenna(gain_dbi=33.0, branching_loss_db=0.5), target_availability_percent=99.99
    )
    radios = tuple(replace(radio, polarization=polarization) for radio in (FIVE, ELEVEN))
    names = {"ab": "both"}.get(ends, ends)
    result = bench.compare((*DISHES, "panel 5 GHz, 8 x 8"), *radios, end=names)
    assert len(result.rows) == 11  # the panel is not for 11 GHz
    for row in result.rows:
        radio = next(one for one in radios if one.name == row.radio)
        planned = bench.planned(row.antenna, radio, ends=ends)
        assert row.received_dbm.at_a == SAME(planned.received_dbm.at_a, abs=1e-9)
        assert row.received_dbm.at_b == SAME(planned.received_dbm.at_b, abs=1e-9)
        assert row.margin_db.at_b == SAME(planned.margin_db.at_b, abs=1e-9)
        assert row.availability_percent.year == SAME(planned.availability_percent.year, abs=1e-9)
        assert row.availability_percent.worst_month == SAME(planned.availability_percent.worst_month, abs=1e-9)
        assert row.signal_verdict == planned.signal_verdict
        assert row.meets == (planned.signal_verdict == "meets")


def test_spare_is_what_the_power_may_lose_before_planning_says_below():
    bench = Bench(target_availability_percent=99.99, wanted_margin_db=3.0)
    result = bench.compare()
    assert {row.meets for row in result.rows} == {True, False}
    for row in result.rows:
        kept = replace(ELEVEN, power_dbm=ELEVEN.power_dbm - row.spare_db + 0.001)
        lost = replace(ELEVEN, power_dbm=ELEVEN.power_dbm - row.spare_db - 0.001)
        assert bench.planned(row.antenna, kept).signal_verdict == "meets"
        assert bench.planned(row.antenna, lost).signal_verdict == "marginal"


def test_the_smallest_that_meets_comes_first_then_who_lacks_least():
    bench = Bench(target_availability_percent=99.99, wanted_margin_db=3.0)
    rows = bench.compare(("dish 1.8 m", "dish 0.3 m", "dish 1.2 m", "dish 0.9 m", "dish 0.6 m")).rows
    meeting = [row for row in rows if row.meets]
    failing = [row for row in rows if not row.meets]
    assert [row.rank for row in rows] == [1, 2, 3, 4, 5]
    assert rows == (*meeting, *failing)
    areas = [row.frontal_area_m2 for row in meeting]
    assert areas == sorted(areas)
    assert [row.spare_db for row in failing] == sorted((row.spare_db for row in failing), reverse=True)
    assert failing


def test_an_antenna_of_unknown_size_comes_after_those_of_known_size():
    unknown = Offer(name="unlabelled", antenna=Antenna(name="unlabelled", gain_dbi=60.0))
    bench = Bench(wanted_margin_db=3.0)
    rows = bench.compare(offers=(unknown, *offers_named(("dish 1.2 m",), catalogue=CATALOGUE))).rows
    assert [row.antenna for row in rows] == ["dish 1.2 m", "unlabelled"]
    assert all(row.meets for row in rows)
    assert rows[1].kind == "gain only"
    assert (rows[1].mass_kg, rows[1].wind, rows[1].off_aim_db, rows[1].far_field_m) == (None, None, None, None)


def test_the_sentence_names_the_runner_up_its_shortfall_and_the_weather():
    wet = replace(CLIMATE, rain_rate_001_mm_h=90.0)
    weak = replace(ELEVEN, power_dbm=0.0)
    bench = Bench(9e3, radio=weak, climate=wet, target_availability_percent=99.99, wanted_margin_db=3.0)
    result = bench.compare()
    second = runner_up(result.rows)
    assert second is not None
    assert second.short_of == "availability"
    assert second.cause == "rain"
    assert result.decision.startswith(f"the {result.rows[0].antenna}: the smallest that meets 99.99 % of the year")
    shortfall = -second.spare_db
    assert f"the {second.antenna} falls" in result.decision
    said = float(result.decision.split("falls ")[1].split(" dB")[0])
    assert shortfall <= said < shortfall + 0.1  # a shortfall is never rounded down
    assert result.decision.endswith("short in rain.")
    assert f"{said:.1f} dB more" in result.changes
    assert "it takes the" in result.changes


def test_where_none_meets_the_nearest_is_named():
    result = Bench(60e3, target_availability_percent=99.999, height_m=200.0).compare(DISHES[:3])
    assert result.best is None
    assert result.decision.startswith("none of 3 meets")
    assert f"nearest is the {result.rows[0].antenna}" in result.decision


def test_a_rule_lowers_the_power_and_levels_are_those_of_planning_with_that_power():
    rule = find_rule("fcc-15.247-2g4-ptp")
    radio = replace(FIVE, frequency_hz=2.44e9, power_dbm=30.0)
    bench = Bench(radio=radio, power_rule=rule)
    for row in bench.compare(("grid dish 0.6 m", "grid dish 0.9 m", "yagi 2.4 GHz, 0.53 m boom")).rows:
        # 47 CFR 15.247 (c)(1)(i): 1 W, less 1 dB for each 3 dB over 6 dBi.
        assert row.highest_setting_dbm == SAME(30.0 - (row.peak_gain_dbi - 6.0) / 3.0, abs=1e-9)
        assert row.power_dbm == SAME(row.highest_setting_dbm)
        assert row.lowered_db == SAME(30.0 - row.power_dbm)
        planned = bench.planned(row.antenna, replace(radio, power_dbm=row.power_dbm))
        assert row.received_dbm.at_b == SAME(planned.received_dbm.at_b, abs=1e-9)
        assert planned.power is not None
        assert not planned.power.a.is_breach


def test_sway_is_counted_in_the_level_and_told_in_full():
    bench = Bench()
    still = bench.compare(("dish 1.2 m",)).rows[0]
    swaying = Sway(azimuth_sigma_deg=0.4, elevation_sigma_deg=0.4)
    ends = {f"antenna_{end}": Antenna(gain_dbi=38.0, sway=swaying) for end in "ab"}
    row = Bench(**ends).compare(("dish 1.2 m",)).rows[0]
    loss = pointing_loss(CATALOGUE.find("dish 1.2 m").pattern(11e9), azimuth_sigma_deg=0.4, elevation_sigma_deg=0.4)
    assert row.sway_mean_db == SAME(loss.mean_db)
    assert row.sway_p999_db == SAME(loss.p999_db)
    assert still.received_dbm.at_b - row.received_dbm.at_b == SAME(2.0 * loss.mean_db, abs=1e-9)
    assert still.sway_mean_db is None


def test_a_steady_error_of_aim_is_read_off_the_pattern():
    row = Bench().compare(("dish 0.6 m",), off_aim_deg=1.0).rows[0]
    # Half power at half the width: 3.01 dB there by definition.
    half = Bench().compare(("dish 0.6 m",), off_aim_deg=row.azimuth_width_deg / 2.0).rows[0]
    assert half.off_aim_db == SAME(3.01, abs=0.02)
    assert 0.0 < row.off_aim_db < half.off_aim_db


def test_wind_is_that_of_area_and_shape():
    row = Bench().compare(("dish 0.6 m",), wind_speed_m_s=30.0, arm_m=2.0).rows[0]
    assert row.wind.force_n == SAME(0.5 * 1.225 * 900.0 * 1.5 * row.frontal_area_m2)
    assert row.wind.moment_nm == SAME(2.0 * row.wind.force_n)
    assert not row.wind.confirmed
    assert "common practice" in row.wind.drag_source


def test_the_mean_throughput_and_modulation_are_those_of_planning():
    table = (
        Modulation(name="slow", threshold_dbm=-85.0, throughput_bps=20e6),
        Modulation(name="fast", threshold_dbm=-62.0, throughput_bps=150e6),
    )
    radio = replace(ELEVEN, threshold_dbm=None, modulations=table, wanted="fast")
    bench = Bench(radio=radio)
    for row in bench.compare().rows:
        planned = bench.planned(row.antenna, radio)
        assert planned.signal is not None
        assert row.throughput_mean_bps == SAME(planned.signal.a_to_b.throughput_mean_bps)
        assert row.modulation == "fast"


def test_what_cannot_be_compared_is_said():
    with pytest.raises(LinkError, match="'five' states no threshold"):
        Bench().compare(DISHES, replace(FIVE, threshold_dbm=None))
    with pytest.raises(LinkError, match="'five' states no power"):
        Bench().compare(DISHES, replace(FIVE, power_dbm=None))
    with pytest.raises(LinkError, match="none of 1 antennas"):
        Bench().compare(("yagi 2.4 GHz, 0.53 m boom",))
    with pytest.raises(AntennaError, match="no antenna 'dish 7 m'"):
        offers_named(("dish 7 m",), catalogue=CATALOGUE)
    result = Bench().compare(("dish 0.6 m", "yagi 2.4 GHz, 0.53 m boom"))
    assert "is not for 11 GHz" in result.passed_over[0]


def test_an_antenna_of_the_study_keeps_its_aim():
    bench = Bench()
    aimed = Antenna(name="mine", gain_dbi=40.0)
    link = replace(bench.link, antenna_a=aimed)
    offer = offers_named(("mine", "dish 0.6 m"), catalogue=CATALOGUE, links=(link,))
    assert offer[0].at(11e9) == aimed
    assert offer[1].at(11e9).pattern.name == "dish 0.6 m"
