"""The complete delta-Bullington method against pycraf 2.1 (P.452-16, written independently) over real terrain.

The terrain is the elevation sample that matplotlib ships (SRTM, 3 arc seconds, Cumberland Mountains). pycraf gives the median
diffraction loss, the smooth-surface levels and Bullington's nu; it rounds the constants of the spherical part (0.036, 21.88,
0.9575, 17.456), which is all that remains between the two. It mixes sea and land with the percentage scaled twice for land, so
that 100 % sea gives sea + 0.99 land; the sea's own loss is recovered from that.
"""

import warnings
from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from scipy.ndimage import map_coordinates

from fellspan.propagation import (
    bullington_loss_db,
    delta_bullington_loss_db,
    effective_heights_m,
    knife_edge_loss_db,
)

FREQUENCIES_GHZ = (0.3, 0.45, 0.9, 2.4, 5.8, 23.0)
POLARIZATIONS = ("horizontal", "vertical")
LAPSE_N_PER_KM = 39.0
K = 157.0 / (157.0 - LAPSE_N_PER_KM)
PATHS, POINTS = 60, 201
CELL_EAST_M, CELL_NORTH_M = 74.4, 92.5
"""3 arc seconds at 36.6 N, rounded: both programs get the same profile, so only the order of size matters."""


@dataclass(frozen=True, kw_only=True)
class Paths:
    distance_m: np.ndarray
    ground_m: np.ndarray
    mast_a_m: np.ndarray
    mast_b_m: np.ndarray

    @property
    def ends(self) -> dict[str, np.ndarray]:
        return {"a_amsl_m": self.ground_m[:, 0] + self.mast_a_m, "b_amsl_m": self.ground_m[:, -1] + self.mast_b_m}


@pytest.fixture(scope="module")
def paths() -> Paths:
    from matplotlib.cbook import get_sample_data

    with get_sample_data("jacksboro_fault_dem.npz") as sample:
        elevation = sample["elevation"].astype(float)
    random = np.random.default_rng(526)
    long = _draw(random, elevation, count=40, reach_cells=400)
    short = _draw(random, elevation, count=600, reach_cells=30)
    # Of the short ones the most level stretches, where the spherical part takes over from the edges.
    roughness = np.std(np.diff(short[1], axis=1), axis=1)
    level = np.argsort(roughness / short[0][:, -1] * POINTS)[:20]
    distance_m, ground_m = (np.concatenate((a, b[level])) for a, b in zip(long, short, strict=True))
    return Paths(
        distance_m=distance_m,
        ground_m=ground_m,
        mast_a_m=np.concatenate((random.uniform(3.0, 60.0, 40), random.uniform(1.0, 6.0, 20))),
        mast_b_m=np.concatenate((random.uniform(3.0, 60.0, 40), random.uniform(1.0, 6.0, 20))),
    )


def _draw(
    random: np.random.Generator, elevation: np.ndarray, *, count: int, reach_cells: int
) -> tuple[np.ndarray, np.ndarray]:
    """Distances and heights of straight paths between random points of the raster, bilinear."""
    last = np.array(elevation.shape) - 1
    a = random.uniform((0, 0), last, size=(count, 2))
    b = np.clip(a + random.uniform(-reach_cells, reach_cells, size=(count, 2)), 0, last)
    along = np.linspace(0.0, 1.0, POINTS)
    place = a[:, :, None] + (b - a)[:, :, None] * along
    length = np.hypot(*((b - a) * (CELL_NORTH_M, CELL_EAST_M)).T)
    return length[:, None] * along, map_coordinates(elevation, place.swapaxes(0, 1), order=1)


@dataclass(frozen=True, kw_only=True)
class Theirs:
    loss_db: np.ndarray
    level_a_m: np.ndarray
    level_b_m: np.ndarray
    nu_real: np.ndarray
    nu_smooth: np.ndarray


def _pycraf(paths: Paths, frequencies_ghz: tuple[float, ...], sea_percent: float = 0.0) -> Theirs:
    """Everything in shape (frequencies, polarizations, paths)."""
    with warnings.catch_warnings():
        # pycraf imports astropy's old test runner, which says that it is deprecated.
        warnings.filterwarnings("ignore", message="The TestRunner")
        from astropy import units
        from pycraf import conversions, pathprof

    def one(ghz: float, word: str, path: int) -> tuple[float, ...]:
        prop: Any = pathprof.PathProp(
            ghz * units.GHz,
            290.0 * units.K,
            1013.0 * units.hPa,
            *(0.0 * units.deg, 0.0 * units.deg, 0.3 * units.deg, 0.0 * units.deg),
            paths.mast_a_m[path] * units.m,
            paths.mast_b_m[path] * units.m,
            30.0 * units.m,
            50.0 * units.percent,
            omega=sea_percent * units.percent,
            polarization=POLARIZATIONS.index(word),
            version=16,
            delta_N=LAPSE_N_PER_KM * conversions.dimless / units.km,
            N0=315.0 * conversions.dimless,
            hprof_dists=paths.distance_m[path] / 1000.0 * units.km,
            hprof_heights=paths.ground_m[path] * units.m,
            hprof_bearing=90.0 * units.deg,
            hprof_backbearing=-90.0 * units.deg,
        )
        median = pathprof.loss_diffraction(prop)[0].value
        fields = (prop.h_std, prop.h_srd, prop.nu_bull_50, prop.nu_bull_zh_50)
        return (median, *(float(getattr(field, "value", field)) for field in fields))

    table = np.array(
        [[[one(f, word, p) for p in range(paths.mast_a_m.size)] for word in POLARIZATIONS] for f in frequencies_ghz]
    )
    return Theirs(**dict(zip(Theirs.__annotations__, np.moveaxis(table, -1, 0), strict=True)))


@pytest.fixture(scope="module")
def theirs(paths: Paths) -> Theirs:
    return _pycraf(paths, FREQUENCIES_GHZ)


FREQUENCY_HZ = np.array(FREQUENCIES_GHZ)[:, None, None] * 1e9


def _with_edge(nu: np.ndarray, length_m: np.ndarray) -> np.ndarray:
    """P.452-16, equations (22) and (23), from pycraf's nu."""
    edge = np.asarray(knife_edge_loss_db(nu))
    return edge + (1 - np.exp(-edge / 6)) * (10 + 0.02 * length_m / 1000)


def test_smooth_surface(paths: Paths, theirs: Theirs) -> None:
    height_a, height_b = effective_heights_m(paths.distance_m, paths.ground_m, **paths.ends)
    np.testing.assert_allclose(paths.ends["a_amsl_m"] - height_a, theirs.level_a_m[0, 0], atol=1e-8)
    np.testing.assert_allclose(paths.ends["b_amsl_m"] - height_b, theirs.level_b_m[0, 0], atol=1e-8)


def test_bullington_parts(paths: Paths, theirs: Theirs) -> None:
    length = paths.distance_m[:, -1]
    wave = {"frequency_hz": FREQUENCY_HZ, "k": K}
    real = bullington_loss_db(paths.distance_m, paths.ground_m, **paths.ends, **wave)
    np.testing.assert_allclose(real, _with_edge(theirs.nu_real, length)[:, :1], atol=1e-8)
    a, b = effective_heights_m(paths.distance_m, paths.ground_m, **paths.ends)
    smooth = bullington_loss_db(paths.distance_m, 0 * paths.ground_m, a_amsl_m=a, b_amsl_m=b, **wave)
    np.testing.assert_allclose(smooth, _with_edge(theirs.nu_smooth, length)[:, :1], atol=1e-8)


def _ours(paths: Paths, frequency_hz: np.ndarray) -> np.ndarray:
    return np.asarray(
        delta_bullington_loss_db(
            paths.distance_m,
            paths.ground_m,
            **paths.ends,
            frequency_hz=frequency_hz,
            k=K,
            polarization=np.array(POLARIZATIONS)[:, None],
        )
    )


def test_complete_method(paths: Paths, theirs: Theirs) -> None:
    ours = _ours(paths, FREQUENCY_HZ)
    assert ours.shape == (len(FREQUENCIES_GHZ), len(POLARIZATIONS), PATHS)
    np.testing.assert_allclose(ours, theirs.loss_db, atol=0.01, rtol=0)
    # The comparison means something: clear, obstructed and spherical cases all occur.
    spherical_part = theirs.loss_db - _with_edge(theirs.nu_real, paths.distance_m[:, -1])
    assert np.count_nonzero(spherical_part > 0.5) >= 40
    assert np.count_nonzero(theirs.nu_real > 0) >= 40
    assert np.count_nonzero(theirs.loss_db == 0) >= 40


def test_rounded_constant_shows_at_100_mhz_vertical(paths: Paths) -> None:
    """Low antennas there sit at the floor of the height gain, 2 + 20 log K, and pycraf's K has 0.036 for 0.036273."""
    horizontal, vertical = np.abs(_ours(paths, np.array([[[0.1e9]]])) - _pycraf(paths, (0.1,)).loss_db)[0]
    assert horizontal.max() < 0.01
    assert 0.05 < vertical.max() < 2 * 20 * np.log10(0.036273 / 0.036)  # both ends on the floor: 0.131 dB


def test_sea_over_the_horizon() -> None:
    distance = np.linspace(0.0, 60e3, POINTS)[None, :].repeat(8, axis=0)
    masts = np.linspace(2.0, 30.0, 8)
    flat = Paths(distance_m=distance, ground_m=0 * distance, mast_a_m=masts, mast_b_m=masts[::-1])
    frequencies = (0.3, 0.9)
    land = _pycraf(flat, frequencies).loss_db
    sea = _pycraf(flat, frequencies, 100.0).loss_db - 0.99 * land
    ours = delta_bullington_loss_db(
        flat.distance_m,
        flat.ground_m,
        **flat.ends,
        frequency_hz=np.array(frequencies)[:, None, None] * 1e9,
        k=K,
        polarization=np.array(POLARIZATIONS)[:, None],
        sea_fraction=1.0,
    )
    # One low end may sit on the floor of the height gain, where the rounded 0.036 costs 0.0656 dB.
    np.testing.assert_allclose(ours, sea, atol=20 * np.log10(0.036273 / 0.036) + 0.002, rtol=0)
    np.testing.assert_allclose(ours[:, 0], sea[:, 0], atol=0.01, rtol=0)
    assert np.abs(sea - land)[:, 1].max() > 1.0  # vertical polarization feels the sea
