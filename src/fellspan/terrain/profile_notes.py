"""Sentences about one path that a person must read: sea filled in, cover unknown, what a survey said.

Knows samples; computes nothing.
"""

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.alongpath import Floats
from fellspan.terrain.assemble import PathWork
from fellspan.terrain.cover import missing_kinds, never_rises
from fellspan.terrain.samples import Samples
from fellspan.terrain.survey_notes import survey_notes

_MOST_SURVEY_NOTES = 10


def path_notes(work: PathWork, samples: Samples, *, refined: bool) -> tuple[str, ...]:
    """Notes on one path; a refined profile keeps those it had, and gains only new facts."""
    layers = work.layers
    notes: list[str] = []
    if samples.negative_cover:
        notes.append("a cover raster holds heights below 0 on this path; they are taken as 0")
    if refined:
        return tuple(notes)
    sea = samples.source == layers.sea
    if sea.any():
        notes.append(
            f"no raster from {_stretches(samples.distance_m, sea)}: taken as open water at {layers.sea_level_m:g} m"
        )
    if layers.cover or layers.surface is not None:
        unknown = ~samples.valued & np.isfinite(samples.ground_m)
        if unknown.any():
            notes.append(
                f"cover is not known from {_stretches(samples.distance_m, unknown)}: taken as none there, check on site"
            )
    if missing := _missing(work, samples):
        notes.append(missing)
    notes += [str(step) for step in samples.surface_steps if step.is_noted]
    notes += [step.low_note for step in samples.surface_steps if step.low_note]
    if never_rises(samples.surface_steps, work.path.length_m):
        notes.append(
            "the surface raster nowhere rises above the ground on this path: is it the same raster, or bare ground?"
        )
    if not layers.is_bare and work.standing:
        notes.append(
            "obstacle heights above ground are counted from the surface raster, which may hold the obstacle already"
        )
    for standing in work.standing:
        if standing.crossing.obstacle.rule == "span" and standing.span_tops_m is None:
            notes.append(
                f"ground under a support of {standing.shown.name} is not known: taken as hung level from below it"
            )
    if beyond := work.hits.beyond:
        rows = "the row is" if len(beyond) == 1 else f"{len(beyond)} such rows are"
        notes.append(
            f"{beyond[0].where}: distance_m {beyond[0].distance_m:g} lies beyond the path's end at "
            f"{work.path.length_m:.0f} m; {rows} not used"
        )
    notes.extend(survey_notes(work, samples))
    for hit in [hit for hit in work.hits.points if hit.row.note][:_MOST_SURVEY_NOTES]:
        notes.append(f"surveyed at {hit.at_m / 1000.0:.3f} km: {hit.row.note} ({hit.row.file})")
    return tuple(notes)


def surface_tells(work: PathWork, samples: Samples) -> bool:
    """False where the surface raster shows nothing on the ground and no cover raster tells of trees and buildings both."""
    kinds = [source.kind for source, _ in work.layers.cover]
    lacking = missing_kinds(kinds, work.layers.complete)
    return not lacking or not never_rises(samples.surface_steps, work.path.length_m)


def _missing(work: PathWork, samples: Samples) -> str:
    """Which of trees and buildings the data do not hold, where they hold one of them; '' where nothing is lacking."""
    layers = work.layers
    kinds = [source.kind for source, _ in layers.cover]
    lacking = missing_kinds(kinds, layers.complete)
    if not layers.is_bare or not (kinds or layers.complete) or not lacking:
        return ""
    if not (samples.valued & ~samples.known & np.isfinite(samples.ground_m)).any() and kinds:
        return ""
    names = " and ".join(f"{kind}s" for kind in lacking)
    return (
        f"{names} are not in the data: the surface counts as not known; add a cover raster of them, a surface raster, "
        f"or an obstacle file declared complete = [{', '.join(repr(kind) for kind in lacking)}]"
    )


def _stretches(distance_m: Floats, where: NDArray[np.bool_]) -> str:
    change = np.diff(np.concatenate(([0], where.astype(np.int8), [0])))
    starts, stops = np.flatnonzero(change > 0), np.flatnonzero(change < 0) - 1
    said = [f"{distance_m[i] / 1000:.2f} to {distance_m[j] / 1000:.2f} km" for i, j in zip(starts, stops, strict=True)]
    others = len(said) - 3
    return ", ".join(said[:3]) + (f" and {others} more stretch{'es' if others > 1 else ''}" if others > 0 else "")
