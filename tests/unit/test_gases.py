"""Gases: limits, shapes, undefined values, pressure and reference air."""

import math

import numpy as np
import pytest

from fellspan.propagation import (
    dry_pressure_hpa,
    gas_attenuation_db_per_km,
    gas_attenuation_parts_db_per_km,
    gas_loss_db,
    out_of_range,
    standard_air,
)
from fellspan.propagation.gas_lines import OXYGEN_LINES, VAPOUR_LINES

AIR = {"dry_pressure_hpa": 1003.277, "temperature_k": 288.15, "vapour_g_m3": 7.5}


def test_line_tables_are_whole() -> None:
    assert (len(OXYGEN_LINES), len(VAPOUR_LINES)) == (44, 35)
    for table in (OXYGEN_LINES, VAPOUR_LINES):
        centres = [row[0] for row in table]
        assert centres == sorted(centres)
        assert {len(row) for row in table} == {7}


def test_no_air_no_loss() -> None:
    vacuum = {"dry_pressure_hpa": 0.0, "temperature_k": 288.15, "vapour_g_m3": 0.0}
    assert gas_attenuation_parts_db_per_km(60e9, **vacuum) == (0.0, 0.0)
    oxygen, vapour = gas_attenuation_parts_db_per_km(
        22.235e9, dry_pressure_hpa=1013.25, temperature_k=288.15, vapour_g_m3=0.0
    )
    assert oxygen > 0.0
    assert vapour == 0.0


def test_loss_is_by_the_kilometre() -> None:
    specific = gas_attenuation_db_per_km(23e9, **AIR)
    assert gas_loss_db(12_500.0, frequency_hz=23e9, **AIR) == pytest.approx(12.5 * specific, rel=1e-14)
    assert gas_loss_db(0.0, frequency_hz=23e9, **AIR) == 0.0
    assert math.isnan(gas_loss_db(-1.0, frequency_hz=23e9, **AIR))


def test_arrays_equal_scalars_whatever_their_length() -> None:
    frequency = np.linspace(1e9, 100e9, 9000).reshape(3, 1, 3000)
    vapour = np.array([0.0, 20.0])[:, None]
    whole = gas_attenuation_db_per_km(frequency, dry_pressure_hpa=950.0, temperature_k=280.0, vapour_g_m3=vapour)
    assert whole.shape == (3, 2, 3000)
    pieces = [
        gas_attenuation_db_per_km(
            frequency[..., start : start + 500], dry_pressure_hpa=950.0, temperature_k=280.0, vapour_g_m3=vapour
        )
        for start in range(0, 3000, 500)
    ]
    np.testing.assert_allclose(whole, np.concatenate(pieces, axis=-1), rtol=1e-13)
    for place in ((0, 0, 0), (1, 1, 1500), (2, 1, 2999)):
        one = gas_attenuation_db_per_km(
            float(frequency[place[0], 0, place[2]]),
            dry_pressure_hpa=950.0,
            temperature_k=280.0,
            vapour_g_m3=float(vapour[place[1], 0]),
        )
        assert type(one) is float
        assert whole[place] == pytest.approx(one, rel=1e-13)


@pytest.mark.parametrize(
    "wrong", [{"dry_pressure_hpa": -1.0}, {"temperature_k": 0.0}, {"vapour_g_m3": -0.1}, {"temperature_k": math.nan}]
)
def test_undefined_air(wrong: dict[str, float]) -> None:
    assert math.isnan(gas_attenuation_db_per_km(10e9, **(AIR | wrong)))
    assert math.isnan(gas_attenuation_db_per_km(0.0, **AIR))


def test_more_vapour_more_loss() -> None:
    loss = gas_attenuation_db_per_km(
        23e9, dry_pressure_hpa=1000.0, temperature_k=290.0, vapour_g_m3=np.linspace(0, 30, 31)
    )
    assert np.all(np.diff(loss) > 0.0)


def test_reference_air() -> None:
    sea = standard_air(0.0)
    assert sea.temperature_k == 288.15
    assert sea.total_pressure_hpa == 1013.25
    assert sea.dry_pressure_hpa == pytest.approx(1013.25 - 7.5 * 288.15 / 216.7, rel=1e-14)
    up = standard_air([0.0, 1000.0, 3000.0], vapour_sea_level_g_m3=10.0)
    assert np.all(np.diff(up.total_pressure_hpa) < 0)
    assert up.vapour_g_m3 == pytest.approx([10.0, 10 * math.exp(-0.5), 10 * math.exp(-1.5)])
    assert dry_pressure_hpa(1000.0, temperature_k=300.0, vapour_g_m3=0.0) == 1000.0


def test_range_is_data() -> None:
    assert out_of_range("p676-12-gases", frequency_hz=60e9) == ()
    assert "0.9 GHz" in out_of_range("p676-12-gases", frequency_hz=0.9e9)[0]
