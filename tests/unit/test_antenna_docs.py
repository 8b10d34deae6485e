"""The examples of docs/antennas.md are read by the code they describe, and its keys are those of the schema."""

import re
from pathlib import Path

import pytest

from fellspan.antennas.catalogue import load_catalogue
from fellspan.antennas.catalogue_schema import KINDS
from fellspan.antennas.facts import facts_of
from fellspan.antennas.files import parse_pattern
from fellspan.errors import AntennaError

PAGE = (Path(__file__).resolve().parents[2] / "docs" / "antennas.md").read_text(encoding="utf-8")


def block(language: str) -> str:
    found = re.search(rf"```{language}\n(.*?)```", PAGE, re.DOTALL)
    assert found is not None
    return found[1]


def test_the_pattern_file_of_the_page_reads() -> None:
    pattern = parse_pattern(block("csv"), file="panel.csv")
    facts = facts_of(pattern)
    assert (pattern.name, pattern.peak_gain_dbi) == ("Panel P", 16.0)
    assert facts.azimuth.half_power_deg == pytest.approx(30.0, abs=0.5)
    assert facts.elevation.half_power_deg == pytest.approx(22.0, abs=0.5)


def test_the_dense_beginning_is_right_but_for_its_missing_rows() -> None:
    with pytest.raises(AntennaError, match="even grid"):
        parse_pattern(block("text"), file="dense.csv")


def test_the_catalogue_of_the_page_reads_and_builds(tmp_path: Path) -> None:
    (tmp_path / "mine.toml").write_text(block("toml"), encoding="utf-8")
    catalogue = load_catalogue(tmp_path / "mine.toml")
    for name in ("hill dish", "harbour sector"):
        assert 15.0 < catalogue.find(name).pattern(5.5e9).peak_gain_dbi < 30.0


def test_every_key_of_every_kind_is_on_the_page() -> None:
    for kind, model in KINDS.items():
        assert kind in PAGE
        for key in model.model_fields:
            assert re.search(rf"\b{key}\b", PAGE), (kind, key)
