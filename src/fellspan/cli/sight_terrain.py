"""The terrain of one sight line: from options, and from questions where no raster was named and someone can answer.

Sees that files exist and that the first raster covers the points; plans nothing.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import get_args

from fellspan.cli.asking import ask, ask_choice
from fellspan.errors import TerrainGapError, UsageError
from fellspan.geodesy.coordinates import ParsedPosition, format_position
from fellspan.geodesy.position import Position
from fellspan.planning.inputs import TerrainInputs
from fellspan.quantities import parse_length_m
from fellspan.study.assembling import address_trouble, raster_path
from fellspan.terrain.sources import CoverSource, ObstacleSource, RasterSource, SurveySource
from fellspan.vocabulary import CoverKind, GapPolicy, LengthUnit, RasterRole


@dataclass(frozen=True, slots=True, kw_only=True)
class TerrainOptions:
    """What was typed about terrain; empty or None where nothing was."""

    ground: Sequence[str]
    surface: Sequence[str]
    cover: Sequence[str]
    obstacles: Sequence[str]
    survey: Sequence[str]
    unit: LengthUnit | None
    datum: str | None
    error: str | None
    gaps: GapPolicy


def terrain_inputs(options: TerrainOptions, points: Sequence[ParsedPosition]) -> TerrainInputs:
    """The files as a study has them; a raster is asked for where none was named, and must cover the points given so far."""
    if options.ground or options.surface:
        return _inputs(options, list(options.ground), list(options.surface))
    places = [point.position for point in points]

    def read(text: str) -> str:
        _existing("raster", text)
        refuse_uncovered(_inputs(options, [text], []), places, anyway=True)
        return text

    file = ask("Elevation raster (file or folder of tiles)", read)
    is_bare = ask_choice("Bare ground, or surface with roofs and treetops?", ("ground", "surface")) == "ground"
    return _inputs(options, [file] if is_bare else [], [] if is_bare else [file])


def refuse_uncovered(terrain: TerrainInputs, places: Sequence[Position], *, anyway: bool = False) -> None:
    """Raise TerrainGapError for the first place without data, unless gaps are sea; `anyway` opens the rasters without places.

    What else is wrong with the rasters is raised as planning would.
    """
    if terrain.gaps == "sea" or not (places or anyway):
        return
    from fellspan.terrain.stack import RasterStack

    role: RasterRole = "ground" if terrain.ground else "surface"
    stack = RasterStack.open(terrain.ground or terrain.surface, role=role)
    try:
        found = stack.sample_positions(
            [place.latitude_deg for place in places], [place.longitude_deg for place in places]
        )
    finally:
        stack.close()
    for place, value in zip(places, found.value_m.tolist(), strict=True):
        if math.isnan(value):
            raise TerrainGapError(
                f"no data at {format_position(place)} in {', '.join(stack.names[:3])}",
                "latitude comes first; fellspan terrain FILE tells what a raster covers",
            )


def _inputs(options: TerrainOptions, ground: Sequence[str], surface: Sequence[str]) -> TerrainInputs:
    return TerrainInputs(
        ground=tuple(_raster(options, file, "ground") for file in ground),
        surface=tuple(_raster(options, file, "surface") for file in surface),
        cover=tuple(_cover(text) for text in options.cover),
        obstacles=tuple(_obstacles(text) for text in options.obstacles),
        survey=tuple(SurveySource(path=_existing("--survey", file)) for file in options.survey),
        gaps=options.gaps,
    )


def _raster(options: TerrainOptions, file: str, role: RasterRole) -> RasterSource:
    return RasterSource(
        path=raster_path(file, Path()),
        role=role,
        vertical_unit=options.unit,
        vertical_datum=options.datum,
        error_m=parse_length_m(options.error) if options.error else None,
    )


def _cover(text: str) -> CoverSource:
    file, kinds = _with_kinds(text)
    if len(kinds) > 1:
        raise UsageError(f"--cover '{text}' names several kinds", "a cover raster holds one kind, as in trees.tif:tree")
    return CoverSource(path=_existing("--cover", file), kind=kinds[0] if kinds else "other")


def _obstacles(text: str) -> ObstacleSource:
    file, kinds = _with_kinds(text)
    return ObstacleSource(path=_existing("--obstacles", file), complete=kinds)


def _with_kinds(text: str) -> tuple[str, tuple[CoverKind, ...]]:
    """A file name and the kinds of cover after its last colon, if it ends so: 'trees.tif:tree', 'houses.csv:building,tree'."""
    file, _, tail = text.rpartition(":")
    words = tail.split(",")
    kinds = tuple(kind for word in words for kind in get_args(CoverKind) if kind == word.strip())
    if not file or len(kinds) != len(words):
        return text, ()
    return file, kinds


def _existing(option: str, text: str) -> str | Path:
    path = raster_path(text, Path())
    wrong = address_trouble(text, raster=option in ("raster", "--cover")) if isinstance(path, str) else None
    if wrong is not None:
        raise UsageError(f"{option}: {wrong[0]}", *wrong[1:])
    if isinstance(path, Path) and not path.exists():
        raise UsageError(f"{option}: there is no file '{text}'", f"looked for at {path.absolute()}")
    return path
