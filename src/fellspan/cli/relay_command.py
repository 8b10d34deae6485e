"""`fellspan relay`: where could an intermediate site stand, for a link that no single hop serves?"""

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from fellspan.errors import UsageError

if TYPE_CHECKING:
    from fellspan.planning.relay_result import RelayRequest

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
    from fellspan.cli.running import clear_progress, progress_line
    from fellspan.planning.relays import find_relay
    from fellspan.study.reading import load_study

    if out is not None:
        from fellspan.exports.folder import check_target

        check_target(out)
    loaded = load_study(study)
    name = _link_name(link, [one.name for one in loaded.links])
    request = _request(mast, hop, area, sites, count, apart, margin, single)
    progress = progress_line("searching")
    try:
        result = find_relay(loaded, name, request, progress=progress)
    finally:
        clear_progress(progress)
    if as_json:
        from fellspan.exports.relay import relay_json

        typer.echo(relay_json(result), nl=False)
    else:
        typer.echo("\n".join(relay_lines(result, ink=Ink(colours=colours_wanted()))))
    if out is not None and result.routes:
        from fellspan.exports.relay import write_relay_folder

        names = write_relay_folder(result, loaded, out)
        if not as_json:
            typer.echo(
                f"\nreport: {out / 'index.html'} ({len(names)} files); the study to plan on with: {out / 'relay.toml'}"
            )
    if not result.routes:
        raise typer.Exit(NOT_REACHED)


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
) -> "RelayRequest":
    from fellspan.planning.relay_result import RelayRequest
    from fellspan.quantities import parse_antenna_height, parse_length_m, parse_loss_db
    from fellspan.screening.single import site_of
    from fellspan.study.places import read_places
    from fellspan.terrain.water_outlines import read_outlines

    mast_m = parse_length_m(mast.removesuffix("above ground").strip())
    outlines = None if area is None else read_outlines((area,))
    candidates = None
    if sites is not None:
        read = read_places(sites, height=parse_antenna_height(f"{mast_m:g} m above ground"))
        candidates = tuple(site_of(read.sites, index) for index in range(len(read.sites.name)))
    return RelayRequest(
        mast_m=mast_m,
        hop_m=None if hop is None else parse_length_m(hop),
        area=None if outlines is None else outlines.shape,
        sites=candidates or (),
        count=count,
        apart_m=None if apart is None else parse_length_m(apart),
        margin_db=None if margin is None else parse_loss_db(margin),
        two_relays=not single,
    )
