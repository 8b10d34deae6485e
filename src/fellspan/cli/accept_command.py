"""`fellspan accept`: a link as built against its plan; or a starter file to fill in with what is measured."""

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from fellspan.errors import UsageError

if TYPE_CHECKING:
    from fellspan.planning.inputs import Study

NOT_ACCEPTED = 1


def accept_command(
    study: Annotated[Path, typer.Argument(help="Study file (.toml).", metavar="STUDY")],
    link: Annotated[str | None, typer.Option("--link", metavar="NAME", help="The link that was measured.")] = None,
    measured: Annotated[
        Path | None, typer.Option("--measured", metavar="FILE", help="What was measured (.toml or .csv).")
    ] = None,
    blank: Annotated[
        Path | None,
        typer.Option("--blank", metavar="FILE", help="Write a measured file to fill in; never overwrites."),
    ] = None,
    out: Annotated[
        Path | None,
        typer.Option(
            "--out", metavar="DIR", help="Write the report of the study, with this link as built, into a folder."
        ),
    ] = None,
    horizons: Annotated[
        bool, typer.Option("--horizons", help="Work out the skylines for the report too, as plan does.")
    ] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print what was found as JSON instead of the page.")] = False,
) -> None:
    """Hold a link as built against its plan: accepted or not, and the likely causes. Exits with 1 where it is not accepted."""
    from fellspan.cli.plan_command import only
    from fellspan.study.reading import load_study

    if (measured is None) == (blank is None):
        raise UsageError(
            "give either --measured FILE or --blank FILE", "--blank writes a file to fill in, --measured reads it back"
        )
    if out is not None:
        from fellspan.exports.folder import check_target

        check_target(out)
    whole = load_study(study)
    name = _named(whole, link)
    if blank is not None:
        _write_blank(only(whole, [name]), blank, study)
        return
    assert measured is not None
    _accept(whole, name, measured, out=out, horizons=horizons, as_json=as_json)


def _named(study: "Study", link: str | None) -> str:
    """The link asked for; the only one of the study where none is named."""
    names = [one.name for one in study.links]
    if link is not None:
        return link
    if len(names) == 1:
        return names[0]
    raise UsageError("say which link was measured: --link NAME", f"links: {', '.join(names)}")


def _write_blank(study: "Study", path: Path, study_path: Path) -> None:
    from fellspan.cli.init_command import write_new
    from fellspan.cli.layout import printable
    from fellspan.study.measured_blank import blank_text

    if path.suffix.lower() != ".toml":
        raise UsageError(
            f"{path} does not end in .toml", "name the file that is to be written, for instance measured.toml"
        )
    link = study.links[0]
    write_new(path, blank_text(link))
    typer.echo(f"wrote {path}")
    typer.echo(f'fill it in, then run: fellspan accept {study_path} --link "{printable(link.name)}" --measured {path}')


def _accept(whole: "Study", name: str, measured: Path, *, out: Path | None, horizons: bool, as_json: bool) -> None:
    from fellspan.cli.accept_page import accept_lines
    from fellspan.cli.layout import Ink, colours_wanted
    from fellspan.cli.plan_command import only
    from fellspan.cli.running import run_plan, tell_old_report, write_report
    from fellspan.exports.as_built import as_built_text
    from fellspan.planning.accepting import accept_link, with_acceptance
    from fellspan.planning.planner import open_terrain
    from fellspan.study.measured_reading import load_measured

    alone = only(whole, [name])
    built = load_measured(measured, alone.links[0])
    plan = run_plan(alone if out is None else whole, horizons=horizons, report=out is not None)
    planned = next((one for one in plan.links if one.result.name == name), None)
    if planned is None:
        tell_old_report(out)
        raise next(failure.error for failure in plan.failures if failure.link.name == name)
    with open_terrain(whole) as terrain:
        found = accept_link(whole, planned, built, terrain=terrain)
    if out is not None:
        write_report(with_acceptance(plan, found), out, quiet=as_json)
    if as_json:
        typer.echo(as_built_text(found), nl=False)
    else:
        typer.echo("\n".join(accept_lines(found, ink=Ink(colours=colours_wanted()))))
    if not found.accepted:
        raise typer.Exit(NOT_ACCEPTED)
