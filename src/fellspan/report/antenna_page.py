"""The page of an antenna, or of several compared: facts and diagrams, everything inside itself; and the diagrams as files."""

from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup

from fellspan import __version__
from fellspan.antennas.pattern import Plane
from fellspan.report import assets, wording
from fellspan.report.antenna_sheet import PLANE_OF_FIELD, AntennaSheet, sheet_rows
from fellspan.report.beam_drawing import draw_beam, is_narrow
from fellspan.report.footprint_drawing import NARROW_WIDTH, contour_words, draw_footprint
from fellspan.report.polar_drawing import LETTERS, MOST_CURVES, PLANE_WORD, curve_of, curve_words, draw_polar

NOTHING = Markup()
PLANES: tuple[Plane, Plane] = ("horizontal", "vertical")


@dataclass(frozen=True, slots=True, kw_only=True)
class Diagram:
    """A drawing and its name as a file; `caption` says in words what it shows."""

    name: str
    markup: Markup
    caption: str
    narrow: Markup = NOTHING
    """The same drawn for a narrow screen, where the wide one would be too small to read."""


def antenna_diagrams(sheets: Sequence[AntennaSheet], *, uid: str = "antenna") -> list[Diagram]:
    """Polar diagrams of both planes, the beam unrolled where it is narrow, and footprints where sheets have them.

    At most `MOST_CURVES` sheets; the first ones are drawn.
    """
    shown = list(sheets)[:MOST_CURVES]
    diagrams: list[Diagram] = []
    unrolled: list[Diagram] = []
    drawn = {plane: [curve_of(sheet.pattern, plane) for sheet in shown] for plane in PLANES}
    needles = any(is_narrow(curve) for curves in drawn.values() for curve in curves)
    for plane, curves in drawn.items():
        word = PLANE_WORD[plane]
        words = " ".join(curve_words(curve) for curve in curves)
        fields = {PLANE_OF_FIELD[sheet.pattern.electric_plane] for sheet in shown}
        field = "" if len(fields) > 1 else " (E plane)" if word in fields else " (H plane)"
        diagrams.append(
            Diagram(
                name=f"{word}.svg",
                markup=Markup(draw_polar(curves, uid=f"{uid}-{word}")),
                caption=f"{word.capitalize()} plane{field}. {words}",
            )
        )
        if needles:
            unrolled.append(
                Diagram(
                    name=f"{word}-close.svg",
                    markup=Markup(draw_beam(curves, uid=f"{uid}-{word}-close")),
                    caption=f"The same beam in the {word} plane, unrolled.",
                )
            )
    diagrams += unrolled
    for index, sheet in enumerate(shown):
        if sheet.footprint is None:
            continue
        diagrams.append(
            Diagram(
                name="footprint.svg" if len(shown) == 1 else f"footprint-{LETTERS[index].lower()}.svg",
                markup=Markup(draw_footprint(sheet.footprint, name=sheet.pattern.name, uid=f"{uid}-foot-{index}")),
                narrow=Markup(
                    draw_footprint(
                        sheet.footprint, name=sheet.pattern.name, uid=f"{uid}-foot-{index}-n", width=NARROW_WIDTH
                    )
                ),
                caption=f"Outlines of equal gain of {sheet.pattern.name}: "
                + " ".join(contour_words(contour) for contour in sheet.footprint.contours),
            )
        )
    return diagrams


def render_antenna_page(sheets: Sequence[AntennaSheet]) -> str:
    """The HTML text of the page; opened with no network it makes no request."""
    diagrams = antenna_diagrams(sheets)
    by_name = {one.name: one for one in diagrams}
    rows = [sheet_rows(sheet) for sheet in sheets]
    labels = list(dict.fromkeys(label for listed in rows for label, _ in listed))
    made = assets.environment()
    made.filters.update(number=wording.number, frequency=wording.frequency)
    return made.get_template("antenna.html.j2").render(
        sheets=list(zip(LETTERS, sheets, strict=False)),
        compared=len(sheets) > 1,
        title=", ".join(sheet.pattern.name for sheet in sheets),
        facts=[(label, [dict(listed).get(label, "–") for listed in rows]) for label in labels],
        planes=[(by_name[f"{word}.svg"], by_name.get(f"{word}-close.svg")) for word in ("azimuth", "elevation")],
        footprints=[one for one in diagrams if one.name.startswith("footprint")],
        notes=list(dict.fromkeys(note for sheet in sheets for note in sheet.pattern.notes)),
        version=__version__,
        css={name: assets.asset(f"{name}.css") for name in ("drawing", "page", "polar", "antenna")},
    )


def svg_file(diagram: Diagram) -> str:
    """A diagram as a file of its own: style inside, a sheet behind it, readable in light and dark viewers."""
    style = (
        f"<style>{_tokens()}{assets.asset('polar.css')}.polar,.beam-view,.footprint{{background:var(--sheet)}}</style>"
    )
    markup = str(diagram.markup)
    end = markup.index(">") + 1
    font = "style=\"font-family:'Source Sans 3','Segoe UI','Liberation Sans',Arial,sans-serif\""
    return f'<?xml version="1.0" encoding="UTF-8"?>\n{markup[: end - 1]} {font}>{style}{markup[end:]}\n'


def _tokens() -> str:
    """The names of colours: those of the drawings, and their dark counterparts."""
    drawing, dark = str(assets.asset("drawing.css")), str(assets.asset("antenna.css"))
    light = drawing[drawing.index(":root") : drawing.index("}") + 1]
    start = dark.index("@media screen and (prefers-color-scheme: dark)")
    return light + dark[start : dark.index("/* end of dark */")]
