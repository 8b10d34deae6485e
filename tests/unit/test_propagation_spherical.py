"""Smooth Earth: symmetry, limits in 1/k, shapes, undefined values."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fellspan.errors import QuantityError
from fellspan.propagation import first_residue_loss_db, spherical_earth_loss_db

seeded = settings(derandomize=True, deadline=None)

heights = st.just(0.0) | st.floats(1e-3, 300.0)
distances = st.floats(100.0, 300e3)
ks = st.sampled_from([0.4, 0.7, 1.0, 4 / 3, 3.0, 50.0, 1e9, math.inf])
frequencies = st.sampled_from([0.15e9, 1e9, 5.8e9, 60e9])


@seeded
@given(distances, heights, heights, frequencies, ks, st.sampled_from(["horizontal", "vertical"]))
def test_reciprocal_and_defined(
    distance_m: float, one: float, other: float, frequency_hz: float, k: float, word: str
) -> None:
    path = {"frequency_hz": frequency_hz, "k": k, "polarization": word}
    there = spherical_earth_loss_db(distance_m, a_height_m=one, b_height_m=other, **path)
    back = spherical_earth_loss_db(distance_m, a_height_m=other, b_height_m=one, **path)
    if max(one, other) == 0.0 and math.isinf(k):
        return  # both antennas on a plane: undefined
    assert isinstance(there, float)
    assert not math.isnan(there)
    assert there == pytest.approx(back, abs=1e-5, rel=1e-7)


def test_infinite_k_is_the_limit() -> None:
    flat = spherical_earth_loss_db(20e3, a_height_m=5.0, b_height_m=8.0, frequency_hz=1e9, k=math.inf)
    nearly = spherical_earth_loss_db(20e3, a_height_m=5.0, b_height_m=8.0, frequency_hz=1e9, k=1e9)
    assert flat > 1.0
    assert flat == pytest.approx(nearly, abs=1e-6)


def test_undefined_is_nan() -> None:
    path = {"a_height_m": 10.0, "b_height_m": 10.0, "frequency_hz": 1e9}
    for wrong in (
        {"k": 0.0},
        {"k": -1.0},
        {"k": math.nan},
        {"a_height_m": -0.1},
        {"b_height_m": math.nan},
        {"frequency_hz": 0.0},
    ):
        assert math.isnan(spherical_earth_loss_db(50e3, **{**path, **wrong}))
    assert math.isnan(spherical_earth_loss_db(0.0, **path))
    assert math.isnan(first_residue_loss_db(1e4, **path, effective_radius_m=-8e6))


def test_short_high_paths_cost_nothing() -> None:
    assert spherical_earth_loss_db(5e3, a_height_m=100.0, b_height_m=100.0, frequency_hz=5.8e9) == 0.0


def test_loss_rises_with_distance_across_the_horizon() -> None:
    distance = np.linspace(1e3, 150e3, 2981)
    loss = np.asarray(spherical_earth_loss_db(distance, a_height_m=30.0, b_height_m=20.0, frequency_hz=2e9))
    assert np.diff(loss).min() >= 0.0
    assert np.diff(loss).max() < 0.2  # no jump where the two forms of the method meet


def test_beyond_the_horizon_it_is_the_first_residue() -> None:
    common = {"a_height_m": 20.0, "b_height_m": 30.0, "frequency_hz": 2e9}
    whole = spherical_earth_loss_db(100e3, **common, k=1.0)
    assert whole == first_residue_loss_db(100e3, **common, effective_radius_m=6371e3)


def test_an_antenna_on_the_ground_is_the_limit() -> None:
    common = {"b_height_m": 30.0, "frequency_hz": 1e9}
    on_ground = spherical_earth_loss_db(5e3, a_height_m=0.0, **common)
    just_above = spherical_earth_loss_db(5e3, a_height_m=1e-9, **common)
    assert on_ground > 0.0
    assert on_ground == pytest.approx(just_above, abs=0.01)


def test_arrays_equal_scalars_and_polarizations_mix() -> None:
    random = np.random.default_rng(3)
    distance = random.uniform(1e3, 120e3, (4, 5))
    a, b = random.uniform(0, 60, 5), random.uniform(0, 60, (4, 1))
    words = np.array(["horizontal", "vertical", "vertical", "horizontal", "vertical"])
    loss = np.asarray(
        spherical_earth_loss_db(
            distance, a_height_m=a, b_height_m=b, frequency_hz=0.4e9, polarization=words, sea_fraction=0.3
        )
    )
    for i, j in np.ndindex(4, 5):
        one = spherical_earth_loss_db(
            distance[i, j],
            a_height_m=a[j],
            b_height_m=b[i, 0],
            frequency_hz=0.4e9,
            polarization=str(words[j]),
            sea_fraction=0.3,
        )
        assert loss[i, j] == one


def test_a_wrong_polarization_is_named() -> None:
    with pytest.raises(QuantityError, match="'circular'"):
        spherical_earth_loss_db(1e3, a_height_m=1, b_height_m=1, frequency_hz=1e9, polarization="circular")


def test_ground_constants() -> None:
    # P.452-18, section 4.2: land 22 and 0.003 S/m, sea 80 and 5 S/m. Antennas on the ground feel them most.
    path = {"a_height_m": 0.0, "b_height_m": 0.0, "frequency_hz": 10e9, "polarization": "vertical"}
    for sea, permittivity, conductivity in ((0.0, 22.0, 0.003), (1.0, 80.0, 5.0)):
        loss = first_residue_loss_db(
            1e4, **path, effective_radius_m=6371e3, relative_permittivity=permittivity, conductivity_s_m=conductivity
        )
        assert spherical_earth_loss_db(1e4, **path, k=1.0, sea_fraction=sea) == pytest.approx(loss, abs=1e-12)
