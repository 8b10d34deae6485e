"""Pages for everyone: no serious finding of axe-core by day and by night, words that can be read on their ground, no jump while
loading, nothing wider than a phone, few sheets on paper, and small enough to be mailed."""

import os
import re
from pathlib import Path

import pytest

from fellspan.antennas.catalogue import load_catalogue
from fellspan.planning.planner import plan_study
from fellspan.report.antenna_page import render_antenna_page
from fellspan.report.antenna_sheet import sheet_of
from fellspan.report.pages import render_pages
from fellspan.study.reading import load_study

ROOT = Path(__file__).parents[2]
AXE = Path(os.environ.get("FELLSPAN_AXE", ROOT / ".venv" / "axe" / "node_modules" / "axe-core" / "axe.min.js"))
MOST_BYTES = 400_000
MOST_SHEETS, SHEETS_OF_A_STREET = 4, 3
"""What a link may take on paper: the longest of the sample, and one across a street."""
STREET = 3
PAPER_PX = 703
"""A4 less its margins, at 96 pixels an inch."""
KINDS = ["index", "sea link", "hidden link", "crew sheet", "antenna"]

pytestmark = pytest.mark.browser


@pytest.fixture(scope="module")
def axe():
    """The checker's script; where it is not installed the test is skipped, but not in CI."""
    if not AXE.exists() and os.environ.get("CI") != "true":
        pytest.skip(f"axe-core is not at {AXE}")
    return AXE.read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def pages(sample, tmp_path_factory):
    """One page of each kind."""
    antenna = tmp_path_factory.mktemp("antenna") / "antenna.html"
    pattern = load_catalogue().find("sector 5 GHz, 90 degrees").pattern(5.8e9)
    antenna.write_text(render_antenna_page([sheet_of(pattern)]), encoding="utf-8")
    crew = next(name for name in sample.texts if name.startswith("crew-05") and name.endswith("-a.html"))
    return {
        "index": sample.folder / "index.html",
        "sea link": sample.link_pages[2],
        "hidden link": sample.link_pages[4],
        "crew sheet": sample.folder / crew,
        "antenna": antenna,
    }


SETTLED = (
    "() => new Promise(done => requestAnimationFrame(() => requestAnimationFrame(() => requestAnimationFrame(done))))"
)
AXE_RUN = """async () => {
  document.querySelectorAll("details").forEach(part => { part.open = true; });
  const found = await axe.run(document, {resultTypes: ["violations"]});
  return found.violations.filter(one => ["serious", "critical"].includes(one.impact))
    .map(one => one.id + ": " + one.nodes.slice(0, 3).map(node => node.html.slice(0, 120)).join(" | "));
}"""
JUMPS = """() => new Promise(done => {
  let sum = 0;
  new PerformanceObserver(list => list.getEntries().forEach(entry => { sum += entry.value; }))
    .observe({type: "layout-shift", buffered: true});
  requestAnimationFrame(() => requestAnimationFrame(() => requestAnimationFrame(() => done(sum))));
})"""
# Contrast of every text in the drawings, which axe does not look at, with the sheet that they stand on; and that of the body.
CONTRAST = """() => {
  const light = colour => {
    const parts = colour.match(/[\\d.]+/g).map(Number).slice(0, 3).map(part => part / 255)
      .map(part => part <= 0.03928 ? part / 12.92 : Math.pow((part + 0.055) / 1.055, 2.4));
    return 0.2126 * parts[0] + 0.7152 * parts[1] + 0.0722 * parts[2];
  };
  const ratio = (one, other) => {
    const [high, low] = [light(one), light(other)].sort((a, b) => b - a);
    return (high + 0.05) / (low + 0.05);
  };
  const probe = document.createElement("i");
  probe.style.color = "var(--sheet)";
  document.body.append(probe);
  const sheet = getComputedStyle(probe).color, body = getComputedStyle(document.body);
  probe.remove();
  const texts = Array.from(document.querySelectorAll("svg text")).filter(text => text.getClientRects().length)
    .map(text => [text.textContent, ratio(getComputedStyle(text).fill, sheet)]);
  return {ground: light(body.backgroundColor), body: ratio(body.color, body.backgroundColor),
          count: texts.length, pale: texts.filter(text => text[1] < 4.5)};
}"""


def _open(browser, path, *, width=1280, scheme="light"):
    context = browser.new_context(viewport={"width": width, "height": 900}, color_scheme=scheme)
    page = context.new_page()
    page.goto(path.as_uri())
    page.evaluate(SETTLED)
    return page


DUMB = """() => Array.from(document.querySelectorAll("svg, img")).filter(one =>
  !one.closest("[aria-hidden=true], .leaflet-container, template") && !one.querySelector("title") &&
  !one.getAttribute("aria-label") && !one.getAttribute("alt")).map(one => one.outerHTML.slice(0, 120))"""


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize(("width", "scheme"), [(1280, "light"), (1280, "dark"), (390, "dark")])
def test_a_page_is_for_everyone(pages, browser, axe, kind, width, scheme):
    page = _open(browser, pages[kind], width=width, scheme=scheme)
    assert page.evaluate(JUMPS) < 0.01
    wide, shown = page.evaluate("() => [document.documentElement.scrollWidth, window.innerWidth]")
    assert wide <= shown == width
    assert page.evaluate(DUMB) == []
    seen = page.evaluate(CONTRAST)
    assert (seen["ground"] > 0.8) if scheme == "light" else (seen["ground"] < 0.05)
    assert seen["body"] >= 7.0
    assert seen["pale"] == []
    assert seen["count"] > 10 or kind in ("index", "crew sheet")
    page.evaluate(axe)
    assert page.evaluate(AXE_RUN) == []
    page.emulate_media(media="print")
    assert page.evaluate(CONTRAST)["ground"] > 0.99, "paper is white"
    page.context.close()


def test_the_chart_of_heights_can_be_read_on_paper(sample, browser):
    """Letters of 6 points at least, which is what the small print of the page has, on a chart that stands on the sheet."""
    for path in sample.link_pages:
        page = _open(browser, path)
        page.set_viewport_size({"width": PAPER_PX, "height": 1040})
        page.emulate_media(media="print")
        found = page.evaluate("""() => {
          const chart = document.querySelector("#heights svg"), box = chart.getBoundingClientRect();
          const scale = box.width / chart.viewBox.baseVal.width;
          const sizes = [...chart.querySelectorAll("text")].map(one => parseFloat(getComputedStyle(one).fontSize) * scale);
          const table = document.querySelector("#heights table").getBoundingClientRect();
          return {least: Math.min(...sizes), width: box.width, right: box.right, table: table.width}; }""")
        assert found["least"] * 0.75 >= 6.0, path.name
        assert found["width"] > 0.4 * PAPER_PX
        assert found["right"] < PAPER_PX
        assert found["table"] > 0.9 * PAPER_PX
        page.context.close()


def test_notes_of_charts_have_a_plate_on_paper_alone(sample, browser):
    """Letters have no halo there, for it would be a second copy of them in the text of a PDF."""
    shown = """() => [...document.querySelectorAll(".plate")].map(one => getComputedStyle(one).display)"""
    page = _open(browser, sample.link_pages[2])
    assert set(page.evaluate(shown)) == {"none"}
    page.emulate_media(media="print")
    assert set(page.evaluate(shown)) == {"inline"}
    assert page.evaluate("""() => [...document.querySelectorAll("#heights .note")].every(note => {
      const text = note.getBoundingClientRect(), plate = note.previousElementSibling.getBoundingClientRect();
      return plate.left < text.left + 1 && plate.right > text.right - 0.2 * text.width; })""")
    page.context.close()


def test_the_decision_stands_above_the_fold_and_a_link_takes_few_sheets(sample, browser):
    sheets = []
    for path in sample.link_pages:
        page = _open(browser, path)
        bottom, top = page.evaluate("""() => ["section.decision", "figure.drawing"].map(
          (name, index) => document.querySelector(name).getBoundingClientRect()[index ? "top" : "bottom"])""")
        assert bottom < top < 720, path.name
        # Wider than the sheet, a browser would shrink all of it: few sheets, but nobody could read them.
        page.set_viewport_size({"width": PAPER_PX, "height": 1040})
        page.emulate_media(media="print")
        assert page.evaluate("() => document.documentElement.scrollWidth") <= PAPER_PX, path.name
        sheets.append(len(re.findall(rb"/Type\s*/Page\b", page.pdf(prefer_css_page_size=True))))
        page.context.close()
    assert max(sheets) <= MOST_SHEETS, sheets
    assert sheets[STREET] <= SHEETS_OF_A_STREET


def test_paper_keeps_every_caution_and_every_point_to_verify(sample, browser):
    page = _open(browser, sample.link_pages[1])
    page.emulate_media(media="print")
    shown = """name => Array.from(document.querySelectorAll(name)).filter(
      one => one.checkVisibility({contentVisibilityAuto: true})).length"""
    plan = sample.plan.links[1]
    assert len(plan.survey) > 6
    assert page.evaluate(shown, "#ground tbody tr") == len(plan.survey)
    assert page.evaluate(shown, "#cautions li") == page.locator("#cautions li").count() > 10
    assert page.evaluate(shown, "#rules table") == 1
    page.context.close()


@pytest.mark.parametrize("kind", ["sample", "hostile", "plain"])
def test_a_link_page_is_small(request, kind):
    report = request.getfixturevalue(kind)
    for path in report.link_pages:
        assert path.stat().st_size < MOST_BYTES, path.name


@pytest.mark.slow
def test_a_link_page_with_horizons_and_equipment_is_small():
    study = load_study(ROOT / "sample_terrain" / "tolmera.toml")
    texts = render_pages(plan_study(study, horizons=True, equipment=True))
    for name, text in texts.items():
        assert len(text.encode("utf-8")) < MOST_BYTES or not name.startswith("link-"), name
