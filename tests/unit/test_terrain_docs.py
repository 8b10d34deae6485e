"""The examples of docs/terrain.md are read by the code, and its tables name every column."""

from pathlib import Path

import pytest

from fellspan.terrain.obstacle_files import ATTRIBUTES, read_obstacles
from fellspan.terrain.obstacle_shapes import PLACE_COLUMNS
from fellspan.terrain.survey import COLUMNS, read_survey

PAGE = (Path(__file__).parents[2] / "docs" / "terrain.md").read_text(encoding="utf-8")


def example(tmp_path: Path, name: str) -> Path:
    """The indented block that follows the file's name."""
    after = PAGE.split(f"`{name}`:\n\n", 1)[1].splitlines()
    end = next(i for i, line in enumerate(after) if not line.startswith("    "))
    file = tmp_path / name
    file.write_text("\n".join(line[4:] for line in after[:end]) + "\n", encoding="utf-8")
    return file


def test_the_obstacle_table_is_read_as_described(tmp_path: Path) -> None:
    obstacles, datums, notes = read_obstacles(example(tmp_path, "things.csv"))
    assert [(thing.name, thing.kind, thing.rule) for thing in obstacles] == [
        ("Old spruce", "tree", "level"),
        ("Quay crane", "other", "level"),
        ("Shore road", "other", "follow"),
        ("Fairway", "other", "sea"),
    ]
    assert (obstacles[2].height_m, obstacles[3].top_amsl_m, obstacles[3].width_m) == (5.0, 34.0, 300.0)
    assert (datums, notes) == ((), ())


def test_the_obstacle_features_are_read_as_described(tmp_path: Path) -> None:
    obstacles, _, _ = read_obstacles(example(tmp_path, "things.geojson"))
    assert [(thing.name, thing.kind, thing.rule) for thing in obstacles] == [
        ("Net loft", "building", "level"),
        ("Line to the mill", "other", "span"),
    ]
    assert (obstacles[1].heights_m, obstacles[1].sag_m) == ((14.0, 16.0, 14.0), 3.0)


def test_the_survey_is_read_as_described(tmp_path: Path) -> None:
    rows = read_survey(example(tmp_path, "walk.csv")).rows
    assert [(row.distance_m, row.top_m, row.kind) for row in rows] == [
        (1180.0, 62.1, "none"),
        (1194.0, 75.9, "tree"),
        (1210.0, 64.0, "none"),
    ]


@pytest.mark.parametrize("column", sorted({*ATTRIBUTES, *PLACE_COLUMNS, *COLUMNS}))
def test_every_column_is_described(column: str) -> None:
    assert f"`{column}`" in PAGE
