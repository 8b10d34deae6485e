"""The survey list: each stated top leaves the criteria exactly met, and what nobody measured comes first."""

import dataclasses
import math

import numpy as np
import pytest
from made_profiles import link_of, obstacle, profile_of

from fellspan.design.survey_list import MEASURED_WORDS, SurveyPoint, survey_list
from fellspan.links.assess import AssessSettings, assess_profile
from fellspan.links.criteria import Criterion
from fellspan.links.site import Link
from fellspan.terrain.profile import BesidePath, PathProfile

RULES = AssessSettings(
    criteria=(
        Criterion(name="ordinary", k=4.0 / 3.0, fraction=1.0, source="made"),
        Criterion(name="worst", k=0.7, fraction=0.3, source="made"),
    )
)


def hilly(seed: int, **changes: object) -> PathProfile:
    rng = np.random.default_rng(seed)
    walk = np.cumsum(rng.normal(0.0, 0.6, 401))
    return profile_of(
        15e3, lambda d: np.interp(d, np.linspace(0.0, 15e3, 401), walk - walk.min()), n=401, sigma_m=1.0, **changes
    )  # type: ignore[arg-type]


def listed(link: Link, profile: PathProfile) -> tuple[SurveyPoint, ...]:
    assessment = assess_profile(link, profile, RULES)
    return survey_list(assessment.result, assessment.profile, assessment.levels)


def short_of(link: Link, profile: PathProfile, at_m: float, top_m: float) -> float:
    """Greatest shortfall within a step of a place where the ground was raised to a top, m."""
    ground = profile.ground_m.copy()
    index = int(np.argmin(np.abs(profile.distance_m - at_m)))
    ground[index] = top_m
    raised = dataclasses.replace(profile, ground_m=ground, surface_m=ground + profile.cover_m)
    levels = assess_profile(link, raised, RULES).levels
    return float((levels.need_m - levels.available_m)[:, index].max())


@pytest.mark.parametrize("seed", range(8))
def test_raising_a_point_to_its_stated_top_meets_the_criterion_exactly(seed: int) -> None:
    profile = hilly(seed)
    link = link_of(profile, 40.0, 40.0)
    points = [point for point in listed(link, profile) if point.highest_top_m is not None]
    assert points
    for point in points:
        assert point.highest_top_m is not None
        assert short_of(link, profile, point.from_a_m, point.highest_top_m) == pytest.approx(0.0, abs=1e-6)
        assert short_of(link, profile, point.from_a_m, point.highest_top_m + 0.01) == pytest.approx(0.01, abs=1e-6)


def test_a_clear_link_stays_met_with_a_point_raised_to_its_top_and_fails_above() -> None:
    profile = hilly(3)
    link = link_of(profile, 70.0, 70.0)
    assert all(item.met for item in assess_profile(link, profile, RULES).result.clearance)
    for point in listed(link, profile):
        if point.highest_top_m is None:
            continue
        for more, met in ((0.0, True), (0.01, False)):
            ground = profile.ground_m.copy()
            ground[int(np.argmin(np.abs(profile.distance_m - point.from_a_m)))] = point.highest_top_m + more
            raised = dataclasses.replace(profile, ground_m=ground, surface_m=ground + profile.cover_m)
            assert all(item.met for item in assess_profile(link, raised, RULES).result.clearance) == met


def test_what_was_surveyed_comes_after_what_was_not_and_the_sites_last() -> None:
    profile = hilly(4, obstacles=(obstacle("barn", 7_000.0, 7_030.0, 60.0),))
    measured = np.where(np.abs(profile.distance_m - 7_015.0) < 40.0, 2, 0).astype(np.int8)
    profile = dataclasses.replace(profile, measured=measured)
    points = listed(link_of(profile, 30.0, 30.0), profile)
    words = [point.measured for point in points[:-2]]
    assert MEASURED_WORDS[2] in words
    assert words == sorted(words, key=lambda word: word == MEASURED_WORDS[2])
    assert [point.stands_there for point in points[-2:]] == ["site Alder", "site Birch"]
    assert [point.rank for point in points] == list(range(1, len(points) + 1))


def test_a_bare_path_lists_where_something_unlisted_would_reach_the_zone() -> None:
    profile = profile_of(10e3, 0.0, n=401, sigma_m=1.0)
    points = listed(link_of(profile, 35.0, 35.0), profile)
    unlisted = [point for point in points if "nothing that the data lack" in point.verify]
    assert 3 <= len(unlisted) <= 8
    away = np.diff(sorted(point.from_a_m for point in unlisted))
    assert away.min() >= 400.0 - 26.0  # a twentieth of the path apart, but for a point joined with one a step away
    high = listed(link_of(profile, 90.0, 90.0), profile)
    assert not [point for point in high if "nothing that the data lack" in point.verify and point.spare_m > 25.0]


def test_no_walk_is_asked_for_where_the_data_stand_far_too_high_already() -> None:
    # A ridge of 60 m cuts a ray at 35 m: whatever else stood on it would change nothing.
    profile = profile_of(10e3, lambda d: np.where(np.abs(d - 5e3) < 1.5e3, 60.0, 0.0), n=401, sigma_m=1.0)
    points = listed(link_of(profile, 35.0, 35.0), profile)
    unlisted = [point for point in points if "nothing that the data lack" in point.verify]
    assert all(point.spare_m is not None and point.spare_m > -3.0 for point in unlisted)
    assert any(
        "governing point" in point.verify and point.spare_m is not None and point.spare_m < -20.0 for point in points
    )
    assert unlisted


@pytest.mark.parametrize(
    ("offset_m", "top_m", "is_listed"),
    [(4.0, 70.0, True), (4.0, float("nan"), True), (4.0, 40.0, False), (12.0, 70.0, False)],
)
def test_what_stands_beside_the_path_in_the_required_zone_is_listed(
    offset_m: float, top_m: float, is_listed: bool
) -> None:
    crane = BesidePath(
        name="Crane 2", kind="other", at_m=5000.0, offset_m=offset_m, top_amsl_m=top_m, source="made.csv"
    )
    profile = profile_of(10e3, 0.0, n=401, sigma_m=1.0, beside=(crane,))
    link = link_of(profile, 60.0, 60.0)
    points = listed(link, profile)
    assert [point.rank for point in points] == list(range(1, len(points) + 1))
    found = [point for point in points if "Crane 2" in point.verify]
    assert len(found) == is_listed
    if not is_listed:
        return
    (point,) = found
    assert point.verify == "place and height of Crane 2, 4.0 m beside the path"
    assert (point.from_a_m, point.longitude_deg) == (5000.0, pytest.approx(profile.longitude_deg[200]))
    assert (point.spare_m is None) is math.isnan(top_m)
    assert ("its top not known" in point.stands_there) is math.isnan(top_m)
    # F1 11.18 m at mid-path, bulge 1.47 m at k 4/3 (hand calculation)
    assert point.highest_top_m == pytest.approx(60.0 - 1.47 - np.sqrt(11.18**2 - 16.0), abs=0.02)
    for more, doubted in ((-0.01, False), (0.01, True)):
        raised = dataclasses.replace(crane, top_amsl_m=point.highest_top_m + more)
        result = assess_profile(link, dataclasses.replace(profile, beside=(raised,)), RULES).result
        assert any("Crane 2" in text and "required part" in text for text in result.cautions) is doubted
