"""`fellspan terrain`: what do these rasters hold? Shows facts of the terrain room and computes none."""

from typing import TYPE_CHECKING, Annotated

import typer

from fellspan.cli.layout import labelled, printable, wrapped
from fellspan.cli.telling import tell
from fellspan.errors import FellspanError
from fellspan.vocabulary import RasterRole

if TYPE_CHECKING:
    from fellspan.terrain.inspect import RasterFacts
    from fellspan.terrain.seams import Seam

_ROLES: dict[RasterRole, str] = {
    "ground": "bare ground (another role: --role)",
    "surface": "surface model (first surface seen from above)",
    "cover": "cover, heights above ground",
}


def terrain_command(
    files: Annotated[list[str], typer.Argument(help="Rasters, or folders of tiles.", show_default=False)],
    role: Annotated[
        RasterRole, typer.Option("--role", help="What the heights are; sets the assumed error and what is compared.")
    ] = "ground",
    band: Annotated[int, typer.Option("--band", min=1, help="Band that holds the heights.")] = 1,
    as_json: Annotated[bool, typer.Option("--json", help="Print the facts as JSON.")] = False,
) -> int:
    """Tell what rasters hold: extent, cell size, unit, datum, gaps, heights, assumed error, and what is wrong with them."""
    from fellspan.terrain.inspect import datum_conflict, inspect_raster, inspect_seams
    from fellspan.terrain.sources import CoverSource, RasterSource

    good: list[RasterSource | CoverSource] = []
    facts: list[RasterFacts] = []
    errors: list[FellspanError] = []
    for path in files:
        source = CoverSource(path=path, band=band) if role == "cover" else RasterSource(path=path, role=role, band=band)
        try:
            facts.append(inspect_raster(source))
        except FellspanError as refusal:
            errors.append(refusal)
        else:
            good.append(source)
    conflict = datum_conflict(facts)
    seams = inspect_seams(good, role=role) if good and conflict is None else ()
    if conflict is not None:
        errors.append(conflict)
    if as_json:
        typer.echo(_json(facts, seams, errors))
    elif facts:
        typer.echo("\n".join(_page(facts, seams)))
    for error in errors:
        tell(f"fellspan: {error}")
    return max((error.exit_code for error in errors), default=0)


def _page(facts: "list[RasterFacts]", seams: "tuple[Seam, ...]") -> list[str]:
    lines: list[str] = []
    for fact in facts:
        lines += [*_facts(fact), ""]
    if len(facts) > 1 or any(fact.files > 1 for fact in facts):
        lines.append("Where they overlap")
        lines += [line for seam in seams for line in wrapped(_seam(seam), first="  - ")] or [
            "  nowhere, or one has a gap"
        ]
        lines.append("")
    return lines[:-1]


def _facts(fact: "RasterFacts") -> list[str]:
    name = fact.name if fact.files == 1 else f"{fact.name}: {fact.files} tiles"
    rows = [
        ("declared as", _ROLES[fact.role]),
        ("extent", f"{_span(fact.south_deg, fact.north_deg, 'NS')}, {_span(fact.west_deg, fact.east_deg, 'EW')}"),
        ("cells", _cells(fact)),
        ("CRS", fact.crs),
        ("vertical unit", fact.unit or "not stated, taken as metres"),
        ("vertical datum", _datum(fact)),
        ("heights", _heights(fact)),
        ("gaps", _gaps(fact)),
        ("assumed error", f"{fact.error_m:g} m (one standard error): {fact.error_source}"),
        ("looks like", _look(fact)),
        ("reading", "fast enough" if fact.slow_because is None else f"slow: {fact.slow_because}"),
    ]
    lines = [printable(name)]
    for label, text in rows:
        lines += labelled(label, text)
    if fact.remedy is not None:
        lines += labelled("remedy", fact.remedy)
    for caution in fact.cautions:
        lines += wrapped(caution, first="  ! ")
    return lines


def _cells(fact: "RasterFacts") -> str:
    finest = "" if fact.files == 1 else " (finest tile)"
    size = f"{_length(fact.cell_x_m)} x {_length(fact.cell_y_m)}"
    return f"{fact.columns} x {fact.rows} of {size} on the ground{finest}, {fact.dtype}, blocks of {fact.blocks}"


def _span(low_deg: float, high_deg: float, letters: str) -> str:
    return f"{_degrees(low_deg, letters)} to {_degrees(high_deg, letters)}"


def _degrees(value_deg: float, letters: str) -> str:
    """A latitude or longitude with its letter; longitudes that run on past 180 are folded back."""
    folded = (value_deg + 180.0) % 360.0 - 180.0 if letters == "EW" and abs(value_deg) > 180.0 else value_deg
    return f"{abs(folded):.5f} {letters[0] if folded >= 0.0 else letters[1]}"


def _length(value_m: float) -> str:
    return f"{value_m:.2f} m" if value_m < 100.0 else f"{value_m:.0f} m"


def _datum(fact: "RasterFacts") -> str:
    if fact.role == "cover":
        return "none: heights above ground"
    return fact.vertical_datum or "not stated"


def _heights(fact: "RasterFacts") -> str:
    if fact.lowest_m is None or fact.highest_m is None:
        return "none in what was read"
    return f"{fact.lowest_m:.1f} m to {fact.highest_m:.1f} m{_of_what(fact)}"


def _gaps(fact: "RasterFacts") -> str:
    if fact.gap_percent == 0.0:
        return f"none{_of_what(fact)}"
    return f"{fact.gap_percent:.2g} %{_of_what(fact)}"


def _of_what(fact: "RasterFacts") -> str:
    return "" if fact.read_percent >= 99.9 else f", from {fact.read_percent:.2g} % of the cells"


def _look(fact: "RasterFacts") -> str:
    if fact.role == "cover":
        return "not judged for cover"
    if fact.looks_like == "unclear":
        return "cannot be told from these cells"
    return f"{fact.looks_like}: a guess, {fact.abrupt_percent:.2g} % of the cells stand out abruptly"


def _seam(seam: "Seam") -> str:
    refused = f"; more than the {seam.allowed_m:.1f} m allowed, planning would refuse them together"
    return f"{seam}{refused if seam.is_refused else ''}"


def _json(facts: "list[RasterFacts]", seams: "tuple[Seam, ...]", errors: list[FellspanError]) -> str:
    import dataclasses
    import json

    return json.dumps(
        {
            "rasters": [dataclasses.asdict(fact) for fact in facts],
            "seams": [dataclasses.asdict(seam) | {"refused": seam.is_refused} for seam in seams],
            "errors": [str(error) for error in errors],
        },
        indent=2,
        ensure_ascii=False,
        allow_nan=False,
    )
