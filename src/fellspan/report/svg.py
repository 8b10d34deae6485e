"""Writing SVG: elements with every attribute and every text escaped. Knows nothing of paths or links."""

from html import escape
from itertools import pairwise
from typing import Final

import numpy as np
import shapely

from fellspan.report.wording import clean

STRAY: Final = 0.15
"""How far a line may stray from the places it was given, sheet units: a sixth of a pixel, which nobody sees."""


def num(value: float) -> str:
    """A coordinate: at most two decimals, no trailing zeros, never `-0`."""
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text in ("-0", "") else text


def text(content: str) -> str:
    """Text from people, safe as the content of an element."""
    return escape(clean(content), quote=False)


def el(name: str, *children: str, **attributes: str | float | None) -> str:
    """An element. Children are markup already; in attribute names `_` stands for `-` and a trailing one is dropped."""
    parts = [name]
    for key, value in attributes.items():
        if value is None:
            continue
        shown = num(value) if isinstance(value, int | float) else escape(clean(value), quote=True)
        parts.append(f'{key.rstrip("_").replace("_", "-")}="{shown}"')
    head = " ".join(parts)
    return f"<{head}>{''.join(children)}</{name}>" if children else f"<{head}/>"


def label(
    x: float, y: float, content: str, *, class_: str = "", anchor: str = "start", hint: str | None = None, **more: str
) -> str:
    """A line of text; `hint` is the full text of one that was shortened."""
    tip = () if hint is None or hint == content else (el("title", text(hint)),)
    return el(
        "text", *tip, text(content), x=x, y=y, class_=class_ or None,
        text_anchor=None if anchor == "start" else anchor, **more,
    )  # fmt: skip


def plate(x: float, y: float, width: float, *, anchor: str = "start") -> str:
    """What stands behind a label on paper, where letters have no halo, and keeps the lines off it.

    `x`, `y` and `anchor` are those of the label, `width` its careful estimate, of which most labels take nine tenths.
    """
    width *= 0.9
    left = x if anchor == "start" else x - width
    return el("rect", x=left - 2.0, y=y - 11.0, width=width + 4.0, height=15.0, class_="plate")


def line(x1: float, y1: float, x2: float, y2: float, *, class_: str = "", **more: str) -> str:
    """A straight line."""
    return el("line", x1=x1, y1=y1, x2=x2, y2=y2, class_=class_ or None, **more)


def _tenths(value: int) -> str:
    sign, whole, tenth = "-" if value < 0 else "", *divmod(abs(value), 10)
    return f"{sign}{whole}" if tenth == 0 else f"{sign}{whole or ''}.{tenth}"


def points(xs: list[float], ys: list[float]) -> str:
    """Path data through the points, to a tenth of a unit; relative steps, and no point that a straight line passes within
    `STRAY`: a page is a third of the size for it.

    The steps are differences of rounded places, so that rounding does not add up along a path.
    """
    places = np.rint(_needed(xs, ys) * 10.0).astype(np.int64).tolist()
    steps = []
    for before, after in pairwise(places):
        across, down = after[0] - before[0], after[1] - before[1]
        if across or down:
            shown = _tenths(down)
            # A minus sign parts two numbers as well as a comma does.
            steps.append(f"{_tenths(across)}{'' if shown.startswith('-') else ','}{shown}")
    parts = [step if index == 0 or step.startswith("-") else f" {step}" for index, step in enumerate(steps or ["0,0"])]
    return f"M{_tenths(places[0][0])},{_tenths(places[0][1])}l{''.join(parts)}"


def _needed(xs: list[float], ys: list[float]) -> np.ndarray[tuple[int, int], np.dtype[np.float64]]:
    given = np.column_stack([xs, ys]).astype(np.float64)
    if given.shape[0] < 4 or not np.isfinite(given).all():
        return given
    kept: np.ndarray[tuple[int, int], np.dtype[np.float64]] = shapely.get_coordinates(
        shapely.simplify(shapely.linestrings(given), STRAY, preserve_topology=False)
    )
    return kept if kept.shape[0] >= 2 else given
