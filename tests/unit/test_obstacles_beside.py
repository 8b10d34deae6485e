"""Obstacles that a path passes without crossing: which are listed, where, how far off and how high."""

import json
from pathlib import Path

import numpy as np
import pytest
from made_terrain import at, lonlat, raster

from fellspan.terrain.beside import MOST_BESIDE
from fellspan.terrain.profile import BesidePath, PathProfile
from fellspan.terrain.terrain import Terrain

A, B = at(500.0, 1500.0), at(5500.0, 1500.0)


def passed(tmp_path: Path, *features: tuple[str, object, dict[str, object]], **options: object) -> PathProfile:
    """The profile from A to B, 5 km east over ground at 50 m, past features (type, coordinates, properties)."""
    file = tmp_path / "things.geojson"
    listed = [
        {"type": "Feature", "properties": properties, "geometry": {"type": form, "coordinates": coordinates}}
        for form, coordinates, properties in features
    ]
    file.write_text(json.dumps({"type": "FeatureCollection", "features": listed}), encoding="utf-8")
    with Terrain.open(ground=raster(tmp_path / "g.tif", 50.0), obstacles=file, **options) as terrain:
        profile = terrain.profile(a=A, b=B)
        assert terrain.refine(profile, [(1000.0, 1200.0)], step_m=1.0).beside == profile.beside
    return profile


def only(profile: PathProfile) -> BesidePath:
    (one,) = profile.beside
    return one


def test_a_mast_four_metres_beside_the_path_is_listed(tmp_path: Path) -> None:
    mast = ("Point", lonlat(3000.0, 1495.0), {"name": "mast", "kind": "other", "height_m": 60, "radius_m": 1})
    profile = passed(tmp_path, mast)
    one = only(profile)
    assert (one.name, one.kind, one.source) == ("mast", "other", "things.geojson")
    assert one.at_m == pytest.approx(2500.0, abs=2.0)
    assert one.offset_m == pytest.approx(4.0, abs=0.3)  # the geodesic bows a little from the grid line
    assert one.top_amsl_m == pytest.approx(110.0)
    assert not profile.obstacles


def test_what_is_crossed_far_off_or_beyond_the_ends_is_not_beside(tmp_path: Path) -> None:
    height = {"height_m": 20}
    profile = passed(
        tmp_path,
        ("Point", lonlat(3000.0, 1500.0), {"name": "crossed", **height}),
        ("Point", lonlat(3000.0, 1580.0), {"name": "far", **height}),
        ("Point", lonlat(480.0, 1505.0), {"name": "behind A", **height}),
        ("Point", lonlat(5520.0, 1505.0), {"name": "beyond B", **height}),
    )
    assert profile.beside == ()
    assert [thing.name for thing in profile.obstacles] == ["crossed"]


def test_a_wall_along_the_path_is_shown_where_it_lies_deepest_in_the_zones(tmp_path: Path) -> None:
    """4 m off near A and 9 m off in the middle: the zone of the middle is the wider one by far."""
    wall = [lonlat(600.0, 1504.0), lonlat(3000.0, 1509.0)]
    one = only(passed(tmp_path, ("LineString", wall, {"name": "wall", "height_m": 12, "width_m": 2})))
    s = np.linspace(100.0, 2500.0, 2401)
    offset = 4.0 - 1.0 + (s - 100.0) / 2400.0 * 5.0
    best = int(np.argmin(offset / np.sqrt(s * (5000.0 - s) / 5000.0)))
    assert one.at_m == pytest.approx(s[best], abs=30.0)
    assert one.offset_m == pytest.approx(offset[best], abs=0.3)
    assert one.top_amsl_m == pytest.approx(62.0)


def test_a_line_that_crosses_and_then_runs_beside_is_both(tmp_path: Path) -> None:
    """It crosses 300 m from A and runs 3 m beside the path from 500 m to 4 km."""
    line = [lonlat(800.0, 1600.0), lonlat(800.0, 1400.0), lonlat(1000.0, 1497.0), lonlat(4500.0, 1497.0)]
    profile = passed(tmp_path, ("LineString", line, {"name": "wire", "heights_m": [30] * 4}))
    assert [thing.name for thing in profile.obstacles] == ["wire"]
    one = only(profile)
    assert one.at_m == pytest.approx(2500.0, abs=300.0)
    assert one.offset_m == pytest.approx(2.5, abs=0.7)
    assert one.top_amsl_m == pytest.approx(80.0)


def test_tops_of_outlines_woods_and_hung_lines(tmp_path: Path) -> None:
    def box(east: float) -> list[list[tuple[float, float]]]:
        ring = [(east, 1510.0), (east + 40.0, 1510.0), (east + 40.0, 1530.0), (east, 1530.0), (east, 1510.0)]
        return [[lonlat(*corner) for corner in ring]]

    line = [lonlat(2500.0, 1520.0), lonlat(3500.0, 1520.0)]
    profile = passed(
        tmp_path,
        ("Polygon", box(1000.0), {"name": "barn", "height_m": 9}),
        ("Polygon", box(2000.0), {"name": "wood", "kind": "tree", "height_m": 15, "growth_m_per_year": 0.5}),
        ("LineString", line, {"name": "line", "heights_m": [30, 40], "sag_m": 6}),
        ("Polygon", box(4000.0), {"name": "ship", "envelope": "ship", "top_amsl_m": 77}),
        growth_years=10.0,
    )
    tops = {one.name: one.top_amsl_m for one in profile.beside}
    assert tops["barn"] == pytest.approx(59.0)
    assert tops["wood"] == pytest.approx(70.0)
    assert tops["ship"] == pytest.approx(77.0)
    # Where it comes deepest is near the middle of the path, 2500 m from A and mid-span: half the chord less the sag.
    assert tops["line"] == pytest.approx(50.0 + 35.0 - 6.0, abs=1.0)
    assert [one.at_m for one in profile.beside] == sorted(one.at_m for one in profile.beside)


def test_of_very_many_only_the_deepest_are_listed(tmp_path: Path) -> None:
    rng = np.random.default_rng(5)
    places = [(float(rng.uniform(700.0, 5300.0)), float(rng.uniform(5.0, 55.0))) for _ in range(200)]
    features = [
        ("Point", lonlat(east, 1500.0 + off), {"name": f"{number}", "height_m": 9})
        for number, (east, off) in enumerate(places)
    ]
    profile = passed(tmp_path, *features)
    assert len(profile.beside) == MOST_BESIDE
    share = [(off - 2.0) / np.sqrt((e - 500.0) * (5500.0 - e)) for e, off in places]
    wanted = set(np.argsort(share)[: MOST_BESIDE - 5].tolist())  # those at the limit may change places
    assert wanted <= {int(one.name) for one in profile.beside}


def test_ground_that_is_not_known_gives_a_top_that_is_not(tmp_path: Path) -> None:
    heights = np.full((300, 600), 50.0)
    heights[120:180, 250:350] = -9999.0
    mast = {"type": "Point", "coordinates": lonlat(3000.0, 1495.0)}
    file = tmp_path / "mast.geojson"
    file.write_text(
        json.dumps({"type": "Feature", "properties": {"height_m": 60, "radius_m": 1}, "geometry": mast}),
        encoding="utf-8",
    )
    with Terrain.open(ground=raster(tmp_path / "holed.tif", heights), obstacles=file) as terrain:
        (profile,) = terrain.profiles([(A, B)])
    assert np.isnan(only(profile).top_amsl_m)
