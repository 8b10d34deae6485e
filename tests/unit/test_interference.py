"""Neighbours inside a study: levels worked out by hand, shielding, leaving out, what stands together at a site."""

import json
import math
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from exports_made_plan import made_plan
from made_neighbours import (
    K,
    at_one_mast,
    east_north,
    free_space,
    planned,
    radio,
    receiver,
    replace_radio,
    study,
    two_parallel,
)
from made_terrain import at, raster

from fellspan.exports.results_json import results_dict
from fellspan.geodesy import geodesic
from fellspan.links.budget import tilt_deg
from fellspan.links.coupling import elevation_deg, polarization_coupling_loss_db
from fellspan.links.neighbour_words import receiver_caution
from fellspan.links.site import Aim
from fellspan.links.stations import overlap_db
from fellspan.propagation import threshold_degradation_db
from fellspan.terrain.terrain import Terrain


def test_two_parallel_links_as_worked_out_by_hand() -> None:
    """5 km side by side, 500 m apart: 5.711 degrees off both beams, 12 (5.711 / 6)^2 = 10.87 dB each."""
    found = study(*two_parallel())
    heard = receiver(found, "South", "B")
    first = heard.interferers[0]
    assert (first.link, first.site, first.end) == ("North", "North west", "A")
    off = math.degrees(math.atan2(500.0, 5_000.0))
    gain = 30.0 - 12.0 * (off / 6.0) ** 2
    slant = math.hypot(5_000.0, 500.0)
    level = 20.0 + 2.0 * gain - free_space(slant, 6e9)
    assert first.level_dbm == pytest.approx(level, abs=0.01)
    assert first.c_i_db == pytest.approx(-50.0 - level, abs=0.01)
    assert first.transmit_gain_dbi == pytest.approx(gain, abs=0.005)
    assert first.receive_gain_dbi == pytest.approx(gain, abs=0.005)
    assert first.distance_m == pytest.approx(slant, abs=0.5)
    assert first.bearing_deg == pytest.approx(270.0 + off, abs=0.05)
    # The near neighbour, 500 m abeam and 40 dB down at both ends, is the only other one.
    beside = heard.interferers[1]
    assert beside.site == "North east"
    assert beside.level_dbm == pytest.approx(20.0 - 10.0 - 10.0 - free_space(500.0, 6e9), abs=0.01)
    both = 10.0 * math.log10(10.0 ** (first.level_dbm / 10.0) + 10.0 ** (beside.level_dbm / 10.0))
    assert heard.interference_dbm == pytest.approx(both, abs=1e-9)
    assert heard.c_i_db == pytest.approx(-50.0 - both, abs=1e-9)
    # Noise in 20 MHz at 290 K: -100.96 dBm (hand), and 6 dB noise figure.
    assert heard.noise_dbm == pytest.approx(-94.96, abs=0.01)
    worse = 10.0 * math.log10(1.0 + 10.0 ** ((both + 94.965) / 10.0))
    assert heard.threshold_degradation_db == pytest.approx(worse, abs=0.01)
    assert heard.effective_margin_db == pytest.approx(30.0 - worse, abs=0.01)


@pytest.mark.parametrize(("over_noise_db", "expected_db"), [(-10.0, 0.414), (-6.0, 0.973), (-3.0, 1.764), (0.0, 3.010)])
def test_degradation_by_interference(over_noise_db: float, expected_db: float) -> None:
    """10 log10(1 + I/N), worked out by hand."""
    assert threshold_degradation_db(-95.0 + over_noise_db, noise_dbm=-95.0) == pytest.approx(expected_db, abs=0.0006)


def test_the_path_is_the_same_both_ways() -> None:
    one, other = two_parallel()
    found = study(one, replace_radio(other, power_dbm=20.0))
    there, back = receiver(found, "South", "B"), receiver(found, "North", "A")
    level = next(i for i in there.interferers if i.site == "North west")
    turned = next(i for i in back.interferers if i.site == "South east")
    assert level.level_dbm == pytest.approx(turned.level_dbm, abs=1e-12)
    assert (level.distance_m, level.free_space_db) == (turned.distance_m, turned.free_space_db)


def crossed(given):
    link, result = given
    antenna = replace(link.antenna_a, mounting=Aim(polarization="horizontal"))
    return replace(link, antenna_a=antenna, antenna_b=antenna), result


def test_the_other_polarization_couples_by_the_leaks_of_both() -> None:
    """30 dB each, added in phase: 10^(-30/20) twice is 6.02 dB more, 23.98 dB (FORMULAS, combined discrimination)."""
    one, other = two_parallel()
    same = receiver(study(one, other), "South", "B").interferers[0]
    turned = receiver(study(one, crossed(other)), "South", "B").interferers[0]
    assert turned.polarization_db == pytest.approx(23.979, abs=0.001)
    assert same.level_dbm - turned.level_dbm == pytest.approx(23.979, abs=0.001)
    assert same.polarization_db == pytest.approx(0.0, abs=1e-9)


def test_polarization_at_its_limits() -> None:
    # 45 degrees of perfect antennas: half the power.
    assert polarization_coupling_loss_db(45.0, 200.0, 200.0) == pytest.approx(3.0103, abs=1e-3)
    # In a null of the co-polar pattern the cross-polar ones of both carry more.
    assert polarization_coupling_loss_db(0.0, -10.0, -5.0) == pytest.approx(-15.0, abs=1e-9)
    assert polarization_coupling_loss_db(0.0, 30.0, 30.0) == pytest.approx(0.0, abs=1e-12)


@pytest.mark.parametrize(
    ("sent", "heard", "expected_db"),
    [
        ((6.00e9, 20e6), (6.00e9, 20e6), 0.0),
        ((6.01e9, 20e6), (6.00e9, 20e6), -3.0103),  # half of it
        ((6.00e9, 40e6), (6.00e9, 20e6), -3.0103),  # half of a wide one falls into a narrow receiver
        ((6.00e9, 20e6), (6.00e9, 40e6), 0.0),  # all of a narrow one into a wide receiver
        ((6.015e9, 20e6), (6.00e9, 20e6), -6.0206),  # a quarter
        ((6.02e9, 20e6), (6.00e9, 20e6), None),  # side by side
        ((6.00e9, None), (6.00e9, 20e6), 0.0),
        ((6.00001e9, None), (6.00e9, None), 0.0),
        ((6.001e9, None), (6.00e9, 20e6), None),
    ],
)
def test_overlap_of_channels(sent: tuple, heard: tuple, expected_db: float | None) -> None:
    found = overlap_db(*sent, *heard)
    assert found is None if expected_db is None else found == pytest.approx(expected_db, abs=1e-4)


def test_overlap_counts_in_the_level_and_channels_apart_do_not_hear_each_other() -> None:
    one, other = two_parallel()
    full = receiver(study(one, other), "South", "B").interferers[0].level_dbm
    half = receiver(study(one, replace_radio(other, frequency_hz=6.01e9)), "South", "B").interferers[0]
    shift = 20.0 * math.log10(6.01 / 6.0)  # free space at the higher frequency
    assert half.level_dbm == pytest.approx(full - 3.0103 - shift, abs=1e-3)
    apart = study(one, replace_radio(other, frequency_hz=6.02e9))
    assert all(not result.interferers and result.threshold_degradation_db == 0.0 for result in apart.receivers)
    assert apart.worst is None


def test_frequency_division_hears_only_what_is_sent_on_its_own_receive_channel() -> None:
    pair = radio(duplex="frequency", frequency_a_hz=6.1e9, frequency_b_hz=5.9e9)
    found = study(*two_parallel(own_radio=pair))
    assert {one.site for one in receiver(found, "South", "B").interferers} == {"North west"}
    assert {one.site for one in receiver(found, "South", "A").interferers} == {"North east"}


def test_without_a_channel_width_no_rise_of_the_threshold_is_made_up() -> None:
    found = study(*two_parallel(own_radio=radio(bandwidth_hz=None)))
    heard = receiver(found, "South", "B")
    assert heard.c_i_db is not None
    assert heard.threshold_degradation_db is None
    assert heard.effective_margin_db is None
    assert any("No channel width is stated" in note for note in found.notes)


def test_elevations_agree_with_the_tilt_of_a_link() -> None:
    expected = tilt_deg(distance_m=12_000.0, from_amsl_m=30.0, to_amsl_m=140.0, k=K)
    assert float(elevation_deg(12_000.0, 110.0, k=K)) == pytest.approx(expected, abs=1e-9)
    assert float(elevation_deg(0.0, 3.0, k=K)) == 90.0


def ridge(folder: Path, *, height_m: float = 120.0, hole: bool = False) -> Path:
    heights = np.full((300, 600), 0.0, dtype=np.float32)
    heights[100:250, 280:290] = height_m
    if hole:
        heights[100:250, 280:290] = -9999.0
    return raster(folder / "ground.tif", heights)


def across_a_ridge():
    """The southern link lies north of the ridge and does not see it; what comes from the other one crosses it."""
    return (
        planned("One", at(300.0, 500.0), at(1_200.0, 500.0)),
        planned("Two", at(5_500.0, 2_000.0), at(4_000.0, 2_000.0), heights_m=(60.0, 90.0)),
    )


def test_a_ridge_shields(tmp_path: Path) -> None:
    links = across_a_ridge()
    with Terrain.open(ground=ridge(tmp_path)) as terrain:
        behind = study(*links, terrain=terrain, prune=False)
    free = study(*links)
    shielded = next(i for i in receiver(behind, "Two", "B").interferers if i.site == "One west")
    open_sea = next(i for i in receiver(free, "Two", "B").interferers if i.site == "One west")
    assert shielded.path == "terrain"
    assert shielded.diffraction_db is not None
    assert shielded.diffraction_db > 20.0
    assert open_sea.level_dbm - shielded.level_dbm == pytest.approx(shielded.diffraction_db, abs=1e-9)
    back = next(i for i in receiver(behind, "One", "A").interferers if i.site == "Two east")
    assert back.diffraction_db == shielded.diffraction_db


def test_over_a_gap_of_the_terrain_free_space_counts_and_is_said(tmp_path: Path) -> None:
    with Terrain.open(ground=ridge(tmp_path, hole=True)) as terrain:
        found = study(*across_a_ridge(), terrain=terrain, prune=False)
    over = next(i for i in receiver(found, "Two", "B").interferers if i.site == "One west")
    assert (over.path, over.diffraction_db) == ("no terrain", None)
    assert any("gap of the terrain" in note for note in found.notes)


def many(count: int):
    """Links strewn over the raster, one seed, all on one channel."""
    rng = np.random.default_rng(4)
    links = []
    for number in range(count):
        east, south = rng.uniform(300.0, 5_500.0), rng.uniform(300.0, 2_600.0)
        links.append(
            planned(
                f"L{number}", at(east, south), at(float(rng.uniform(300.0, 5_500.0)), float(rng.uniform(300.0, 2_600.0))),
                own_radio=radio(power_dbm=float(rng.uniform(-20.0, 20.0))),
            )
        )  # fmt: skip
    return links


def test_leaving_out_the_weak_changes_nothing_that_matters(tmp_path: Path) -> None:
    links = many(8)
    with Terrain.open(ground=ridge(tmp_path, height_m=60.0)) as terrain:
        asked = []
        profiles = terrain.profiles

        def counting(pairs, **more):
            asked.append(len(pairs))
            return profiles(pairs, **more)

        terrain.profiles = counting  # type: ignore[method-assign]
        fast = study(*links, terrain=terrain)
        few = sum(asked)
        asked.clear()
        full = study(*links, terrain=terrain, prune=False)
    assert few < sum(asked)
    for result in full.receivers:
        same = receiver(fast, result.link, result.end)
        assert same.threshold_degradation_db == pytest.approx(result.threshold_degradation_db, abs=0.05)
        strong = [i for i in result.interferers if i.level_dbm > (result.noise_dbm or 0.0) - 10.0]
        assert same.interferers[: len(strong)] == tuple(strong)
    assert fast.worst == full.worst


def test_the_worst_pair_comes_first_and_is_named() -> None:
    one, other = two_parallel(apart_m=200.0)
    third = planned("Far", east_north(0.0, 9_000.0), east_north(5_000.0, 9_000.0))
    found = study(third, one, other)
    assert found.worst is not None
    assert "'North west' of 'North'" in found.worst or "'South west' of 'South'" in found.worst
    assert {found.receivers[0].link, found.receivers[1].link} <= {"South", "North"}
    assert found.receivers[-1].link == "Far"
    caution = receiver_caution(found.receivers[0])
    assert caution is not None
    assert "raise the threshold" in caution
    assert receiver_caution(found.receivers[-1]) is None


def test_power_that_is_not_stated_is_no_silence() -> None:
    one, other = two_parallel()
    found = study(one, replace_radio(other, power_dbm=None))
    assert receiver(found, "South", "B").interferers == ()
    assert any("'North'" in note and "not counted" in note for note in found.notes)


def test_many_links_at_once_take_no_terrain_twice(tmp_path: Path) -> None:
    links = many(40)
    with Terrain.open(ground=raster(tmp_path / "flat.tif", 0.0)) as terrain:
        asked = []
        profiles = terrain.profiles

        def counting(pairs, **more):
            asked.extend(frozenset((p.latitude_deg, p.longitude_deg) for p in pair) for pair in pairs)
            return profiles(pairs, **more)

        terrain.profiles = counting  # type: ignore[method-assign]
        found = study(*links, terrain=terrain)
    assert len(asked) == len(set(asked)) <= 400
    assert len(found.receivers) == 80


def test_bearings_are_those_of_the_geodesic() -> None:
    one, other = two_parallel()
    first = receiver(study(one, other), "South", "B").interferers[0]
    way = geodesic.inverse(one[0].b.position, other[0].a.position)
    assert first.bearing_deg == pytest.approx(way.bearing_ab_deg, abs=1e-9)


def keys_of(value: object) -> set[str]:
    if isinstance(value, dict):
        return set(value).union(*(keys_of(inner) for inner in value.values()))
    return set().union(*(keys_of(inner) for inner in value)) if isinstance(value, list) else set()


def test_every_key_is_explained_in_the_docs_and_json_can_hold_it() -> None:
    found = study(*at_one_mast(low_first=True, heights=(30.0, 30.5)))
    assert found.high_low
    assert found.near
    plain = results_dict(replace(made_plan(), interference=found))["interference"]
    json.dumps(plain, allow_nan=False)
    page = (Path(__file__).resolve().parents[2] / "docs" / "results.md").read_text(encoding="utf-8")
    part = page[page.index("### `interference`") : page.index("### an entry of `failures`")]
    assert sorted(key for key in keys_of(plain) if f"`{key}`" not in part) == []
