"""Against the law of Rec. ITU-R P.841 as P.530-19, equation (24), applies it, and the older form of P.2001-6 (B.7)."""

import numpy as np
import pytest

from fellspan.propagation import (
    annual_from_worst_month_geographic_percent,
    annual_from_worst_month_percent,
    geographic_correction_db,
    worst_month_from_annual_percent,
)


@pytest.mark.parametrize(("worst", "annual"), [(0.01, 0.0015078), (0.1, 0.021270), (1.0, 0.30005), (3.0, 1.06073)])
def test_power_law(worst: float, annual: float) -> None:
    # By hand: p = (pw / 2.85)^(1/0.87), five digits.
    assert annual_from_worst_month_percent(worst) == pytest.approx(annual, rel=2e-5)
    assert worst_month_from_annual_percent(annual) == pytest.approx(worst, rel=2e-5)


@pytest.mark.parametrize("worst", [0.001, 0.01, 0.1, 1.0])
def test_power_law_as_p841_rounds_it(worst: float) -> None:
    # P.841 prints p = 0.30 pw^1.15, rounded: within 1 % over this span.
    assert annual_from_worst_month_percent(worst) == pytest.approx(0.30 * worst**1.15, rel=0.01)


def test_ends_of_the_span() -> None:
    # (2.85/12)^(1/0.13) = 1.58e-5 % of the year is where twelve months hold what one does, 1.9e-4 % of the worst month.
    assert worst_month_from_annual_percent(1.58e-5) == pytest.approx(12 * 1.58e-5, rel=1e-3)
    # Below it: our rule, no source, holds the ratio at twelve.
    assert annual_from_worst_month_percent(1.2e-6) == pytest.approx(1e-7, rel=1e-12)
    assert worst_month_from_annual_percent(1e-7) == pytest.approx(1.2e-6, rel=1e-12)
    assert worst_month_from_annual_percent(3.0) == pytest.approx(7.4, abs=0.02)
    # A lost month is a lost year: our rule, no source.
    assert annual_from_worst_month_percent(100.0) == 100.0
    assert annual_from_worst_month_percent(0.0) == 0.0


def test_both_ways_round() -> None:
    annual = np.logspace(-9, 0.4, 200)
    back = annual_from_worst_month_percent(worst_month_from_annual_percent(annual))
    np.testing.assert_allclose(back, annual, rtol=1e-12)


# latitude, km, slope mrad -> DeltaG dB; by hand from (B.7).
GEOGRAPHIC = [
    (50, 40, 1.25, 7.2965),
    (0, 40, 1.25, 4.9687),
    (30, 50, 0.0, 4.6001),
    (60, 30, 3.3, 9.3514),
    (70, 10, 10.0, 10.8),
]


@pytest.mark.parametrize(("latitude", "km", "slope", "correction"), GEOGRAPHIC)
def test_geographic_form(latitude: float, km: float, slope: float, correction: float) -> None:
    for sign in (1, -1):
        found = geographic_correction_db(km * 1e3, latitude_deg=sign * latitude, inclination_mrad=slope)
        assert found == pytest.approx(correction, abs=6e-5)


def test_the_two_forms_differ_as_known() -> None:
    # Hand calculation for 0.1 % of the worst month at latitude 50, 40 km, 1.25 mrad: 0.0186 against 0.0213 %.
    older = annual_from_worst_month_geographic_percent(0.1, distance_m=40e3, latitude_deg=50.0, inclination_mrad=1.25)
    assert older == pytest.approx(0.0186, abs=6e-5)
    assert annual_from_worst_month_percent(0.1) == pytest.approx(0.0213, abs=6e-5)
