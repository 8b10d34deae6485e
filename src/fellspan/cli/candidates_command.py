"""`fellspan candidates`: many possible links at once, from hubs to places, in a run that can be stopped and goes on."""

from collections.abc import Callable
from pathlib import Path
from typing import Annotated, TypeVar, get_args

import typer

from fellspan.errors import FellspanError, UsageError

_Value = TypeVar("_Value")


def candidates_command(
    study: Annotated[Path, typer.Argument(help="Study file (.toml); needs no links.", metavar="STUDY")],
    hubs: Annotated[Path, typer.Option("--hubs", metavar="FILE", help="Hubs and their sectors: CSV, GeoJSON or KML.")],
    places: Annotated[Path, typer.Option("--places", metavar="FILE", help="Places to reach: CSV, GeoJSON or KML.")],
    out: Annotated[Path, typer.Option("--out", metavar="DIR", help="Folder of the run and of its files.")],
    pairs: Annotated[
        Path | None, typer.Option("--pairs", metavar="FILE", help="Judge these pairs only: CSV with hub and place.")
    ] = None,
    min_distance: Annotated[
        str | None, typer.Option("--min-distance", metavar="LENGTH", help='Leave nearer pairs out, "200 m".')
    ] = None,
    max_distance: Annotated[
        str | None, typer.Option("--max-distance", metavar="LENGTH", help='Leave farther pairs out, "15 km".')
    ] = None,
    crs: Annotated[
        str | None, typer.Option("--crs", metavar="CRS", help="Coordinate system of x and y in the files.")
    ] = None,
    hub_height: Annotated[
        str | None,
        typer.Option("--hub-height", metavar="HEIGHT", help='At hubs that state none, "20 m above ground".'),
    ] = None,
    place_height: Annotated[
        str | None,
        typer.Option("--place-height", metavar="HEIGHT", help='At places that state none, "2 m above roof".'),
    ] = None,
    radio: Annotated[str | None, typer.Option("--radio", metavar="NAME", help="Radio of the study to use.")] = None,
    hub_antenna: Annotated[
        str | None,
        typer.Option("--hub-antenna", metavar="NAME", help="Antenna of the study for hubs that state none."),
    ] = None,
    place_antenna: Annotated[
        str | None, typer.Option("--place-antenna", metavar="NAME", help="Antenna of the study at every place.")
    ] = None,
    best: Annotated[int, typer.Option("--best", min=1, max=100, help="Hubs to list for each place.")] = 3,
    lines: Annotated[
        str, typer.Option("--lines", metavar="WHICH", help="Pairs to write as lines for a GIS: all, or best hubs only.")
    ] = "all",
    fresh: Annotated[bool, typer.Option("--fresh", help="Start anew; drop an earlier run in the folder.")] = False,
    scheduler: Annotated[
        str | None,
        typer.Option("--scheduler", metavar="ADDRESS", help="Work on a Dask cluster, as tcp://HOST:8786."),
    ] = None,
    chunk: Annotated[
        int, typer.Option("--chunk", min=1, max=1_000_000, help="Pairs worked on and committed together.")
    ] = 4096,
    threads: Annotated[
        int | None, typer.Option("--threads", min=1, max=256, help="Threads on this machine; one a core if left out.")
    ] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print the summary as JSON.")] = False,
) -> None:
    """Judge every pair of hubs and places: clear or not, level, margin; the best hubs of each place.

    A run that was stopped goes on with the same command.
    """
    from fellspan.cli.candidates_run import Asked, run_candidates
    from fellspan.cli.choices import one_of
    from fellspan.exports.candidates_folder import Lines
    from fellspan.quantities import parse_antenna_height, parse_length_m
    from fellspan.study.screening_study import Wishes

    run_candidates(
        Asked(
            study=study,
            hubs=hubs,
            places=places,
            pairs=pairs,
            out=out,
            best=best,
            lines=one_of(lines, get_args(Lines), "--lines"),
            fresh=fresh,
            scheduler=scheduler,
            chunk=chunk,
            threads=threads,
            as_json=as_json,
            wishes=Wishes(
                radio=radio,
                antenna_hub=hub_antenna,
                antenna_place=place_antenna,
                height_hub=_read("--hub-height", hub_height, parse_antenna_height),
                height_place=_read("--place-height", place_height, parse_antenna_height),
                min_distance_m=_read("--min-distance", min_distance, parse_length_m),
                max_distance_m=_read("--max-distance", max_distance, parse_length_m),
                crs=crs,
            ),
        )
    )


def _read(option: str, text: str | None, parse: Callable[[str], _Value]) -> _Value | None:
    """What an option says; None where it is not given."""
    try:
        return None if text is None else parse(text)
    except FellspanError as error:
        raise UsageError(f"{option}: {error.what}", *error.details) from None
