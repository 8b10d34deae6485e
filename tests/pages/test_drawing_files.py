"""Drawings as files of their own: whole, in light colours, silent in a browser, and named on the page they come from."""

import re

import pytest
from defusedxml import ElementTree

from fellspan.exports.folder import report_names
from fellspan.report.drawing_files import LIST, colours, drawing_files, stand_alone

SVG = "{http://www.w3.org/2000/svg}"


@pytest.fixture(scope="module")
def files(sample):
    """Page names, and the drawings of each."""
    return {path.name: drawing_files(path.name, sample.texts[path.name]) for path in sample.link_pages}


def test_every_page_has_its_drawings_and_names_each(sample, files):
    for page, drawings in files.items():
        listed = re.findall(r'href="(drawing-[^"]+\.svg)"', sample.texts[page])
        assert listed == list(drawings)
        assert LIST not in sample.texts[page]
        assert {name.rsplit("-", 1)[1] for name in drawings} >= {"profile.svg", "heights.svg"}
    assert {name for drawings in files.values() for name in drawings} <= set(report_names(sample.plan))
    kinds = {
        re.sub(r"^drawing-\d+-.*?(?=(profile|antennas|heights|reflection))", "", n) for d in files.values() for n in d
    }
    assert {"antennas-azimuth.svg", "antennas-elevation.svg", "reflection-a.svg", "reflection-b.svg"} <= kinds


def test_a_drawing_is_xml_with_its_own_style_and_size(files):
    for drawings in files.values():
        for name, text in drawings.items():
            root = ElementTree.fromstring(text)
            assert root.tag == f"{SVG}svg"
            assert float(root.get("width")) > 300
            assert root.find(f"{SVG}title") is not None, name
            style = root.find(f"{SVG}style").text
            assert "var(" not in text
            assert "inherit" not in style
            assert colours()["--sheet"] in style
            ids = {part.get("id") for part in root.iter()} - {None}
            assert set(re.findall(r"url\(#([\w-]+)\)", text)) <= ids, name
            assert set(root.get("aria-labelledby").split()) <= ids


def test_colours_are_the_light_ones_and_all_known():
    assert colours()["--sheet"] == "#fffdf8"
    assert not any("var(" in value or value == "inherit" for value in colours().values())


def test_what_xml_cannot_hold_is_left_out():
    made = stand_alone("path-profile", ' viewBox="0 0 10 10"', "<text>a\x0bb\ufffe&lt;c</text>")
    assert ElementTree.fromstring(made).find(f"{SVG}text").text == "ab<c"


@pytest.mark.browser
def test_a_drawing_opens_by_itself_in_a_browser_and_looks_as_on_the_page(sample, files, tmp_path, watch):
    page_name, drawings = next(iter(files.items()))
    for name, text in drawings.items():
        (tmp_path / name).write_text(text, encoding="utf-8")
        watched = watch(1200, 800)
        watched.page.goto((tmp_path / name).as_uri())
        assert watched.messages == []
        assert watched.requests == []
        alone = watched.page.evaluate("() => getComputedStyle(document.querySelector('text')).fill")
        assert alone in ("rgb(34, 48, 58)", "rgb(86, 100, 108)")  # ink, soft ink
    look = """() => { const line = document.querySelector('svg.path-profile .sight-line'), drawn = getComputedStyle(line);
      return [drawn.stroke, drawn.strokeWidth, drawn.strokeDasharray]; }"""
    first = watch(1200, 800).page
    first.goto((tmp_path / next(iter(drawings))).as_uri())
    second = watch(1200, 800).page
    second.goto((sample.folder / page_name).as_uri())
    assert first.evaluate(look) == second.evaluate(look)
