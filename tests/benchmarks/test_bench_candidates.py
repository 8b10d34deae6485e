"""Candidates against a bare NumPy bilinear gather of the same samples, and against a loop over pairs with rasterio.

One raster of 25 million cells, pairs of about 300 samples, twenty hubs. The gather takes the columns and rows of the very
samples that the pairs are judged on, worked out beforehand, from an array in memory, on one thread. Candidates run as asked:
positions, sampling, the closer look, two criteria, delta-Bullington and level on two threads; availability and the draws of the
confidence are measured apart and printed (pytest -s).
"""

import time
from collections.abc import Callable

import numpy as np
import pytest
import rasterio
from affine import Affine
from made_screening import candidates
from made_terrain import NORTH, TO_DEGREES, TO_GRID, WEST
from numpy.typing import NDArray
from pyproj import Geod

import fellspan.screening.batch as batch
import fellspan.screening.signal as signal
from fellspan.screening.pairs import Candidates, SiteColumns
from fellspan.screening.profiles import Profiles
from fellspan.screening.screen import screen_pairs
from fellspan.screening.signal_fading import Shares
from fellspan.terrain.terrain import Terrain

pytestmark = [pytest.mark.bench, pytest.mark.slow]

CELLS, CELL_M, HUBS, PAIRS = 5000, 10.0, 20, 40_000
MOST_GATHERS, LEAST_LOOPS = 3.0, 200.0


@pytest.fixture(scope="module")
def terrain(tmp_path_factory: pytest.TempPathFactory) -> "Terrain":
    path = tmp_path_factory.mktemp("relief") / "relief.tif"
    random = np.random.default_rng(1)
    wave = np.hypot(*np.meshgrid(np.fft.rfftfreq(CELLS), np.fft.fftfreq(CELLS)))
    wave[0, 0] = 1.0
    spectrum = (random.standard_normal(wave.shape) + 1j * random.standard_normal(wave.shape)) * wave**-2.6
    ground = np.fft.irfft2(spectrum, s=(CELLS, CELLS))
    ground = 300.0 + 90.0 * (ground - ground.mean()) / ground.std()
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        width=CELLS,
        height=CELLS,
        count=1,
        dtype="float32",
        crs="EPSG:32623",
        transform=Affine(CELL_M, 0.0, WEST, 0.0, -CELL_M, NORTH),
        tiled=True,
    ) as file:
        file.write(ground.astype(np.float32), 1)
    return Terrain.open(ground=path)


def columns(letter: str, x: NDArray[np.float64], y: NDArray[np.float64], height_m: float) -> SiteColumns:
    longitude, latitude = TO_DEGREES.transform(x, y)
    return SiteColumns(
        name=tuple(f"{letter}{number}" for number in range(x.size)),
        latitude_deg=np.asarray(latitude),
        longitude_deg=np.asarray(longitude),
        height_m=np.full(x.size, height_m),
        height_reference=np.zeros(x.size, dtype=np.int8),
        roof_m=np.full(x.size, np.nan),
    )


def pairs(count: int, *, seed: int = 3) -> tuple[Candidates, NDArray[np.int64], NDArray[np.int64]]:
    """Places 300 m to 2.7 km round their hubs: 300 samples of half a cell on average."""
    random = np.random.default_rng(seed)
    inside = CELLS * CELL_M - 6000.0
    hub_x, hub_y = WEST + 3000.0 + random.random(HUBS) * inside, NORTH - 3000.0 - random.random(HUBS) * inside
    hub = np.repeat(np.arange(HUBS), count // HUBS)
    angle, away = random.random(hub.size) * 2.0 * np.pi, random.uniform(300.0, 2700.0, hub.size)
    places = columns("P", hub_x[hub] + away * np.sin(angle), hub_y[hub] + away * np.cos(angle), 10.0)
    return (
        candidates(columns("H", hub_x, hub_y, 25.0), places, target_availability_percent=None),
        hub,
        np.arange(hub.size),
    )


def bare_gather(
    cells: NDArray[np.float64], column: NDArray[np.float64], row: NDArray[np.float64]
) -> NDArray[np.float64]:
    u, v = column - 0.5, row - 0.5
    i, j = np.floor(v).astype(np.int64), np.floor(u).astype(np.int64)
    down, across = v - i, u - j
    upper = cells[i, j] * (1.0 - across) + cells[i, j + 1] * across
    lower = cells[i + 1, j] * (1.0 - across) + cells[i + 1, j + 1] * across
    return upper * (1.0 - down) + lower * down


def quickest(work: Callable[[], object], times: int) -> float:
    best = float("inf")
    for _ in range(times):
        begun = time.perf_counter()
        work()
        best = min(best, time.perf_counter() - begun)
    return best


def without_weather_and_draws(monkeypatch: pytest.MonkeyPatch) -> None:
    def no_shares(_: Candidates, rows: object, *args: object, **kwargs: object) -> Shares:
        none = np.full(rows.length_m.size, np.nan)  # type: ignore[attr-defined]
        return Shares(both_percent=none, each_percent=(none, none), nearly_percent=(none, none))

    monkeypatch.setattr(signal, "shares_of_year", no_shares)
    monkeypatch.setattr(batch.Batch, "_after_draws", lambda *_, **__: np.zeros(0, dtype=np.int64))


def test_everything_costs_at_most_three_bare_gathers(terrain: Terrain, monkeypatch: pytest.MonkeyPatch) -> None:
    made, hub, place = pairs(PAIRS)
    taken: list[tuple[NDArray[np.float64], NDArray[np.float64]]] = []
    original = batch.Batch._bucket

    def kept(self: batch.Batch, profiles: Profiles, *args: object) -> object:
        own = np.arange(profiles.distance_m.shape[1]) <= profiles.last[:, np.newaxis]
        t = 2.0 * profiles.distance_m / profiles.length_m[:, np.newaxis] - 1.0
        column, row = self._laid._stacks[0].curves[0].at(t, profiles.which)
        taken.append((column[own], row[own]))
        return original(self, profiles, *args)  # type: ignore[arg-type]

    with monkeypatch.context() as patched:
        patched.setattr(batch.Batch, "_bucket", kept)
        without_weather_and_draws(patched)
        screen_pairs(made, hub=hub, place=place, terrain=terrain, threads=1)
    samples = sum(column.size for column, _ in taken)
    sheet = terrain.many.stacks[0].sheet(0)
    assert sheet is not None
    cells = sheet._cells

    def gather() -> None:
        for column, row in taken:
            bare_gather(cells, column, row)

    with monkeypatch.context() as patched:
        without_weather_and_draws(patched)
        ratios = []
        for _ in range(5):
            bare = quickest(gather, 1)
            whole = quickest(lambda: screen_pairs(made, hub=hub, place=place, terrain=terrain), 1)
            ratios.append(whole / bare)
            print(
                f"bare {1e6 * bare / PAIRS:.1f} us, all of it {1e6 * whole / PAIRS:.1f} us a pair, {ratios[-1]:.2f} gathers"
            )
    with monkeypatch.context() as patched:
        drawn: list[int] = []
        patched.setattr("fellspan.screening.screen.draw_single", lambda *args, **_: drawn.append(args[2]))
        full = quickest(lambda: screen_pairs(made, hub=hub, place=place, terrain=terrain), 2)
    print(
        f"{samples / PAIRS:.0f} samples a pair; with availability and bounds of the draws {1e6 * full / PAIRS:.1f} us a pair;"
    )
    print(f"draws decide on {len(set(drawn))} of {PAIRS}")
    assert min(ratios) < MOST_GATHERS


def test_far_faster_than_a_loop_over_pairs(terrain: Terrain, monkeypatch: pytest.MonkeyPatch) -> None:
    made, hub, place = pairs(PAIRS)
    without_weather_and_draws(monkeypatch)
    geod, few = Geod(ellps="WGS84"), 40
    hubs, places = made.hubs, made.places

    def loop() -> None:
        with rasterio.open(terrain.layers.ground.files[0].path) as file:
            for pair in range(0, PAIRS, PAIRS // few):
                a = hubs.longitude_deg[hub[pair]], hubs.latitude_deg[hub[pair]]
                b = places.longitude_deg[place[pair]], places.latitude_deg[place[pair]]
                _, _, length = geod.inv(*a, *b)
                points = geod.npts(*a, *b, max(1, int(length / (CELL_M / 2.0)) - 1))
                x, y = TO_GRID.transform(*np.transpose(points))
                list(file.sample(zip(x, y, strict=True)))

    screen_pairs(made, hub=hub, place=place, terrain=terrain)
    looped = quickest(loop, 2) / few
    whole = quickest(lambda: screen_pairs(made, hub=hub, place=place, terrain=terrain), 2) / PAIRS
    print(f"loop {1e6 * looped:.0f} us, arrays {1e6 * whole:.1f} us a pair: {looped / whole:.0f} times")
    assert looped > LEAST_LOOPS * whole


def test_time_is_linear_in_pairs(terrain: Terrain, monkeypatch: pytest.MonkeyPatch) -> None:
    without_weather_and_draws(monkeypatch)
    many, few = pairs(PAIRS), pairs(PAIRS // 4)
    for made, hub, place in (few, many):
        screen_pairs(made, hub=hub, place=place, terrain=terrain)
    ratios = []
    for _ in range(3):
        times = [
            quickest(
                lambda made=made, hub=hub, place=place: screen_pairs(made, hub=hub, place=place, terrain=terrain), 1
            )
            for made, hub, place in (few, many)
        ]
        ratios.append(times[1] / times[0])
    print("four times the pairs take", [f"{ratio:.2f}" for ratio in ratios], "times as long")
    assert min(ratios) < 5.0
