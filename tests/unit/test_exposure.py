"""Exposure: the stricter rule, distances both ways, the dish model against its own far field, mistakes."""

import math

import numpy as np
import pytest

from fellspan.errors import QuantityError
from fellspan.propagation import (
    EXPOSURE_LIMITS,
    dish_density_w_m2,
    dish_distance_to_limit_m,
    dish_surface_density_w_m2,
    distance_to_limit_m,
    exposure_limit_w_m2,
    power_density_w_m2,
    source,
)

DISH = {"power_w": 0.2, "diameter_m": 0.6, "aperture_efficiency": 0.55, "frequency_hz": 5.8e9}


def test_the_stricter_rule_by_default() -> None:
    frequency = np.geomspace(30e6, 100e9, 200)
    stricter = exposure_limit_w_m2(frequency)
    each = [exposure_limit_w_m2(frequency, rule=rule) for rule in ("icnirp-2020", "fcc-1.1310")]
    np.testing.assert_array_equal(stricter, np.minimum(*each))
    assert exposure_limit_w_m2(900e6) == 4.5
    assert exposure_limit_w_m2(900e6, rule="fcc-1.1310") == pytest.approx(6.0)
    assert np.all(exposure_limit_w_m2(frequency, group="occupational") > stricter)


def test_where_one_rule_ends_the_other_goes_on() -> None:
    assert exposure_limit_w_m2(150e9) == 10.0
    assert math.isnan(exposure_limit_w_m2(150e9, rule="fcc-1.1310"))
    assert exposure_limit_w_m2(10e6) == pytest.approx(18.0)
    assert math.isnan(exposure_limit_w_m2(10e6, rule="icnirp-2020"))
    assert math.isnan(exposure_limit_w_m2(400e9))
    assert math.isnan(exposure_limit_w_m2(math.nan))
    assert math.isnan(exposure_limit_w_m2(5e9, body="local", rule="fcc-1.1310"))


def test_bands_meet() -> None:
    for one in EXPOSURE_LIMITS:
        for other in EXPOSURE_LIMITS:
            same = (one.rule, one.group, one.body) == (other.rule, other.group, other.body)
            if same and one.high_hz == other.low_hz:
                ends = [row.factor_w_m2 * (one.high_hz / 1e6) ** row.exponent for row in (one, other)]
                # The rules round their own joins: 1.34 MHz and 6 GHz are the coarsest.
                assert ends[0] == pytest.approx(ends[1], rel=0.005)


def test_distance_and_density_are_inverses() -> None:
    eirp = np.linspace(0.0, 90.0, 19)
    distance = distance_to_limit_m(eirp_dbm=eirp, limit_w_m2=10.0)
    np.testing.assert_allclose(power_density_w_m2(distance, eirp_dbm=eirp), 10.0, rtol=1e-12)
    assert np.all(np.diff(distance) > 0.0)
    assert distance_to_limit_m(eirp_dbm=-math.inf, limit_w_m2=10.0) == 0.0
    assert math.isnan(distance_to_limit_m(eirp_dbm=30.0, limit_w_m2=math.nan))
    assert math.isnan(power_density_w_m2(0.0, eirp_dbm=30.0))


def test_dish_joins_its_far_field() -> None:
    distance = np.linspace(0.0, 30.0, 3001)
    density = dish_density_w_m2(distance, **DISH)
    assert density[0] < dish_surface_density_w_m2(power_w=0.2, diameter_m=0.6)
    rising = np.diff(density) > 0.0
    assert np.count_nonzero(rising) == 1  # the step of 3 % where the far field starts
    assert np.max(np.diff(density)[rising] / density[:-1][rising]) < 0.03
    gain_dbi = 10 * math.log10(0.55 * (math.pi * 0.6 * 5.8e9 / 299792458) ** 2)
    eirp_dbm = 10 * math.log10(200.0) + gain_dbi
    assert density[-1] == pytest.approx(power_density_w_m2(30.0, eirp_dbm=eirp_dbm), rel=1e-12)


def test_beyond_the_dish_distance_the_limit_is_kept() -> None:
    distance = np.linspace(0.0, 60.0, 60_001)
    density = dish_density_w_m2(distance, **DISH)
    for limit in (2.0, 1.5, 0.66, 0.65, 0.64, 0.1, 0.01):
        edge = dish_distance_to_limit_m(limit_w_m2=limit, **DISH)
        assert np.all(density[distance > edge + 1e-3] <= limit)
        if edge:
            assert np.any(density[(distance > edge - 5e-3) & (distance <= edge)] >= limit * 0.99)
    assert dish_distance_to_limit_m(limit_w_m2=2.0, **DISH) == 0.0
    assert dish_distance_to_limit_m(limit_w_m2=[2.0, 0.01], **DISH)[0] == 0.0


def test_undefined_dishes() -> None:
    for wrong in ({"aperture_efficiency": 1.1}, {"diameter_m": 0.0}, {"power_w": -1.0}, {"frequency_hz": math.nan}):
        assert math.isnan(dish_density_w_m2(1.0, **(DISH | wrong)))
        assert math.isnan(dish_distance_to_limit_m(limit_w_m2=10.0, **(DISH | wrong)))
    assert dish_density_w_m2(1.0, **(DISH | {"power_w": 0.0})) == 0.0


def test_what_nobody_confirmed_is_marked() -> None:
    assert source("oet65-dish").status == "unconfirmed"
    assert "UNCONFIRMED" in (dish_density_w_m2.__doc__ or "")


@pytest.mark.parametrize("wrong", [{"group": "worker"}, {"rule": "icnirp"}, {"body": "head"}])
def test_mistakes_are_refused(wrong: dict[str, str]) -> None:
    with pytest.raises(QuantityError, match=next(iter(wrong.values()))):
        exposure_limit_w_m2(5.8e9, **wrong)  # type: ignore[arg-type]
