"""Axes, the band of levels under the path profile, the names over it and the key of its signs."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.links import words
from fellspan.links.result import EndResult
from fellspan.planning.plan import LinkPlan
from fellspan.report.profile_parts import shortfall_mark
from fellspan.report.scales import Placed, Scale, Wanted, nice_step, nice_ticks, place_labels, text_width
from fellspan.report.section import Section, Sheet
from fellspan.report.svg import el, label, line
from fellspan.report.wording import distance, kilometres, metres, missing, number, percent, shorten
from fellspan.terrain.profile import PathObstacle
from fellspan.vocabulary import COVER_KINDS

ROWS = (
    ("Distance from A, km", "km"),
    ("Ground, m", "ground"),
    ("Level required, m", "required"),
    ("Level available, m", "available"),
)
MOST_NAMES = 9
AXIS_NAME = {True: "m above sea level", False: "m asl"}


def stations(section: Section) -> list[float]:
    """Distances the band tells, m: both ends, the governing point, and round distances with room between."""
    sheet, length, governing = section.sheet, section.profile.length_m, section.criterion.worst_at_m
    chosen = [0.0, length]

    def room(place: float, gap: float) -> bool:
        return all(abs(section.x.at(place) - section.x.at(other)) >= gap for other in chosen)

    if room(governing, 0.75 * sheet.station_gap):
        chosen.append(governing)
    step = nice_step(length, sheet.stations)
    chosen += [place for place in np.arange(step, length, step).tolist() if room(place, sheet.station_gap)]
    return sorted(chosen)


def axes(section: Section) -> str:
    """Level axis with its lines across the plot."""
    sheet = section.sheet
    drawn = []
    for level in nice_ticks(section.y.from_value, section.y.to_value, 6 if sheet.plot_height > 180 else 4):
        y = section.y.at(level)
        if y < section.y.to_px + 4.0:
            continue
        drawn.append(line(sheet.axis_width, y, sheet.right, y, class_="grid"))
        drawn.append(line(sheet.axis_width - 4, y, sheet.axis_width, y, class_="tick-y", data_level_m=repr(level)))
        drawn.append(label(sheet.axis_width - 7, y + sheet.small * 0.35, number(level, 0), class_="axis", anchor="end"))
    drawn.append(line(sheet.axis_width, section.y.from_px, sheet.axis_width, section.y.to_px, class_="axis-line"))
    drawn.append(label(2, section.y.to_px - 4, AXIS_NAME[sheet.roomy], class_="axis"))
    return el("g", *drawn, class_="axis-y")


def band(section: Section, *, top: float) -> tuple[str, float]:
    """The rows of levels aligned with the drawing above; returns the markup and where it ends."""
    sheet, levels = section.sheet, section.plan.levels
    row_height = sheet.line_height * 1.22
    bottom = top + row_height * len(ROWS)
    need = levels.need_m[section.result.governing]
    drawn = []
    for row in range(len(ROWS) + 1):
        drawn.append(line(0, top + row * row_height, sheet.width, top + row * row_height, class_="band-line"))
    for row, (long, short) in enumerate(ROWS):
        baseline = top + row * row_height + row_height * 0.68
        drawn.append(label(2, baseline, long if sheet.roomy else short, class_="band-label"))
    bulge = levels.bulge_m[section.result.governing]

    def value(at: float, heights: NDArray[np.float64]) -> float:
        return float(np.interp(at, levels.distance_m, heights))

    for at in stations(section):
        x = section.x.at(at)
        here = " here" if at == section.criterion.worst_at_m else ""
        ground = value(at, section.profile.ground_m)
        column = [
            line(x, section.y.at(ground + value(at, bulge)), x, top, class_=f"ordinate{here}"),
            line(x, top - 5, x, top + 1, class_="tick-x", data_at_m=repr(at)),
        ]
        available, required = value(at, levels.available_m), value(at, need)
        if here:
            # So rounded that the two levels differ by the very number that the callout says.
            required = round(available, 1) - words.spare_m(section.criterion, length_m=section.profile.length_m)
        texts = (
            kilometres(at, length_m=section.profile.length_m),
            number(ground),
            number(required),
            number(available),
        )
        for row, content in enumerate(texts):
            baseline = top + row * row_height + row_height * 0.68
            column.append(label(x, baseline, content, class_=f"band-text{here}", anchor="middle"))
        surface = f"{value(at, levels.surface_m):.2f}"
        drawn.append(el("g", *column, class_="station", data_at_m=repr(at), data_surface_m=surface))
    return el("g", *drawn, class_="band"), bottom


def heading(section: Section, end: EndResult, *, at_b: bool) -> str:
    """Site name and antenna level over an end."""
    sheet = section.sheet
    x, anchor = (sheet.width - 2, "end") if at_b else (2.0, "start")
    letter = "B" if at_b else "A"
    name = shorten(end.site, 40 if sheet.roomy else 19)
    level = (
        f"antenna {metres(end.antenna_amsl_m)} above sea level" if sheet.roomy else f"{metres(end.antenna_amsl_m)} asl"
    )
    content = f"{name} · {letter}" if at_b else f"{letter} · {name}"
    return label(x, sheet.font * 1.05, content, class_="site", anchor=anchor, hint=end.site) + label(
        x, sheet.font * 1.05 + sheet.line_height, level, class_="site-more", anchor=anchor
    )


@dataclass(frozen=True, slots=True, kw_only=True)
class Named:
    """An obstacle whose name stands over the drawing."""

    obstacle: PathObstacle
    content: str
    spot: Placed


def choose_names(plan: LinkPlan, sheet: Sheet) -> list[Named]:
    """The obstacles that are named, those that come nearest to the sight line first, each in a lane of its own.

    One's own building has its site's name over it already. Lanes are given from right to left: a leader then never meets
    the name of its neighbour, which stands higher.
    """
    profile, criterion = plan.profile, plan.result.clearance[plan.result.governing]
    x = Scale(from_value=0.0, to_value=profile.length_m, from_px=sheet.left, to_px=sheet.right)
    ray = plan.levels.available_m

    def room(item: PathObstacle) -> float:
        return float(np.interp((item.from_m + item.to_m) / 2.0, profile.distance_m, ray)) - item.top_amsl_m

    ignored = plan.result.ignored
    others = [
        item for item in profile.obstacles
        if not any(own.from_m < item.to_m and item.from_m < own.to_m for own in ignored)
    ]  # fmt: skip
    nearest = sorted(others, key=lambda item: (criterion.cause != item.name, room(item)))[:MOST_NAMES]
    ordered = sorted(nearest, key=lambda item: -item.from_m)
    contents = [shorten(item.name, 26 if sheet.roomy else 15) for item in ordered]
    wanted = [
        Wanted(at=x.at((item.from_m + item.to_m) / 2.0), width=text_width(content, sheet.small))
        for item, content in zip(ordered, contents, strict=True)
    ]
    through = (x.at(criterion.worst_at_m),)
    # The name of the level axis stands at the left end of the lowest lane.
    placed = place_labels(
        wanted,
        low=text_width(AXIS_NAME[sheet.roomy], sheet.small) + 6.0,
        high=sheet.width,
        lanes=sheet.lanes,
        through=through,
    )
    return [
        Named(obstacle=item, content=content, spot=spot)
        for item, content, spot in zip(ordered, contents, placed, strict=True)
        if spot is not None
    ]


def obstacle_names(section: Section, named: list[Named], *, lanes_bottom: float) -> str:
    """Names of obstacles over the drawing, with leaders down to their tops."""
    sheet, drawn = section.sheet, []
    for item in named:
        obstacle, spot = item.obstacle, item.spot
        baseline = lanes_bottom - spot.lane * sheet.line_height - 4.0
        bulge = float(np.interp((obstacle.from_m + obstacle.to_m) / 2.0, section.distance_m, section.bulge_m))
        top = section.y.at(obstacle.top_amsl_m + bulge)
        drawn.append(line(spot.at, baseline - sheet.small * 0.7, spot.at, top - 1.0, class_="leader-thin"))
        hint = f"{obstacle.name}: {metres(obstacle.height_m)} above ground, top at {metres(obstacle.top_amsl_m)}"
        drawn.append(label(spot.start, baseline, item.content, class_="obstacle-name", hint=hint))
    return el("g", *drawn, class_="obstacles")


def key(section: Section, uid: str, *, top: float) -> tuple[str, float]:
    """What the signs mean, only those that stand in the drawing; returns the markup and where it ends."""
    sheet, criterion = section.sheet, section.criterion
    entries = [
        (line(0, -4, 24, -4, class_="sight-line"), "sight line"),
        (el("rect", x=0, y=-9, width=24, height=10, class_="zone-whole"), "first Fresnel zone"),
    ]
    if criterion.required_fraction > 0.0:
        words = f"required part ({percent(criterion.required_fraction)})"
        entries.append((el("rect", x=0, y=-9, width=24, height=10, class_="zone-required"), words))
    entries.append((el("rect", x=0, y=-9, width=24, height=10, fill=f"url(#{uid}-ground)", class_="swatch"),
                    "ground" if section.profile.ground_is_bare else "ground and what stands on it"))  # fmt: skip
    if section.sea.any():
        entries.append((el("rect", x=0, y=-9, width=24, height=10, fill=f"url(#{uid}-sea)", class_="swatch"), "sea"))
    if section.level_arc_m is not None:
        entries.append((line(0, -4, 24, -4, class_="level-arc"), "a level surface: the Earth's curve"))
    present = set(section.cover_kind[section.surface_drawn - section.ground_drawn > 0.05].tolist()) - {0}
    names = {"building": "building", "tree": "trees", "other": "other cover"}
    for kind in sorted(present):
        word = COVER_KINDS[kind]
        swatch = el("rect", x=0, y=-9, width=24, height=10, fill=f"url(#{uid}-{word})", class_=f"cover cover-{word}")
        entries.append((swatch, names[word]))
    if section.doubt_m is not None:
        swatch = el("rect", x=0, y=-9, width=24, height=10, fill=f"url(#{uid}-doubt)", class_="doubt-swatch")
        entries.append((swatch, "error of the data, 5 to 95 %"))
    if any(item.cuts_sight for item in criterion.obstructions):
        entries.append((line(0, -4, 24, -4, class_="cut-sight"), "cuts the sight line"))
    if any(not item.cuts_sight for item in criterion.obstructions):
        entries.append((line(0, -4, 24, -4, class_="cut-zone"), "reaches into the required part"))
    if section.other_shortfall:
        words = f"greatest missing height: {missing(criterion.shortfall_m)} at {distance(criterion.shortfall_at_m)}"
        entries.append((shortfall_mark(12.0, -4.0), words))
    x, y = 2.0, top + sheet.line_height
    drawn = []
    for swatch, words in entries:
        width = 30.0 + text_width(words, sheet.small) + 14.0
        if x + width > sheet.width and x > 2.0:
            x, y = 2.0, y + sheet.line_height * 1.1
        drawn.append(el("g", swatch, label(30, 0, words, class_="key-text"), transform=f"translate({x:.1f} {y:.1f})"))
        x += width
    return el("g", *drawn, class_="key"), y + sheet.font * 0.6
