"""Gases against the validation rows that ITU-R Study Group 3 publishes for Rec. ITU-R P.676-12, and two libraries.

itur 0.4.0 has the same edition; our line tables were transcribed from it, so it proves the formulas, not the tables.
pycraf 2.1 has its own tables: those of P.676-10, whose oxygen lines are the same and whose vapour lines are older. The
published rows prove both.
"""

import warnings

import numpy as np
import pytest

from fellspan.propagation import (
    dry_pressure_hpa,
    gas_attenuation_db_per_km,
    gas_attenuation_parts_db_per_km,
    standard_air,
)

ATMOSPHERES = [
    # dry pressure hPa, K, g/m3
    (1013.25, 288.15, 7.5),
    (1003.277, 288.15, 7.5),
    (1005.0, 303.15, 22.0),
    (980.0, 263.15, 1.5),
    (700.0, 275.0, 4.0),
]
FREQUENCIES_GHZ = np.concatenate((np.arange(1.0, 100.01, 0.5), np.arange(50.0, 70.0, 0.05), [22.235, 60.306]))


@pytest.mark.parametrize(
    ("ghz", "oxygen", "vapour"),
    [
        (12, 0.008698264, 0.009535388),
        (20, 0.01188355, 0.097047305),
        (60, 14.6234748, 0.154841841),
        (90, 0.038869711, 0.341973394),
    ],
)
def test_published_rows(ghz: float, oxygen: float, vapour: float) -> None:
    # Published table, Study Group 3; 1013.25 hPa taken as dry pressure. Half a unit of its last digit.
    parts = gas_attenuation_parts_db_per_km(ghz * 1e9, dry_pressure_hpa=1013.25, temperature_k=288.15, vapour_g_m3=7.5)
    assert parts == pytest.approx((oxygen, vapour), rel=6e-8)


@pytest.mark.parametrize(
    ("ghz", "total", "within"),
    [
        (2.4, 0.007196, 6e-7),
        (5.8, 0.009299, 6e-7),
        (10, 0.014199, 6e-7),
        (18, 0.057513, 6e-7),
        (23, 0.194289, 6e-7),
        (38, 0.116615, 6e-7),
        (57, 10.206, 6e-4),
        (64, 7.020, 6e-4),
        (70, 0.5140, 6e-5),
        (80, 0.342368, 6e-7),
    ],
)
def test_values_computed_with_itur(ghz: float, total: float, within: float) -> None:
    # Computed with itur 0.4.0, same air; half a unit of the last digit noted.
    value = gas_attenuation_db_per_km(ghz * 1e9, dry_pressure_hpa=1013.25, temperature_k=288.15, vapour_g_m3=7.5)
    assert value == pytest.approx(total, abs=within)


def test_total_pressure_is_another_matter() -> None:
    # 1013.25 hPa as total pressure: 14.502 + 0.1536 dB/km at 60 GHz, computed with itur 0.4.0.
    dry = dry_pressure_hpa(1013.25, temperature_k=288.15, vapour_g_m3=7.5)
    assert dry == pytest.approx(1013.25 - 9.9729, abs=1e-4)
    parts = gas_attenuation_parts_db_per_km(60e9, dry_pressure_hpa=dry, temperature_k=288.15, vapour_g_m3=7.5)
    assert parts[0] == pytest.approx(14.502, abs=6e-4)
    assert parts[1] == pytest.approx(0.1536, abs=6e-5)


@pytest.mark.parametrize(("dry_hpa", "kelvin", "vapour"), ATMOSPHERES)
def test_five_atmospheres_against_itur(dry_hpa: float, kelvin: float, vapour: float) -> None:
    from itur.models import itu676

    assert itu676.get_version() == 12
    ours = gas_attenuation_parts_db_per_km(
        FREQUENCIES_GHZ * 1e9, dry_pressure_hpa=dry_hpa, temperature_k=kelvin, vapour_g_m3=vapour
    )
    for part, function in zip(ours, (itu676.gamma0_exact, itu676.gammaw_exact), strict=True):
        theirs = function(FREQUENCIES_GHZ, dry_hpa, vapour, kelvin).value
        # Same formula, other order of operations. The requirement is 0.5 %.
        np.testing.assert_allclose(part, theirs, rtol=1e-11)


@pytest.mark.parametrize(("dry_hpa", "kelvin", "vapour"), ATMOSPHERES)
def test_oxygen_against_pycraf(dry_hpa: float, kelvin: float, vapour: float) -> None:
    with warnings.catch_warnings():
        # pycraf pulls in astropy's own test runner, which deprecates itself.
        warnings.filterwarnings("ignore", message="The TestRunner")
        import astropy.units as units
        from pycraf import atm
    vapour_hpa = vapour * kelvin / 216.7
    theirs, _ = atm.atten_specific_annex1(
        FREQUENCIES_GHZ * units.GHz, dry_hpa * units.hPa, vapour_hpa * units.hPa, kelvin * units.K
    )
    ours, _ = gas_attenuation_parts_db_per_km(
        FREQUENCIES_GHZ * 1e9, dry_pressure_hpa=dry_hpa, temperature_k=kelvin, vapour_g_m3=vapour
    )
    # Tables transcribed by others, independently of ours.
    np.testing.assert_allclose(ours, theirs.value, rtol=1e-11)


@pytest.mark.parametrize("height_m", [0.0, 250.0, 1000.0, 2500.0, 5000.0, 10_000.0])
def test_reference_air_against_itur(height_m: float) -> None:
    from itur.models import itu835

    air = standard_air(height_m)
    assert air.temperature_k == pytest.approx(float(itu835.standard_temperature(height_m / 1000).value), rel=1e-9)
    assert air.total_pressure_hpa == pytest.approx(float(itu835.standard_pressure(height_m / 1000).value), rel=1e-9)
    assert air.vapour_g_m3 == pytest.approx(
        float(itu835.standard_water_vapour_density(height_m / 1000).value), rel=1e-9
    )
