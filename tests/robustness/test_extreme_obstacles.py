"""Shapes that are legal but extreme: round the Earth, over a pole, with very many vertices; answers stay finite and quick.

Quick is counted, not timed: every point that is laid beside the path costs geodesics, and every sample costs heights.
"""

import json
from pathlib import Path

import numpy as np
import pytest
import rasterio
import shapely
from affine import Affine

from fellspan.errors import ObstacleFileError
from fellspan.geodesy.position import Position
from fellspan.terrain.alongpath import along_across_many
from fellspan.terrain.terrain import Terrain

MORE_POINTS, MOST_SAMPLES = 500, 1_300
"""What one profile may lay beside its path beyond a point for each corner of the shape, and twice the regular samples."""

EXTREME = {
    "half_earth": {"type": "Polygon", "coordinates": [[[-90, -80], [0, -80], [0, 80], [-90, 80], [-90, -80]]]},
    "parallel": {"type": "LineString", "coordinates": [[-179, 36.05], [-90, 36.05], [0, 36.05], [90, 36.05]]},
    "meridian": {"type": "LineString", "coordinates": [[-45.19, -90], [-45.19, 90]]},
    "one_place": {"type": "LineString", "coordinates": [[-45.19, 36.05], [-45.19, 36.05]]},
}


@pytest.fixture(scope="module")
def ground(tmp_path_factory: pytest.TempPathFactory) -> Path:
    file = tmp_path_factory.mktemp("extreme") / "flat.tif"
    options = {
        "driver": "GTiff", "height": 200, "width": 400, "count": 1, "dtype": "float32", "crs": "EPSG:4326",
        "transform": Affine(0.0005, 0.0, -45.3, 0.0, -0.0005, 36.1),
    }  # fmt: skip
    with rasterio.open(file, "w", **options) as dataset:
        dataset.write(np.full((200, 400), 5.0, dtype=np.float32), 1)
    return file


class Counted:
    """The number of points that obstacles lay beside the path."""

    def __init__(self) -> None:
        self.points = 0

    def __call__(self, *columns: np.ndarray) -> object:
        self.points += columns[-1].size
        return along_across_many(*columns)


@pytest.fixture
def counted(monkeypatch: pytest.MonkeyPatch) -> Counted:
    counter = Counted()
    # Obstacles ask by way of `along_across`, which stands in the module of this one.
    for module in ("alongpath", "beside"):
        monkeypatch.setattr(f"fellspan.terrain.{module}.along_across_many", counter)
    return counter


def crossed(
    ground: Path, file: Path, geometry: dict[str, object], properties: dict[str, object], counted: Counted
) -> list[float]:
    file.write_text(json.dumps({"type": "Feature", "geometry": geometry, "properties": properties}), encoding="utf-8")
    a, b = Position(latitude_deg=36.04, longitude_deg=-45.28), Position(latitude_deg=36.06, longitude_deg=-45.12)
    with Terrain.open(ground=ground, obstacles=file) as terrain:
        profile = terrain.profile(a=a, b=b)
    corners = shapely.get_num_coordinates(shapely.from_geojson(json.dumps(geometry)))
    assert counted.points <= corners + MORE_POINTS
    assert profile.distance_m.size <= MOST_SAMPLES
    assert np.isfinite(profile.surface_m).all()
    assert (np.diff(profile.distance_m) > 0.0).all()
    return [round(thing.to_m - thing.from_m, 2) for thing in profile.obstacles] + [profile.length_m]


@pytest.mark.parametrize("height", [{"height_m": 9}, {"top_amsl_m": 40}, {"height_m": 9, "kind": "tree"}])
@pytest.mark.parametrize("name", sorted(EXTREME))
def test_extreme_shapes_are_crossed_where_they_are(
    ground: Path, tmp_path: Path, counted: Counted, name: str, height: dict[str, object]
) -> None:
    *spans, length = crossed(ground, tmp_path / "extreme.geojson", EXTREME[name], height, counted)
    if name.endswith("earth"):
        assert spans == [pytest.approx(length, abs=0.01)]
    elif name == "one_place":
        assert len(spans) <= 1
    else:
        # 1 m wide lines: along the parallel at an angle of some 9 degrees, across the meridian nearly square.
        assert spans == [pytest.approx(6.6 if name == "parallel" else 1.01, abs=0.3)]


@pytest.mark.parametrize("sag", [0, 100])
def test_a_span_round_half_the_earth_still_gives_numbers(
    ground: Path, tmp_path: Path, counted: Counted, sag: int
) -> None:
    *spans, _ = crossed(ground, tmp_path / "span.geojson", EXTREME["meridian"], {"height_m": 9, "sag_m": sag}, counted)
    assert len(spans) == 1


def test_an_outline_round_the_whole_earth_is_refused(ground: Path, tmp_path: Path, counted: Counted) -> None:
    ring = [[-180, -90], [180, -90], [180, 90], [-180, 90], [-180, -90]]
    with pytest.raises(ObstacleFileError, match="no area"):
        crossed(ground, tmp_path / "all.geojson", {"type": "Polygon", "coordinates": [ring]}, {"height_m": 9}, counted)


def test_a_wood_of_very_many_corners(ground: Path, tmp_path: Path, counted: Counted) -> None:
    angle = np.linspace(0.0, 2.0 * np.pi, 100_001)
    ripple = 0.02 * (1.0 + 0.05 * np.sin(500.0 * angle))
    ring = np.column_stack((-45.2 + ripple * np.cos(angle), 36.05 + ripple * np.sin(angle)))
    ring[-1] = ring[0]
    geometry = {"type": "Polygon", "coordinates": [ring.tolist()]}
    *spans, _ = crossed(ground, tmp_path / "wood.geojson", geometry, {"kind": "tree", "height_m": 9}, counted)
    assert sum(spans) == pytest.approx(2 * 0.02 * 90_000.0, rel=0.06)
    assert counted.points > 10_000  # the count is alive
