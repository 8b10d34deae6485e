"""The study of one sight line: from options, and from questions where options are missing and someone can answer.

Makes a `Study`; runs nothing and writes nothing.
"""

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import get_args

from fellspan.cli.asking import ask, ask_choice, ask_or_skip, can_ask
from fellspan.cli.sight_points import read_points
from fellspan.errors import UsageError
from fellspan.geodesy.coordinates import ParsedPosition, parse_position
from fellspan.links.site import Link, Radio, Site
from fellspan.planning.inputs import Study, TerrainInputs
from fellspan.quantities import AntennaHeight, parse_antenna_height, parse_frequency_hz, parse_length_m
from fellspan.study.assembling import raster_path
from fellspan.study.notes import position_note
from fellspan.terrain.sources import RasterSource
from fellspan.vocabulary import CriteriaPreset, GapPolicy, HeightReference

_EXAMPLE = "--ground dtm.tif --frequency '5.8 GHz' --height-a '12 m above ground'"


@dataclass(frozen=True, slots=True, kw_only=True)
class SightOptions:
    """What was typed after `fellspan sight`; None or empty where nothing was."""

    points: Sequence[str]
    crs: str | None
    ground: Sequence[str]
    surface: Sequence[str]
    gaps: GapPolicy
    frequency: str | None
    height_a: str | None
    height_b: str | None
    roof_a: str | None
    roof_b: str | None
    preset: CriteriaPreset


def sight_study(options: SightOptions) -> tuple[Study, bool]:
    """The study, and whether anything was asked for it.

    Raises
    ------
    UsageError
        Something is missing and nobody can be asked.
    """
    points = read_points(options.points, crs=options.crs)
    missing = _missing(options, len(points))
    if missing and not can_ask():
        raise UsageError(
            f"sight still needs: {', '.join(missing)}",
            "the input is no terminal, so nothing can be asked",
            f"for instance: {_EXAMPLE}",
        )
    while len(points) < 2:
        points.append(ask(f"Position of {'AB'[len(points)]}", lambda text: parse_position(text, crs=options.crs)))
    frequency_hz = (
        parse_frequency_hz(options.frequency)
        if options.frequency
        else ask("Frequency, as in 5.8 GHz", parse_frequency_hz)
    )
    a = _site("A", points[0], options.height_a, options.roof_a)
    b = _site("B", points[1], options.height_b, options.roof_b)
    notes = tuple(position_note(name, point.caution) for name, point in zip("AB", points, strict=True) if point.caution)
    today = dt.date.today()
    study = Study(
        title=f"Sight line of {today.isoformat()}",
        links=(Link(name="A - B", a=a, b=b, radio=Radio(name="radio", frequency_hz=frequency_hz)),),
        terrain=_terrain(options),
        date=today,
        preset=options.preset,
        notes=notes,
    )
    return study, bool(missing)


def _missing(options: SightOptions, points: int) -> list[str]:
    """What must still be known, as a person would type it."""
    wanted = {
        "the position of A": points >= 1,
        "the position of B": points >= 2,
        "--ground or --surface (a raster)": bool(options.ground or options.surface),
        "--frequency": options.frequency,
        "--height-a": options.height_a,
        "--height-b": options.height_b,
    }
    return [name for name, given in wanted.items() if not given]


def _site(name: str, point: ParsedPosition, height_text: str | None, roof_text: str | None) -> Site:
    height = (
        parse_antenna_height(height_text)
        if height_text
        else ask(f"Antenna height at {name}, as in 12 m above roof", parse_antenna_height)
    )
    reference = height.reference or _reference(name, height, height_text)
    roof_m = parse_length_m(roof_text) if roof_text else None
    if reference == "roof" and roof_m is None and can_ask():
        roof_m = ask_or_skip(f"Roof at {name} above ground, if no raster shows it", parse_length_m)
    return Site(name=name, position=point.position, height_m=height.height_m, height_reference=reference, roof_m=roof_m)


def _reference(name: str, height: AntennaHeight, text: str | None) -> HeightReference:
    """What a height without words is measured from: never guessed."""
    if not can_ask():
        raise UsageError(
            f"--height-{name.lower()} '{text}' does not say above what",
            f"write '{text} above ground', '{text} above roof' or '{text} above sea level'",
        )
    word = ask_choice(f"{height.height_m:g} m at {name}: above what?", get_args(HeightReference))
    return next(reference for reference in get_args(HeightReference) if reference == word)


def _terrain(options: SightOptions) -> TerrainInputs:
    ground, surface = list(options.ground), list(options.surface)
    if not ground and not surface:
        file = ask("Elevation raster (file or folder of tiles)", _existing)
        is_bare = ask_choice("Bare ground, or surface with roofs and treetops?", ("ground", "surface"))
        (ground if is_bare == "ground" else surface).append(file)
    return TerrainInputs(
        ground=tuple(RasterSource(path=raster_path(file, Path()), role="ground") for file in ground),
        surface=tuple(RasterSource(path=raster_path(file, Path()), role="surface") for file in surface),
        gaps=options.gaps,
    )


def _existing(text: str) -> str:
    path = raster_path(text, Path())
    if isinstance(path, Path) and not path.exists():
        raise UsageError(f"there is no file '{text}'", f"looked for at {path.absolute()}")
    return text
