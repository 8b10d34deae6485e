"""Rain rate from months or zones: inverse, limits, shapes, mistakes."""

import math

import numpy as np
import pytest

from fellspan.errors import QuantityError
from fellspan.propagation import (
    rain_probability_percent,
    rain_rate_mm_h,
    rain_rate_percent,
    zone_rain_rate_001_mm_h,
)

RAIN = np.array([80, 60, 55, 40, 30, 20, 0, 5, 25, 70, 90, 95.0])
WARM = np.array([-4, -2, 3, 8, 13, 18, 22, 21, 16, 9, 3, -1.0])
YEAR = {"monthly_rain_mm": RAIN, "monthly_temperature_c": WARM}


def test_rate_and_percentage_are_inverses() -> None:
    percent = np.geomspace(1e-5, 0.99 * rain_probability_percent(RAIN, monthly_temperature_c=WARM), 60)
    rate = rain_rate_mm_h(percent, **YEAR)
    assert np.all(np.diff(rate) < 0.0)
    np.testing.assert_allclose(rain_rate_percent(rate, **YEAR), percent, rtol=1e-10)


def test_limits() -> None:
    total = rain_probability_percent(RAIN, monthly_temperature_c=WARM)
    assert rain_rate_percent(0.0, **YEAR) == pytest.approx(total, rel=1e-14)
    assert rain_rate_mm_h(1.001 * total, **YEAR) == 0.0
    desert = {"monthly_rain_mm": np.zeros(12), "monthly_temperature_c": WARM}
    assert rain_rate_mm_h(0.01, **desert) == 0.0
    assert rain_rate_percent(1.0, **desert) == 0.0


def test_a_month_cannot_rain_all_the_time() -> None:
    # 2000 mm in a cold month would be more than 100 % of it at the typical rate: 70 % is the cap, and the rate grows instead.
    assert rain_probability_percent(np.full(12, 2000.0), monthly_temperature_c=np.zeros(12)) == pytest.approx(
        70.0, rel=1e-12
    )


def test_frost_counts_as_zero_degrees() -> None:
    cold, freezing = (
        rain_rate_mm_h(0.01, monthly_rain_mm=RAIN, monthly_temperature_c=np.full(12, t)) for t in (-30.0, 0.0)
    )
    assert cold == freezing


def test_arrays_equal_scalars() -> None:
    places = {"monthly_rain_mm": np.stack((RAIN, 2 * RAIN)), "monthly_temperature_c": WARM}
    percent = np.array([[0.01], [0.1], [1.0]])
    rates = rain_rate_mm_h(percent, **places)
    assert rates.shape == (3, 2)
    for i in range(3):
        for j in range(2):
            one = rain_rate_mm_h(
                float(percent[i, 0]), monthly_rain_mm=places["monthly_rain_mm"][j], monthly_temperature_c=WARM
            )
            assert type(one) is float
            assert rates[i, j] == pytest.approx(one, rel=1e-12)


def test_undefined_values() -> None:
    assert math.isnan(rain_rate_mm_h(0.0, **YEAR))
    assert math.isnan(rain_rate_mm_h(0.01, monthly_rain_mm=-RAIN, monthly_temperature_c=WARM))
    assert math.isnan(
        rain_rate_mm_h(0.01, monthly_rain_mm=RAIN, monthly_temperature_c=np.where(WARM > 20, math.nan, WARM))
    )
    assert math.isnan(rain_rate_percent(-1.0, **YEAR))


def test_mistakes_are_refused() -> None:
    with pytest.raises(QuantityError, match="11 monthly values of rain"):
        rain_rate_mm_h(0.01, monthly_rain_mm=RAIN[:11], monthly_temperature_c=WARM)
    with pytest.raises(QuantityError, match="1 monthly values of temperature"):
        rain_probability_percent(RAIN, monthly_temperature_c=10.0)
    with pytest.raises(QuantityError, match="'I'"):
        zone_rain_rate_001_mm_h("I")
    assert zone_rain_rate_001_mm_h(" k ") == 42.0
