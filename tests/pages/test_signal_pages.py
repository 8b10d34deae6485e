"""The radio side in every view: two links of the sample, planned once; the views agree and compute nothing of their own."""

import csv
import dataclasses
import io
import re
from html import unescape
from pathlib import Path

import pytest

from fellspan.cli.layout import Ink
from fellspan.cli.link_page import link_lines
from fellspan.climate.given import GivenClimate
from fellspan.exports.coordination import coordination_csv
from fellspan.exports.tables import links_csv
from fellspan.links import radio_words
from fellspan.links.result import LinkResult
from fellspan.links.site import Antenna
from fellspan.planning.plan import StudyPlan
from fellspan.planning.planner import plan_study
from fellspan.report.overview import overview_view
from fellspan.report.pages import render_pages
from fellspan.report.workings_section import value_words
from fellspan.study.reading import load_study

STUDY = Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml"
SEA, HARBOUR = "South Light - Ostrel Landing", "Harbour Office - Cape Light"


@pytest.fixture(scope="module")
def plan() -> StudyPlan:
    study = load_study(STUDY)
    return plan_study(dataclasses.replace(study, links=tuple(one for one in study.links if one.name in (SEA, HARBOUR))))


@pytest.fixture(scope="module")
def pages(plan: StudyPlan) -> dict[str, str]:
    return {name: words_of(html) for name, html in render_pages(plan).items()}


def words_of(html: str) -> str:
    body = re.sub(r"<(script|style|svg).*?</\1>", " ", html, flags=re.DOTALL)
    return " ".join(unescape(re.sub(r"<[^>]+>", " ", body)).split())


def result(plan: StudyPlan, name: str) -> LinkResult:
    return next(link.result for link in plan.links if link.result.name == name)


def terminal(plan: StudyPlan, name: str) -> str:
    link = next(link for link in plan.links if link.result.name == name)
    lines = link_lines(link, ink=Ink(colours=False))
    assert max(map(len, lines)) <= 80
    return " ".join(" ".join(lines).split())


def test_all_views_tell_the_same_verdict_and_availability(plan: StudyPlan, pages: dict[str, str]) -> None:
    why = radio_words.verdict_why(result(plan, SEA))
    assert "99.99 % wanted, which 3 dB more margin would reach" in why
    assert why.endswith("dB, 27 dB wanted")
    page = pages["link-01-south-light-ostrel-landing.html"]
    for told in (terminal(plan, SEA), page):
        assert why in told
        assert "99.99 % of the year in each direction: not met" in told
        assert "2.09 hours out, mostly by multipath" in told
        assert "multipath P.530-17 detailed" in told
    rows = {row.result.name: row for row in overview_view(plan).rows}
    assert (rows[SEA].signal.text, rows[SEA].availability.text) == ("marginal", "99.976 %")
    assert (rows[HARBOUR].signal.text, rows[HARBOUR].availability.text) == ("through an obstruction", "–")
    for row in (rows[SEA], rows[HARBOUR]):
        cells = (row.signal, row.distance, row.spare, row.confidence, row.levels, row.margin, row.availability)
        assert " ".join(cell.text for cell in cells) in pages["index.html"]


def test_the_budget_on_the_page_closes(plan: StudyPlan) -> None:
    html = render_pages(plan)["link-01-south-light-ostrel-landing.html"]
    table = html[html.index("<h3>Level</h3>") :].split("</table>")[0]
    rows = re.findall(r"<tr[^>]*><th[^>]*>(.*?)</th><td class=\"num\">(.*?)</td><td class=\"num\">(.*?)</td>", table)
    numbers = [[float(cell.split()[0].replace("−", "-")) for cell in row[1:]] for row in rows]
    level = next(index for index, row in enumerate(rows) if "Received level" in row[0])
    for column, ends in ((0, "at_b"), (1, "at_a")):
        shown = sum(row[column] for row in numbers[:level])
        assert shown == pytest.approx(numbers[level][column], abs=0.05 * level + 0.1)  # a level goes down
        assert 0.0 <= getattr(result(plan, SEA).received_dbm, ends) - numbers[level][column] < 0.1
        # Level less what it needs is the margin, as printed.
        assert numbers[level][column] - numbers[level + 1][column] == pytest.approx(numbers[level + 2][column])


def test_modulations_stand_in_both_views(plan: StudyPlan, pages: dict[str, str]) -> None:
    for told in (terminal(plan, SEA), pages["link-01-south-light-ostrel-landing.html"]):
        for row in ("QPSK", "16-QAM", "64-QAM", "256-QAM"):
            assert row in told
    assert "Modulations, B to A" in pages["link-01-south-light-ostrel-landing.html"]
    assert "Modulations, both ways" in pages["link-02-harbour-office-cape-light.html"]


def test_a_breach_is_told_everywhere_and_once_for_ends_alike(plan: StudyPlan, pages: dict[str, str]) -> None:
    words = "the 23 dBm set are 15.7 dB over it; confirm with your regulator."
    assert terminal(plan, HARBOUR).count(words) == 2  # the rule, and the caution
    assert pages["link-02-harbour-office-cape-light.html"].count(words) == 2
    assert [text for text in result(plan, HARBOUR).cautions if text.startswith("Power at both ends: Limit by row")]


def test_a_missing_rule_and_missing_figures_name_their_keys(plan: StudyPlan, pages: dict[str, str]) -> None:
    assert radio_words.NO_RULE in pages["link-01-south-light-ostrel-landing.html"]
    assert radio_words.NO_RULE in terminal(plan, SEA)


def test_without_maps_the_key_of_the_rain_rate_is_named(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("fellspan.climate.assembling.maps_available", lambda: False)
    study = load_study(STUDY)
    links = tuple(one for one in study.links if one.name == HARBOUR)
    bare = plan_study(dataclasses.replace(study, links=links, climate=GivenClimate()))
    page = words_of(render_pages(bare)["link-01-harbour-office-cape-light.html"])
    for told in (terminal(bare, HARBOUR), page):
        assert "set climate.rain_rate (usual: 20 mm/h in dry plains" in told
    assert "Available not computed: the notes say which figure is missing" in page


def test_distances_and_their_limits_are_told(pages: dict[str, str], plan: StudyPlan) -> None:
    page = pages["link-02-harbour-office-cape-light.html"]
    pair = result(plan, HARBOUR).exposure
    assert pair is not None
    assert pair.a is not None
    assert pair.a.sentence in page
    assert pair.a.sentence in terminal(plan, HARBOUR)
    assert "Near field of a dish: unconfirmed" in page
    assert "10 W/m² over 30 minutes, ICNIRP 2020" in page


def test_workings_carry_formula_inputs_source_and_range(pages: dict[str, str], plan: StudyPlan) -> None:
    page = pages["link-01-south-light-ostrel-landing.html"]
    signal = result(plan, SEA).signal
    assert signal is not None
    keys = {one.key for direction in (signal.a_to_b, signal.b_to_a) for one in direction.workings}
    assert f"{len(keys)} figures of the signal" in page
    assert "A to B: South Light to Ostrel Landing ; B to A: Ostrel Landing to South Light ." in page
    for direction in (signal.a_to_b, signal.b_to_a):
        for one in direction.workings:
            assert value_words(one.value, one.unit) in page
            assert one.formula in page
            for given in one.inputs:
                assert f"{given.label} {value_words(given.value, given.unit)}" in page
    assert "20 log(4 pi d f / c)" in page
    assert page.count("Rec. ITU-R P.525-5") == 1  # a source is told once, its rows carry its number
    assert "Valid for" in page


def test_the_sheet_for_the_regulator_is_linked_only_where_there_is_one(plan: StudyPlan, pages: dict[str, str]) -> None:
    assert "coordination.csv" in pages["index.html"]
    bare = Antenna()
    links = tuple(
        dataclasses.replace(one, antenna_a=bare, antenna_b=bare) for one in plan.study.links if one.name == HARBOUR
    )
    unknown = plan_study(dataclasses.replace(plan.study, links=links))
    assert coordination_csv(unknown) is None
    assert "coordination.csv" not in render_pages(unknown)["index.html"]


def test_links_csv_holds_the_radio_side(plan: StudyPlan) -> None:
    rows = {row["name"]: row for row in csv.DictReader(io.StringIO(links_csv(plan)))}
    sea, harbour = rows[SEA], rows[HARBOUR]
    assert (sea["modulation"], sea["target_met"], sea["dominant_cause"]) == ("64-QAM", "no", "multipath")
    assert float(sea["availability_year_percent"]) == pytest.approx(
        result(plan, SEA).availability_percent.year, abs=1e-6
    )
    assert (sea["power_rule"], harbour["power_rule"]) == ("", "fcc-15.247-5g8")
    assert float(harbour["power_breach_a_db"]) == pytest.approx(15.7, abs=0.1)
    assert float(harbour["keep_away_front_a_m"]) > 0.0


def test_each_direction_of_a_pair_has_its_own_frequency_in_the_sheet(plan: StudyPlan) -> None:
    rows = [row for row in csv.DictReader(io.StringIO(coordination_csv(plan) or "")) if row["link"] == SEA]
    assert [(row["direction"], float(row["frequency_hz"])) for row in rows] == [
        ("A to B", 10.755e9),
        ("B to A", 11.245e9),
    ]


@pytest.mark.parametrize(
    ("verdict", "target", "reason", "words"),
    [
        ("meets", None, "", "the margin wanted is there"),
        ("meets", 99.9, "", "margin and availability wanted are there"),
        ("marginal", None, "trees stand in the required zone", "trees stand in the required zone"),
        ("below", 99.9, "4 dB of the margin wanted are missing", "4 dB of the margin wanted are missing"),
        ("below", None, "", "see the reasons and cautions"),
    ],
)
def test_every_signal_verdict_says_what_stands_behind_it(
    plan: StudyPlan, verdict: str, target: float | None, reason: str, words: str
) -> None:
    whole = result(plan, SEA)
    assert whole.signal is not None
    signal = dataclasses.replace(whole.signal, target_availability_percent=target, verdict_reason=reason)
    changed = dataclasses.replace(whole, signal_verdict=verdict, signal=signal)
    assert radio_words.verdict_why(changed) == words
