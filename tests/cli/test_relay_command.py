"""`fellspan relay`: a ridge with one pass; the page, JSON, the folder of the report, and refusals in four lines."""

import json
from pathlib import Path

import pytest
import shapely
from made_pass import CELL_M, cell_centre, ground_with_pass
from made_studies import run_command, unwrapped
from made_terrain import lonlat, raster

from fellspan.cli.main import run
from fellspan.planning.planner import plan_study
from fellspan.study.reading import load_study

RELAY = ("relay", "pass.toml", "--mast", "12 m", "--hop", "2 km")
STUDY = """
[study]
title = "A ridge with a pass"
date = 2026-05-01

[terrain]
ground = { path = "ground.tif", error = "0 m" }

[criteria]
preset = "sixty-percent"

[[site]]
name = "NAME-A"
at = "AT-A"
height = "8 m above ground"

[[site]]
name = "NAME-B"
at = "AT-B"
height = "8 m above ground"

[[radio]]
name = "radio"
frequency = "5.8 GHz"
power = "20 dBm"
threshold = "-75 dBm"

[[antenna]]
name = "dish"
gain = "25 dBi"

[[link]]
name = "NAME-A - NAME-B"
a = "NAME-A"
b = "NAME-B"
radio = "radio"
antenna = "dish"
"""


def spot(column: float, row: float) -> str:
    longitude, latitude = lonlat(column * CELL_M, row * CELL_M)
    return f"{latitude:.7f} N, {-longitude:.7f} W"


def write(folder: Path, name: str = "pass.toml", *, a: str = "West", b: str = "East") -> None:
    raster(folder / "ground.tif", ground_with_pass(), cell_m=CELL_M)
    text = STUDY.replace("AT-A", spot(3.3, 15.4)).replace("AT-B", spot(28.6, 15.2))
    (folder / name).write_text(text.replace("NAME-A", a).replace("NAME-B", b), encoding="utf-8")


def area_file(path: Path, *corners: tuple[float, float]) -> None:
    ring = [list(lonlat(x * CELL_M, y * CELL_M)) for x, y in (*corners, corners[0])]
    feature = {"type": "Feature", "properties": {}, "geometry": {"type": "Polygon", "coordinates": [ring]}}
    path.write_text(json.dumps({"type": "FeatureCollection", "features": [feature]}), encoding="utf-8")


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    made = tmp_path_factory.mktemp("relay")
    write(made)
    area_file(made / "north.geojson", (0, 0), (32, 0), (32, 12), (0, 12))
    area_file(made / "valley.geojson", (0, 0), (8, 0), (8, 24), (0, 24))
    (made / "sites.csv").write_text(
        "name,latitude,longitude,height\n"
        + "\n".join(
            f"{name},{lonlat(x * CELL_M, y * CELL_M)[1]:.7f},{lonlat(x * CELL_M, y * CELL_M)[0]:.7f},{height}"
            for name, x, y, height in (("Valley", 6.0, 20.0, "10 m above ground"), ("Crest", 15.9, 15.3, ""))
        ),
        encoding="utf-8",
    )
    return made


@pytest.fixture(scope="module")
def report(folder: Path):  # type: ignore[no-untyped-def]
    return run_command(*RELAY, "--count", "2", "--out", "found", folder=folder), folder / "found"


def test_the_page_says_first_what_was_found_and_fits_80_columns(report) -> None:  # type: ignore[no-untyped-def]
    ran, _ = report
    assert (ran.returncode, ran.stderr) == (0, ""), ran.stderr
    lines = ran.stdout.splitlines()
    assert max(map(len, lines)) <= 80
    assert ran.stdout.isascii()
    assert lines[0] == "Relay for West - East"
    assert lines[1].startswith("One relay serves with 12 m of mast: best is Relay 1, every hop clear on bare")
    for words in ("obstructed", "to Relay 1", "to East", "above sea level", "cells", "may be built on"):
        assert words in ran.stdout, words
    assert lines[-4].startswith("report: found/index.html (")
    assert lines[-3].startswith("channels: give each hop a channel of its own in the study (frequency = ...)")
    assert lines[-1] == "next: fellspan plan found/relay.toml"
    head = (report[1] / "relay.toml").read_text(encoding="utf-8").partition("[study]")[0]
    assert "Give each hop a channel of its own" in head
    assert "Give each hop a channel of its own" in (report[1] / "index.html").read_text(encoding="utf-8")


def test_every_study_written_loads_and_plans_to_the_same_verdicts(report) -> None:  # type: ignore[no-untyped-def]
    _, out = report
    told = json.loads((out / "relay.json").read_text(encoding="utf-8"))
    assert len(told["relays"]) == 2
    for name, route in zip(("relay.toml", "relay-2.toml"), told["relays"], strict=True):
        plan = plan_study(load_study(out / name))
        assert not plan.failures
        for link, hop in zip(plan.links, route["hops"], strict=True):
            assert link.result.name == hop["name"]
            assert (link.result.verdict, link.result.signal_verdict) == ("clear", "meets")
            assert (hop["verdict"], hop["signal_verdict"]) == ("clear", "meets")
            assert link.result.distance_m == pytest.approx(hop["distance_m"], abs=1e-6)
            assert link.result.margin_db.at_b == pytest.approx(hop["margin_db"]["at_b"], abs=1e-9)


def test_one_channel_for_both_hops_leaves_what_a_plan_of_the_study_written_says(tmp_path: Path) -> None:
    write(tmp_path)
    study = (tmp_path / "pass.toml").read_text(encoding="utf-8")
    text = study.replace('power = "20 dBm"', 'power = "20 dBm"\nchannel_width = "20 MHz"')
    beside = text[text.index("[[link]]") :].replace("West - East", "Beside", 1)
    (tmp_path / "pass.toml").write_text(text + beside, encoding="utf-8")
    ran = run_command(*RELAY, "--link", "West - East", "--count", "1", "--out", "found", folder=tmp_path)
    assert (ran.returncode, ran.stderr) == (0, ""), ran.stderr
    (told,) = json.loads((tmp_path / "found" / "relay.json").read_text(encoding="utf-8"))["relays"]
    use = told["channels"]
    found = plan_study(load_study(tmp_path / "found" / "relay.toml")).interference
    assert found is not None
    worst = min(found.receivers, key=lambda one: one.effective_margin_db or 0.0)
    assert worst.effective_margin_db is not None
    assert use["shared_db"] == pytest.approx(worst.effective_margin_db, abs=1e-6)
    assert use["shared_at"] == worst.site
    assert use["shared_db"] < told["worst_margin_db"] - 10.0
    # the twin of the link is on the air on the same channel, and stands at its ends
    assert use["others_counted"] is True
    assert use["beside_study_db"] < told["worst_margin_db"] - 10.0
    words = " ".join(ran.stdout.split())
    assert "all hops on the link's one channel: " in words
    assert "beside the study's other links: " in words
    page = (tmp_path / "found" / "index.html").read_text(encoding="utf-8")
    assert "of margin left, at " in page


def test_hops_get_channels_of_their_own_within_the_band_of_the_rule_and_keep_what_was_promised(tmp_path: Path) -> None:
    """20 MHz at 5775 MHz in 5725 to 5850 MHz (47 CFR 15.247): one and a half widths above is 5805 MHz."""
    write(tmp_path)
    text = (tmp_path / "pass.toml").read_text(encoding="utf-8").replace("5.8 GHz", "5.775 GHz")
    text = text.replace('power = "20 dBm"', 'power = "20 dBm"\nchannel_width = "20 MHz"\nnoise_figure = "6 dB"')
    text = text.replace('antenna = "dish"', 'antenna = "dish"\nrule = "fcc-15.247-5g8-ptp"')
    (tmp_path / "pass.toml").write_text(text, encoding="utf-8")
    ran = run_command(*RELAY, "--count", "1", "--out", "found", folder=tmp_path)
    assert (ran.returncode, ran.stderr) == (0, ""), ran.stderr
    assert max(map(len, ran.stdout.splitlines())) <= 80
    words = "first hop keeps 5.775 GHz, the hop after it got 5.805 GHz, within 5725 to 5850 MHz"
    assert words in " ".join(ran.stdout.split())
    written = (tmp_path / "found" / "relay.toml").read_text(encoding="utf-8")
    assert words in " ".join(written.replace("# ", "").split())
    assert words in (tmp_path / "found" / "index.html").read_text(encoding="utf-8")
    (told,) = json.loads((tmp_path / "found" / "relay.json").read_text(encoding="utf-8"))["relays"]
    assert told["channels"]["shared_db"] < told["worst_margin_db"] - 10.0
    plan = plan_study(load_study(tmp_path / "found" / "relay.toml"))
    assert [link.link.radio.frequency_hz for link in plan.links] == [5.775e9, 5.805e9]
    assert plan.interference is not None
    for link, hop in zip(plan.links, told["hops"], strict=True):
        assert link.result.signal_verdict == "meets"
        for end, promised in zip("AB", (hop["margin_db"]["at_a"], hop["margin_db"]["at_b"]), strict=True):
            (one,) = (r for r in plan.interference.receivers if (r.link, r.end) == (link.result.name, end))
            # 20 log10(5805 / 5775) = 0.045 dB of free space
            assert one.effective_margin_db == pytest.approx(promised, abs=0.06)


def test_a_chain_of_two_tells_what_was_tried(folder: Path) -> None:
    ran = run_command(*RELAY[:-1], "0.6 km", "--count", "1", "--json", folder=folder)
    told = json.loads(ran.stdout)
    tried = told["chains"]
    assert tried["pairs"] >= tried["chains"]
    assert tried["block"] == [1, 1]
    page = run_command(*RELAY[:-1], "0.6 km", "--count", "1", folder=folder)
    assert page.returncode == ran.returncode
    assert f"Chains of two all {tried['places'][0]} cells" in " ".join(page.stdout.split())
    assert max(map(len, page.stdout.splitlines())) <= 80


def test_the_geojson_holds_closed_areas_in_lon_lat_order_around_the_relays(report) -> None:  # type: ignore[no-untyped-def]
    _, out = report
    features = json.loads((out / "relay.geojson").read_text(encoding="utf-8"))["features"]
    kinds = [feature["properties"]["what"] for feature in features]
    assert kinds.count("end") == 2
    assert kinds.count("relay") == 2
    assert kinds.count("hop") == 4
    (area,) = (one for one in features if one["properties"]["what"] == "both ends clear from here")
    shape = shapely.from_geojson(json.dumps(area["geometry"]))
    assert shape.is_valid
    for part in shapely.get_parts(shape):
        assert part.exterior.is_closed
        assert part.exterior.is_ccw  # RFC 7946, section 3.1.6
    west, south, east, north = shape.bounds
    assert -45.3 < west < east < -45.1
    assert 36.0 < south < north < 36.2
    for feature in features:
        if feature["properties"]["what"] == "relay":
            assert shape.covers(shapely.Point(feature["geometry"]["coordinates"]))
    cells = area["properties"]["cells"]
    square_m = shape.area * 111_320.0 * 111_132.0 * 0.8085  # cosine of 36.05 degrees
    assert square_m == pytest.approx(cells * CELL_M**2, rel=0.01)
    assert len(cell_centre(0, 0)) == 2


def test_the_overview_shows_places_numbers_and_the_area(report) -> None:  # type: ignore[no-untyped-def]
    _, out = report
    page = (out / "index.html").read_text(encoding="utf-8")
    for words in (
        '<h2 id="relays">Relays</h2>',
        "both ends clear from here with a 12 m mast, on bare ground<",
        "addRelays(map_overview, ",
        "markRelays(map_overview);",
        'href="relay-2.toml"',
        "a right to stand there",
    ):
        assert words in page, words


def test_json_says_the_same_and_nothing_else(folder: Path) -> None:
    ran = run_command(*RELAY, "--area", "north.geojson", "--count", "1", "--json", folder=folder)
    assert (ran.returncode, ran.stderr) == (0, "")
    told = json.loads(ran.stdout)
    assert (told["schema"], told["link"], told["direct_verdict"]) == (1, "West - East", "obstructed")
    (site,) = told["relays"][0]["sites"]
    south = lonlat(0.0, 12 * CELL_M)[1]
    assert site["latitude_deg"] > south - 1e-4
    assert told["relays"][0]["worst_margin_db"] == pytest.approx(
        min(min(hop["margin_db"].values()) for hop in told["relays"][0]["hops"])
    )
    assert told["area"]["each_cell_judged_as_planned"] is True


def test_candidate_sites_keep_their_names_and_take_the_mast_where_they_state_none(folder: Path) -> None:
    ran = run_command(*RELAY, "--sites", "sites.csv", "--out", "sited", folder=folder)
    assert (ran.returncode, ran.stderr) == (0, ""), ran.stderr
    assert "best is Crest" in ran.stdout
    assert "antenna 12 m above ground" in " ".join(ran.stdout.split())
    assert "2 candidate sites" in ran.stdout
    assert "markRelays" in (folder / "sited" / "index.html").read_text(encoding="utf-8")


def test_none_found_is_1_and_leaves_no_folder(folder: Path) -> None:
    ran = run_command(*RELAY, "--area", "valley.geojson", "--single", "--out", "none", folder=folder)
    assert ran.returncode == 1, ran.stdout + ran.stderr
    assert "No way round found: no relay with 12 m of mast" in ran.stdout
    assert not (folder / "none").exists()


def test_hostile_names_come_through_page_and_study(tmp_path: Path) -> None:
    write(tmp_path, a="Relay 1", b="<b onload=alert(1)>&amp;{{7*7}} " + "x" * 350)
    ran = run_command(*RELAY, "--count", "1", "--out", "found", folder=tmp_path)
    assert ran.returncode == 0, ran.stderr
    assert max(map(len, ran.stdout.splitlines())) <= 80
    plan = plan_study(load_study(tmp_path / "found" / "relay.toml"))
    assert [link.result.verdict for link in plan.links] == ["clear", "clear"]
    assert plan.links[0].result.ends.b.site == "Relay 1'"
    page = (tmp_path / "found" / "index.html").read_text(encoding="utf-8")
    assert "<b onload" not in page
    assert "{{7*7}}" in page


def test_the_folder_of_another_report_is_left_alone(folder: Path) -> None:
    planned = run_command("plan", "pass.toml", "--out", "planned", folder=folder)
    assert planned.returncode == 0, planned.stderr
    before = (folder / "planned" / "index.html").read_bytes()
    ran = run_command(*RELAY, "--out", "planned", folder=folder)
    assert (ran.returncode, ran.stdout) == (4, "")
    assert "holds the report of 'West - East'" in ran.stderr
    assert (folder / "planned" / "index.html").read_bytes() == before


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("--link", "Wets - East"), "there is no link named 'Wets - East'"),
        (("--hop", "0.4 km"), "3 hops of 0.40 km do not reach"),
        (("--hop", "blue"), "--hop: "),
        (("--mast", "-3 m"), "--mast: "),
        (("--mast", "3"), "--mast: "),
        (("--mast", "3 m above roof"), "a relay's mast stands on the ground"),
        (("--margin", "6"), "--margin: "),
        (("--apart", "-1 km"), "--apart: "),
        (("--count", "0"), "--count"),
        (("--area", "pass.toml"), "area file 'pass.toml': not GeoJSON"),
        (("--area", "nowhere.geojson"), "nowhere.geojson"),
        (("--sites", "pass.toml"), "pass.toml"),
        (("--sites", "empty.csv"), "empty.csv"),
        (("--out", "pass.toml"), "is a file"),
        (("--out", "foreign"), "was not written by Fellspan"),
    ],
)
def test_refusals_are_short_and_name_the_value(
    folder: Path,
    arguments: tuple[str, ...],
    words: str,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.chdir(folder)
    (folder / "empty.csv").write_text("name,latitude,longitude\n", encoding="utf-8")
    (folder / "foreign").mkdir(exist_ok=True)
    (folder / "foreign" / "index.html").write_text("mine", encoding="utf-8")
    assert run([*RELAY, *arguments]) in (2, 4)
    said = capsys.readouterr()
    assert said.out == ""
    assert words in said.err
    assert "Traceback" not in said.err
    assert "bug" not in said.err
    assert len(unwrapped(said.err).splitlines()) <= 4
