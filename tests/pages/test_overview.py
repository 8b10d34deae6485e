"""The overview: every way of choosing a link, the table, the filter, hubs, survey list and totals; small with many links."""

import math
import re
from dataclasses import replace

import numpy as np
import pytest
from synthetic_plans import TOLMERA, make_link, make_study

from fellspan.geodesy.position import Position
from fellspan.links.words import state_of
from fellspan.report import pages
from fellspan.report.overview import overview_view
from fellspan.report.panel_drawing import COLUMNS, HIGH, WIDE, draw_panel
from fellspan.report.survey_groups import SITES

browser_only = pytest.mark.browser
FOUND = """() => Array.from(document.querySelectorAll(".sortable tbody tr")).filter(row => !row.hidden)
  .map(row => row.querySelector("a").textContent)"""

SPOT = """() => { let at; fellspanMap.map.eachLayer(layer => {
    if (layer.options.className === "map-spot") at = layer.getLatLng(); });
  return [at.lat, at.lng]; }"""


def overview_of(plan) -> str:
    return pages._overview(plan, pages._environment(), [])


@pytest.fixture(scope="module")
def many(island):
    """200 links from ten hubs, over the invented island."""
    rng = np.random.default_rng(7)

    def spot(north_km, east_km):
        return Position(
            latitude_deg=TOLMERA.latitude_deg + north_km / 111.0, longitude_deg=TOLMERA.longitude_deg + east_km / 90.0
        )

    hubs = [spot(*rng.uniform(-7.0, 7.0, 2)) for _ in range(10)]
    links = tuple(
        make_link(
            f"Hub {index % 10 + 1} - Place {index + 1}", hubs[index % 10], spot(*rng.uniform(-8.0, 8.0, 2)), at=TOLMERA,
            names=(f"Hub {index % 10 + 1}", f"Place {index + 1}"), heights_m=(20.0, 8.0), samples=401,
        )
        for index in range(200)
    )  # fmt: skip
    plan = make_study(island, at=TOLMERA)
    return replace(plan, links=links, failures=())


def test_two_hundred_links_stay_a_small_page(many):
    text = overview_of(many)
    # The map library is 150 kB and a relief at most 135 kB of it; the rest of the budget of 1.5 MB is the links' own.
    assert len(text.encode()) < 1_500_000 - 135_000
    assert text.count('class="path-profile mini') == 200


def test_the_overview_of_the_sample_is_small(sample):
    assert len(sample.texts["index.html"].encode()) < 400_000


@browser_only
def test_two_hundred_links_load_sort_and_choose_without_a_word(many, tmp_path, watch):
    (tmp_path / "index.html").write_text(overview_of(many), encoding="utf-8")
    for width, height in ((1280, 900), (390, 844)):
        watched = watch(width, height)
        page = watched.page
        page.goto((tmp_path / "index.html").as_uri())
        assert page.evaluate("() => document.documentElement.scrollWidth") <= width
        assert page.locator(".sortable tbody tr").count() == 200
        page.locator(".entry[data-link='150']").click()
        assert page.locator("#chosen h2").inner_text() == many.links[150].result.name
        assert watched.messages == []
        assert watched.requests == []


@browser_only
def test_a_heading_sorts_by_pointer_and_keyboard_and_gives_the_order_back(plain, watch):
    page = watch(1280, 900).page
    page.goto((plain.folder / "index.html").as_uri())
    study = [link.result.name for link in plain.plan.links]
    by_length = [link.result.name for link in sorted(plain.plan.links, key=lambda link: link.result.distance_m)]
    head = page.locator(".sortable th", has_text="Length")
    assert page.evaluate(FOUND) == study
    head.locator("button").click()
    assert (head.get_attribute("aria-sort"), page.evaluate(FOUND)) == ("ascending", by_length)
    page.keyboard.press("Enter")
    assert (head.get_attribute("aria-sort"), page.evaluate(FOUND)) == ("descending", by_length[::-1])
    page.keyboard.press("Enter")
    assert (head.get_attribute("aria-sort"), page.evaluate(FOUND)) == (None, study)
    page.locator(".sortable th", has_text="Path").locator("button").click()
    states = {link.result.name: state_of(link.result) for link in plain.plan.links}
    order = ("clear", "clear-bare", "marginal", "obstructed")
    ranks = [order.index(states[name]) for name in page.evaluate(FOUND)]
    assert ranks == sorted(ranks)
    assert len(set(ranks)) > 1


@browser_only
def test_the_filter_holds_for_list_table_and_map(plain, watch):
    page = watch(1280, 900).page
    page.goto((plain.folder / "index.html").as_uri())
    wanted = [link.result.name for link in plain.plan.links if link.result.verdict == "obstructed"]
    page.select_option("#state", "obstructed")
    assert page.evaluate(FOUND) == wanted
    assert page.locator(".entry:visible").count() == len(wanted)
    drawn = page.evaluate("() => document.querySelectorAll('.leaflet-pane .map-path:not(.is-out)').length")
    assert drawn == len(wanted)
    assert page.locator("#shown").inner_text() == f"{len(wanted)} of {len(plain.plan.links)} links"
    page.select_option("#state", "")
    page.fill("#search", "CLINIC")
    assert page.evaluate(FOUND) == [one.result.name for one in plain.plan.links if "Clinic" in one.result.name]


@browser_only
def test_a_link_is_chosen_in_the_table_by_keyboard_and_focus_comes_back(plain, watch):
    page = watch(1280, 900).page
    page.goto((plain.folder / "index.html").as_uri())
    page.locator(".sortable .show").nth(3).focus()
    page.keyboard.press("Enter")
    assert page.locator("#chosen h2").inner_text() == plain.plan.links[3].result.name
    assert page.locator("tr.is-chosen").get_attribute("data-link") == "3"
    page.keyboard.press("Escape")
    assert page.evaluate("() => document.activeElement.getAttribute('aria-label')") == (
        f"Show {plain.plan.links[3].result.name} on the map"
    )


@browser_only
def test_every_site_of_the_sample_is_named_on_the_map(sample, watch):
    page = watch(1280, 900).page
    page.goto((sample.folder / "index.html").as_uri())
    ends = [end.site for link in sample.plan.links for end in (link.result.ends.a, link.result.ends.b)]
    shown = page.evaluate(
        "() => Array.from(document.querySelectorAll('.site-name')).filter(n => getComputedStyle(n).visibility === 'visible')"
        ".map(n => n.textContent)"
    )
    assert set(shown) == set(ends)


@browser_only
def test_without_scripts_the_table_still_leads_to_the_pages(plain, browser):
    context = browser.new_context(java_script_enabled=False)
    page = context.new_page()
    page.goto((plain.folder / "index.html").as_uri())
    assert page.locator(".sortable tbody a").count() == len(plain.plan.links)
    assert "need the scripts of this page" in page.locator(".map-frame").inner_text()
    context.close()


@browser_only
def test_map_table_and_totals_print_on_few_sheets(plain, sample, watch):
    page = watch(1280, 900).page
    for report in (plain, sample):
        page.goto((report.folder / "index.html").as_uri())
        sheets = page.pdf(prefer_css_page_size=True)
        assert 1 <= len(re.findall(rb"/Type\s*/Page\b", sheets)) <= 4
    page.emulate_media(media="print")
    assert page.locator(".sortable").is_visible()
    assert page.evaluate("() => getComputedStyle(document.querySelector('.sortable tbody tr')).breakInside") == "avoid"


@browser_only
def test_one_link_alone_has_an_overview_too(plain, tmp_path, watch):
    alone = replace(plain.plan, links=plain.plan.links[:1], failures=())
    (tmp_path / "index.html").write_text(overview_of(alone), encoding="utf-8")
    watched = watch(390, 844)
    watched.page.goto((tmp_path / "index.html").as_uri())
    watched.page.locator(".entry").click()
    assert watched.page.locator("#chosen svg.path-profile:visible").count() == 1
    assert watched.messages == []


def test_totals_hubs_and_left_margin_are_those_of_the_plan(sample):
    view = overview_view(sample.plan)
    links = sample.plan.links
    assert view.length_m == pytest.approx(sum(link.result.distance_m for link in links))
    assert sum(view.states.values()) == sum(count for _, count in view.signals) == len(links)
    ends = [end.site for link in links for end in (link.result.ends.a, link.result.ends.b)]
    assert {hub.site: len(hub.links) for hub in view.hubs} == {s: ends.count(s) for s in ends if ends.count(s) >= 3}
    for hub in view.hubs:
        carried = [link for link in links if hub.site in (link.result.a, link.result.b)]
        assert hub.length_m == pytest.approx(sum(link.result.distance_m for link in carried))
        assert hub.worst in {state_of(link.result) for link in carried}
        if any(link.result.verdict == "obstructed" for link in carried):
            assert hub.worst == "obstructed"
    found = sample.plan.interference.receivers
    left = min(one.effective_margin_db for one in found if one.link == links[4].result.name)
    assert view.rows[4].margin.text == f"−{math.ceil(abs(left) * 10.0) / 10.0:.1f}"
    assert view.rows[4].alone not in ("", view.rows[4].margin.text)


def test_the_survey_list_holds_every_point_once_and_runs_from_a_to_b(sample):
    groups = overview_view(sample.plan).survey
    labels = [label for group in groups for row in group.rows for label in row.labels]
    every = [f"L{n:02d}-{p.rank:02d}" for n, link in enumerate(sample.plan.links, 1) for p in link.survey]
    assert sorted(labels) == sorted(every)
    assert groups[0].name == SITES
    ends = {end.site for link in sample.plan.links for end in (link.result.ends.a, link.result.ends.b)}
    assert sorted(row.stands_there for row in groups[0].rows) == sorted(ends)
    for group in groups[1:]:
        along = [float(row.where.removesuffix(" km")) for row in group.rows]
        assert along == sorted(along)


def test_the_small_profile_keeps_ends_peaks_and_the_governing_point(sample):
    for link in sample.plan.links:
        panel = draw_panel(link)
        item = link.result.clearance[link.result.governing]
        assert panel.left == pytest.approx(item.worst_at_m / link.result.distance_m * 100.0, abs=0.01)
        assert 0.0 <= panel.top <= 100.0
        drawn = re.search(
            r'd="M0,(\d+)l([^V]*)V300H0Z" class="mini-(?:cover|ground)"', panel.svg
        )  # cover first, where any
        steps = [(int(x), int(y)) for x, y in re.findall(r"(-?\d+),?(-?\d+)", drawn[2])]
        xs, ys = np.cumsum([0, *(x for x, _ in steps)]), int(drawn[1]) + np.cumsum([0, *(y for _, y in steps)])
        assert (xs[0], xs[-1]) == (0, WIDE)
        assert 0 <= ys.min() <= ys.max() <= HIGH
        ticks = [(top * HIGH / 100.0, float(word.removesuffix(" m").replace("−", "-"))) for top, word in panel.heights]
        per_m = (ticks[0][0] - ticks[-1][0]) / (ticks[-1][1] - ticks[0][1])
        surface = link.profile.surface_m + link.levels.bulge_m[link.result.governing]
        wanted = ticks[0][0] - (surface - ticks[0][1]) * per_m
        at = link.levels.distance_m / link.levels.distance_m[-1]
        for column in range(COLUMNS):
            inside = np.flatnonzero((at >= column / COLUMNS) & (at < (column + 1) / COLUMNS))
            if inside.size:
                top = inside[np.argmin(wanted[inside])]
                # units of rounding: of the place along a steep slope, of the height, and of the ticks
                near = ys[np.abs(xs - at[top] * WIDE) <= 4.0]
                low = np.interp(at[top] * WIDE, xs, ys)
                assert min([low, *near]) - wanted[top] <= 3.0, (link.result.name, column)


@browser_only
def test_pointing_at_the_small_profile_marks_the_place_on_the_map(plain, watch):
    watched = watch(1280, 900)
    page = watched.page
    page.goto((plain.folder / "index.html").as_uri())
    page.locator(".entry[data-link='6']").click()  # the longest, of several stretches
    box = page.locator(".strip-plot").bounding_box()
    result, profile = plain.plan.links[6].result, plain.plan.links[6].profile
    for share in (0.0, 0.3, 0.75):
        page.mouse.move(box["x"] + 1 + share * (box["width"] - 2), box["y"] + 20)
        place = page.evaluate(SPOT)
        index = int(np.argmin(np.abs(profile.distance_m - share * result.distance_m)))
        # a pixel of the picture
        reach = 2.0 * result.distance_m / box["width"] / 90_000.0
        assert place == pytest.approx([profile.latitude_deg[index], profile.longitude_deg[index]], abs=reach)
    assert page.locator(".strip-at").inner_text().endswith("km from A")
    page.mouse.move(640, 200)
    assert page.locator(".map-spot").count() == 0
    page.keyboard.press("Escape")
    assert watched.messages == []
