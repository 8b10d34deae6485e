"""Margin against distance as an inline SVG: a curve for each pair, named at the curve, the target, and this link's distance.

Distance runs on a scale of ratios. Shows what was worked out and computes nothing.
"""

import math
from typing import Final

import numpy as np

from fellspan.design.equip_result import EquipResult, EquipRow
from fellspan.design.equip_words import pair_words, runner_up
from fellspan.report import svg, wording
from fellspan.report.scales import Scale, nice_ticks, text_width

WIDTH, NARROW_WIDTH = 760.0, 360.0
MOST_CURVES: Final = 5
_HEIGHT, _LEFT, _TOP, _BOTTOM = 400.0, 44.0, 34.0, 44.0
_MARKS_KM: Final = (0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0)
_LOW_DB, _HIGH_DB = -15.0, 40.0
_LABEL_PX: Final = 13.0


def shown_rows(result: EquipResult) -> tuple[EquipRow, ...]:
    """The pairs that are drawn: the first of the ranking, and the runner-up in any case."""
    known = [row for row in result.rows if row.reach is not None and any(one is not None for one in row.reach.spare_db)]
    shown = known[:MOST_CURVES]
    second = runner_up(result.rows)
    if second is not None and second in known and second not in shown:
        shown = [*shown[: MOST_CURVES - 1], second]
    return tuple(shown)


def reach_words(row: EquipRow, rows: tuple[EquipRow, ...]) -> str:
    """`dish 0.6 m reaches 14.8 km`, rounded down."""
    name = pair_words(row, rows)
    reach = row.reach
    if reach is None or reach.distance_m is None:
        return f"{name} reaches not even {wording.distance(100.0)}"
    kilometres = f"{math.floor(reach.distance_m / 100.0) / 10.0:.1f} km"
    if reach.limited_by == "beyond":
        return f"{name} reaches more than {kilometres}"
    return f"{name} reaches {kilometres}" + (" by the radio's timing" if reach.limited_by == "timing" else "")


def draw_reach(result: EquipResult, *, uid: str, width: float = WIDTH) -> str:
    """An SVG element; empty text where no reach was searched."""
    rows = shown_rows(result)
    if not rows:
        return ""
    right, bottom = width - 14.0, _HEIGHT - _BOTTOM
    across, up = _across(result, rows, right), Scale(from_value=_LOW_DB, to_value=_HIGH_DB, from_px=bottom, to_px=_TOP)
    frame = {"x": _LEFT, "y": _TOP, "width": right - _LEFT, "height": bottom - _TOP}
    parts = [
        svg.el("clipPath", svg.el("rect", **frame), id=f"{uid}-c"),
        svg.el("rect", **frame, class_="frame"),
        *_grid(across, up, right=right, bottom=bottom, narrow=width < WIDTH),
    ]
    for index, row in enumerate(rows):
        parts.append(_curve(row, result, index, across, up, clip=f"url(#{uid}-c)"))
    parts += _marks(result, across, up, right=right, bottom=bottom)
    parts += _names(rows, result, across, up, right=right)
    parts.append(svg.label(4.0, 18.0, "dB left over margin and target asked", class_="axis"))
    parts.append(svg.label(right, _HEIGHT - 6.0, "distance, km", class_="axis", anchor="end"))
    words = "; ".join(reach_words(row, result.rows) for row in rows)
    return svg.el(
        "svg",
        svg.el("title", svg.text("Margin against distance"), id=f"{uid}-t"),
        svg.el("desc", svg.text(f"{words}."), id=f"{uid}-d"),
        *parts,
        class_="beam-view reach",
        viewBox=f"0 0 {svg.num(width)} {svg.num(_HEIGHT)}",
        role="img",
        aria_labelledby=f"{uid}-t {uid}-d",
        xmlns="http://www.w3.org/2000/svg",
    )


def _across(result: EquipResult, rows: tuple[EquipRow, ...], right: float) -> Scale:
    """Logarithms of distance, m: from well before the nearest of interest to well past the farthest."""
    ends = [row.reach.distance_m for row in rows if row.reach is not None and row.reach.distance_m is not None]
    ends.append(result.distance_m)
    first, last = result.reach_distance_m[0], result.reach_distance_m[-1]
    low, high = max(min(ends) / 4.0, first), min(max(ends) * 2.5, last)
    return Scale(
        from_value=math.log10(min(low, last / 10.0)),
        to_value=math.log10(max(high, first * 10.0)),
        from_px=_LEFT,
        to_px=right,
    )


def _grid(across: Scale, up: Scale, *, right: float, bottom: float, narrow: bool) -> list[str]:
    parts = []
    for level in nice_ticks(up.from_value, up.to_value, 7):
        y = up.at(level)
        parts.append(svg.line(_LEFT, y, right, y, class_="grid-line"))
        parts.append(svg.label(_LEFT - 5.0, y + 4.5, wording.number(level, 0, sign=True), class_="axis", anchor="end"))
    for kilometres in _MARKS_KM:
        at = math.log10(1000.0 * kilometres)
        if across.from_value - 1e-9 <= at <= across.to_value + 1e-9:
            x = across.at(at)
            parts.append(svg.line(x, _TOP, x, bottom, class_="grid-line"))
            parts.append(svg.label(x, bottom + 16.0, f"{kilometres:g}", class_="axis", anchor="middle"))
    return parts


def _places(row: EquipRow, result: EquipResult) -> tuple[np.ndarray, np.ndarray]:
    """Logarithm of distance and decibels left of one pair, where they are known."""
    assert row.reach is not None
    known = [
        (math.log10(at), left)
        for at, left in zip(result.reach_distance_m, row.reach.spare_db, strict=True)
        if left is not None
    ]
    data = np.array(known, dtype=np.float64).reshape(-1, 2)
    return data[:, 0], data[:, 1]


def _curve(row: EquipRow, result: EquipResult, index: int, across: Scale, up: Scale, *, clip: str) -> str:
    at, left = _places(row, result)
    drawn = svg.points(across.all(at), up.all(np.clip(left, up.from_value - 20.0, up.to_value + 20.0)))
    return svg.el("path", d=drawn, class_=f"pattern-line line-{index}", clip_path=clip)


def _marks(result: EquipResult, across: Scale, up: Scale, *, right: float, bottom: float) -> list[str]:
    """The target, and this link."""
    zero, here = up.at(0.0), across.at(math.log10(result.distance_m))
    words = f"this link, {wording.distance(result.distance_m)}"
    inside = here + 6.0 + text_width(words, _LABEL_PX) < right
    beside, anchor = (here + 6.0, "start") if inside else (here - 6.0, "end")
    return [
        svg.line(_LEFT, zero, right, zero, class_="target"),
        svg.plate(_LEFT + 6.0, zero + 16.0, text_width("what is asked", _LABEL_PX)),
        svg.label(_LEFT + 6.0, zero + 16.0, "what is asked", class_="note"),
        svg.line(here, _TOP, here, bottom, class_="planned"),
        svg.plate(beside, bottom - 8.0, text_width(words, _LABEL_PX), anchor=anchor),
        svg.label(beside, bottom - 8.0, words, class_="note", anchor=anchor),
    ]


def _names(rows: tuple[EquipRow, ...], result: EquipResult, across: Scale, up: Scale, *, right: float) -> list[str]:
    """Each pair's name beside its curve, at heights of their own: the farther ones to the right, the nearer to the left."""
    parts = []
    farthest_first = sorted(range(len(rows)), key=lambda index: -_at_zero(rows[index], result))
    levels = np.linspace(_HIGH_DB - 5.0, 6.0, max(len(rows), 2))
    for place, index in enumerate(farthest_first):
        at, left = _places(rows[index], result)
        level = float(levels[place])
        x, y = across.at(float(np.interp(-level, -left, at))), up.at(level)
        x = min(max(x, _LEFT), right)
        name = wording.shorten(pair_words(rows[index], result.rows), 34 if right > 600.0 else 22)
        room = text_width(name, _LABEL_PX) + 12.0
        to_right = x + room < right and (place <= len(rows) // 2 or x - room < _LEFT)
        shift = 9.0 if to_right else -9.0
        parts.append(svg.el("circle", cx=x, cy=y, r=3.2, class_=f"half-power mark-{index}"))
        anchor, baseline = ("start", y - 3.0) if to_right else ("end", y + 14.0)
        parts.append(svg.plate(x + shift, baseline, room - 12.0, anchor=anchor))
        hint = pair_words(rows[index], result.rows)
        parts.append(svg.label(x + shift, baseline, name, class_="note", anchor=anchor, hint=hint))
    return parts


def _at_zero(row: EquipRow, result: EquipResult) -> float:
    """Where the curve meets the target, as a logarithm; for sorting."""
    at, left = _places(row, result)
    return float(np.interp(0.0, -left, at)) if left.size else 0.0
