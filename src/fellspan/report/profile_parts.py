"""Parts of the path profile: ground, cover, zone, masts and the governing point, each as SVG markup."""

import numpy as np

from fellspan.links import words
from fellspan.links.result import CriterionResult, EndResult
from fellspan.report.section import Section
from fellspan.report.svg import el, label, line, num, points
from fellspan.report.wording import distance, governing_words, metres, missing, number, percent, share, shorten
from fellspan.vocabulary import COVER_KINDS

LENS_POINTS = 121


def patterns(uid: str) -> str:
    """Hatches: each kind of material differs by its drawing, not by its colour alone."""

    def hatch(name: str, size: float, turn: int, *content: str) -> str:
        return el(
            "pattern", el("rect", width=size, height=size, class_=f"base-{name}"), *content, id=f"{uid}-{name}",
            width=size, height=size, patternUnits="userSpaceOnUse", patternTransform=f"rotate({turn})" if turn else None,
        )  # fmt: skip

    return el(
        "defs",
        hatch("ground", 8, 45, line(0, 0, 0, 8, class_="stroke-ground")),
        hatch("sea", 12, 0, el("path", d="M0,3q1.5,-2 3,0t3,0M6,9q1.5,-2 3,0t3,0", class_="stroke-sea")),
        hatch("building", 4, 0, line(2, 0, 2, 4, class_="stroke-building")),
        hatch("tree", 6, 0, el("circle", cx=1.5, cy=1.5, r=0.9, class_="dot-tree"),
              el("circle", cx=4.5, cy=4.5, r=0.9, class_="dot-tree")),
        hatch("other", 6, 0, el("path", d="M0,0L6,6M6,0L0,6", class_="stroke-other")),
        hatch("doubt", 5, 0, line(0, 2.5, 2, 2.5, class_="stroke-doubt")),
    )  # fmt: skip


def ground(section: Section, uid: str) -> str:
    """Hatched ground, its line, and the curve of a level surface where the bulge can be seen."""
    xs, ys = section.x.all(section.distance_m), section.y.all(section.ground_drawn)
    bottom = section.y.from_px
    body = points([xs[0], *xs, xs[-1]], [bottom, *ys, bottom]) + "Z"
    drawn = el("path", d=body, fill=f"url(#{uid}-ground)")
    edges = np.flatnonzero(np.r_[True, np.diff(section.sea.astype(int)) != 0, True])
    for start, stop in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
        if section.sea[start]:
            run_x, run_y = xs[start:stop], ys[start:stop]
            shape = points([run_x[0], *run_x, run_x[-1]], [bottom, *run_y, bottom]) + "Z"
            drawn += el("path", d=shape, fill=f"url(#{uid}-sea)")
    drawn += el("path", d=points(xs, ys), class_="ground-line")
    if section.level_arc_m is not None:
        arc = [min(y, bottom) for y in section.y.all(section.level_arc_m)]
        drawn += el("path", d=points(xs, arc), class_="level-arc")
    return drawn


def cover(section: Section, uid: str) -> str:
    """Cover between ground and surface, one path a kind, so that a thousand trees stay one element."""
    xs, low, high = (
        section.x.all(section.distance_m),
        section.y.all(section.ground_drawn),
        section.y.all(section.surface_drawn),
    )
    kinds = np.where(section.surface_drawn - section.ground_drawn > 0.05, section.cover_kind, 0)
    edges = np.flatnonzero(np.r_[True, np.diff(kinds) != 0, True])
    shapes: dict[int, list[str]] = {}
    for start, stop in zip(edges[:-1].tolist(), edges[1:].tolist(), strict=True):
        if kinds[start] == 0:
            continue
        run_x = xs[start:stop]
        if run_x[-1] - run_x[0] < 1.6:
            middle = (run_x[0] + run_x[-1]) / 2.0
            top, base = min(high[start:stop]), max(low[start:stop])
            outline = points([middle - 0.8, middle - 0.8, middle + 0.8, middle + 0.8], [base, top, top, base])
        else:
            outline = points([*run_x, *reversed(run_x)], [*high[start:stop], *reversed(low[start:stop])])
        shapes.setdefault(int(kinds[start]), []).append(outline + "Z")
    return "".join(
        el("path", d="".join(parts), class_=f"cover cover-{COVER_KINDS[kind]}", fill=f"url(#{uid}-{COVER_KINDS[kind]})")
        for kind, parts in sorted(shapes.items())
    )


def doubt(section: Section, uid: str) -> str:
    """How far the errors of the data may move the surface, as a pale band around it; nothing where it would be a hair."""
    reach = section.doubt_m
    if reach is None:
        return ""
    xs = section.x.all(section.distance_m)
    upper, lower = section.y.all(section.checked_drawn + reach), section.y.all(section.checked_drawn - reach)
    body = points([*xs, *reversed(xs)], [*upper, *reversed(lower)]) + "Z"
    return el("path", d=body, fill=f"url(#{uid}-doubt)", class_="doubt") + el(
        "path", d=points(xs, upper), class_="doubt-edge"
    )


def zone(section: Section) -> str:
    """The whole first Fresnel zone lightly, its required part as a lens, and the straight sight line."""
    length = section.profile.length_m
    # Spaced by the cosine: the lens is round at its ends, where even steps would cut corners.
    at = 0.5 * length * (1.0 - np.cos(np.linspace(0.0, np.pi, LENS_POINTS)))
    at = np.unique(np.append(at, section.criterion.worst_at_m))
    levels = section.plan.levels
    ray = np.interp(at, levels.distance_m, levels.available_m)
    radius = np.interp(at, levels.distance_m, levels.fresnel_radius_m)
    xs, middle = section.x.all(at), section.y.all(ray)
    upper, lower = section.y.all(ray + radius), section.y.all(ray - radius)
    needed = section.y.all(ray - section.criterion.required_fraction * radius)
    drawn = el("path", d=points([*xs, *reversed(xs)], [*upper, *reversed(lower)]) + "Z", class_="zone-whole")
    if section.criterion.required_fraction > 0.0:
        drawn += el("path", d=points([*xs, *reversed(xs)], [*middle, *reversed(needed)]) + "Z", class_="zone-required")
    return drawn + line(xs[0], middle[0], xs[-1], middle[-1], class_="sight-line")


def obstructed(section: Section) -> str:
    """Stretches that reach into the required zone, thick along the surface."""
    parts = []
    for item in section.criterion.obstructions:
        inside = np.flatnonzero((section.distance_m >= item.from_m - 1e-6) & (section.distance_m <= item.to_m + 1e-6))
        if inside.size == 0:
            continue
        xs, ys = _upper_edge(section.x.all(section.distance_m[inside]), section.y.all(section.checked_drawn[inside]))
        if xs[-1] - xs[0] < 5.0:
            xs, ys = [xs[0] - 2.5, *xs, xs[-1] + 2.5], [ys[0], *ys, ys[-1]]
        parts.append(el("path", d=points(xs, ys), class_="cut-sight" if item.cuts_sight else "cut-zone"))
    return "".join(parts)


def _upper_edge(xs: list[float], ys: list[float]) -> tuple[list[float], list[float]]:
    """The highest point in every 4 units, so that a thick line over rough tops stays a line."""
    tops: dict[int, tuple[float, float]] = {}
    for x, y in zip(xs, ys, strict=True):
        column = int(x // 4.0)
        if column not in tops or y < tops[column][1]:
            tops[column] = (x, y)
    edge = [(xs[0], ys[0]), *tops.values(), (xs[-1], ys[-1])]
    return [x for x, _ in edge], [y for _, y in edge]


def mast(section: Section, end: EndResult, *, at_b: bool) -> str:
    """Roof and mast to scale, with their heights dimensioned outside the path."""
    sheet, side = section.sheet, 1.0 if at_b else -1.0
    x = section.x.to_px if at_b else section.x.from_px
    foot, top = section.y.at(end.ground_m), section.y.at(end.antenna_amsl_m)
    stops: list[tuple[float, float, str, float]] = []
    drawn = ""
    roof_px = foot
    if end.roof_m:
        roof_px = section.y.at(end.ground_m + end.roof_m)
        left = min(x + side * 13.0, x - side * 6.0)
        drawn += el("rect", x=left, y=roof_px, width=19.0, height=max(foot - roof_px, 1.0), class_="roof")
        stops.append((foot, roof_px, "roof ", end.roof_m))
    mast_height = end.antenna_amsl_m - end.ground_m - (end.roof_m or 0.0)
    stops.append((roof_px, top, "mast " if end.roof_m else "", mast_height))
    drawn += line(x, roof_px, x, top, class_="mast") + _dish(x, top, facing=-side)
    dim_x = x + side * (20.0 if sheet.roomy else 13.0)
    text_y = [(low + high) / 2.0 + sheet.small * 0.35 for low, high, _, _ in stops]
    if len(text_y) == 2 and text_y[0] - text_y[1] < sheet.small * 1.1:
        middle = (text_y[0] + text_y[1]) / 2.0
        text_y = [middle + sheet.small * 0.55, middle - sheet.small * 0.55]
    for (low, high, word, height), y in zip(stops, text_y, strict=True):
        drawn += _dimension(dim_x, low, high) + line(x + side * 3.0, high, dim_x + side * 4.0, high, class_="extension")
        content = (word if sheet.roomy else "") + metres(height)
        drawn += label(dim_x + side * 6.0, y, content, class_="dim-text", anchor="start" if at_b else "end")
    drawn += line(x + side * 3.0, foot, dim_x + side * 4.0, foot, class_="extension")
    return el("g", drawn, class_="end-b" if at_b else "end-a")


def _dish(x: float, y: float, *, facing: float) -> str:
    return el("path", d=f"M{num(x)},{num(y - 5)}Q{num(x + facing * 7)},{num(y)} {num(x)},{num(y + 5)}Z", class_="dish")


def _arrow(x: float, y: float, *, down: bool) -> str:
    tail = -6.0 if down else 6.0
    return el("path", d=f"M{num(x)},{num(y)}l-2.4,{num(tail)}h4.8z", class_="arrow")


def _dimension(x: float, low: float, high: float) -> str:
    """A vertical dimension line from `low` up to `high` (sheet units); arrows stand outside where it is short."""
    if low - high >= 16.0:
        return line(x, low, x, high, class_="dim") + _arrow(x, low, down=True) + _arrow(x, high, down=False)
    outside = line(x, low, x, low + 12.0, class_="dim") + line(x, high, x, high - 12.0, class_="dim")
    return outside + _arrow(x, low, down=False) + _arrow(x, high, down=True)


def _share_words(item: CriterionResult) -> str:
    """The share of the zone that is free, where that says more than a curious number."""
    if item.worst_fraction is None:
        return ""
    if item.clearance_m < 0.0:
        return f"; it stands {missing(-item.clearance_m)} above the sight line"
    if item.required_fraction == 0.0:
        return "; only the sight line must be free at this k"
    if item.worst_fraction > 1.5:
        return "; more than the whole zone is free"
    return f"; {share(item.worst_fraction)} of the zone is free, {percent(item.required_fraction)} is required"


def shortfall_mark(x: float, y: float) -> str:
    """The sign of the greatest shortfall."""
    return el("path", d=f"M{num(x)},{num(y - 6)}l5,6l-5,6l-5,-6z", class_="shortfall-point")


def governing(section: Section, *, callout_y: float) -> str:
    """The governing point with its dimension, and the callout in the sky above it."""
    item, sheet = section.criterion, section.sheet
    surface = item.surface_m + item.bulge_m
    needed = item.available_m - item.required_m
    x, y, y_needed = section.x.at(item.worst_at_m), section.y.at(surface), section.y.at(needed)
    low, high = max(y, y_needed), min(y, y_needed)
    met = "met" if item.met else "short"
    first = governing_words(item, section.profile.length_m)
    if section.other_shortfall:
        first = (
            f"Least share of the zone: {first}" if sheet.roomy else first.replace("of the required clearance", "here")
        )
    free = _share_words(item)
    where = f"{distance(item.worst_at_m)} from A: {item.cause}" if item.cause else f"{distance(item.worst_at_m)} from A"
    room = 96 if sheet.roomy else 50
    second = where + free if len(where + free) <= room else where
    shown = shorten(second, room)
    half = max(len(first) * sheet.font * 0.62, len(shown) * sheet.small * 0.56) / 2.0
    middle = min(max(x, half + 4.0), sheet.width - half - 4.0)
    under = callout_y + sheet.line_height * 2.0 - sheet.font * 0.1
    tip = high - (14.0 if low - high < 16.0 else 2.0)
    drawn = [
        line(x, under, x, max(tip, under), class_="leader"),
        _dimension(x, low, high),
        line(x - 9, y, x + 9, y, class_="extension"),
        line(x - 9, y_needed, x + 9, y_needed, class_="extension"),
        el("circle", el("title", f"Governing point: {first}"), cx=x, cy=y, r=4, class_="governing-point"),
        label(middle, callout_y + sheet.font, first, class_=f"callout {met}", anchor="middle"),
        label(
            middle,
            callout_y + sheet.font + sheet.line_height,
            shown,
            class_="callout-more",
            anchor="middle",
            hint=second,
        ),
    ]
    if section.other_shortfall:
        index = int(np.argmin(np.abs(section.distance_m - item.shortfall_at_m)))
        place = section.x.at(item.shortfall_at_m), section.y.at(float(section.checked_drawn[index]))
        drawn.append(shortfall_mark(*place))
    spare = words.spare_m(item, length_m=section.profile.length_m)
    return el(
        "g", *drawn, class_=f"governing {met}", data_at_m=repr(item.worst_at_m), data_level_m=repr(surface),
        data_needed_m=repr(needed), data_available_m=repr(item.available_m),
        data_spare_m=repr(item.clearance_m - item.required_m), data_label=number(spare),
    )  # fmt: skip
