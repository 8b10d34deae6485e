"""Each link of the sample tells its story, planned by the engine: what a reader of the report is promised."""

import dataclasses
from pathlib import Path

import pytest

import fellspan
from fellspan.links.result import LinkResult

STUDY = Path(__file__).resolve().parents[2] / "sample_terrain" / "tolmera.toml"


@pytest.fixture(scope="module")
def plan() -> fellspan.StudyPlan:
    return fellspan.plan_study(fellspan.load_study(STUDY))


@pytest.fixture(scope="module")
def results(plan: fellspan.StudyPlan) -> dict[str, LinkResult]:
    assert not plan.failures
    return {linked.result.name: linked.result for linked in plan.links}


def test_the_study_has_all_verdicts_and_no_caution_of_its_own(
    plan: fellspan.StudyPlan, results: dict[str, LinkResult]
) -> None:
    assert len(results) == 10
    assert {result.verdict for result in results.values()} == {"clear", "marginal", "obstructed"}
    assert {result.signal_verdict for result in results.values()} == {"meets", "marginal", "below"}
    assert plan.cautions == ()


def test_roof_to_roof_a_growing_tree_reaches_into_the_zone(results: dict[str, LinkResult]) -> None:
    result = results["Town Hall - School"]
    assert result.verdict == "marginal"
    governing = result.clearance[result.governing]
    assert governing.cause == "lime tree on School Walk"
    assert governing.extra_height_m.both is not None
    assert 0.5 < governing.extra_height_m.both < 2.0
    assert {item.what for item in result.ignored} == {"town hall", "school"}


def test_without_growth_the_same_tree_stays_out_of_it() -> None:
    study = dataclasses.replace(fellspan.load_study(STUDY), growth_years=0.0)
    plan = fellspan.plan_study(dataclasses.replace(study, links=study.links[:1]))
    assert all(criterion.met for criterion in plan.links[0].result.clearance)


def test_the_ridge_wants_some_ten_metres(results: dict[str, LinkResult]) -> None:
    result = results["Harbour Office - Southdown Farm"]
    assert result.verdict == "obstructed"
    extra = [criterion.extra_height_m.both or 0.0 for criterion in result.clearance]
    assert 6.0 < max(extra) < 12.0
    assert result.clearance[result.governing].cause.startswith("ground at")


def test_over_the_sea_the_bulge_of_the_worst_month_decides(results: dict[str, LinkResult]) -> None:
    result = results["South Light - Ostrel Landing"]
    assert 25_000.0 < result.distance_m < 40_000.0
    assert result.verdict == "marginal"
    ordinary, worst_month = result.clearance
    assert ordinary.met
    assert not worst_month.met
    assert worst_month.k is not None
    assert worst_month.k < 1.0
    assert result.governing == 1
    assert worst_month.cause == "Earth bulge over the sea"


def test_the_street_link_is_short_high_in_frequency_and_clear(results: dict[str, LinkResult]) -> None:
    result = results["East Terrace - West Terrace"]
    assert result.frequency_hz == 60e9
    assert result.distance_m < 300.0
    assert result.verdict == "clear"
    assert result.clearance[result.governing].cause == "Main Street traffic"


def test_no_mast_helps_over_the_mountain(results: dict[str, LinkResult]) -> None:
    result = results["Town Hall - North Landing"]
    assert result.verdict == "obstructed"
    assert min(criterion.extra_height_m.both or 0.0 for criterion in result.clearance) > 200.0


def test_the_survey_turns_marginal_into_clear(results: dict[str, LinkResult]) -> None:
    result = results["Beacon - West Point"]
    assert (result.verdict, result.basis) == ("clear", "surveyed")
    study = fellspan.load_study(STUDY)
    link = tuple(link for link in study.links if link.name == result.name)
    terrain = dataclasses.replace(study.terrain, survey=())
    unsurveyed = fellspan.plan_study(dataclasses.replace(study, links=link, terrain=terrain)).links[0].result
    assert (unsurveyed.verdict, unsurveyed.basis) == ("marginal", "surface raster")


def test_from_the_beacon_the_harbour_is_plainly_clear(results: dict[str, LinkResult]) -> None:
    result = results["Beacon - Harbour Office"]
    assert (result.verdict, result.signal_verdict) == ("clear", "meets")
    assert result.confidence > 0.999


def test_ships_cut_the_harbour_mouth(results: dict[str, LinkResult]) -> None:
    result = results["Harbour Office - Cape Light"]
    assert result.verdict == "obstructed"
    governing = result.clearance[result.governing]
    assert {obstruction.cause for obstruction in governing.obstructions} == {"ships in the fairway"}


def test_one_sector_serves_three_links_each_with_its_own_gain(results: dict[str, LinkResult]) -> None:
    served = [results[f"Beacon - {name}"] for name in ("Harbour Office", "School", "Southdown Farm")]
    assert {result.verdict for result in served} == {"clear"}
    assert {result.signal_verdict for result in served} == {"meets"}
    sectors = [result.antennas.a for result in served if result.antennas is not None]
    assert {(sector.name, sector.bearing_deg, sector.tilt_deg) for sector in sectors} == {
        ("beacon sector", 140.0, -3.5)
    }
    harbour, school, farm = (sector.gain_dbi or 0.0 for sector in sectors)
    peak = sectors[0].peak_gain_dbi or 0.0
    assert peak - 1.0 < harbour < peak
    assert peak - 1.0 < school < peak
    assert harbour != school
    assert peak - 8.0 < farm < peak - 4.0


def test_far_off_its_bearing_the_sector_is_doubted(results: dict[str, LinkResult]) -> None:
    told = [text for text in results["Beacon - Southdown Farm"].cautions if "beacon sector" in text]
    assert len(told) == 1
    assert "degrees right of" in told[0]
    assert not [text for text in results["Beacon - School"].cautions if "beacon sector" in text]


def test_dishes_are_aimed_at_the_other_end(results: dict[str, LinkResult]) -> None:
    antennas = results["Harbour Office - Cape Light"].antennas
    assert antennas is not None
    for end in (antennas.a, antennas.b):
        assert end.gain_dbi == pytest.approx(end.peak_gain_dbi)
        assert end.far_field_m is not None
        assert end.far_field_m < results["Harbour Office - Cape Light"].distance_m
