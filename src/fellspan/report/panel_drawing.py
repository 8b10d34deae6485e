"""The small path profile of the overview: the same levels as the large drawing, in a fifth of the bytes. Computes nothing.

The picture is stretched to the width it is given, so that one serves a phone and a desk; lines keep their width, and words
stand around it as HTML. Heights carry the Earth bulge of the governing criterion's k, as in the large drawing.
"""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from markupsafe import Markup
from numpy.typing import NDArray

from fellspan.links.result import CriterionResult
from fellspan.links.words import state_of
from fellspan.planning.plan import LinkPlan
from fellspan.report.scales import nice_ticks
from fellspan.report.section import nearest_index
from fellspan.report.svg import el
from fellspan.report.wording import headline, number

WIDE, HIGH = 1000, 300
"""Units of the picture; places are whole units, finer than a screen shows."""
COLUMNS = 150
LENS_POINTS = 25
CUT_EVERY = 6
"""Units: the highest point in each makes the line of a cut, so that rough tops do not fray it."""

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Panel:
    """The picture, and what HTML sets around it: heights (percent from the top, words) and where the governing point stands."""

    svg: Markup
    heights: tuple[tuple[float, str], ...]
    left: float
    top: float
    """Place of the governing point in the picture, percent."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Frame:
    """Metres to units of the picture."""

    length_m: float
    low_m: float
    high_m: float

    def x(self, at_m: Array) -> list[int]:
        return np.rint(at_m / self.length_m * WIDE).astype(int).tolist()  # type: ignore[no-any-return]

    def y(self, level_m: Array) -> list[int]:
        return np.rint((self.high_m - level_m) / (self.high_m - self.low_m) * HIGH).astype(int).tolist()  # type: ignore[no-any-return]


def draw_panel(plan: LinkPlan) -> Panel:
    """The small profile of a link."""
    levels, profile, result = plan.levels, plan.profile, plan.result
    criterion = result.clearance[result.governing]
    bulge = levels.bulge_m[result.governing]
    kept = _kept(plan, criterion)
    ground, surface = profile.ground_m[kept] + bulge[kept], profile.surface_m[kept] + bulge[kept]
    frame = _frame(plan, ground, surface)
    xs = frame.x(levels.distance_m[kept])
    at = 0.5 * frame.length_m * (1.0 - np.cos(np.linspace(0.0, np.pi, LENS_POINTS)))
    ray = np.interp(at, levels.distance_m, levels.available_m)
    needed = ray - criterion.required_fraction * np.interp(at, levels.distance_m, levels.fresnel_radius_m)
    ends = [(0, *frame.y(levels.available_m[:1])), (WIDE, *frame.y(levels.available_m[-1:]))]
    feet = [frame.y(ground[:1])[0], frame.y(ground[-1:])[0]]
    parts = [
        el("path", d=f"{_line(xs, frame.y(surface))}V{HIGH}H0Z", class_="mini-cover")
        if np.any(surface > ground)
        else "",
        el("path", d=f"{_line(xs, frame.y(ground))}V{HIGH}H0Z", class_="mini-ground"),
        # Closed along the ray, which is straight.
        el("path", d=f"{_line(frame.x(at), frame.y(needed))}Z", class_="zone-required")
        if criterion.required_fraction > 0.0
        else "",
        el("path", d=_line([0, WIDE], [ends[0][1], ends[1][1]]), class_="sight-line"),
        *_cuts(plan, criterion, frame, bulge),
        el("path", d=f"M0,{feet[0]}V{ends[0][1]}M{WIDE},{feet[1]}V{ends[1][1]}", class_="mast"),
    ]
    svg = el(
        "svg", *(part for part in parts if part), class_=f"path-profile mini {state_of(result)}",
        viewBox=f"0 0 {WIDE} {HIGH}", preserveAspectRatio="none", role="img",
        aria_label=f"Small path profile. {headline(result)}",
    )  # fmt: skip
    return Panel(
        svg=Markup(svg),
        heights=tuple(
            (round(frame.y(np.array([level]))[0] / HIGH * 100.0, 1), f"{number(level, 0)} m")
            for level in nice_ticks(frame.low_m, frame.high_m, 4)
        ),
        left=round(criterion.worst_at_m / frame.length_m * 100.0, 2),
        top=round(frame.y(np.array([criterion.surface_m + criterion.bulge_m]))[0] / HIGH * 100.0, 2),
    )


def _kept(plan: LinkPlan, criterion: CriterionResult) -> NDArray[np.intp]:
    """The highest surface of each column at its true place, both ends and the governing point."""
    surface, distance = plan.profile.surface_m, plan.levels.distance_m
    usable = np.flatnonzero(np.isfinite(surface) & np.isfinite(plan.profile.ground_m))
    column = np.minimum((distance[usable] / distance[-1] * COLUMNS).astype(np.intp), COLUMNS - 1)
    order = np.lexsort((surface[usable], column))
    last = np.flatnonzero(np.r_[np.diff(column[order]) > 0, True])
    exact = [usable[0], usable[-1], nearest_index(distance, criterion.worst_at_m)]
    kept: NDArray[np.intp] = np.unique(np.concatenate([usable[order[last]], exact])).astype(np.intp)
    return kept


def _frame(plan: LinkPlan, ground: Array, surface: Array) -> _Frame:
    levels = plan.levels
    high = max(float(surface.max()), float(levels.available_m.max()))
    low = min(float(ground.min()), float(levels.available_m.min()))
    span = max(high - low, 6.0)
    return _Frame(length_m=float(levels.distance_m[-1]), low_m=low - 0.1 * span, high_m=low + 1.08 * span)


def _cuts(plan: LinkPlan, criterion: CriterionResult, frame: _Frame, bulge: Array) -> list[str]:
    """Stretches inside the required zone along the tops, as one path of each kind."""
    distance, tops = plan.levels.distance_m, plan.levels.surface_m + bulge
    drawn: dict[str, list[str]] = {}
    for item in criterion.obstructions:
        inside = np.flatnonzero((distance >= item.from_m - 1e-6) & (distance <= item.to_m + 1e-6))
        if inside.size == 0:
            continue
        columns: dict[int, tuple[int, int]] = {}
        for x, y in zip(frame.x(distance[inside]), frame.y(tops[inside]), strict=True):
            if x // CUT_EVERY not in columns or y < columns[x // CUT_EVERY][1]:
                columns[x // CUT_EVERY] = (x, y)
        xs, ys = [x for x, _ in columns.values()], [y for _, y in columns.values()]
        if xs[-1] - xs[0] < CUT_EVERY:
            xs, ys = [max(0, xs[0] - 3), *xs, min(WIDE, xs[-1] + 3)], [ys[0], *ys, ys[-1]]
        drawn.setdefault("cut-sight" if item.cuts_sight else "cut-zone", []).append(_line(xs, ys))
    return [el("path", d="".join(lines), class_=name) for name, lines in sorted(drawn.items())]


def _line(xs: list[int], ys: list[int]) -> str:
    """Path data through the points in relative steps; points on the way of a straight step are left out."""
    places: list[tuple[int, int]] = []
    for place in zip(xs, ys, strict=True):
        while len(places) >= 2 and _straight(places[-2], places[-1], place):
            places.pop()
        if not places or place != places[-1]:
            places.append(place)
    steps = [f"{x - x0},{y - y0}" for (x0, y0), (x, y) in pairwise(places)]
    return f"M{places[0][0]},{places[0][1]}l" + " ".join(steps or ["0,0"]).replace(" -", "-").replace(",-", "-")


def _straight(one: tuple[int, int], two: tuple[int, int], three: tuple[int, int]) -> bool:
    return (two[0] - one[0]) * (three[1] - one[1]) == (two[1] - one[1]) * (three[0] - one[0]) and one[0] <= two[
        0
    ] <= three[0]
