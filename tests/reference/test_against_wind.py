"""Wind force against hand-worked values of 1/2 rho v^2 Cd A with rho 1.225 kg/m3, and limits of its arithmetic."""

import math

import numpy as np
import pytest

from fellspan.design.wind import DRAG, shape_of, wind_force_n, wind_moment_nm
from fellspan.errors import QuantityError


def disc_m2(diameter_m: float) -> float:
    return math.pi / 4.0 * diameter_m**2


@pytest.mark.parametrize(
    ("diameter_m", "speed_m_s", "force_n"),
    [
        # Worked by hand with Cd 1.5, printed to 0.1 N.
        (0.6, 30.0, 233.8),
        (0.6, 45.0, 526.0),
        (1.2, 30.0, 935.2),
        (1.2, 45.0, 2104.1),
        (1.2, 56.0, 3258.6),
    ],
)
def test_force_on_a_dish_is_that_worked_by_hand(diameter_m: float, speed_m_s: float, force_n: float) -> None:
    found = wind_force_n(disc_m2(diameter_m), speed_m_s=speed_m_s, drag_coefficient=1.5)
    assert found == pytest.approx(force_n, abs=0.05)  # half of the last printed digit


def test_square_plate_has_the_coefficient_of_hoerner() -> None:
    # Hoerner, Fluid-Dynamic Drag: 1.17 for a disc or square plate across the wind.
    assert DRAG["flat plate"].coefficient == 1.17
    assert DRAG["flat plate"].confirmed


def test_only_what_was_seen_in_its_source_counts_as_confirmed() -> None:
    assert {shape for shape, drag in DRAG.items() if drag.confirmed} == {"flat plate"}
    for drag in DRAG.values():
        assert drag.confirmed is not any(words in drag.source for words in ("from memory", "no source"))


def test_force_goes_with_the_square_of_the_speed_and_broadcasts() -> None:
    speeds = np.array([10.0, 20.0, 40.0])
    force = np.asarray(wind_force_n(np.array([[0.1], [0.3]]), speed_m_s=speeds, drag_coefficient=1.2))
    assert force.shape == (2, 3)
    np.testing.assert_allclose(force[:, 2] / force[:, 0], 16.0)
    np.testing.assert_allclose(force[1] / force[0], 3.0)


def test_moment_is_force_times_arm() -> None:
    assert wind_moment_nm(526.0, arm_m=2.5) == pytest.approx(1315.0)


def test_shapes() -> None:
    assert shape_of("dish") == "solid dish"
    assert shape_of("dish", grid=True) == "grid dish"
    assert shape_of("yagi", width_m=0.3, height_m=0.05) == "rods"
    assert shape_of("panel", width_m=0.37, height_m=0.37) == "flat plate"
    assert shape_of("sheet", width_m=0.15, height_m=1.0) == "long plate"


@pytest.mark.parametrize("value", [-1.0, math.inf, math.nan])
def test_impossible_values_are_refused_with_the_value(value: float) -> None:
    with pytest.raises(QuantityError, match=f"{value:g}"):
        wind_force_n(0.3, speed_m_s=value, drag_coefficient=1.2)
    with pytest.raises(QuantityError, match="mast arm"):
        wind_moment_nm(10.0, arm_m=value)
