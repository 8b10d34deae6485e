"""Heights gathered along polynomials by the compiled loop are those of the sheet's own gather, place by place."""

from pathlib import Path

import numpy as np
import pytest
from made_terrain import raster

from fellspan.screening.ways import NODES, Curves
from fellspan.terrain import sheet_kernel
from fellspan.terrain.sheet import Sheet
from fellspan.terrain.terrain import Terrain

HEIGHT, WIDTH = 70, 110


def sheet_of(tmp_path: Path, *, holes: int) -> Sheet:
    random = np.random.default_rng(7)
    heights = np.round(random.uniform(0.0, 500.0, (HEIGHT, WIDTH)), 1)
    heights[random.integers(0, HEIGHT, holes), random.integers(0, WIDTH, holes)] = -9999.0
    with Terrain.open(ground=raster(tmp_path / "ground.tif", heights)) as terrain:
        sheet = terrain.many.stacks[0].sheet(0)
        assert sheet is not None
        sheet.read_near(np.array([WIDTH / 2]), np.array([HEIGHT / 2]), reach=200.0)
        return sheet


def curves(count: int, *, bent: bool) -> Curves:
    """Paths anywhere on the raster and some way off it; the gather holds them on its edge."""
    random = np.random.default_rng(11)
    column, row = np.zeros((2, NODES, count))
    column[0], row[0] = random.uniform(0.0, WIDTH, count), random.uniform(0.0, HEIGHT, count)
    column[1], row[1] = random.uniform(-60.0, 60.0, (2, count))
    if bent:
        column[2:], row[2:] = random.uniform(-2.0, 2.0, (2, NODES - 2, count)) * random.choice(
            [0.0, 1.0], (NODES - 2, count)
        )
    return Curves(column=column, row=row, is_close=np.ones(count, dtype=np.bool_))


@pytest.mark.parametrize("bent", [False, True])
@pytest.mark.parametrize("places", [1, 37])
@pytest.mark.parametrize("holes", [0, 400])
def test_as_the_sheet_gathers(tmp_path: Path, bent: bool, places: int, holes: int) -> None:
    sheet, along = sheet_of(tmp_path, holes=holes), curves(30, bent=bent)
    random = np.random.default_rng(3)
    which = np.sort(random.integers(0, 30, 90))
    t = np.sort(random.uniform(-1.0, 1.0, (90, places)), axis=1)
    found, whole = sheet.heights_along(along, t, which)
    expected = sheet.heights(*along.at(t, which))
    np.testing.assert_allclose(found, expected, rtol=0.0, atol=1e-9)
    assert whole == bool(np.isfinite(expected).all())
    assert np.isfinite(found).any()
    assert (holes == 0) == whole


def test_places_that_are_no_numbers_stay_on_the_sheet(tmp_path: Path) -> None:
    sheet, along = sheet_of(tmp_path, holes=0), curves(2, bent=False)
    along.column[1, 0], along.row[0, 1] = np.nan, np.inf
    found, _ = sheet.heights_along(along, np.array([[-1.0, 0.0, 1.0]] * 2), np.array([0, 1]))
    assert found.shape == (2, 3)


def test_the_first_the_middle_and_the_last_place_on_a_raster() -> None:
    along = curves(200, bent=True)
    along.column[0, :20] = 5_000.0  # these lie off it
    which, t = np.arange(200)[::-1].copy(), np.linspace(-1.0, 1.0, 61)
    found = np.empty((200, 3), dtype=np.int64)
    sheet_kernel.spread_inside(along.column, along.row, which, t, WIDTH, HEIGHT, 1e-6, found)
    column, row = along.at(np.tile(t, (200, 1)), which)
    inside = (column >= -1e-6) & (column <= WIDTH + 1e-6) & (row >= -1e-6) & (row <= HEIGHT + 1e-6)
    for at, on in zip(found.tolist(), inside, strict=True):
        places = np.flatnonzero(on).tolist()
        assert at == ([places[0], places[(len(places) - 1) // 2], places[-1]] if places else [-1, -1, -1])
    assert 20 <= (found[:, 0] < 0).sum() < 150
