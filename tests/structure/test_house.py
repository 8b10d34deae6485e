"""The house keeps its shape: rooms import only rooms above them, files stay short, nothing stands where it should not."""

import ast
import re
import subprocess
import tomllib
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
PACKAGE = ROOT / "src" / "fellspan"

ROOMS = (
    "errors",
    "vocabulary",
    "showing",
    "quantities",
    "propagation",
    "antennas",
    "geodesy",
    "terrain",
    "climate",
    "links",
    "design",
    "screening",
    "planning",
    "runs",
    "study",
    "report",
    "exports",
    "cli",
)
"""Base first: a room imports only rooms that stand before it. docs/architecture.md shows the same list."""

WIDEST_FILE = 400


def tracked(*patterns: str) -> list[Path]:
    listed = subprocess.run(
        ["git", "ls-files", "--cached", "--others", "--exclude-standard", *patterns],
        cwd=ROOT,
        check=True,
        capture_output=True,
        text=True,
    ).stdout.split("\n")
    return [ROOT / name for name in listed if name and (ROOT / name).exists()]


def rooms_imported(path: Path) -> Iterator[str]:
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        names: list[str] = []
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            if node.level:
                pytest.fail(f"{path.name} imports relatively, line {node.lineno}")
            names = [node.module or ""]
            if node.module == "fellspan":
                names = [f"fellspan.{alias.name}" for alias in node.names]
        for name in names:
            parts = name.split(".")
            if parts[0] == "fellspan" and len(parts) > 1 and parts[1] != "__version__":
                yield parts[1]


def test_rooms_import_only_rooms_above_them() -> None:
    wrong = []
    for path in PACKAGE.rglob("*.py"):
        room = path.relative_to(PACKAGE).parts[0].removesuffix(".py")
        if room in ("__init__", "__main__"):
            continue
        assert room in ROOMS, f"{room} is not a room of docs/architecture.md"
        for other in rooms_imported(path):
            if ROOMS.index(other) > ROOMS.index(room):
                wrong.append(f"{path.relative_to(PACKAGE)} imports {other}")
    assert not wrong, wrong


@pytest.mark.parametrize("base", ["propagation", "antennas"])
def test_physics_knows_nothing_of_terrain_files_or_links(base: str) -> None:
    allowed = {"errors", "vocabulary", "quantities", "propagation", base}
    for path in (PACKAGE / base).rglob("*.py"):
        assert set(rooms_imported(path)) <= allowed, path


def test_architecture_page_lists_the_rooms_in_order() -> None:
    text = (ROOT / "docs" / "architecture.md").read_text(encoding="utf-8")
    places = [
        text.index(f"`{room}`") for room in ROOMS if (PACKAGE / room).exists() or (PACKAGE / f"{room}.py").exists()
    ]
    assert places == sorted(places)


def test_no_file_is_longer_than_the_limit() -> None:
    long = {
        str(path.relative_to(ROOT)): lines
        for path in tracked("*.py", "*.js", "*.css", "*.j2", "*.toml")
        if (lines := len(path.read_text(encoding="utf-8").splitlines())) > WIDEST_FILE
    }
    assert not long, long


def test_each_room_says_what_it_is_for() -> None:
    for path in PACKAGE.rglob("*.py"):
        text = path.read_text(encoding="utf-8")
        assert ast.get_docstring(ast.parse(text)), f"{path.relative_to(ROOT)} does not open with what it is for"


def test_only_the_agreed_names_stand_at_the_top() -> None:
    allowed = {"pyproject.toml", "README.md", "LICENSE", "DEVELOPERS.md", "src", "tests", "sample_terrain", "docs"}
    top = {path.relative_to(ROOT).parts[0] for path in tracked()}
    assert {name for name in top if not name.startswith(".")} <= allowed


def test_the_sample_holds_exactly_one_study() -> None:
    assert len(list((ROOT / "sample_terrain").glob("*.toml"))) == 1


def test_version_is_said_once_and_the_same() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    found = re.search(r'__version__ = "(.+)"', (PACKAGE / "__init__.py").read_text(encoding="utf-8"))
    assert found is not None
    assert found[1] == project["version"]
