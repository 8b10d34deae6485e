"""Comparing many pairs costs a fraction of planning each: the path is worked out once for all of them."""

import time
from dataclasses import replace

import pytest
from made_benches import ELEVEN, Bench

from fellspan.design.offers import Offer
from fellspan.links.site import Antenna

pytestmark = pytest.mark.bench


def test_fifty_antennas_by_five_radios_cost_a_fraction_of_planning_each() -> None:
    bench = Bench(target_availability_percent=99.99)
    offers = tuple(
        Offer(name=f"{gain}", antenna=Antenna(name=f"{gain}", gain_dbi=float(gain))) for gain in range(10, 60)
    )
    radios = tuple(replace(ELEVEN, name=f"radio {number}", power_dbm=10.0 + number) for number in range(5))
    bench.compare(offers=offers[:2])
    bench.planned("dish 0.6 m", ELEVEN)
    started = time.process_time()
    assert len(bench.compare((), *radios, offers=offers).rows) == 250
    compared_s = time.process_time() - started
    started = time.process_time()
    for _ in range(25):
        bench.planned("dish 0.6 m", ELEVEN)
    planned_s = 10.0 * (time.process_time() - started)
    print(f"250 pairs compared: {compared_s:.2f} s; planned one by one: {planned_s:.2f} s")
    assert compared_s < 0.2 * planned_s
