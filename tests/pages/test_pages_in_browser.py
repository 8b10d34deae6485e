"""Every page in a real browser: silent, within its width, chosen by hand and by keyboard, and true to the result."""

import re
from dataclasses import dataclass

import pytest
from watched_browser import watching

from fellspan.links.words import spare_m
from fellspan.report.wording import clean

pytestmark = pytest.mark.browser

SIZES = {"desktop": (1280, 900), "phone": (390, 844)}


SHOWN = 'Array.from(document.querySelectorAll("svg.path-profile")).filter(svg => svg.getClientRects().length)'
PLACES = f"""() => {SHOWN}.map(svg => {{
  const middle = (part, axis) => {{
    const box = part.getBoundingClientRect();
    return axis === "x" ? (box.left + box.right) / 2 : (box.top + box.bottom) / 2;
  }};
  const ticks = (name, key, axis) =>
    Array.from(svg.querySelectorAll(name)).map(part => [Number(part.dataset[key]), middle(part, axis)]);
  const point = svg.querySelector(".governing-point"), group = svg.querySelector(".governing");
  return {{x: ticks(".tick-x", "atM", "x"), y: ticks(".tick-y", "levelM", "y"),
           point: [middle(point, "x"), middle(point, "y")], said: {{...group.dataset}},
           words: svg.querySelector(".callout").textContent}};
}})"""


FOREIGN = "() => document.querySelectorAll('img:not(.leaflet-image-layer), [onerror]').length"
TEXTS = f"""() => {SHOWN}.map(svg => {{
  const frame = svg.getBoundingClientRect();
  return Array.from(svg.querySelectorAll("text")).map(part => {{
    const box = part.getBoundingClientRect();
    return [part.lastChild.textContent, box.left - frame.left, box.top - frame.top, box.right - frame.left,
            box.bottom - frame.top, frame.width];
  }});
}})[0]"""


@dataclass(frozen=True, kw_only=True)
class Visit:
    """What one page showed at one size."""

    name: str
    size: str
    widths: tuple[int, int]
    requests: list[str]
    messages: list[str]
    drawings: list[dict]
    texts: list[list]
    heading: str
    title: str
    foreign: int


def _visits(report, browser, names):
    """Each page loaded once, measured at every size, as turning a phone or dragging a window does."""
    seen = []
    with watching(browser) as opened:
        for name in names:
            watched = opened(*SIZES["desktop"])
            page = watched.page
            page.goto((report.folder / name).as_uri())
            for size, (width, height) in SIZES.items():
                page.set_viewport_size({"width": width, "height": height})
                # two frames: the map has then been measured and its names placed
                page.evaluate("() => new Promise(done => requestAnimationFrame(() => requestAnimationFrame(done)))")
                drawn = name != "index.html"
                seen.append(
                    Visit(
                        name=name,
                        size=size,
                        widths=tuple(page.evaluate("() => [document.documentElement.scrollWidth, window.innerWidth]")),
                        requests=watched.requests,
                        messages=watched.messages,
                        drawings=page.evaluate(PLACES) if drawn else [],
                        texts=page.evaluate(TEXTS) if drawn else [],
                        heading=page.evaluate("() => document.querySelector('h1').textContent"),
                        title=page.title(),
                        foreign=page.evaluate(FOREIGN),
                    )
                )
    return seen


@pytest.fixture(scope="module")
def plain_visits(plain, browser):
    return _visits(plain, browser, plain.main_pages)


@pytest.fixture(scope="module")
def hostile_visits(hostile, browser):
    return _visits(hostile, browser, hostile.main_pages)


@pytest.fixture(scope="module")
def sample_visits(sample, browser):
    return _visits(sample, browser, sample.main_pages)


@pytest.fixture(scope="module")
def tiled_visits(tiled, browser):
    return _visits(tiled, browser, tiled.main_pages[:2])


@pytest.fixture(scope="module")
def antimeridian_visits(antimeridian, browser):
    return _visits(antimeridian, browser, antimeridian.main_pages[:3])


@pytest.mark.parametrize("kind", ["plain", "sample", "hostile", "tiled", "antimeridian"])
def test_no_page_asks_for_anything_says_anything_or_scrolls_sideways(request, kind):
    visits = request.getfixturevalue(f"{kind}_visits")
    assert {visit.size for visit in visits} == set(SIZES)
    for visit in visits:
        wide, shown = visit.widths
        assert shown == SIZES[visit.size][0]
        assert wide <= shown, f"{visit.name} is {wide} px wide in a window of {shown} px"
        assert visit.requests == [], visit.name
        assert visit.messages == [], visit.name


def _on_scale(ticks, value):
    (v0, p0), (v1, p1) = ticks[0], ticks[-1]
    return p0 + (value - v0) / (v1 - v0) * (p1 - p0)


@pytest.mark.parametrize("kind", ["plain", "sample"])
@pytest.mark.parametrize("size", SIZES)
def test_governing_point_is_drawn_where_the_result_says(request, kind, size):
    report, seen = request.getfixturevalue(kind), request.getfixturevalue(f"{kind}_visits")
    visits = [visit for visit in seen if visit.size == size and visit.drawings]
    for plan, visit in zip(report.plan.links, visits, strict=True):
        assert len(visit.drawings) == 1
        drawing, item = visit.drawings[0], plan.result.clearance[plan.result.governing]
        # half a pixel: strokes are snapped to the grid of the screen
        assert drawing["point"][0] == pytest.approx(_on_scale(drawing["x"], item.worst_at_m), abs=0.5)
        assert drawing["point"][1] == pytest.approx(_on_scale(drawing["y"], item.surface_m + item.bulge_m), abs=0.5)
        assert float(drawing["said"]["atM"]) == item.worst_at_m
        spare = spare_m(item, length_m=plan.result.distance_m)
        assert f"{abs(spare):.1f} m" in drawing["words"]
        assert ("short" in drawing["words"]) == (spare < 0.0) == (not item.met)


def _middle_of_path(page, index):
    return page.evaluate(
        """index => { const path = document.querySelector(".map-hit.of-link-" + index);
          const at = path.getPointAtLength(path.getTotalLength() * 0.8).matrixTransform(path.getScreenCTM());
          return [at.x, at.y]; }""",
        index,
    )


def test_a_link_is_chosen_by_a_click_on_its_path_on_the_map(plain, watch):
    page = watch(1280, 900).page
    page.goto((plain.folder / "index.html").as_uri())
    assert page.locator("#chosen").is_hidden()
    page.mouse.click(*_middle_of_path(page, 6))
    assert page.locator("#chosen h2").inner_text() == plain.plan.links[6].result.name
    assert page.locator("#chosen svg.path-profile:visible").count() == 1
    assert page.locator(".entry[aria-pressed=true]").get_attribute("data-link") == "6"
    assert page.locator("#chosen a.page-link").get_attribute("href") == plain.main_pages[7]


def test_a_link_is_chosen_in_the_list_by_keyboard_alone_and_left_again(plain, watch):
    watched = watch(1280, 900)
    page = watched.page
    page.goto((plain.folder / "index.html").as_uri())
    for _ in range(40):
        page.keyboard.press("Tab")
        if page.evaluate("() => document.activeElement.dataset.link") == "2":
            break
    page.keyboard.press("Enter")
    assert page.locator("#chosen h2").inner_text() == plain.plan.links[2].result.name
    assert page.locator("#chosen svg.path-profile:visible").count() == 1
    page.keyboard.press("Escape")
    assert page.locator("#chosen").is_hidden()
    assert page.evaluate("() => document.activeElement.dataset.link") == "2"
    assert watched.messages == []


def test_a_link_page_leads_back_to_its_link(plain, watch):
    page = watch(390, 844).page
    page.goto(plain.link_pages[3].as_uri())
    page.click(".trail a")
    assert page.locator("#chosen h2").inner_text() == plain.plan.links[3].result.name


def test_map_fills_the_overview_and_opens_from_the_key_plan(plain, watch):
    page = watch(1280, 900).page
    page.goto((plain.folder / "index.html").as_uri())
    box = page.locator(".folium-map").bounding_box()
    assert box["width"] >= 0.7 * 1280
    assert box["height"] >= 0.85 * 900
    page.goto(plain.link_pages[0].as_uri())
    page.click("[data-map=open]")
    box = page.locator(".folium-map").bounding_box()
    assert (round(box["width"]), round(box["height"])) == (1280, 900)
    page.keyboard.press("Escape")
    assert page.locator(".folium-map").bounding_box()["width"] < 400


def test_hostile_names_are_shown_as_the_text_they_are(hostile, hostile_visits):
    for number, plan in enumerate(hostile.plan.links):
        for visit in hostile_visits[2 * number + 2 : 2 * number + 4]:
            assert visit.heading == clean(plan.result.name)
            assert visit.title == " ".join(f"{clean(plan.result.name)} – {plan.result.verdict}".split())
            assert visit.foreign == 0
    assert hostile_visits[0].heading == clean(hostile.plan.study.title)
    assert hostile_visits[0].foreign == 0


def test_tiles_are_asked_for_only_after_the_reader_presses_the_button(tiled, watch):
    watched = watch(1280, 900)
    watched.page.goto((tiled.folder / "index.html").as_uri())
    assert watched.requests == []
    with watched.page.expect_request(lambda request: request.url.startswith("https://tiles.invalid/")):
        watched.page.click("[data-map=tiles]")
    assert all(url.startswith("https://tiles.invalid/") for url in watched.requests)
    assert "Map data <b>desk</b>" in watched.page.locator(".leaflet-control-attribution").inner_text()


def test_names_on_the_map_do_not_overlap_and_stay_inside(plain, watch):
    for width, height in SIZES.values():
        page = watch(width, height).page
        page.goto((plain.folder / "index.html").as_uri())
        boxes = page.evaluate(
            """() => Array.from(document.querySelectorAll(".site-name:not(.crowded)")).map(name => {
              const box = name.getBoundingClientRect(); return [box.left, box.top, box.right, box.bottom]; })"""
        )
        assert len(boxes) >= 5
        for index, one in enumerate(boxes):
            for other in boxes[:index]:
                apart = one[0] >= other[2] or other[0] >= one[2] or one[1] >= other[3] or other[1] >= one[3]
                assert apart, (one, other)


@pytest.mark.parametrize("kind", ["plain", "sample", "hostile"])
def test_texts_of_the_drawing_do_not_overlap_nor_leave_it(request, kind):
    for visit in request.getfixturevalue(f"{kind}_visits"):
        assert len(visit.texts) > 20 or not visit.drawings
        for index, (said, left, top, right, bottom, width) in enumerate(visit.texts):
            assert left >= -1.0, said
            assert right <= width + 1.0, said
            for other in visit.texts[:index]:
                # 2 and 3 px: boxes of text hold room above and below the letters
                overlap = (
                    min(right, other[3]) - max(left, other[1]) > 2 and min(bottom, other[4]) - max(top, other[2]) > 3
                )
                assert not overlap, (visit.name, visit.size, said, other[0])


def test_a_link_page_prints_on_a_few_sheets_of_a4(plain, watch):
    page = watch(1280, 900).page
    for path in plain.link_pages[:3]:
        page.goto(path.as_uri())
        sheets = page.pdf(prefer_css_page_size=True)
        assert 2 <= len(re.findall(rb"/Type\s*/Page\b", sheets)) <= 4
        # A4 in points, to a point
        width, height = (
            float(value) for value in re.search(rb"/MediaBox\s*\[0 0 ([\d.]+) ([\d.]+)\]", sheets).groups()
        )
        assert (width, height) == pytest.approx((595.3, 841.9), abs=1.0)


def test_the_profile_stands_on_the_first_sheet(plain, sample, watch):
    page = watch(1280, 900).page
    page.emulate_media(media="print")
    page.set_viewport_size({"width": 703, "height": 1040})  # A4 less its margins, at 96 px an inch
    for path in (*plain.link_pages, *sample.link_pages):
        page.goto(path.as_uri())
        bottom = page.evaluate("() => document.querySelector('figure.drawing').getBoundingClientRect().bottom")
        assert bottom <= 1040


DOTS = """() => { const frame = document.querySelector(".folium-map").getBoundingClientRect();
  return Array.from(document.querySelectorAll(".site-dot")).map(dot => {
    const at = dot.getBoundingClientRect();
    return [at.left - frame.left, frame.right - at.right, at.top - frame.top, frame.bottom - at.bottom,
            frame.width, frame.height]; }); }"""


def _settled(page):
    page.evaluate("() => new Promise(done => requestAnimationFrame(() => requestAnimationFrame(done)))")


@pytest.mark.parametrize("size", ["desktop", "phone"])
def test_an_open_overview_fits_its_map_to_the_sheet_and_back(sample, watch, size):
    page = watch(*SIZES[size]).page
    page.goto((sample.folder / "index.html").as_uri())
    page.evaluate("() => fellspanMap.map.setZoom(14, {animate: false})")  # as someone leaves it who looked at a detail
    before = page.evaluate("() => [fellspanMap.map.getZoom(), document.querySelector('.folium-map').clientWidth]")
    # What a browser does before it draws sheets; the layout is still that of the window.
    at_once = f"() => {{ window.dispatchEvent(new Event('beforeprint')); return ({DOTS})(); }}"
    for dot in page.evaluate(at_once):
        assert min(dot[:4]) >= 5, dot
        assert dot[4:] == [703, 420]
    page.evaluate("() => window.dispatchEvent(new Event('afterprint'))")
    assert page.evaluate("() => document.querySelector('.folium-map').clientWidth") == before[1]
    page.emulate_media(media="print")
    _settled(page)
    for dot in page.evaluate(DOTS):
        assert min(dot[:4]) >= 5, dot
        assert dot[4:] == [703, 420]
    assert page.locator(".line-key:visible").count() == 1


def test_links_fill_the_map_and_names_are_whole(sample, watch):
    page = watch(*SIZES["desktop"]).page
    page.goto((sample.folder / "index.html").as_uri())
    _settled(page)
    left, right, *_ = (min(side) for side in zip(*page.evaluate(DOTS), strict=True))
    width = page.locator(".folium-map").bounding_box()["width"]
    assert width - left - right > 0.8 * width
    cut = page.evaluate("""() => { const frame = document.querySelector(".folium-map").getBoundingClientRect();
      return Array.from(document.querySelectorAll(".site-name:not(.crowded)")).filter(name => {
        const at = name.getBoundingClientRect();
        return at.left < frame.left || at.right > frame.right || at.top < frame.top || at.bottom > frame.bottom;
      }).map(name => name.textContent); }""")
    assert cut == []


def test_a_phone_shows_the_key_of_lines_below_the_map(sample, watch):
    page = watch(*SIZES["phone"]).page
    page.goto((sample.folder / "index.html").as_uri())
    chart, key = page.locator(".folium-map").bounding_box(), page.locator(".line-key").bounding_box()
    assert key["y"] >= chart["y"] + chart["height"]
    assert "clear on bare ground only" in page.locator(".line-key").inner_text()


def test_a_cut_wears_the_colour_of_its_own_link(sample, watch):
    page = watch(*SIZES["desktop"]).page
    page.goto((sample.folder / "index.html").as_uri())
    colours = page.evaluate("""() => Array.from(document.querySelectorAll(".leaflet-pane .map-cut")).map(cut => {
      const link = cut.getAttribute("class").match(/of-link-\\d+/)[0];
      return [getComputedStyle(cut).stroke, getComputedStyle(document.querySelector(".map-path." + link)).stroke]; })""")
    assert len({own for own, _ in colours}) == 2
    for own, of_the_link in colours:
        assert own == of_the_link


def test_letters_stand_once_on_paper(plain, watch):
    page = watch(703, 1040).page
    page.goto(plain.link_pages[0].as_uri())
    halo = "() => Array.from(document.querySelectorAll('svg text')).filter(t => getComputedStyle(t).stroke !== 'none').length"
    assert page.evaluate(halo) > 0
    page.emulate_media(media="print")
    assert page.evaluate(halo) == 0
