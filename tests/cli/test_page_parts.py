"""The parts that the terminal page is made of: widths, wrapping, and numbers rounded toward caution."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fellspan.cli import figures
from fellspan.cli.layout import WIDTH, Ink, columns_of, labelled, padded, printable, table, wrapped
from fellspan.cli.running import named
from fellspan.links.result import ExtraHeight


def test_wide_and_combining_characters_take_their_columns() -> None:
    assert columns_of("abc") == 3
    assert columns_of("長い") == 4
    assert columns_of("e\u0301") == 1


@given(text=st.text(max_size=400))
def test_nothing_is_wider_than_the_page(text: str) -> None:
    for line in (*wrapped(text, first="  ! "), *labelled(text, text)):
        assert columns_of(line) <= WIDTH


def test_wide_characters_without_blanks_are_broken() -> None:
    lines = wrapped("長" * 100)
    assert len(lines) > 1
    assert "".join(lines) == "長" * 100


def test_control_characters_do_not_reach_the_terminal() -> None:
    assert printable("a\x1b[31mb\nc\x9bd") == "a [31mb c d"


def test_columns_stay_in_line_and_cut_names_say_so() -> None:
    assert padded("長い名前", 6) == "長..."[:4] + padded("", 6 - columns_of("長..."[:4]))
    lines = table(("Name", "km"), [("a" * 20, "1.5"), ("b", "12.25")], widths=(10, 6), right=(1,))
    assert lines == ["Name           km", "aaaaaaa...    1.5", "b           12.25"]


def test_emphasis_only_where_there_are_colours() -> None:
    assert Ink(colours=False).emphasise("CLEAR", "good") == "CLEAR"
    assert Ink(colours=True).emphasise("CLEAR", "good").replace("\x1b[1m\x1b[32m", "").replace("\x1b[0m", "") == "CLEAR"


@pytest.mark.parametrize(
    ("value", "up", "down"), [(1.01, "1.1 m", "1.0 m"), (2.0, "2.0 m", "2.0 m"), (0.3, "0.3 m", "0.3 m")]
)
def test_metres_are_rounded_toward_caution(value: float, up: str, down: str) -> None:
    assert (figures.up(value), figures.down(value)) == (up, down)


def test_a_probability_never_reads_as_certainty() -> None:
    assert [figures.percent(p) for p in (1.0, 0.9999, 0.8999, 0.5, 0.0001, 0.0)] == [
        ">99.9 %", ">99.9 %", "89.9 %", "50 %", "<0.1 %", "<0.1 %",
    ]  # fmt: skip


def test_an_end_that_cannot_clear_it_is_said_so() -> None:
    text = figures.extra_height(ExtraHeight(a=7.21, b=None, both=4.0))
    assert text == "A alone 7.3 m, B alone cannot, or both 4.0 m each"
    assert figures.extra_height(ExtraHeight(a=11_273.4, b=1.742, both=100.1)) == (
        "A alone not practical, B alone 1.8 m, or both not practical"
    )


def test_small_phrases() -> None:
    assert figures.distance(850.4) == "850 m"
    assert figures.distance(28_049.0) == "28.05 km"
    assert figures.frequency(433.92e6) == "433.92 MHz"
    assert figures.bearing(5.04, None) == "005.0 deg true, magnetic unknown"
    assert figures.bearing(359.96, 359.97) == "000.0 deg true, 000.0 deg magnetic"
    assert figures.tilt(-1.234) == "1.23 deg down"
    assert figures.tilt(0.001) == "level"
    assert figures.earth_factor(float("inf")) == figures.earth_factor(None) == "infinite"
    assert figures.position(-33.1, 18.25) == "33.10000 S, 18.25000 E"


def test_a_message_names_its_link_once() -> None:
    assert named("Quay", "no data on the way") == "Quay: no data on the way"
    assert named("Quay", "no data on 'Quay'") == "no data on 'Quay'"
