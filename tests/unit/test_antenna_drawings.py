"""Diagrams of antennas: marks stand where the numbers say, curves keep their peaks and nulls, words say the same."""

import math
import xml.etree.ElementTree as ET

import numpy as np
import pytest

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.dishes import dish
from fellspan.antennas.facts import facts_of
from fellspan.antennas.footprint import footprint
from fellspan.antennas.patches import patch
from fellspan.antennas.pattern import Pattern, Plane
from fellspan.antennas.wires import dipole
from fellspan.report import beam_drawing, polar_drawing
from fellspan.report.antenna_sheet import sheet_of, sheet_rows
from fellspan.report.footprint_drawing import NARROW_WIDTH, contour_words, draw_footprint
from fellspan.report.polar_drawing import CENTRE, RADIUS, Curve, curve_of, draw_polar, rings_for

SPACE = "{http://www.w3.org/2000/svg}"
SECTOR = from_data_sheet(
    name="sector <90> & more",
    frequency_hz=5.8e9,
    gain_dbi=16.0,
    azimuth_width_deg=90.0,
    elevation_width_deg=7.0,
    front_to_back_db=28.0,
    downtilt_deg=4.0,
)
DISH = dish(frequency_hz=5.8e9, diameter_m=0.6)
DIPOLE = dipole(frequency_hz=450e6)
PATTERNS = [SECTOR, DISH, DIPOLE]
PLANES: list[Plane] = ["horizontal", "vertical"]


def polar(curves: list[Curve]) -> ET.Element:
    return ET.fromstring(draw_polar(curves, uid="u"))


def found(drawing: ET.Element, tag: str, word: str) -> list[ET.Element]:
    return [item for item in drawing.iter(SPACE + tag) if word in item.get("class", "").split()]


def angle_and_gain(x: float, y: float, curve: Curve, plane: Plane) -> tuple[float, float]:
    """Back from a place on the sheet to angle and gain."""
    across, along = x - CENTRE, polar_drawing._TOP - y
    angle = math.degrees(math.atan2(across, along) if plane == "horizontal" else math.atan2(along, across))
    rings = rings_for([curve])
    share = math.hypot(across, along) / RADIUS
    return angle, rings.floor_dbi + share * (rings.top_dbi - rings.floor_dbi)


@pytest.mark.parametrize("plane", PLANES)
@pytest.mark.parametrize("pattern", PATTERNS, ids=lambda pattern: pattern.kind)
def test_half_power_marks_stand_where_the_numbers_say(pattern: Pattern, plane: Plane) -> None:
    facts = facts_of(pattern).azimuth if plane == "horizontal" else facts_of(pattern).elevation
    curve = curve_of(pattern, plane)
    # Under the diagram stands one more as a key; the marks themselves are within the rings.
    marks = [
        (float(mark.get("cx", 0)), float(mark.get("cy", 0)))
        for mark in found(polar([curve]), "circle", "half-power")
        if float(mark.get("cx", 0)) > 20.0
    ]
    if facts.half_power_from_deg is None or facts.half_power_to_deg is None:
        assert marks == []
        return
    read = sorted(angle_and_gain(x, y, curve, plane) for x, y in marks)
    for (angle, gain), stated in zip(read, (facts.half_power_from_deg, facts.half_power_to_deg), strict=True):
        assert angle == pytest.approx(stated, abs=0.02)
        assert gain == pytest.approx(curve.peak_dbi - 3.0103, abs=0.02)


@pytest.mark.parametrize("plane", PLANES)
def test_the_side_lobe_mark_stands_on_the_curve(plane: Plane) -> None:
    curve = curve_of(DISH, plane)
    marks = [item.get("d", "") for item in found(polar([curve]), "path", "side-lobe")]
    x, y = (float(part) for part in marks[0][1:].split("l")[0].split(","))
    angle, gain = angle_and_gain(x, y + 5.0, curve, plane)
    assert abs(angle) == pytest.approx(curve.facts.side_lobe_deg, abs=0.05)
    assert gain == pytest.approx(curve.peak_dbi + (curve.facts.side_lobe_db or 0.0), abs=0.05)
    assert gain == pytest.approx(float(np.interp(angle, curve.data.angle_deg, curve.data.gain_dbi)), abs=0.1)


def test_half_power_marks_of_the_unrolled_beam_stand_where_the_numbers_say() -> None:
    curve = curve_of(DISH, "horizontal")
    across, up = beam_drawing.scales_for([curve])
    marks = found(ET.fromstring(beam_drawing.draw_beam([curve], uid="u")), "circle", "half-power")
    places = sorted((float(mark.get("cx", 0)), float(mark.get("cy", 0))) for mark in marks)
    edges = (curve.facts.half_power_from_deg or 0.0, curve.facts.half_power_to_deg or 0.0)
    for (x, y), edge in zip(places, edges, strict=True):
        assert x == pytest.approx(across.at(edge), abs=0.02)
        assert y == pytest.approx(up.at(curve.peak_dbi - 3.0103), abs=0.02)


def test_rings_hold_every_curve_and_are_ten_decibels_apart() -> None:
    curves = [curve_of(pattern, "horizontal") for pattern in PATTERNS]
    rings = rings_for(curves)
    assert rings.top_dbi >= max(curve.peak_dbi for curve in curves) - 0.05
    assert np.diff(rings.levels()) == pytest.approx(-10.0)
    labels = [item.text for item in found(polar(curves), "text", "level")]
    assert labels == [f"{rings.top_dbi:.0f} dBi", "20", "10", "0", "−10"]


def test_several_antennas_differ_in_line_and_letter() -> None:
    drawing = polar([curve_of(pattern, "vertical") for pattern in PATTERNS])
    classes = [item.get("class") for item in drawing.iter(SPACE + "path") if "pattern-line" in item.get("class", "")]
    assert classes == [f"pattern-line line-{index}" for index in range(3)]
    assert [item.text for item in found(drawing, "text", "badge-letter")] == ["A", "B", "C"]
    places = [(float(item.get("cx", 0)), float(item.get("cy", 0))) for item in found(drawing, "circle", "badge")]
    assert min(math.dist(one, other) for one in places for other in places if one is not other) >= 24.0


def test_words_say_what_the_lines_show_and_names_are_text() -> None:
    drawing = polar([curve_of(SECTOR, "horizontal")])
    assert "sector <90> & more" in (drawing.findtext(SPACE + "title") or "")
    words = drawing.findtext(SPACE + "desc") or ""
    # Tilted electrically by 4 degrees of a 7 degree beam: 12 (4/7)^2 = 3.9 dB less in the plane of the boresight.
    assert "12.1 dBi in this plane, 16.0 dBi at its peak beside it" in words
    assert "90.0° wide at half power" in words
    assert drawing.get("role") == "img"


def test_a_quarter_turn_swaps_the_planes() -> None:
    upright, turned = curve_of(DIPOLE, "vertical"), curve_of(DIPOLE, "horizontal", turned=True)
    assert turned.data.plane == "horizontal"
    assert turned.facts.half_power_deg == upright.facts.half_power_deg
    assert np.array_equal(turned.data.gain_dbi, upright.data.gain_dbi)


def test_a_beam_cut_off_by_its_ground_plane_is_no_omni_in_words() -> None:
    # 4.4 and 1.6 mm at 2.4 GHz: only 2.9 dB down where the ground plane ends it (two-slot model, by hand).
    made = patch(frequency_hz=2.4e9, permittivity=4.4, height_m=0.0016)
    told = " ".join(polar([curve_of(made, "vertical")]).itertext())
    assert "no half-power width: it ends" in told
    assert "all around" not in told
    laid_down = " ".join(polar([curve_of(DIPOLE, "vertical", turned=True)]).itertext())
    assert "nearly the same all around" in laid_down
    rows = dict(sheet_rows(sheet_of(made)))
    assert "it ends before" in rows["Elevation beam"]
    assert "wide at half power" in rows["Azimuth beam"]


def test_ground_behind_the_mast_is_said_in_words() -> None:
    shown = footprint(patch(frequency_hz=2.4e9, front_to_back_db=15.0), height_m=20.0, tilt_deg=-30.0)
    behind = next(contour for contour in shown.contours if (contour.near_m or 0.0) < -1.0)
    words = contour_words(behind, reach_m=shown.reach_m)
    assert f"from {-(behind.near_m or 0.0):.0f} m behind the mast" in words


@pytest.mark.parametrize("other", [30.0, None])
def test_the_other_end_is_marked_where_it_lies(other: float | None) -> None:
    marks = found(polar([curve_of(SECTOR, "horizontal", other_end_deg=other)]), "line", "other-end")
    assert len(marks) == (0 if other is None else 1)
    for mark in marks:
        across, along = float(mark.get("x2", 0)) - CENTRE, polar_drawing._TOP - float(mark.get("y2", 0))
        assert math.degrees(math.atan2(across, along)) == pytest.approx(30.0, abs=0.1)


@pytest.mark.parametrize("width", [1000.0, NARROW_WIDTH])
@pytest.mark.parametrize("tilt_deg", [-4.0, -12.0])
def test_a_footprint_names_its_distances_and_stays_on_its_sheet(width: float, tilt_deg: float) -> None:
    shown = footprint(DISH, height_m=30.0, tilt_deg=tilt_deg)
    drawing = ET.fromstring(draw_footprint(shown, name="dish", uid="u", width=width))
    words = drawing.findtext(SPACE + "desc") or ""
    assert "−3 dB: from " in words
    texts = " ".join(item.text or "" for item in drawing.iter(SPACE + "text"))
    near = shown.contours[0].near_m or 0.0
    assert f"−3 dB: {near:.0f} m" in texts or f"from {near:.0f} m" in texts
    sheet = [float(part) for part in (drawing.get("viewBox") or "").split()]
    assert sheet[2] == width
    for item in drawing.iter(SPACE + "text"):
        assert 0.0 <= float(item.get("x", 0)) <= width
        assert 0.0 <= float(item.get("y", 0)) <= sheet[3]
