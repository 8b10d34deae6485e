"""The trade-off chart: readable XML, every pair in words, no coordinates out of hand, hostile names kept as text."""

import xml.etree.ElementTree as ET
from dataclasses import replace

import pytest
from made_profiles import link_of, obstacle, profile_of

from fellspan.design.heights import design_heights
from fellspan.design.heights_result import HeightSettings, HeightsResult, Limits
from fellspan.links.assess import AssessSettings, assess_profile
from fellspan.report.heights_drawing import draw_heights, heights_words, shows_what_works


def heights(top_m: float = 30.0, **limits: float) -> HeightsResult:
    profile = profile_of(8e3, 0.0, n=401, obstacles=(obstacle("mill", 3_000.0, 3_020.0, top_m),), sigma_m=1.0)
    link = link_of(profile, 20.0, 20.0)
    limit = Limits(**limits)
    settings = HeightSettings(limits_a=limit, limits_b=limit)
    return design_heights(link, assess_profile(link, profile, AssessSettings()), AssessSettings(), heights=settings)[0]


@pytest.mark.parametrize("found", [heights(), heights(300.0), heights(high_m=5.0), heights(0.5)])
def test_the_chart_is_xml_that_says_in_words_what_it_shows(found: HeightsResult) -> None:
    drawn = ET.fromstring(draw_heights(found, uid="h", names=('<A & "B">', "East")))
    assert drawn.findtext("{*}desc") == heights_words(found)
    assert "&" in "".join(drawn.itertext())
    assert len(ET.tostring(drawn)) < 20_000
    circles = drawn.findall(".//{*}circle")
    assert len(circles) >= 1
    for circle in circles:
        assert 0.0 <= float(circle.get("cx", "")) <= 520.0
        assert 0.0 <= float(circle.get("cy", "")) <= 420.0


def test_every_pair_to_build_stands_right_of_and_above_the_exact_edge() -> None:
    found = heights()
    for option in found.options:
        assert option.build is not None
        assert option.raw is not None
        at = [b for a, b in found.boundary if a <= option.build.a_m]
        assert option.build.b_m >= min(at) - 1e-6 if len(at) == len(found.boundary) else True
    confident = found.boundary_confident
    assert [a for a, _ in confident] == sorted(a for a, _ in confident)
    assert [b for _, b in confident] == sorted((b for _, b in confident), reverse=True)


def with_pairs(planned: tuple[float, float], *pairs: tuple[float, float]) -> HeightsResult:
    """A result of which the pairs to build are these, in the order of its options."""
    found = heights()
    assert len(found.options) == len(pairs)
    options = tuple(
        replace(option, build=replace(found.planned, a_m=a, b_m=b))
        for option, (a, b) in zip(found.options, pairs, strict=True)
    )
    return replace(found, planned=replace(found.planned, a_m=planned[0], b_m=planned[1]), options=options)


CROWDED = with_pairs((5, 10), (4, 10), (5, 6), (6, 6), (4, 9), (8, 1))
CLOSE = with_pairs((8, 8), (16, 8), (8, 18), (13, 13), (13, 13), (15, 9))


@pytest.mark.parametrize("found", [heights(), heights(22.0), CROWDED, CLOSE])
def test_words_beside_the_marks_meet_neither_each_other_nor_other_marks(found: HeightsResult) -> None:
    drawn = ET.fromstring(draw_heights(found, uid="h", names=("West", "East")))
    boxes = []
    for text in drawn.findall(".//{*}text[@class='note']"):
        x, y, width = float(text.get("x", "")), float(text.get("y", "")), 5.5 * len(text.text or "")
        left = x - width if text.get("text-anchor") == "end" else x
        boxes.append((left, y - 9.0, left + width, y + 2.0))
        assert left >= 54.0 - 1.0
        assert left + width <= 504.0 + 1.0
    marks = [(float(one.get("cx", "")), float(one.get("cy", ""))) for one in drawn.findall(".//{*}circle")]
    assert len(boxes) == len(marks) >= 2
    for index, box in enumerate(boxes):
        assert not any(box[0] < x < box[2] and box[1] < y < box[3] for x, y in marks)
        assert not any(
            box[0] < other[2] and other[0] < box[2] and box[1] < other[3] and other[1] < box[3]
            for other in boxes[index + 1 :]
        )


def test_a_sheet_on_which_nothing_works_is_told_from_one_with_shade() -> None:
    assert shows_what_works(CROWDED)
    assert not shows_what_works(replace(with_pairs((5, 15), *[(346, 356)] * 5), planned_holds=False))
