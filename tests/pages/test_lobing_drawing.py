"""The drawing of level against height: its curves, marks and words, for curves made by hand."""

import xml.etree.ElementTree as ElementTree

import pytest

from fellspan.design.reflection_result import HeightRange, Lobing, LobingCurve, NullFreeHeights
from fellspan.report.lobing_drawing import draw_lobing, lobing_words

HEIGHT = tuple(10.0 + 0.1 * index for index in range(101))
LEVEL = tuple(3.0 - 0.5 * (index % 50) for index in range(101))
LOBING = Lobing(
    end="a",
    height_m=HEIGHT,
    planned_m=12.0,
    curves=(
        LobingCurve(name="worst month", k=0.6, level_db=(None,) * 101),
        LobingCurve(name="median", k=4.0 / 3.0, level_db=LEVEL),
        LobingCurve(name="infinite", k=None, level_db=tuple(-60.0 if index == 7 else 0.0 for index in range(101))),
    ),
)
FREE = NullFreeHeights(
    end="a",
    planned_m=12.0,
    change_m=1.5,
    ranges=(HeightRange(from_m=13.5, to_m=15.0), HeightRange(from_m=40.0, to_m=41.0)),
    searched=HeightRange(from_m=8.0, to_m=45.0),
    lowest_m=8.0,
)
SVG = "{http://www.w3.org/2000/svg}"


def test_it_is_valid_and_says_in_words_what_it_shows() -> None:
    root = ElementTree.fromstring(draw_lobing(LOBING, uid="one", heights=FREE, name='Ridge <&> "East"'))
    assert root.get("role") == "img"
    labelled = (root.get("aria-labelledby") or "").split()
    assert {child.get("id") for child in root} >= set(labelled)
    words = root.findtext(f"{SVG}desc") or ""
    assert words == lobing_words(LOBING, FREE)
    assert "−7.0 dB at 12.0 m as planned" in words
    assert "At worst month k 0.60 nothing is mirrored." in words
    assert "least −60.0 dB at 10.7 m" in words
    assert "13.5 to 15.0 m, 40.0 to 41.0 m" in words


def test_a_curve_for_each_k_that_mirrors_and_a_bar_for_heights_shown() -> None:
    root = ElementTree.fromstring(draw_lobing(LOBING, uid="one", heights=FREE))
    curves = [item.get("class") for item in root.iter(f"{SVG}path")]
    assert curves == ["pattern-line line-0", "pattern-line line-2"]
    bars = [item for item in root.iter(f"{SVG}rect") if item.get("class") == "null-free"]
    assert len(bars) == 1
    # 13.5 to 15 m of 10 to 20 m, on a scale 304 units high
    assert float(bars[0].get("height") or 0.0) == pytest.approx(0.15 * 304.0, abs=0.1)
    planned = next(item for item in root.iter(f"{SVG}line") if item.get("class") == "planned")
    assert float(planned.get("y1") or 0.0) == pytest.approx(338.0 - 0.2 * 304.0, abs=0.1)


def test_where_nothing_helps_the_words_say_what_was_tried() -> None:
    none = NullFreeHeights(end="a", planned_m=12.0, change_m=None, ranges=(), searched=FREE.searched, lowest_m=8.0)
    assert "No height from 8.0 m to 45.0 m" in lobing_words(LOBING, none)
