"""Several hundred pairs over the sample islands, as arrays and by planning, and some against the plan of a study of them."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from made_screening import assert_as_planned, every_pair, one_by_one

import fellspan.screening.screen as screen
from fellspan import load_study
from fellspan.planning.inputs import Study
from fellspan.planning.planner import open_terrain, plan_study, settings_of
from fellspan.screening.columns import Columns
from fellspan.screening.pairs import HEIGHT_REFERENCES, PATH_VERDICTS, SIGNAL_VERDICTS, Candidates, Sector, SiteColumns
from fellspan.screening.screen import screen_pairs
from fellspan.screening.single import link_of
from fellspan.terrain.terrain import Terrain

pytestmark = pytest.mark.slow

SAMPLE = Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml"


def sites(letter: str, count: int, *, seed: int, height_m: float) -> SiteColumns:
    random = np.random.default_rng(seed)
    return SiteColumns(
        name=tuple(f"{letter}{number}" for number in range(count)),
        latitude_deg=random.uniform(36.005, 36.085, count),
        longitude_deg=random.uniform(-45.26, -45.13, count),
        height_m=random.uniform(0.5, 1.5, count) * height_m,
        height_reference=np.zeros(count, dtype=np.int8),
        roof_m=np.full(count, np.nan),
    )


def made(study: Study, hubs: int, places: int) -> Candidates:
    link = study.links[6]  # from the sector of the Beacon
    aims = (link.antenna_a, replace(link.antenna_a, mounting=None))
    return Candidates(
        hubs=sites("H", hubs, seed=1, height_m=25.0),
        places=sites("P", places, seed=2, height_m=10.0),
        sectors=tuple(
            Sector(hub=hub, name=f"sector {number}", antenna=antenna)
            for hub in range(hubs)
            for number, antenna in enumerate(aims[: 1 + hub % 2])
        ),
        place_antenna=link.antenna_b,
        radio=link.radio,
        settings=settings_of(study),
        target_availability_percent=99.99,
        growth_years=study.growth_years,
    )


@pytest.fixture(scope="module")
def study() -> Study:
    return load_study(SAMPLE)


def test_rasters_and_sea(study: Study) -> None:
    bare = replace(study, terrain=replace(study.terrain, obstacles=(), survey=()))
    pairs = made(bare, 4, 75)
    hub, place = every_pair(pairs)
    with open_terrain(bare) as terrain:
        found = screen_pairs(pairs, hub=hub, place=place, terrain=terrain)
        assert_as_planned(found, one_by_one(pairs, hub, place, terrain))
    assert set(found.verdict[found.status == 0].tolist()) == {0, 1, 2}


def test_everything_that_the_sample_holds(study: Study) -> None:
    pairs = made(study, 2, 40)
    hub, place = every_pair(pairs)
    with open_terrain(study) as terrain:
        found = screen_pairs(pairs, hub=hub, place=place, terrain=terrain)
        assert_as_planned(found, one_by_one(pairs, hub, place, terrain))


def test_places_all_over_the_town(study: Study, monkeypatch: pytest.MonkeyPatch) -> None:
    """Outlines, streets with traffic, cranes, ships and a power line: two hundred pairs, a third of the places on roofs."""
    pairs = made(study, 2, 100)
    random = np.random.default_rng(3)
    pairs.places.latitude_deg[:] = random.uniform(36.030, 36.042, 100)
    pairs.places.longitude_deg[:] = random.uniform(-45.175, -45.150, 100)
    pairs.places.height_reference[::3] = HEIGHT_REFERENCES.index("roof")
    pairs.places.roof_m[::3] = random.uniform(4.0, 16.0, 34)
    pairs.hubs.latitude_deg[:], pairs.hubs.longitude_deg[:] = (36.035368, 36.026), (-45.163227, -45.19)
    pairs.hubs.height_m[:] = 20.0, 30.0
    pairs.hubs.height_reference[0] = HEIGHT_REFERENCES.index("roof")
    alone: list[int] = []
    single = screen.screen_single

    def counted(candidates: Candidates, columns: Columns, row: int, *, terrain: Terrain) -> None:
        alone.append(row)
        single(candidates, columns, row, terrain=terrain)

    monkeypatch.setattr(screen, "screen_single", counted)
    hub, place = every_pair(pairs)
    with open_terrain(study) as terrain:
        found = screen_pairs(pairs, hub=hub, place=place, terrain=terrain)
        assert not alone
        assert_as_planned(found, one_by_one(pairs, hub, place, terrain))
    assert set(found.verdict.tolist()) == {0, 1, 2}


def test_against_the_plan_of_a_study_of_the_pairs(study: Study) -> None:
    pairs = made(study, 2, 8)
    hub, place = every_pair(pairs)
    with open_terrain(study) as terrain:
        found = screen_pairs(pairs, hub=hub, place=place, terrain=terrain)
    for row in range(hub.size):
        if found.status[row]:
            continue
        link = link_of(pairs, int(hub[row]), int(found.sector[row]), int(place[row]))
        plan = plan_study(replace(study, links=(link,)))
        result = plan.links[0].result
        governing = result.clearance[result.governing]
        assert PATH_VERDICTS[found.verdict[row]] == result.verdict
        assert SIGNAL_VERDICTS[found.signal_verdict[row]] == result.signal_verdict
        assert found.worst_fraction[row] == pytest.approx(governing.worst_fraction, abs=1e-6)
        assert found.worst_at_m[row] == pytest.approx(governing.worst_at_m, abs=1e-5)
        assert found.diffraction_db[row] == pytest.approx(result.losses_db.diffraction, abs=1e-6)
        assert found.margin_at_place_db[row] == pytest.approx(result.margin_db.at_b, abs=1e-6)
        assert found.availability_percent[row] == pytest.approx(result.availability_percent.year, abs=1e-6)
