"""Sentences about what a survey did to one path: where it departs from the rasters, and what it could not settle.

Computes differences only; nothing here changes a sample.
"""

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.alongpath import Floats
from fellspan.terrain.assemble import PathWork
from fellspan.terrain.samples import Samples
from fellspan.terrain.survey import SurveyRow

_SIGMAS, _ALWAYS_ALLOWED_M, _SILENT_M = 3.0, 1.0, 0.05
_MOST_LISTED = 20


def survey_notes(work: PathWork, samples: Samples) -> Iterator[str]:
    """What a person must know of the survey on a path."""
    yield from _wide(work)
    yield from _removed(work, samples)
    yield from _departures(work, samples)
    yield from _not_grown(work)


def _wide(work: PathWork) -> Iterator[str]:
    """Stretches too long to count as measured."""
    limit = (
        f"counts as measured up to {work.longest_chord_m:.0f} m only: beyond it the higher of raster and survey stands"
    )
    for segment in work.hits.wide[:_MOST_LISTED]:
        first, second = segment.first.row, segment.second.row
        if first is second:
            yield f"{first.where}: a radius of {segment.length_m / 2.0:.0f} m {limit}"
        else:
            yield f"{_places((first, second))}: the line over the {segment.length_m:.0f} m between them {limit}"
    others = len(work.hits.wide) - _MOST_LISTED
    if others > 0:
        yield f"survey: {others} more stretch{'es' if others > 1 else ''} too long to count as measured"


def _removed(work: PathWork, samples: Samples) -> Iterator[str]:
    """Obstacles that a survey of their own spot has removed."""
    gone = sorted(samples.removed)
    for number in gone[:_MOST_LISTED]:
        thing = work.standing[number].shown
        middle = 0.5 * (thing.from_m + thing.to_m)
        nearest = min((hit for hit in work.hits.ends() if hit.row.has_top), key=lambda hit: abs(hit.at_m - middle))
        yield (
            f"{thing.kind} '{thing.name}' ({thing.source}) at {middle / 1000.0:.3f} km is left out where the survey measured "
            f"lower, {nearest.row.where}"
        )
    if len(gone) > _MOST_LISTED:
        yield f"survey: {len(gone) - _MOST_LISTED} more obstacles are left out where it measured lower"


def _departures(work: PathWork, samples: Samples) -> Iterator[str]:
    """Where measured ground or tops lie off the rasters by more than the errors of both explain."""
    if not work.hits.points and not work.hits.segments:
        return
    measured = work.hits.measured(samples.distance_m)
    said = np.isfinite(measured.ground_m) | np.isfinite(measured.top_m) | np.isfinite(measured.cover_m)
    if not said.any():
        return
    distance = samples.distance_m[said]
    ground = work.ground(distance)
    cover, _ = work.cover(distance, ground)
    measured, raster = ground.measured, ground.raster
    has_ground, has_top = np.isfinite(measured.ground_m), np.isfinite(measured.top_m)
    step = measured.ground_m - raster.value_m
    off = np.abs(step) > _allowed(measured.ground_sigma_m, raster.sigma_m)
    yield from _worst(work, distance, step, off & has_ground, measured.file, "ground", "the ground raster")
    lowered = measured.top_m - raster.value_m
    bare = has_top & ~has_ground & (lowered < -_SILENT_M)
    more = "; the ground is lowered to it there, since none was measured"
    yield from _worst(work, distance, lowered, bare, measured.file, "top", "the ground raster", more)
    top = np.where(has_top, measured.top_m, raster.value_m + measured.cover_m)
    surface_sigma = np.where(cover.from_surface, cover.sigma_m, np.hypot(raster.sigma_m, cover.sigma_m))
    below = top - (raster.value_m + cover.height_m)
    off_top = (cover.height_m > 0.0) & (below < -_allowed(measured.top_sigma_m, surface_sigma)) & ~bare
    yield from _worst(work, distance, below, off_top, measured.file, "top", "what the rasters say stands there")


def _allowed(first_sigma_m: Floats, second_sigma_m: Floats) -> Floats:
    allowed: Floats = np.maximum(_ALWAYS_ALLOWED_M, _SIGMAS * np.hypot(first_sigma_m, second_sigma_m))
    return allowed


def _worst(
    work: PathWork,
    distance_m: Floats,
    step_m: Floats,
    where: NDArray[np.bool_],
    file: NDArray[np.int16],
    what: str,
    against: str,
    more: str = "",
) -> Iterator[str]:
    """One line for each survey file: its worst departure, the rows it comes from, and the stretches that are like it."""
    for number in np.unique(file[where]).tolist():
        here = np.flatnonzero(where & (file == number))
        worst = here[int(np.argmax(np.abs(step_m[here])))]
        rows = work.hits.rows_at(float(distance_m[worst]))
        stretches = 1 + int(np.count_nonzero(np.diff(here) > 1))
        span = f"{distance_m[here[0]] / 1000.0:.2f} to {distance_m[here[-1]] / 1000.0:.2f} km"
        like = f", worst of {stretches} places from {span}" if stretches > 1 else ""
        yield (
            f"{_places(rows) if rows else f'survey file {number + 1}'}: {what} {abs(step_m[worst]):.1f} m "
            f"{'below' if step_m[worst] < 0 else 'above'} {against} at {distance_m[worst] / 1000.0:.3f} km{like}{more}"
        )


def _not_grown(work: PathWork) -> Iterator[str]:
    """Surveyed trees that stay as they stood while others grow."""
    if not work.layers.growth_years:
        return
    rows = [
        hit.row
        for hit in work.hits.ends()
        if hit.row.kind == "tree" and hit.row.has_top and hit.row.growth_m_per_year is None
    ]
    if rows:
        yield (
            f"{rows[0].where}: {len(rows)} surveyed tree tops on this path state no growth_m_per_year; "
            f"taken as they stood, without {work.layers.growth_years:g} years of growth"
        )


def _places(rows: tuple[SurveyRow, ...]) -> str:
    """'survey file 'walk.csv', row 2 and row 3'."""
    later = [row.where.rsplit(", ", 1)[-1] for row in rows[1:] if row.where != rows[0].where]
    return " and ".join([rows[0].where, *later])
