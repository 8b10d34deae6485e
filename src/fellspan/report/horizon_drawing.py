"""The horizon sketch as an inline SVG: outlines by distance, landmarks with bearings, the far site, the beam of the antenna.

Shows what a Skyline holds and computes none of it. Layers differ in weight and dash, so that the sketch reads in grey.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from fellspan.links.skyline import BANDS, Landmark, LayerName, Skyline
from fellspan.report import svg, wording
from fellspan.report.scales import Scale, nice_ticks

WIDTH: Final = 1000.0
_LEFT, _RIGHT, _TOP = 52.0, WIDTH - 14.0, 132.0
_PLOT: Final = 210.0
_LEAST_SPAN_DEG: Final = 2.5
_LANES: Final = 4
_LANE_PX: Final = 26.0
_LABEL_PX: Final = 150.0
_PLAIN_DEG: Final = (-24.0, -12.0, 12.0, 24.0)
_LAYER_WORDS: Final[dict[LayerName, str]] = {"near": "up to 1 km", "middle": "1 to 5 km", "far": "beyond 5 km"}


@dataclass(frozen=True, slots=True, kw_only=True)
class Target:
    """The far site in the sketch: its name, tilt and distance; `hidden_by` is None where the sight line is free.

    `declination_deg` is that of this end, `width_deg` half-power widths of the antenna here in azimuth and elevation, and
    `boresight_deg` where it points: bearing and tilt.
    """

    name: str
    tilt_deg: float
    distance_m: float
    hidden_by: str | None
    declination_deg: float | None
    width_deg: tuple[float | None, float | None]
    boresight_deg: tuple[float, float]


def draw_horizon(seen: Skyline, target: Target, *, uid: str, title: str) -> str:
    """An SVG element; the description in it says the same in words."""
    across = Scale(
        from_value=float(seen.offset_deg[0]), to_value=float(seen.offset_deg[-1]), from_px=_LEFT, to_px=_RIGHT
    )
    up = _up(seen, target)
    clip = svg.el("rect", x=_LEFT, y=_TOP, width=_RIGHT - _LEFT, height=_PLOT)
    inside = [*_outlines(seen, across, up), *_beam(seen, target, across, up)]
    height = _TOP + _PLOT + (62.0 if target.declination_deg is None else 82.0)
    parts = [
        svg.el("clipPath", clip, id=f"{uid}-c"),
        svg.el("rect", x=_LEFT, y=_TOP, width=_RIGHT - _LEFT, height=_PLOT, class_="frame"),
        *_levels(up),
        svg.el("g", *inside, clip_path=f"url(#{uid}-c)"),
        *_far_site(target, across, up),
        *_labels(seen, across, up),
        *_bearings(seen, target, across),
    ]
    return svg.el(
        "svg",
        svg.el("title", svg.text(title), id=f"{uid}-t"),
        svg.el("desc", svg.text(horizon_words(seen, target)), id=f"{uid}-d"),
        *parts,
        class_="horizon",
        viewBox=f"0 0 {svg.num(WIDTH)} {svg.num(height)}",
        role="img",
        aria_labelledby=f"{uid}-t {uid}-d",
        xmlns="http://www.w3.org/2000/svg",
    )


def horizon_words(seen: Skyline, target: Target) -> str:
    """The sketch in words."""
    hidden = "in sight" if target.hidden_by is None else f"hidden by {target.hidden_by}"
    words = [
        (
            f"{target.name} stands at {wording.bearing(seen.bearing_deg)} true, "
            f"{wording.degrees(target.tilt_deg, 2, sign=True)}, {wording.distance(target.distance_m)} away, {hidden}."
        )
    ]
    if seen.landmarks:
        marks = "; ".join(landmark_words(mark, seen.bearing_deg) for mark in seen.landmarks)
        words.append(f"Landmarks from left to right: {marks}.")
    else:
        words.append("No summit stands out of the skyline.")
    wide, high = target.width_deg
    if wide is not None and high is not None:
        words.append(
            f"Half-power beam of the antenna (brackets): {wording.degrees(wide)} in azimuth, "
            f"{wording.degrees(high)} in elevation."
        )
    return " ".join(words)


def landmark_words(mark: Landmark, bearing_deg: float) -> str:
    """`quay crane at 068.2° true, 14.2° left of the link, +0.16° up, 5.76 km away`."""
    return (
        f"{mark.what} at {wording.bearing(mark.bearing_deg)} true, {side_words(mark.bearing_deg, bearing_deg)}, "
        f"{wording.degrees(mark.elevation_deg, 2, sign=True)}, {wording.distance(mark.distance_m)} away"
    )


def side_words(mark_deg: float, bearing_deg: float) -> str:
    """How far a bearing lies left or right of the link."""
    off = offset_deg(mark_deg, bearing_deg)
    return f"{wording.degrees(abs(off))} {'right' if off >= 0.0 else 'left'} of the link"


def offset_deg(mark_deg: float, bearing_deg: float) -> float:
    """Signed angle from the link to a bearing, degrees, clockwise positive."""
    return (mark_deg - bearing_deg + 180.0) % 360.0 - 180.0


def _up(seen: Skyline, target: Target) -> Scale:
    finite = seen.elevation_deg[np.isfinite(seen.elevation_deg)]
    values = [target.tilt_deg, *([float(finite.min()), float(finite.max())] if finite.size else [])]
    low, high = min(values), max(values)
    # A wall next to the antenna would flatten all that can be aimed by.
    high = min(high, max(target.tilt_deg, 0.0) + 20.0)
    low = max(low, min(target.tilt_deg, 0.0) - 20.0)
    spare = max(0.12 * (high - low), 0.5 * (_LEAST_SPAN_DEG - (high - low)))
    return Scale(from_value=low - spare, to_value=high + spare, from_px=_TOP + _PLOT, to_px=_TOP)


def _outlines(seen: Skyline, across: Scale, up: Scale) -> list[str]:
    """From far to near, each filled so that it hides what stands behind it."""
    parts = []
    for layer in reversed(seen.layers):
        angle = layer.elevation_deg
        has = np.isfinite(angle)
        edges = np.flatnonzero(np.diff(np.concatenate(([False], has, [False])).astype(np.int8)))
        for start, stop in zip(edges[::2].tolist(), edges[1::2].tolist(), strict=True):
            if stop - start < 2:
                continue
            held = np.clip(angle[start:stop], up.from_value - 1.0, up.to_value + 1.0)
            line = svg.points(across.all(seen.offset_deg[start:stop]), up.all(held))
            left, right = across.at(float(seen.offset_deg[start])), across.at(float(seen.offset_deg[stop - 1]))
            area = f"{line}L{svg.num(right)},{svg.num(_TOP + _PLOT)}H{svg.num(left)}Z"
            parts.append(svg.el("path", d=area, class_=f"land land-{layer.name}"))
            parts.append(svg.el("path", d=line, class_=f"outline outline-{layer.name}"))
    return parts


def _levels(up: Scale) -> list[str]:
    parts = []
    span = up.to_value - up.from_value
    for angle in nice_ticks(up.from_value, up.to_value, 6):
        y = up.at(angle)
        parts.append(svg.line(_LEFT, y, _RIGHT, y, class_="level" if abs(angle) > 1e-9 else "level zero"))
        shown = wording.degrees(angle, 0 if span > 6.0 else 1, sign=True)
        parts.append(svg.label(_LEFT - 6.0, y + 5.0, shown, class_="axis", anchor="end"))
    return parts


def _beam(seen: Skyline, target: Target, across: Scale, up: Scale) -> list[str]:
    """Half-power width as brackets about the boresight: a level one for azimuth, an upright one for elevation."""
    off = offset_deg(target.boresight_deg[0], seen.bearing_deg)
    x, y = across.at(off), up.at(target.boresight_deg[1])
    wide, high = target.width_deg
    parts = []
    if wide is not None and wide < 180.0:
        left, right = across.at(off - 0.5 * wide), across.at(off + 0.5 * wide)
        at = _TOP + _PLOT - 10.0
        parts.append(svg.el("path", d=_bracket(left, at, right, at), class_="beam"))
    if high is not None and high < 180.0:
        low, top = up.at(target.boresight_deg[1] - 0.5 * high), up.at(target.boresight_deg[1] + 0.5 * high)
        aside = x + 26.0
        parts.append(svg.el("path", d=_bracket(aside, top, aside, low), class_="beam"))
        parts.append(svg.line(x, y, aside, y, class_="beam-lead"))
    return parts


def _bracket(x1: float, y1: float, x2: float, y2: float) -> str:
    n = svg.num
    if y1 == y2:
        return f"M{n(x1)},{n(y1 - 6)}V{n(y1 + 6)}M{n(x1)},{n(y1)}H{n(x2)}M{n(x2)},{n(y1 - 6)}V{n(y1 + 6)}"
    return f"M{n(x1 - 6)},{n(y1)}H{n(x1 + 6)}M{n(x1)},{n(y1)}V{n(y2)}M{n(x1 - 6)},{n(y2)}H{n(x1 + 6)}"


def _far_site(target: Target, across: Scale, up: Scale) -> list[str]:
    """The axis of the link, and the far site on it: solid where it is in sight, broken where it is hidden."""
    x, y = across.at(0.0), up.at(target.tilt_deg)
    hidden = target.hidden_by is not None
    state = "hidden" if hidden else "seen"
    words = wording.shorten(target.name, 40)
    more = f"{wording.distance(target.distance_m)}, {'in sight' if not hidden else 'hidden by ' + (target.hidden_by or '')}"
    return [
        svg.line(x, 46.0, x, _TOP + _PLOT, class_="link-axis"),
        svg.el("circle", cx=x, cy=y, r=8.0, class_=f"far-site {state}"),
        svg.line(x - 13.0, y, x + 13.0, y, class_=f"far-cross {state}"),
        svg.line(x, y - 13.0, x, y + 13.0, class_=f"far-cross {state}"),
        svg.label(x, 18.0, words, class_="far-name", anchor="middle", hint=target.name),
        svg.label(x, 37.0, wording.shorten(more, 90), class_="far-more", anchor="middle", hint=more),
    ]


def _plain(seen: Skyline) -> list[tuple[float, float, str, float]]:
    """Bearing, elevation and distance of the skyline at even steps, for one without a summit to name; not where it is open."""
    found = []
    for wanted in _PLAIN_DEG:
        at = int(np.argmin(np.abs(seen.offset_deg - wanted)))
        if np.isfinite(seen.elevation_deg[at]) and seen.distance_m[at] < seen.reach_m[at] - 1.0:
            bearing = (seen.bearing_deg + float(seen.offset_deg[at])) % 360.0
            found.append((bearing, float(seen.elevation_deg[at]), "skyline", float(seen.distance_m[at])))
    return found


def _labels(seen: Skyline, across: Scale, up: Scale) -> list[str]:
    """Bearing, what and how far of each landmark, in lanes above the sketch with a leader down to it."""
    ends = [-math.inf] * _LANES
    parts = []
    axis = across.at(0.0)
    marks = [(one.bearing_deg, one.elevation_deg, one.what, one.distance_m) for one in seen.landmarks] or _plain(seen)
    for bearing, elevation, what, distance_m in marks:
        x = across.at(offset_deg(bearing, seen.bearing_deg))
        y = min(max(up.at(elevation), _TOP), _TOP + _PLOT)
        start = min(max(x - 4.0, _LEFT), _RIGHT - _LABEL_PX)
        # Words never stand on the line to the far site: they end left of it where its landmark stands left of it.
        leftward = x <= axis < start + _LABEL_PX + 4.0
        if leftward:
            start = min(x + 4.0, axis - 4.0) - _LABEL_PX
        elif axis < x < axis + 8.0:
            start = axis + 4.0
        lane = next((i for i in range(_LANES) if start >= ends[i] + 8.0), None)
        if lane is None:
            continue
        lane_y = _TOP - 8.0 - lane * _LANE_PX * 0.8
        if lane_y < 60.0 and abs(x - axis) < 240.0:
            continue
        ends[lane] = start + _LABEL_PX
        parts.append(svg.line(x, lane_y + 4.0, x, y, class_="leader"))
        parts.append(svg.el("path", d=f"M{svg.num(x - 4)},{svg.num(y - 6)}h8l-4,6z", class_="summit"))
        full = f"{wording.bearing(bearing)} {what}, {wording.distance(distance_m)}"
        words = wording.shorten(full, 27)
        if leftward:
            parts.append(svg.label(start + _LABEL_PX, lane_y, words, class_="mark", hint=full, anchor="end"))
        else:
            parts.append(svg.label(start, lane_y, words, class_="mark", hint=full))
    return parts


def _bearings(seen: Skyline, target: Target, across: Scale) -> list[str]:
    """True bearings below the sketch, and magnetic ones under them."""
    parts = []
    base = _TOP + _PLOT
    rows = [("true", 0.0, base + 20.0)]
    if target.declination_deg is not None:
        rows.append(("magnetic", target.declination_deg, base + 40.0))
    low, high = seen.bearing_deg + across.from_value, seen.bearing_deg + across.to_value
    for word, declination, y in rows:
        parts.append(svg.label(_LEFT - 6.0, y, word if word == "true" else "magn.", class_="axis", anchor="end"))
        for bearing in nice_ticks(low - declination, high - declination, 12):
            x = across.at(bearing + declination - seen.bearing_deg)
            if x < _LEFT + 14.0 or x > _RIGHT - 14.0:
                continue
            if word == "true":
                parts.append(svg.line(x, base, x, base + 6.0, class_="tick"))
            shown = f"{round(bearing) % 360:03d}°"
            parts.append(svg.label(x, y, shown, class_="axis", anchor="middle"))
    end = rows[-1][2]
    magnetic = (
        ""
        if target.declination_deg is None
        else f", {wording.bearing(seen.bearing_deg - target.declination_deg)} magnetic"
    )
    words = (
        f"link {wording.bearing(seen.bearing_deg)} true{magnetic}; elevation in degrees at k {wording.k_factor(seen.k)}"
    )
    parts.append(svg.label(_LEFT, end + 24.0, words, class_="note"))
    x = _RIGHT
    for name, _ in reversed(BANDS):
        word = _LAYER_WORDS[name]
        x -= 84.0
        parts.append(svg.label(x, end + 24.0, word, class_="note"))
        parts.append(svg.line(x - 30.0, end + 19.0, x - 6.0, end + 19.0, class_=f"outline outline-{name}"))
        x -= 42.0
    return parts
