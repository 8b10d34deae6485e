"""Bullington and delta-Bullington: reciprocity, batches, 1/k through zero, grazing, undefined values."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fellspan.propagation import (
    bullington_loss_db,
    delta_bullington_loss_db,
    effective_heights_m,
    knife_edge_loss_db,
    knife_edge_nu,
)

seeded = settings(derandomize=True, deadline=None)

DISTANCE = np.linspace(0.0, 20e3, 101)


def _terrain(seed: int, shape: tuple[int, ...] = ()) -> np.ndarray:
    random = np.random.default_rng(seed)
    return 200.0 + np.cumsum(random.normal(0.0, 8.0, (*shape, DISTANCE.size)), axis=-1)


def _ends(ground: np.ndarray, mast_m: float = 15.0) -> dict[str, np.ndarray]:
    return {"a_amsl_m": ground[..., 0] + mast_m, "b_amsl_m": ground[..., -1] + mast_m + 3.0}


@seeded
@given(
    st.integers(0, 10**6),
    st.sampled_from([0.2e9, 2e9, 5.8e9, 60e9]),
    st.sampled_from([0.5, 4 / 3, 20.0, math.inf, -5.0, -0.7]),
    st.sampled_from([5.0, 40.0, 400.0]),
)
def test_reciprocal(seed: int, frequency_hz: float, k: float, mast_m: float) -> None:
    ground = _terrain(seed)
    ends = _ends(ground, mast_m)
    swapped = {"a_amsl_m": ends["b_amsl_m"], "b_amsl_m": ends["a_amsl_m"]}
    wave = {"frequency_hz": frequency_hz, "k": k}
    there = delta_bullington_loss_db(DISTANCE, ground, **ends, **wave)
    back = delta_bullington_loss_db(DISTANCE[-1] - DISTANCE[::-1], ground[::-1], **swapped, **wave)
    assert type(there) is float
    assert there >= 0.0
    assert there == pytest.approx(back, abs=1e-6)


def test_a_batch_equals_one_at_a_time() -> None:
    ground = _terrain(1, (3, 4))
    surface = ground + np.random.default_rng(2).uniform(0, 20, ground.shape)
    ends = _ends(ground)
    frequency_hz, k = np.array([0.3e9, 2e9, 5.8e9, 23e9]), np.array([[0.6], [math.inf], [-2.0]])
    sea = np.array([0.0, 0.2, 0.5, 1.0])
    batch = np.asarray(
        delta_bullington_loss_db(
            DISTANCE, ground, **ends, frequency_hz=frequency_hz, k=k, sea_fraction=sea, surface_m=surface
        )
    )
    own_distance = np.asarray(
        delta_bullington_loss_db(
            np.broadcast_to(DISTANCE, ground.shape),
            ground,
            **ends,
            frequency_hz=frequency_hz,
            k=k,
            sea_fraction=sea,
            surface_m=surface,
        )
    )
    assert batch.shape == (3, 4)
    np.testing.assert_array_equal(batch, own_distance)
    for i, j in np.ndindex(3, 4):
        one = delta_bullington_loss_db(
            DISTANCE,
            ground[i, j],
            a_amsl_m=ends["a_amsl_m"][i, j],
            b_amsl_m=ends["b_amsl_m"][i, j],
            frequency_hz=frequency_hz[j],
            k=k[i, 0],
            sea_fraction=sea[j],
            surface_m=surface[i, j],
        )
        assert batch[i, j] == pytest.approx(one, abs=1e-9)


def test_paths_of_different_length_share_a_batch() -> None:
    ground = _terrain(5, (2,))
    distance = DISTANCE * np.array([[1.0], [0.3]])
    both = np.asarray(delta_bullington_loss_db(distance, ground, **_ends(ground), frequency_hz=2e9))
    for i in range(2):
        alone = delta_bullington_loss_db(distance[i], ground[i], **_ends(ground[i]), frequency_hz=2e9)
        assert both[i] == pytest.approx(alone, abs=1e-9)


def test_inputs_are_left_alone() -> None:
    distance, ground = DISTANCE.copy(), _terrain(3)
    kept = ground.copy()
    distance.flags.writeable = ground.flags.writeable = False
    delta_bullington_loss_db(distance, ground, **_ends(ground), frequency_hz=1e9, surface_m=ground)
    np.testing.assert_array_equal(ground, kept)


def test_one_edge_is_the_knife_edge_with_the_empirical_term() -> None:
    # P.526-16, equation (57), on one point 60 m above the line of two ends, flat Earth.
    distance, ground = np.array([0.0, 4e3, 12e3]), np.array([0.0, 60.0, 0.0])
    edge = knife_edge_loss_db(knife_edge_nu(60.0, from_a_m=4e3, from_b_m=8e3, frequency_hz=2e9))
    assert isinstance(edge, float)
    expected = edge + (1 - math.exp(-edge / 6)) * (10 + 0.02 * 12)
    loss = bullington_loss_db(distance, ground, a_amsl_m=0.0, b_amsl_m=0.0, frequency_hz=2e9, k=math.inf)
    assert loss == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize("level", [0.0, 100.0, 123.456])
def test_exact_grazing_costs_the_grazing_edge(level: float) -> None:
    # Every point on the ray: the crossing of the horizon rays is 0/0 in the printed formula, and nu is 0 by any other way.
    ground = np.full(DISTANCE.size, level)
    loss = bullington_loss_db(DISTANCE, ground, a_amsl_m=level, b_amsl_m=level, frequency_hz=2e9, k=math.inf)
    above = bullington_loss_db(DISTANCE, ground + 1e-6, a_amsl_m=level, b_amsl_m=level, frequency_hz=2e9, k=math.inf)
    assert loss == pytest.approx(above, abs=1e-3)
    slope = bullington_loss_db(
        DISTANCE, level + DISTANCE / 7e3, a_amsl_m=level, b_amsl_m=level + 20 / 7, frequency_hz=2e9, k=math.inf
    )
    assert slope == pytest.approx(above, abs=1e-3)


def test_grazing_slopes_whose_rounding_would_leave_the_path() -> None:
    # Found by search: without a guard the crossing falls on the very end of the path, and the loss is undefined.
    for level, slope in ((-122.85585234441675, 0.006315866001612446), (428.1929081719139, -0.016860823657155116)):
        ground = level + slope * DISTANCE
        loss = bullington_loss_db(
            DISTANCE, ground, a_amsl_m=ground[0], b_amsl_m=ground[-1], frequency_hz=60e9, k=math.inf
        )
        # J(0) = 6.0327 dB with the empirical term of P.526-16, equation (57), for 20 km, by hand.
        assert loss == pytest.approx(6.0327 + (1 - math.exp(-6.0327 / 6)) * 10.4, abs=1e-3)


def test_loss_is_continuous_in_one_over_k_through_zero() -> None:
    ground = _terrain(8)
    wave = {**_ends(ground), "frequency_hz": 5.8e9}
    just = [bullington_loss_db(DISTANCE, ground, **wave, k=k) for k in (1e9, math.inf, -1e9)]
    assert just[0] == pytest.approx(just[1], abs=1e-5)
    assert just[2] == pytest.approx(just[1], abs=1e-5)
    whole = [delta_bullington_loss_db(DISTANCE, ground, **wave, k=k) for k in (1e9, math.inf)]
    assert whole[0] == pytest.approx(whole[1], abs=1e-5)


def test_negative_k_goes_without_the_spherical_part() -> None:
    flat = np.zeros(DISTANCE.size)
    wave = {"a_amsl_m": 5.0, "b_amsl_m": 5.0, "frequency_hz": 0.5e9}
    for k in (-1e9, -1.0):
        assert delta_bullington_loss_db(DISTANCE, flat, **wave, k=k) == bullington_loss_db(DISTANCE, flat, **wave, k=k)
    plane = delta_bullington_loss_db(DISTANCE, flat, **wave, k=math.inf)
    assert plane > bullington_loss_db(DISTANCE, flat, **wave, k=math.inf) + 1.0


def test_lower_k_never_costs_less_over_an_edge() -> None:
    ground = _terrain(9)
    inverse = np.linspace(-1.0, 2.0, 41)[:, None]
    with np.errstate(divide="ignore"):
        loss = bullington_loss_db(DISTANCE, ground, **_ends(ground), frequency_hz=2e9, k=1 / inverse[:, 0])
    assert np.diff(loss).min() >= -1e-9


def test_undefined_is_nan() -> None:
    ground = _terrain(4)
    ends = _ends(ground)
    hole = ground.copy()
    hole[50] = math.nan
    flat = np.zeros(DISTANCE.size)
    for wrong in (
        delta_bullington_loss_db(DISTANCE, hole, **ends, frequency_hz=1e9),
        delta_bullington_loss_db(DISTANCE, ground, **ends, frequency_hz=1e9, surface_m=hole),
        delta_bullington_loss_db(DISTANCE, ground, **ends, frequency_hz=1e9, k=0.0),
        delta_bullington_loss_db(DISTANCE, ground, **ends, frequency_hz=1e9, k=math.nan),
        delta_bullington_loss_db(DISTANCE, ground, **ends, frequency_hz=math.nan),
        delta_bullington_loss_db(DISTANCE, ground, **ends, frequency_hz=1e9, sea_fraction=math.nan),
        delta_bullington_loss_db(DISTANCE, ground, **{**ends, "a_amsl_m": math.nan}, frequency_hz=1e9),
        delta_bullington_loss_db(DISTANCE, flat, a_amsl_m=-1.0, b_amsl_m=100.0, frequency_hz=1e9),
        delta_bullington_loss_db(DISTANCE, flat, a_amsl_m=-1.0, b_amsl_m=100.0, frequency_hz=1e9, k=-3.0),
        bullington_loss_db(DISTANCE, hole, **ends, frequency_hz=1e9),
    ):
        assert math.isnan(wrong)
    batch = delta_bullington_loss_db(DISTANCE, np.stack([ground, hole]), **ends, frequency_hz=1e9)
    assert list(np.isnan(batch)) == [False, True]


def test_a_path_without_interior_points() -> None:
    loss = delta_bullington_loss_db([0.0, 500.0], [3.0, 4.0], a_amsl_m=30.0, b_amsl_m=30.0, frequency_hz=5.8e9)
    assert loss == 0.0


def test_surface_counts_in_the_real_profile_only() -> None:
    ground = np.full(DISTANCE.size, 50.0)
    surface = ground + np.where((DISTANCE > 9e3) & (DISTANCE < 11e3), 25.0, 0.0)
    ends = {"a_amsl_m": 80.0, "b_amsl_m": 80.0}
    wave = {"frequency_hz": 2e9, "k": 4 / 3}
    bare = delta_bullington_loss_db(DISTANCE, ground, **ends, **wave)
    with_trees = delta_bullington_loss_db(DISTANCE, ground, **ends, **wave, surface_m=surface)
    added = bullington_loss_db(DISTANCE, surface, **ends, **wave) - bullington_loss_db(DISTANCE, ground, **ends, **wave)
    assert added > 1.0
    assert with_trees - bare == pytest.approx(added, abs=1e-9)
    assert delta_bullington_loss_db(DISTANCE, ground, **ends, **wave, surface_m=ground) == bare


def test_effective_heights_over_a_plane_slope() -> None:
    ground = 10.0 + DISTANCE / 500.0
    a, b = effective_heights_m(DISTANCE, ground, a_amsl_m=10.0 + 25.0, b_amsl_m=50.0 + 35.0)
    assert (a, b) == (pytest.approx(25.0, abs=1e-9), pytest.approx(35.0, abs=1e-9))


def test_rows_that_the_smooth_earth_costs_nothing_and_rows_that_it_does_share_a_batch() -> None:
    # Enough rows for several blocks; high and low masts in turn, so that some have no spherical part and some no sight.
    count = 240
    ground = _terrain(21, (count,))
    mast_m = np.where(np.arange(count) % 3 == 0, 600.0, 4.0)
    ends = {"a_amsl_m": (ground[:, 0] + mast_m)[:, None], "b_amsl_m": (ground[:, -1] + mast_m)[:, None]}
    k = 1.0 / np.array([0.75, 1.2, 1.9])
    batch = np.asarray(delta_bullington_loss_db(DISTANCE, ground[:, None], **ends, frequency_hz=5.8e9, k=k))
    assert batch.shape == (count, 3)
    assert 0 < np.count_nonzero(batch == 0.0) < batch.size
    for i, j in np.ndindex(*batch.shape):
        one = delta_bullington_loss_db(
            DISTANCE,
            ground[i],
            a_amsl_m=float(ends["a_amsl_m"][i, 0]),
            b_amsl_m=float(ends["b_amsl_m"][i, 0]),
            frequency_hz=5.8e9,
            k=float(k[j]),
        )
        assert batch[i, j] == pytest.approx(one, abs=1e-10)
