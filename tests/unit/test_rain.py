"""Rain: limits, monotony, inverse, editions and readings, undefined values, mistakes."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fellspan.errors import QuantityError
from fellspan.propagation import (
    horizontal_from_vertical_rain_db,
    precipitation_regime,
    rain_attenuation_db_per_km,
    rain_coefficients,
    rain_events_per_year,
    rain_height_m,
    rain_loss_001_db,
    rain_loss_at_frequency_db,
    rain_loss_db,
    rain_path_factor,
    rain_percent,
    vertical_from_horizontal_rain_db,
    wet_snow_multiplier,
)

seeded = settings(derandomize=True, deadline=None)
PATH = {"rain_rate_001_mm_h": 40.0, "frequency_hz": 18e9, "polarization": "horizontal"}
frequencies = st.floats(6e9, 175e9)


@pytest.mark.parametrize("edition", ["19", "17"])
def test_no_rain_no_loss(edition: str) -> None:
    assert rain_attenuation_db_per_km(0.0, frequency_hz=18e9, polarization="vertical") == 0.0
    dry = rain_loss_001_db(12e3, rain_rate_001_mm_h=0.0, frequency_hz=18e9, polarization="vertical", edition=edition)
    assert dry == 0.0
    assert rain_loss_db(dry, percent=0.001, frequency_hz=18e9) == 0.0
    assert rain_percent(10.0, loss_001_db=dry, frequency_hz=18e9) == 0.0
    assert rain_loss_001_db(0.0, **PATH, edition=edition) == 0.0


@pytest.mark.parametrize(("edition", "longest_m"), [("19", 60e3), ("17", 25e3)])
def test_longer_paths_and_heavier_rain_lose_more(edition: str, longest_m: float) -> None:
    # Edition 17 has no bounds: on longer paths with light rain its path factor falls faster than the rain grows.
    distance = np.linspace(0.0, longest_m, 241)[:, None]
    rain = np.geomspace(3.0, 250.0, 60)
    for frequency_hz in (7e9, 18e9, 80e9):
        loss = rain_loss_001_db(
            distance, rain_rate_001_mm_h=rain, frequency_hz=frequency_hz, polarization="vertical", edition=edition
        )
        assert loss.shape == (241, 60)
        assert np.all(np.diff(loss[1:], axis=1) > 0.0)
        assert np.all(np.diff(loss, axis=0) > 0.0)


def test_heavier_rain_seems_lighter_by_less_than_a_tenth_of_a_decibel_at_low_frequencies() -> None:
    # As printed: the methods page says so.
    rain, distance = np.geomspace(0.5, 250.0, 400), np.linspace(1e3, 60e3, 60)[:, None]
    for frequency_hz in (1.5e9, 2.2e9, 3e9, 5e9, 6e9):
        loss = rain_loss_001_db(distance, rain_rate_001_mm_h=rain, frequency_hz=frequency_hz, polarization="vertical")
        assert np.max(np.maximum.accumulate(loss, axis=1) - loss) < 0.1


def test_the_path_factor_stays_positive() -> None:
    frequency = np.geomspace(1e9, 175e9, 60)[:, None, None]
    _, alpha = rain_coefficients(frequency, polarization="horizontal")
    distance, rain = np.linspace(100.0, 100e3, 300)[:, None], np.geomspace(0.1, 250.0, 30)
    for edition in ("19", "17"):
        factor = rain_path_factor(
            distance, rain_rate_001_mm_h=rain, alpha=alpha, frequency_hz=frequency, edition=edition
        )
        assert np.all(factor > 0.0)
        if edition == "17":
            assert np.max(factor) == 2.5


def test_words_and_tilts_agree() -> None:
    for word, tilt in (("horizontal", 0.0), ("vertical", 90.0)):
        assert rain_coefficients(23e9, polarization=word) == rain_coefficients(23e9, tilt_deg=tilt)
    slant, other = (rain_coefficients(23e9, tilt_deg=tilt) for tilt in (45.0, -45.0))
    assert slant == other
    flat, steep = rain_coefficients(23e9, polarization="horizontal"), rain_coefficients(23e9, polarization="vertical")
    assert slant[0] == pytest.approx((flat[0] + steep[0]) / 2)
    both = rain_attenuation_db_per_km(30.0, frequency_hz=23e9, polarization=["horizontal", "vertical"])
    assert both[0] > both[1]


@seeded
@given(frequencies, st.floats(0.01, 200.0), st.floats(-3.3, 0.3), st.sampled_from(["A", "B"]))
def test_percentage_and_loss_are_inverses(frequency_hz: float, at_001: float, log_percent: float, reading: str) -> None:
    percent = 10.0**log_percent
    loss = rain_loss_db(at_001, percent=percent, frequency_hz=frequency_hz, reading=reading)
    back = rain_percent(loss, loss_001_db=at_001, frequency_hz=frequency_hz, reading=reading)
    assert back == pytest.approx(percent, rel=1e-9)


@pytest.mark.parametrize("reading", ["A", "B"])
def test_more_margin_never_means_more_outage(reading: str) -> None:
    loss = np.concatenate(([-5.0, 0.0], np.geomspace(1e-6, 1e4, 4000), [math.inf]))
    for frequency_hz in (6e9, 18e9, 80e9):
        percent = rain_percent(loss, loss_001_db=20.0, frequency_hz=frequency_hz, reading=reading)
        assert np.all(np.diff(percent) <= 0.0)
        assert percent[0] == percent[1] == 100.0
        # The law's turning point, an upper bound for whatever lies beyond.
        assert 1e-6 < percent[-1] < 2e-4
        one_by_one = [
            rain_percent(float(x), loss_001_db=20.0, frequency_hz=frequency_hz, reading=reading) for x in loss[::97]
        ]
        np.testing.assert_array_equal(percent[::97], one_by_one)


def test_readings_part_only_above_ten_gigahertz_and_away_from_a_hundredth() -> None:
    for frequency_hz, percent in ((9.9e9, 0.001), (10e9, 1.0)):
        a, b = (
            rain_loss_db(20.0, percent=percent, frequency_hz=frequency_hz, reading=reading) for reading in ("A", "B")
        )
        assert a == b
    low_a, low_b = (rain_loss_db(20.0, percent=0.001, frequency_hz=80e9, reading=reading) for reading in ("A", "B"))
    assert 1.0 - low_b / low_a == pytest.approx(0.031, abs=0.002)


def test_scaling_there_and_back() -> None:
    loss = np.linspace(0.0, 60.0, 13)
    np.testing.assert_allclose(
        horizontal_from_vertical_rain_db(vertical_from_horizontal_rain_db(loss)), loss, rtol=1e-12
    )
    np.testing.assert_array_equal(rain_loss_at_frequency_db(loss, from_hz=18e9, to_hz=18e9), loss)
    assert math.isnan(horizontal_from_vertical_rain_db(300.0))
    assert rain_events_per_year(0.0) == 0.0
    assert rain_events_per_year(0.1) > rain_events_per_year(0.01)


def test_undefined_values() -> None:
    assert math.isnan(rain_attenuation_db_per_km(-1.0, frequency_hz=18e9, polarization="vertical"))
    assert math.isnan(rain_attenuation_db_per_km(30.0, frequency_hz=0.0, polarization="vertical"))
    assert math.isnan(rain_loss_001_db(-1.0, **PATH))
    assert math.isnan(rain_loss_001_db(math.nan, **PATH))
    assert math.isnan(rain_loss_db(20.0, percent=0.0, frequency_hz=18e9))
    assert math.isnan(rain_percent(math.nan, loss_001_db=20.0, frequency_hz=18e9))
    assert math.isnan(rain_percent(10.0, loss_001_db=math.nan, frequency_hz=18e9))
    assert math.isnan(rain_percent(0.0, loss_001_db=20.0, frequency_hz=-1.0))
    assert math.isnan(wet_snow_multiplier(math.nan))


def test_mistakes_are_refused() -> None:
    with pytest.raises(QuantityError, match="'circular'"):
        rain_coefficients(18e9, polarization="circular")
    with pytest.raises(QuantityError, match="both"):
        rain_coefficients(18e9, polarization="vertical", tilt_deg=45.0)
    with pytest.raises(QuantityError, match="needs a polarization"):
        rain_coefficients(18e9)
    with pytest.raises(QuantityError, match="edition '18'"):
        rain_loss_001_db(1e3, **PATH, edition="18")  # type: ignore[arg-type]
    with pytest.raises(QuantityError, match="reading 'C'"):
        rain_loss_db(20.0, percent=0.1, frequency_hz=18e9, reading="C")  # type: ignore[arg-type]


def test_which_method_a_path_needs() -> None:
    top = rain_height_m(2640.0)
    assert top == 3000.0
    assert precipitation_regime(-600.0, -700.0, rain_height_m=top) == "rain"
    assert precipitation_regime(-600.0, -599.0, rain_height_m=top) == "combined"
    assert precipitation_regime(100.0, 1800.0, rain_height_m=top) == "combined"
    assert precipitation_regime(5400.0, 6000.0, rain_height_m=top) == "none"
    assert precipitation_regime(5399.0, 6000.0, rain_height_m=top) == "combined"
    many = precipitation_regime([0.0, 0.0], 50.0, rain_height_m=[5000.0, 3000.0])
    assert list(many) == ["rain", "combined"]
    with pytest.raises(QuantityError, match="not a number"):
        precipitation_regime(math.nan, 0.0, rain_height_m=3000.0)


def test_wet_snow_between_rain_and_nothing() -> None:
    assert wet_snow_multiplier([0.0, 500.0, -1201.0, -5000.0]) == pytest.approx([0.0, 0.0, 1.0, 1.0])
    assert 3.0 < np.max(wet_snow_multiplier(np.arange(-1200.0, 0.0, 5.0))) < 4.0
