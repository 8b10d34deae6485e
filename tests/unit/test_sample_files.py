"""The sample is what its script makes, small, one study, and readable as terrain data should be."""

import importlib.util
import sys
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType

import numpy as np
import pytest
import rasterio

SAMPLE = Path(__file__).resolve().parents[2] / "sample_terrain"
MADE = {"tolmera_ground.tif", "tolmera_trees.tif", "buildings.geojson", "obstacles.csv", "survey.csv"}


@pytest.fixture(scope="module")
def script() -> Iterator[ModuleType]:
    sys.path.insert(0, str(SAMPLE))
    try:
        spec = importlib.util.spec_from_file_location("make_sample", SAMPLE / "make_sample.py")
        assert spec is not None
        assert spec.loader is not None
        module = importlib.util.module_from_spec(spec)
        spec.loader.exec_module(module)
        yield module
    finally:
        sys.path.remove(str(SAMPLE))


def counts(name: str) -> np.ndarray:
    with rasterio.open(SAMPLE / name) as raster:
        return raster.read(1)


def test_there_is_one_study_and_a_few_megabytes_in_all() -> None:
    files = [path for path in SAMPLE.iterdir() if path.is_file()]
    assert [path.name for path in files if path.suffix == ".toml"] == ["tolmera.toml"]
    assert {path.name for path in files} >= MADE
    assert sum(path.stat().st_size for path in files) < 4_000_000


def test_the_rasters_state_scale_datum_and_nodata() -> None:
    with rasterio.open(SAMPLE / "tolmera_ground.tif") as ground, rasterio.open(SAMPLE / "tolmera_trees.tif") as trees:
        assert ground.crs.to_epsg() is None or ground.crs.to_epsg() != 32623  # compound: horizontal and vertical
        assert "EGM2008 height" in ground.crs.to_wkt()
        assert trees.crs.to_epsg() == 32623
        assert (ground.scales, trees.scales) == ((0.1,), (0.1,))
        assert (ground.res, trees.res) == ((10.0, 10.0), (5.0, 5.0))
        assert ground.bounds == trees.bounds
        assert (ground.nodata, trees.nodata) == (-32768, 255)
        assert ground.profile["tiled"]
        assert trees.profile["tiled"]


def test_the_land_is_an_island_group_with_hills_woods_and_a_town_plain() -> None:
    ground, trees = counts("tolmera_ground.tif") * 0.1, counts("tolmera_trees.tif") * 0.1
    assert 380.0 < ground.max() < 420.0
    assert ground.min() == 0.0
    assert 0.8 < np.mean(ground == 0.0) < 0.9
    shore = np.concatenate([ground[0], ground[-1], ground[:, 0], ground[:, -1]])
    assert shore.max() == 0.0  # open ocean on every side
    assert 20.0 < trees.max() <= 25.0
    woods = trees > 0.0
    assert 0.2 < woods.sum() / (4.0 * (ground > 0.0).sum()) < 0.4
    assert not woods[np.repeat(np.repeat(ground == 0.0, 2, 0), 2, 1)].any()


def test_what_stands_on_the_islands_is_what_the_script_makes(script: ModuleType) -> None:
    town = script.town
    assert (SAMPLE / "buildings.geojson").read_text(encoding="utf-8") == town.buildings_geojson(script.SEED)
    assert (SAMPLE / "obstacles.csv").read_text(encoding="utf-8") == town.obstacles_csv()
    survey = town.survey_csv(counts("tolmera_ground.tif") * 0.1, counts("tolmera_trees.tif") * 0.1, script.SEED)
    assert (SAMPLE / "survey.csv").read_text(encoding="utf-8") == survey
    assert town.buildings_geojson(script.SEED + 1) != town.buildings_geojson(script.SEED)
    network, heights = script.network, (counts("tolmera_ground.tif") * 0.1, counts("tolmera_trees.tif") * 0.1)
    assert (SAMPLE / "hubs.csv").read_text(encoding="utf-8") == network.hubs_csv()
    assert (SAMPLE / "places.csv").read_text(encoding="utf-8") == network.places_csv(*heights, script.SEED)


def test_the_same_seed_makes_the_same_noise_at_both_cell_sizes(script: ModuleType) -> None:
    relief = script.relief
    fine, again = (relief.noise(np.random.default_rng(7), 3_600.0, 50.0, octaves=3) for _ in range(2))
    coarse = relief.noise(np.random.default_rng(7), 3_600.0, 250.0, octaves=3)
    np.testing.assert_array_equal(fine, again)
    blocks = fine.reshape(coarse.shape[0], 5, coarse.shape[1], 5)[:, 2, :, 2]
    np.testing.assert_allclose(blocks, coarse, atol=1e-9)  # same place, so rounding only


@pytest.mark.slow
def test_the_rasters_are_what_the_script_makes(script: ModuleType, tmp_path: Path) -> None:
    script.write_sample(tmp_path)
    for name, most_m in (("tolmera_ground.tif", 0.1), ("tolmera_trees.tif", 0.5)):
        with rasterio.open(tmp_path / name) as raster:
            made = raster.read(1).astype(np.int64)
        off_m = np.abs(made - counts(name)) * 0.1
        # Another processor may round the last bit of a sum another way: a step of the stored heights, here and there.
        assert off_m.max() <= most_m + 1e-9, name
        assert np.mean(off_m > 0.0) < 1e-3, name
