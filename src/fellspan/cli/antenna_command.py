"""`fellspan antenna`: what does this antenna look like, in both planes? Prints facts, writes a page and its diagrams.

Shows what the antennas room works out and computes nothing.
"""

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from fellspan.cli.layout import labelled, printable, table, wrapped
from fellspan.errors import OutputError, UsageError

if TYPE_CHECKING:
    from fellspan.antennas.catalogue import Catalogue, CatalogueAntenna
    from fellspan.report.antenna_sheet import AntennaSheet

_PLAIN = str.maketrans({"−": "-", "–": "-", "²": "2"})


def antenna_command(
    name: Annotated[
        str | None, typer.Argument(help="Name in the catalogue, or a pattern file (.csv).", show_default=False)
    ] = None,
    frequency: Annotated[
        str | None,
        typer.Option("--frequency", help="Such as '5.8 GHz'; else the middle of its band, or of what bands share."),
    ] = None,
    file: Annotated[Path | None, typer.Option("--file", help="Pattern file, instead of a name.")] = None,
    compare: Annotated[
        list[str] | None, typer.Option("--compare", help="Another antenna on the same diagrams; may be repeated.")
    ] = None,
    catalogue: Annotated[Path | None, typer.Option("--catalogue", help="File of antennas of your own.")] = None,
    height: Annotated[str | None, typer.Option("--height", help="Above ground, for the footprint: '25 m'.")] = None,
    tilt: Annotated[float, typer.Option("--tilt", help="Of the boresight, degrees, up is positive.")] = 0.0,
    out: Annotated[
        Path | None, typer.Option("--out", help="Page to write (.html), or folder for page and diagrams.")
    ] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print the facts as JSON.")] = False,
    as_list: Annotated[bool, typer.Option("--list", help="List the antennas of the catalogue.")] = False,
) -> int:
    """What does this antenna look like? Gain, beams, lobes and far field, as facts and as diagrams in both planes."""
    from fellspan.antennas.catalogue import load_catalogue

    known = load_catalogue(catalogue)
    if as_list:
        typer.echo(_listing_json(known) if as_json else "\n".join(_listing(known)))
        return 0
    named = [*([name] if name else []), *(compare or [])]
    asked = [*([(str(file), True)] if file else []), *((one, one.lower().endswith(".csv")) for one in named)]
    if not asked:
        raise UsageError("no antenna is named", "fellspan antenna NAME, or --file FILE.csv", "fellspan antenna --list")
    _check_count(len(asked))
    frequency = frequency or _shared(asked, known)
    sheets = [
        _sheet(one, known, is_file=is_file, frequency=frequency, height=height, tilt_deg=tilt) for one, is_file in asked
    ]
    if as_json:
        typer.echo(_json(sheets))
    else:
        typer.echo("\n".join(_pages(sheets)))
    if out is not None:
        written = _write(sheets, out)
        if not as_json:
            typer.echo(f"\npage: {written}")
    return 0


def _check_count(asked: int) -> None:
    from fellspan.report.polar_drawing import MOST_CURVES

    if asked > MOST_CURVES:
        raise UsageError(
            f"{asked} antennas on one diagram cannot be told apart", f"compare {MOST_CURVES} at most at a time"
        )


def _shared(asked: "list[tuple[str, bool]]", known: "Catalogue") -> str | None:
    """The frequency that antennas of the catalogue are compared at: the middle of what their bands share; None for one alone.

    Gains and beams at different frequencies say nothing of which antenna is better.
    """
    named = [known.find(one, None) for one, is_file in asked if not is_file]
    if len(named) < 2 or len(named) < len(asked):
        return None
    lowest, highest = max(one.lowest_hz for one in named), min(one.highest_hz for one in named)
    if lowest > highest:
        return None
    return f"{_middle_of(lowest, highest) / 1e9:.12g} GHz"


def _sheet(
    asked: str, known: "Catalogue", *, is_file: bool, frequency: str | None, height: str | None, tilt_deg: float
) -> "AntennaSheet":
    from fellspan.antennas.files import read_pattern
    from fellspan.antennas.footprint import footprint
    from fellspan.quantities import parse_frequency_hz, parse_length_m
    from fellspan.report.antenna_sheet import sheet_of

    details: dict[str, Any] = {}
    if is_file:
        pattern = read_pattern(asked)
        if frequency is not None and abs(parse_frequency_hz(frequency) / pattern.frequency_hz - 1.0) > 1e-6:
            raise UsageError(
                f"{Path(asked).name} holds the pattern at {pattern.frequency_hz / 1e9:g} GHz, not at {frequency}",
                "a measured pattern has the frequency it was measured at: leave --frequency out",
            )
    else:
        frequency_hz = None if frequency is None else parse_frequency_hz(frequency)
        antenna = known.find(asked, frequency_hz)
        pattern = antenna.pattern(_middle_hz(antenna) if frequency_hz is None else frequency_hz)
        details = {
            "size": _size(antenna),
            "mass_kg": antenna.mass_kg,
            "frontal_area_m2": antenna.frontal_area_m2,
            "note": antenna.note,
        }
    if height is not None:
        details["footprint"] = footprint(pattern, height_m=parse_length_m(height), tilt_deg=tilt_deg)
    return sheet_of(pattern, **details)


def _pages(sheets: "list[AntennaSheet]") -> list[str]:
    from fellspan.report.antenna_sheet import apart_words

    lines: list[str] = []
    for sheet in sheets:
        lines += [*_page(sheet), ""]
    apart = apart_words(sheets)
    return [*lines, *wrapped(apart, first="! ")] if apart else lines[:-1]


def _page(sheet: "AntennaSheet") -> list[str]:
    from fellspan.report.antenna_sheet import sheet_rows
    from fellspan.report.footprint_drawing import contour_words

    lines = [printable(sheet.pattern.name)]
    for label, words in sheet_rows(sheet):
        lines += labelled(label, plain(words))
    if sheet.footprint is not None:
        shown = sheet.footprint
        lines += labelled("Footprint", f"{shown.height_m:g} m above flat ground, tilt {plain(f'{shown.tilt_deg:+g}°')}")
        for contour in shown.contours:
            lines += labelled("", plain(contour_words(contour, reach_m=shown.reach_m)))
    for note in sheet.notes:
        lines += wrapped(plain(note), first="  ! ")
    return lines


def plain(words: str) -> str:
    """Words for any terminal: no degree sign, no typographic minus."""
    return words.translate(_PLAIN).replace("°", " deg")


def _json(sheets: "list[AntennaSheet]") -> str:
    import json

    from fellspan.report.antenna_sheet import sheet_dict

    listed = {"antennas": [sheet_dict(sheet) for sheet in sheets]}
    return json.dumps(listed, indent=2, ensure_ascii=False, allow_nan=False)


def _write(sheets: "list[AntennaSheet]", out: Path) -> Path:
    """The page at `out`, or page and diagrams in a folder; each file whole or not at all."""
    from fellspan.report.antenna_page import antenna_svg_files, render_antenna_page

    page = out if out.suffix.lower() in (".html", ".htm") else out / "antenna.html"
    diagrams = antenna_svg_files(sheets)
    files = {page.name: render_antenna_page(sheets)}
    files |= {f"{page.stem}-{name}" if page is out else name: text for name, text in diagrams.items()}
    folder = page.parent
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for name, text in files.items():
            part = folder / f".{name}.part"
            part.write_text(text, encoding="utf-8", errors="backslashreplace")
            part.replace(folder / name)
    except OSError as error:
        raise OutputError(f"cannot write {folder / page.name}: {error.strerror or error}") from None
    return page


def _listing(known: "Catalogue") -> list[str]:
    rows = [(one.name, one.kind, _band(one), _size(one), f"{one.mass_kg:g} kg") for one in known.antennas]
    return table(("Name", "Kind", "Band", "Width x height", "Mass"), rows, widths=(30, 7, 17, 15, 7), right=(4,))


def _listing_json(known: "Catalogue") -> str:
    import json

    keys = (
        "name",
        "kind",
        "lowest_hz",
        "highest_hz",
        "width_m",
        "height_m",
        "mass_kg",
        "frontal_area_m2",
        "note",
        "source",
    )
    listed = {"antennas": [{key: getattr(one, key) for key in keys} for one in known.antennas]}
    return json.dumps(listed, indent=2, ensure_ascii=False, allow_nan=False)


def _band(antenna: "CatalogueAntenna") -> str:
    unit, scale = ("GHz", 1e9) if antenna.highest_hz >= 1e9 else ("MHz", 1e6)
    return f"{antenna.lowest_hz / scale:g} to {antenna.highest_hz / scale:g} {unit}"


def _size(antenna: "CatalogueAntenna") -> str:
    return f"{antenna.width_m:g} x {antenna.height_m:g} m"


def _middle_hz(antenna: "CatalogueAntenna") -> float:
    """A round frequency in the middle of the band, on a scale of ratios."""
    return _middle_of(antenna.lowest_hz, antenna.highest_hz)


def _middle_of(lowest_hz: float, highest_hz: float) -> float:
    middle = float(f"{(lowest_hz * highest_hz) ** 0.5:.2g}")
    return min(max(middle, lowest_hz), highest_hz)
