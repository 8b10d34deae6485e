"""Polar diagrams of antennas as SVG: one plane through the boresight, rings in dBi, several antennas told apart by line.

Shows cuts and their facts as `antennas` worked them out; the marks stand where the numbers say. Knows nothing of pages.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.facts import HALF_POWER_DB, Cut, CutFacts, cut, cut_facts
from fellspan.antennas.pattern import Pattern, Plane
from fellspan.report import svg, wording
from fellspan.report.scales import keep_peaks

MOST_CURVES = 6
"""More antennas on one diagram cannot be told apart by line style."""
LETTERS = "ABCDEF"
BACK_FROM_DEG = 120.0
"""A lobe further from the peak than this is the back, not a side lobe (common practice, no source)."""
WIDTH, HEIGHT, CENTRE, RADIUS = 440.0, 452.0, 220.0, 172.0
_TOP = 228.0
_RING_DB = 10.0
_RINGS = 5
PLANE_WORD: dict[Plane, str] = {"horizontal": "azimuth", "vertical": "elevation"}


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Curve:
    """One antenna on a diagram: its cut in the plane, and the facts of it."""

    name: str
    data: Cut
    facts: CutFacts
    other_end_deg: float | None = None
    """Where the other end of the link lies, off the boresight; None draws no mark."""
    highest_dbi: float | None = None
    """Gain at the maximum over all directions, which may lie beside this plane."""

    @property
    def peak_dbi(self) -> float:
        """Highest gain of the cut."""
        return float(np.max(self.data.gain_dbi))


@lru_cache(maxsize=24)
def _cut_of(pattern: Pattern, plane: Plane) -> tuple[Cut, CutFacts]:
    data = cut(pattern, plane)
    return data, cut_facts(data)


def curve_of(
    pattern: Pattern,
    plane: Plane,
    *,
    name: str | None = None,
    turned: bool = False,
    other_end_deg: float | None = None,
) -> Curve:
    """The curve of one antenna in one plane; `turned` is one that hangs a quarter turn about its boresight."""
    own: Plane = plane if not turned else "vertical" if plane == "horizontal" else "horizontal"
    data, facts = _cut_of(pattern, own)
    if facts.side_lobe_deg is not None and facts.side_lobe_deg > BACK_FROM_DEG:
        facts = replace(facts, side_lobe_db=None, side_lobe_deg=None)
    return Curve(
        name=name or pattern.name,
        data=replace(data, plane=plane),
        facts=facts,
        other_end_deg=other_end_deg,
        highest_dbi=pattern.peak_gain_dbi,
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Rings:
    """The radial scale: `top_dbi` at the outer ring, `floor_dbi` at the centre."""

    top_dbi: float
    floor_dbi: float

    def radius(self, gain_dbi: float) -> float:
        """Distance from the centre, sheet units; what lies under the floor is the centre."""
        share = (gain_dbi - self.floor_dbi) / (self.top_dbi - self.floor_dbi)
        return RADIUS * min(max(share, 0.0), 1.0)

    def radii(self, gain_dbi: NDArray[np.float64]) -> NDArray[np.float64]:
        """The same for many."""
        share = (gain_dbi - self.floor_dbi) / (self.top_dbi - self.floor_dbi)
        return np.asarray(RADIUS * np.clip(share, 0.0, 1.0))

    def levels(self) -> list[float]:
        """Gains of the rings, from the outermost inward."""
        return [self.top_dbi - index * _RING_DB for index in range(_RINGS)]


def rings_for(curves: Sequence[Curve]) -> Rings:
    """Rings in steps of 10 dB, the outermost at the next 5 dBi above the highest gain."""
    top = 5.0 * math.ceil((max(curve.peak_dbi for curve in curves) - 0.05) / 5.0)
    return Rings(top_dbi=top, floor_dbi=top - _RINGS * _RING_DB)


def place(angle_deg: float, radius: float, plane: Plane) -> tuple[float, float]:
    """Where an angle off the boresight stands: from above, boresight up; from the side, boresight to the right, up is up."""
    angle = math.radians(angle_deg)
    if plane == "horizontal":
        return CENTRE + radius * math.sin(angle), _TOP - radius * math.cos(angle)
    return CENTRE + radius * math.cos(angle), _TOP - radius * math.sin(angle)


def draw_polar(curves: Sequence[Curve], *, uid: str) -> str:
    """An SVG element with the curves, all of the same plane; with one curve its cross-polar level is drawn too.

    `uid` is unique within the page.
    """
    plane = curves[0].data.plane
    rings = rings_for(curves)
    alone = len(curves) == 1
    height = HEIGHT if alone else HEIGHT - 24.0
    parts = [_grid(rings, plane)]
    if alone:
        parts.append(_cross(curves[0], rings, plane))
    parts += [_curve(curve, index, rings, plane) for index, curve in enumerate(curves)]
    parts += [_marks(curve, index, rings, plane, label=alone) for index, curve in enumerate(curves)]
    parts.append(_levels(rings, plane))
    parts += [_other_end(curve, LETTERS[index], plane, alone=alone) for index, curve in enumerate(curves)]
    if not alone:
        parts.append(_badges(curves, rings, plane))
    title = f"{PLANE_WORD[plane].capitalize()} plane of {' and '.join(curve.name for curve in curves)}"
    words = " ".join(curve_words(curve) for curve in curves)
    return svg.el(
        "svg",
        svg.el("title", svg.text(title), id=f"{uid}-t"),
        svg.el("desc", svg.text(f"Polar diagram, gain in dBi around the antenna. {words}"), id=f"{uid}-d"),
        *parts,
        class_="polar",
        viewBox=f"0 0 {svg.num(WIDTH)} {svg.num(height)}",
        role="img",
        aria_labelledby=f"{uid}-t {uid}-d",
        xmlns="http://www.w3.org/2000/svg",
    )


def curve_words(curve: Curve) -> str:
    """One curve in a sentence: the text equivalent of its line."""
    facts = curve.facts
    words = f"{curve.name}: {wording.number(curve.peak_dbi)} dBi"
    if curve.highest_dbi is not None and curve.highest_dbi - curve.peak_dbi >= 0.1:
        words += f" in this plane, {wording.number(curve.highest_dbi)} dBi at its peak beside it"
    if facts.half_power_deg is None:
        words += ", the same or nearly so all around" if _is_round(curve) else f", {no_width_words(all_around=False)}"
    else:
        if abs(facts.peak_deg) >= 0.05:
            words += f" at {wording.degrees(facts.peak_deg, sign=True)}"
        words += f", {wording.degrees(facts.half_power_deg)} wide at half power"
    if facts.side_lobe_db is not None and facts.side_lobe_deg is not None:
        words += f", first side lobe {wording.number(facts.side_lobe_db)} dB at {wording.degrees(facts.side_lobe_deg)} from it"
    return words + "."


def _grid(rings: Rings, plane: Plane) -> str:
    parts = [
        svg.el("circle", cx=CENTRE, cy=_TOP, r=rings.radius(level), class_="ring" if index else "ring outer")
        for index, level in enumerate(rings.levels())
    ]
    for angle in range(-150, 181, 30):
        inner, outer = place(angle, rings.radius(rings.levels()[-1]), plane), place(angle, RADIUS, plane)
        parts.append(svg.line(*inner, *outer, class_="spoke main" if angle == 0 else "spoke"))
        x, y = place(angle, RADIUS + 9.0, plane)
        anchor = "middle" if abs(x - CENTRE) < 12.0 else "start" if x > CENTRE else "end"
        drop = 4.5 if abs(y - _TOP) < 12.0 else 9.0 if y > _TOP else 0.0
        parts.append(svg.label(x, y + drop, _angle_text(angle), class_="angle", anchor=anchor))
    front, side = (
        ("Azimuth, from above", "right is +") if plane == "horizontal" else ("Elevation, from the side", "up is +")
    )
    parts.append(svg.label(4.0, 18.0, front, class_="plane"))
    parts.append(svg.label(WIDTH - 4.0, 18.0, side, class_="angle", anchor="end"))
    return svg.el("g", *parts, class_="polar-grid")


def _levels(rings: Rings, plane: Plane) -> str:
    """The gains of the rings, on a spoke away from main lobe and back lobe in both planes."""
    parts = []
    for level in rings.levels():
        x, y = place(-105.0, rings.radius(level), plane)
        unit = " dBi" if level == rings.top_dbi else ""
        parts.append(svg.label(x, y + 4.0, f"{wording.number(level, 0)}{unit}", class_="level", anchor="middle"))
    return svg.el("g", *parts)


def _angle_text(angle: int) -> str:
    return "0°" if angle == 0 else "180°" if angle == 180 else f"{wording.number(angle, 0, sign=True)}°"


def _path(angle_deg: NDArray[np.float64], gain_dbi: NDArray[np.float64], rings: Rings, plane: Plane) -> str:
    """Path data through the cut, thinned so that no peak or null is lost."""
    turn = angle_deg - angle_deg[0]
    kept = keep_peaks(turn, columns=720, peaks=(gain_dbi,), exact=(int(np.argmax(gain_dbi)),))
    radius, angle = rings.radii(gain_dbi[kept]), np.radians(angle_deg[kept])
    across, along = radius * np.sin(angle), radius * np.cos(angle)
    if plane == "horizontal":
        return svg.points((CENTRE + across).tolist(), (_TOP - along).tolist())
    return svg.points((CENTRE + along).tolist(), (_TOP - across).tolist())


def _curve(curve: Curve, index: int, rings: Rings, plane: Plane) -> str:
    data = _path(curve.data.angle_deg, curve.data.gain_dbi, rings, plane)
    return svg.el("path", d=data, class_=f"pattern-line line-{index}")


def _cross(curve: Curve, rings: Rings, plane: Plane) -> str:
    """The cross-polar curve with its name on it; nothing where it stays under the innermost ring."""
    gains = curve.data.cross_gain_dbi
    if float(np.max(gains)) < rings.levels()[-1]:
        return ""
    return svg.el("path", d=_path(curve.data.angle_deg, gains, rings, plane), class_="pattern-line line-cross")


def _edges(curve: Curve) -> list[float]:
    """The half-power directions, as far as there are any."""
    edges = curve.facts.half_power_from_deg, curve.facts.half_power_to_deg
    return [edge for edge in edges if edge is not None]


def _marks(curve: Curve, index: int, rings: Rings, plane: Plane, *, label: bool) -> str:
    """Dots at the half-power directions and an open diamond at the first side lobe, with their numbers where there is room."""
    parts = []
    half = curve.peak_dbi - 10.0 * math.log10(2.0)
    for edge in _edges(curve):
        x, y = place(edge, rings.radius(half), plane)
        if label:
            out = place(edge, RADIUS, plane)
            parts.append(svg.line(CENTRE, _TOP, *out, class_="half-power-ray"))
        parts.append(svg.el("circle", cx=round(x, 2), cy=round(y, 2), r=3.6, class_=f"half-power mark-{index}"))
    lobe = _side_lobe_place(curve, rings, plane)
    if lobe is not None:
        x, y = lobe
        parts.append(
            svg.el(
                "path",
                d=f"M{svg.num(x)},{svg.num(y - 5)}l5,5l-5,5l-5,-5z",
                class_=f"side-lobe mark-{index}",
            )
        )
    if label:
        parts.append(_mark_words(curve))
    return svg.el("g", *parts, class_="marks")


def _other_end(curve: Curve, letter: str, plane: Plane, *, alone: bool) -> str:
    """A ray toward the other end of the link; its words stand in a free corner, where they hide no mark."""
    if curve.other_end_deg is None:
        return ""
    end = place(curve.other_end_deg, RADIUS + 6.0, plane)
    left = letter == LETTERS[0]
    x, anchor = (4.0, "start") if left else (WIDTH - 4.0, "end")
    words = "other end" if alone else f"other end of {letter}"
    return (
        svg.line(CENTRE, _TOP, *end, class_="other-end")
        + svg.label(x, 40.0, words, class_="other-end-text", anchor=anchor)
        + svg.label(x, 56.0, wording.degrees(curve.other_end_deg, sign=True), class_="other-end-text", anchor=anchor)
    )


def _side_lobe_place(curve: Curve, rings: Rings, plane: Plane) -> tuple[float, float] | None:
    facts = curve.facts
    if facts.side_lobe_db is None or facts.side_lobe_deg is None:
        return None
    # The lobe may stand on either side: take the side whose gain there is the one stated.
    gains = []
    for sign in (1.0, -1.0):
        angle = (facts.peak_deg + sign * facts.side_lobe_deg + 180.0) % 360.0 - 180.0
        gains.append(
            (abs(float(np.interp(angle, curve.data.angle_deg, curve.data.gain_dbi)) - _lobe_dbi(curve)), angle)
        )
    if _lobe_dbi(curve) < rings.floor_dbi:
        return None
    return place(min(gains)[1], rings.radius(_lobe_dbi(curve)), plane)


def _lobe_dbi(curve: Curve) -> float:
    return curve.peak_dbi + (curve.facts.side_lobe_db or 0.0)


def _is_round(curve: Curve) -> bool:
    """Whether the cut nowhere falls by half, unlike a beam that a ground plane cuts off."""
    return float(np.min(curve.data.gain_dbi)) >= curve.peak_dbi - HALF_POWER_DB


def no_width_words(*, all_around: bool) -> str:
    """Why a cut has no half-power width: an omni around, a beam that its ground plane cuts off before it has fallen so far."""
    why = "nearly the same all around" if all_around else "it ends before it has fallen so far"
    return f"no half-power width: {why}"


def _mark_words(curve: Curve) -> str:
    """What the marks say, under the diagram."""
    facts = curve.facts
    parts = []
    if facts.half_power_deg is None:
        parts.append(svg.label(4.0, HEIGHT - 22.0, no_width_words(all_around=_is_round(curve)), class_="mark-text"))
    else:
        parts.append(svg.el("circle", cx=9.0, cy=HEIGHT - 26.5, r=3.6, class_="half-power mark-0"))
        words = f"half power: {wording.degrees(facts.half_power_deg)} wide"
        parts.append(svg.label(20.0, HEIGHT - 22.0, words, class_="mark-text"))
    if facts.side_lobe_db is not None:
        parts.append(svg.el("path", d=f"M9,{svg.num(HEIGHT - 12)}l5,5l-5,5l-5,-5z", class_="side-lobe mark-0"))
        words = f"first side lobe: {wording.number(facts.side_lobe_db)} dB at {wording.degrees(facts.side_lobe_deg)}"
        parts.append(svg.label(20.0, HEIGHT - 2.5, words, class_="mark-text"))
    return svg.el("g", *parts)


def _badges(curves: Sequence[Curve], rings: Rings, plane: Plane) -> str:
    """A letter on each curve, where it runs farthest from the others."""
    angles = np.arange(-160.0, 161.0, 4.0)
    radii = np.array([rings.radii(np.interp(angles, curve.data.angle_deg, curve.data.gain_dbi)) for curve in curves])
    taken = [place(edge, rings.radius(curve.peak_dbi - 3.01), plane) for curve in curves for edge in _edges(curve)]
    parts = []
    for index in range(len(curves)):
        others = np.delete(radii, index, axis=0)
        apart = np.min(np.abs(others - radii[index]), axis=0)
        score = np.minimum(apart, 26.0) + np.minimum(radii[index], 90.0) * 0.25
        for x, y in taken:
            for at, angle in enumerate(angles):
                here = place(float(angle), float(radii[index, at]), plane)
                if math.hypot(here[0] - x, here[1] - y) < 24.0:
                    score[at] = -1.0
        best = int(np.argmax(score))
        x, y = place(float(angles[best]), float(radii[index, best]), plane)
        taken.append((x, y))
        parts.append(svg.el("circle", cx=x, cy=y, r=8.5, class_=f"badge badge-{index}"))
        parts.append(svg.label(x, y + 4.2, LETTERS[index], class_="badge-letter", anchor="middle"))
    return svg.el("g", *parts)
