"""The trade-off of two mast heights as an inline SVG: what works, the planned pair, the pairs to build, the mast steps.

Height at A goes to the right, at B up. Shows what design found and computes nothing of it.
"""

from typing import Final

from fellspan.design.heights_result import HEIGHT_WORDS, HeightOption, HeightsResult, Pair
from fellspan.report import svg, wording
from fellspan.report.scales import Scale, nice_ticks, text_width

WIDTH, HEIGHT = 450.0, 350.0
_LEFT, _RIGHT, _TOP, _BOTTOM = 54.0, WIDTH - 16.0, 34.0, HEIGHT - 46.0
_LEAST_SPAN_M: Final = 8.0
_MOST_M: Final = 120.0
"""Pairs beyond this are told in the table alone: they would flatten the part that people can build."""
_MOST_STEPS: Final = 45

_NOTE_PX: Final = 12.5
_LETTER_PX: Final = 6.4
"""Width that a letter of the words beside a mark takes at most, on average."""

Box = tuple[float, float, float, float]
"""Left, top, right, bottom."""
Corners = tuple[tuple[float, float], ...]


def draw_heights(heights: HeightsResult, *, uid: str, names: tuple[str, str]) -> str:
    """An SVG element; `names` are those of the sites at A and B."""
    across, up = _scales(heights)
    clip = svg.el("rect", x=_LEFT, y=_TOP, width=_RIGHT - _LEFT, height=_BOTTOM - _TOP)
    parts = [svg.el("clipPath", clip, id=f"{uid}-c"), *_grid(across, up, heights.step_m)]
    inside = [
        _works(heights.boundary_confident, across, up),
        _edge(heights.boundary, across, up, "edge-exact", closed=True),
        _edge(heights.boundary_confident, across, up, "edge-sure", closed=False),
    ]
    parts.append(svg.el("g", *inside, clip_path=f"url(#{uid}-c)"))
    parts += _marks(heights, across, up)
    parts.append(svg.label(_LEFT, 18.0, wording.shorten(f"mast at B, m ({names[1]})", 44), class_="axis"))
    mast_a = wording.shorten(f"mast at A, m ({names[0]})", 44)
    parts.append(svg.label(_RIGHT, HEIGHT - 6.0, mast_a, class_="axis", anchor="end"))
    return svg.el(
        "svg",
        svg.el("title", svg.text("Height at A against height at B"), id=f"{uid}-t"),
        svg.el("desc", svg.text(heights_words(heights)), id=f"{uid}-d"),
        *parts,
        class_="beam-view heights",
        viewBox=f"0 0 {svg.num(WIDTH)} {svg.num(HEIGHT)}",
        role="img",
        aria_labelledby=f"{uid}-t {uid}-d",
        xmlns="http://www.w3.org/2000/svg",
    )


def shows_what_works(heights: HeightsResult) -> bool:
    """Whether a pair of heights with the confidence asked lies on the sheet."""
    across, up = _scales(heights)
    return heights.planned_holds or any(_fits(option, across, up) for option in heights.options)


def heights_words(heights: HeightsResult) -> str:
    """The drawing in words: the planned pair and every pair to build."""
    parts = [f"Planned: {_pair_words(heights.planned)}."]
    for option in heights.options:
        words = HEIGHT_WORDS[option.kind]
        if option.build is not None:
            parts.append(f"{words[0].upper()}{words[1:]}: {_pair_words(option.build)}.")
    return " ".join(parts)


def _pair_words(pair: Pair) -> str:
    return f"{wording.metres(pair.a_m)} at A, {wording.metres(pair.b_m)} at B"


def _scales(heights: HeightsResult) -> tuple[Scale, Scale]:
    pairs = [option.build for option in heights.options if option.build is not None]
    shown = [heights.planned, *(pair for pair in pairs if max(pair.a_m, pair.b_m) <= _MOST_M)]
    spans = []
    for values in ([pair.a_m for pair in shown], [pair.b_m for pair in shown]):
        spans.append(max(1.15 * max(values), _LEAST_SPAN_M))
    return (
        Scale(from_value=0.0, to_value=spans[0], from_px=_LEFT, to_px=_RIGHT),
        Scale(from_value=0.0, to_value=spans[1], from_px=_BOTTOM, to_px=_TOP),
    )


def _grid(across: Scale, up: Scale, step_m: float) -> list[str]:
    """Mast steps as a fine grid where they can be told apart, then the figures."""
    parts = [svg.el("rect", x=_LEFT, y=_TOP, width=_RIGHT - _LEFT, height=_BOTTOM - _TOP, class_="frame")]
    fine = ""
    for number in range(1, int(across.to_value / step_m) + 1) if across.to_value / step_m <= _MOST_STEPS else ():
        fine += f"M{svg.num(across.at(number * step_m))},{svg.num(_TOP)}V{svg.num(_BOTTOM)}"
    for number in range(1, int(up.to_value / step_m) + 1) if up.to_value / step_m <= _MOST_STEPS else ():
        fine += f"M{svg.num(_LEFT)},{svg.num(up.at(number * step_m))}H{svg.num(_RIGHT)}"
    if fine:
        parts.append(svg.el("path", d=fine, class_="mast-steps"))
    for height in nice_ticks(0.0, across.to_value, 8):
        x = across.at(height)
        parts.append(svg.line(x, _BOTTOM, x, _BOTTOM + 4.0, class_="grid-line"))
        parts.append(svg.label(x, _BOTTOM + 17.0, wording.number(height, 0), class_="axis", anchor="middle"))
    for height in nice_ticks(0.0, up.to_value, 8):
        y = up.at(height)
        parts.append(svg.line(_LEFT - 4.0, y, _LEFT, y, class_="grid-line"))
        parts.append(svg.label(_LEFT - 7.0, y + 4.5, wording.number(height, 0), class_="axis", anchor="end"))
    return parts


def _places(corners: Corners, across: Scale, up: Scale) -> tuple[list[float], list[float]]:
    """Corners on the sheet; what lies far outside is held just outside, so that coordinates stay short."""
    xs = [min(across.at(a), 4.0 * WIDTH) for a, _ in corners]
    ys = [max(up.at(b), -4.0 * HEIGHT) for _, b in corners]
    return xs, ys


def _works(corners: Corners, across: Scale, up: Scale) -> str:
    """What works with the confidence asked: all that lies right of and above the edge."""
    if not corners:
        return ""
    xs, ys = _places(corners, across, up)
    far_x, far_y = max(xs[-1], _RIGHT) + 1.0, -4.0 * HEIGHT
    return svg.el("path", d=svg.points([xs[0], *xs, far_x, far_x], [far_y, *ys, ys[-1], far_y]) + "Z", class_="works")


def _edge(corners: Corners, across: Scale, up: Scale, class_: str, *, closed: bool) -> str:
    if not corners:
        return ""
    xs, ys = _places(corners, across, up)
    if closed:
        # The exact edge ends upright over its first corner and level beyond its last.
        xs, ys = [xs[0], *xs, max(xs[-1], _RIGHT) + 1.0], [-4.0 * HEIGHT, *ys, ys[-1]]
    return svg.el("path", d=svg.points(xs, ys), class_=class_)


def _marks(heights: HeightsResult, across: Scale, up: Scale) -> list[str]:
    """The planned pair and the pairs to build, each with its words; equal pairs share a mark."""
    words: dict[tuple[float, float], list[str]] = {}
    for option in heights.options:
        if option.build is not None and _fits(option, across, up):
            words.setdefault((option.build.a_m, option.build.b_m), []).append(HEIGHT_WORDS[option.kind].split(",")[0])
    marks = [*words.items(), ((heights.planned.a_m, heights.planned.b_m), ["planned"])]
    taken = [(across.at(a) - 6.0, up.at(b) - 6.0, across.at(a) + 6.0, up.at(b) + 6.0) for (a, b), _ in marks]
    parts = []
    for (a, b), named in marks:
        x, y = across.at(a), up.at(b)
        mark = "planned-pair" if named == ["planned"] else "built-pair"
        parts.append(svg.el("circle", cx=x, cy=y, r=4.5, class_=mark))
        shown = f"{', '.join(named)}: {a:.4g}, {b:.4g}"
        box, anchor = _free(x, y, _LETTER_PX * len(shown), taken)
        taken.append(box)
        start = box[0] if anchor == "start" else box[2]
        parts.append(svg.plate(start, box[3] - 3.0, text_width(shown, _NOTE_PX), anchor=anchor))
        parts.append(svg.label(start, box[3] - 3.0, shown, class_="note", anchor=anchor))
    return parts


def _free(x: float, y: float, width: float, taken: list[Box]) -> tuple[Box, str]:
    """Where words stand beside their mark: the nearest place inside the frame that meets neither words nor marks."""
    right_first = x <= (_LEFT + _RIGHT) / 2.0
    found: list[tuple[Box, str]] = []
    for down in (4.0, -8.0, 16.0, -20.0, 28.0, -32.0, 40.0, -44.0):
        for right in (right_first, not right_first):
            start = x + 8.0 if right else x - 8.0 - width
            box = (start, y + down - 10.0, start + width, y + down + 3.0)
            if box[0] >= _LEFT and box[2] <= _RIGHT and box[1] >= _TOP and box[3] <= _BOTTOM:
                found.append((box, "start" if right else "end"))
    # Words too long for either side stand over or under their mark.
    start = max(min(x - 0.5 * width, _RIGHT - width), _LEFT)
    found += [((start, y + down - 10.0, start + width, y + down + 3.0), "start") for down in (-12.0, 20.0, -26.0, 34.0)]
    clear = [one for one in found if not any(_meet(one[0], other) for other in taken)]
    return (clear or found)[0]


def _meet(one: Box, other: Box) -> bool:
    return one[0] < other[2] and other[0] < one[2] and one[1] < other[3] and other[1] < one[3]


def _fits(option: HeightOption, across: Scale, up: Scale) -> bool:
    pair = option.build
    return pair is not None and pair.a_m <= across.to_value and pair.b_m <= up.to_value
