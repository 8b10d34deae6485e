"""Level against antenna height as an inline SVG: one curve for each k, the planned height, and the heights that avoid nulls.

Height goes up, as on the mast. Shows what was worked out and computes nothing.
"""

import math
from typing import Final

import numpy as np

from fellspan.design.reflection_result import KName, Lobing, LobingCurve, NullFreeHeights
from fellspan.report import svg, wording
from fellspan.report.scales import Scale, nice_step, nice_ticks, text_width

WIDTH, HEIGHT = 520.0, 380.0
_LEFT, _RIGHT, _TOP, _BOTTOM = 54.0, WIDTH - 16.0, 34.0, HEIGHT - 42.0
_LEAST_DB, _FLOOR_DB, _TOP_DB = -15.0, -40.0, 9.0
_NEAR_PX: Final = 1e-6
CURVE_CLASS: Final[dict[KName, int]] = {"median": 0, "worst month": 1, "infinite": 2}
"""Which dash and colour a k has, as in the key beside the drawings."""


def k_words(curve: LobingCurve) -> str:
    """`median k 4/3`."""
    return "k infinite" if curve.k is None else f"{curve.name} k {wording.k_factor(curve.k)}"


def lobing_words(lobing: Lobing, heights: NullFreeHeights | None) -> str:
    """The drawing in words: level at the planned height, the deepest point shown, and what avoids it."""
    parts = []
    for curve in lobing.curves:
        known = [(level, at) for level, at in zip(curve.level_db, lobing.height_m, strict=True) if level is not None]
        if not known:
            parts.append(f"At {k_words(curve)} nothing is mirrored.")
            continue
        here = min(known, key=lambda pair: abs(pair[1] - lobing.planned_m))[0]
        low, low_at = min(known)
        parts.append(
            f"At {k_words(curve)} {wording.number(here, sign=True)} dB at {wording.metres(lobing.planned_m)} as planned, "
            f"least {wording.number(low, sign=True)} dB at {wording.metres(low_at)}."
        )
    if heights is not None:
        parts.append(_remedy(heights))
    return " ".join(parts)


def _remedy(heights: NullFreeHeights) -> str:
    if heights.change_m is None:
        tried = f"{wording.metres(heights.searched.from_m)} to {wording.metres(heights.searched.to_m)}"
        return f"No height from {tried} keeps the fade within 3 dB whatever k and water do."
    shown = heights.ranges[:3]
    ranges = ", ".join(f"{wording.number(one.from_m)} to {wording.metres(one.to_m)}" for one in shown)
    more = " and others" if len(heights.ranges) > len(shown) else ""
    return f"Heights that keep the fade within 3 dB whatever k and water do: {ranges}{more}."


def draw_lobing(lobing: Lobing, *, uid: str, heights: NullFreeHeights | None = None, name: str = "") -> str:
    """An SVG element for one end; `heights` marks what avoids nulls, `name` is the site's."""
    low, high = lobing.height_m[0], lobing.height_m[-1]
    up = Scale(from_value=low, to_value=high, from_px=_BOTTOM, to_px=_TOP)
    across = _level_scale(lobing)
    parts = [
        svg.el("clipPath", svg.el("rect", x=_LEFT, y=_TOP, width=_RIGHT - _LEFT, height=_BOTTOM - _TOP), id=f"{uid}-c"),
        *_grid(across, up),
        *_free(up, heights),
    ]
    for curve in lobing.curves:
        parts += _curve(curve, lobing, across, up, clip=f"url(#{uid}-c)")
    y = up.at(lobing.planned_m)
    parts.append(svg.line(_LEFT, y, _RIGHT, y, class_="planned"))
    planned = f"planned, {wording.metres(lobing.planned_m)}"
    parts.append(svg.plate(_LEFT + 6.0, y - 5.0, text_width(planned, 12.5)))
    parts.append(svg.label(_LEFT + 6.0, y - 5.0, planned, class_="note"))
    letter = lobing.end.upper()
    parts.append(svg.label(4.0, 18.0, wording.shorten(f"{letter} · {name}" if name else letter, 44), class_="plane"))
    parts.append(svg.label(_RIGHT, 18.0, "m above ground", class_="axis", anchor="end"))
    parts.append(svg.label(_RIGHT, HEIGHT - 6.0, "level over the direct ray alone, dB", class_="axis", anchor="end"))
    return svg.el(
        "svg",
        svg.el("title", svg.text(f"Level against height at {letter}"), id=f"{uid}-t"),
        svg.el("desc", svg.text(lobing_words(lobing, heights)), id=f"{uid}-d"),
        *parts,
        class_="beam-view lobing",
        viewBox=f"0 0 {svg.num(WIDTH)} {svg.num(HEIGHT)}",
        role="img",
        aria_labelledby=f"{uid}-t {uid}-d",
        xmlns="http://www.w3.org/2000/svg",
    )


def _level_scale(lobing: Lobing) -> Scale:
    known = [level for curve in lobing.curves for level in curve.level_db if level is not None]
    least = min((*known, _LEAST_DB))
    floor = max(5.0 * math.floor(least / 5.0), _FLOOR_DB)
    return Scale(from_value=floor, to_value=_TOP_DB, from_px=_LEFT, to_px=_RIGHT)


def _grid(across: Scale, up: Scale) -> list[str]:
    parts = [svg.el("rect", x=_LEFT, y=_TOP, width=_RIGHT - _LEFT, height=_BOTTOM - _TOP, class_="frame")]
    step = 5.0 if across.to_value - across.from_value <= 30.0 else 10.0
    level = step * math.ceil(across.from_value / step)
    while level <= across.to_value:
        x = across.at(level)
        parts.append(svg.line(x, _TOP, x, _BOTTOM, class_="grid-line zero" if level == 0.0 else "grid-line"))
        parts.append(svg.label(x, _BOTTOM + 16.0, wording.number(level, 0, sign=True), class_="axis", anchor="middle"))
        level += step
    span = up.to_value - up.from_value
    digits = 0 if nice_step(span, 7) >= 1.0 else 1 if nice_step(span, 7) >= 0.1 else 2
    for height in nice_ticks(up.from_value, up.to_value, 7):
        y = up.at(height)
        parts.append(svg.line(_LEFT, y, _RIGHT, y, class_="grid-line"))
        parts.append(svg.label(_LEFT - 5.0, y + 4.5, wording.number(height, digits), class_="axis", anchor="end"))
    return parts


def _free(up: Scale, heights: NullFreeHeights | None) -> list[str]:
    """Bars at the left edge where the height avoids nulls."""
    parts = []
    for one in () if heights is None else heights.ranges:
        low, high = max(one.from_m, up.from_value), min(one.to_m, up.to_value)
        if high < low:
            continue
        top, bottom = up.at(high), up.at(low)
        parts.append(svg.el("rect", x=_LEFT, y=top, width=7.0, height=max(bottom - top, 1.5), class_="null-free"))
    return parts


def _curve(curve: LobingCurve, lobing: Lobing, across: Scale, up: Scale, *, clip: str) -> list[str]:
    known = [index for index, level in enumerate(curve.level_db) if level is not None]
    if len(known) < 2:
        return []
    level = np.array([curve.level_db[index] for index in known], dtype=np.float64)
    height = np.array([lobing.height_m[index] for index in known])
    # What falls below the scale leaves the frame and comes back: the clip keeps it inside.
    drawn = svg.points(across.all(np.maximum(level, across.from_value - 3.0)), up.all(height))
    return [svg.el("path", d=drawn, class_=f"pattern-line line-{CURVE_CLASS[curve.name]}", clip_path=clip)]
