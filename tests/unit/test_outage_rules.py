"""Availability: sums of causes, both directions, minutes; diffraction fading from the spread of the gradient."""

import math

import numpy as np
import pytest
from scipy.stats import norm

from fellspan.propagation import (
    diffraction_outage_percent,
    fade_exceeded_percent,
    gradient_from_k_n_per_km,
    gradient_spread_n_per_km,
    k_exceeded_99_9,
    knife_edge_loss_db,
    knife_edge_nu,
    minutes_per_worst_month,
    minutes_per_year,
    multipath_occurrence_quick_percent,
    one_way_outage,
    two_way_outage,
)


@pytest.mark.parametrize(
    ("available", "minutes", "tolerance"),
    [
        (99.0, 87.66 * 60, 0.3),
        (99.9, 525.96, 0.005),
        (99.99, 52.60, 0.005),
        (99.995, 26.30, 0.005),
        (99.999, 5.26, 0.005),
    ],
)
def test_minutes_of_an_average_year(available: float, minutes: float, tolerance: float) -> None:
    # 365.25 days; arithmetic.
    assert minutes_per_year(100.0 - available) == pytest.approx(minutes, abs=tolerance)


def test_minutes_of_a_month() -> None:
    assert minutes_per_worst_month(100.0) == pytest.approx(43_830.0, abs=1e-9)


def test_causes_add_and_the_greatest_is_named() -> None:
    outage = one_way_outage(rain_percent=0.01, multipath_percent=0.002, diffraction_percent=0.003)
    assert outage.total_percent == pytest.approx(0.015, rel=1e-12)
    assert outage.availability_percent == pytest.approx(99.985, rel=1e-12)
    assert outage.dominant == "rain"
    assert one_way_outage(rain_percent=0.0, multipath_percent=0.002).dominant == "multipath"
    low_k = one_way_outage(rain_percent=0.0, multipath_percent=0.0, diffraction_percent=1e-9)
    assert low_k.dominant == "diffraction"
    assert one_way_outage(rain_percent=0.0, multipath_percent=0.0).dominant == "none"


def test_of_rain_and_its_cross_polar_part_the_larger_counts() -> None:
    assert one_way_outage(rain_percent=0.01, multipath_percent=0, rain_cross_polar_percent=0.03).rain_percent == 0.03
    assert one_way_outage(rain_percent=0.05, multipath_percent=0, rain_cross_polar_percent=0.03).rain_percent == 0.05


def test_never_more_than_all_the_time() -> None:
    outage = one_way_outage(rain_percent=60.0, multipath_percent=70.0)
    assert outage.total_percent == 100.0
    assert outage.availability_percent == 0.0


def test_arrays_equal_loops_and_unknown_stays_unknown() -> None:
    rain, multipath = np.array([0.01, 0.0, math.nan, 0.0]), np.array([0.02, 0.0, 0.01, 0.5])
    whole = one_way_outage(rain_percent=rain, multipath_percent=multipath, diffraction_percent=[0.0, 0.1, 0.0, 0.2])
    assert list(whole.dominant) == ["multipath", "diffraction", "none", "multipath"]
    for index in (0, 1, 3):
        alone = one_way_outage(
            rain_percent=rain[index],
            multipath_percent=multipath[index],
            diffraction_percent=[0.0, 0.1, 0.0, 0.2][index],
        )
        assert alone.total_percent == np.asarray(whole.total_percent)[index]
        assert alone.dominant == whole.dominant[index]
    assert math.isnan(np.asarray(whole.total_percent)[2])


def test_both_ways() -> None:
    a = one_way_outage(rain_percent=0.010, multipath_percent=0.004, diffraction_percent=0.001)
    b = one_way_outage(rain_percent=0.006, multipath_percent=0.003, diffraction_percent=0.002)
    both = two_way_outage(a, b)
    assert both.rain_percent == 0.010
    assert both.diffraction_percent == 0.002
    assert both.multipath_percent == pytest.approx(0.007 - 0.004 * 0.003 / 100.0, rel=1e-12)
    assert two_way_outage(a, b, common_multipath=True).multipath_percent == 0.004
    back = two_way_outage(b, a)
    assert back.total_percent == both.total_percent
    assert max(float(a.total_percent), float(b.total_percent)) <= float(both.total_percent)
    dead = one_way_outage(rain_percent=0.0, multipath_percent=100.0)
    assert two_way_outage(dead, dead).multipath_percent == 100.0


def test_availability_falls_with_length_and_grows_with_margin() -> None:
    distance = np.linspace(2e3, 80e3, 60)[:, np.newaxis]
    margin = np.linspace(0.0, 50.0, 51)
    occurrence = multipath_occurrence_quick_percent(
        distance, frequency_hz=6e9, a_amsl_m=200.0, b_amsl_m=200.0, dn1_n_per_km=-200.0
    )
    fading = fade_exceeded_percent(margin, occurrence_percent=occurrence)
    available = np.asarray(one_way_outage(rain_percent=0.0, multipath_percent=fading).availability_percent)
    assert np.all(np.diff(available, axis=0) <= 0.0)
    assert np.all(np.diff(available, axis=1) >= 0.0)
    assert available[:, -1].min() > available[:, 10].min()


# --- diffraction fading ---------------------------------------------------------------------------------------------------

MEDIAN, TAIL = -39.0, 20.0
GRID = np.linspace(0.0, 3.0, 601)


def test_spread_is_that_of_a_normal_law() -> None:
    # 3.0902 standard deviations to 99.9 %: table of the normal distribution.
    assert gradient_spread_n_per_km(median_n_per_km=-40.0, tail_n_per_km=40.0) == pytest.approx(80.0 / 3.0902, rel=1e-4)
    assert math.isnan(float(gradient_spread_n_per_km(median_n_per_km=-40.0, tail_n_per_km=-40.0)))


def test_a_step_in_the_loss_gives_the_tail_beyond_it() -> None:
    # Loss passes the margin exactly at the gradient not exceeded for 99.9 %: outage 0.1 %.
    step_at = (157.0 + TAIL) / 157.0
    loss = np.clip((GRID - step_at) * 1e6 + 10.0, 0.0, 40.0)
    found = diffraction_outage_percent(10.0, inverse_k=GRID, loss_db=loss, median_n_per_km=MEDIAN, tail_n_per_km=TAIL)
    assert found == pytest.approx(0.1, rel=0.1)  # the step lies within one stretch of the grid
    exact = np.sort(np.append(GRID, [step_at, step_at + 1e-9]))
    loss = np.where(exact > step_at, 40.0, 0.0)
    found = diffraction_outage_percent(10.0, inverse_k=exact, loss_db=loss, median_n_per_km=MEDIAN, tail_n_per_km=TAIL)
    assert found == pytest.approx(0.1, rel=1e-6)


def _hill_loss(k_inverse: np.ndarray) -> np.ndarray:
    """A knife edge half-way on 40 km at 6 GHz, grazing at 1/k = 0.95."""
    height = 500.0 * 20.0 * 20.0 / 6371.0 * (k_inverse - 0.95)
    return np.asarray(knife_edge_loss_db(knife_edge_nu(height, from_a_m=20e3, from_b_m=20e3, frequency_hz=6e9)))


def test_against_random_gradients() -> None:
    # Monte Carlo over the same law, not over the grid: two million draws, seeded.
    sigma = (TAIL - MEDIAN) / norm.ppf(0.999)
    draws = (157.0 + np.random.default_rng(5).normal(MEDIAN, sigma, 2_000_000)) / 157.0
    loss = _hill_loss(draws)
    grid = np.linspace(-1.0, 3.0, 2001)
    for margin in (1.0, 3.0, 6.0, 8.0):
        hits = np.count_nonzero(loss > margin)
        assert hits > 1000
        found = diffraction_outage_percent(
            margin, inverse_k=grid, loss_db=_hill_loss(grid), median_n_per_km=MEDIAN, tail_n_per_km=TAIL
        )
        assert found == pytest.approx(100.0 * hits / draws.size, rel=4.0 / math.sqrt(hits))


def test_more_margin_less_outage_and_vector_equals_loop() -> None:
    margin = np.linspace(0.0, 20.0, 41)
    together = diffraction_outage_percent(
        margin, inverse_k=GRID, loss_db=_hill_loss(GRID), median_n_per_km=MEDIAN, tail_n_per_km=TAIL
    )
    assert np.all(np.diff(together) <= 0.0)
    for one, share in zip(margin, np.asarray(together), strict=True):
        alone = diffraction_outage_percent(
            one, inverse_k=GRID, loss_db=_hill_loss(GRID), median_n_per_km=MEDIAN, tail_n_per_km=TAIL
        )
        assert isinstance(alone, float)
        assert alone == share


def test_paths_in_a_batch_have_their_own_loss_and_gradients() -> None:
    losses = np.stack([_hill_loss(GRID), _hill_loss(GRID) + 2.0])
    found = np.asarray(
        diffraction_outage_percent(
            [6.0, 6.0], inverse_k=GRID, loss_db=losses, median_n_per_km=MEDIAN, tail_n_per_km=[TAIL, TAIL + 10.0]
        )
    )
    assert found.shape == (2,)
    assert found[1] > found[0]


def test_all_none_and_undefined() -> None:
    law = {"inverse_k": GRID, "median_n_per_km": MEDIAN, "tail_n_per_km": TAIL}
    flat = np.zeros_like(GRID)
    assert diffraction_outage_percent(0.0, loss_db=flat, **law) == 0.0
    assert diffraction_outage_percent(-1.0, loss_db=flat, **law) == pytest.approx(100.0, rel=1e-12)
    assert math.isnan(float(diffraction_outage_percent(math.nan, loss_db=flat, **law)))
    assert math.isnan(float(diffraction_outage_percent(1.0, loss_db=np.full_like(GRID, math.nan), **law)))
    jump = np.where(GRID > 1.5, math.inf, 0.0)
    back = np.where(GRID > 1.5, 0.0, math.inf)
    sum_of_both = float(diffraction_outage_percent(5.0, loss_db=jump, **law)) + float(
        diffraction_outage_percent(5.0, loss_db=back, **law)
    )
    assert sum_of_both == pytest.approx(100.0, abs=0.01)
    crossed = diffraction_outage_percent(5.0, inverse_k=GRID, loss_db=flat, median_n_per_km=0.0, tail_n_per_km=-10.0)
    assert math.isnan(float(crossed))
    for wrong in ([1.0], [1.0, 0.5], [[0.0, 1.0], [1.0, 0.0]]):
        with pytest.raises(ValueError, match="rising"):
            diffraction_outage_percent(5.0, inverse_k=wrong, loss_db=0.0, median_n_per_km=0.0, tail_n_per_km=10.0)


def test_worst_month_tail_by_path_length() -> None:
    # P.530-19 (4): the gradient at 99.9 % of the worst month is -13 + 2670/d N/km; the share beyond it is 0.1 %.
    tail = gradient_from_k_n_per_km(k_exceeded_99_9(50e3))
    assert tail == pytest.approx(-13.0 + 2670.0 / 50.0, abs=1e-9)
    edge = (157.0 + float(tail)) / 157.0
    nodes = np.array([-2.0, edge, edge + 1e-9, 4.0])
    outage = diffraction_outage_percent(
        5.0, inverse_k=nodes, loss_db=[0.0, 0.0, 10.0, 10.0], median_n_per_km=-39.0, tail_n_per_km=tail
    )
    assert outage == pytest.approx(0.1, rel=1e-5)
