"""What the script of a link page is fed: every point that could govern, what grows, and no text that breaks out of it."""

import dataclasses
import json
from pathlib import Path

import numpy as np
import pytest

from fellspan.exports.results_json import results_text
from fellspan.links import clearance
from fellspan.links.assess import assess_in_full, stood
from fellspan.links.criteria import Criterion
from fellspan.planning.planner import open_terrain, plan_study, settings_of
from fellspan.planning.what_if import PARTS, what_if_of
from fellspan.report.whatif import script_json, what_if_data
from fellspan.report.wording import clean
from fellspan.study.reading import load_study

STUDY = Path(__file__).parents[2] / "sample_terrain" / "tolmera.toml"


def unpacked(data):
    """Distances, levels and the runs of a payload."""
    points = data["points"]
    x, s = np.cumsum(points["x"]) / 1e3, np.cumsum(points["s"]) / 1e4
    x[-1] = data["length"]

    def spread(turns):
        out = np.zeros(x.size, dtype=int)
        for start, value in zip(turns[::2], turns[1::2], strict=True):
            out[start:] = value
        return out

    return x, s, spread(points["what"]), spread(points["rate"]), spread(points["tree"]).astype(bool)


def payload(report, link):
    return json.loads(what_if_data(report.plan, link))


def least_and_extra(x, surface, *, a, b, k, fraction, frequency_hz):
    """Least share of the zone and the heights that would mend what is missing, over samples."""
    clear = clearance.available_m(x, a_amsl_m=a, b_amsl_m=b) - surface - clearance.bulge_m(x, k=k)
    zone = clearance.zone_radius_m(x, frequency_hz=frequency_hz)
    extra = clearance.extra_heights_m(fraction * zone - clear, x)
    return clearance.normalised_clearance(clear, zone).min(), [float(value) for value in extra]


def test_nothing_that_could_govern_is_left_out_at_any_height_k_zone_or_frequency(sample):
    # Against every sample of the profile at a sixteenth of the cell, without choosing among them.
    random = np.random.default_rng(20260501)
    study = sample.plan.study
    with open_terrain(study) as terrain:
        for plan in sample.plan.links:
            profile = plan.profile
            step = profile.cell_m / PARTS
            dense = terrain.profile(a=profile.a, b=profile.b, step_m=step, name=profile.name)
            dense, stands, _, _ = stood(plan.link, dense)
            x, surface, *_ = unpacked(payload(sample, plan))
            ends = plan.result.ends
            for _ in range(60):
                ask = {
                    "a": ends.a.antenna_amsl_m + random.uniform(-3.0, 40.0),
                    "b": ends.b.antenna_amsl_m + random.uniform(-3.0, 40.0),
                    "k": 1.0 / random.uniform(0.2, 2.0),
                    "fraction": random.choice([0.0, 0.3, 0.6, 1.0]),
                    "frequency_hz": 10.0 ** random.uniform(8.7, 11.0),
                }
                share, extra = least_and_extra(dense.distance_m, stands.surface_m, **ask)
                kept_share, kept_extra = least_and_extra(x, surface, **ask)
                assert kept_share == pytest.approx(share, abs=0.005), (plan.link.name, ask)
                for kept, wanted in zip(kept_extra, extra, strict=True):
                    # More than 100 m to build is "not practical" on the page, whatever the number.
                    assert min(kept, 100.0) == pytest.approx(min(wanted, 100.0), abs=0.05), (plan.link.name, ask)


def test_a_payload_stays_small(sample):
    for plan in sample.plan.links:
        assert len(what_if_data(sample.plan, plan)) < 30_000, plan.link.name


def test_trees_stand_in_other_years_as_terrain_opened_for_those_years_has_them(sample):
    study = sample.plan.study
    seen = 0
    for years in (0.0, 25.0):
        with open_terrain(dataclasses.replace(study, growth_years=years)) as terrain:
            for plan in sample.plan.links:
                data = payload(sample, plan)
                x, s, _, rate, tree = unpacked(data)
                if not data["growth"]["grows"]:
                    continue
                profile = plan.profile
                dense = terrain.profile(a=profile.a, b=profile.b, step_m=profile.cell_m / PARTS, name=profile.name)
                dense, stands, _, _ = stood(plan.link, dense)
                pair = np.array(data["rates"])[rate]
                more = years - study.growth_years
                grown = s + more * (pair[:, 1] if more > 0 else pair[:, 0])
                nearest = np.abs(dense.distance_m[None, :] - x[:, None]).argmin(axis=1)
                # The samples of the plan itself stand at another step; those of the closer look are the same.
                same = np.abs(dense.distance_m[nearest] - x) < 1e-3
                assert same.mean() > 0.4
                assert np.abs(grown - stands.surface_m[nearest])[same].max() < 0.01, (plan.link.name, years)
                seen += int((tree & same).sum())
    assert seen > 100


def test_terrain_grown_is_terrain_opened_for_that_year():
    study = load_study(STUDY)
    link = next(link for link in study.links if link.name == "Beacon - West Point")
    ends = {"a": link.a.position, "b": link.b.position, "name": link.name}
    with open_terrain(study) as terrain, open_terrain(dataclasses.replace(study, growth_years=17.0)) as fresh:
        assert terrain.grows
        assert terrain.growth_years == study.growth_years
        np.testing.assert_array_equal(terrain.grown(17.0).profile(**ends).surface_m, fresh.profile(**ends).surface_m)
        assert np.abs(terrain.profile(**ends).surface_m - fresh.profile(**ends).surface_m).max() > 1.0
        closer = terrain.refine(terrain.profile(**ends), [(900.0, 1200.0), (4000.0, 4100.0)], step_m=0.4)
        again = terrain.grown(17.0).resampled(closer)
        np.testing.assert_array_equal(again.distance_m, closer.distance_m)
        same = np.isin(closer.distance_m, fresh.profile(**ends).distance_m)
        np.testing.assert_array_equal(again.surface_m[same], fresh.profile(**ends).surface_m)
        np.testing.assert_array_equal(terrain.resampled(closer).surface_m, closer.surface_m)


def test_looking_closer_changes_nothing_of_the_plan():
    study = load_study(STUDY)
    study = dataclasses.replace(study, links=study.links[:2])
    with_points, without = plan_study(study, what_if=True), plan_study(study)
    assert results_text(with_points) == results_text(without)
    assert all(plan.what_if is not None for plan in with_points.links)
    assert all(plan.what_if is None for plan in without.links)


def test_criteria_of_both_kinds_of_obstruction_are_there_for_the_preset_alone(sample):
    plan = sample.plan.links[0]
    data = payload(sample, plan)
    assert [item["fraction"] for item in data["isolated"]] == [1.0, 0.0]
    assert [item["fraction"] for item in data["criteria"]] == [1.0, 0.3]
    stated = (Criterion(name="own", k=float("inf"), fraction=0.4, source="own"),)
    study = dataclasses.replace(sample.plan.study, criteria=stated)
    with open_terrain(study) as terrain:
        assessment = assess_in_full(plan.link, terrain=terrain, settings=settings_of(study))
        points = what_if_of(plan.link, assessment.profile, terrain)
    own = dataclasses.replace(
        plan, result=assessment.result, profile=assessment.profile, levels=assessment.levels, what_if=points
    )
    data = json.loads(what_if_data(dataclasses.replace(sample.plan, study=study), own))
    assert data["isolated"] is None
    assert data["criteria"] == [{"name": "own", "k": None, "fraction": 0.4}]


def test_no_name_breaks_out_of_the_script(hostile):
    for plan in hostile.plan.links:
        text = str(what_if_data(hostile.plan, plan))
        assert not set(text) & set("<>&")
        assert text.isascii()
        data = json.loads(text)
        named = {item["name"] for item in data["labels"] if item["kind"] == "obstacle"}
        assert named <= {clean(item.name) for item in plan.profile.obstacles}
        for line in (data["link"], data["a"]["site"], data["b"]["site"]):
            assert len(line.splitlines()) == 1
            assert clean(line) == line


def test_script_json_holds_what_it_was_given():
    value = {"</script><!--": ["\u2028", "&amp;", "a\x00b"]}
    assert json.loads(script_json(value)) == value
    with pytest.raises(ValueError, match="Out of range float"):
        script_json(float("inf"))


def test_a_plan_without_a_closer_look_still_has_points(plain):
    plan = plain.plan.links[1]
    x, surface, _, _, _ = unpacked(payload(plain, plan))
    result = plan.result
    share, _ = least_and_extra(
        x, surface, a=result.ends.a.antenna_amsl_m, b=result.ends.b.antenna_amsl_m, k=4 / 3, fraction=0.6,
        frequency_hz=result.frequency_hz,
    )  # fmt: skip
    assert share == pytest.approx(result.clearance[0].worst_fraction, abs=0.005)
