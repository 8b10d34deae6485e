"""A look around a site: shares and farthest places against the cells themselves, the files, and what is refused."""

import datetime as dt
import json
import math
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
import rasterio
from made_relief import CRS, SOUTH_M, WEST_M, relief_m, write_relief
from shapely.geometry import Point, shape

from fellspan.errors import LinkError, OutputError
from fellspan.exports import around as exporting
from fellspan.exports.around import around_dict, contours_geojson, write_around
from fellspan.geodesy.geodesic import inverse
from fellspan.geodesy.position import Position
from fellspan.geodesy.transforms import transformer
from fellspan.links.criteria import Criterion, worst_month_k
from fellspan.links.site import Site
from fellspan.planning.around import MASTS_M, SECTORS, Around, area_criteria, look_around
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.report.around_map import classes_of, luminance
from fellspan.report.around_page import decision, render_around_page, share_words
from fellspan.terrain.sources import CoverSource, ObstacleSource, RasterSource

CELL_M, SIDE = 40.0, 120
LONGITUDE, LATITUDE = transformer(CRS, "EPSG:4326").transform(WEST_M + 2_410.0, SOUTH_M + 2_390.0)
SITE = Site(name="Knoll", position=Position(latitude_deg=LATITUDE, longitude_deg=LONGITUDE), height_m=15.0)


def made_study(ground: Path, **more: object) -> Study:
    terrain = TerrainInputs(ground=(RasterSource(path=ground, error_m=2.0),))
    given: dict[str, object] = {"title": "Trial", "links": (), "terrain": terrain, "date": dt.date(2026, 5, 1)}
    return Study(**(given | more))  # type: ignore[arg-type]


def seen_from(study: Study, **more: object) -> Around:
    given: dict[str, object] = {"frequency_hz": 5.8e9, "radius_m": 2_000.0}
    return look_around(study, SITE, **(given | more))  # type: ignore[arg-type]


@pytest.fixture(scope="module")
def relief(tmp_path_factory: pytest.TempPathFactory) -> Path:
    heights = relief_m(SIDE, spread_m=40.0)
    heights[20:26, 70:80] = -9999.0
    return write_relief(tmp_path_factory.mktemp("around") / "relief.tif", heights, cell_m=CELL_M, nodata=-9999.0)


@pytest.fixture(scope="module")
def around(relief: Path) -> Around:
    return seen_from(made_study(relief))


def test_shares_are_those_of_the_cells(around: Around) -> None:
    field = around.field
    inside = field.distance_m <= 2_000.0
    known = inside & np.isfinite(field.needed_m)
    assert around.masts_m == MASTS_M
    for mast, share in zip(around.masts_m, around.shares, strict=True):
        assert share == pytest.approx((field.needed_m[known] <= mast).mean(), abs=1e-9)
    assert around.known_share == pytest.approx(known.sum() / inside.sum(), abs=1e-9)
    assert 0.5 < around.known_share < 1.0
    assert all(sight >= share for sight, share in zip(around.sight_shares, around.shares, strict=True))
    assert around.share == around.shares[1]


def test_sectors_hold_the_cells_of_their_bearings(around: Around) -> None:
    field = around.field
    rows, columns = np.indices(field.shape)
    latitude, longitude = field.grid.positions(columns.ravel() + 0.5, rows.ravel() + 0.5)
    # bearings on a plane at the site's latitude: good to a tenth of a degree over 2 km
    east = (longitude - LONGITUDE) * math.cos(math.radians(LATITUDE))
    bearing = np.degrees(np.arctan2(east, latitude - LATITUDE)).reshape(field.shape) % 360.0
    for number, sector in enumerate(around.sectors):
        assert sector.name == SECTORS[number]
        off = (bearing - 45.0 * number + 180.0) % 360.0 - 180.0
        here = (np.abs(off) < 22.5) & (field.distance_m <= 2_000.0) & np.isfinite(field.needed_m)
        assert sector.shares is not None
        assert sector.shares[1] == pytest.approx((field.needed_m[here] <= 10.0).mean(), abs=0.02)
        reached = here & (field.needed_m <= 10.0)
        assert (sector.farthest is None) == (not reached.any())
        if sector.farthest is not None:
            assert sector.farthest.distance_m == pytest.approx(field.distance_m[reached].max(), abs=1.5 * CELL_M)
            way = inverse(SITE.position, sector.farthest.position)
            assert way.distance_m == pytest.approx(sector.farthest.distance_m, abs=0.5)
            assert way.bearing_ab_deg == pytest.approx(sector.farthest.bearing_deg, abs=0.05)
            assert sector.farthest.needed_m <= 10.0
    assert around.farthest is not None
    assert around.farthest.distance_m == max(s.farthest.distance_m for s in around.sectors if s.farthest)


def test_bare_ground_is_never_just_reached(around: Around, relief: Path, tmp_path: Path) -> None:
    assert around.basis == "bare ground only"
    assert "on bare ground" in decision(around)
    assert around.cautions[0].startswith("Bare ground only")
    assert any("site walk decides" in line for line in around.cautions)
    assert any("2 m is not added" in line for line in around.cautions)
    trees = write_relief(tmp_path / "cover.tif", np.zeros((SIDE, SIDE), dtype=np.float32), cell_m=CELL_M)
    terrain = TerrainInputs(
        ground=(RasterSource(path=relief),), cover=(CoverSource(path=trees, kind="other"),), gaps="sea"
    )
    known = seen_from(made_study(relief, terrain=terrain))
    assert known.basis == "surface raster"
    assert "on bare ground" not in decision(known)
    assert "of the land within" in decision(known)
    assert known.known_share == 1.0  # the hole is water: nobody builds there
    assert (~known.on_land()).sum() > 50


def test_what_was_not_looked_at_is_said(relief: Path, tmp_path: Path) -> None:
    file = tmp_path / "wires.geojson"
    ends = [[LONGITUDE, LATITUDE + 0.003], [LONGITUDE + 0.004, LATITUDE + 0.003]]
    wire = {
        "type": "Feature",
        "geometry": {"type": "LineString", "coordinates": ends},
        "properties": {"name": "Line", "kind": "other", "envelope": "span", "heights_m": "30; 30", "sag_m": 4},
    }
    file.write_text(json.dumps({"type": "FeatureCollection", "features": [wire]}), encoding="utf-8")
    terrain = TerrainInputs(
        surface=(RasterSource(path=relief, role="surface"),), obstacles=(ObstacleSource(path=file),)
    )
    told = seen_from(made_study(relief, terrain=terrain)).cautions
    assert any("Hanging wires" in line for line in told)
    assert any("roofs and treetops" in line for line in told)
    assert not any("Hanging wires" in line for line in seen_from(made_study(relief)).cautions)


def test_rules_are_taken_at_their_strictest_distance(relief: Path) -> None:
    near, far = (area_criteria(made_study(relief), radius_m) for radius_m in (12_000.0, 40_000.0))
    assert [rule.k for rule in near] == pytest.approx([4 / 3, worst_month_k(12_000.0)])
    assert [rule.k for rule in far] == pytest.approx([4 / 3, worst_month_k(18_000.0)])
    assert far[1].k <= worst_month_k(40_000.0)
    assert "strictest" in far[1].note
    tropical = made_study(relief, preset="p530-tropical")
    assert [rule.fraction for rule in area_criteria(tropical, 20_000.0)] == [1.0]
    assert [rule.fraction for rule in area_criteria(tropical, 40_000.0)] == [1.0, 0.6]
    own = Criterion(name="own", k=1.0, fraction=0.5, source="study")
    assert area_criteria(made_study(relief, criteria=(own,)), 40_000.0) == (own,)
    assert len(area_criteria(made_study(relief, preset="sixty-percent"), 40_000.0)) == 1


@pytest.mark.parametrize("masts", [(-1.0,), (float("nan"),), (5_000.0,), tuple(map(float, range(1, 9)))])
def test_masts_that_make_no_sense_are_refused(relief: Path, masts: tuple[float, ...]) -> None:
    with pytest.raises(LinkError, match="mast heights"):
        seen_from(made_study(relief), masts_m=masts)


def test_contours_hold_the_cells_that_are_reached(around: Around) -> None:
    features = json.loads(contours_geojson(around))["features"]
    assert [item["properties"]["what"] for item in features] == ["reached"] * 5 + ["no answer", "site"]
    field, rng = around.field, np.random.default_rng(6)
    areas = {item["properties"].get("mast_m"): shape(item["geometry"]) for item in features[:6]}
    assert areas[5.0].area <= areas[10.0].area <= areas[30.0].area
    for row, column in zip(rng.integers(0, field.shape[0], 300), rng.integers(0, field.shape[1], 300), strict=True):
        latitude, longitude = field.grid.positions(np.array([column + 0.5]), np.array([row + 0.5]))
        place = Point(float(longitude[0]), float(latitude[0]))
        for mast in MASTS_M:
            assert areas[mast].contains(place) == bool(field.needed_m[row, column] <= mast)
        unknown = bool(np.isnan(field.needed_m[row, column]) and field.distance_m[row, column] <= 2_000.0)
        assert areas[None].contains(place) == unknown


def test_contours_are_joined_where_cells_are_many(around: Around, monkeypatch: pytest.MonkeyPatch) -> None:
    fine = len(contours_geojson(around))
    monkeypatch.setattr(exporting, "MOST_SIDE", 30)
    coarse = contours_geojson(around)
    assert len(coarse) < 0.5 * fine
    assert json.loads(coarse)["features"][0]["properties"]["cell_m"] > 3 * around.field.cell_m


def test_the_raster_says_what_the_field_says(around: Around, tmp_path: Path) -> None:
    names = write_around(around, tmp_path / "out")
    assert sorted(path.name for path in (tmp_path / "out").iterdir()) == sorted(names)
    with rasterio.open(tmp_path / "out" / "heights.tif") as dataset:
        cells = dataset.read(1, masked=True)
        assert dataset.nodata == -9999.0
        assert dataset.units == ("m",)
        assert dataset.tags()["SITE"] == "Knoll"
        assert dataset.crs.to_epsg() == 32623
        assert dataset.transform == around.field.transform
    assert (cells.mask == np.isnan(around.field.needed_m)).all()
    np.testing.assert_array_equal(cells.compressed(), around.field.needed_m[~cells.mask])
    numbers = json.loads((tmp_path / "out" / "around.json").read_text(encoding="utf-8"))
    assert numbers == json.loads(json.dumps(around_dict(around)))
    assert numbers["around"]["shares"][1] == pytest.approx(around.share, abs=1e-5)


def test_files_come_all_or_not_at_all(around: Around, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = tmp_path / "out"
    write_around(around, folder)
    before = {path.name: path.read_bytes() for path in folder.iterdir()}
    write_around(around, folder)  # over its own
    assert {path.name: path.read_bytes() for path in folder.iterdir()} == before

    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(exporting, "write_raster", full)
    with pytest.raises(OutputError, match="No space left"):
        write_around(around, folder)
    assert {path.name: path.read_bytes() for path in folder.iterdir()} == before
    foreign = tmp_path / "mine"
    foreign.mkdir()
    (foreign / "index.html").write_text("my own page", encoding="utf-8")
    with pytest.raises(OutputError, match="was not written by"):
        write_around(around, foreign)
    assert [path.name for path in foreign.iterdir()] == ["index.html"]


def test_classes_are_told_apart_in_grey(around: Around) -> None:
    classes = classes_of(around)
    assert sum(item.share for item in classes) == pytest.approx(around.shares[-1])
    grey = [luminance(item.colour) for item in classes]
    assert all(after - before >= 25.0 for before, after in pairwise(grey))
    assert [item.label for item in classes[:2]] == ["up to 5 m", "5 to 10 m"]


@pytest.mark.parametrize(
    ("share", "words"), [(0.0, "none"), (0.004, "under 1 %"), (0.2999, "29 %"), (0.9999, "99 %"), (1.0, "100 %")]
)
def test_shares_are_rounded_down(share: float, words: str) -> None:
    assert share_words(share) == words


def test_a_mast_that_hardly_anybody_means_is_asked_back(around: Around, relief: Path) -> None:
    assert "see that 600 m was meant" in " ".join(seen_from(made_study(relief), other_m=600.0).cautions)
    assert "was meant" not in " ".join(around.cautions)


def test_nobody_takes_the_heights_for_safe_ones(around: Around, relief: Path) -> None:
    assert decision(around).endswith("on the heights in the data without their errors.")
    said = " ".join(around.cautions)
    assert "standard error of 2 m is not added" in said
    assert "Build no mast" in said
    page = render_around_page(around)
    assert (
        "On the heights in the data, without their errors" in page.split('class="height-key"')[1].split("</section>")[0]
    )
    silent = TerrainInputs(ground=(RasterSource(path=relief),))
    assert "their error, which is not stated" in " ".join(seen_from(made_study(relief, terrain=silent)).cautions)
