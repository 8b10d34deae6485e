"""Draws counted quickly against the draws themselves, and the numbers that both begin with."""

import math
from dataclasses import replace

import numpy as np
import pytest
from made_profiles import link_of, profile_of
from numpy.typing import NDArray

import fellspan.design.answers as answers
from fellspan.design.answers import answers_of, confidence_of_case, ground_of, lines_of
from fellspan.design.case import Case
from fellspan.design.draws import DRAWS, MOST_POINTS, SEED, draw, parts_of
from fellspan.design.error_model import GRADIENT_UNIT, default_error_model
from fellspan.design.heights_result import HeightSettings
from fellspan.design.normals import Normals, normals
from fellspan.links.assess import AssessSettings, assess_profile
from fellspan.links.site import Link

HEIGHTS = HeightSettings()


def test_numbers_asked_for_in_pieces_are_the_stream_of_the_seed() -> None:
    made = Normals(7, kept=3000)
    pieces = [made.first(count).copy() for count in (1, 11, 2000, 1999, 3000)]
    rng = np.random.default_rng(7)
    whole = np.concatenate([rng.standard_normal(shape, dtype=np.float32).ravel() for shape in ((4, 500), 999, 1)])
    for piece in pieces:
        np.testing.assert_array_equal(piece, whole[: piece.size])
    beyond = made.first(4000)
    np.testing.assert_array_equal(beyond[:3000], whole)
    with pytest.raises(ValueError):
        made.first(10)[0] = 1.0


def kinds() -> list[tuple[str, Case]]:
    """Paths with and without trees, roofs, exact ground, and samples to thin."""
    rng = np.random.default_rng(3)
    rough = np.cumsum(rng.normal(0.0, 0.5, 300))
    trees = np.where(rng.random(300) < 0.3, rng.uniform(3.0, 9.0, 300), 0.0)
    bare = profile_of(5e3, lambda d: rough, n=300, sigma_m=1.2, cell_m=30.0)
    wooded = profile_of(5e3, lambda d: rough, n=300, cover=lambda d: trees, cell_m=10.0)
    wooded = replace(wooded, sigma_m=np.where(trees > 0.0, 2.0, 1.0))
    fine = profile_of(4e3, 20.0, n=2001, sigma_m=1.0)
    exact = profile_of(5e3, lambda d: rough, n=300, sigma_m=0.0)
    found = []
    for name, profile in (("bare", bare), ("wooded", wooded), ("fine", fine), ("exact", exact)):
        found.append((name, laid(link_of(profile, 30.0, 30.0), profile)))
    link = link_of(wooded, 30.0, 30.0)
    roof = replace(link, a=replace(link.a, height_m=4.0, height_reference="roof", roof_m=12.0, roof_edge_m=12.0))
    return [*found, ("roof edge", laid(roof, wooded))]


def laid(link: Link, profile: object) -> Case:
    """Antennas just so high that about nine draws of ten hold."""
    settings = AssessSettings()
    case = Case.of(link, assess_profile(link, profile, settings), settings)  # type: ignore[arg-type]
    a, b = case.planned
    lines = [(rules, a, b) for rules in case.rules]
    spare = draw(case, default_error_model(case.profile), lines).spare_m(case.rules_at(a, b).most_m, a, b)
    rise = max(-float(np.quantile(spare, 0.08)), 2.5 - min(link.a.height_m, link.b.height_m))
    higher = replace(
        link,
        a=replace(link.a, height_m=link.a.height_m + rise),
        b=replace(link.b, height_m=link.b.height_m + rise),
    )
    return Case.of(higher, assess_profile(higher, profile, settings), settings)  # type: ignore[arg-type]


@pytest.mark.parametrize(("name", "case"), kinds(), ids=lambda value: value if isinstance(value, str) else "")
def test_counted_quickly_they_are_the_draws_of_planning(name: str, case: Case) -> None:
    a, b = case.planned
    model = default_error_model(case.profile)
    lines = lines_of(case, answers_of(case, ground_of(case, HEIGHTS), HEIGHTS))
    parts = parts_of(case, model, lines)
    draws = draw(case, model, lines)
    if name == "fine":
        assert parts.points.size <= MOST_POINTS + 2
        assert parts.shift_m.any()
    if name == "wooded":
        assert all(some.size for some, _, _ in parts.fields)
    share = draws.holds(case.rules_at(a, b).most_m, a, b)
    assert 0.5 < share <= 1.0
    if name != "exact":
        assert share < 1.0
    assert abs(confidence_of_case(case) - share) <= 2.0 / DRAWS


def test_draws_are_what_they_were_before_their_numbers_were_kept() -> None:
    case = dict(kinds())["wooded"]
    model = default_error_model(case.profile)
    lines = [(rules, *case.planned) for rules in case.rules]
    parts, rng, half = parts_of(case, model, lines), np.random.default_rng(SEED), DRAWS // 2
    distance = case.profile.distance_m[parts.points]

    def carried(at: NDArray[np.float64], reach_m: float) -> NDArray[np.float64]:
        fresh = rng.standard_normal((at.size, half), dtype=np.float32).astype(np.float64)
        for i in range(1, at.size):
            keep = math.exp(-(at[i] - at[i - 1]) / reach_m)
            fresh[i] = keep * fresh[i - 1] + math.sqrt(1.0 - keep**2) * fresh[i]
        return fresh

    ground = carried(distance, model.ground_reach_m)
    error = ground * parts.ground_m[:, np.newaxis]
    for some, sizes, reach in parts.fields:
        error[some] += carried(distance[some], reach) * sizes[some, np.newaxis]
    along = rng.standard_normal(half, dtype=np.float32) * model.position_error_m
    bent = rng.standard_normal(half, dtype=np.float32) * model.gradient_error * GRADIENT_UNIT
    error += parts.common @ np.stack((ground[0], ground[-1], along, bent))
    np.testing.assert_allclose(draw(case, model, lines).error_m, np.hstack((error, -error)), atol=2e-5)


def test_where_a_few_draws_would_decide_planning_makes_them(monkeypatch: pytest.MonkeyPatch) -> None:
    case = dict(kinds())["bare"]
    share = confidence_of_case(case)
    made: list[Case] = []

    def counted(*args: object, **options: object) -> object:
        made.append(args[0])  # type: ignore[arg-type]
        return draw(*args, **options)  # type: ignore[arg-type]

    monkeypatch.setattr(answers, "draw", counted)
    confidence_of_case(case)
    assert not made
    near = replace(case, settings=AssessSettings(confidence=share + 1e-4))
    assert confidence_of_case(near) == pytest.approx(share, abs=2e-4)
    assert len(made) == 1


def test_numbers_are_made_once() -> None:
    one, two = normals(SEED, 10), normals(SEED, 20)
    assert np.shares_memory(one, two)
