"""Pages as texts: named safely, the same bytes each time, complete, and pointing nowhere outside."""

import re
from dataclasses import replace

import pytest

from fellspan.report.naming import crew_name, page_name
from fellspan.report.pages import render_pages


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("Harbour - North Light", "link-01-harbour-north-light.html"),
        ("../../etc/passwd", "link-01-etc-passwd.html"),
        ("Île d'Ys \u202e<script>", "link-01-ile-d-ys-script.html"),
        ("مرفأ", "link-01.html"),
        ("", "link-01.html"),
        ("CON\x00", "link-01-con.html"),
    ],
)
def test_page_names_are_plain_ascii(name, expected):
    assert page_name(0, name) == expected


def test_long_names_make_short_file_names_and_the_number_keeps_them_apart():
    names = {page_name(index, "w" * 300) for index in range(120)}
    assert len(names) == 120
    assert max(map(len, names)) <= 70


def test_same_plan_same_bytes(plain):
    assert render_pages(plain.plan) == plain.texts


def test_every_link_has_its_page_and_progress_is_told(plain):
    told = []
    pages = render_pages(plain.plan, progress=lambda *call: told.append(call))
    names = [p.result.name for p in plain.plan.links]
    of_links = [[page_name(i, n), crew_name(i, n, "a"), crew_name(i, n, "b")] for i, n in enumerate(names)]
    assert list(pages) == ["index.html", *(name for three in of_links for name in three)]
    assert told[0] == (0, 8, "index.html")
    assert told[-1] == (8, 8, "")


@pytest.mark.parametrize("kind", ["plain", "hostile", "antimeridian"])
def test_pages_name_no_address_but_those_of_namespaces(request, kind):
    for name, text in request.getfixturevalue(kind).texts.items():
        found = set(re.findall(r"(?:https?:)?//[a-z0-9.-]+\.[a-z]{2,}", text))
        # Leaflet's script holds its home page, in its licence and in a credit that is switched off, a bug
        # report in a comment, and XML namespaces; the browser tests show that nothing is asked of them.
        assert found <= {"https://leafletjs.com", "https://bugzilla.mozilla.org", "http://www.w3.org"}, name
        assert "url(" not in re.sub(r"url\(#[\w-]+\)", "", re.sub(r"<script>.*?</script>", "", text, flags=re.DOTALL))
        assert "jquery" not in text.lower()
        assert "sourceMappingURL" not in text


def test_only_links_to_files_of_the_report(plain):
    for text in plain.texts.values():
        for target in re.findall(r'href="([^"]*)"', re.sub(r"<script>.*?</script>", "", text, flags=re.DOTALL)):
            assert re.fullmatch(
                r"data:,|#[\w-]+|[A-Za-z0-9-]+\.(html|json|csv|geojson|kml|gpx|svg)(#[\w-]+)?", target
            ), target


def test_failures_and_their_messages_are_listed(plain):
    text = plain.texts["index.html"]
    assert "terrain has no data from 3.21 km to 4.07 km of &#39;Gone - Nowhere&#39;" in text
    assert "add a raster that covers the stretch" in text


def test_a_study_of_failures_only_still_makes_an_overview(plain):
    pages = render_pages(replace(plain.plan, links=()))
    assert list(pages) == ["index.html"]
    assert "could be assessed" in pages["index.html"]


def test_pages_are_small(plain):
    # A page carries the map library (150 kB), a relief (at most 120 kB) and its drawings.
    assert max(len(text) for name, text in plain.texts.items() if name != "index.html") < 400_000
