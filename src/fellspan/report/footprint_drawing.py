"""The beam's footprint on flat ground as SVG: a side view over a plan of lens-shaped outlines of equal gain, with distances.

Shows a `Footprint` of the antennas room and computes none.
"""

import math
from dataclasses import dataclass

import numpy as np

from fellspan.antennas.footprint import Contour, Footprint
from fellspan.report import svg, wording
from fellspan.report.scales import Scale, nice_step, nice_ticks

WIDTH, NARROW_WIDTH = 1000.0, 440.0
_MARGIN_LEFT, _MARGIN_RIGHT = 56.0, 16.0
_SIDE_TOP, _SIDE_GROUND = 66.0, 134.0
_PLAN_TOP = 160.0
_LEAST_PLAN, _MOST_PLAN = 190.0, 460.0


@dataclass(frozen=True, slots=True, kw_only=True)
class _Sheet:
    """Where things stand: scales along and across the beam, and the edges of the plan."""

    ahead: Scale
    across: Scale
    right: float
    bottom: float
    half_m: float

    @property
    def middle(self) -> float:
        """The line ahead on the plan."""
        return 0.5 * (_PLAN_TOP + self.bottom)


def _sheet(shown: Footprint, width: float) -> _Sheet:
    """To scale where the outlines are not too slender; else stretched across."""
    low = -shown.reach_m if shown.is_ring else min(0.0, max(float(np.min(c.ahead_m)) for c in shown.contours))
    widths = [float(np.max(np.abs(contour.right_m))) for contour in shown.contours]
    # The outer outlines of a fan may be cut at the sides, so that the first one is drawn large.
    half = min(1.06 * max(widths), max(1.6 * widths[0], 0.25 * shown.reach_m))
    room = width - _MARGIN_LEFT - _MARGIN_RIGHT
    per_m = min(room / (shown.reach_m - low), _MOST_PLAN / (2.0 * half))
    right = _MARGIN_LEFT + per_m * (shown.reach_m - low)
    height = max(2.0 * half * per_m, _LEAST_PLAN)
    middle = _PLAN_TOP + 0.5 * height
    return _Sheet(
        ahead=Scale(from_value=low, to_value=shown.reach_m, from_px=_MARGIN_LEFT, to_px=right),
        across=Scale(from_value=0.0, to_value=half, from_px=middle, to_px=_PLAN_TOP + height),
        right=right,
        bottom=_PLAN_TOP + height,
        half_m=half,
    )


def draw_footprint(shown: Footprint, *, name: str, uid: str, width: float = WIDTH) -> str:
    """An SVG element; `uid` is unique within the page, `width` is that of the sheet: `WIDTH`, or `NARROW_WIDTH` for phones."""
    sheet = _sheet(shown, width)
    ahead, across, middle = sheet.ahead, sheet.across, sheet.middle
    stretch = across.px_per_unit / ahead.px_per_unit
    frame = {"x": _MARGIN_LEFT, "y": _PLAN_TOP, "width": sheet.right - _MARGIN_LEFT, "height": sheet.bottom - _PLAN_TOP}
    parts = [
        svg.el("clipPath", svg.el("rect", **frame), id=f"{uid}-c"),
        *_side(shown, sheet, width),
        svg.el("rect", **frame, class_="frame"),
        *_plan_grid(sheet, most=7 if width > 600.0 else 4),
    ]
    for index, contour in reversed(list(enumerate(shown.contours))):
        data = svg.points(ahead.all(contour.ahead_m), across.all(contour.right_m)) + "z"
        if shown.is_ring and contour.near_m is not None:
            data += _inner_edge(contour.near_m, ahead, across)
        parts.append(
            svg.el("path", d=data, class_=f"lens lens-{index}", clip_path=f"url(#{uid}-c)", fill_rule="evenodd")
        )
    foot = ahead.at(0.0)
    parts.append(svg.line(foot, middle, sheet.right, middle, class_="beam-axis"))
    parts.append(svg.el("circle", cx=foot, cy=middle, r=4.5, class_="foot"))
    to_scale = abs(stretch - 1.0) < 0.02
    height = sheet.bottom + 46.0
    scale = "to scale" if to_scale else f"across the beam {stretch:.2g} times as large as along it"
    parts.append(svg.label(_MARGIN_LEFT, height - 8.0, f"Plan {scale}.", class_="axis"))
    if not to_scale:
        parts += _distances(shown, sheet)
    elif width - sheet.right > 330.0:
        parts += _legend(shown, sheet.right + 36.0, _PLAN_TOP + 24.0)
    else:
        parts += _legend(shown, _MARGIN_LEFT, height + 18.0)
        height += 24.0 * len(shown.contours) + 8.0
    title = f"Footprint of {name} at {shown.height_m:g} m, tilt {wording.degrees(shown.tilt_deg, 1, sign=True)}"
    return svg.el(
        "svg",
        svg.el("title", svg.text(title), id=f"{uid}-t"),
        svg.el(
            "desc",
            svg.text(" ".join(contour_words(contour, reach_m=shown.reach_m) for contour in shown.contours)),
            id=f"{uid}-d",
        ),
        *parts,
        class_="footprint",
        viewBox=f"0 0 {svg.num(width)} {svg.num(height)}",
        role="img",
        aria_labelledby=f"{uid}-t {uid}-d",
        xmlns="http://www.w3.org/2000/svg",
    )


def contour_words(contour: Contour, *, reach_m: float) -> str:
    """One outline in a sentence."""
    near = "the foot of the mast" if contour.near_m is None else _place(contour.near_m)
    far = f"to beyond {wording.distance(reach_m)}" if contour.far_m is None else f"to {wording.distance(contour.far_m)}"
    wide = "" if contour.width_m is None else f", {wording.distance(contour.width_m)} wide"
    return f"{wording.number(contour.level_db, 0)} dB: from {near} {far}{wide}."


def _place(at_m: float) -> str:
    """A distance ahead; a steep beam also reaches ground behind its mast."""
    return wording.distance(at_m) if at_m > -0.5 else f"{wording.distance(-at_m)} behind the mast"


def _inner_edge(near_m: float, ahead: Scale, across: Scale) -> str:
    turn = np.linspace(0.0, 2.0 * math.pi, 181)
    return svg.points(ahead.all(near_m * np.cos(turn)), across.all(near_m * np.sin(turn))) + "z"


def _legend(shown: Footprint, x: float, y: float) -> list[str]:
    """The outlines and their distances as a list, where they would crowd the plan."""
    parts = []
    for index, contour in enumerate(shown.contours):
        at = y + 24.0 * index
        parts.append(svg.el("path", d=f"M{svg.num(x)},{svg.num(at - 4.5)}h36", class_=f"lens lens-{index}"))
        parts.append(svg.label(x + 44.0, at, contour_words(contour, reach_m=shown.reach_m), class_="lens-text"))
    return parts


def _side(shown: Footprint, sheet: _Sheet, width: float) -> list[str]:
    """Mast, ground, and the rays of the boresight and of the first outline."""
    ahead = sheet.ahead
    foot, tall = ahead.at(0.0), _SIDE_GROUND - _SIDE_TOP
    words = f"boresight {wording.degrees(shown.tilt_deg, 1, sign=True)}"
    if shown.centre_m is not None and shown.centre_m <= shown.reach_m:
        words += f": the middle of the beam meets the ground at {wording.distance(shown.centre_m)}"
    parts = [
        svg.label(4.0, 18.0, f"Footprint on flat ground, antenna {shown.height_m:g} m above it", class_="plane"),
        svg.label(4.0, 38.0, words, class_="axis"),
        svg.line(_MARGIN_LEFT, _SIDE_GROUND, sheet.right, _SIDE_GROUND, class_="ground"),
        svg.line(foot, _SIDE_GROUND, foot, _SIDE_TOP, class_="mast"),
    ]
    first = shown.contours[0]
    for at_m, class_ in ((first.near_m, "side-ray"), (shown.centre_m, "beam-axis"), (first.far_m, "side-ray")):
        if at_m is None or at_m <= 0.0:
            continue
        share = min(1.0, shown.reach_m / at_m)
        parts.append(
            svg.line(foot, _SIDE_TOP, ahead.at(min(at_m, shown.reach_m)), _SIDE_TOP + tall * share, class_=class_)
        )
    if width > 600.0:
        parts.append(
            svg.label(sheet.right, _SIDE_GROUND + 16.0, "side view, heights enlarged", class_="axis", anchor="end")
        )
    return parts


def _plan_grid(sheet: _Sheet, *, most: int) -> list[str]:
    ahead, across = sheet.ahead, sheet.across
    parts = []
    most_here = max(2, min(most, int((sheet.right - _MARGIN_LEFT) / 70.0)))
    for value in nice_ticks(ahead.from_value, ahead.to_value, most_here):
        x = ahead.at(value)
        parts.append(svg.line(x, _PLAN_TOP, x, sheet.bottom, class_="grid-line"))
        anchor = "end" if x > sheet.right - 20.0 else "middle"
        parts.append(svg.label(x, sheet.bottom + 16.0, _tick(value), class_="axis", anchor=anchor))
    step = nice_step(sheet.half_m, 2)
    count = math.floor(sheet.half_m / step)
    for index in range(-count, count + 1):
        y = across.at(index * step)
        parts.append(svg.line(_MARGIN_LEFT, y, sheet.right, y, class_="grid-line"))
        parts.append(svg.label(_MARGIN_LEFT - 5.0, y + 4.5, _tick(index * step), class_="axis", anchor="end"))
    return parts


def _tick(value_m: float) -> str:
    """A round distance, either way."""
    away = abs(value_m)
    return "0" if away < 1e-9 else f"{away:g} m" if away < 1000.0 else f"{away / 1000.0:g} km"


def _distances(shown: Footprint, sheet: _Sheet) -> list[str]:
    """Each outline named where it crosses the line ahead; near edges above the axis, far ones below."""
    parts = []
    middle = sheet.middle
    for index, contour in enumerate(shown.contours):
        shift = 22.0 + 18.0 * index
        level = f"{wording.number(contour.level_db, 0)} dB"
        for at_m, y, is_near in ((contour.near_m, middle - shift, True), (contour.far_m, middle + shift, False)):
            if at_m is None:
                continue
            x = sheet.ahead.at(at_m)
            parts.append(svg.line(x, middle, x, y + (2.0 if is_near else -10.0), class_="beam-axis"))
            # Near edges are named to their left and far ones to their right, unless the sheet ends there.
            leftward = x > _MARGIN_LEFT + 120.0 if is_near else x > sheet.right - 120.0
            parts.append(
                svg.label(
                    x - 4.0 if leftward else x + 4.0,
                    y,
                    f"{level}: {_place(at_m)}",
                    class_="lens-text",
                    anchor="end" if leftward else "start",
                )
            )
        if contour.far_m is None:
            words = f"{level}: beyond {wording.distance(shown.reach_m)}"
            parts.append(svg.label(sheet.right - 6.0, middle + shift, words, class_="lens-text", anchor="end"))
    return parts
