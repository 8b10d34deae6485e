"""The choice of relay places: best first, spread apart, one for each block."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from fellspan.design.relay_picks import spread_picks, thinned


def test_the_best_come_first_and_stand_apart() -> None:
    x = np.array([0.0, 5.0, 100.0, 104.0, 300.0])
    picks = spread_picks([3.0, 9.0, 5.0, 7.0, 1.0], x, np.zeros(5), apart_m=50.0, count=3)
    assert picks.tolist() == [1, 3, 4]


def test_nothing_without_a_score_is_picked() -> None:
    picks = spread_picks([np.nan, -np.inf, 2.0], [0.0, 10.0, 20.0], [0.0, 0.0, 0.0], apart_m=0.0, count=5)
    assert picks.tolist() == [2]


@given(st.lists(st.tuples(st.floats(-1e3, 1e3), st.floats(0, 1e3), st.floats(0, 1e3)), max_size=40), st.floats(0, 500))
def test_picks_never_stand_nearer_than_asked(places: list[tuple[float, float, float]], apart: float) -> None:
    score, x, y = (np.array([place[axis] for place in places]) for axis in range(3))
    picks = spread_picks(score, x, y, apart_m=apart, count=10)
    for one, first in enumerate(picks):
        for second in picks[one + 1 :]:
            assert np.hypot(x[first] - x[second], y[first] - y[second]) >= apart
    assert np.all(np.diff(score[picks]) <= 0.0)
    if places:
        assert picks[0] == int(np.argmax(score))


@pytest.mark.parametrize("most", [1, 7, 60, 10_000])
def test_thinning_keeps_the_best_cell_and_no_more_than_asked(most: int) -> None:
    rows, columns = (part.ravel() for part in np.mgrid[0:50, 0:70])
    score = np.random.default_rng(5).normal(size=rows.size)
    kept = thinned(score, rows, columns, most=most)
    assert 1 <= kept.size <= most
    assert int(np.argmax(score)) in kept
    assert np.all(np.diff(kept) > 0)
