"""Rain coefficients against the table printed in Rec. ITU-R P.838-3, a row published for validation, and itur 0.4.0."""

import numpy as np
import pytest

from fellspan.propagation import rain_attenuation_db_per_km, rain_coefficients

TABLE_5 = [
    # GHz, kH, alphaH, kV, alphaV as printed, to four or five digits
    (6, 0.0007056, 1.5900, 0.0004878, 1.5728),
    (10, 0.01217, 1.2571, 0.01129, 1.2156),
    (11, 0.01772, 1.2140, 0.01731, 1.1617),
    (18, 0.07078, 1.0818, 0.07708, 1.0025),
    (23, 0.1286, 1.0214, 0.1284, 0.9630),
    (38, 0.4001, 0.8816, 0.3844, 0.8552),
]


@pytest.mark.parametrize(("ghz", "k_h", "alpha_h", "k_v", "alpha_v"), TABLE_5)
def test_printed_table(ghz: float, k_h: float, alpha_h: float, k_v: float, alpha_v: float) -> None:
    # Printed digits alone allow 0.04 %.
    assert rain_coefficients(ghz * 1e9, polarization="horizontal") == pytest.approx((k_h, alpha_h), rel=5e-4)
    assert rain_coefficients(ghz * 1e9, polarization="vertical") == pytest.approx((k_v, alpha_v), rel=5e-4)


def test_row_published_for_validation() -> None:
    # Study Group 3: 14.25 GHz, elevation 31.077 degrees, tilt 0, 26.48052 mm/h.
    found = rain_coefficients(14.25e9, tilt_deg=0.0, elevation_deg=31.077)
    assert found == pytest.approx((0.03975488, 1.12418043), rel=2e-7)
    gamma = rain_attenuation_db_per_km(26.48052, frequency_hz=14.25e9, tilt_deg=0.0, elevation_deg=31.077)
    assert gamma == pytest.approx(1.58130839, rel=1e-8)


def test_values_computed_with_itur() -> None:
    # Computed with itur 0.4.0, six digits noted.
    assert rain_coefficients(60e9, polarization="horizontal") == pytest.approx((0.860613, 0.76563), rel=1e-5)
    assert rain_coefficients(80e9, polarization="vertical") == pytest.approx((1.16683, 0.70208), rel=1e-5)
    assert rain_attenuation_db_per_km(30.0, frequency_hz=11e9, polarization="vertical") == pytest.approx(
        0.89993, abs=6e-6
    )


@pytest.mark.parametrize(("tilt_deg", "elevation_deg"), [(0, 0), (90, 0), (45, 0), (30, 12), (72, 40)])
def test_every_tilt_against_itur(tilt_deg: float, elevation_deg: float) -> None:
    from itur.models.itu838 import rain_specific_attenuation_coefficients

    ghz = np.geomspace(1.0, 1000.0, 61)
    k, alpha = rain_coefficients(ghz * 1e9, tilt_deg=tilt_deg, elevation_deg=elevation_deg)
    theirs = np.array([rain_specific_attenuation_coefficients(f, elevation_deg, tilt_deg) for f in ghz], dtype=float)
    np.testing.assert_allclose(k, theirs[:, 0], rtol=1e-10)
    np.testing.assert_allclose(alpha, theirs[:, 1], rtol=1e-10)
