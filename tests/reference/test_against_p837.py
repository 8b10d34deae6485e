"""Rain rate against values worked by hand from Rec. ITU-R P.837-8, Annex 1, and against itur 0.4.0.

itur has P.837-7: the same equations on its own maps. Its monthly figures are fed to ours.
"""

import numpy as np
import pytest

from fellspan.propagation import (
    rain_probability_percent,
    rain_rate_mm_h,
    rain_rate_percent,
    zone_rain_rate_001_mm_h,
)

EVEN = {"monthly_rain_mm": [60.0] * 12, "monthly_temperature_c": [10.0] * 12}


def test_even_year() -> None:
    # By hand: 60 mm and 10 degrees in every month.
    assert rain_probability_percent([60.0] * 12, monthly_temperature_c=[10.0] * 12) == pytest.approx(5.78249, abs=6e-6)
    rates = rain_rate_mm_h([0.001, 0.01, 0.1, 1.0], **EVEN)
    assert rates == pytest.approx([58.31, 25.56, 9.205, 2.106], rel=2.5e-4)


@pytest.mark.parametrize(
    ("latitude", "longitude"), [(51.5, -0.14), (1.35, 103.8), (25.8, -80.2), (68.0, 20.0), (-30.0, 25.0)]
)
def test_against_itur_on_its_own_figures(latitude: float, longitude: float) -> None:
    from itur.models import itu837
    from itur.models.itu1510 import surface_month_mean_temperature

    model = itu837._ITU837_7()
    lat, lon = np.array([latitude]), np.array([longitude])
    rain = np.array([float(model.Mt(lat, lon, month)[0]) for month in range(1, 13)])
    kelvin = np.array(
        [float(np.ravel(surface_month_mean_temperature(latitude, longitude, month).value)[0]) for month in range(1, 13)]
    )
    year = {"monthly_rain_mm": rain, "monthly_temperature_c": kelvin - 273.15}
    assert rain_probability_percent(rain, monthly_temperature_c=kelvin - 273.15) == pytest.approx(
        float(itu837.rainfall_probability(latitude, longitude).value), rel=1e-9
    )
    for percent in (0.001, 0.1, 1.0):
        theirs = float(itu837.rainfall_rate(latitude, longitude, percent).value)
        # Its bisection stops at 1e-5 mm/h.
        assert rain_rate_mm_h(percent, **year) == pytest.approx(theirs, abs=2e-5)
    # Its value at 0.01 % comes from a map that was interpolated after the equations; ours before.
    assert rain_rate_mm_h(0.01, **year) == pytest.approx(
        float(itu837.rainfall_rate(latitude, longitude, 0.01).value), rel=0.03
    )


def test_percentage_for_a_rate() -> None:
    assert rain_rate_percent([25.56, 9.205], **EVEN) == pytest.approx([0.01, 0.1], rel=1e-3)  # by hand, the same year


def test_zones() -> None:
    # Rec. ITU-R P.837-1, as two programs hold it.
    letters = "ABCDEFGHJKLMNPQ"
    rates = [8, 12, 15, 19, 22, 28, 30, 32, 35, 42, 60, 63, 95, 145, 115]
    assert [zone_rain_rate_001_mm_h(letter) for letter in letters] == rates
