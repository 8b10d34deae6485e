"""Antenna pages, and the antennas on link pages, in a real browser: silent, offline, within their width, light and dark."""

import pytest

from fellspan.antennas.catalogue import load_catalogue
from fellspan.antennas.footprint import footprint
from fellspan.report.antenna_page import render_antenna_page
from fellspan.report.antenna_sheet import sheet_of

pytestmark = pytest.mark.browser

SHOWN = """() => Array.from(document.querySelectorAll("svg.polar, svg.beam-view, svg.footprint"))
  .filter(svg => svg.getClientRects().length).map(svg => {
    const frame = svg.getBoundingClientRect();
    const out = Array.from(svg.querySelectorAll("text")).filter(text => {
      const box = text.getBoundingClientRect();
      return box.left < frame.left - 1 || box.right > frame.right + 1 ||
        box.top < frame.top - 1 || box.bottom > frame.bottom + 1;
    }).map(text => text.textContent);
    const sizes = Array.from(svg.querySelectorAll("text")).map(text =>
      parseFloat(getComputedStyle(text).fontSize) * frame.width / svg.viewBox.baseVal.width);
    return {kind: svg.getAttribute("class"), out, least: Math.min(...sizes)};
  })"""
LIGHTNESS = """element => {
  const [r, g, b] = getComputedStyle(document.querySelector(element))[element.startsWith("svg") ? "fill" : "backgroundColor"]
    .match(/\\d+/g).map(Number);
  return 0.2126 * r + 0.7152 * g + 0.0722 * b;
}"""


def _sheet(name, frequency_hz=5.8e9, tilt_deg=None):
    pattern = load_catalogue().find(name).pattern(frequency_hz)
    shown = None if tilt_deg is None else footprint(pattern, height_m=30.0, tilt_deg=tilt_deg)
    return sheet_of(pattern, footprint=shown)


@pytest.fixture(scope="module")
def pages(tmp_path_factory):
    """One antenna of each shape, and a comparison."""
    folder = tmp_path_factory.mktemp("antennas")
    made = {
        "dish": [_sheet("dish 0.6 m", tilt_deg=-4.0)],
        "sector": [_sheet("sector 5 GHz, 90 degrees", tilt_deg=-3.0)],
        "omni": [_sheet("omni 5 GHz, 12 elements", tilt_deg=-2.0)],
        "compared": [
            _sheet(name)
            for name in ("dish 0.6 m", "sector 5 GHz, 90 degrees", "omni 5 GHz, 12 elements", "panel 5 GHz, 4 x 4")
        ],
    }
    for name, sheets in made.items():
        (folder / f"{name}.html").write_text(render_antenna_page(sheets), encoding="utf-8")
    return folder


@pytest.mark.parametrize("size", [(1280, 900), (390, 844)], ids=["desktop", "phone"])
@pytest.mark.parametrize("name", ["dish", "sector", "omni", "compared"])
def test_an_antenna_page_is_silent_and_within_its_width(pages, watch, name, size):
    watched = watch(*size)
    watched.page.goto((pages / f"{name}.html").as_uri())
    assert watched.requests == []
    assert watched.messages == []
    assert watched.page.evaluate("document.documentElement.scrollWidth") <= size[0]
    drawings = watched.page.evaluate(SHOWN)
    kinds = {drawing["kind"] for drawing in drawings}
    assert kinds == {"polar", "beam-view"} | ({"footprint"} if name != "compared" else set())
    for drawing in drawings:
        assert drawing["out"] == [], drawing
        assert drawing["least"] >= 9.5, drawing


def test_a_dark_screen_gets_a_dark_page_with_light_words_and_paper_stays_light(pages, watch):
    page = watch().page
    page.goto((pages / "dish.html").as_uri())
    assert page.evaluate(LIGHTNESS, "body") > 220
    page.emulate_media(color_scheme="dark")
    assert page.evaluate(LIGHTNESS, "body") < 50
    assert page.evaluate(LIGHTNESS, "svg.polar text") > 150
    page.emulate_media(color_scheme="dark", media="print")
    assert page.evaluate(LIGHTNESS, "body") == pytest.approx(255, abs=1)
    assert page.evaluate(LIGHTNESS, "svg.polar text") < 120


@pytest.mark.parametrize("size", [(1280, 900), (390, 844)], ids=["desktop", "phone"])
def test_link_pages_show_both_ends_antennas(sample, watch, size):
    watched = watch(*size)
    index = next(at for at, link in enumerate(sample.plan.links) if link.result.name == "Beacon - Southdown Farm")
    watched.page.goto(sample.link_pages[index].as_uri())
    assert watched.messages == []
    assert watched.page.evaluate("document.documentElement.scrollWidth") <= size[0]
    section = watched.page.locator("section.antennas")
    assert section.locator("svg.polar").count() == 2
    assert "A beacon sector" in " ".join(section.inner_text().split())
    assert "B panel" in " ".join(section.inner_text().split())
    assert "other end of A" in section.locator("svg.polar").first.inner_html()
    drawings = [item for item in watched.page.evaluate(SHOWN) if item["kind"] in ("polar", "beam-view")]
    assert [drawing["out"] for drawing in drawings] == [[]] * len(drawings)


def test_a_link_of_which_only_gains_are_known_shows_no_diagram(sample):
    index = next(at for at, link in enumerate(sample.plan.links) if link.result.name == "East Terrace - West Terrace")
    text = sample.link_pages[index].read_text(encoding="utf-8")
    assert 'class="antennas"' not in text
    assert "Gain toward the other end" in text
