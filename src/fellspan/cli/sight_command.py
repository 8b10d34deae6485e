"""`fellspan sight`: is it clear between two points? Needs no file; asks at a terminal, refuses in a pipe, saves a study."""

import datetime as dt
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, get_args

import typer

from fellspan.cli.choices import one_of
from fellspan.cli.init_command import write_new
from fellspan.errors import FellspanError, UsageError
from fellspan.vocabulary import CriteriaPreset, GapPolicy

if TYPE_CHECKING:
    from fellspan.planning.inputs import Study


def sight_command(
    points: Annotated[
        list[str] | None, typer.Argument(metavar="A [B]", help="Positions, latitude first.", show_default=False)
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
    frequency: Annotated[str | None, typer.Option(metavar="TEXT", help="As in '5.8 GHz'.")] = None,
    height_a: Annotated[str | None, typer.Option(metavar="TEXT", help="Antenna at A, as in '12 m above roof'.")] = None,
    height_b: Annotated[
        str | None, typer.Option(metavar="TEXT", help="Antenna at B, as in '40 ft above ground'.")
    ] = None,
    roof_a: Annotated[str | None, typer.Option(metavar="TEXT", help="Roof at A above ground, as in '9 m'.")] = None,
    roof_b: Annotated[str | None, typer.Option(metavar="TEXT", help="Roof at B above ground.")] = None,
    crs: Annotated[
        str | None, typer.Option(metavar="TEXT", help="System of the positions, as in EPSG:32623; WGS 84 if left out.")
    ] = None,
    gaps: Annotated[
        str, typer.Option(metavar="|".join(get_args(GapPolicy)), help="What gaps in the rasters are.")
    ] = "error",
    criteria: Annotated[
        str, typer.Option(metavar="|".join(get_args(CriteriaPreset)), help="What 'clear' means.")
    ] = "p530-temperate",
    study: Annotated[
        Path | None, typer.Option("--study", metavar="OUT.toml", help="Save the study under this name.")
    ] = None,
    save: Annotated[bool, typer.Option("--save/--no-save", help="Save a study file for `fellspan plan`.")] = True,
    out: Annotated[Path | None, typer.Option("--out", metavar="DIR", help="Write the report into this folder.")] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print results as JSON instead of the page.")] = False,
) -> None:
    """Is it clear between two points? Asks for what is missing when at a terminal."""
    gap_policy: GapPolicy = one_of(gaps, get_args(GapPolicy), "--gaps")
    preset: CriteriaPreset = one_of(criteria, get_args(CriteriaPreset), "--criteria")
    if study is not None and study.exists():
        raise UsageError(f"{study} exists and is left as it is", "name another file for --study")

    from fellspan.cli.running import finish, run_plan
    from fellspan.cli.sight_study import SightOptions, sight_study

    made, was_asked = sight_study(
        SightOptions(
            points=points or (),
            crs=crs,
            ground=ground or (),
            surface=surface or (),
            gaps=gap_policy,
            frequency=frequency,
            height_a=height_a,
            height_b=height_b,
            roof_a=roof_a,
            roof_b=roof_b,
            preset=preset,
        )
    )
    try:
        plan = run_plan(made)
        if plan.failures:
            raise plan.failures[0].error
    except FellspanError:
        if was_asked and save:
            _save(made, study)  # what a person has typed is worth keeping, to be mended
        raise
    finish(plan, out=out, as_json=as_json)
    if save:
        _save(made, study)


def _save(study: "Study", wanted: Path | None) -> None:
    from fellspan.study.writing import study_text

    path = wanted or _free_name()
    write_new(path, study_text(study, folder=path.parent))
    typer.echo(f"study saved as {path}, for fellspan plan", err=True)


def _free_name() -> Path:
    """A name of today that no file has yet."""
    today = dt.date.today().isoformat()
    names = (Path(f"sight-{today}{'' if number == 1 else f'-{number}'}.toml") for number in range(1, 10_000))
    return next(name for name in names if not name.exists())
