"""`fellspan sight`: is it clear between two points? Needs no file; asks at a terminal, refuses in a pipe, saves a study."""

import datetime as dt
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, get_args

import typer

from fellspan.cli.choices import one_of
from fellspan.cli.init_command import write_new
from fellspan.cli.telling import tell
from fellspan.errors import FellspanError, UsageError
from fellspan.vocabulary import CriteriaPreset, GapPolicy, LengthUnit

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
    cover: Annotated[
        list[str] | None,
        typer.Option(
            "--cover",
            metavar="FILE:KIND",
            help="Raster of heights above ground, as in trees.tif:tree (tree, building or other).",
        ),
    ] = None,
    obstacles: Annotated[
        list[str] | None,
        typer.Option(
            "--obstacles",
            metavar="FILE[:KIND]",
            help="CSV or GeoJSON of buildings, masts, trees; ':building' says that it holds all buildings.",
        ),
    ] = None,
    survey: Annotated[
        list[str] | None, typer.Option("--survey", metavar="FILE", help="CSV of what was measured on the ground.")
    ] = None,
    unit: Annotated[
        str | None,
        typer.Option(metavar="|".join(get_args(LengthUnit)), help="Unit of the raster's heights, if it states none."),
    ] = None,
    datum: Annotated[
        str | None, typer.Option(metavar="TEXT", help="Vertical datum of the raster, as in EGM96, if it states none.")
    ] = None,
    error: Annotated[
        str | None, typer.Option(metavar="TEXT", help="One standard error of the raster's heights, as in '1.5 m'.")
    ] = None,
    power: Annotated[
        str | None,
        typer.Option(metavar="TEXT", help="Transmit power, as in '23 dBm'; with the gains it gives the level."),
    ] = None,
    gain: Annotated[str | None, typer.Option(metavar="TEXT", help="Antenna gain at both ends, as in '25 dBi'.")] = None,
    gain_a: Annotated[str | None, typer.Option(metavar="TEXT", help="Antenna gain at A.")] = None,
    gain_b: Annotated[str | None, typer.Option(metavar="TEXT", help="Antenna gain at B.")] = None,
    threshold: Annotated[
        str | None, typer.Option(metavar="TEXT", help="Level that the radio needs, as in '-72 dBm'; gives the margin.")
    ] = None,
    crs: Annotated[
        str | None, typer.Option(metavar="TEXT", help="System of the positions, as in EPSG:32623; WGS 84 if left out.")
    ] = None,
    gaps: Annotated[
        str, typer.Option(metavar="|".join(get_args(GapPolicy)), help="What gaps in the rasters are.")
    ] = "error",
    criteria: Annotated[
        str, typer.Option(metavar="|".join(get_args(CriteriaPreset)), help="What 'clear' means.")
    ] = "p530-temperate",
    saved_as: Annotated[
        Path | None, typer.Option("--study", metavar="OUT.toml", help="Save the study under this name.")
    ] = None,
    save: Annotated[bool, typer.Option("--save/--no-save", help="Save a study file for `fellspan plan`.")] = True,
    out: Annotated[Path | None, typer.Option("--out", metavar="DIR", help="Write the report into this folder.")] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print results as JSON instead of the page.")] = False,
) -> None:
    """Is it clear between two points? Asks for what is missing when at a terminal."""
    gap_policy: GapPolicy = one_of(gaps, get_args(GapPolicy), "--gaps")
    preset: CriteriaPreset = one_of(criteria, get_args(CriteriaPreset), "--criteria")
    length_unit: LengthUnit | None = None if unit is None else one_of(unit, get_args(LengthUnit), "--unit")
    if saved_as is not None and saved_as.exists():
        raise UsageError(f"{saved_as} exists and is left as it is", "name another file for --study")

    from fellspan.cli.running import finish, run_plan
    from fellspan.cli.sight_study import SightOptions, sight_study

    if out is not None:
        from fellspan.exports.folder import check_target

        check_target(out)

    made, was_asked = sight_study(
        SightOptions(
            points=points or (),
            crs=crs,
            ground=ground or (),
            surface=surface or (),
            cover=cover or (),
            obstacles=obstacles or (),
            survey=survey or (),
            unit=length_unit,
            datum=datum,
            error=error,
            gaps=gap_policy,
            frequency=frequency,
            height_a=height_a,
            height_b=height_b,
            roof_a=roof_a,
            roof_b=roof_b,
            power=power,
            gain_a=gain_a or gain,
            gain_b=gain_b or gain,
            threshold=threshold,
            preset=preset,
        )
    )
    try:
        plan = run_plan(made, report=out is not None)
        if plan.failures:
            raise plan.failures[0].error
    except FellspanError:
        if was_asked and save:
            _save(made, saved_as)  # what a person has typed is worth keeping, to be mended
        raise
    finish(plan, out=out, as_json=as_json)
    if save:
        _save(made, saved_as)


def _save(study: "Study", wanted: Path | None) -> None:
    from fellspan.study.writing import study_text

    path = wanted or _free_name()
    write_new(path, study_text(study, folder=path.parent))
    tell(f"study saved as {path}, for fellspan plan")


def _free_name() -> Path:
    """A name of today that no file has yet."""
    today = dt.date.today().isoformat()
    names = (Path(f"sight-{today}{'' if number == 1 else f'-{number}'}.toml") for number in range(1, 10_000))
    return next(name for name in names if not name.exists())
