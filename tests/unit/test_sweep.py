"""The sweep over terrain: rays where they belong, cells that say what a path to them says, gaps, cover and other rasters."""

from pathlib import Path

import numpy as np
import pytest
import rasterio
import rasterio.warp
from affine import Affine
from made_relief import CRS, SOUTH_M, WEST_M, relief_m, write_relief

from fellspan.design import sweep as sweeping
from fellspan.design.sweep import HeightField, height_field, polar_field
from fellspan.errors import FellspanError, LinkError, TerrainGapError
from fellspan.geodesy.geodesic import WGS84_GEOD
from fellspan.geodesy.position import Position
from fellspan.geodesy.transforms import transformer
from fellspan.links.clearance import need_m
from fellspan.links.criteria import Criterion
from fellspan.links.own_building import standing
from fellspan.links.site import Site
from fellspan.terrain import plates, surroundings
from fellspan.terrain.handles import HandlePool
from fellspan.terrain.rays import rays_around
from fellspan.terrain.sources import CoverSource, RasterSource
from fellspan.terrain.surroundings import Surroundings
from fellspan.terrain.terrain import Terrain

FREQUENCY_HZ, CELL_M, SIDE = 5.8e9, 30.0, 160
RULES = (
    Criterion(name="0.6 F1", k=4 / 3, fraction=0.6, source="common practice"),
    Criterion(name="sight at low k", k=0.7, fraction=0.0, source="common practice"),
)
MIDDLE = WEST_M + 0.5 * SIDE * CELL_M, SOUTH_M + 0.5 * SIDE * CELL_M


def position(x: float, y: float) -> Position:
    longitude, latitude = transformer(CRS, "EPSG:4326").transform(x, y)
    return Position(latitude_deg=latitude, longitude_deg=longitude)


HERE = position(MIDDLE[0] + 7.0, MIDDLE[1] - 11.0)
SITE = Site(name="Knoll", position=HERE, height_m=15.0)


@pytest.fixture(scope="module")
def relief(tmp_path_factory: pytest.TempPathFactory) -> Path:
    heights = relief_m(SIDE, spread_m=60.0)
    return write_relief(tmp_path_factory.mktemp("sweep") / "relief.tif", heights, cell_m=CELL_M, nodata=-9999.0)


def field_of(terrain: Terrain, *, radius_m: float = 2_200.0, site: Site = SITE, **more: object) -> HeightField:
    asked = {"site": site, "frequency_hz": FREQUENCY_HZ, "criteria": RULES, "radius_m": radius_m, **more}
    return height_field(terrain, **asked)  # type: ignore[arg-type]


def by_path(terrain: Terrain, field: HeightField, row: int, column: int, *, step_m: float | None = None) -> float:
    """The height needed at a cell, from the profile of the path to it and the need of `links`."""
    latitude, longitude = field.grid.positions(np.array([column + 0.5]), np.array([row + 0.5]))
    there = Position(latitude_deg=float(latitude[0]), longitude_deg=float(longitude[0]))
    profile = terrain.profile(a=field.site.position, b=there, step_m=step_m)
    surface = standing(profile).surface_m
    share = (profile.distance_m / profile.length_m)[1:-1]
    levels = []
    for rule in RULES:
        need = need_m(surface, profile.distance_m, k=rule.k, fraction=rule.fraction, frequency_hz=FREQUENCY_HZ)[1:-1]
        levels.append(float(((need - field.antenna_amsl_m * (1.0 - share)) / share).max()))
    assert abs(profile.length_m - field.distance_m[row, column]) < 0.01 * CELL_M
    return max(max(levels) - float(profile.ground_m[-1]), 0.0)


def errors_m(
    terrain: Terrain, field: HeightField, count: int, *, near_m: float = 300.0
) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(4)
    known = np.argwhere(np.isfinite(field.needed_m) & (field.distance_m > near_m))
    chosen = known[rng.integers(0, len(known), count)]
    true = np.array([by_path(terrain, field, row, column, step_m=CELL_M / 16) for row, column in chosen])
    return np.array([field.needed_m[row, column] for row, column in chosen]) - true, true


def test_rays_lie_on_their_geodesics(relief: Path) -> None:
    rays = rays_around(HERE, reach_m=2_000.0, step_m=10.0, apart_m=30.0)
    with Terrain.open(ground=relief) as terrain:
        got = Surroundings(terrain, rays).samples(0, rays.held).ground_m
        for ray in (0, 7, rays.held - 1):
            start = (
                np.full(rays.distance_m.shape, HERE.longitude_deg),
                np.full(rays.distance_m.shape, HERE.latitude_deg),
            )
            bearing = np.full(rays.distance_m.shape, rays.bearing_deg[ray])
            longitude, latitude, _ = WGS84_GEOD.fwd(*start, bearing, rays.distance_m)
            true = terrain.layers.ground.sample_positions(latitude, longitude).value_m
            # a hundredth of a cell aside on slopes of up to 1 in 1, and 4 bytes a height
            np.testing.assert_allclose(got[ray], true, rtol=0.0, atol=0.01 * CELL_M * 0.5)


def test_fifty_rays_over_terrain_equal_the_maximum_over_their_samples(relief: Path) -> None:
    asked = {"site": SITE, "frequency_hz": FREQUENCY_HZ, "criteria": RULES, "radius_m": 2_000.0}
    with Terrain.open(ground=relief) as terrain:
        polar = polar_field(terrain, **asked, step_m=15.0, rays=50)  # type: ignore[arg-type]
    assert polar.level_m.shape == (50, 134)
    distance = polar.rays.distance_m
    for ray in range(50):
        for target in (1, 9, 50, 133):
            j = int(np.flatnonzero(polar.rays.target == target)[0])
            path = np.concatenate(([0.0], distance[: j + 1]))
            surface = np.concatenate(([0.0], polar.surface_m[ray, : j + 1]))
            share = (path / path[-1])[1:-1]
            levels = []
            for rule in RULES:
                need = need_m(surface, path, k=rule.k, fraction=rule.fraction, frequency_hz=FREQUENCY_HZ)[1:-1]
                levels.append(((need - polar.antenna_amsl_m * (1.0 - share)) / share).max())
            # 1e-9 m: what is promised
            assert polar.level_m[ray, target] == pytest.approx(max(levels), rel=0.0, abs=1e-9)


def test_cells_say_what_the_path_to_them_says(relief: Path) -> None:
    with Terrain.open(ground=relief) as terrain:
        field = field_of(terrain)
        errors, true = errors_m(terrain, field, 150)
    useful = true <= 40.0  # masts that people build
    assert useful.sum() > 60
    assert np.median(np.abs(errors[useful])) < 0.02
    assert np.percentile(np.abs(errors[useful]), 95) < 0.5
    assert ((true <= 10.0) == (true + errors <= 10.0)).mean() >= 0.98


def test_cover_counts_but_not_what_either_end_stands_on(relief: Path, tmp_path: Path) -> None:
    trees = np.zeros((2 * SIDE, 2 * SIDE), dtype=np.float32)
    trees[40:60, 100:240] = 14.0
    trees[2 * SIDE // 2 - 2 : 2 * SIDE // 2 + 3, 2 * SIDE // 2 - 2 : 2 * SIDE // 2 + 3] = 9.0  # around the site
    cover = write_relief(tmp_path / "trees.tif", trees, cell_m=0.5 * CELL_M)
    with (
        Terrain.open(ground=relief, cover=CoverSource(path=cover, kind="tree")) as terrain,
        Terrain.open(ground=relief) as bare,
    ):
        field, without = field_of(terrain), field_of(bare)
        errors, true = errors_m(terrain, field, 120)
    known = np.isfinite(field.needed_m)
    assert field.shape == without.shape
    assert (field.needed_m[known] >= without.needed_m[known] - 0.3).all()
    assert (field.needed_m - without.needed_m)[known].max() > 5.0
    assert np.median(np.abs(errors[true <= 40.0])) < 0.05
    assert ((true <= 10.0) == (true + errors <= 10.0)).mean() >= 0.95


def test_an_obstacle_of_a_file_casts_its_shadow(relief: Path, tmp_path: Path) -> None:
    behind, mast = position(MIDDLE[0] + 1_500.0, MIDDLE[1] - 11.0), position(MIDDLE[0] + 300.0, MIDDLE[1] - 11.0)
    file = tmp_path / "wall.csv"
    file.write_text(
        "name,kind,latitude_deg,longitude_deg,height_m,radius_m\n"
        f"Silo,building,{mast.latitude_deg:.7f},{mast.longitude_deg:.7f},80,40\n",
        encoding="utf-8",
    )
    with Terrain.open(ground=relief, obstacles=file) as terrain, Terrain.open(ground=relief) as bare:
        rose = field_of(terrain).needed_m - (without := field_of(bare)).needed_m
    latitude, longitude = behind.latitude_deg, behind.longitude_deg
    x, y = transformer("EPSG:4326", CRS).transform(longitude, latitude)
    column, row = (int(v) for v in ~without.transform @ (x, y))
    assert rose[row, column] > 50.0
    assert np.nanmax(np.abs(rose[:, : column // 2])) < 1e-3  # nothing on the other side


def test_a_gap_is_no_answer_there_and_beyond(relief: Path, tmp_path: Path) -> None:
    heights = relief_m(SIDE, spread_m=60.0)
    heights[60:75, 90:100] = -9999.0
    holed = write_relief(tmp_path / "holed.tif", heights, cell_m=CELL_M, nodata=-9999.0)
    with Terrain.open(ground=holed) as terrain, Terrain.open(ground=relief) as whole:
        field, known = field_of(terrain), field_of(whole)
        sea = field_of(Terrain.open(ground=holed, gaps="sea"))
    lost = np.isnan(field.needed_m) & np.isfinite(known.needed_m)
    assert lost.any()
    same = np.isfinite(field.needed_m)
    unlike = np.abs(field.needed_m - known.needed_m)[same] > 1e-3
    assert unlike.mean() < 0.005  # on the rim of the hole, where fewer cells say what the height is
    assert np.isfinite(sea.needed_m[lost]).all()


def test_a_window_says_what_the_whole_says(relief: Path) -> None:
    low, high = position(MIDDLE[0] + 500.0, MIDDLE[1] + 300.0), position(MIDDLE[0] + 1_400.0, MIDDLE[1] + 1_100.0)
    bounds = low.longitude_deg, low.latitude_deg, high.longitude_deg, high.latitude_deg
    with Terrain.open(ground=relief) as terrain:
        whole, part = field_of(terrain), field_of(terrain, window=bounds)
    assert part.needed_m.size < 0.1 * whole.needed_m.size
    column, row = (round(v) for v in ~whole.transform @ (part.transform @ (0.0, 0.0)))
    rows, columns = part.shape
    same = whole.needed_m[row : row + rows, column : column + columns]
    both = np.isfinite(same) & np.isfinite(part.needed_m)
    assert both.mean() > 0.95
    assert np.median(np.abs(same[both] - part.needed_m[both])) < 0.02
    assert np.percentile(np.abs(same[both] - part.needed_m[both]), 95) < 1.0


def test_coarse_cells_are_squares_of_the_rasters_own(relief: Path) -> None:
    with Terrain.open(ground=relief) as terrain:
        fine, coarse = field_of(terrain), field_of(terrain, cell_m=120.0)
    assert coarse.transform.a == pytest.approx(4 * fine.transform.a)
    assert coarse.cell_m == pytest.approx(120.0, rel=0.01)
    assert coarse.needed_m.size < fine.needed_m.size / 12
    assert abs(np.nanmean(coarse.needed_m <= 10.0) - np.nanmean(fine.needed_m <= 10.0)) < 0.03


def test_tiles_in_other_systems_say_the_same(relief: Path, tmp_path: Path) -> None:
    """The western half as it is, the eastern half warped to degrees."""
    with rasterio.open(relief) as dataset:
        heights, transform, crs = dataset.read(1), dataset.transform, dataset.crs
    west = write_relief(tmp_path / "west.tif", heights[:, :90].copy(), cell_m=CELL_M, nodata=-9999.0)
    low, high = position(WEST_M + 85 * CELL_M, SOUTH_M), position(WEST_M + SIDE * CELL_M, SOUTH_M + SIDE * CELL_M)
    step = 2.0e-4
    shape = int((high.latitude_deg - low.latitude_deg) / step), int((high.longitude_deg - low.longitude_deg) / step)
    placed = Affine(step, 0.0, low.longitude_deg, 0.0, -step, high.latitude_deg)
    warped = np.full(shape, -9999.0, dtype=np.float32)
    rasterio.warp.reproject(
        heights, warped, src_transform=transform, src_crs=crs, dst_transform=placed, dst_crs="EPSG:4326",
        src_nodata=-9999.0, dst_nodata=-9999.0, resampling=rasterio.warp.Resampling.cubic, num_threads=1,
    )  # fmt: skip
    east = tmp_path / "east.tif"
    with rasterio.open(
        east, "w", driver="GTiff", height=shape[0], width=shape[1], count=1, dtype="float32", crs="EPSG:4326",
        transform=placed, nodata=-9999.0,
    ) as dataset:  # fmt: skip
        dataset.write(warped, 1)
    with Terrain.open(ground=relief) as one, Terrain.open(ground=[west, east]) as two:
        alone = field_of(one)
        joined = field_of(two, site=Site(name="K", position=position(WEST_M + 70.3 * CELL_M, MIDDLE[1]), height_m=15.0))
        again = field_of(one, site=Site(name="K", position=position(WEST_M + 70.3 * CELL_M, MIDDLE[1]), height_m=15.0))
    assert alone.shape == again.shape or abs(alone.shape[0] - again.shape[0]) <= 1
    assert joined.shape == again.shape
    both = np.isfinite(joined.needed_m) & np.isfinite(again.needed_m)
    assert both.sum() > 0.9 * np.isfinite(again.needed_m).sum()
    assert np.median(np.abs(joined.needed_m[both] - again.needed_m[both])) < 0.3
    assert ((joined.needed_m <= 10.0) == (again.needed_m <= 10.0))[both].mean() > 0.97


def test_the_antimeridian_is_no_edge(tmp_path: Path) -> None:
    heights = relief_m(120, spread_m=30.0)
    step = 3.0e-4
    fields = []
    for west in (179.985, 20.0):
        file = tmp_path / f"at{west:g}.tif"
        with rasterio.open(
            file, "w", driver="GTiff", height=120, width=120, count=1, dtype="float32", crs="EPSG:4326",
            transform=Affine(step, 0.0, west, 0.0, -step, 10.0),
        ) as dataset:  # fmt: skip
            dataset.write(heights, 1)
        longitude = west + 60 * step
        here = Position(
            latitude_deg=10.0 - 60 * step, longitude_deg=longitude - 360.0 if longitude > 180.0 else longitude
        )
        with Terrain.open(ground=file) as terrain:
            fields.append(field_of(terrain, site=Site(name="S", position=here, height_m=12.0), radius_m=1_500.0))
    assert fields[0].shape == fields[1].shape
    np.testing.assert_allclose(fields[0].needed_m, fields[1].needed_m, rtol=0.0, atol=0.05)


def test_a_raster_of_the_whole_turn_is_met_on_both_of_its_edges(tmp_path: Path) -> None:
    """The same belt of heights, cut open at 180 degrees under the site, and at 0 on the other side of the Earth."""
    columns, step = 3600, 0.1
    wave = np.cos(np.linspace(0.0, 2.0 * np.pi * 90, columns, endpoint=False))
    heights = (400.0 + 90.0 * wave * np.linspace(0.5, 1.5, 40)[:, None]).astype(np.float32)
    fields = []
    for cut in (-180.0, 0.0):
        file = tmp_path / f"belt{cut:g}.tif"
        turned = np.roll(heights, round((-180.0 - cut) / step), axis=1)
        with rasterio.open(
            file, "w", driver="GTiff", height=40, width=columns, count=1, dtype="float32", crs="EPSG:4326",
            transform=Affine(step, 0.0, cut, 0.0, -step, 2.0),
        ) as dataset:  # fmt: skip
            dataset.write(turned, 1)
        site = Site(name="S", position=Position(latitude_deg=0.01, longitude_deg=179.98), height_m=300.0)
        with Terrain.open(ground=file) as terrain:
            fields.append(field_of(terrain, site=site, radius_m=90_000.0))
    assert fields[0].shape == fields[1].shape
    known = np.isfinite(fields[1].needed_m)
    assert known.sum() > 100
    # where the raster is cut the height of the outer half cell holds, for want of a neighbour
    np.testing.assert_array_equal(np.isfinite(fields[0].needed_m), known)
    assert np.median(np.abs(fields[0].needed_m - fields[1].needed_m)[known]) < 1.0


def test_heights_are_joined_where_memory_is_short(relief: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    with Terrain.open(ground=relief) as terrain:
        fine = field_of(terrain)
        monkeypatch.setattr(surroundings, "MOST_CELLS", 4_000)
        joined = field_of(terrain)
        monkeypatch.setattr(sweeping, "MOST_SAMPLES", 20_000)
        coarse = field_of(terrain)
    assert any("joined" in note for note in joined.notes)
    known = np.isfinite(fine.needed_m) & np.isfinite(joined.needed_m)
    # the highest of each square counts: seldom is a lower level asked than by the cells themselves
    levels = joined.needed_m + joined.ground_m, fine.needed_m + fine.ground_m
    assert (levels[0] >= levels[1] - 1.0)[known].mean() > 0.95
    assert any("cells of" in note for note in coarse.notes)
    assert coarse.cell_m > 1.9 * fine.cell_m


def test_plates_hold_what_the_raster_holds(relief: Path, tmp_path: Path) -> None:
    """Scale, offset, declared and undeclared numbers for nothing, as samples of a path have them."""
    raw = np.arange(600, dtype=np.int16).reshape(20, 30)
    raw[3, 4], raw[9, 9] = -9999, -32768
    file = tmp_path / "raw.tif"
    with rasterio.open(
        file, "w", driver="GTiff", height=20, width=30, count=1, dtype="int16", crs=CRS,
        transform=Affine(CELL_M, 0.0, WEST_M, 0.0, -CELL_M, SOUTH_M + 20 * CELL_M),
    ) as dataset:  # fmt: skip
        dataset.write(raw, 1)
        dataset.scales, dataset.offsets = (0.5,), (10.0,)
    with Terrain.open(ground=RasterSource(path=file, vertical_unit="ft")) as terrain:
        stack, handles = terrain.layers.ground, HandlePool()
        plate = plates.read_plate(stack.files[0], handles, columns=(0.0, 30.0), rows=(0.0, 20.0))
        assert plate is not None
        assert plates.read_plate(stack.files[0], handles, columns=(40.0, 50.0), rows=(0.0, 20.0)) is None
        halves = plates.read_plate(stack.files[0], handles, columns=(0.0, 30.0), rows=(0.0, 20.0), most_cells=150)
    wanted = (raw * 0.5 + 10.0) * 0.3048
    wanted[3, 4] = wanted[9, 9] = np.nan
    np.testing.assert_allclose(plate.heights, wanted, rtol=1e-6)
    assert halves is not None
    assert halves.factor == 2
    assert halves.heights[0, 0] == pytest.approx(wanted[1, 1], rel=1e-6)
    assert np.isfinite(halves.heights).all()  # one number among four is enough


@pytest.mark.parametrize(
    ("change", "error", "words"),
    [
        ({"radius_m": 0.0}, LinkError, "radius 0 m"),
        ({"radius_m": float("nan")}, LinkError, "nan"),
        ({"frequency_hz": -1.0}, LinkError, "-1 Hz"),
        ({"criteria": ()}, LinkError, "no criterion"),
        ({"site": Site(name="Far", position=Position(latitude_deg=10.0, longitude_deg=10.0), height_m=9.0)},
         TerrainGapError, "'Far'"),
        ({"window": (10.0, 10.0, 10.1, 10.1)}, TerrainGapError, "lies in the area"),
    ],
)  # fmt: skip
def test_what_makes_no_sense_is_refused(
    relief: Path, change: dict[str, object], error: type[FellspanError], words: str
) -> None:
    with Terrain.open(ground=relief) as terrain, pytest.raises(error, match=words):
        field_of(terrain, **change)
