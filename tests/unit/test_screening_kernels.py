"""The compiled loops over many paths say what the functions of `links` and `propagation` say of each path alone."""

from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.special import ndtri

from fellspan.links import clearance
from fellspan.links.criteria import ISOLATED_BAND, ISOLATED_SHARE, are_extended
from fellspan.links.evaluate import governing_rows
from fellspan.links.minima import MINIMA, lowest_minima
from fellspan.links.uncertainty import clearance_variance_m2
from fellspan.links.ways_past_trees import mean_over_path_m
from fellspan.propagation.bullington import _Path, effective_heights_m
from fellspan.propagation.constants import EARTH_RADIUS_M, SPEED_OF_LIGHT_M_S
from fellspan.screening import horizons_kernel, paths_kernel, rays_kernel
from fellspan.terrain.samples import SAME_M, merged

Floats = NDArray[np.float64]

FREQUENCY_HZ = 6.2e9
WAVELENGTH_M = SPEED_OF_LIGHT_M_S / FREQUENCY_HZ
K = np.array([4.0 / 3.0, 0.7])
FRACTION = np.array([1.0, 0.3])
ISOLATED = 0.0


class Paths:
    """Made paths of several lengths in arrays of one width, filled up as the room has them."""

    def __init__(self, seed: int, *, count: int = 40, width: int = 90) -> None:
        random = np.random.default_rng(seed)
        self.last = random.integers(4, width - 1, count)
        self.length = random.uniform(200.0, 40_000.0, count)
        self.distance = np.empty((count, width))
        self.t = np.empty((count, width))
        paths_kernel.equal_steps(self.length, self.last, self.distance, self.t)
        wave = np.cumsum(random.standard_normal((count, width)), axis=1)
        self.surface = np.round(30.0 + 8.0 * wave * random.choice([0.1, 1.0, 3.0], (count, 1)), 1)
        for row, last in enumerate(self.last):
            self.surface[row, last:] = self.surface[row, last]
        self.a = self.surface[:, 0] + random.uniform(0.0, 60.0, count)
        self.b = self.surface[:, -1] + random.uniform(0.0, 60.0, count)
        self.error = random.uniform(0.0, 3.0, (count, width)) * (random.random((count, 1)) < 0.9)
        self.source = random.integers(0, 2, (count, width)).astype(np.int16)
        self.a_error, self.b_error = random.uniform(0.0, 3.0, (2, count))
        self.cell = self.length / self.last * random.uniform(0.5, 4.0, count)
        self.left_out = np.where(random.random((count, width)) < 0.02, self.surface + 30.0, -np.inf)
        self.trees = random.random((count, width)) < 0.1
        self.step = self.length / self.last / 7.3
        self.curve = np.tile(1.0 / (2.0 * EARTH_RADIUS_M * K), (count, 1))
        self.fraction = np.tile(FRACTION, (count, 1))
        self.isolated = np.full(count, ISOLATED)

    def own(self, row: int, values: NDArray[Any]) -> NDArray[Any]:
        """A path's own samples of an array (q, n)."""
        return np.concatenate((values[row, : self.last[row]], values[row, -1:]))

    def filled(self, values: Floats) -> Floats:
        """An array (q, n) with the last sample but one repeated, as after a closer look."""
        found = values.copy()
        for row, last in enumerate(self.last.tolist()):
            found[row, last:-1] = values[row, last - 1]
        return found

    def levels(self, row: int) -> tuple[Floats, Floats, Floats, Floats]:
        """Distance (n,), and normalised clearance, margin and ray above the surface of one path, by `links.clearance`."""
        distance, surface = self.own(row, self.distance), self.own(row, self.surface)
        ray = clearance.available_m(distance, a_amsl_m=self.a[row], b_amsl_m=self.b[row])
        radius = clearance.zone_radius_m(distance, frequency_hz=FREQUENCY_HZ)
        clear = ray - surface - clearance.bulge_m(distance, k=K)
        normalised = clearance.normalised_clearance(clear, radius)
        asked = FRACTION.copy()
        if not are_extended(distance, normalised[1]):
            asked[1] = ISOLATED
        return distance, normalised, clear - asked[:, np.newaxis] * radius, ray - surface


@pytest.mark.parametrize("seed", range(4))
def test_the_closer_look_stands_round_the_lowest_minima(seed: int) -> None:
    paths = Paths(seed)
    more = np.empty(paths.distance.shape, dtype=np.int32)
    total = np.empty(paths.last.size, dtype=np.int64)
    rays_kernel.look(
        paths.distance,
        paths.surface,
        paths.last,
        paths.a,
        paths.b,
        paths.curve,
        paths.fraction,
        paths.isolated,
        WAVELENGTH_M,
        ISOLATED_BAND,
        ISOLATED_SHARE,
        MINIMA,
        paths.step,
        SAME_M,
        more,
        total,
    )
    width = int(total.max()) + 3
    rows = np.arange(paths.last.size)
    new = total - 1 - paths.last
    fine, come_from = np.empty((rows.size, width)), np.empty((rows.size, width), dtype=np.int64)
    t, (row_of, start_of) = np.empty(new.sum()), np.empty((2, new.sum()), dtype=np.int64)
    paths_kernel.with_more(
        rows,
        paths.distance,
        paths.last,
        paths.length,
        more,
        paths.step,
        SAME_M,
        np.cumsum(new) - new,
        fine,
        come_from,
        t,
        row_of,
        start_of,
    )
    isolated = 0
    for row in rows.tolist():
        distance, normalised, margin, _ = paths.levels(row)
        wanted = lowest_minima(np.concatenate((margin, normalised))).any(axis=0)
        regular = np.arange(1, int(paths.length[row] / paths.step[row]) + 1) * paths.step[row]
        near = np.zeros(regular.size, dtype=np.bool_)
        for index in np.flatnonzero(wanted).tolist():
            near |= (regular >= distance[index - 1]) & (regular <= distance[index + 1])
        expected = merged(distance, np.zeros(0), regular[near], float(paths.length[row]))
        found = np.concatenate((fine[row, : total[row] - 1], fine[row, -1:]))
        assert total[row] == expected.size
        np.testing.assert_allclose(found, expected, rtol=0.0, atol=1e-9)
        assert (fine[row, total[row] - 1 : -1] == fine[row, total[row] - 2]).all()
        assert (come_from[row, total[row] - 1 : -1] == come_from[row, total[row] - 2]).all()
        mine = row_of == row
        fresh = come_from[row, : total[row] - 1] >= paths.distance.size
        np.testing.assert_allclose((t[mine] + 1.0) / 2.0 * paths.length[row], fine[row, : total[row] - 1][fresh])
        assert (start_of[mine] // paths.distance.shape[1] == row).all()
        isolated += not are_extended(distance, normalised[1])
    assert 0 < isolated < rows.size


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("wide", [True, False])
def test_what_is_said_of_a_path_is_what_links_says(seed: int, wide: bool) -> None:
    paths = Paths(seed)
    count, width = paths.distance.shape
    error = paths.error if wide else paths.error[:, :1].copy()
    source = paths.source if wide else paths.source[:, :1].copy()
    left_out, trees = (
        (paths.left_out, paths.trees) if wide else (np.empty((count, 0)), np.empty((count, 0), dtype=bool))
    )
    z = float(ndtri(0.9))
    spare, numbers = np.empty((count, width)), np.empty((count, 6))
    answers = np.empty((count, 4), dtype=np.int64)
    rays_kernel.judge(
        paths.distance,
        paths.surface,
        paths.last,
        paths.a,
        paths.b,
        paths.curve,
        paths.fraction,
        paths.isolated,
        float(paths.curve[0, 0]),
        WAVELENGTH_M,
        ISOLATED_BAND,
        ISOLATED_SHARE,
        clearance.TOLERANCE_M,
        clearance.SAME,
        error,
        source,
        paths.a_error,
        paths.b_error,
        paths.cell,
        left_out,
        trees,
        z,
        spare,
        numbers,
        answers,
    )
    seen = set()
    for row in range(count):
        distance, normalised, margin, above = paths.levels(row)
        worst = clearance.worst_indices(normalised, distance)
        most = -margin.min(axis=-1)
        missing = np.where(most > clearance.TOLERANCE_M, most, 0.0)
        governing = int(governing_rows(missing, margin[[0, 1], worst]))
        least = margin.min(axis=0)
        own_error = paths.own(row, np.broadcast_to(error, (count, width)))
        own_source = paths.own(row, np.broadcast_to(source, (count, width)))
        variance = clearance_variance_m2(
            distance,
            own_error,
            a_error_m=paths.a_error[row],
            b_error_m=paths.b_error[row],
            cell_m=paths.cell[row],
            like_a=own_source == own_source[0],
            like_b=own_source == own_source[-1],
            ends_alike=own_source[0] == own_source[-1],
        )
        sigma = np.sqrt(np.maximum(variance, 0.0))
        probability = clearance.probability_met(margin, sigma).min()
        extra = clearance.extra_heights_m(-least, distance)[1]
        for_confidence = clearance.extra_heights_m(z * sigma - least, distance)[1]
        bulge = clearance.bulge_m(distance, k=K[0])
        if wide:
            room = above + paths.own(row, paths.surface) - paths.own(row, paths.left_out) - bulge
            # as `links.doubts.with_doubts`: over own cover too
            for_confidence = max(for_confidence, clearance.extra_heights_m(-room, distance)[1])
        expected = [normalised[governing, worst[governing]], distance[worst[governing]], extra, for_confidence]
        np.testing.assert_allclose(numbers[row, :4], expected, rtol=1e-9, atol=1e-9)
        assert 0.5 * (1.0 + _erf(numbers[row, 4])) == pytest.approx(probability, abs=1e-12)
        middle = distance[np.argmin(np.abs(distance - 0.5 * paths.length[row]))]
        assert numbers[row, 5] == pytest.approx(middle / paths.length[row], rel=1e-12)
        cut = bool(-(above - bulge).min() > clearance.TOLERANCE_M)
        in_trees = over = False
        expected_spare = least
        if wide:
            in_trees = bool((paths.own(row, paths.trees) & (least < 0.0)).any())
            over = bool((-room).max() > clearance.TOLERANCE_M)
            expected_spare = np.minimum(least, room)
        assert answers[row].tolist() == [governing, (missing == 0.0).all(), cut, in_trees + 2 * over]
        np.testing.assert_allclose(paths.own(row, spare), expected_spare, rtol=1e-9, atol=1e-9)
        seen.add(tuple(answers[row, :3].tolist()))
    assert len(seen) >= 4  # paths of one kind would say little


def _erf(z: float) -> float:
    from scipy.special import erf

    return float(erf(z / np.sqrt(2.0)))


@pytest.mark.parametrize("seed", range(4))
def test_horizons_and_the_smooth_earth(seed: int) -> None:
    paths = Paths(seed)
    count = paths.last.size
    curve = np.tile(np.array([4e-8, 1.2e-7, 0.0, -3e-8]), (count, 1))
    found = np.empty((3, count, 4))
    along, surfaces = paths.filled(paths.distance), paths.filled(paths.surface)
    horizons_kernel.horizons(along, surfaces, paths.a, paths.b, curve, found)
    level = np.empty((3, count, 4))
    horizons_kernel.horizons(along, np.empty((count, 0)), paths.a, paths.b, curve, level)
    ends, mean = np.empty((2, count)), np.empty(count)
    horizons_kernel.smooth_ends(along, surfaces, paths.a, paths.b, ends, mean)
    free = 0
    for row in range(count):
        distance, surface = paths.own(row, paths.distance), paths.own(row, paths.surface)
        a, b = np.asarray(paths.a[row]), np.asarray(paths.b[row])
        for number in range(4):
            with np.errstate(divide="ignore"):
                path = _Path(distance, 1.0 / (2.0 * EARTH_RADIUS_M * curve[row, number]), FREQUENCY_HZ)
            np.testing.assert_allclose(found[:, row, number], path._maxima(surface, a, b), rtol=1e-9, atol=1e-12)
            np.testing.assert_allclose(level[:, row, number], path._maxima(np.zeros(1), a, b), rtol=1e-9, atol=1e-12)
            free += bool(found[0, row, number] < 0.0)
        expected = np.stack(effective_heights_m(distance, surface, a_amsl_m=a, b_amsl_m=b))
        np.testing.assert_allclose([a - ends[0, row], b - ends[1, row]], expected, rtol=1e-9, atol=1e-9)
        assert mean[row] == pytest.approx(mean_over_path_m(distance, surface), rel=1e-12)
    assert 0 < free < 4 * count


@pytest.mark.parametrize("seed", range(20))
def test_equal_values_are_taken_in_the_order_of_links(seed: int) -> None:
    random = np.random.default_rng(seed)
    values = random.integers(0, 4, 40).astype(float)
    values[0] = values[-1] = np.inf
    wanted = np.zeros(40, dtype=np.bool_)
    rays_kernel._mark_lowest(values, 39, MINIMA, np.empty(MINIMA), np.empty(MINIMA, dtype=np.int64), wanted)
    assert wanted.tolist() == lowest_minima(values).tolist()
    distance = np.linspace(0.0, 780.0, 40)
    worst = rays_kernel._worst(distance, values, 39, clearance.SAME)
    assert worst == clearance.worst_index(values, distance)
