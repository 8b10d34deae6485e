"""A browser for the tests of pages, and reports written once a session."""

import os
from dataclasses import dataclass
from pathlib import Path

import pytest
from synthetic_plans import TOLMERA, make_study, write_island
from watched_browser import ARGUMENTS, CHROMIUM, watching

from fellspan.geodesy.position import Position
from fellspan.planning.plan import StudyPlan
from fellspan.planning.planner import plan_study
from fellspan.report.pages import render_pages
from fellspan.study.reading import load_study

ANTIMERIDIAN = Position(latitude_deg=36.05, longitude_deg=179.99)
TILES_URL = "https://tiles.invalid/{z}/{x}/{y}.png"


@dataclass(frozen=True, kw_only=True)
class Report:
    """A plan and the folder its pages stand in."""

    plan: StudyPlan
    folder: Path
    texts: dict[str, str]

    @property
    def main_pages(self) -> list[str]:
        """File names of the overview and of the pages of links; crew sheets have tests of their own."""
        return [name for name in self.texts if not name.startswith("crew-")]

    @property
    def link_pages(self) -> list[Path]:
        """Pages of the links, in the order of the plan."""
        return [self.folder / name for name in self.main_pages[1:]]


def _write(folder: Path, plan: StudyPlan) -> Report:
    texts = render_pages(plan)
    for name, text in texts.items():
        (folder / name).write_text(text, encoding="utf-8", newline="\n")
    return Report(plan=plan, folder=folder, texts=texts)


@pytest.fixture(scope="session")
def island(tmp_path_factory):
    """A raster of the invented island."""
    return write_island(tmp_path_factory.mktemp("land") / "island.tif", at=TOLMERA)


@pytest.fixture(scope="session")
def plain(tmp_path_factory, island):
    """An ordinary report."""
    return _write(tmp_path_factory.mktemp("plain"), make_study(island, at=TOLMERA))


@pytest.fixture(scope="session")
def hostile(tmp_path_factory, island):
    """A report of which every name is an attack or an accident."""
    return _write(tmp_path_factory.mktemp("hostile"), make_study(island, at=TOLMERA, hostile=True))


@pytest.fixture(scope="session")
def tiled(tmp_path_factory, island):
    """A report that may show online tiles."""
    return _write(tmp_path_factory.mktemp("tiled"), make_study(island, at=TOLMERA, tiles_url=TILES_URL))


@pytest.fixture(scope="session")
def antimeridian(tmp_path_factory):
    """A report of links on both sides of 180 degrees."""
    raster = write_island(tmp_path_factory.mktemp("far") / "island.tif", at=ANTIMERIDIAN)
    return _write(tmp_path_factory.mktemp("antimeridian"), make_study(raster, at=ANTIMERIDIAN))


@pytest.fixture(scope="session")
def sample(tmp_path_factory):
    """The report of the sample study, planned by the engine."""
    study = load_study(Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml")
    return _write(tmp_path_factory.mktemp("sample"), plan_study(study, what_if=True))


@pytest.fixture(scope="session")
def browser():
    """Chromium; where there is none the test is skipped, but not in CI."""
    if not CHROMIUM.exists() and os.environ.get("CI") != "true":
        pytest.skip(f"{CHROMIUM} is not installed")
    from playwright.sync_api import sync_playwright

    with sync_playwright() as play:
        started = play.chromium.launch(executable_path=CHROMIUM, args=ARGUMENTS)
        yield started
        started.close()


@pytest.fixture
def watch(browser):
    """`watching` for one test."""
    with watching(browser) as opened:
        yield opened
