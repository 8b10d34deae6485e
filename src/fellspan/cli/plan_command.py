"""`fellspan plan`: everything for every link of a study file, with the report."""

import dataclasses
from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from fellspan.errors import UsageError

if TYPE_CHECKING:
    from fellspan.planning.inputs import Study
    from fellspan.planning.plan import StudyPlan

INPUT, NOT_REACHED = 2, 1


class Required(StrEnum):
    """The least path verdict that --require accepts."""

    clear = "clear"
    marginal = "marginal"


def plan_command(
    study: Annotated[Path, typer.Argument(help="Study file (.toml).", metavar="STUDY")],
    out: Annotated[Path | None, typer.Option("--out", metavar="DIR", help="Write the report into this folder.")] = None,
    link: Annotated[
        list[str] | None, typer.Option("--link", metavar="NAME", help="Plan this link only; may be given again.")
    ] = None,
    require: Annotated[
        Required | None, typer.Option("--require", help="Exit with 1 if any link is worse than this.")
    ] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print results as JSON instead of the page.")] = False,
) -> None:
    """Plan every link of a study file: clear or not, by how much, and what would clear it."""
    from fellspan.cli.running import finish, run_plan
    from fellspan.study.reading import load_study

    plan = run_plan(_only(load_study(study), link or []))
    finish(plan, out=out, as_json=as_json)
    if require is not None and _falls_short(plan, require):
        raise typer.Exit(NOT_REACHED)
    if plan.failures:
        raise typer.Exit(INPUT)


def _falls_short(plan: "StudyPlan", required: Required) -> bool:
    """Whether a link failed or its path is worse than required."""
    enough = {"clear"} if required is Required.clear else {"clear", "marginal"}
    return bool(plan.failures) or any(link.result.verdict not in enough for link in plan.links)


def _only(study: "Study", names: list[str]) -> "Study":
    """The study with the named links alone."""
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
    return dataclasses.replace(study, links=tuple(link for link in study.links if link.name in names))
