"""The path profile as markup: well formed, exact where it counts, and no peak lost however it is thinned."""

import xml.etree.ElementTree as ET

import numpy as np
import pytest
from synthetic_plans import HOSTILE, TOLMERA, make_link, shifted

from fellspan.links.words import spare_m
from fellspan.report.profile_drawing import draw_profile, profile_text
from fellspan.report.scales import Wanted, keep_peaks, nice_ticks, place_labels
from fellspan.report.section import FULL, NARROW, PANEL, prepare

SVG = "{*}"


@pytest.fixture(scope="module")
def spiky():
    """A long path with a wood of which every sample differs and masts narrower than a pixel."""
    return make_link(
        "spiky", shifted(TOLMERA, north_km=-5.5, east_km=-2), shifted(TOLMERA, north_km=-4.5, east_km=7), at=TOLMERA,
        trees=((0.2, 0.7, 14.0),), samples=40_001,
        obstacles=tuple((f"mast {n}", 0.1 + 0.07 * n, 0.1, 20.0 + n, "other") for n in range(12)),
    )  # fmt: skip


@pytest.mark.parametrize("sheet", [FULL, PANEL, NARROW], ids=lambda sheet: sheet.name)
def test_no_peak_is_lost_by_thinning(spiky, sheet):
    section = prepare(spiky, sheet, plot_top=0.0)
    assert section.kept.size < spiky.profile.distance_m.size / 8
    columns = np.minimum(
        (spiky.profile.distance_m / spiky.profile.length_m * sheet.columns).astype(int), sheet.columns - 1
    )
    for heights in (spiky.profile.surface_m, spiky.levels.need_m[spiky.result.governing]):
        for column in range(sheet.columns):
            here = columns == column
            kept = section.kept[here[section.kept]]
            assert heights[kept].max() == heights[here].max()
    at = spiky.result.clearance[spiky.result.governing].worst_at_m
    assert at in section.distance_m


@pytest.mark.parametrize("sheet", [FULL, PANEL, NARROW], ids=lambda sheet: sheet.name)
def test_drawing_is_well_formed_and_exact_at_the_governing_point(spiky, sheet):
    root = ET.fromstring(draw_profile(spiky, uid="t", sheet=sheet))
    item = spiky.result.clearance[spiky.result.governing]
    xs = {float(t.get("data-at-m")): float(t.get("x1")) for t in root.iter() if t.get("class") == "tick-x"}
    ys = {float(t.get("data-level-m")): float(t.get("y1")) for t in root.iter() if t.get("class") == "tick-y"}
    point = next(t for t in root.iter() if t.get("class") == "governing-point")
    assert float(point.get("cx")) == pytest.approx(np.interp(item.worst_at_m, list(xs), list(xs.values())), abs=0.02)
    low, high = min(ys), max(ys)
    slope = (ys[high] - ys[low]) / (high - low)
    assert float(point.get("cy")) == pytest.approx(ys[low] + slope * (item.surface_m + item.bulge_m - low), abs=0.02)


def test_every_text_is_escaped_and_ids_are_the_callers():
    plan = make_link(
        HOSTILE, shifted(TOLMERA, north_km=0, east_km=0), shifted(TOLMERA, north_km=-1, east_km=1), at=TOLMERA,
        names=(HOSTILE, "\x00\ud800 ok"), obstacles=((HOSTILE, 0.5, 30.0, 60.0, "building"),),
    )  # fmt: skip
    drawn = draw_profile(plan, uid="q7", sheet=FULL)
    root = ET.fromstring(drawn)
    assert not root.findall(".//{*}script")
    assert not root.findall(".//{*}img")
    ids = [part.get("id") for part in root.iter() if part.get("id")]
    assert len(ids) == len(set(ids))
    assert all(name.startswith("q7-") for name in ids)
    assert HOSTILE in "".join(root.find("{*}desc").itertext())


def test_words_say_what_the_drawing_shows(spiky):
    said = profile_text(spiky)
    item = spiky.result.clearance[spiky.result.governing]
    missing = -spare_m(item, length_m=spiky.result.distance_m)
    assert missing >= item.required_m - item.clearance_m
    assert f"{missing:.1f} m short of the required clearance" in said
    assert "Obstructed" in said


@pytest.mark.parametrize(("low", "high", "most"), [(0.0, 9.7, 5), (-13.2, 407.0, 6), (1201.3, 1202.9, 4)])
def test_ticks_are_round_few_and_inside(low, high, most):
    ticks = nice_ticks(low, high, most)
    assert 2 <= len(ticks) <= most + 1
    assert low <= ticks[0] < ticks[-1] <= high
    steps = np.diff(ticks)
    assert steps == pytest.approx(steps[0])
    assert float(f"{steps[0]:.0e}") == pytest.approx(steps[0])


def test_labels_never_meet_and_are_dropped_rather_than_crossed():
    rng = np.random.default_rng(5)
    for _ in range(200):
        wanted = [
            Wanted(at=float(at), width=float(w))
            for at, w in zip(-np.sort(-rng.uniform(50, 850, 9)), rng.uniform(30, 160, 9), strict=True)
        ]
        placed = [spot for spot in place_labels(wanted, low=0.0, high=900.0, lanes=3, through=(400.0,)) if spot]
        assert placed
        for index, one in enumerate(placed):
            assert not one.start < 400.0 < one.end
            assert one.start >= 0.0
            assert one.end <= 900.0
            for other in placed[:index]:
                if one.lane == other.lane:
                    assert one.start >= other.end or other.start >= one.end
                upper, lower = (one, other) if one.lane >= other.lane else (other, one)
                assert not lower.start < upper.at < lower.end


def test_thinning_leaves_out_what_is_unknown():
    distance = np.linspace(0.0, 1000.0, 5001)
    heights = np.sin(distance / 37.0)
    heights[1000:1500] = np.nan
    kept = keep_peaks(distance, columns=100, peaks=(heights,), exact=())
    assert np.isfinite(heights[kept]).all()
    assert kept[0] == 0
    assert kept[-1] == 5000
