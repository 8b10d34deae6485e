"""`fellspan heights`: how high must the antennas be? For the links of a study, or between two points as `sight` takes them."""

import dataclasses
import json
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, get_args

import typer

from fellspan.cli.choices import one_of
from fellspan.cli.telling import tell
from fellspan.errors import UsageError
from fellspan.vocabulary import CriteriaPreset, GapPolicy

if TYPE_CHECKING:
    from fellspan.design.heights_result import HeightSettings, Limits
    from fellspan.planning.inputs import Study
    from fellspan.planning.plan import StudyPlan

INPUT = 2
START_HEIGHT = "10 m above ground"
"""What two points start from where no height is typed."""


def heights_command(
    where: Annotated[list[str], typer.Argument(metavar="STUDY | A B", help="Study file (.toml), or two positions.")],
    link: Annotated[
        list[str] | None,
        typer.Option("--link", metavar="NAME", help="This link of the study only; may be given again."),
    ] = None,
    ground: Annotated[
        list[str] | None,
        typer.Option("--ground", "--terrain", metavar="FILE", help="Two points: raster of bare ground."),
    ] = None,
    surface: Annotated[
        list[str] | None, typer.Option("--surface", metavar="FILE", help="Two points: raster of the surface.")
    ] = None,
    frequency: Annotated[str | None, typer.Option(metavar="TEXT", help="Two points: as in '5.8 GHz'.")] = None,
    height_a: Annotated[
        str | None, typer.Option(metavar="TEXT", help=f"Two points: planned at A; {START_HEIGHT} if left out.")
    ] = None,
    height_b: Annotated[
        str | None, typer.Option(metavar="TEXT", help=f"Two points: planned at B; {START_HEIGHT} if left out.")
    ] = None,
    roof_a: Annotated[str | None, typer.Option(metavar="TEXT", help="Two points: roof at A above ground.")] = None,
    roof_b: Annotated[str | None, typer.Option(metavar="TEXT", help="Two points: roof at B above ground.")] = None,
    crs: Annotated[str | None, typer.Option(metavar="TEXT", help="System of the positions, as in EPSG:32623.")] = None,
    gaps: Annotated[
        str, typer.Option(metavar="|".join(get_args(GapPolicy)), help="Two points: what gaps in the rasters are.")
    ] = "error",
    criteria: Annotated[
        str, typer.Option(metavar="|".join(get_args(CriteriaPreset)), help="Two points: what 'clear' means.")
    ] = "p530-temperate",
    step: Annotated[str, typer.Option(metavar="TEXT", help="Mast step to round up to.")] = "1 m",
    limit_a: Annotated[
        str | None, typer.Option(metavar="TEXT", help="Highest mast at A, as in '30 m', or a range, '3 m to 30 m'.")
    ] = None,
    limit_b: Annotated[str | None, typer.Option(metavar="TEXT", help="Highest mast at B, or a range.")] = None,
    cost_per_metre: Annotated[
        str | None, typer.Option(metavar="A[,B]", help="Cost of a metre of mast, the same or one for each end.")
    ] = None,
    cost_per_section: Annotated[float, typer.Option(metavar="COST", help="Cost of each begun mast section.")] = 0.0,
    section: Annotated[str, typer.Option(metavar="TEXT", help="Length of a mast section.")] = "3 m",
    years: Annotated[float | None, typer.Option(metavar="YEARS", help="Years for which trees are grown.")] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print results as JSON instead of the page.")] = False,
) -> None:
    """How high must the antennas be? The lowest heights that work, and what governs them."""
    gap_policy: GapPolicy = one_of(gaps, get_args(GapPolicy), "--gaps")
    preset: CriteriaPreset = one_of(criteria, get_args(CriteriaPreset), "--criteria")
    wanted = _settings(step, limit_a, limit_b, cost_per_metre, cost_per_section, section)
    if _is_study(where):
        from fellspan.cli.plan_command import only
        from fellspan.study.reading import load_study

        _refuse_beside_a_study(
            {
                "--crs": crs,
                "--ground": ground,
                "--surface": surface,
                "--frequency": frequency,
                "--height-a": height_a,
                "--height-b": height_b,
                "--roof-a": roof_a,
                "--roof-b": roof_b,
            }
        )
        study = only(load_study(Path(where[0])), link or [])
    else:
        from fellspan.cli.sight_study import SightOptions, sight_study

        study, _ = sight_study(
            SightOptions(
                points=where,
                crs=crs,
                ground=ground or (),
                surface=surface or (),
                gaps=gap_policy,
                frequency=frequency,
                height_a=height_a or START_HEIGHT,
                height_b=height_b or START_HEIGHT,
                roof_a=roof_a,
                roof_b=roof_b,
                preset=preset,
                command="heights",
            )
        )
    if years is not None:
        study = _grown(study, years)
    from fellspan.planning.planner import plan_study

    plan = plan_study(study, heights=wanted)
    if as_json:
        typer.echo(_json_text(plan), nl=False)
    else:
        _print(plan)
    for failure in plan.failures:
        tell(f"fellspan: {failure.link.name}: {failure.error}")
    if plan.failures:
        raise typer.Exit(INPUT)


def _refuse_beside_a_study(given: dict[str, object]) -> None:
    """Options of two points would be lost beside a study, which says the same itself."""
    lost = [name for name, value in given.items() if value]
    if lost:
        raise UsageError(
            f"{', '.join(lost)} cannot stand beside a study",
            "the study says it: change it there, or give two positions instead of the study",
        )


def _is_study(where: list[str]) -> bool:
    return len(where) == 1 and (where[0].endswith(".toml") or Path(where[0]).is_file())


def _grown(study: "Study", years: float) -> "Study":
    if not 0.0 <= years <= 100.0:
        raise UsageError(f"--years {years:g} is outside 0 to 100", "give the years for which the link should work")
    return dataclasses.replace(study, growth_years=years)


def _settings(
    step: str, limit_a: str | None, limit_b: str | None, cost: str | None, per_section: float, section: str
) -> "HeightSettings":
    from fellspan.design.heights_result import HeightSettings
    from fellspan.quantities import parse_length_m

    cost_a, cost_b = _costs(cost)
    return HeightSettings(
        step_m=parse_length_m(step),
        limits_a=_limits(limit_a),
        limits_b=_limits(limit_b),
        cost_a_per_m=cost_a,
        cost_b_per_m=cost_b,
        cost_per_section=per_section,
        section_m=parse_length_m(section),
    )


def _limits(text: str | None) -> "Limits":
    from fellspan.design.heights_result import Limits
    from fellspan.quantities import parse_length_m

    if text is None:
        return Limits()
    low, to, high = text.partition(" to ")
    if not to:
        return Limits(high_m=parse_length_m(text))
    return Limits(low_m=parse_length_m(low), high_m=parse_length_m(high))


def _costs(text: str | None) -> tuple[float | None, float | None]:
    if text is None:
        return None, None
    try:
        costs = [float(part) for part in text.split(",")]
    except ValueError:
        costs = []
    if len(costs) not in (1, 2):
        raise UsageError(
            f"--cost-per-metre '{text}' is not a cost, or one for each end", "write 120, or 120,80 for A and B"
        )
    return costs[0], costs[-1]


def _print(plan: "StudyPlan") -> None:
    from fellspan.cli.heights_page import heights_lines
    from fellspan.cli.layout import Ink, colours_wanted, rule

    ink = Ink(colours=colours_wanted())
    for number, linked in enumerate(plan.links):
        lines = heights_lines(linked, ink=ink)
        typer.echo("\n".join(["", rule(), *lines] if number else lines))


def _json_text(plan: "StudyPlan") -> str:
    """The keys of results.json that answer the question, for each link."""
    from fellspan.exports.results_json import results_dict

    kept = ("name", "a", "b", "verdict", "basis", "distance_m", "heights", "confidence_along_path")
    found = results_dict(plan)
    answer = {
        "schema": found["schema"],
        "fellspan": found["fellspan"],
        "links": [{key: link[key] for key in kept} for link in found["links"]],
        "failures": found["failures"],
    }
    return json.dumps(answer, ensure_ascii=False, allow_nan=False, indent=1) + "\n"
