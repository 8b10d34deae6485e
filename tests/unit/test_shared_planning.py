"""Work shared between processes: the same answers in the same order, whoever did it, and when one is lost."""

import dataclasses
import os
from pathlib import Path

import numpy as np
import pytest
from made_terrain import at, raster

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.exports.folder import report_files
from fellspan.links.radio import Radio
from fellspan.links.site import Antenna, Link, Site
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.planning.planner import plan_study
from fellspan.planning.processes import MANY, shared_work
from fellspan.terrain.sources import RasterSource

COUNT = MANY + 1


def many_links(folder: Path) -> Study:
    """Links from one place over rough ground; one that has no ground at its end; antennas with patterns."""
    import datetime as dt

    rng = np.random.default_rng(3)
    file = raster(folder / "ground.tif", rng.normal(20.0, 6.0, (60, 80)), cell_m=30.0)
    pattern = from_data_sheet(
        name="dish",
        frequency_hz=5.8e9,
        gain_dbi=25.0,
        azimuth_width_deg=9.0,
        elevation_width_deg=9.0,
        front_to_back_db=30.0,
    )
    dish = Antenna(pattern=pattern)
    radio = Radio(name="radio", frequency_hz=5.8e9)
    hub = Site(name="Hub", position=at(200.0, 200.0), height_m=20.0)
    links = [
        Link(
            name=f"Hub - {number}",
            a=hub,
            b=Site(name=str(number), position=at(900.0 + 40.0 * number, 300.0 + 30.0 * number), height_m=10.0),
            radio=radio,
            antenna_a=dish,
            antenna_b=dish,
        )
        for number in range(COUNT - 1)
    ]
    nowhere = Site(name="Nowhere", position=at(9_000.0, 300.0), height_m=10.0)
    links.append(Link(name="Hub - Nowhere", a=hub, b=nowhere, radio=radio))
    return Study(
        title="Many",
        links=tuple(links),
        terrain=TerrainInputs(ground=(RasterSource(path=file),)),
        date=dt.date(2026, 5, 1),
    )


@pytest.mark.slow
@pytest.mark.timeout(600)
def test_two_processes_plan_and_write_what_one_does_byte_for_byte(tmp_path: Path) -> None:
    study = many_links(tmp_path)
    told: list[str] = []
    one = plan_study(study, what_if=True)
    two = plan_study(study, what_if=True, processes=2, progress=lambda done, count, name: told.append(name))
    assert told[: len(study.links)] == [link.name for link in study.links]
    assert [failure.link.name for failure in two.failures] == ["Hub - Nowhere"]
    assert str(two.failures[0].error) == str(one.failures[0].error)
    assert all(plan.link is link for plan, link in zip(two.links, study.links, strict=False))
    assert not two.links[0].profile.ground_m.flags.writeable
    assert report_files(two, processes=2) == report_files(one)


def _prepared(given: tuple[int, int]) -> tuple[int, int]:
    return given


def _who(state: tuple[int, int], number: int) -> tuple[int, int]:
    parent, fatal = state
    if number == fatal and os.getpid() != parent:
        os._exit(9)
    return number, os.getpid()


@pytest.mark.timeout(120)
def test_a_lost_process_loses_nothing() -> None:
    done = list(shared_work(_prepared, _who, (os.getpid(), MANY // 2), count=2 * MANY, processes=2))
    assert [number for number, _ in done] == list(range(2 * MANY))
    others = {process for _, process in done} - {os.getpid()}
    assert others, "nothing was shared"
    assert done[-1][1] == os.getpid()


def test_few_items_stay_here() -> None:
    assert {process for _, process in shared_work(_prepared, _who, (0, -1), count=MANY - 1, processes=2)} == {
        os.getpid()
    }


def test_a_plan_says_the_same_whatever_is_asked_besides(tmp_path: Path) -> None:
    study = many_links(tmp_path)
    study = dataclasses.replace(study, links=study.links[:2])
    assert [link.result for link in plan_study(study, what_if=True).links] == [
        link.result for link in plan_study(study, processes=2).links
    ]
