"""The beam unrolled: gain over angle close to the boresight, for lobes that are needles on a polar diagram."""

import math
from collections.abc import Sequence

import numpy as np

from fellspan.report import svg, wording
from fellspan.report.polar_drawing import LETTERS, PLANE_WORD, Curve, rings_for
from fellspan.report.scales import Scale, keep_peaks, nice_step

NARROW_DEG = 25.0
"""Beams wider than this read well on the polar diagram alone."""
WIDTH, HEIGHT = 440.0, 250.0
_LEFT, _RIGHT, _TOP, _BOTTOM = 40.0, 430.0, 34.0, 212.0
_SPAN_DB = 40.0
_BEAMS = 5.0


def is_narrow(curve: Curve) -> bool:
    """Whether the beam is one that the polar diagram shows as a needle."""
    return (curve.facts.half_power_deg or 360.0) < NARROW_DEG


def scales_for(curves: Sequence[Curve]) -> tuple[Scale, Scale]:
    """Angle and gain scales, 40 dB down: as many beamwidths to both sides as show the first side lobes, else all around."""
    narrow = [curve for curve in curves if is_narrow(curve)]
    span = 180.0
    if narrow:
        widest = max(curve.facts.half_power_deg or 0.0 for curve in narrow)
        lobes = max((curve.facts.side_lobe_deg or 0.0) for curve in narrow)
        aside = max(abs(curve.facts.peak_deg) for curve in narrow)
        reach = min(aside + max(2.0 * widest, min(1.4 * lobes, _BEAMS * widest)), 90.0)
        step = nice_step(2.0 * reach, 8)
        span = step * math.ceil(reach / step - 1e-9)
    top = rings_for(curves).top_dbi
    return (
        Scale(from_value=-span, to_value=span, from_px=_LEFT, to_px=_RIGHT),
        Scale(from_value=top - _SPAN_DB, to_value=top, from_px=_BOTTOM, to_px=_TOP),
    )


def draw_beam(curves: Sequence[Curve], *, uid: str) -> str:
    """An SVG element: gain against angle off the boresight; worth drawing where a beam `is_narrow`."""
    across, up = scales_for(curves)
    plane = curves[0].data.plane
    parts = [
        svg.el("clipPath", svg.el("rect", x=_LEFT, y=_TOP, width=_RIGHT - _LEFT, height=_BOTTOM - _TOP), id=f"{uid}-c"),
        *_grid(across, up, PLANE_WORD[plane]),
    ]
    for index, curve in enumerate(curves):
        inside = np.abs(curve.data.angle_deg) <= 1.05 * across.to_value
        angle, gain = curve.data.angle_deg[inside], curve.data.gain_dbi[inside]
        kept = keep_peaks(angle - angle[0], columns=500, peaks=(gain,), exact=(int(np.argmax(gain)),))
        line = svg.points(across.all(angle[kept]), [min(y, HEIGHT) for y in up.all(gain[kept])])
        parts.append(svg.el("path", d=line, class_=f"pattern-line line-{index}", clip_path=f"url(#{uid}-c)"))
    for index, curve in enumerate(curves):
        parts += _marks(curve, index, across, up, label=len(curves) == 1)
    if len(curves) > 1:
        parts += _badges(curves, across, up)
    title = f"Gain against angle, {PLANE_WORD[plane]} plane"
    words = (
        f"Gain in dBi against angle, {wording.degrees(across.from_value, 0)} to {wording.degrees(across.to_value, 0)}."
    )
    return svg.el(
        "svg",
        svg.el("title", svg.text(title), id=f"{uid}-t"),
        svg.el("desc", svg.text(f"{words} {' '.join(curve.name for curve in curves)}"), id=f"{uid}-d"),
        *parts,
        class_="beam-view",
        viewBox=f"0 0 {svg.num(WIDTH)} {svg.num(HEIGHT)}",
        role="img",
        aria_labelledby=f"{uid}-t {uid}-d",
        xmlns="http://www.w3.org/2000/svg",
    )


def _grid(across: Scale, up: Scale, plane: str) -> list[str]:
    parts = [svg.el("rect", x=_LEFT, y=_TOP, width=_RIGHT - _LEFT, height=_BOTTOM - _TOP, class_="frame")]
    step = 60.0 if across.to_value == 180.0 else nice_step(2.0 * across.to_value, 8)
    count = round(across.to_value / step)
    digits = 0 if step >= 1.0 else 1 if step >= 0.1 else 2
    for index in range(-count, count + 1):
        x = across.at(index * step)
        parts.append(svg.line(x, _TOP, x, _BOTTOM, class_="grid-line"))
        words = "0°" if index == 0 else f"{wording.number(index * step, digits, sign=True)}°"
        if index in (-count, 0, count) or count <= 4:
            parts.append(
                svg.label(x, _BOTTOM + 16.0, words, class_="axis", anchor="end" if index == count else "middle")
            )
    for index in range(5):
        level = up.to_value - 10.0 * index
        y = up.at(level)
        parts.append(svg.line(_LEFT, y, _RIGHT, y, class_="grid-line"))
        parts.append(svg.label(_LEFT - 5.0, y + 4.5, wording.number(level, 0), class_="axis", anchor="end"))
    parts.append(
        svg.label(
            4.0, 18.0, f"{'Close to the boresight' if across.to_value < 180.0 else 'Unrolled'}, {plane}", class_="plane"
        )
    )
    parts.append(svg.label(WIDTH - 10.0, 18.0, "dBi", class_="axis", anchor="end"))
    return parts


def _marks(curve: Curve, index: int, across: Scale, up: Scale, *, label: bool) -> list[str]:
    facts, parts = curve.facts, []
    half = curve.peak_dbi - 10.0 * math.log10(2.0)
    edges = [edge for edge in (facts.half_power_from_deg, facts.half_power_to_deg) if edge is not None]
    inside = [edge for edge in edges if abs(edge) <= across.to_value]
    y = up.at(half)
    if label and len(inside) == 2 and facts.half_power_deg is not None:
        right = across.at(inside[1])
        parts.append(svg.line(across.at(inside[0]), y, right, y, class_="half-power-ray"))
        parts.append(
            svg.label(right + 8.0, y - 4.0, f"half power, {wording.degrees(facts.half_power_deg)}", class_="axis")
        )
    parts += [
        svg.el("circle", cx=round(across.at(edge), 2), cy=round(y, 2), r=3.6, class_=f"half-power mark-{index}")
        for edge in inside
    ]
    if facts.side_lobe_db is not None and facts.side_lobe_deg is not None:
        level = curve.peak_dbi + facts.side_lobe_db
        sides = [facts.peak_deg + sign * facts.side_lobe_deg for sign in (1.0, -1.0)]
        best = min(sides, key=lambda at: abs(float(np.interp(at, curve.data.angle_deg, curve.data.gain_dbi)) - level))
        if abs(best) <= across.to_value and level >= up.from_value:
            x, y = across.at(best), up.at(level)
            parts.append(
                svg.el("path", d=f"M{svg.num(x)},{svg.num(y - 5)}l5,5l-5,5l-5,-5z", class_=f"side-lobe mark-{index}")
            )
            if label:
                words = f"{wording.number(facts.side_lobe_db)} dB"
                leftward = x > _RIGHT - 80.0 or best < 0.0
                parts.append(
                    svg.label(
                        x - 8.0 if leftward else x + 8.0,
                        y - 7.0,
                        words,
                        class_="axis",
                        anchor="end" if leftward else "start",
                    )
                )
    return parts


def _badges(curves: Sequence[Curve], across: Scale, up: Scale) -> list[str]:
    """A letter on each curve, each at another angle on its own slope, where the others are far in level."""
    angles = np.linspace(0.92 * across.from_value, 0.92 * across.to_value, 60)
    levels = np.array([np.interp(angles, curve.data.angle_deg, curve.data.gain_dbi) for curve in curves])
    heights = np.clip((levels - up.from_value) * up.px_per_unit, -20.0, None)
    taken: list[tuple[float, float]] = []
    parts = []
    for index in range(len(curves)):
        apart = np.min(np.abs(np.delete(heights, index, axis=0) - heights[index]), axis=0)
        score = np.where(heights[index] > 6.0, np.minimum(apart, 30.0), -2.0)
        for at, angle in enumerate(angles):
            x, y = across.at(float(angle)), up.at(float(levels[index, at]))
            if any(math.hypot(x - left, y - top) < 24.0 for left, top in taken):
                score[at] = -1.0
        best = int(np.argmax(score))
        x, y = across.at(float(angles[best])), min(up.at(float(levels[index, best])), _BOTTOM - 9.0)
        taken.append((x, y))
        parts.append(svg.el("circle", cx=x, cy=y, r=8.5, class_="badge"))
        parts.append(svg.label(x, y + 4.2, LETTERS[index], class_="badge-letter", anchor="middle"))
    return parts
