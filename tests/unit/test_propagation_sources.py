"""The citation registry: complete, named on the methods page, and able to say what is out of range."""

import re
from pathlib import Path

import pytest

import fellspan.propagation
from fellspan.propagation import SOURCES, out_of_range, source

ROOT = Path(__file__).parents[2]
METHODS = ROOT / "docs" / "methods.md"


@pytest.mark.parametrize("key", SOURCES)
def test_every_source_is_on_the_methods_page(key: str) -> None:
    page = METHODS.read_text(encoding="utf-8")
    assert f"`{key}`" in page
    entry = source(key)
    if entry.status != "practice":
        assert entry.document in page


def test_the_methods_page_names_no_source_that_is_not_there() -> None:
    page = METHODS.read_text(encoding="utf-8")
    named = set(re.findall(r"^\| `([a-z0-9-]+)` \|", page, flags=re.MULTILINE))
    assert named == set(SOURCES)


def test_every_function_that_cites_a_key_cites_a_real_one() -> None:
    cited: set[str] = set()
    for name in fellspan.propagation.__all__:
        text = getattr(fellspan.propagation, name).__doc__ or ""
        for match in re.findall(r"Source\s+keys?:\s+([a-z0-9-]+(?:,\s+[a-z0-9-]+)*)", text):
            cited.update(key.strip() for key in match.split(","))
    assert len(cited) >= 15
    assert cited <= set(SOURCES)


def test_entries_are_complete() -> None:
    for key, entry in SOURCES.items():
        assert entry.key == key
        assert entry.title
        assert entry.reference
        assert "\n" not in entry.note
        for limit in entry.ranges:
            assert limit.low < limit.high


def test_reference_is_one_line() -> None:
    assert source("p526-16-knife-edge").reference == "Rec. ITU-R P.526-16, section 4.1, equations (26) and (31)"
    assert source("sixty-percent").reference == "common practice, no source"


def test_out_of_range_says_value_source_and_range() -> None:
    assert out_of_range("p530-19-k999", distance_m=30e3) == ()
    assert out_of_range("p530-19-k999", distance_m=18e3) == ()
    assert out_of_range("p530-19-k999", distance_m=12e3) == (
        "path length 12 km is outside the range of Rec. ITU-R P.530-19, section 2.2.2.1, equation (4): 18 to 200 km",
    )
    both = out_of_range("p526-16-delta-bullington", frequency_hz=20e6, inverse_k=-0.1)
    assert both == (
        "frequency 20 MHz is outside the range of Rec. ITU-R P.526-16, section 4.5.2, equations (58) to (66): at least 30 MHz",
        "1/k -0.1 is outside the range of Rec. ITU-R P.526-16, section 4.5.2, equations (58) to (66): at least 0",
    )
    assert out_of_range("p526-16-delta-bullington") == ()
    assert out_of_range("p530-19-k999", distance_m=float("nan")) == ()


def test_mistakes_in_asking_are_refused() -> None:
    with pytest.raises(ValueError, match=r"'distance_km'; it has distance_m"):
        out_of_range("p530-19-k999", distance_km=12)
    with pytest.raises(KeyError, match="'p530'"):
        source("p530")


def test_sources_are_frozen() -> None:
    with pytest.raises(TypeError):
        SOURCES["x"] = source("earth-bulge")  # type: ignore[index]
    with pytest.raises(AttributeError):
        source("earth-bulge").key = "x"  # type: ignore[misc]
