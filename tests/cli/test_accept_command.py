"""`fellspan accept`: verdict, exit codes, the starter, JSON, and the report with the link as built."""

import json
import re
from html import unescape
from pathlib import Path

import pytest
from made_studies import unwrapped

from fellspan.cli import main

SAMPLE = str(Path(__file__).resolve().parents[2] / "sample_terrain" / "tolmera.toml")
LINK = "Beacon - West Point"
GOOD = '[measured]\ndate = 2026-05-20\nby = "N. <N>"\n[a]\nlevel = "-43.5 dBm"\n[b]\nlevel = "-42.1 dBm"\n'
LOW = GOOD.replace("-43.5", "-63.5").replace("-42.1", "-64.0")


def accept(measured: Path, *more: str, link: str = LINK) -> int:
    return main.run(["accept", SAMPLE, "--link", link, "--measured", str(measured), *more])


def written(folder: Path, text: str, name: str = "m.toml") -> Path:
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


def test_a_level_within_the_band_is_accepted_with_0(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert accept(written(tmp_path, GOOD)) == 0
    out = capsys.readouterr().out
    assert "ACCEPTED AS BUILT" in out
    assert "Likely causes" not in out
    assert max(len(line) for line in out.splitlines()) <= 80


def test_a_side_lobe_is_named_with_1_and_the_checks_climb_last(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert accept(written(tmp_path, LOW)) == 1
    out = capsys.readouterr().out
    assert "NOT ACCEPTED" in out
    assert "1. an antenna aimed by its first side lobe, at A or at B" in out
    assert out.index("hold the aim of both") < out.index("sweep azimuth wide")
    assert max(len(line) for line in out.splitlines()) <= 80
    assert "\x1b" not in out


def test_the_difference_is_that_of_the_levels_shown(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """And the edge of the band that the crew sheet prints is the edge that a crew is held to."""
    assert accept(written(tmp_path, LOW)) == 1
    rows = re.findall(r"(-?\d+\.\d) dBm +(-?\d+\.\d) dBm +([+-]\d+\.\d)", capsys.readouterr().out)
    assert len(rows) == 2
    for measured, expected, off in rows:
        assert float(measured) - float(expected) == pytest.approx(float(off), abs=1e-9)
    least = float(rows[0][1]) - 3.0
    for level, code in ((least, 0), (least - 0.1, 1)):
        text = re.sub(r'level = "[^"]*"', f'level = "{level:.1f} dBm"', GOOD)
        assert accept(written(tmp_path, text)) == code
    capsys.readouterr()


def test_a_table_says_the_same_as_json(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    table = "end,what,value\nA,level,-63.5 dBm\nB,level,-64 dBm\n"
    assert accept(written(tmp_path, table, "m.csv"), "--json") == 1
    found = json.loads(capsys.readouterr().out)
    assert found["accepted"] is False
    assert [one["verdict"] for one in found["directions"]] == ["not accepted", "not accepted"]
    assert found["causes"][0]["key"] == "side lobe"
    page = (Path(__file__).resolve().parents[2] / "docs" / "results.md").read_text(encoding="utf-8")
    keys = {*found, *found["directions"][0], *found["causes"][0], *found["path"]}
    assert [key for key in sorted(keys) if f"`{key}`" not in page] == []


@pytest.mark.parametrize(
    ("text", "link", "said"),
    [
        (GOOD.replace("level =", "levle ="), LINK, "m.toml, a: unknown key 'levle'"),
        (GOOD.replace('"-43.5 dBm"', '"43.5 dBm"'), LINK, "m.toml, a, level: 43.5 dBm is more than any link receives"),
        ("[measured]\n", LINK, "no level was read at either end"),
        (GOOD, "Beacon - East Point", "there is no link named 'Beacon - East Point'"),
    ],
)
def test_bad_input_ends_with_2_and_few_lines(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], text: str, link: str, said: str
) -> None:
    assert accept(written(tmp_path, text), link=link) == 2
    error = capsys.readouterr().err
    assert said in error
    assert len(unwrapped(error).splitlines()) <= 4


def test_one_of_measured_and_blank_is_asked_for(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main.run(["accept", SAMPLE, "--link", LINK]) == 2
    assert "give either --measured FILE or --blank FILE" in capsys.readouterr().err
    assert main.run(["accept", SAMPLE, "--blank", str(tmp_path / "m.toml")]) == 2
    assert "say which link was measured" in capsys.readouterr().err


def test_the_starter_is_written_once_and_never_over_a_file(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "m.toml"
    assert main.run(["accept", SAMPLE, "--link", LINK, "--blank", str(path)]) == 0
    text = path.read_text(encoding="utf-8")
    path.write_text("mine", encoding="utf-8")
    assert main.run(["accept", SAMPLE, "--link", LINK, "--blank", str(path)]) == 2
    assert path.read_text(encoding="utf-8") == "mine"
    capsys.readouterr()
    path.write_text(text.replace('# level = ""', 'level = "-42.5 dBm"', 2), encoding="utf-8")
    assert accept(path) == 0


def test_an_obstructed_link_has_no_level_to_accept_by(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert accept(written(tmp_path, GOOD), link="Harbour Office - Southdown Farm") == 1
    assert "CANNOT BE JUDGED" in capsys.readouterr().out


def test_the_report_holds_the_link_as_built(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert accept(written(tmp_path, LOW), "--out", str(tmp_path / "report")) == 1
    capsys.readouterr()
    results = json.loads((tmp_path / "report" / "results.json").read_text(encoding="utf-8"))
    held = [link for link in results["links"] if "as_built" in link]
    assert [link["name"] for link in held] == [LINK]
    assert held[0]["as_built"]["revision"] == "C, as built"
    page = (tmp_path / "report" / "link-06-beacon-west-point.html").read_text(encoding="utf-8")
    text = " ".join(unescape(re.sub(r"<[^>]+>", " ", re.sub(r"<style.*?</style>", " ", page, flags=re.DOTALL))).split())
    for said in ("As built", "Not accepted", "C, as built", "An antenna aimed by its first side lobe", "by N. <N>"):
        assert said in text, said
    other = (tmp_path / "report" / "link-08-beacon-school.html").read_text(encoding="utf-8")
    assert "C, as built" not in other
    assert "N. <N>" not in page


def test_the_example_of_the_docs_is_accepted(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    page = (Path(__file__).resolve().parents[2] / "docs" / "accept.md").read_text(encoding="utf-8")
    example = re.search(r"```toml\n(.*?)```", page, re.DOTALL)
    assert example is not None
    assert accept(written(tmp_path, example[1])) == 0
    assert "ACCEPTED AS BUILT" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("end", "said"),
    [
        ('height = "2 m above sea level"', "could not be worked out as built"),
        ('at = "36.2 N, 47.9 W"', "! the path could not be worked out as built"),
        ('at = "36.05936 N, 45.19309 W"\nheight = "0.5 m above ground"', "the path as built is"),
        ('power = "33 dBm"', "is planned"),
        ('bearing = 87.5\nbearing_is = "true"', "the two sheets or the two ends of the file are exchanged"),
        ('bearing = 280.6\nbearing_is = "true"', "it may be written down as true by mistake"),
        ('antenna = "dish 0.3 m, no. 7"', "another antenna was put up than planned"),
        ('polarization = "horizontal"', "the polarizations as mounted differ"),
        ('feeder_loss = "6 dB"', "feeders as measured lose more than planned"),
    ],
)
def test_what_was_measured_at_an_end_is_told(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], end: str, said: str
) -> None:
    assert accept(written(tmp_path, LOW.replace("[a]", f"[a]\n{end}"))) == 1
    out = capsys.readouterr().out
    assert said in " ".join(out.split())
    assert max(len(line) for line in out.splitlines()) <= 80
