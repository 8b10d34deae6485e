"""Multipath functions: limits, directions of change, round trips, vectors equal to loops, undefined in and undefined out."""

import math
from collections.abc import Callable

import numpy as np
import pytest

from fellspan.errors import QuantityError
from fellspan.propagation import (
    annual_from_worst_month_percent,
    clear_air_cross_polar_outage_percent,
    diversity_improvement,
    diversity_outage_percent,
    enhancement_exceeded_percent,
    fade_exceeded_percent,
    fade_for_percent_db,
    frequency_correlation_squared,
    geographic_correction_db,
    multipath_activity,
    multipath_occurrence_detailed_percent,
    multipath_occurrence_percent,
    out_of_range,
    rain_cross_polar_outage_percent,
    selective_outage_percent,
    shorter_worst_period_factor,
    space_correlation_squared,
    tandem_outage_percent,
)

PATH = {"frequency_hz": 6e9, "a_amsl_m": 300.0, "b_amsl_m": 350.0}


def test_fading_falls_with_depth_and_grows_with_occurrence() -> None:
    fade = np.linspace(0.0, 70.0, 1401)[:, np.newaxis]
    occurrence = np.logspace(-10, math.log10(2000.0), 120)
    percent = np.asarray(fade_exceeded_percent(fade, occurrence_percent=occurrence))
    assert np.all(np.diff(percent, axis=0) < 0.0)
    assert np.all(np.diff(percent[1:], axis=1) > 0.0)
    assert percent.max() <= 100.0


def test_deep_and_shallow_meet_at_the_transition() -> None:
    for occurrence in (1e-6, 0.01, 1.0, 50.0, 1500.0):
        at = 25.0 + 1.2 * math.log10(occurrence)
        below = fade_exceeded_percent(at - 1e-9, occurrence_percent=occurrence)
        assert below == pytest.approx(float(fade_exceeded_percent(at, occurrence_percent=occurrence)), rel=1e-7)


def test_fade_for_a_percentage_is_the_inverse() -> None:
    occurrence = np.array([1e-5, 0.01, 1.0, 30.0, 800.0])[:, np.newaxis]
    percent = np.logspace(-7, 1.75, 60)
    fade = fade_for_percent_db(percent, occurrence_percent=occurrence)
    np.testing.assert_allclose(
        fade_exceeded_percent(fade, occurrence_percent=occurrence), np.broadcast_to(percent, (5, 60)), rtol=1e-9
    )


def test_ends_of_fading() -> None:
    assert fade_exceeded_percent(20.0, occurrence_percent=0.0) == 0.0
    assert fade_exceeded_percent(-0.1, occurrence_percent=0.0) == 100.0
    assert fade_exceeded_percent(-0.1, occurrence_percent=5.0) == 100.0
    assert fade_exceeded_percent(math.inf, occurrence_percent=5.0) == 0.0
    assert fade_exceeded_percent(1.0, occurrence_percent=1e-30) < 1e-28  # type: ignore[operator]
    assert fade_for_percent_db(0.01, occurrence_percent=0.0) == 0.0
    assert fade_for_percent_db(80.0, occurrence_percent=5.0) == pytest.approx(0.0, abs=1e-9)
    assert fade_for_percent_db(0.0, occurrence_percent=5.0) == math.inf


def test_undefined_stays_undefined() -> None:
    nan = math.nan
    assert math.isnan(float(fade_exceeded_percent(nan, occurrence_percent=5.0)))
    assert math.isnan(float(fade_exceeded_percent(nan, occurrence_percent=0.0)))
    assert math.isnan(float(fade_exceeded_percent(20.0, occurrence_percent=nan)))
    assert math.isnan(float(fade_exceeded_percent(20.0, occurrence_percent=-1.0)))
    assert math.isnan(float(fade_for_percent_db(nan, occurrence_percent=5.0)))
    assert math.isnan(float(fade_for_percent_db(-1.0, occurrence_percent=5.0)))
    assert math.isnan(float(annual_from_worst_month_percent(nan)))
    occurrence = multipath_occurrence_detailed_percent(
        [nan, -1.0, 20e3], dn1_n_per_km=[-200, -200, nan], terrain_roughness_m=40.0, **PATH
    )
    assert np.isnan(occurrence).all()


def test_occurrence_grows_with_length_and_frequency_and_not_with_direction() -> None:
    distance = np.linspace(5.1e3, 120e3, 200)
    level = {"a_amsl_m": 300.0, "b_amsl_m": 300.0, "dn1_n_per_km": -200.0, "terrain_roughness_m": 40.0}
    by_length = multipath_occurrence_detailed_percent(distance, frequency_hz=6e9, **level)
    assert np.all(np.diff(by_length) > 0.0)
    by_frequency = multipath_occurrence_detailed_percent(30e3, frequency_hz=np.linspace(1e9, 40e9, 100), **level)
    assert np.all(np.diff(by_frequency) > 0.0)
    there = multipath_occurrence_percent(40e3, mean_ground_amsl_m=150.0, log_k=-5.0, dn75=10.0, **PATH)
    back = multipath_occurrence_percent(
        40e3, frequency_hz=6e9, a_amsl_m=350.0, b_amsl_m=300.0, mean_ground_amsl_m=150.0, log_k=-5.0, dn75=10.0
    )
    assert there == back


_WITH_OCCURRENCE: dict[str, Callable[[np.ndarray, np.ndarray], object]] = {
    "fade": lambda p0, x: fade_exceeded_percent(x, occurrence_percent=p0),
    "inverse": lambda p0, x: fade_for_percent_db(x / 10.0, occurrence_percent=p0),
    "edition -19": lambda p0, x: multipath_occurrence_percent(
        x * 2e3, mean_ground_amsl_m=150.0, log_k=-5.0, dn75=p0 / 10, **PATH
    ),
    "selective": lambda p0, x: selective_outage_percent(
        p0, distance_m=x * 1e3, signature_width_hz=28e6, signature_depth_db=20.0
    ),
    "space": lambda p0, x: space_correlation_squared(x, distance_m=50e3, frequency_hz=6e9, occurrence_percent=p0),
    "frequency": lambda p0, x: frequency_correlation_squared(x * 1e7, frequency_hz=6e9, occurrence_percent=p0),
    "improvement": lambda p0, x: diversity_improvement(0.7, occurrence_percent=p0, fade_db=x),
    "diversity": lambda p0, x: diversity_outage_percent(
        0.01, selective_percent=0.02, correlation_squared=x / 40, improvement=20.0, occurrence_percent=p0
    ),
    "clear-air cross-polar": lambda p0, x: clear_air_cross_polar_outage_percent(
        p0, antenna_discrimination_db=x, required_ratio_db=24.0
    ),
    "rain cross-polar": lambda p0, x: rain_cross_polar_outage_percent(p0, frequency_hz=x * 1e9, required_ratio_db=24.0),
    "correction": lambda p0, x: geographic_correction_db(x * 1e3, latitude_deg=p0),
    "tandem": lambda p0, x: tandem_outage_percent(
        np.stack([p0 / 1e4, p0 / 1e3], axis=-1), distance_m=[20e3, 30e3], fade_db=x
    ),
}


@pytest.mark.parametrize("name", _WITH_OCCURRENCE)
def test_vector_equals_loop_and_inputs_stay_as_they_were(name: str) -> None:
    function = _WITH_OCCURRENCE[name]
    generator = np.random.default_rng(11)
    occurrence, other = generator.uniform(0.1, 90.0, 25), generator.uniform(3.0, 39.0, 25)
    kept = occurrence.copy(), other.copy()
    whole = np.asarray(function(occurrence, other))
    each = [function(np.asarray(a), np.asarray(b)) for a, b in zip(occurrence, other, strict=True)]
    np.testing.assert_allclose(whole, each, rtol=1e-12)
    assert all(isinstance(value, float) for value in each)
    assert np.array_equal(occurrence, kept[0])
    assert np.array_equal(other, kept[1])


def test_nothing_up_where_there_is_no_multipath() -> None:
    assert multipath_activity(0.0) == 0.0
    assert selective_outage_percent(0.0, distance_m=50e3, signature_width_hz=28e6, signature_depth_db=20.0) == 0.0
    correlation = space_correlation_squared(10.0, distance_m=50e3, frequency_hz=6e9, occurrence_percent=0.0)
    improvement = diversity_improvement(correlation, occurrence_percent=0.0, fade_db=30.0)
    assert (
        diversity_outage_percent(
            0.0, selective_percent=0.0, correlation_squared=correlation, improvement=improvement, occurrence_percent=0.0
        )
        == 0.0
    )
    assert clear_air_cross_polar_outage_percent(0.0, antenna_discrimination_db=30.0, required_ratio_db=24.0) == 0.0
    assert rain_cross_polar_outage_percent(0.0, frequency_hz=18e9, required_ratio_db=24.0) == 0.0


def test_diversity_never_harms() -> None:
    # Two antennas in one place (no spacing) and a shallow fade: no help, and no harm.
    at_once = space_correlation_squared(0.0, distance_m=50e3, frequency_hz=6e9, occurrence_percent=20.0)
    assert at_once == 1.0
    assert diversity_improvement(at_once, occurrence_percent=20.0, fade_db=5.0, level_difference_db=10.0) == 1.0
    outage = diversity_outage_percent(
        0.02, selective_percent=0.03, correlation_squared=at_once, improvement=1.0, occurrence_percent=20.0
    )
    assert outage == pytest.approx(0.05, rel=1e-12)


def test_wider_spacing_helps_up_to_its_limit() -> None:
    spacing = np.linspace(3.0, 23.0, 21)
    path = {"distance_m": 50e3, "frequency_hz": 6e9, "occurrence_percent": 20.0}
    correlation = space_correlation_squared(spacing, **path)
    improvement = diversity_improvement(correlation, occurrence_percent=20.0, fade_db=35.0)
    assert np.all(np.diff(improvement) > 0.0)
    assert space_correlation_squared(40.0, **path) == space_correlation_squared(23.0, **path)


def test_a_canceller_and_a_better_antenna_help() -> None:
    plain = clear_air_cross_polar_outage_percent(10.0, antenna_discrimination_db=28.0, required_ratio_db=24.0)
    assert clear_air_cross_polar_outage_percent(
        10.0, antenna_discrimination_db=28.0, required_ratio_db=24.0, canceller_db=20.0
    ) == pytest.approx(float(plain) / 100.0, rel=1e-12)
    assert clear_air_cross_polar_outage_percent(10.0, antenna_discrimination_db=34.0, required_ratio_db=24.0) < plain
    # Antenna discrimination beyond 35 dB counts as 35 (section 4.1).
    assert clear_air_cross_polar_outage_percent(
        10.0, antenna_discrimination_db=38.0, required_ratio_db=24.0
    ) == clear_air_cross_polar_outage_percent(10.0, antenna_discrimination_db=35.0, required_ratio_db=24.0)


def test_chain_of_hops() -> None:
    hops = np.array([0.01, 0.02, 0.005])
    total = tandem_outage_percent(hops, distance_m=[30e3, 40e3, 20e3], fade_db=30.0)
    assert hops.max() <= total < hops.sum()
    # Deep margins or long hops: independent, and the product of two small probabilities is next to nothing.
    far = tandem_outage_percent(hops, distance_m=[80e3, 80e3, 80e3], fade_db=45.0)
    assert far == pytest.approx(hops.sum(), rel=1e-3)
    assert tandem_outage_percent([0.01], distance_m=[30e3], fade_db=30.0) == pytest.approx(0.01, rel=1e-12)
    assert tandem_outage_percent([80.0, 90.0], distance_m=[30e3, 30e3], fade_db=1.0) <= 100.0


def test_worst_periods_and_their_words() -> None:
    hours = np.array([1.0, 24.0, 168.0, 720.0])
    assert np.all(np.diff(shorter_worst_period_factor(hours, relief="hilly")) < 0.0)
    with pytest.raises(QuantityError, match="'steep'"):
        shorter_worst_period_factor(24.0, relief="steep")  # type: ignore[arg-type]


def test_enhancement_falls_with_height_and_stays_a_percentage() -> None:
    percent = enhancement_exceeded_percent(np.linspace(0.0, 40.0, 81), fade_001_db=35.0)
    assert np.all(np.diff(percent) <= 0.0)
    assert np.max(percent) <= 100.0


def test_ranges_are_said() -> None:
    assert out_of_range("p530-19-multipath", distance_m=40e3, frequency_hz=6e9, dn75=10.0) == ()
    (one,) = out_of_range("p530-19-multipath", dn75=60.0)
    assert "dN75 60 N-units" in one
    (two,) = out_of_range("p530-19-worst-month", worst_month_percent=20.0)
    assert "0.00019 to 7.4 %" in two
