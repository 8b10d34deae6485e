"""Woodland: limits, spread, trees counted once."""

import math

import numpy as np
import pytest

from fellspan.propagation import (
    WOODLAND_SPREAD,
    loss_past_trees_db,
    out_of_range,
    source,
    woodland_loss_db,
    woodland_loss_spread_db,
    woodland_saturation_db,
    woodland_specific_db_per_m,
)


def test_limits() -> None:
    assert woodland_loss_db(0.0, specific_db_per_m=0.5, saturation_db=30.0) == 0.0
    assert woodland_loss_db(1e6, specific_db_per_m=0.5, saturation_db=30.0) == 30.0
    assert woodland_loss_db(0.01, specific_db_per_m=0.5, saturation_db=30.0) == pytest.approx(0.005, rel=1e-3)
    assert woodland_loss_db(10.0, specific_db_per_m=0.5, saturation_db=0.0) == 0.0
    assert woodland_loss_db(10.0, specific_db_per_m=0.0, saturation_db=30.0) == 0.0
    assert woodland_loss_db(0.0, specific_db_per_m=0.5, saturation_db=0.0) == 0.0
    for wrong in (
        {"specific_db_per_m": -1.0, "saturation_db": 30.0},
        {"specific_db_per_m": 0.5, "saturation_db": math.nan},
    ):
        assert math.isnan(woodland_loss_db(10.0, **wrong))
    assert math.isnan(woodland_loss_db(-1.0, specific_db_per_m=0.5, saturation_db=30.0))
    assert math.isnan(woodland_specific_db_per_m(0.0))


def test_deeper_woods_and_higher_frequencies_lose_more() -> None:
    frequency = np.geomspace(30e6, 30e9, 40)[:, None]
    depth = np.linspace(0.0, 20.0, 21)
    loss = woodland_loss_db(
        depth,
        specific_db_per_m=woodland_specific_db_per_m(frequency),
        saturation_db=woodland_saturation_db(frequency),
    )
    assert loss.shape == (40, 21)
    assert np.all(np.diff(loss, axis=1) > 0.0)
    assert np.all(np.diff(loss[:, 1:], axis=0) > 0.0)
    assert loss[3, 7] == woodland_loss_db(
        7.0,
        specific_db_per_m=woodland_specific_db_per_m(float(frequency[3, 0])),
        saturation_db=woodland_saturation_db(float(frequency[3, 0])),
    )


def test_spread_holds_the_median() -> None:
    for depth_m in (1.0, 10.0, 200.0):
        least, most = woodland_loss_spread_db(depth_m, frequency_hz=5.8e9)
        median = woodland_loss_db(
            depth_m, specific_db_per_m=woodland_specific_db_per_m(5.8e9), saturation_db=woodland_saturation_db(5.8e9)
        )
        assert least == pytest.approx((1 - WOODLAND_SPREAD) * median)
        assert most == pytest.approx((1 + WOODLAND_SPREAD) * median)


def test_trees_are_counted_once() -> None:
    assert loss_past_trees_db(through_db=12.0, over_db=20.0) == 12.0
    np.testing.assert_array_equal(loss_past_trees_db(through_db=[12.0, 30.0], over_db=20.0), [12.0, 20.0])
    assert math.isnan(loss_past_trees_db(through_db=math.nan, over_db=3.0))


def test_what_is_extrapolated_is_said() -> None:
    assert out_of_range("p833-10-woodland", frequency_hz=5.8e9)
    assert out_of_range("p833-10-specific", frequency_hz=60e9)
    assert source("p833-10-specific").status == "code"
