"""`fellspan plan`: everything for every link of a study file, with the report."""

import dataclasses
from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from fellspan.errors import FellspanError, UsageError

if TYPE_CHECKING:
    from fellspan.planning.inputs import Study
    from fellspan.planning.plan import StudyPlan

INPUT, NOT_REACHED = 2, 1


class Required(StrEnum):
    """The least that --require accepts of a path; 'clear' alone knows what stands on the ground."""

    clear = "clear"
    clear_bare_ground = "clear-bare-ground"
    marginal = "marginal"


FULL_UP_TO = 3
"""More links than this get their decisions alone on the terminal, unless asked for in full."""


def plan_command(
    study: Annotated[Path, typer.Argument(help="Study file (.toml).", metavar="STUDY")],
    out: Annotated[Path | None, typer.Option("--out", metavar="DIR", help="Write the report into this folder.")] = None,
    link: Annotated[
        list[str] | None, typer.Option("--link", metavar="NAME", help="Plan this link only; may be given again.")
    ] = None,
    require: Annotated[
        Required | None,
        typer.Option(
            "--require",
            help="Exit with 1 if any link is worse. 'clear' wants trees and buildings in the data or surveyed; "
            "'clear-bare-ground' also takes what is clear on bare ground only.",
        ),
    ] = None,
    full: Annotated[
        bool, typer.Option("--full", help=f"Print every link in full, also where there are more than {FULL_UP_TO}.")
    ] = False,
    horizons: Annotated[
        bool,
        typer.Option("--horizons", help="Work out the skyline from each end too, for aiming; a second or so an end."),
    ] = False,
    equip: Annotated[
        bool,
        typer.Option("--equip", help="Compare the antennas of the catalogue on each link too; a second or so a link."),
    ] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print results as JSON instead of the page.")] = False,
) -> None:
    """Plan every link of a study file: clear or not, by how much, and what would clear it."""
    from fellspan.cli.running import finish, run_plan, tell_old_report
    from fellspan.cli.telling import tell
    from fellspan.study.reading import load_study

    if out is not None:
        from fellspan.exports.folder import check_target

        check_target(out)
    try:
        chosen = only(load_study(study), link or [])
        plan = run_plan(chosen, horizons=horizons, equipment=equip, report=out is not None)
    except FellspanError:
        tell_old_report(out)
        raise
    brief = not full and not link and len(plan.links) + len(plan.failures) > FULL_UP_TO
    finish(plan, out=out, as_json=as_json, brief=brief, chosen=bool(link))
    if require is not None and (short := _short_of(plan, require)):
        tell(f"fellspan: --require {require.value} is not reached by {short}")
        raise typer.Exit(NOT_REACHED)
    if plan.failures:
        raise typer.Exit(INPUT)


def _short_of(plan: "StudyPlan", required: Required) -> str:
    """The links that failed or whose path is worse than required, with their states; empty where there are none."""
    from fellspan.cli.layout import printable
    from fellspan.links.words import STATE_WORDS, state_of

    order = ("clear", "clear-bare", "marginal")
    enough = order[: list(Required).index(required) + 1]
    short = [
        f"{link.result.name} ({STATE_WORDS[state_of(link.result)]})"
        for link in plan.links
        if state_of(link.result) not in enough
    ]
    short += [f"{failure.link.name} (not planned)" for failure in plan.failures]
    return printable(", ".join(short[:3]) + (f" and {len(short) - 3} more" if short[3:] else ""))


def only(study: "Study", names: list[str]) -> "Study":
    """The study with the named links alone; all of them where none is named."""
    if not names:
        return study
    known = [link.name for link in study.links]
    for name in names:
        if name not in known:
            from fellspan.study.messages import did_you_mean

            raise UsageError(
                f"there is no link named '{name}' in this study",
                *did_you_mean(name, known),
                f"links: {', '.join(known)}",
            )
    chosen = tuple(link for link in study.links if link.name in names)
    return dataclasses.replace(study, links=chosen, links_left_out=tuple(name for name in known if name not in names))
