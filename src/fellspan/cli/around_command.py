"""`fellspan around`: from one site, where could the other end stand, and how high must it be there?"""

from dataclasses import replace
from pathlib import Path
from typing import Annotated, get_args

import typer

from fellspan.cli.choices import one_of
from fellspan.errors import UsageError
from fellspan.vocabulary import CriteriaPreset, GapPolicy, LengthUnit

_TEXT = "TEXT"
_RADIUS = "15 km"
_OTHER = "10 m"


def around_command(
    site: Annotated[
        list[str], typer.Argument(metavar="SITE", help="A position, latitude first; with --study also a site's name.")
    ],
    study: Annotated[
        Path | None, typer.Option("--study", metavar="STUDY.toml", help="Terrain, criteria and sites of this study.")
    ] = None,
    height: Annotated[
        str | None, typer.Option(metavar=_TEXT, help="Antenna at the site, as in '12 m above ground'.")
    ] = None,
    frequency: Annotated[
        str | None, typer.Option(metavar=_TEXT, help="As in '5.8 GHz'; that of the site's link if left out.")
    ] = None,
    radius: Annotated[str, typer.Option(metavar=_TEXT, help="How far to look.")] = _RADIUS,
    other_height: Annotated[
        list[str] | None,
        typer.Option(
            "--other-height", metavar=_TEXT, help=f"Mast at the other end, {_OTHER} if left out; again for more."
        ),
    ] = None,
    ground: Annotated[
        list[str] | None,
        typer.Option(
            "--ground", "--terrain", metavar="FILE", help="Raster of bare ground; may be given again, finest first."
        ),
    ] = None,
    surface: Annotated[
        list[str] | None,
        typer.Option("--surface", metavar="FILE", help="Raster of the surface, roofs and treetops included."),
    ] = None,
    cover: Annotated[
        list[str] | None,
        typer.Option("--cover", metavar="FILE:KIND", help="Raster of heights above ground (tree, building or other)."),
    ] = None,
    obstacles: Annotated[
        list[str] | None,
        typer.Option("--obstacles", metavar="FILE[:KIND]", help="CSV or GeoJSON of buildings, masts, trees."),
    ] = None,
    roof: Annotated[str | None, typer.Option(metavar=_TEXT, help="Roof at the site above ground, as in '9 m'.")] = None,
    unit: Annotated[
        str | None,
        typer.Option(metavar="|".join(get_args(LengthUnit)), help="Unit of the raster's heights, if it states none."),
    ] = None,
    datum: Annotated[
        str | None, typer.Option(metavar=_TEXT, help="Vertical datum of the raster, if it states none.")
    ] = None,
    error: Annotated[
        str | None, typer.Option(metavar=_TEXT, help="One standard error of the raster's heights, as in '1.5 m'.")
    ] = None,
    crs: Annotated[
        str | None, typer.Option(metavar=_TEXT, help="System of the position, as in EPSG:32623; WGS 84 if left out.")
    ] = None,
    gaps: Annotated[
        str | None, typer.Option(metavar="|".join(get_args(GapPolicy)), help="What gaps in the rasters are.")
    ] = None,
    criteria: Annotated[
        str | None, typer.Option(metavar="|".join(get_args(CriteriaPreset)), help="What 'free' means.")
    ] = None,
    cell: Annotated[
        str | None, typer.Option(metavar=_TEXT, help="Answer for squares so wide, as in '50 m'; quicker.")
    ] = None,
    out: Annotated[Path | None, typer.Option("--out", metavar="DIR", help="Map, raster and contours go here.")] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print the numbers as JSON instead of the page.")] = False,
) -> None:
    """Where could the other end stand, and how high? The height needed at every place around a site."""
    from fellspan.cli.around_asked import Asked, site_and_study
    from fellspan.cli.layout import Ink, colours_wanted
    from fellspan.quantities import parse_length_m

    preset: CriteriaPreset | None = (
        None if criteria is None else one_of(criteria, get_args(CriteriaPreset), "--criteria")
    )
    if out is not None:
        from fellspan.exports.folder import check_target

        check_target(out)
    found, frequency_hz, planned, height_from = site_and_study(
        Asked(
            words=site,
            study=study,
            height=height,
            frequency=frequency,
            ground=ground or (),
            surface=surface or (),
            cover=cover or (),
            obstacles=obstacles or (),
            roof=roof,
            unit=None if unit is None else one_of(unit, get_args(LengthUnit), "--unit"),
            datum=datum,
            error=error,
            crs=crs,
            gaps=None if gaps is None else one_of(gaps, get_args(GapPolicy), "--gaps"),
        )
    )
    if preset is not None:
        planned = replace(planned, preset=preset, criteria=())
    others = [parse_length_m(text) for text in other_height or [_OTHER]]
    if not all(mast_m > 0.0 for mast_m in others):
        raise UsageError(f"--other-height '{min(others):g} m' is no mast", "a height above 0, as in 10 m")
    radius_m = parse_length_m(radius)
    cell_m = None if cell is None else parse_length_m(cell)
    if cell_m is not None and not cell_m > 0.0:
        raise UsageError(f"--cell '{cell}' is not a width above 0", "as in 50 m")

    from fellspan.cli.around_page import around_lines
    from fellspan.planning.around import MASTS_M, look_around

    answer = look_around(
        planned,
        found,
        frequency_hz=frequency_hz,
        radius_m=radius_m,
        other_m=others[0],
        masts_m=MASTS_M if len(others) == 1 else others,
        cell_m=cell_m,
        height_from=height_from,
    )
    if as_json:
        from fellspan.exports.around import around_json

        typer.echo(around_json(answer), nl=False)
    else:
        typer.echo("\n".join(around_lines(answer, ink=Ink(colours=colours_wanted()))))
    if out is not None:
        from fellspan.exports.around import PAGE, write_around

        names = write_around(answer, out)
        if not as_json:
            typer.echo(f"\nmap: {out / PAGE} ({len(names)} files)")
