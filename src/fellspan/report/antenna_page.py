"""The page of an antenna, or of several compared: facts and diagrams, everything inside itself; and the diagrams as files."""

from collections.abc import Sequence
from dataclasses import dataclass

from markupsafe import Markup

from fellspan import __version__
from fellspan.links.safety import ANTENNA_TOPICS, safety_lines
from fellspan.report import assets, wording
from fellspan.report.antenna_sheet import PLANE_OF_FIELD, AntennaSheet, apart_words, sheet_rows
from fellspan.report.footprint_drawing import NARROW_WIDTH, contour_words, draw_footprint
from fellspan.report.plane_views import PLANES, PlaneView, plane_views
from fellspan.report.polar_drawing import LETTERS, MOST_CURVES, PLANE_WORD, curve_of


@dataclass(frozen=True, slots=True, kw_only=True)
class FootprintView:
    """A footprint drawn for a wide sheet and for a phone, where the wide one would be too small to read."""

    markup: Markup
    narrow: Markup
    caption: str


def _planes(sheets: Sequence[AntennaSheet]) -> tuple[PlaneView, ...]:
    shown = sheets[:MOST_CURVES]
    drawn = {plane: [curve_of(sheet.pattern, plane) for sheet in shown] for plane in PLANES}
    electric = {PLANE_OF_FIELD[sheet.pattern.electric_plane] for sheet in shown}
    fields = {}
    if len(electric) == 1:
        fields = {word: " (E plane)" if word in electric else " (H plane)" for word in PLANE_WORD.values()}
    return plane_views(drawn, uid="antenna", fields=fields)


def _footprints(sheets: Sequence[AntennaSheet]) -> list[FootprintView]:
    views = []
    for index, sheet in enumerate(sheets[:MOST_CURVES]):
        shown, name = sheet.footprint, sheet.pattern.name
        if shown is None:
            continue
        words = " ".join(contour_words(contour, reach_m=shown.reach_m) for contour in shown.contours)
        views.append(
            FootprintView(
                markup=Markup(draw_footprint(shown, name=name, uid=f"foot-{index}")),
                narrow=Markup(draw_footprint(shown, name=name, uid=f"foot-{index}-n", width=NARROW_WIDTH)),
                caption=f"Outlines of equal gain of {name}: {words}",
            )
        )
    return views


def antenna_svg_files(sheets: Sequence[AntennaSheet]) -> dict[str, str]:
    """File names and texts of the diagrams, each able to stand alone."""
    files: dict[str, str] = {}
    for view in _planes(sheets):
        files[f"{view.word}.svg"] = _svg_file(view.markup)
        if view.close:
            files[f"{view.word}-close.svg"] = _svg_file(view.close)
    footprints = _footprints(sheets)
    for index, foot in enumerate(footprints):
        tail = "" if len(footprints) == 1 else f"-{index + 1}"
        files[f"footprint{tail}.svg"] = _svg_file(foot.markup)
    return files


def render_antenna_page(sheets: Sequence[AntennaSheet]) -> str:
    """The HTML text of the page; opened with no network it makes no request."""
    rows = [sheet_rows(sheet) for sheet in sheets]
    labels = list(dict.fromkeys(label for listed in rows for label, _ in listed))
    made = assets.environment()
    made.filters.update(number=wording.number, frequency=wording.frequency)
    return made.get_template("antenna.html.j2").render(
        sheets=list(zip(LETTERS, sheets, strict=False)),
        compared=len(sheets) > 1,
        apart=apart_words(sheets),
        title=", ".join(sheet.pattern.name for sheet in sheets),
        facts=[(label, [dict(listed).get(label, "–") for listed in rows]) for label in labels],
        key=[(letter, sheet.pattern.name) for letter, sheet in zip(LETTERS, sheets, strict=False)],
        planes=_planes(sheets),
        footprints=_footprints(sheets),
        notes=list(dict.fromkeys(note for sheet in sheets for note in sheet.notes)),
        safety=safety_lines(ANTENNA_TOPICS),
        version=__version__,
        css={name: assets.asset(f"{name}.css") for name in ("drawing", "page", "polar", "antenna")},
    )


def _svg_file(markup: str) -> str:
    """A diagram as a file of its own: style inside, a sheet behind it, readable in light and dark viewers."""
    sheet = ".polar,.beam-view,.footprint{background:var(--sheet)}"
    style = f"<style>{assets.colours()}{assets.asset('polar.css')}{sheet}</style>"
    end = markup.index(">") + 1
    font = "style=\"font-family:'Source Sans 3','Segoe UI','Liberation Sans',Arial,sans-serif\""
    return f'<?xml version="1.0" encoding="UTF-8"?>\n{markup[: end - 1]} {font}>{style}{markup[end:]}\n'
