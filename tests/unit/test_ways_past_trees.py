"""Diffraction and trees on arrays of paths: a batch equals its paths, and the bound over k is one."""

import numpy as np
import pytest

from fellspan.links.ways_past_trees import (
    PathRows,
    depth_in_trees_m,
    mean_over_path_m,
    most_db,
    sample_lengths_m,
    share_of_path,
    ways_past_trees,
)

FREQUENCY_HZ = np.array([0.9e9, 5.8e9, 23e9])
INVERSE_K = np.linspace(-0.4, 1.9, 12)


def _rows(count: int, *, seed: int, trees: bool = True) -> PathRows:
    random = np.random.default_rng(seed)
    samples = 90
    share = np.sort(random.uniform(0.0, 1.0, (count, samples)), axis=1)
    share[:, 0], share[:, -1] = 0.0, 1.0
    distance = random.uniform(500.0, 60e3, (count, 1)) * share
    ground = 300.0 + np.cumsum(random.normal(0.0, random.choice([0.1, 2.0], (count, 1)), (count, samples)), axis=1)
    wood = (random.random((count, samples)) < 0.1) & (np.arange(count) % 3 > 0)[:, np.newaxis]
    wood[:, [0, -1]] = False
    mast = random.choice([2.0, 15.0, 80.0], (2, count))
    return PathRows.of(
        distance_m=distance,
        ground_m=ground,
        surface_m=ground + np.where(wood, 14.0, 0.0),
        trees=wood if trees else None,
        a_amsl_m=ground[:, 0] + mast[0],
        b_amsl_m=ground[:, -1] + mast[1],
        sea_fraction=random.choice([0.0, 0.3], count),
    )


def _alone(rows: PathRows, index: int) -> PathRows:
    return PathRows.of(
        distance_m=rows.distance_m[index],
        ground_m=rows.ground_m[index],
        surface_m=rows.surface_m[index],
        trees=None if rows.trees is None else rows.trees[index],
        a_amsl_m=rows.a_amsl_m[index],
        b_amsl_m=rows.b_amsl_m[index],
        sea_fraction=rows.sea_fraction[index],
    )


def test_a_batch_equals_its_paths() -> None:
    rows = _rows(40, seed=1)
    depth = depth_in_trees_m(rows, k=4.0 / 3.0)
    own_k = INVERSE_K + np.linspace(0.0, 0.1, 40)[:, np.newaxis]
    both = [
        ways_past_trees(rows, inverse_k=k, frequency_hz=FREQUENCY_HZ, polarization="vertical", depth_m=depth)
        for k in (INVERSE_K, own_k)
    ]
    assert np.count_nonzero(depth) > 5
    assert both[0].is_through.any()
    for index in range(40):
        one = _alone(rows, index)
        assert depth_in_trees_m(one, k=4.0 / 3.0) == pytest.approx(depth[index], abs=1e-9)
        for ways, k in ((both[0], INVERSE_K), (both[1], own_k[index])):
            alone = ways_past_trees(
                one, inverse_k=k, frequency_hz=FREQUENCY_HZ, polarization="vertical", depth_m=depth[index]
            )
            np.testing.assert_allclose(ways.over_db[index], alone.over_db, atol=1e-9)
            np.testing.assert_allclose(ways.through_db[index], alone.through_db, atol=1e-9)
            np.testing.assert_allclose(ways.cheaper_db[index], alone.cheaper_db, atol=1e-9)


@pytest.mark.parametrize("seed", range(6))
def test_the_bound_holds_at_every_k_and_is_met_where_the_smooth_earth_costs_nothing(seed: int) -> None:
    rows = _rows(120, seed=seed)
    ways = ways_past_trees(
        rows,
        inverse_k=INVERSE_K,
        frequency_hz=FREQUENCY_HZ,
        polarization="horizontal",
        depth_m=depth_in_trees_m(rows, k=4.0 / 3.0),
    )
    most = most_db(
        rows,
        ways.over_db[:, -1],
        inverse_k=np.broadcast_to(INVERSE_K, (120, INVERSE_K.size)),
        frequency_hz=FREQUENCY_HZ,
        polarization="horizontal",
    )
    assert np.all(most[:, np.newaxis] >= ways.cheaper_db - 1e-9)
    assert np.all(most[:, np.newaxis] >= ways.over_db - 1e-9)
    assert np.count_nonzero(most == 0.0) > 10
    assert np.count_nonzero(most > 0.0) > 100


def test_samples_stand_for_their_lengths() -> None:
    distance = np.array([[0.0, 1.0, 4.0, 10.0], [0.0, 5.0, 5.0, 10.0]])
    np.testing.assert_array_equal(sample_lengths_m(distance), [[0.5, 2.0, 4.5, 3.0], [2.5, 2.5, 2.5, 2.5]])
    height = np.array([[2.0, 2.0, 2.0, 2.0], [0.0, 4.0, 4.0, 0.0]])
    np.testing.assert_allclose(mean_over_path_m(distance, height), [2.0, 2.0])
    np.testing.assert_allclose(share_of_path(distance, distance > 2.0), [0.75, 0.75])
