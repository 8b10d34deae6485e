"""Turns what a caller gives for each kind of terrain data into opened layers, with datums compared.

Opens files; samples nothing.
"""

import math
from collections.abc import Iterable, Sequence
from contextlib import ExitStack
from dataclasses import replace
from pathlib import Path
from typing import TypeAlias, TypeVar, get_args

from fellspan.errors import TerrainError, VerticalDatumError
from fellspan.terrain.assemble import Layers
from fellspan.terrain.many_obstacles import ManyObstacles
from fellspan.terrain.obstacle_files import read_obstacles
from fellspan.terrain.sources import CoverSource, ObstacleSource, RasterSource, SurveySource
from fellspan.terrain.stack import RasterStack
from fellspan.terrain.survey import read_survey
from fellspan.terrain.survey_index import SurveyIndex
from fellspan.terrain.units import datum_key, is_ellipsoidal
from fellspan.vocabulary import CoverKind, GapPolicy, RasterRole

_Source = TypeVar("_Source", RasterSource, CoverSource, ObstacleSource, SurveySource)

RasterLike: TypeAlias = str | Path | RasterSource | Sequence[str | Path | RasterSource]
CoverLike: TypeAlias = str | Path | CoverSource | Sequence[str | Path | CoverSource]
ObstaclesLike: TypeAlias = str | Path | ObstacleSource | Sequence[str | Path | ObstacleSource]
SurveyLike: TypeAlias = str | Path | SurveySource | Sequence[str | Path | SurveySource]


def open_layers(
    *,
    ground: RasterLike | None,
    surface: RasterLike | None,
    cover: CoverLike | None,
    obstacles: ObstaclesLike | None,
    survey: SurveyLike | None,
    gaps: str,
    sea_level_m: float,
    growth_years: float,
) -> tuple[Layers, str | None, tuple[str, ...]]:
    """Open everything: the layers, the vertical datum that the files state, and notes."""
    policy = _policy(gaps)
    if not math.isfinite(sea_level_m) or not -500.0 <= sea_level_m <= 9500.0:
        raise TerrainError(f"sea level {sea_level_m:g} m is outside -500 to 9500 m")
    if not math.isfinite(growth_years) or not 0.0 <= growth_years <= 100.0:
        raise TerrainError(f"growth over {growth_years:g} years is outside 0 to 100 years")
    ground_sources = _rasters(_listed(ground, RasterSource), "ground")
    surface_sources = _rasters(_listed(surface, RasterSource), "surface")
    cover_sources = _listed(cover, CoverSource)
    obstacle_sources = _listed(obstacles, ObstacleSource)
    survey_sources = _listed(survey, SurveySource)
    if not ground_sources and not surface_sources:
        raise TerrainError("no terrain raster is given", "give a raster of bare ground, or of the surface, or both")
    if not ground_sources and cover_sources:
        raise TerrainError(
            f"cover raster '{Path(cover_sources[0].path).name}' is given beside a surface raster only",
            "a surface already holds what stands on the ground: leave the cover out, or add bare ground",
        )
    read_from = [read_obstacles(source.path) for source in obstacle_sources]
    surveys = [read_survey(source.path) for source in survey_sources]
    tables = [(datum, f"survey file {file.name}") for file in surveys for datum in file.datums]
    for source, (_, stated, _) in zip(obstacle_sources, read_from, strict=True):
        tables += [(datum, f"obstacle file {Path(source.path).name}") for datum in stated]
    notes: list[str] = []
    with ExitStack() as on_failure:

        def opened(sources: Sequence[RasterSource | CoverSource], role: RasterRole) -> RasterStack:
            stack = RasterStack.open(sources, role=role)
            on_failure.callback(stack.close)
            return stack

        bare = opened(ground_sources, "ground") if ground_sources else None
        top = opened(surface_sources, "surface") if surface_sources else None
        covers = tuple((source, opened([source], "cover")) for source in cover_sources)
        rasters = [stack for stack in (bare, top) if stack is not None]
        datum = _one_datum([*((stack.vertical_datum, stack.names[0]) for stack in rasters), *tables])
        if policy == "sea" and is_ellipsoidal(datum):
            raise VerticalDatumError(
                f"gaps cannot be filled with sea: heights are above an ellipsoid ('{datum}'), not above sea level",
                f"raster: {rasters[0].names[0]}",
                "convert the heights to a datum of sea level (a geoid), or leave gaps at 'error'",
            )
        on_failure.pop_all()
    if bare is None:
        notes.append("only a surface raster is given: heights above ground are counted from roofs and tree tops there")
    if datum is not None and all(stack.vertical_datum is None for stack in rasters):
        notes.append(f"no raster states its vertical datum; taken as that of the tables, '{datum}'")
    for _, _, said in read_from:
        notes.extend(said)
    finest = min(stack.cell_m for stack in (*rasters, *(stack for _, stack in covers)))
    layers = Layers(
        ground=rasters[0],
        is_bare=bare is not None,
        surface=top if bare is not None else None,
        cover=covers,
        obstacles=ManyObstacles([obstacle for read, _, _ in read_from for obstacle in read]),
        complete=frozenset(kind for source in obstacle_sources for kind in _complete(source)),
        survey=SurveyIndex(surveys, radius_m=0.5 * finest, growth_years=growth_years),
        sources=(*rasters[0].names, *(f"survey: {file.name}" for file in surveys), "sea level"),
        gaps=policy,
        sea_level_m=sea_level_m,
        growth_years=growth_years,
    )
    return layers, datum, tuple(notes)


def _listed(given: object, kind: type[_Source]) -> tuple[_Source, ...]:
    """One path, one source or a sequence of them, as sources."""
    if given is None:
        return ()
    many: Iterable[object] = (
        [given] if isinstance(given, str | Path | kind) or not isinstance(given, Iterable) else given
    )
    sources: list[_Source] = []
    for one in many:
        if isinstance(one, str | Path):
            sources.append(kind(path=one))
        elif isinstance(one, kind):
            sources.append(one)
        else:
            raise TerrainError(f"'{one!r}' is no path and no {kind.__name__}")
    return tuple(sources)


def _complete(source: ObstacleSource) -> tuple[CoverKind, ...]:
    for kind in source.complete:
        if kind not in ("building", "tree"):
            raise TerrainError(
                f"obstacle file '{Path(source.path).name}' cannot be complete for kind '{kind}'",
                "allowed: building, tree",
            )
    return source.complete


def _rasters(sources: Sequence[RasterSource], role: RasterRole) -> tuple[RasterSource, ...]:
    return tuple(source if source.role == role else replace(source, role=role) for source in sources)


def _policy(gaps: str) -> GapPolicy:
    if gaps == "error":
        return "error"
    if gaps == "sea":
        return "sea"
    raise TerrainError(f"gaps '{gaps}' is unknown", "allowed: " + ", ".join(get_args(GapPolicy)))


def _one_datum(datums: Sequence[tuple[str | None, str]]) -> str | None:
    """The one vertical datum that rasters and tables state."""
    first: tuple[str, str] | None = None
    for datum, who in datums:
        if datum is None:
            continue
        if first is None:
            first = (datum, who)
        elif datum_key(datum) != datum_key(first[0]):
            raise VerticalDatumError(
                f"{who} is in vertical datum '{datum}', but {first[1]} is in '{first[0]}'",
                "convert the heights of one of them; they are not mixed silently",
            )
    return first[0] if first else None
