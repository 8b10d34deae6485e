"""Where a relay would go: a ridge with one pass, against a brute force over all cells; chains of two; candidate sites."""

import dataclasses
from pathlib import Path

import numpy as np
import pytest
import shapely
from made_pass import CELL_M, COLUMNS, PASS_ROW, ROWS, cell_centre, ground_with_pass, link_over, study_with_pass
from made_terrain import at, lonlat

from fellspan.errors import LinkError
from fellspan.links.site import Link, Site
from fellspan.planning.inputs import Study
from fellspan.planning.planner import plan_study
from fellspan.planning.relay_hops import hop_link
from fellspan.planning.relay_result import RelayRequest
from fellspan.planning.relays import find_relay
from fellspan.report.relay_words import decision
from fellspan.terrain.raster_file import on_plane


def planned_clear(study: Study, links: list[Link]) -> list[bool]:
    """What planning says of each link alone, by the way that any study goes."""
    plan = plan_study(dataclasses.replace(study, links=tuple(links)))
    verdicts = {link.result.name: link.result.verdict for link in plan.links}
    return [verdicts.get(link.name) == "clear" for link in links]


def both_hops_clear(study: Study, sites: list[Site]) -> list[bool]:
    """Whether both ends see each of these sites clear."""
    link = study.links[0]
    near = planned_clear(study, [hop_link(link, name=f"a {at}", a=link.a, b=site) for at, site in enumerate(sites)])
    seen = [at for at, clear in enumerate(near) if clear]
    far = planned_clear(study, [hop_link(link, name=f"b {at}", a=sites[at], b=link.b) for at in seen])
    answer = [False] * len(sites)
    for number, clear in zip(seen, far, strict=True):
        answer[number] = clear
    return answer


@pytest.fixture(scope="module")
def found(tmp_path_factory: pytest.TempPathFactory):  # type: ignore[no-untyped-def]
    study = study_with_pass(tmp_path_factory.mktemp("pass"))
    return study, find_relay(study, "West - East", RelayRequest(mast_m=12.0, hop_m=2_000.0))


def test_the_direct_path_is_cut_and_the_relay_stands_where_it_sees_both_valleys(found) -> None:  # type: ignore[no-untyped-def]
    study, result = found
    assert result.direct is not None
    assert result.direct.result.verdict == "obstructed"
    assert result.routes
    assert result.area is not None
    assert result.area.exact
    for route in result.routes:
        assert [hop.result.verdict for hop in route.hops] == ["clear", "clear"]
        assert both_hops_clear(study, list(route.relays)) == [True]


@pytest.mark.slow
@pytest.mark.timeout(900)
def test_every_cell_agrees_with_planning_both_hops_one_by_one(found) -> None:  # type: ignore[no-untyped-def]
    study, result = found
    area = result.area
    cells = [(row, column) for row in range(ROWS) for column in range(COLUMNS)]
    sites = [
        Site(name=f"{row}/{column}", position=at((column + 0.5) * CELL_M, (row + 0.5) * CELL_M), height_m=12.0)
        for row, column in cells
    ]
    brute = both_hops_clear(study, sites)
    wrong = []
    for (row, column), clear in zip(cells, brute, strict=True):
        x, y = (float(one) for one in on_plane(~area.transform, *map(np.asarray, cell_centre(row, column))))
        inside = 0 <= int(y) < area.clear.shape[0] and 0 <= int(x) < area.clear.shape[1]
        said = bool(inside and area.clear[int(y), int(x)])
        if clear != said:
            wrong.append((row, column, clear, said))
    assert sum(brute) >= 5, "the sample has no relay at all: the test would prove nothing"
    assert not wrong


def test_a_ridge_without_its_pass_and_a_low_mast_has_no_relay_below_the_crest(tmp_path: Path) -> None:
    heights = ground_with_pass()
    heights[:, 13:19] = 200.0
    study = study_with_pass(tmp_path, heights=heights)
    area = shapely.Polygon([lonlat(x * CELL_M, y * CELL_M) for x, y in ((0, 0), (12, 0), (12, 24), (0, 24))])
    tower = find_relay(study, "West - East", RelayRequest(mast_m=700.0, area=area, two_relays=False, count=1))
    assert "see that 700 m was meant" in tower.cautions[0]
    result = find_relay(study, "West - East", RelayRequest(mast_m=5.0, area=area, two_relays=False))
    assert not result.routes
    assert decision(result).endswith("A taller mast (--mast) or longer hops (--hop) may find one.")
    assert not any("was meant" in caution for caution in result.cautions)
    assert result.area is not None
    assert result.area.cells == 0


def test_two_relays_where_one_does_not_do(tmp_path: Path) -> None:
    """Two ridges, and hops too short for one relay: a chain over both."""
    rows, columns = np.mgrid[0:ROWS, 0:COLUMNS].astype(np.float64)
    heights = 5.0 + sum(80.0 * np.exp(-(((columns - middle) / 1.2) ** 2)) for middle in (9.5, 20.5)) + 0.0 * rows
    study = study_with_pass(tmp_path, heights=heights)
    result = find_relay(study, "West - East", RelayRequest(mast_m=6.0, hop_m=620.0, count=1))
    assert [len(route.relays) for route in result.routes] == [2]
    assert [hop.result.verdict for hop in result.routes[0].hops] == ["clear"] * 3
    assert all(hop.result.distance_m <= 621.0 for hop in result.routes[0].hops)


def test_candidate_sites_alone_are_tried(tmp_path: Path) -> None:
    study = study_with_pass(tmp_path)
    crest = Site(name="Crest", position=at(15.9 * CELL_M, 15.3 * CELL_M), height_m=10.0)
    valley = Site(name="Valley", position=at(6.0 * CELL_M, 20.0 * CELL_M), height_m=10.0)
    far = Site(name="Far", position=at(60.0 * CELL_M, 20.0 * CELL_M), height_m=10.0)
    result = find_relay(study, "West - East", RelayRequest(sites=(valley, far, crest)))
    assert [route.relays[0].name for route in result.routes] == ["Crest"]
    assert result.area is None
    assert "1 of 3 candidate sites" in result.refused[0]


def test_relays_stand_apart_and_within_the_area(found, tmp_path: Path) -> None:  # type: ignore[no-untyped-def]
    study, _ = found
    north = shapely.Polygon([lonlat(x * CELL_M, y * CELL_M) for x, y in ((0, 0), (32, 0), (32, 12), (0, 12))])
    result = find_relay(study, "West - East", RelayRequest(mast_m=12.0, area=north, apart_m=150.0, count=4))
    places = [route.relays[0].position for route in result.routes]
    assert len(places) >= 2
    assert all(shapely.contains_xy(north, place.longitude_deg, place.latitude_deg) for place in places)
    from fellspan.geodesy.geodesic import inverse

    for one, first in enumerate(places):
        assert all(inverse(first, other).distance_m >= 149.0 for other in places[one + 1 :])


def test_what_cannot_be_is_refused_in_words(tmp_path: Path) -> None:
    study = study_with_pass(tmp_path)
    with pytest.raises(LinkError, match=r"0\.40 km"):
        find_relay(study, "West - East", RelayRequest(hop_m=0.4e3))
    with pytest.raises(LinkError, match="'North'"):
        find_relay(study, "North", RelayRequest())
    with pytest.raises(LinkError, match="-3"):
        RelayRequest(mast_m=-3.0)
    with pytest.raises(LinkError, match="25"):
        RelayRequest(count=25)


def test_the_pass_is_the_lowest_place_that_serves(found) -> None:  # type: ignore[no-untyped-def]
    """From the saddle itself both valleys are seen only with enough mast: the area tells it apart from the crest."""
    _, result = found
    assert PASS_ROW < ROWS
    assert result.area.cells < result.area.looked_at
    assert link_over().name == result.link_name
