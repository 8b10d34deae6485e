"""Obstacles and surveyed rows laid over profiles that rasters alone gave, as `terrain.assemble` lays them over one path.

Works on arrays of paths and on what stands on each of them; opens nothing, knows no rays.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fellspan.screening.profiles import Profiles
from fellspan.terrain.assemble import Layers, is_removed
from fellspan.terrain.cover import NONE, OTHER
from fellspan.terrain.obstacle_tops import Standing
from fellspan.terrain.obstacles import JOIN_M
from fellspan.terrain.profile import MEASURED_GROUND, MEASURED_NOTHING, MEASURED_TOP
from fellspan.terrain.survey_hits import SurveyHits
from fellspan.vocabulary import COVER_KINDS

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class OnPath:
    """What stands on one path beside its rasters."""

    standing: tuple[Standing, ...] = ()
    hits: SurveyHits | None = None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Overlaid:
    """Profiles with everything on them, and what made each sample, arrays (q, n)."""

    profiles: Profiles
    cover_m: Floats
    cover_kind: NDArray[np.int8]
    """Those of the profiles."""
    obstacle: NDArray[np.int32]
    """Which of the path's obstacles makes the surface, -1 where none does."""
    inside: NDArray[np.bool_]
    """Samples that lie in any obstacle with a known top."""
    measured: NDArray[np.int8] | None
    """As in `PathProfile`; None where nothing was surveyed."""

    def rows(self, rows: Index | NDArray[np.bool_]) -> "Overlaid":
        """Some of the paths."""
        return Overlaid(
            profiles=self.profiles.rows(rows),
            cover_m=self.cover_m[rows],
            cover_kind=self.cover_kind[rows],
            obstacle=self.obstacle[rows],
            inside=self.inside[rows],
            measured=None if self.measured is None else self.measured[rows],
        )


@dataclass(slots=True, kw_only=True, eq=False)
class _Work:
    """Arrays (q, n) that are being overlaid."""

    ground_m: Floats
    ground_sigma_m: Floats
    cover_m: Floats
    kind: NDArray[np.int8]
    sigma_m: Floats
    source: NDArray[np.int16]
    known: NDArray[np.bool_]
    said: NDArray[np.bool_]
    has_top: NDArray[np.bool_]
    has_ground: NDArray[np.bool_]

    @classmethod
    def of(cls, raw: Profiles) -> "_Work":
        shape = raw.distance_m.shape
        nothing = np.zeros(shape, dtype=np.bool_)
        return cls(
            ground_m=raw.ground_m.copy(),
            ground_sigma_m=np.broadcast_to(raw.ground_sigma_m, shape).copy(),
            cover_m=np.zeros(shape) if raw.cover_m is None else raw.cover_m.copy(),
            kind=np.zeros(shape, dtype=np.int8) if raw.cover_kind is None else raw.cover_kind.copy(),
            sigma_m=np.broadcast_to(raw.sigma_m, shape).copy(),
            source=np.broadcast_to(raw.source, shape).copy(),
            known=np.broadcast_to(raw.known, shape).copy(),
            said=nothing,
            has_top=nothing.copy(),
            has_ground=nothing.copy(),
        )


def overlaid(raw: Profiles, on: Sequence[OnPath], layers: Layers) -> Overlaid:
    """Profiles (q, n) with what stands on each path, (q,), over them."""
    work = _Work.of(raw)
    surveyed = [row for row, one in enumerate(on) if one.hits is not None]
    for row in surveyed:
        _lay_survey(work, row, raw.distance_m[row], on[row].hits or SurveyHits(), layers)
    obstacle, inside = _lay_obstacles(work, raw, on)
    measured = None
    if surveyed:
        _settle_ends(work, raw, surveyed)
        top = work.has_top & (obstacle < 0)
        measured = np.where(top, MEASURED_TOP, np.where(work.has_ground, MEASURED_GROUND, MEASURED_NOTHING))
    profiles = replace(
        raw,
        ground_m=work.ground_m,
        cover_m=work.cover_m,
        cover_kind=work.kind,
        sigma_m=work.sigma_m,
        ground_sigma_m=work.ground_sigma_m,
        source=work.source,
        known=work.known,
    )
    return Overlaid(
        profiles=profiles,
        cover_m=work.cover_m,
        cover_kind=work.kind,
        obstacle=obstacle,
        inside=inside,
        measured=None if measured is None else measured.astype(np.int8),
    )


def ground_at(hits: SurveyHits, distance_m: Floats, raster_m: Floats) -> Floats:
    """The ground at rising distances, (n,), from that of the rasters: what obstacles stand on."""
    measured = hits.measured(distance_m).ground_m
    chords = hits.chords(distance_m).ground_m
    value = np.where(np.isfinite(measured), measured, raster_m)
    with np.errstate(invalid="ignore"):
        return np.where(~np.isfinite(measured) & (chords > value), chords, value)


def _lay_survey(work: _Work, row: int, distance_m: Floats, hits: SurveyHits, layers: Layers) -> None:
    """What was surveyed on one path; as `PathWork.ground` and the first half of `PathWork.samples`."""
    measured, chords = hits.measured(distance_m), hits.chords(distance_m)
    value, ground_sigma, source = work.ground_m[row], work.ground_sigma_m[row], work.source[row]
    height, kind = work.cover_m[row], work.kind[row]
    cover_sigma = np.sqrt(np.maximum(work.sigma_m[row] ** 2 - ground_sigma**2, 0.0))
    told = np.isfinite(measured.ground_m)
    value = np.where(told, measured.ground_m, value)
    ground_sigma = np.where(told, measured.ground_sigma_m, ground_sigma)
    source = np.where(told, layers.first_survey + measured.file, source)
    with np.errstate(invalid="ignore"):
        raised = ~told & (chords.ground_m > value)
    value = np.where(raised, chords.ground_m, value)
    ground_sigma = np.where(raised, np.maximum(ground_sigma, chords.sigma_m), ground_sigma)
    source = np.where(raised, layers.first_survey + chords.file, source)

    has_top, has_cover = np.isfinite(measured.top_m), np.isfinite(measured.cover_m)
    with np.errstate(invalid="ignore"):
        bare = has_top & ~told & ~(value <= measured.top_m)
    value = np.where(bare, measured.top_m, value)
    source = np.where(bare, layers.first_survey + measured.file, source)
    said = has_top | has_cover
    height = np.where(has_top, np.maximum(measured.top_m - value, 0.0), np.where(has_cover, measured.cover_m, height))
    cover_sigma = np.where(said, measured.top_sigma_m, cover_sigma)
    kind = np.where(said & (measured.kind != NONE), measured.kind, kind)
    with np.errstate(invalid="ignore"):
        chord = np.fmax(chords.top_m - value, chords.cover_m)
        raises = ~said & np.isfinite(chord) & (chord > height)
    height = np.where(raises, chord, height)
    cover_sigma = np.where(raises, chords.sigma_m, cover_sigma)
    kind = np.where(raises & (chords.kind != NONE), chords.kind, kind)
    cover_sigma = np.where((height > 0.0) | has_top, cover_sigma, 0.0)

    work.ground_m[row], work.ground_sigma_m[row], work.source[row] = value, ground_sigma, source
    work.cover_m[row] = height
    work.kind[row] = np.where(height > 0.0, np.where(kind == NONE, OTHER, kind), NONE)
    work.sigma_m[row] = np.where(has_top, cover_sigma, np.hypot(ground_sigma, cover_sigma))
    work.known[row] |= said
    work.said[row], work.has_top[row], work.has_ground[row] = said, has_top, told


def _lay_obstacles(work: _Work, raw: Profiles, on: Sequence[OnPath]) -> tuple[NDArray[np.int32], NDArray[np.bool_]]:
    """Obstacles where they stand higher than all else; of several the highest, of equals the first."""
    shape = raw.distance_m.shape
    obstacle, inside = np.full(shape, -1, dtype=np.int32), np.zeros(shape, dtype=np.bool_)
    every = [(row, number, one) for row, path in enumerate(on) for number, one in enumerate(path.standing)]
    if not every:
        return obstacle, inside
    rows = np.array([row for row, _, _ in every], dtype=np.int64)
    number = np.array([one for _, one, _ in every], dtype=np.int32)
    standing = [one for _, _, one in every]
    start, stop = _stretches(raw, rows, standing)
    count = stop - start
    of = np.repeat(np.arange(rows.size), count)
    sample = np.arange(int(count.sum())) - np.repeat(np.cumsum(count) - count, count) + np.repeat(start, count)

    ground = work.ground_m.reshape(-1)[sample]
    base = np.array([one.base_m for one in standing])[of]
    follows = np.array([one.follows for one in standing])[of]
    top = np.where(follows, ground + base, base)
    for k, one in enumerate(standing):
        if one.span_tops_m is not None:
            here = of == k
            top[here] = one.top_m(raw.distance_m.reshape(-1)[sample[here]], ground[here])
    shown_top = np.array([one.shown.top_amsl_m for one in standing])[of]
    shown_height = np.array([one.shown.height_m for one in standing])[of]
    inside.reshape(-1)[sample[np.isfinite(np.minimum(shown_top, ground + shown_height))]] = True

    with np.errstate(invalid="ignore"):
        above = top - ground
        wins = above > work.cover_m.reshape(-1)[sample]
    gone = _removed(raw, on, every)
    if gone.any():
        wins &= ~(gone[of] & work.said.reshape(-1)[sample])
    of, sample, above = of[wins], sample[wins], above[wins]
    order = np.lexsort((number[of], -above, sample))
    of, sample, above = of[order], sample[order], above[order]
    first = np.ones(sample.size, dtype=np.bool_)
    first[1:] = sample[1:] != sample[:-1]
    of, sample, above = of[first], sample[first], above[first]

    kinds = np.array([COVER_KINDS.index(one.shown.kind) for one in standing], dtype=np.int8)
    sigma = np.array([one.shown.sigma_m for one in standing])[of]
    absolute = np.array([one.is_absolute for one in standing])[of]
    obstacle.reshape(-1)[sample] = number[of]
    work.cover_m.reshape(-1)[sample] = above
    work.kind.reshape(-1)[sample] = kinds[of]
    ground_sigma = work.ground_sigma_m.reshape(-1)[sample]
    work.sigma_m.reshape(-1)[sample] = np.where(absolute, sigma, np.hypot(ground_sigma, sigma))
    return obstacle, inside


def _stretches(raw: Profiles, rows: Index, standing: Sequence[Standing]) -> tuple[Index, Index]:
    """Flat indices of the samples that each obstacle covers, the first and the one after the last."""
    columns = raw.distance_m.shape[1]
    # Rows one behind the other on one line, so that all are found in one search.
    apart = 2.0 ** np.ceil(np.log2(float(raw.length_m.max()) + 1e3))
    line = (raw.distance_m + np.arange(raw.which.size)[:, np.newaxis] * apart).reshape(-1)
    begin = np.array([one.crossing.from_m for one in standing]) - JOIN_M
    end = np.array([one.crossing.to_m for one in standing]) + JOIN_M
    start = np.searchsorted(line, np.maximum(begin, -1.0) + rows * apart, side="left")
    stop = np.searchsorted(line, end + rows * apart, side="right")
    return np.maximum(start, rows * columns), np.minimum(stop, (rows + 1) * columns)


def _removed(raw: Profiles, on: Sequence[OnPath], every: Sequence[tuple[int, int, Standing]]) -> NDArray[np.bool_]:
    """Which obstacles a survey of their own spot may remove."""
    gone = np.zeros(len(every), dtype=np.bool_)
    tops: dict[int, Floats] = {}
    for k, (row, _, one) in enumerate(every):
        hits = on[row].hits
        if hits is None:
            continue
        if row not in tops:
            tops[row] = np.array([hit.at_m for hit in hits.ends() if hit.row.has_top])
        gone[k] = is_removed(one, tops[row], cell_m=float(raw.cell_m[row]))
    return gone


def _settle_ends(work: _Work, raw: Profiles, surveyed: Sequence[int]) -> None:
    """Where survey counts, the error of the ground at an end is that of the nearest bare sample of the same source.

    Without one, `height_errors` takes the stated error, whatever stands here.
    """
    for row in surveyed:
        distance = raw.distance_m[row]
        for end in (0, -1):
            alike = (work.cover_m[row] == 0.0) & (work.source[row] == work.source[row, end])
            if alike.any():
                away = np.where(alike, np.abs(distance - distance[end]), np.inf)
                work.ground_sigma_m[row, end] = work.sigma_m[row, int(np.argmin(away))]
