"""`fellspan relay`: where could an intermediate site stand, for a link that no single hop serves?"""

import dataclasses
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, TypeVar

import typer

from fellspan.errors import QuantityError, UsageError

if TYPE_CHECKING:
    from fellspan.links.site import Site
    from fellspan.planning.inputs import Study
    from fellspan.planning.relay_result import RelayRequest, RelayResult

_T = TypeVar("_T")
NOT_REACHED = 1


def relay_command(
    study: Annotated[Path, typer.Argument(help="Study file (.toml).", metavar="STUDY")],
    link: Annotated[str | None, typer.Option("--link", metavar="NAME", help="The link that needs a relay.")] = None,
    mast: Annotated[str, typer.Option(metavar="TEXT", help="Antenna height above ground at a relay.")] = "10 m",
    hop: Annotated[
        str | None, typer.Option(metavar="TEXT", help="Longest hop, as in '12 km'; the link's length if left out.")
    ] = None,
    area: Annotated[
        Path | None, typer.Option(metavar="FILE", help="GeoJSON of the areas in which a relay may stand.")
    ] = None,
    sites: Annotated[
        Path | None,
        typer.Option(
            metavar="FILE", help="Candidate sites (CSV, GeoJSON, KML) with their heights; only they are tried."
        ),
    ] = None,
    count: Annotated[int, typer.Option(metavar="N", help="How many places to plan in full.", min=1, max=20)] = 3,
    apart: Annotated[
        str | None,
        typer.Option(metavar="TEXT", help="Least distance between places; a twentieth of the link if left out."),
    ] = None,
    margin: Annotated[
        str | None,
        typer.Option(metavar="TEXT", help="Least margin of both hops, as in '10 dB'; the link's own if left out."),
    ] = None,
    single: Annotated[bool, typer.Option("--single", help="One relay only: never look for chains of two.")] = False,
    out: Annotated[
        Path | None, typer.Option("--out", metavar="DIR", help="Write the report of the relays into this folder.")
    ] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print results as JSON instead of the page.")] = False,
) -> None:
    """Where could an intermediate site stand? Places from which both hops are clear, the best planned in full."""
    from fellspan.cli.layout import Ink, colours_wanted
    from fellspan.cli.relay_page import relay_lines
    from fellspan.cli.running import clear_progress, progress_line, tell_old_report
    from fellspan.planning.relays import find_relay
    from fellspan.study.reading import load_study

    if out is not None:
        from fellspan.exports.relay import check_relay_folder

        check_relay_folder(out)
    loaded = load_study(study)
    name = _link_name(link, [one.name for one in loaded.links])
    request, notes = _request(mast, hop, area, sites, count, apart, margin, single)
    progress = progress_line("searching")
    try:
        result = find_relay(loaded, name, request, progress=progress)
    finally:
        clear_progress(progress)
    result = dataclasses.replace(result, cautions=(*notes, *result.cautions))
    if as_json:
        from fellspan.exports.relay import relay_json

        typer.echo(relay_json(result), nl=False)
    else:
        typer.echo("\n".join(relay_lines(result, ink=Ink(colours=colours_wanted()))))
    if not result.routes:
        tell_old_report(out)
        raise typer.Exit(NOT_REACHED)
    if out is not None:
        _write(result, loaded, out, quiet=as_json)


def _write(result: "RelayResult", study: "Study", out: Path, *, quiet: bool) -> None:
    from fellspan.cli.layout import wrapped
    from fellspan.cli.running import clear_progress, progress_line
    from fellspan.exports.relay import write_relay_folder
    from fellspan.report.relay_words import study_words

    progress = progress_line("writing")
    try:
        names = write_relay_folder(result, study, out, progress=progress)
    finally:
        clear_progress(progress)
    if not quiet:
        typer.echo(f"\nreport: {out / 'index.html'} ({len(names)} files)")
        typer.echo("\n".join(wrapped(study_words(result.routes[0]), first="channels: ", rest="  ")))
        typer.echo(f"next: fellspan plan {out / 'relay.toml'}")


def _link_name(given: str | None, known: list[str]) -> str:
    if given is None and len(known) == 1:
        return known[0]
    if given in known and given is not None:
        return given
    from fellspan.study.messages import did_you_mean

    listed = f"links: {', '.join(known)}" if known else "a link names the two ends that a relay is to join"
    if given is None:
        raise UsageError("relay: which link? give --link NAME", listed)
    raise UsageError(f"there is no link named '{given}' in this study", *did_you_mean(given, known), listed)


def _request(
    mast: str,
    hop: str | None,
    area: Path | None,
    sites: Path | None,
    count: int,
    apart: str | None,
    margin: str | None,
    single: bool,
) -> "tuple[RelayRequest, tuple[str, ...]]":
    """What is asked, and what is doubtful in it."""
    from fellspan.planning.relay_result import RelayRequest
    from fellspan.quantities import parse_antenna_height, parse_length_m, parse_loss_db
    from fellspan.screening.single import site_of
    from fellspan.study.places import read_places
    from fellspan.terrain.water_outlines import read_outlines

    height = _of_option("--mast", parse_antenna_height, mast)
    if height.reference not in (None, "ground"):
        raise UsageError(
            f"--mast '{mast}': a relay's mast stands on the ground", "give a height above ground, as in 10 m"
        )
    outlines = None if area is None else read_outlines((area,), what="area")
    candidates: tuple[Site, ...] = ()
    notes: tuple[str, ...] = ()
    if sites is not None:
        read = read_places(sites, height=parse_antenna_height(f"{height.height_m:g} m above ground"))
        candidates = tuple(site_of(read.sites, index) for index in range(len(read.sites.name)))
        notes = read.notes
    request = RelayRequest(
        mast_m=height.height_m,
        hop_m=None if hop is None else _of_option("--hop", parse_length_m, hop),
        area=None if outlines is None else outlines.shape,
        sites=candidates,
        count=count,
        apart_m=None if apart is None else _of_option("--apart", parse_length_m, apart),
        margin_db=None if margin is None else _of_option("--margin", parse_loss_db, margin),
        two_relays=not single,
    )
    return request, notes


def _of_option(option: str, parse: Callable[[str], _T], text: str) -> _T:
    try:
        return parse(text)
    except QuantityError as error:
        raise UsageError(f"{option}: {error.what}", *error.details) from None
