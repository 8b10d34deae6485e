"""The overview of a search for a relay: diamonds, numbers on hops, the area and its words; and the network of any study."""

import dataclasses
from types import SimpleNamespace

import pytest
from made_pass import study_with_pass

from fellspan.exports.relay import relay_plan
from fellspan.links.signal_result import NOT_COMPUTED
from fellspan.planning.relay_result import RelayRequest
from fellspan.planning.relays import find_relay
from fellspan.report.network import clear_air_rate_bps, hubs_of
from fellspan.report.overview import overview_view
from fellspan.report.pages import render_pages
from fellspan.report.relay_area import area_corners, area_rings
from fellspan.report.relay_section import hop_ranks, map_overlay, relays_view

browser_only = pytest.mark.browser


@pytest.fixture(scope="module")
def searched(tmp_path_factory):
    study = study_with_pass(tmp_path_factory.mktemp("pass"))
    result = find_relay(study, "West - East", RelayRequest(mast_m=12.0, hop_m=2_000.0, count=2))
    plan = relay_plan(result, study)
    return SimpleNamespace(result=result, plan=plan, page=render_pages(plan, relays=result)["index.html"])


def test_ranks_and_pages_belong_to_the_links_of_the_report(searched):
    ranks = hop_ranks(searched.result)
    assert ranks == (0, 1, 1, 2, 2)
    view = relays_view(searched.result)
    rows = overview_view(searched.plan).rows
    for way in view.ways:
        of_way = [rows[index] for index, rank in enumerate(ranks) if rank == way.rank]
        assert [(hop.name, hop.page, hop.state) for hop in way.hops] == [
            (row.result.name, row.page, row.state) for row in of_way
        ]
        assert f'href="{way.hops[0].page}"' in searched.page


def test_numbers_stand_in_the_middle_of_their_hops_and_the_area_holds_the_relays(searched):
    overlay = map_overlay(searched.result, -45.28)
    for index, rank, latitude, longitude in overlay["hops"]:
        ends = searched.plan.links[index].result.ends
        assert latitude == pytest.approx(0.5 * (ends.a.latitude_deg + ends.b.latitude_deg), abs=2e-6)
        assert longitude == pytest.approx(0.5 * (ends.a.longitude_deg + ends.b.longitude_deg), abs=2e-6)
        assert rank == hop_ranks(searched.result)[index]
    turned = map_overlay(searched.result, 314.72)
    assert turned["area"][0][0][0][1] == pytest.approx(overlay["area"][0][0][0][1] + 360.0, abs=1e-6)
    assert all(ring[0] == ring[-1] for part in overlay["area"] for ring in part)


@browser_only
@pytest.mark.parametrize(("width", "height"), [(1280, 900), (390, 844)])
def test_the_map_tells_relays_by_shape_and_number(searched, tmp_path, watch, width, height):
    (tmp_path / "index.html").write_text(searched.page, encoding="utf-8")
    watched = watch(width, height)
    page = watched.page
    page.goto((tmp_path / "index.html").as_uri())
    assert page.locator(".site-dot.relay").count() == 2
    assert page.locator(".leaflet-pane .hop-rank i").all_inner_texts() == ["1", "1", "2", "2"]
    assert page.locator(".leaflet-pane path.relay-area").count() == 1
    assert "both ends clear from here with a 12 m mast" in page.locator(".map-key").inner_text()
    assert page.evaluate("() => document.documentElement.scrollWidth") <= width
    # A hop is still chosen by its line in the list, and Escape leaves it.
    page.locator(".entry[data-link='1']").click()
    assert page.locator("#chosen h2").inner_text() == searched.plan.links[1].result.name
    assert watched.messages == []
    assert watched.requests == []


@browser_only
@pytest.mark.parametrize(("width", "height"), [(1280, 900), (390, 844)])
def test_the_relief_fills_the_map_of_relays_and_holds_the_area(searched, tmp_path, watch, width, height):
    (tmp_path / "index.html").write_text(searched.page, encoding="utf-8")
    page = watch(width, height).page
    page.goto((tmp_path / "index.html").as_uri())
    relief = page.locator("#map_overview img.leaflet-image-layer").bounding_box()
    for inner in (page.locator("#map_overview"), page.locator(".leaflet-pane path.relay-area")):
        box = inner.bounding_box()
        for at, size in (("x", "width"), ("y", "height")):
            assert relief[at] <= box[at] + 1.0
            assert relief[at] + relief[size] >= box[at] + box[size] - 1.0


def test_the_corners_of_the_area_hold_its_rings(searched):
    area = searched.result.area
    corners = area_corners(area, 314.72)
    for at in (0, 1):
        drawn = [point[at] for part in area_rings(area, 314.72) for ring in part for point in ring]
        assert min(corner[at] for corner in corners) <= min(drawn) + 1e-5
        assert max(corner[at] for corner in corners) >= max(drawn) - 1e-5
    assert area_corners(dataclasses.replace(area, clear=area.clear & False, cells=0), 0.0) == []


def test_a_search_for_relays_has_no_table_of_hubs_and_a_study_has(searched, sample):
    assert 'id="network"' not in searched.page
    assert 'id="network"' in sample.texts["index.html"]
    assert 'id="relays"' not in sample.texts["index.html"]


def test_what_a_hub_carries_is_the_sum_and_the_worst_of_its_links(sample):
    by_name = {link.result.name: link.result for link in sample.plan.links}
    seen_rate = False
    for hub in hubs_of(sample.plan):
        results = [by_name[name] for name, _, _ in hub.links]
        assert hub.length_m == pytest.approx(sum(result.distance_m for result in results))
        verdicts = [result.signal_verdict for result in results]
        if "below" in verdicts:
            assert hub.signal.startswith("below")
        rates = [rate for rate in map(clear_air_rate_bps, results) if rate is not None]
        if rates:
            seen_rate = True
            assert hub.rate.startswith(f"{sum(rates) / 1e6:.3g} Mbit/s") or "Gbit/s" in hub.rate
            assert ("by" in hub.rate) == (len(rates) < len(results))
        else:
            assert hub.rate == "–"
    assert seen_rate, "the sample states no rate at a hub: the test would prove nothing"


def test_the_rate_is_that_of_the_slower_way_and_of_no_path_through_an_obstruction(sample):
    result = next(one.result for one in sample.plan.links if (clear_air_rate_bps(one.result) or 0.0) > 0.0)
    rate = clear_air_rate_bps(result)
    signal = result.signal
    slow = dataclasses.replace(
        signal.b_to_a,
        availability_percent=NOT_COMPUTED,
        modulations=tuple(dataclasses.replace(row, margin_db=-1.0) for row in signal.b_to_a.modulations),
    )
    slower = dataclasses.replace(result, signal=dataclasses.replace(signal, b_to_a=slow))
    assert rate > 0.0
    assert clear_air_rate_bps(slower) == 0.0
    assert clear_air_rate_bps(dataclasses.replace(result, signal=None)) is None
