"""A link measured as built says so where the reader looks first, and the page stays for everyone; so does a what-if."""

from dataclasses import replace
from pathlib import Path

import pytest
from test_accessibility import AXE, AXE_RUN, CONTRAST, DUMB, SETTLED
from whatif_reading import typed

from fellspan.design.as_built import AsBuilt, BuiltEnd, Reading
from fellspan.planning.accepting import accept_link, with_acceptance
from fellspan.planning.horizons import with_horizons
from fellspan.planning.planner import open_terrain
from fellspan.report.overview import overview_view
from fellspan.report.pages import render_pages

WOODS, SEA = 5, 2
MODES = [(1280, "light"), (1280, "dark"), (390, "light"), (390, "dark")]


@pytest.fixture(scope="module")
def built(sample):
    """Plans of the link over the woods alone, measured on a side lobe and measured as planned."""
    plan = replace(sample.plan, links=(sample.plan.links[WOODS],))
    (link,) = plan.links
    plans = []
    for low_db in (21.0, 0.5):
        read = AsBuilt(
            link=link.result.name,
            readings=(
                Reading(end="a", level_dbm=link.result.received_dbm.at_a - low_db),
                Reading(end="b", level_dbm=link.result.received_dbm.at_b - low_db),
            ),
            a=BuiltEnd(height_m=5.1, height_reference="ground", bearing_deg=280.5, bearing_is="magnetic"),
            modulation="64-QAM 5/6",
            power_control="off",
            levels_are="all chains",
        )
        with open_terrain(plan.study) as terrain:
            found = accept_link(plan.study, link, read, terrain=terrain)
        plans.append(with_acceptance(plan, found))
    return plans


@pytest.fixture(scope="module")
def pages(built, tmp_path_factory):
    """Overview and page of the link, of each plan."""
    found = []
    for plan in built:
        folder = tmp_path_factory.mktemp("built")
        texts = render_pages(plan)
        for name, text in texts.items():
            (folder / name).write_text(text, encoding="utf-8")
        found.append((folder / "index.html", folder / next(name for name in texts if name.startswith("link-"))))
    return found


@pytest.fixture(scope="module")
def axe():
    if not AXE.exists():
        pytest.skip(f"axe-core is not at {AXE}")
    return Path(AXE).read_text(encoding="utf-8")


def _open(browser, path, width, scheme):
    page = browser.new_context(viewport={"width": width, "height": 900}, color_scheme=scheme).new_page()
    page.goto(path.as_uri())
    page.evaluate(SETTLED)
    return page


@pytest.mark.browser
@pytest.mark.parametrize(("which", "said"), [(0, "Not accepted"), (1, "Accepted as built")])
def test_the_verdict_as_built_stands_over_that_of_the_plan(pages, built, browser, which, said):
    page = _open(browser, pages[which][1], 1280, "light")
    head = page.locator("#decision > .built-line")
    assert head.locator(".verdict").inner_text().endswith(said)
    assert built[which].links[0].as_built.decision in head.inner_text()
    assert head.bounding_box()["y"] < page.locator(".decision-head").bounding_box()["y"]
    assert page.locator("figure.drawing").bounding_box()["y"] < 720, "the profile still begins on the first screen"
    head.locator("a").click()
    assert page.evaluate("() => document.querySelector('#as-built').getBoundingClientRect().top") < 450
    page.emulate_media(media="print")
    assert head.is_visible()
    assert "−0.1°" in page.locator("#as-built").inner_text(), "figures as everywhere on the page"
    page.context.close()


def test_lists_of_all_links_say_what_was_measured(built, sample):
    assert [row.built for row in overview_view(built[0]).rows] == ["✕ not accepted"]
    assert [row.built for row in overview_view(built[1]).rows] == ["✓ accepted"]
    assert not any(row.built for row in overview_view(sample.plan).rows)
    assert not any("Measured as built" in text for text in sample.texts.values())


@pytest.mark.browser
@pytest.mark.parametrize("kind", [0, 1], ids=["overview", "link"])
@pytest.mark.parametrize(("width", "scheme"), MODES)
def test_a_page_as_built_is_for_everyone(pages, browser, axe, kind, width, scheme):
    page = _open(browser, pages[0][kind], width, scheme)
    assert page.get_by_text("as built").first.is_visible()
    assert page.evaluate("() => document.documentElement.scrollWidth") <= width
    assert page.evaluate(DUMB) == []
    assert page.evaluate(CONTRAST)["pale"] == []
    page.evaluate(axe)
    assert page.evaluate(AXE_RUN) == []
    page.context.close()


@pytest.mark.browser
@pytest.mark.parametrize(("width", "scheme"), MODES)
def test_a_changed_drawing_is_for_everyone(sample, browser, axe, width, scheme):
    page = _open(browser, sample.link_pages[SEA], width, scheme)
    typed(page, a="30", b="abc", k="0.8")
    assert page.locator("[data-what-if=copy]").is_visible()
    assert page.evaluate("() => document.documentElement.scrollWidth") <= width
    assert page.evaluate(DUMB) == []
    assert page.evaluate(CONTRAST)["pale"] == []
    page.evaluate(axe)
    assert page.evaluate(AXE_RUN) == []
    page.context.close()


@pytest.mark.browser
def test_a_phone_shows_the_far_site_in_the_horizon_first(sample, browser, tmp_path):
    with open_terrain(sample.plan.study) as terrain:
        link = with_horizons(sample.plan.links[SEA], terrain)
    texts = render_pages(replace(sample.plan, links=(link,)))
    name = next(name for name in texts if name.startswith("link-"))
    (tmp_path / name).write_text(texts[name], encoding="utf-8")
    page = _open(browser, tmp_path / name, 390, "light")
    for at in range(2):
        box = page.locator(".horizons svg .far-site").nth(at).bounding_box()
        assert 0 < box["x"] < 390 - box["width"]
    page.context.close()
