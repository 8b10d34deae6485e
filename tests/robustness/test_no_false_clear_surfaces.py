"""A surface raster that shows nothing on the ground, or lies below it, may not make a link read better than bare ground."""

from pathlib import Path

import numpy as np
import pytest
from made_terrain import at, raster

from fellspan.links.assess import assess
from fellspan.links.site import Link, Radio, Site
from fellspan.terrain.profile import PathProfile
from fellspan.terrain.terrain import Terrain

A, B = at(300.0, 1500.0), at(5700.0, 1500.0)
SIZE = (300, 600)


def _noted(profile: PathProfile, words: str) -> bool:
    return any(words in note for note in profile.notes)


def _basis(**data: Path) -> str:
    mole, point = (Site(name=name, position=end, height_m=40.0) for name, end in (("Mole", A), ("Point", B)))
    with Terrain.open(**data) as terrain:
        return assess(
            Link(name="Mole - Point", a=mole, b=point, radio=Radio(frequency_hz=5.8e9)), terrain=terrain
        ).basis


@pytest.mark.parametrize(
    ("ground_m", "rise_m", "to_m", "said"),
    [
        (10.0, 0.0, 5700.0, True),
        (10.0, 0.4, 5700.0, True),
        (10.0, 0.6, 5700.0, False),
        (10.0, 0.0, 490.0, False),  # 190 m of meadow may well be bare
        (0.0, 0.0, 5700.0, False),  # so is the sea
    ],
)
def test_a_surface_that_shows_nothing_on_the_ground_does_not_count_as_known(
    tmp_path: Path, ground_m: float, rise_m: float, to_m: float, said: bool
) -> None:
    top = np.full(SIZE, ground_m)
    top[:, 35:45] += rise_m
    data = {"ground": raster(tmp_path / "ground.tif", ground_m), "surface": raster(tmp_path / "top.tif", top)}
    with Terrain.open(**data) as terrain:
        profile = terrain.profile(a=A, b=at(to_m, 1500.0))
        closer = terrain.refine(profile, [(5.0, 30.0)], step_m=1.0)  # flat there
    assert _noted(profile, "the surface raster nowhere rises above the ground on this path") is said
    assert profile.surface_is_known is not said
    assert (closer.surface_is_known, closer.notes) == (profile.surface_is_known, profile.notes)
    if to_m > 5000.0 and ground_m > 0.0:
        assert (_basis(**data) == "bare ground only") is said


@pytest.mark.parametrize(("low_m", "said"), [(0.4, False), (0.8, True)])
def test_a_surface_a_little_below_the_ground_in_the_median_is_noted(tmp_path: Path, low_m: float, said: bool) -> None:
    top = np.full(SIZE, 50.0 - low_m)
    top[:, 300:350] = 60.0
    ground = raster(tmp_path / "ground.tif", 50.0)
    with Terrain.open(ground=ground, surface=raster(tmp_path / "top.tif", top)) as terrain:
        profile = terrain.profile(a=A, b=B)
    assert _noted(profile, "top.tif lies 0.8 m below ground.tif in the median") is said
    assert _noted(profile, "in the median") is said
