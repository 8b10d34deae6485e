"""Files of power rules: read as written, refused with file, row and remedy, and named in the documentation."""

import re
from pathlib import Path

import pytest

from fellspan.errors import RuleError
from fellspan.links.rule_types import BackOff, Density
from fellspan.links.rules import check_power, find_rule, load_rules
from fellspan.links.rules_file import read_rules, rules_of

PAGE = (Path(__file__).parents[2] / "docs" / "rules.md").read_text(encoding="utf-8")

ROW = """
[[rule]]
id = "tolmera-5g8"
authority = "Tolmera Radio Office"
region = "Tolmera"
title = "5.8 GHz"
band = ["5725 MHz", "5.875 GHz"]
citation = "Invented order 7"
seen = "2026-05-01"
status = "rule text seen"
eirp_max = "4 W"
"""


def written(tmp_path: Path, text: str, name: str = "own.toml") -> Path:
    file = tmp_path / name
    file.write_text(text, encoding="utf-8")
    return file


def test_own_rows_stand_after_those_that_come_with_fellspan(tmp_path: Path) -> None:
    rules = load_rules(written(tmp_path, "\ufeff" + ROW))
    assert rules[:-1] == load_rules()
    row = find_rule("tolmera-5g8", rules)
    assert (row.low_hz, row.high_hz, row.origin) == (5.725e9, 5.875e9, "own.toml")
    assert row.eirp_max_dbm == pytest.approx(36.0206, abs=1e-4)


def test_units_and_tables_become_si() -> None:
    extra = (
        'conducted_max = "1 W"\nback_off = { above = "6 dBi", lower_by_db = 1, for_each_db = 3, density = true }\n'
        'density = [{ power = "8 dBm", per = "3 kHz", of = "conducted" }]\n'
    )
    (row,) = rules_of(ROW + extra, name="own.toml")
    assert row.conducted_max_dbm == pytest.approx(30.0)
    assert row.back_off == BackOff(above_dbi=6.0, lower_by_db=1.0, for_each_db=3.0, density=True)
    assert row.densities == (Density(power_dbm=8.0, per_hz=3000.0, of="conducted"),)


def replaced(key: str, value: str) -> str:
    return re.sub(rf"(?m)^{key} = .*$", lambda _: f"{key} = {value}", ROW)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        (replaced("id", '"has space"'), ["row 1", "has space"]),
        (replaced("id", "7"), ["row 1", "id = 7"]),
        (replaced("authority", '""'), ["row 1 ('tolmera-5g8')", "authority"]),
        (replaced("title", '"bell \\u0007"'), ["title", "control"]),
        (replaced("title", '"' + "x" * 501 + '"'), ["title", "500"]),
        (replaced("band", '"5.8 GHz"'), ["band", "5.8 GHz"]),
        (replaced("band", '["5.8 GHz"]'), ["band", "1 ends"]),
        (replaced("band", '["5.9 GHz", "5.8 GHz"]'), ["band", "5.9 GHz"]),
        (replaced("band", '["5725", "5850"]'), ["band", "5725"]),
        (replaced("seen", '"lately"'), ["seen", "lately"]),
        (replaced("seen", '"not seen"'), ["not seen", "unconfirmed"]),
        (replaced("status", '"sure"'), ["status", "sure", "unconfirmed"]),
        (replaced("eirp_max", '"36"'), ["eirp_max", "36", "no unit"]),
        (replaced("eirp_max", '"36 dBi"'), ["eirp_max", "dBi"]),
        (replaced("eirp_max", "36"), ["eirp_max", "36"]),
        (re.sub("(?m)^eirp_max.*$", "", ROW), ["limits nothing"]),
        (re.sub("(?m)^citation.*$", "", ROW), ["citation", "missing"]),
        (ROW + 'eirp_maximum = "3 W"\n', ["eirp_maximum", "eirp_max"]),
        (ROW + 'place = "at sea"\n', ["place", "at sea"]),
        (ROW + 'use = "fun"\n', ["use", "fun"]),
        (ROW + 'conditions = "none"\n', ["conditions", "list"]),
        (ROW + 'gain_min = "30 dB"\n', ["gain_min", "30 dB"]),
        (ROW + 'density = { power = "8 dBm", per = "3 kHz", of = "eirp" }\n', ["density", "list"]),
        (ROW + 'density = [{ power = "8 dBm", per = "3 kHz" }]\n', ["density.of", "missing"]),
        (ROW + 'density = [{ power = "8 dBm", per = "0 kHz", of = "eirp" }]\n', ["density.per", "0 kHz"]),
        (ROW + 'density = [{ power = "8 dBm", per = "3 kHz", of = "port" }]\n', ["density.of", "port"]),
        (ROW + 'density = ["8 dBm"]\n', ["density", "8 dBm"]),
        (ROW + 'back_off = { above = "6 dBi", lower_by_db = 1, for_each_db = 3 }\n', ["back_off", "conducted_max"]),
        (
            ROW + 'conducted_max = "1 W"\nback_off = { above = "6 dBi", lower_by_db = 1, for_each_db = 0 }\n',
            ["back_off.for_each_db", "0"],
        ),
        (
            ROW + 'conducted_max = "1 W"\nback_off = { above = "6 dBi", lower_by_db = nan, for_each_db = 1 }\n',
            ["back_off.lower_by_db", "nan"],
        ),
        (
            ROW + 'eirp_fall = { below = "51 dBi", lower_by_db = 2, for_each_db = 1, floor = "40 dBm" }\n',
            ["floor", "40 dBm"],
        ),
        (
            ROW
            + 'peak_eirp_max = "39 dBm"\n'
            + 'eirp_fall = { below = "51 dBi", lower_by_db = 2, for_each_db = 1, floor = "30 dBm" }\n',
            ["peak_floor"],
        ),
        (ROW + ROW, ["row 2 ('tolmera-5g8')", "earlier"]),
        ("", ["no row"]),
        ("rule = 3\n", ["no row"]),
        ("title = 'x'\n" + ROW, ["title"]),
        ("[[rule]\n", ["TOML"]),
        ("a = " + "[" * 5000, ["TOML"]),
    ],
)
def test_what_is_wrong_is_said_with_file_row_and_value(tmp_path: Path, text: str, words: list[str]) -> None:
    with pytest.raises(RuleError) as caught:
        read_rules(written(tmp_path, text))
    message = str(caught.value)
    assert message.startswith("own.toml")
    assert all(word in message for word in words), message
    assert message.count("\n") <= 3


def test_the_id_of_a_shipped_row_is_taken(tmp_path: Path) -> None:
    with pytest.raises(RuleError, match=r"own\.toml, row 1 \('etsi-300328-2g4'\)"):
        load_rules(written(tmp_path, replaced("id", '"etsi-300328-2g4"')))


def test_files_that_cannot_be_read_are_named(tmp_path: Path) -> None:
    with pytest.raises(RuleError, match=r"absent\.toml"):
        read_rules(tmp_path / "absent.toml")
    with pytest.raises(RuleError, match="cannot be read"):
        read_rules(tmp_path)
    (tmp_path / "odd.toml").write_bytes(b"id = '\xff'")
    with pytest.raises(RuleError, match=r"odd\.toml: not a text file in UTF-8 \(byte 7\)"):
        read_rules(tmp_path / "odd.toml")
    with pytest.raises(RuleError, match=r"big\.toml: \d+ bytes"):
        read_rules(written(tmp_path, "#" * 2_000_001, "big.toml"))


def test_the_page_names_every_row_its_citation_and_its_status() -> None:
    lines = {line.split("|")[1].strip().strip("`"): line for line in PAGE.splitlines() if line.startswith("| `")}
    for row in load_rules():
        line = lines[row.id]
        assert row.citation in line
        assert row.band_words.replace(" to ", "-") in line
        assert ("unconfirmed" in line) == (row.status == "unconfirmed")


def test_the_page_names_every_key() -> None:
    from fellspan.links import rules_file

    keys = {*rules_file._REQUIRED, *rules_file._OPTIONAL}
    for required, optional in (rules_file._BACK_OFF, rules_file._EIRP_FALL, rules_file._DENSITY):
        keys |= {*required, *optional}
    assert [key for key in sorted(keys) if f"`{key}`" not in PAGE] == []


def test_the_example_of_the_page_is_read_and_used(tmp_path: Path) -> None:
    after = PAGE.split("`our_rules.toml`:\n\n", 1)[1].splitlines()
    end = next(i for i, line in enumerate(after) if line and not line.startswith("    "))
    file = written(tmp_path, "\n".join(line[4:] for line in after[:end]), "our_rules.toml")
    row = find_rule("tolmera-5g8-ptp", load_rules(file))
    check = check_power(row, frequency_hz=5.8e9, bandwidth_hz=20e6, power_dbm=20.0, gain_dbi=26.0)
    assert f"{check.highest_setting_dbm:.0f} dBm at the radio" in PAGE.split("`our_rules.toml`:")[1]
