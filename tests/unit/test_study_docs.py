"""The documentation of the study file agrees with the reader: its example loads, and every key is explained."""

import re
from pathlib import Path

import pytest

from fellspan.study.reading import read_study
from fellspan.study.schema import StudyFile, Table

PAGE = Path(__file__).resolve().parents[2] / "docs" / "study-file.md"

PANEL = "# frequency: 5.8 GHz\nplane,angle_deg,gain_dbi\n" + "".join(
    f"{plane},{angle},{10.0 if abs(angle) < 30 else -10.0}\n"
    for plane in ("azimuth", "elevation")
    for angle in range(-180, 180, 5)
)

RULES = """
[[rule]]
id = "own-11"
authority = "Tolmera"
region = "Tolmera"
title = "Fixed links"
band = ["10.7 GHz", "11.7 GHz"]
eirp_max = "55 dBm"
citation = "Notice 4"
seen = "2026"
status = "rule text seen"
"""


def tables(model: type[Table] = StudyFile) -> dict[str, type[Table]]:
    from fellspan.study import schema

    return {name: item for name, item in vars(schema).items() if isinstance(item, type) and issubclass(item, Table)}


def example() -> str:
    found = re.search(r"```toml\n(.*?)```", PAGE.read_text(encoding="utf-8"), re.DOTALL)
    assert found is not None
    return found[1]


def test_the_example_loads(tmp_path: Path) -> None:
    (tmp_path / "terrain" / "fine").mkdir(parents=True)
    for name in (
        "terrain/coarse.tif",
        "terrain/surface.tif",
        "terrain/trees.tif",
        "obstacles.csv",
        "survey-march.csv",
        "water.geojson",
    ):
        (tmp_path / name).touch()
    (tmp_path / "survey-april.csv").touch()
    (tmp_path / "panel.csv").write_text(PANEL, encoding="utf-8")
    (tmp_path / "own-antennas.toml").touch()
    (tmp_path / "own-rules.toml").write_text(RULES, encoding="utf-8")
    study = read_study(example(), path=tmp_path / "study.toml")
    assert [link.name for link in study.links] == ["Harbour - North Light", "Harbour - Quarry"]
    assert study.links[1].a.roof_edge_m == 4.0
    assert study.links[1].radio.high_end == "A"
    assert [link.power_rule and link.power_rule.id for link in study.links] == ["fcc-15.407-5g8", "own-11"]
    assert study.notes == ()
    assert all(end.pattern is not None for link in study.links for end in (link.antenna_a, link.antenna_b))


@pytest.mark.parametrize("name", sorted(tables()))
def test_every_key_is_explained(name: str) -> None:
    text = PAGE.read_text(encoding="utf-8")
    for key in tables()[name].model_fields:
        assert f"`{key}`" in text or f"[{key}]" in text or f"{{ name, k, {key} }}" in text, f"{name}.{key}"


def test_the_example_shows_every_key() -> None:
    """All but the alternatives that would contradict another key of the example."""
    shown = set(re.findall(r"\b([a-z_0-9]+) = ", example())) | set(
        re.findall(r"\[+(?:[a-z]+\.)?([a-z_]+)\]", example())
    )
    keys = {key for table in tables().values() for key in table.model_fields}
    left_out = keys - shown
    assert left_out == {
        *("preset", "median_k", "roof_edge_b", "parapet_a", "parapet_b", "diversity_a"),
        *(f"{key}_b" for key in ("feeder_loss", "feeder", "branching_loss", "radome_wet", "radome_iced", "sway")),
    }
