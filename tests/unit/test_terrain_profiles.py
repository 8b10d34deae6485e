"""Terrain: profiles, gaps, sea, cover, steps and refinement, on small rasters with known heights."""

from pathlib import Path

import numpy as np
import pytest
from made_terrain import NORTH, TO_GRID, WEST, at, raster

from fellspan.errors import TerrainError, TerrainGapError, VerticalDatumError
from fellspan.geodesy.position import Position
from fellspan.terrain.profile import PathProfile
from fellspan.terrain.sources import CoverSource, RasterSource
from fellspan.terrain.terrain import Terrain
from fellspan.vocabulary import COVER_KINDS

A, B = at(500.0, 500.0), at(5500.0, 2500.0)
TREE, BUILDING, OTHER = (COVER_KINDS.index(kind) for kind in ("tree", "building", "other"))


def plane(row: np.ndarray, column: np.ndarray) -> np.ndarray:
    return 100.0 + 0.02 * (column + 0.5) * 10.0 - 0.01 * (row + 0.5) * 10.0


@pytest.fixture
def sloped(tmp_path: Path) -> Path:
    rows, columns = np.mgrid[0:300, 0:600]
    return raster(tmp_path / "sloped.tif", plane(rows, columns))


def kinds_with_height(profile: PathProfile) -> set[int]:
    return set(profile.cover_kind[profile.cover_m > 0.0].tolist())


def test_a_plane_is_reproduced_along_the_path(sloped: Path) -> None:
    with Terrain.open(ground=sloped) as terrain:
        profile = terrain.profile(a=A, b=B)
    east, north = TO_GRID.transform(profile.longitude_deg, profile.latitude_deg)
    expected = 100.0 + 0.02 * (east - WEST) - 0.01 * (NORTH - north)
    assert np.abs(profile.ground_m - expected).max() < 1e-3  # float32 heights
    assert profile.distance_m[0] == 0.0
    assert profile.length_m == pytest.approx(5385.0, abs=5.0)
    assert np.array_equal(profile.surface_m, profile.ground_m)
    assert profile.ground_is_bare
    assert not profile.surface_is_known
    assert profile.vertical_datum == "EGM2008 height"


def test_the_default_step_is_half_a_cell_and_a_given_one_divides_the_path(sloped: Path) -> None:
    with Terrain.open(ground=sloped) as terrain:
        profile = terrain.profile(a=A, b=B)
        coarse = terrain.profile(a=A, b=B, step_m=100.0)
    assert profile.step_m == pytest.approx(5.0, rel=0.002)
    assert np.allclose(np.diff(profile.distance_m), profile.step_m)
    assert 95.0 < coarse.step_m <= 100.0
    assert coarse.distance_m[-1] == coarse.length_m


def test_both_directions_see_the_same_ground(sloped: Path) -> None:
    with Terrain.open(ground=sloped) as terrain:
        there, back = terrain.profiles([(A, B), (B, A)])
    assert np.abs(there.ground_m - back.ground_m[::-1]).max() < 1e-5


def test_the_same_two_ends_are_refused_with_the_name(sloped: Path) -> None:
    with (
        Terrain.open(ground=sloped) as terrain,
        pytest.raises(TerrainError, match=r"'Mole - Mole' are at 36\.1"),
    ):
        terrain.profiles([(A, B), (A, A)], names=["Mole - Point", "Mole - Mole"])


def test_a_step_of_nothing_is_refused(sloped: Path) -> None:
    with Terrain.open(ground=sloped) as terrain:
        for step in (0.0, -1.0, float("nan")):
            with pytest.raises(TerrainError, match="step"):
                terrain.profile(a=A, b=B, step_m=step)


def test_a_step_too_fine_becomes_coarser_with_a_note(sloped: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("fellspan.terrain.terrain.MAX_SAMPLES", 1000)
    with Terrain.open(ground=sloped) as terrain:
        profile = terrain.profile(a=A, b=B, step_m=0.001)
        assert profile.distance_m.size == 1001
        assert any("at most 1000 samples" in note for note in profile.notes)
        with pytest.raises(TerrainError, match="at most 1000"):
            terrain.refine(profile, [(0.0, 5000.0)], step_m=1.0)


def test_a_hole_is_named_in_km_with_raster_and_remedy(tmp_path: Path) -> None:
    heights = np.full((300, 600), 50.0)
    heights[:, 200:300] = -9999.0  # from 2.0 to 3.0 km east
    file = raster(tmp_path / "holed.tif", heights)
    a, b = at(500.0, 1500.0), at(5500.0, 1500.0)
    with Terrain.open(ground=file) as terrain:
        with pytest.raises(TerrainGapError) as caught:
            terrain.profile(a=a, b=b, name="Harbour - North Light")
        (profile,) = terrain.profiles([(a, b)])
    first, raster_line, remedy = str(caught.value).split("\n  ")
    assert first == "terrain has no data from 1.50 km to 2.50 km of 'Harbour - North Light'"
    assert raster_line == "raster: holed.tif"
    assert 'gaps = "sea"' in remedy
    (gap,) = profile.gaps
    assert gap.from_m == pytest.approx(1500.0, abs=10.0)
    assert gap.to_m == pytest.approx(2500.0, abs=10.0)
    inside = (profile.distance_m >= gap.from_m) & (profile.distance_m <= gap.to_m)
    assert np.isnan(profile.ground_m[inside]).all()
    assert np.isnan(profile.surface_m[inside]).all()
    assert np.isfinite(profile.ground_m[~inside]).all()
    assert (profile.source[inside] == -1).all()


def test_nothing_is_known_in_a_gap_even_under_a_cover_raster(tmp_path: Path) -> None:
    heights = np.full((300, 600), 50.0)
    heights[:, 200:300] = -9999.0
    cover = CoverSource(path=raster(tmp_path / "trees.tif", 5.0), kind="other")
    with Terrain.open(ground=raster(tmp_path / "holed.tif", heights), cover=cover) as terrain:
        (holed, whole) = terrain.profiles(
            [(at(500.0, 1500.0), at(5500.0, 1500.0)), (at(500.0, 1500.0), at(1500.0, 1500.0))]
        )
    assert (holed.surface_is_known, whole.surface_is_known) == (False, True)
    assert not any("cover is not known" in note for note in holed.notes)


@pytest.mark.parametrize("inward", [False, True])
def test_a_path_that_runs_off_is_told_where_the_raster_ends(sloped: Path, inward: bool) -> None:
    ends = [at(5000.0, 1500.0), at(7000.0, 1500.0)]
    a, b = reversed(ends) if inward else ends
    with Terrain.open(ground=sloped) as terrain, pytest.raises(TerrainGapError) as caught:
        terrain.profile(a=a, b=b)
    edge = at(6000.0, 1500.0)
    assert f"from {'0.00 km to 1.00' if inward else '1.00 km to 2.00'} km" in str(caught.value)
    assert f"sloped.tif, which ends at {edge.latitude_deg:.4f} N {-edge.longitude_deg:.4f} W" in str(caught.value)


def test_a_path_beside_the_raster_says_so(sloped: Path) -> None:
    with Terrain.open(ground=sloped) as terrain, pytest.raises(TerrainGapError, match="nothing on the whole path"):
        terrain.profile(a=at(7000.0, 1500.0), b=at(8000.0, 1500.0))


def test_gaps_that_are_sea_are_filled_and_noted(tmp_path: Path) -> None:
    heights = np.full((300, 600), 3.0)
    heights[:, 200:300] = -9999.0
    file = raster(tmp_path / "holed.tif", heights)
    with Terrain.open(ground=file, gaps="sea", sea_level_m=1.5) as terrain:
        profile = terrain.profile(a=at(500.0, 1500.0), b=at(5500.0, 1500.0))
    filled = (profile.distance_m > 1520.0) & (profile.distance_m < 2480.0)
    assert (profile.ground_m[filled] == 1.5).all()
    assert (profile.sigma_m[filled] == 0.5).all()  # docs/terrain.md; common practice, no source
    assert {profile.sources[i] for i in profile.source[filled]} == {"sea level"}
    assert not profile.gaps
    assert any("open water at 1.5 m" in note and "1.50 to 2.50 km" in note for note in profile.notes)


def test_cover_rasters_combine_highest_wins_and_trees_grow(tmp_path: Path) -> None:
    ground = raster(tmp_path / "ground.tif", 10.0)
    trees, roofs = np.zeros((300, 600)), np.zeros((300, 600))
    trees[:, 200:300], roofs[:, 250:400] = 12.0, 8.0
    cover = [
        CoverSource(path=raster(tmp_path / "trees.tif", trees), kind="tree", growth_m_per_year=0.4, error_m=2.0),
        CoverSource(path=raster(tmp_path / "roofs.tif", roofs), kind="building", error_m=1.0),
    ]
    sources = RasterSource(path=ground, error_m=3.0)
    with Terrain.open(ground=sources, cover=cover, growth_years=10.0) as terrain:
        profile = terrain.profile(a=at(500.0, 1500.0), b=at(5500.0, 1500.0))

    def there(km: float) -> int:
        return int(np.argmin(np.abs(profile.distance_m - km * 1000.0)))

    assert profile.surface_m[there(2.2)] == pytest.approx(10.0 + 12.0 + 4.0)  # tree over roof, grown
    assert profile.cover_kind[there(2.2)] == TREE
    assert profile.surface_m[there(3.0)] == pytest.approx(18.0)
    assert profile.cover_kind[there(3.0)] == BUILDING
    assert profile.cover_m[there(4.5)] == 0.0
    assert profile.sigma_m[there(2.2)] == pytest.approx(np.hypot(3.0, 2.0))
    assert profile.sigma_m[there(3.0)] == pytest.approx(np.hypot(3.0, 1.0))
    assert profile.sigma_m[there(4.5)] == pytest.approx(3.0)
    assert profile.surface_is_known


def test_unknown_cover_counts_as_none_and_is_said(tmp_path: Path) -> None:
    ground = raster(tmp_path / "ground.tif", 10.0)
    trees = np.full((300, 600), 5.0)
    trees[:, 200:300] = -9999.0
    source = CoverSource(path=raster(tmp_path / "trees.tif", trees), kind="other")
    with Terrain.open(ground=ground, cover=source) as terrain:
        profile = terrain.profile(a=at(500.0, 1500.0), b=at(5500.0, 1500.0))
        elsewhere = terrain.profile(a=at(4000.0, 1500.0), b=at(5500.0, 1500.0))
        closer = terrain.refine(profile, [(4000.0, 4100.0)], step_m=1.0)
    assert not closer.surface_is_known  # what was unknown stays so, wherever one looks closer
    assert not profile.surface_is_known
    assert profile.cover_m[np.argmin(np.abs(profile.distance_m - 2000.0))] == 0.0
    assert any("cover is not known from 1.50 to 2.50 km" in note for note in profile.notes)
    assert elsewhere.surface_is_known


def test_negative_cover_is_taken_as_none_with_a_note(tmp_path: Path) -> None:
    ground = raster(tmp_path / "ground.tif", 10.0)
    cover = CoverSource(path=raster(tmp_path / "cover.tif", -2.0), kind="other")
    with Terrain.open(ground=ground, cover=cover) as terrain:
        profile = terrain.profile(a=A, b=B)
    assert (profile.cover_m == 0.0).all()
    assert any("below 0" in note for note in profile.notes)


def test_a_surface_beside_bare_ground_is_cover_of_kind_other(tmp_path: Path) -> None:
    ground = raster(tmp_path / "ground.tif", 10.0)
    top = np.full((300, 600), 9.5)  # a surface below the ground is noise, not a pit
    top[:, 200:300] = 22.0
    surface = RasterSource(path=raster(tmp_path / "surface.tif", top), error_m=0.7)
    with Terrain.open(ground=ground, surface=surface) as terrain:
        profile = terrain.profile(a=at(500.0, 1500.0), b=at(5500.0, 1500.0))
    i = int(np.argmin(np.abs(profile.distance_m - 2000.0)))
    assert profile.cover_m[i] == pytest.approx(12.0)
    assert kinds_with_height(profile) == {OTHER}
    assert profile.cover_m.min() == 0.0
    assert profile.sigma_m[i] == pytest.approx(0.7)  # the surface itself was measured there
    assert profile.surface_is_known


def test_a_cover_raster_names_what_the_surface_shows(tmp_path: Path) -> None:
    ground = raster(tmp_path / "ground.tif", 10.0)
    top, trees = np.full((300, 600), 10.0), np.zeros((300, 600))
    top[:, 200:400], trees[:, 200:300] = 22.0, 9.0
    cover = CoverSource(path=raster(tmp_path / "trees.tif", trees), kind="tree", growth_m_per_year=0.5)
    surface = raster(tmp_path / "surface.tif", top)
    with Terrain.open(ground=ground, surface=surface, cover=cover, growth_years=4.0) as terrain:
        profile = terrain.profile(a=at(500.0, 1500.0), b=at(5500.0, 1500.0))
    tree, other = (int(np.argmin(np.abs(profile.distance_m - d))) for d in (2000.0, 3000.0))
    assert (profile.cover_kind[tree], profile.cover_m[tree]) == (TREE, pytest.approx(14.0))
    assert (profile.cover_kind[other], profile.cover_m[other]) == (OTHER, pytest.approx(12.0))


def test_a_surface_alone_stands_in_for_the_ground(tmp_path: Path) -> None:
    surface = raster(tmp_path / "surface.tif", 33.0)
    with Terrain.open(surface=surface) as terrain:
        profile = terrain.profile(a=A, b=B)
        assert not terrain.ground_is_bare
    assert not profile.ground_is_bare
    assert profile.surface_is_known
    assert np.allclose(profile.ground_m, 33.0, atol=1e-9)
    assert (profile.cover_m == 0.0).all()
    with pytest.raises(TerrainError, match=r"'trees\.tif'"):
        Terrain.open(surface=surface, cover="trees.tif")


def test_nothing_to_open_is_refused() -> None:
    with pytest.raises(TerrainError, match="no terrain raster"):
        Terrain.open()


@pytest.mark.parametrize(
    ("option", "value", "said"),
    [("gaps", "zero", "zero"), ("sea_level_m", float("nan"), "nan"), ("growth_years", -1.0, "-1")],
)
def test_options_out_of_range_are_refused_with_the_value(sloped: Path, option: str, value: object, said: str) -> None:
    with pytest.raises(TerrainError, match=said):
        Terrain.open(ground=sloped, **{option: value})


def test_different_vertical_datums_are_refused(tmp_path: Path) -> None:
    ground = RasterSource(path=raster(tmp_path / "ground.tif", 1.0), vertical_datum="EGM96 height")
    surface = RasterSource(path=raster(tmp_path / "surface.tif", 1.0), vertical_datum="Local 1990")
    with pytest.raises(VerticalDatumError, match="Local 1990"):
        Terrain.open(ground=ground, surface=surface)
    survey = tmp_path / "walk.csv"
    survey.write_text("link,distance_m,ground_m,vertical_datum\nA - B,10,1,Local 1990\n", encoding="utf-8")
    with pytest.raises(VerticalDatumError, match=r"walk\.csv"):
        Terrain.open(ground=ground, survey=survey)
    survey.write_text("link,distance_m,ground_m,vertical_datum\nA - B,10,1,EGM96\n", encoding="utf-8")
    with Terrain.open(ground=ground, survey=survey) as terrain:
        assert terrain.vertical_datum == "EGM96 height"


def test_a_gap_names_the_raster_beside_it(tmp_path: Path) -> None:
    near = raster(tmp_path / "near.tif", 10.0, size=(300, 200))
    far = raster(tmp_path / "far.tif", 10.0, size=(100, 600), cell_m=11.5)  # the north only
    with Terrain.open(ground=[near, far]) as terrain:
        (profile,) = terrain.profiles([(at(500.0, 1500.0), at(5500.0, 1500.0))])
        (beside,) = terrain.profiles([(at(4000.0, 1500.0), at(5500.0, 1500.0))])
    assert [gap.raster for gap in profile.gaps] == ["near.tif"]
    assert [gap.raster for gap in beside.gaps] == ["near.tif, far.tif"]


def test_a_datum_that_only_a_table_states_is_said(tmp_path: Path) -> None:
    ground = raster(tmp_path / "ground.tif", 1.0, crs="EPSG:32623")
    survey = tmp_path / "walk.csv"
    survey.write_text("link,distance_m,ground_m,vertical_datum\nA - B,10,1,EGM96\n", encoding="utf-8")
    with Terrain.open(ground=ground, survey=survey) as terrain:
        assert terrain.vertical_datum == "EGM96"
        assert any("taken as that of the tables, 'EGM96'" in note for note in terrain.notes)


def test_an_unknown_datum_is_said(tmp_path: Path) -> None:
    with Terrain.open(ground=raster(tmp_path / "ground.tif", 1.0, crs="EPSG:32623")) as terrain:
        assert terrain.vertical_datum is None
        assert any("datum not stated" in note for note in terrain.profile(a=A, b=B).notes)


def test_refining_adds_samples_keeps_the_others_and_settles(sloped: Path) -> None:
    with Terrain.open(ground=sloped) as terrain:
        profile = terrain.profile(a=A, b=B)
        fine = terrain.refine(profile, [(1000.0, 1100.0), (1050.0, 1200.0), (-50.0, 20.0)], step_m=profile.cell_m / 16)
        again = terrain.refine(fine, [(1000.0, 1200.0)], step_m=profile.cell_m / 16)
    assert np.isin(profile.distance_m, fine.distance_m).all()
    assert (np.diff(fine.distance_m) > 0.0).all()
    inside = (fine.distance_m >= 1000.0) & (fine.distance_m <= 1200.0)
    assert np.diff(fine.distance_m[inside]).max() <= profile.cell_m / 16 + 1e-3
    assert np.array_equal(again.distance_m, fine.distance_m)
    assert (fine.step_m, fine.cell_m, fine.notes) == (profile.step_m, profile.cell_m, profile.notes)
    same = np.isin(fine.distance_m, profile.distance_m)
    assert np.array_equal(fine.ground_m[same], profile.ground_m)
    with Terrain.open(ground=sloped) as terrain:
        for step in (0.0, float("inf")):
            with pytest.raises(TerrainError, match="step"):
                terrain.refine(profile, [(0.0, 1.0)], step_m=step)


def test_across_the_antimeridian(tmp_path: Path) -> None:
    import rasterio
    from affine import Affine

    heights = np.tile(np.arange(200, dtype=np.float32), (100, 1))
    transform = Affine(0.001, 0.0, 179.9, 0.0, -0.001, 10.05)
    options = {"height": 100, "width": 200, "count": 1, "dtype": "float32", "crs": "EPSG:4326", "transform": transform}
    with rasterio.open(tmp_path / "far.tif", "w", driver="GTiff", **options) as file:
        file.write(heights, 1)
    a, b = Position(latitude_deg=10.0, longitude_deg=179.95), Position(latitude_deg=10.0, longitude_deg=-179.95)
    with Terrain.open(ground=tmp_path / "far.tif") as terrain:
        profile = terrain.profile(a=a, b=b)
    assert profile.ground_m[0] == pytest.approx(49.5, abs=0.01)
    assert profile.ground_m[-1] == pytest.approx(149.5, abs=0.01)
    assert (np.diff(profile.ground_m) > -1e-3).all()


def test_a_batch_is_made_one_by_one(sloped: Path) -> None:
    """Memory of a batch: iterating holds one profile, whatever the number of pairs."""
    import tracemalloc

    with Terrain.open(ground=sloped) as terrain:
        for profile in terrain.iter_profiles([(A, B)] * 3):
            size = profile.distance_m.size
        tracemalloc.start()
        for profile in terrain.iter_profiles([(A, B)] * 100):
            size = max(size, profile.distance_m.size)
        peak = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
    assert peak < 100 * size * 8 * 11 / 5  # a fifth of what all profiles together would hold
