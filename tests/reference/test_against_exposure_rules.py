"""Exposure limits against 47 CFR 1.1310, table 1 (rule text), and ICNIRP 2020 (as two programs hold it); distances by hand.

The dish model is from memory of FCC OET Bulletin 65 and is held only to a calculation by hand of the same formulas.
"""

import math

import pytest

from fellspan.propagation import (
    dish_density_w_m2,
    dish_surface_density_w_m2,
    distance_to_limit_m,
    exposure_limit_w_m2,
    power_density_w_m2,
)


@pytest.mark.parametrize(
    ("mhz", "public_mw_cm2", "occupational_mw_cm2"),
    [
        (1, 100, 100),
        (10, 1.8, 9),
        (100, 0.2, 1),
        (300, 0.2, 1),
        (900, 0.6, 3),
        (1500, 1, 5),
        (5800, 1, 5),
        (80e3, 1, 5),
    ],
)
def test_fcc_table(mhz: float, public_mw_cm2: float, occupational_mw_cm2: float) -> None:
    # 1 mW/cm2 is 10 W/m2; f/1500 and f/300 between 300 and 1500 MHz.
    ask = {"frequency_hz": mhz * 1e6, "rule": "fcc-1.1310"}
    assert exposure_limit_w_m2(**ask) == pytest.approx(10 * public_mw_cm2, rel=1e-12)
    assert exposure_limit_w_m2(**ask, group="occupational") == pytest.approx(10 * occupational_mw_cm2, rel=1e-12)


@pytest.mark.parametrize(
    ("mhz", "public", "occupational", "public_local", "occupational_local"),
    [
        (100, 2, 10, 10, 50),
        (900, 4.5, 22.5, 0.058 * 900**0.86, 0.29 * 900**0.86),
        (5000, 10, 50, 40, 200),
        (60e3, 10, 50, 26.65, 133.23),
    ],
)
def test_icnirp_table(
    mhz: float, public: float, occupational: float, public_local: float, occupational_local: float
) -> None:
    # 26.65 W/m2 at 60 GHz by hand; five times that for trained people.
    ask = {"frequency_hz": mhz * 1e6, "rule": "icnirp-2020"}
    assert exposure_limit_w_m2(**ask) == pytest.approx(public, rel=1e-12)
    assert exposure_limit_w_m2(**ask, group="occupational") == pytest.approx(occupational, rel=1e-12)
    assert exposure_limit_w_m2(**ask, body="local") == pytest.approx(public_local, abs=6e-3)
    assert exposure_limit_w_m2(**ask, body="local", group="occupational") == pytest.approx(occupational_local, abs=6e-3)


@pytest.mark.parametrize(
    ("eirp_dbm", "distance_m", "within"), [(36, 0.178, 6e-4), (48, 0.709, 6e-4), (53, 1.26, 6e-3), (82, 35.5, 0.06)]
)
def test_distance_to_ten_watts_a_square_metre(eirp_dbm: float, distance_m: float, within: float) -> None:
    found = distance_to_limit_m(eirp_dbm=eirp_dbm, limit_w_m2=10.0)
    assert found == pytest.approx(distance_m, abs=within)  # by hand
    assert power_density_w_m2(found, eirp_dbm=eirp_dbm) == pytest.approx(10.0, rel=1e-12)


def test_dish() -> None:
    # By hand: 0.2 W, 0.6 m, efficiency 0.55, 5.8 GHz.
    dish = {"power_w": 0.2, "diameter_m": 0.6, "aperture_efficiency": 0.55, "frequency_hz": 5.8e9}
    assert dish_surface_density_w_m2(power_w=0.2, diameter_m=0.6) == pytest.approx(2.829, abs=6e-4)
    assert dish_density_w_m2([0.0, 1.0, 1.741], **dish) == pytest.approx(1.556, abs=6e-4)
    # The far field starts at 4.179 m, with a gain of 0.55 (pi 0.6 / 0.051688)^2 = 731.44.
    assert dish_density_w_m2(4.180, **dish) == pytest.approx(0.2 * 731.44 / (4 * math.pi * 4.18**2), abs=6e-4)
    assert dish_density_w_m2(4.178, **dish) == pytest.approx(1.556 * 1.741 / 4.178, abs=6e-4)
