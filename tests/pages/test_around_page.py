"""The page of a look around a site in a real browser: silent, within its width, the picture in place, clicks answered."""

import datetime as dt

import numpy as np
import pytest
from made_relief import CRS, SOUTH_M, WEST_M, relief_m, write_relief

from fellspan.geodesy.position import Position
from fellspan.geodesy.transforms import transformer
from fellspan.links.site import Site
from fellspan.planning.around import look_around
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.report.around_page import render_around_page
from fellspan.terrain.sources import RasterSource

pytestmark = pytest.mark.browser

RADIUS_M = 2_000.0
CLICK = """([lat, lng]) => {
  const frame = document.getElementById("map").getBoundingClientRect();
  const layer = document.querySelector("img.heights").getBoundingClientRect();
  const data = JSON.parse(document.getElementById("data").textContent);
  const y = at => Math.log(Math.tan(Math.PI / 4 + at * Math.PI / 360));
  const [south, west] = data.bounds[0], [north, east] = data.bounds[1];
  return [layer.left + (lng - west) / (east - west) * layer.width,
          layer.top + (y(north) - y(lat)) / (y(north) - y(south)) * layer.height, frame.width];
}"""


@pytest.fixture(scope="module")
def around(tmp_path_factory):
    """Relief with a hole, seen from its middle; the site's name is an attack."""
    heights = relief_m(120, spread_m=40.0)
    heights[20:26, 70:80] = -9999.0
    file = write_relief(tmp_path_factory.mktemp("seen") / "relief.tif", heights, cell_m=40.0, nodata=-9999.0)
    longitude, latitude = transformer(CRS, "EPSG:4326").transform(WEST_M + 2_410.0, SOUTH_M + 2_390.0)
    site = Site(
        name="<script>alert(1)</script></script>",
        position=Position(latitude_deg=latitude, longitude_deg=longitude),
        height_m=15.0,
    )
    study = Study(
        title="Trial", links=(), terrain=TerrainInputs(ground=(RasterSource(path=file),)), date=dt.date(2026, 5, 1)
    )
    return look_around(study, site, frequency_hz=5.8e9, radius_m=RADIUS_M)


@pytest.mark.parametrize("size", [(1280, 900), (390, 844)], ids=["desktop", "phone"])
def test_the_page_is_silent_and_within_its_width(around, watch, tmp_path, size):
    page = tmp_path / "index.html"
    page.write_text(render_around_page(around), encoding="utf-8")
    watched = watch(*size)
    watched.page.goto(page.as_uri())
    assert watched.requests == []
    assert watched.messages == []
    assert watched.page.evaluate("document.documentElement.scrollWidth") <= size[0]
    text = watched.page.locator("main").inner_text()
    for words in ("up to 5 m", "no answer", "site walk decides", "Sight line alone"):
        assert words in text
    assert watched.page.locator(".site-name").inner_text().startswith("<script>")
    assert watched.page.locator("img.heights").bounding_box()["width"] > 200


def test_a_click_says_what_the_cell_says(around, watch, tmp_path):
    page = tmp_path / "index.html"
    page.write_text(render_around_page(around), encoding="utf-8")
    watched = watch(1280, 900)
    watched.page.goto(page.as_uri())
    watched.page.wait_for_function("document.querySelector('img.heights').complete")
    field = around.field
    rng = np.random.default_rng(12)
    steady = np.zeros(field.shape, dtype=bool)  # cells whose neighbours say the same: a pixel may lie on the next one
    classes = np.where(np.isnan(field.needed_m), -1, np.searchsorted(around.masts_m, field.needed_m))
    inner = classes[1:-1, 1:-1]
    same = [classes[1 + r : classes.shape[0] - 1 + r, 1 + c : classes.shape[1] - 1 + c] == inner
            for r in (-1, 0, 1) for c in (-1, 0, 1)]  # fmt: skip
    steady[1:-1, 1:-1] = np.logical_and.reduce(same)
    steady &= field.distance_m < 0.9 * RADIUS_M
    told = set()
    for wanted in (-1, 0, 1, 5):
        cells = np.argwhere(steady & (classes == wanted))
        row, column = cells[rng.integers(0, len(cells))]
        latitude, longitude = field.grid.positions(np.array([column + 0.5]), np.array([row + 0.5]))
        x, y, _ = watched.page.evaluate(CLICK, [float(latitude[0]), float(longitude[0])])
        watched.page.mouse.click(x, y)
        text = watched.page.locator("#told").inner_text()
        words = {-1: "No answer here", 0: "up to 5 m", 1: "5 to 10 m", 5: "more than the highest mast"}[wanted]
        assert words in text, (wanted, text)
        assert f"{field.distance_m[row, column] / 1000:.1f} km" in text
        told.add(text)
    assert len(told) == 4


def test_it_prints_on_paper_in_light_colours(around, watch, tmp_path):
    page = tmp_path / "index.html"
    page.write_text(render_around_page(around), encoding="utf-8")
    watched = watch(1100, 900)
    watched.page.goto(page.as_uri())
    watched.page.emulate_media(media="print", color_scheme="dark")
    assert watched.page.evaluate("getComputedStyle(document.body).backgroundColor") == "rgb(255, 255, 255)"
    assert watched.page.locator(".told").is_hidden()


def test_on_paper_the_map_shows_all_of_the_circle(around, watch, tmp_path):
    page = tmp_path / "index.html"
    page.write_text(render_around_page(around), encoding="utf-8")
    watched = watch(1280, 900)
    watched.page.goto(page.as_uri())
    # What a browser does: the event at the width of the screen, then the layout of the sheet, and no script after it.
    frame, rim, site = watched.page.evaluate("""() => {
      window.dispatchEvent(new Event("beforeprint"));
      return ["#map, .folium-map", ".map-rim", ".site-mark i"].map(name => {
        const box = document.querySelector(name).getBoundingClientRect();
        return [box.left, box.top, box.right, box.bottom]; }); }""")
    for inner in (rim, site):
        assert frame[0] <= inner[0] <= inner[2] <= frame[2]
        assert frame[1] <= inner[1] <= inner[3] <= frame[3]
    assert rim[2] - rim[0] > 0.6 * (frame[2] - frame[0])
    watched.page.set_viewport_size({"width": 703, "height": 1040})
    watched.page.emulate_media(media="print")
    sheet = watched.page.evaluate("() => document.querySelector('.map-frame').getBoundingClientRect().width")
    assert frame[2] - frame[0] <= sheet < 703
