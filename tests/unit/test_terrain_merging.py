"""Merging of samples, survey and obstacles, against slow plain rules, on many made-up cases."""

from itertools import pairwise

import numpy as np
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.position import Position
from fellspan.terrain.cover import CoverLayer, combine
from fellspan.terrain.obstacle_tops import stand
from fellspan.terrain.obstacles import Obstacle, ObstacleIndex
from fellspan.terrain.samples import merged
from fellspan.terrain.survey import SurveyFile, SurveyRow
from fellspan.terrain.survey_index import SurveyIndex
from fellspan.vocabulary import COVER_KINDS

PATH = GeodesicPath.towards(Position(latitude_deg=36.05, longitude_deg=-45.2), 60.0, 1000.0)
LONGEST_M = 60.0
DISTANCES = np.arange(0.0, 1000.1, 2.5)

distances = st.lists(st.floats(-50.0, 1050.0), max_size=30)
quick = settings(max_examples=60, deadline=None, derandomize=True)


@given(exact=distances, beside=distances, regular=distances)
@quick
def test_merged_distances_rise_hold_the_ends_and_lose_nothing(
    exact: list[float], beside: list[float], regular: list[float]
) -> None:
    found = merged(np.array(exact), np.array(beside), np.array(regular), 1000.0)
    assert found[0] == 0.0
    assert found[-1] == 1000.0
    assert (np.diff(found) > 4.9e-4).all()
    for wanted in (*exact, *beside, *regular):
        if 0.0 <= wanted <= 1000.0:
            # Chains of crowding values thin out to their first: within a millimetre there is always one.
            assert np.abs(found - wanted).min() <= 1e-3 + 5e-4 * len(exact + beside + regular)
    again = merged(found, np.array(beside), np.array(regular), 1000.0)
    assert np.array_equal(again, found)


def row(
    number: int, at_m: float, ground: float | None, top: float | None, radius: float | None, profile: str
) -> SurveyRow:
    return SurveyRow(
        where=f"row {number}", file="f", latitude_deg=None, longitude_deg=None, link="L", distance_m=at_m,
        ground_m=ground, top_m=top, cover_m=None, kind="none", note="", profile=profile, radius_m=radius, source="",
        error_m=0.1,
    )  # fmt: skip


heights = st.one_of(st.none(), st.floats(0.0, 500.0))
points = st.lists(st.tuples(st.floats(0.0, 1000.0), st.floats(0.0, 500.0), heights, st.floats(0.0, 80.0)), max_size=8)
walks = st.lists(st.tuples(st.integers(0, 400), st.floats(0.0, 500.0), heights), max_size=8, unique_by=lambda p: p[0])


@given(points=points, walk=walks)
@quick
def test_survey_against_a_plain_rule(
    points: list[tuple[float, float, float | None, float]], walk: list[tuple[int, float, float | None]]
) -> None:
    rows = [row(i, s, g, t, r, "") for i, (s, g, t, r) in enumerate(points)]
    walked = [(2.5 * s, g, t) for s, g, t in sorted(walk)]
    rows += [row(100 + i, s, g, t, 1.0, "P") for i, (s, g, t) in enumerate(walked)]
    index = SurveyIndex([SurveyFile(name="f", rows=tuple(rows))], radius_m=5.0)
    hits = index.on_path(PATH, "l", longest_m=LONGEST_M)
    found, chords = hits.measured(DISTANCES), hits.chords(DISTANCES)
    for i, s in enumerate(DISTANCES):
        ground = top = None
        wide: list[float] = []
        for (s0, g0, t0), (s1, g1, t1) in pairwise(walked):
            if s1 - s0 > LONGEST_M:
                if s0 - 1e-3 <= s <= s1 + 1e-3:
                    wide.append(g0 + (g1 - g0) * min(max((s - s0) / (s1 - s0), 0.0), 1.0))
            elif s0 - 1e-3 <= s <= s1 + 1e-3:
                share = min(max((s - s0) / (s1 - s0), 0.0), 1.0)
                ground = g0 + (g1 - g0) * share
                if t0 is not None and t1 is not None:
                    top = t0 + (t1 - t0) * share
        single = [(s_, g, t, r) for s_, g, t, r in points]
        for j, (s_, g, t) in enumerate(walked):
            beside = [walked[k] for k in (j - 1, j + 1) if 0 <= k < len(walked) and abs(walked[k][0] - s_) <= LONGEST_M]
            if not beside:
                single.append((s_, g, t, 1.0))
            elif t is not None and not any(other[2] is not None for other in beside):
                single.append((s_, None, t, 1.0))
        wide += [g for s_, g, _, r in single if r > LONGEST_M and abs(s - s_) <= r + 1e-3]
        single = [(s_, g, t, min(r, LONGEST_M)) for s_, g, t, r in single]
        assert np.isnan(chords.ground_m[i]) == (not wide)
        if wide:
            assert abs(chords.ground_m[i] - max(wide)) < 1e-6
        reach = [(abs(s - s_), g, t) for s_, g, t, r in single if abs(s - s_) <= r + 1e-3]
        with_ground = [(d, g) for d, g, _ in reach if g is not None]
        with_top = [(d, t) for d, _, t in reach if t is not None]
        if with_ground:
            ground = min(with_ground, key=lambda item: item[0])[1]
        if with_top:
            top = min(with_top, key=lambda item: item[0])[1]
        assert (None if np.isnan(found.ground_m[i]) else True) == (None if ground is None else True)
        if ground is not None:
            assert abs(found.ground_m[i] - ground) < 1e-6
        assert np.isnan(found.top_m[i]) == (top is None)
        if top is not None:
            assert abs(found.top_m[i] - top) < 1e-6
        assert (found.file[i] >= 0) == (ground is not None or top is not None)


discs = st.lists(
    st.tuples(st.floats(0.0, 1000.0), st.floats(0.05, 60.0), st.floats(1.0, 50.0), st.booleans()), max_size=6
)


@given(discs=discs)
@quick
def test_level_and_absolute_tops_against_a_plain_rule(discs: list[tuple[float, float, float, bool]]) -> None:
    """Ground rises 0.1 m a metre: a disc stands level on its far edge, or at its height above the sea."""
    obstacles = []
    for s, radius, height, sea in discs:
        latitude, longitude = PATH.positions(s)
        given_height = {"top_amsl_m": height} if sea else {"height_m": height}
        obstacles.append(
            Obstacle(
                name="d",
                kind="other",
                shape=shapely.Point(float(longitude), float(latitude)),
                source="test",
                rule="sea" if sea else "level",
                radius_m=radius,
                **given_height,
            )
        )
    standing = stand(
        ObstacleIndex(obstacles).crossings(PATH),
        ground_along=lambda s: 0.1 * s,
        ground_at_supports=lambda crossing, spans: np.zeros((spans.size, 2)),
        step_m=5.0,
        growth_years=0.0,
    )
    assert len(standing) == len(discs)
    wanted = sorted(
        (round(max(s - r, 0.0), 4), round(h if sea else 0.1 * min(s + r, 1000.0) + h, 4)) for s, r, h, sea in discs
    )
    found = sorted((round(one.shown.from_m, 4), round(one.shown.top_amsl_m, 4)) for one in standing)
    assert np.allclose(np.array(found).reshape(-1, 2), np.array(wanted).reshape(-1, 2), atol=2e-3)


values = st.lists(st.one_of(st.just(float("nan")), st.floats(-5.0, 40.0)), min_size=6, max_size=6)


@given(trees=values, roofs=values, surface=values, use_surface=st.booleans())
@quick
def test_cover_is_the_highest_of_what_is_known(
    trees: list[float], roofs: list[float], surface: list[float], use_surface: bool
) -> None:
    ground = np.full(6, 10.0)
    layers = [
        CoverLayer(kind="tree", value_m=np.array(trees), sigma_m=np.full(6, 1.0)),
        CoverLayer(kind="building", value_m=np.array(roofs), sigma_m=np.full(6, 2.0)),
    ]
    top = np.array(surface) + 10.0 if use_surface else None
    cover = combine(ground, layers, top, np.full(6, 0.5) if use_surface else None)
    for i in range(6):
        known = [v for v in (trees[i], roofs[i], surface[i] if use_surface else float("nan")) if not np.isnan(v)]
        assert cover.height_m[i] == max([0.0, *known]) or abs(cover.height_m[i] - max([0.0, *known])) < 1e-9
        assert (cover.kind[i] == COVER_KINDS.index("none")) == (cover.height_m[i] == 0.0)
        all_kinds = not (np.isnan(trees[i]) or np.isnan(roofs[i]))
        assert cover.known[i] == (all_kinds or (use_surface and not np.isnan(surface[i])))
        assert cover.valued[i] == cover.known[i]
    # Trees alone tell nothing of buildings, unless a file is declared to hold them all.
    alone = combine(ground, layers[:1], top, np.full(6, 0.5) if use_surface else None)
    with_all = combine(ground, layers[:1], top, np.full(6, 0.5) if use_surface else None, complete=("building",))
    seen = np.isfinite(np.array(surface)) & use_surface
    assert np.array_equal(alone.known, seen)
    assert np.array_equal(with_all.known, seen | np.isfinite(np.array(trees)))
    assert np.array_equal(alone.valued, with_all.known)
