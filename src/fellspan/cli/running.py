"""What `plan` and `sight` share: planning with progress, printing page or JSON, writing the report.

Imports the engine, so commands import it only when they run.
"""

import sys
from collections.abc import Callable
from pathlib import Path

import typer

from fellspan.cli.layout import WIDTH, Ink, colours_wanted, cut, printable
from fellspan.cli.page import page_lines
from fellspan.cli.telling import tell
from fellspan.errors import UsageError
from fellspan.planning.inputs import Study
from fellspan.planning.plan import StudyPlan
from fellspan.planning.planner import plan_study
from fellspan.planning.processes import processes_at_hand

_BAR = 20


def run_plan(study: Study, *, horizons: bool = False, equipment: bool = False, report: bool = False) -> StudyPlan:
    """Plan a study, with progress on a terminal; `horizons` and `equipment` are what `plan_study` adds, a second or so each.

    `report` adds what the pages of a report work with.
    """
    progress = progress_line("planning")
    try:
        return plan_study(
            study,
            progress=progress,
            horizons=horizons,
            equipment=equipment,
            what_if=report,
            processes=processes_at_hand(),
        )
    finally:
        clear_progress(progress)


def finish(plan: StudyPlan, *, out: Path | None, as_json: bool, brief: bool = False, chosen: bool = False) -> None:
    """Print the page or JSON, tell what failed, and write the report.

    Links that failed are told on standard error, so that they are seen when the output goes elsewhere. Where the report
    cannot go is said before anything is printed. `chosen` links alone never replace a report that holds others.
    """
    if out is not None and plan.links:
        _see_to_target(plan, out, chosen=chosen)
    if as_json:
        from fellspan.exports.results_json import results_text

        typer.echo(results_text(plan), nl=False)
    elif plan.links:
        typer.echo("\n".join(page_lines(plan, ink=Ink(colours=colours_wanted()), brief=brief)))
    sys.stdout.flush()
    for failure in plan.failures:
        tell(f"fellspan: {named(failure.link.name, str(failure.error))}")
    if out is None:
        return
    if not plan.links:
        tell_old_report(out)
        return
    write_report(plan, out, quiet=as_json)


def write_report(plan: StudyPlan, out: Path, *, quiet: bool) -> None:
    """Write the report, with progress on a terminal, and say where it is unless `quiet`."""
    from fellspan.exports.folder import write_folder

    progress = progress_line("writing")
    try:
        names = write_folder(plan, out, progress=progress, processes=processes_at_hand())
    finally:
        clear_progress(progress)
    if not quiet:
        typer.echo(f"\nreport: {out / 'index.html' if 'index.html' in names else out} ({len(names)} files)")


def _see_to_target(plan: StudyPlan, out: Path, *, chosen: bool) -> None:
    from fellspan.exports.folder import check_folder

    lost = check_folder(plan, out)
    if not lost:
        return
    listed = ", ".join(f"'{printable(name)}'" for name in lost[:3]) + (f" and {len(lost) - 3} more" if lost[3:] else "")
    if chosen:
        raise UsageError(
            f"the report in '{out}' also holds {listed}, which --link leaves out",
            "their pages would be lost: give another folder for --out, or plan all links",
        )
    tell(f"fellspan: the report in '{out}' also holds {listed}, not planned now: removed from it")


def tell_old_report(out: Path | None) -> None:
    """Say that an earlier report was left as it was, where there is one."""
    if out is None:
        return
    from fellspan.exports.folder import links_in

    if links_in(out):
        tell(f"fellspan: nothing was written; the earlier report in '{out}' stands as it was")


def named(link_name: str, message: str) -> str:
    """A message that says which link it is about, once."""
    return message if link_name in message.splitlines()[0] else f"{link_name}: {message}"


def progress_line(doing: str) -> Callable[[int, int, str], None] | None:
    """A line on standard error that is written over; None where nobody watches."""
    if not sys.stderr.isatty():
        return None

    def show(done: int, count: int, name: str) -> None:
        filled = _BAR * done // max(count, 1)
        text = f"{doing} [{'#' * filled}{'.' * (_BAR - filled)}] {done}/{count} {printable(name)}"
        sys.stderr.write(f"\r\x1b[K{cut(text, WIDTH - 1)}")
        sys.stderr.flush()

    return show


def clear_progress(progress: Callable[[int, int, str], None] | None) -> None:
    """Take the progress line away."""
    if progress is not None:
        sys.stderr.write("\r\x1b[K")
        sys.stderr.flush()
