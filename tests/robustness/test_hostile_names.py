"""Names that attack, break or turn around are text in everything that a plan writes: pages, drawings, tables, maps.

Every output is read by a parser that is not ours: Chromium's for pages, defusedxml for SVG, KML and GPX, json, csv.
"""

import csv
import json
import os
import re
import shutil
import sys
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import pytest
from defusedxml import ElementTree

from fellspan.exports.folder import report_files
from fellspan.planning.planner import plan_study
from fellspan.study.reading import load_study

sys.path.insert(0, str(Path(__file__).parents[1] / "pages"))
try:
    from watched_browser import ARGUMENTS, CHROMIUM, watching
finally:
    sys.path.pop(0)

SAMPLE = Path(__file__).parents[2] / "sample_terrain"
SCRIPT = "</script><script>document.title='owned'</script>\"><img src=x onerror=alert(1)> {{7*7}} '&amp;"
TURNED = "\u202eمنارة הנמל\u202c \u200f– \u2066مرفأ"
NAMES = {
    "script": SCRIPT,
    "turned": TURNED,
    "long": "W" * 300,
    "lines": "two\nlines\r\nand a\ttab",
    "formula": '=HYPERLINK("file:///etc/passwd","x")',
    "plus": "+1+cmd|' /C calc'!A0",
    "minus": "-2+3",
    "at": "@SUM(1)",
    "tabbed": "\t=1+1",
    "markup": "]]><b>&lt;&#x41;</b><!-- %s ${x} `x` \\",
}
SITES = tuple(NAMES.values())
THINGS = "@things '&<i>.csv"
FILE = "=gr'ound & <b>x\u202e.tif"
PLACES = (
    "36.035368, -45.163227",
    "36.033015, -45.169094",
    "36.038172, -45.155982",
    "36.034, -45.160",
    "36.0372, -45.1651",
)
FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r", "\n")


def toml(text: str) -> str:
    """A basic string of TOML: that of JSON with DEL written out."""
    return json.dumps(text).replace("\x7f", "\\u007f")


def write_study(folder: Path) -> Path:
    """Five links between ten sites; every name in it is one of NAMES, and so are the files'."""
    shutil.copy(SAMPLE / "tolmera_ground.tif", folder / FILE)
    obstacle_rows = [
        ["name", "kind", "wkt", "envelope", "height_m", "top_amsl_m", "heights_m", "sag_m", "radius_m", "width_m",
         "growth_m_per_year", "error_m", "source"],
        [SCRIPT, "tree", "POINT (-45.1664370 36.0341052)", "", "14.5", "", "", "", "8", "", "", "0.5", TURNED],
        ["=1+1", "other", "LINESTRING (-45.170 36.0343, -45.150 36.0363)", "", "3", "", "", "", "", "9", "", "0.5", "@x"],
    ]  # fmt: skip
    with (folder / THINGS).open("w", encoding="utf-8", newline="") as file:
        csv.writer(file).writerows(obstacle_rows)
    parts = f"""
[study]
title = {toml(SCRIPT)}
planner = {toml(NAMES["formula"] + TURNED)}
revision = {toml("<i>=1</i>")}
date = 2026-05-01
[terrain]
ground = {{ path = {toml(FILE)}, datum = {toml("<b>=d")}, error = "1 m" }}
obstacles = {toml(THINGS)}
[[radio]]
name = {toml(NAMES["plus"])}
frequency = "5.8 GHz"
power = "20 dBm"
threshold = "-75 dBm"
channel_width = "20 MHz"
[[antenna]]
name = {toml(SCRIPT)}
gain = "19 dBi"
azimuth_width = 17
elevation_width = 17
front_to_back = "30 dB"
"""
    for index, name in enumerate(SITES):
        place = PLACES[index // 2] if index % 2 == 0 else PLACES[(index // 2 + 1) % 5]
        parts += f'[[site]]\nname = {toml(name)}\nat = "{place}"\nheight = "{20 + index} m above ground"\n'
    for index in range(5):
        a, b = SITES[2 * index : 2 * index + 2]
        parts += f"[[link]]\nname = {toml(f'{a} / {b}')}\na = {toml(a)}\nb = {toml(b)}\n"
        parts += f"radio = {toml(NAMES['plus'])}\nantenna = {toml(SCRIPT)}\n"
    study = folder / "study.toml"
    study.write_text(parts, encoding="utf-8")
    return study


@pytest.fixture(scope="module")
def plan(tmp_path_factory):
    return plan_study(load_study(write_study(tmp_path_factory.mktemp("hostile"))))


@pytest.fixture(scope="module")
def files(plan):
    return report_files(plan)


@pytest.fixture(scope="module")
def folder(files, tmp_path_factory):
    made = tmp_path_factory.mktemp("report")
    for name, text in files.items():
        (made / name).write_text(text, encoding="utf-8", newline="\n")
    return made


def flat(text: str) -> str:
    """White space of any kind as one blank: no page and no XML keeps it apart."""
    return " ".join(text.split())


def test_the_names_reach_the_plan_as_they_were_typed(plan):
    assert not plan.failures
    ends = {end for link in plan.links for end in (link.result.a, link.result.b)}
    assert ends == {name.strip() for name in SITES}
    assert plan.study.title == SCRIPT
    assert any(SCRIPT in item.cause for link in plan.links for item in link.result.clearance) or any(
        item.name == SCRIPT for link in plan.links for item in (*link.profile.obstacles, *link.profile.beside)
    )


def test_file_names_are_plain_short_and_differ_on_every_disk(files):
    for name in files:
        assert re.fullmatch(r"[a-z0-9][a-z0-9.-]{0,99}", name), name
    assert len({name.lower() for name in files}) == len(files)


def cells(files, name):
    return list(csv.reader(files[name].splitlines(keepends=True)))


def test_no_cell_of_any_table_starts_a_formula_and_every_name_is_in_it(plan, files):
    tables = [name for name in files if name.endswith(".csv")]
    assert len(tables) == 3 + len(plan.links)
    for table in tables:
        for row in cells(files, table):
            for cell in row:
                if re.fullmatch(r"-?[\d.]+(e[-+]?\d+)?", cell):
                    continue
                assert not cell.lstrip().startswith(FORMULA_STARTS), (table, cell)
                assert not cell.startswith(FORMULA_STARTS), (table, cell)
    head, *rows = cells(files, "links.csv")
    for column, told in (("name", lambda r: r.name), ("a", lambda r: r.a), ("b", lambda r: r.b)):
        got = [row[head.index(column)] for row in rows]
        wanted = [told(link.result) for link in plan.links]
        for cell, name in zip(got, wanted, strict=True):
            assert cell == ("'" + name if name.startswith(FORMULA_STARTS) else name)
    assert len(head) == len(set(head))


def test_a_profile_table_says_its_units_in_every_column(files):
    name = next(name for name in files if name.startswith("profile-"))
    head, *rows = cells(files, name)
    words = {"cover_kind", "obstacle", "measured", "source"}
    for column in head:
        assert column in words or re.search(r"_(m|deg)( \(.+\))?$", column), column
    assert all(len(row) == len(head) for row in rows)


def test_map_and_survey_files_hold_the_names_as_text(plan, files):
    kml = ElementTree.fromstring(files["links.kml"])
    space = "{http://www.opengis.net/kml/2.2}"
    assert flat(kml.find(f"{space}Document/{space}name").text) == flat(SCRIPT)
    folders = [flat(part.find(f"{space}name").text) for part in kml.iter(f"{space}Folder")]
    assert folders == [flat(link.result.name) for link in plan.links]
    marks = {flat(part.find(f"{space}name").text) for part in kml.iter(f"{space}Placemark")}
    assert {flat(name) for name in SITES} <= marks
    gpx = ElementTree.fromstring(files["survey.gpx"])
    space = "{http://www.topografix.com/GPX/1/1}"
    assert flat(gpx.find(f"{space}metadata/{space}name").text) == flat(SCRIPT)
    told = " ".join(flat(part.text) for part in gpx.iter(f"{space}desc"))
    for link in plan.links:
        assert flat(link.result.name) in told
    features = json.loads(files["links.geojson"])["features"]
    assert {item["properties"]["name"] for item in features if item["properties"]["what"] == "site"} == {
        name.strip() for name in SITES
    }
    results = json.loads(files["results.json"])
    assert [link["name"] for link in results["links"]] == [link.result.name for link in plan.links]


def test_every_drawing_is_xml_that_holds_the_name_and_no_script(plan, files):
    drawings = [name for name in files if name.endswith(".svg")]
    assert len(drawings) >= 6 * len(plan.links)
    for name in drawings:
        root = ElementTree.fromstring(files[name])
        kinds = {part.tag.rsplit("}", 1)[1] for part in root.iter()}
        assert kinds <= {"svg", "style", "title", "desc", "defs", "pattern", "clipPath", "g", "path", "line", "rect", "circle",
                         "text", "tspan", "polyline", "polygon", "ellipse"}, name  # fmt: skip
        assert not [key for part in root.iter() for key in part.attrib if key.lower().startswith("on")]
        if name.endswith("-profile.svg"):
            title = flat(root.find("{http://www.w3.org/2000/svg}title").text)
            assert title == flat(f"Path profile of {plan.links[int(name.split('-')[1]) - 1].result.name}")


LOOK = """() => ({
  wide: document.documentElement.scrollWidth, room: window.innerWidth, title: document.title,
  heading: document.querySelector("h1").textContent, text: document.body.textContent,
  foreign: document.querySelectorAll("img:not(.leaflet-image-layer), [onerror], iframe, object, embed, form").length,
})"""


@pytest.fixture(scope="module")
def seen(files, folder):
    """Every page in Chromium at 390 px, with what it said and asked, and every dialog that it opened."""
    if not CHROMIUM.exists() and os.environ.get("CI") != "true":
        pytest.skip(f"{CHROMIUM} is not installed")
    # In a thread of its own: the browser of other tests may be open in this one.
    with ThreadPoolExecutor(1) as pool:
        return pool.submit(_looked_at, files, folder).result()


def _looked_at(files, folder):
    from playwright.sync_api import sync_playwright

    looks = {}
    with sync_playwright() as play:
        browser = play.chromium.launch(executable_path=CHROMIUM, args=ARGUMENTS)
        with watching(browser) as opened:
            for name in (name for name in files if name.endswith((".html", "-profile.svg"))):
                watched = opened(390, 844)
                dialogs = []
                watched.page.on("dialog", lambda dialog, told=dialogs: (told.append(dialog.message), dialog.dismiss()))
                watched.page.goto((folder / name).as_uri())
                if name == "index.html":
                    watched.page.locator(".entry").nth(1).click()
                    rows = watched.page.evaluate(
                        "() => [Array.from(document.querySelectorAll('.sortable tbody a')).map(a => a.textContent),"
                        " Array.from(document.querySelectorAll('.entry-name')).map(a => a.textContent),"
                        " Array.from(document.querySelectorAll('.site-dot')).map(a => a.title)]"
                    )
                    looks["rows"] = rows
                    watched.page.evaluate("() => document.querySelectorAll('details').forEach(d => { d.open = true; })")
                look = watched.page.evaluate(LOOK) if name.endswith(".html") else {}
                looks[name] = look | {"said": watched.messages, "asked": watched.requests, "dialogs": dialogs}
        browser.close()
    return looks


@pytest.mark.browser
def test_no_page_runs_asks_or_says_anything_nor_scrolls_sideways(seen, files):
    pages = [name for name in files if name.endswith((".html", "-profile.svg"))]
    assert len(pages) == 1 + 4 * 5
    for name in pages:
        look = seen[name]
        assert (look["said"], look["asked"], look["dialogs"]) == ([], [], []), name
        if name.endswith(".html"):
            assert look["title"] != "owned"
            assert look["foreign"] == 0, name
            assert look["wide"] <= look["room"] or name.startswith("crew-"), name


@pytest.mark.browser
def test_pages_show_the_names_as_the_text_they_are(seen, plan):
    names = [flat(link.result.name) for link in plan.links]
    assert [flat(text) for text in seen["rows"][0]] == names
    assert [flat(text) for text in seen["rows"][1]] == names
    assert {flat(text) for text in seen["rows"][2]} == {flat(name) for name in SITES}
    assert flat(seen["index.html"]["heading"]) == flat(SCRIPT)
    assert flat(plan.study.planner) in flat(seen["index.html"]["text"])
    assert FILE in flat(seen["index.html"]["text"])
    links = [look for name, look in seen.items() if name.startswith("link-") and name.endswith(".html")]
    for look, link in zip(links, plan.links, strict=True):
        assert flat(look["heading"]) == flat(link.result.name)
        for told in (link.result.a, link.result.b, SCRIPT):
            assert flat(told) in flat(look["text"])
    crews = [look for name, look in seen.items() if name.startswith("crew-")]
    sites = [site for link in plan.links for site in (link.result.a, link.result.b)]
    for look, site in zip(crews, sites, strict=True):
        assert flat(site)[:40] in flat(look["text"])  # shortened, so that the sheet stays one page
