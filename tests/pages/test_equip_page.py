"""The page of compared equipment in a real browser: silent, within its width, its chart legible, names and marks in place."""

from dataclasses import replace

import pytest
from made_benches import DISHES, ELEVEN, Bench

from fellspan.report.equip_page import render_equip_page
from fellspan.report.reach_drawing import MOST_CURVES, draw_reach, shown_rows

pytestmark = pytest.mark.browser

SHOWN = """() => Array.from(document.querySelectorAll("svg.reach")).filter(svg => svg.getClientRects().length).map(svg => {
  const frame = svg.getBoundingClientRect();
  const texts = Array.from(svg.querySelectorAll("text"));
  const out = texts.filter(text => {
    const box = text.getBoundingClientRect();
    return box.left < frame.left - 1 || box.right > frame.right + 1 || box.top < frame.top - 1 || box.bottom > frame.bottom + 1;
  }).map(text => text.textContent);
  const notes = Array.from(svg.querySelectorAll("text.note"));
  const boxes = notes.map(text => text.getBoundingClientRect());
  const hit = [];
  boxes.forEach((a, i) => boxes.slice(i + 1).forEach((b, j) => {
    if (a.left < b.right && b.left < a.right && a.top + 2 < b.bottom && b.top + 2 < a.bottom)
      hit.push([notes[i].textContent, notes[i + 1 + j].textContent]);
  }));
  const sizes = texts.map(text => parseFloat(getComputedStyle(text).fontSize) * frame.width / svg.viewBox.baseVal.width);
  return {out, hit, least: Math.min(...sizes), names: notes.map(text => text.textContent)};
})"""


@pytest.fixture(scope="module")
def result():
    """Five dishes over 20 km, weather included."""
    return Bench(target_availability_percent=99.99, wanted_margin_db=3.0).compare(
        DISHES, reach=True, wind_speed_m_s=45.0
    )


@pytest.mark.parametrize("size", [(1280, 900), (390, 844)], ids=["desktop", "phone"])
def test_the_page_is_silent_legible_and_within_its_width(result, watch, tmp_path, size):
    page = tmp_path / "equip.html"
    page.write_text(render_equip_page(result), encoding="utf-8")
    watched = watch(*size)
    watched.page.goto(page.as_uri())
    assert watched.requests == []
    assert watched.messages == []
    assert watched.page.evaluate("document.documentElement.scrollWidth") <= size[0]
    (drawing,) = watched.page.evaluate(SHOWN)
    assert drawing["out"] == []
    assert drawing["hit"] == []
    assert drawing["least"] >= 9.5
    assert set(DISHES) <= set(drawing["names"])
    assert "what is asked" in drawing["names"]
    assert "this link, 20.00 km" in drawing["names"]
    text = watched.page.locator("main").inner_text()
    assert result.rows[0].antenna in text
    assert "structural engineer" in text


def test_curves_differ_in_dash_and_never_in_colour_alone(result, watch, tmp_path):
    page = tmp_path / "equip.html"
    page.write_text(render_equip_page(result), encoding="utf-8")
    watched = watch(1280, 900)
    watched.page.goto(page.as_uri())
    dashes = watched.page.evaluate(
        "() => Array.from(document.querySelectorAll('.only-wide svg.reach .pattern-line'))"
        ".map(path => getComputedStyle(path).strokeDasharray)"
    )
    assert len(dashes) == len(set(dashes)) == MOST_CURVES


def test_hostile_names_stay_text(result):
    rows = (replace(result.rows[0], antenna="<script>alert(1)</script>"), *result.rows[1:])
    text = render_equip_page(replace(result, rows=rows, link="<img src=x onerror=alert(1)>"))
    assert "<script>alert" not in text
    assert "<img src=x" not in text


def test_without_reach_there_is_no_chart():
    plain = Bench(radio=ELEVEN).compare(DISHES[:2])
    assert shown_rows(plain) == ()
    assert draw_reach(plain, uid="x") == ""
    assert "How far each" not in render_equip_page(plain)
