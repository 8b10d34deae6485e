"""Reach solved back: at the distance found the engine leaves exactly what is asked, and curves are those of the engine."""

from dataclasses import replace

import numpy as np
import pytest
from made_benches import CATALOGUE, DISHES, ELEVEN, FIVE, Bench

from fellspan.design.equip import EquipPath, compare_equipment
from fellspan.design.needed_margin import MOST_DB, needed_margin_db, wanted_receiver
from fellspan.design.offers import offers_named
from fellspan.design.reach import REACH_M
from fellspan.links.antenna_gains import antennas_of
from fellspan.links.signal_path import fading_over, free_path
from fellspan.links.site import Antenna
from fellspan.propagation import free_space_loss_db


def row_over(bench, antenna, radio, distance_m):
    """The comparison of one pair over a free path of another length: the engine asked afresh."""
    here = bench.way(replace(bench.link, radio=radio))
    geometry = here.path.geometry

    def way(link):
        path = free_path(
            link,
            here.path.figures,
            length_m=distance_m,
            a_amsl_m=geometry.a_amsl_m,
            b_amsl_m=geometry.b_amsl_m,
            mean_ground_m=geometry.mean_ground_m,
            median_k=here.path.median_k,
        )
        return EquipPath(path=path, bearings_deg=here.bearings_deg, tilts_deg=here.tilts_deg)

    offers = offers_named((antenna,), catalogue=CATALOGUE)
    return compare_equipment(bench.link, offers, (radio,), way=way, weather=bench.judged.weather).rows[0]


@pytest.mark.parametrize("target", [None, 99.9, 99.99])
@pytest.mark.parametrize("radio", [FIVE, ELEVEN], ids=lambda radio: radio.name)
def test_reach_solves_back_to_what_is_asked(radio, target):
    ends = {
        "antenna_a": Antenna(gain_dbi=30.0, feeder_loss_db=1.0, radome_wet_db=1.5),
        "antenna_b": Antenna(gain_dbi=30.0),
    }
    bench = Bench(radio=radio, target_availability_percent=target, wanted_margin_db=6.0, height_m=(60.0, 140.0), **ends)
    rows = bench.compare(DISHES[:4], reach=True).rows
    solved = [row for row in rows if row.reach.limited_by != "beyond"]
    assert len(solved) >= 2
    for row in solved:
        at = row.reach.distance_m
        # 0.01 m of 10 km is 1e-5 dB; the needed margin is solved to 1e-4 dB.
        assert row_over(bench, row.antenna, radio, at).spare_db == pytest.approx(0.0, abs=1e-3)
        assert row_over(bench, row.antenna, radio, at * 0.999).meets
        assert not row_over(bench, row.antenna, radio, at * 1.001).meets


def test_curves_are_what_the_engine_leaves_at_each_distance():
    bench = Bench(target_availability_percent=99.99, wanted_margin_db=3.0)
    row = bench.compare(("dish 0.9 m",), reach=True).rows[0]
    for index in (5, 20, 35, 50):
        asked = row_over(bench, row.antenna, ELEVEN, REACH_M[index])
        # Charts interpolate the needed margin on quarters of a dB.
        assert row.reach.spare_db[index] == pytest.approx(asked.spare_db, abs=0.01)


def test_without_weather_reach_is_free_space_alone():
    # No target: free space and air against margin. Dry and thin air: free space alone, P.525-5 equation (4).
    bench = Bench(radio=FIVE)
    bench.judged = replace(
        bench.judged, climate=replace(bench.judged.climate, vapour_g_m3=0.0, total_pressure_hpa=301.0)
    )
    row = bench.compare(("dish 0.3 m",), reach=True).rows[0]
    loss = FIVE.power_dbm + 2.0 * row.peak_gain_dbi - FIVE.threshold_dbm - bench.link.wanted_margin_db
    assert float(free_space_loss_db(row.reach.distance_m, frequency_hz=5.8e9)) == pytest.approx(loss, abs=0.1)
    assert row.reach.limited_by == "margin"


def test_more_gain_more_rain_and_a_harder_target_do_what_they_must():
    bench = Bench(target_availability_percent=99.99, wanted_margin_db=3.0)
    reaches = {row.antenna: row.reach.distance_m for row in bench.compare(reach=True).rows}
    assert [reaches[name] for name in DISHES] == sorted(reaches.values())
    wet = Bench(
        target_availability_percent=99.99,
        wanted_margin_db=3.0,
        climate=replace(bench.judged.climate, rain_rate_001_mm_h=90.0),
    )
    harder = Bench(target_availability_percent=99.999, wanted_margin_db=3.0)
    for other in (wet, harder):
        row = other.compare(("dish 0.6 m",), reach=True).rows[0]
        assert row.reach.distance_m < reaches["dish 0.6 m"]
    row = wet.compare(("dish 0.6 m",), reach=True).rows[0]
    assert row.reach.limited_by == "rain"


def test_the_timing_of_a_radio_ends_reach():
    radio = replace(ELEVEN, greatest_distance_m=7000.0)
    row = Bench(radio=radio).compare(("dish 1.2 m",), reach=True).rows[0]
    assert (row.reach.distance_m, row.reach.limited_by) == (7000.0, "timing")


def test_far_beyond_and_nowhere_are_said():
    strong = replace(FIVE, power_dbm=60.0)
    row = Bench(radio=strong).compare(("dish 1.8 m",), reach=True).rows[0]
    assert (row.reach.distance_m, row.reach.limited_by) == (REACH_M[-1], "beyond")
    weak = replace(FIVE, power_dbm=-80.0)
    row = Bench(radio=weak).compare(("dish 0.3 m",), reach=True).rows[0]
    assert row.reach.distance_m is None
    assert row.reach.limited_by == "margin"


def test_needed_margin_meets_the_target_and_a_hair_less_does_not():
    bench = Bench(target_availability_percent=99.99)
    link, here = bench.link, bench.way(bench.link)
    row = bench.compare(("dish 0.6 m",)).rows[0]
    assert row.spare_db is not None
    antennas = antennas_of(link, bearings_deg=here.bearings_deg, tilts_deg=here.tilts_deg)
    fading = fading_over(link, here.path, frequency_hz=11e9, antennas=antennas, weather=bench.judged.weather)
    receiver = wanted_receiver(link.radio, link.antenna_b, discrimination_db=25.0, gain_dbi=38.0, line_loss_db=0.0)
    assert receiver is not None
    for target in (99.0, 99.9, 99.99, 99.999):
        need = needed_margin_db(fading, receiver, target_percent=target)
        outage = np.asarray(fading.outage(np.array([need, need - 2e-4]), receiver)[0].total_percent)
        assert outage[0] <= 100.0 - target < outage[1]
        rough = needed_margin_db(fading, receiver, target_percent=target, exact=False)
        assert rough == pytest.approx(need, abs=0.01)
    assert needed_margin_db(fading, receiver, target_percent=100.0 - 1e-13) is None
    assert MOST_DB == 100.0
