"""Surveyed points and profiles on a path: what they say at each sample, in place of the raster.

Knows nothing of files and rasters; `survey_index` finds what counts on a path.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.alongpath import Floats
from fellspan.terrain.obstacle_tops import EDGE_M
from fellspan.terrain.survey import SurveyRow
from fellspan.vocabulary import COVER_KINDS

NEAR_M = 10.0
"""A surveyed position counts on a path that passes within this or within its radius, m."""
CHORD_CELLS: Final = 3.0
CHORD_LEAST_M, CHORD_MOST_M = 50.0, 150.0
"""Points farther apart than three cells, within these limits, m, do not make the line between them measured (our own rule)."""
TOUCH_M = 1e-3


def chord_m(cell_m: float) -> float:
    """The longest line between two measured points that counts as measured, m, over rasters of such a cell."""
    return min(max(CHORD_CELLS * cell_m, CHORD_LEAST_M), CHORD_MOST_M)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Measured:
    """What was surveyed at each sample, arrays (n,); NaN where nothing was.

    `top_m` is above sea level, `cover_m` a top above ground where the ground was not measured; `kind` is 0 where not said.
    `file` is the index of the survey file that gave the ground or, failing that, the top; -1 where none.
    """

    ground_m: Floats
    ground_sigma_m: Floats
    top_m: Floats
    cover_m: Floats
    top_sigma_m: Floats
    kind: NDArray[np.int8]
    file: NDArray[np.int16]


@dataclass(frozen=True, slots=True, kw_only=True)
class PointHit:
    """A row that counts on a path, `at_m` from A, and the half length of the stretch it speaks for."""

    row: SurveyRow
    file: int
    at_m: float
    radius_m: float
    ground: bool = True
    top: bool = True


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Chords:
    """Lines between points too far apart to count as measured, arrays (n,); NaN where none is. Only where they lie above
    everything else do they count."""

    ground_m: Floats
    top_m: Floats
    cover_m: Floats
    sigma_m: Floats
    kind: NDArray[np.int8]
    file: NDArray[np.int16]


@dataclass(frozen=True, slots=True, kw_only=True)
class SegmentHit:
    """Two consecutive points of a measured profile, or one row at both ends of its own stretch."""

    first: PointHit
    second: PointHit

    @property
    def length_m(self) -> float:
        """How far it runs along the path, m."""
        return self.second.at_m - self.first.at_m

    @property
    def has_ground(self) -> bool:
        """True where both ends have their ground measured."""
        return self.first.row.ground_m is not None and self.second.row.ground_m is not None

    @property
    def has_top(self) -> bool:
        """True where both ends have their top measured."""
        return self.first.row.top_m is not None and self.second.row.top_m is not None


@dataclass(frozen=True, slots=True, kw_only=True)
class SurveyHits:
    """Everything surveyed on one path."""

    points: tuple[PointHit, ...] = ()
    segments: tuple[SegmentHit, ...] = ()
    wide: tuple[SegmentHit, ...] = ()
    """Stretches too long to count as measured."""
    beyond: tuple[SurveyRow, ...] = ()
    """Rows of this link whose distance from A is longer than the path."""

    def nodes(self) -> Floats:
        """Distances at which a sample must stand, those at points first."""
        exact = [hit.at_m for hit in self.points]
        exact += [end.at_m for segment in (*self.segments, *self.wide) for end in (segment.first, segment.second)]
        return np.array(exact, dtype=np.float64)

    def ends(self) -> tuple[PointHit, ...]:
        """Every row that counts as measured on the path, once, by its distance."""
        every = [*self.points, *(end for segment in self.segments for end in (segment.first, segment.second))]
        once = {id(hit.row): hit for hit in reversed(every)}
        return tuple(sorted(once.values(), key=lambda hit: hit.at_m))

    def rows_at(self, distance_m: float) -> tuple[SurveyRow, ...]:
        """The rows that speak at a distance: the nearest point, else both ends of a stretch."""
        reach = [hit for hit in self.points if abs(hit.at_m - distance_m) <= hit.radius_m + TOUCH_M]
        if reach:
            return (min(reach, key=lambda hit: abs(hit.at_m - distance_m)).row,)
        for segment in self.segments:
            if segment.first.at_m - TOUCH_M <= distance_m <= segment.second.at_m + TOUCH_M:
                return (segment.first.row, segment.second.row)
        return ()

    def chords(self, distance_m: Floats) -> Chords:
        """The lines over stretches too long to count as measured, at rising distances; the highest where several are."""
        count = distance_m.size
        out = Chords(
            ground_m=np.full(count, np.nan),
            top_m=np.full(count, np.nan),
            cover_m=np.full(count, np.nan),
            sigma_m=np.zeros(count),
            kind=np.zeros(count, dtype=np.int8),
            file=np.full(count, -1, dtype=np.int16),
        )
        for segment in self.wide:
            _lay_chord(segment, distance_m, out)
        return out

    def edges(self) -> Floats:
        """Distances just inside and outside the stretches that the survey speaks for."""
        ends = [hit.at_m + side * hit.radius_m for hit in self.points for side in (-1.0, 1.0)]
        out = [hit.at_m + side * (hit.radius_m + EDGE_M) for hit in self.points for side in (-1.0, 1.0)]
        out += [segment.first.at_m - EDGE_M for segment in self.segments]
        out += [segment.second.at_m + EDGE_M for segment in self.segments]
        ends += [segment.first.at_m - EDGE_M for segment in self.wide]
        ends += [segment.second.at_m + EDGE_M for segment in self.wide]
        return np.array(ends + out, dtype=np.float64)

    def measured(self, distance_m: Floats) -> Measured:
        """What was surveyed at rising distances; points speak before profiles, the nearer point before the farther."""
        count = distance_m.size
        out = Measured(
            ground_m=np.full(count, np.nan),
            ground_sigma_m=np.full(count, np.nan),
            top_m=np.full(count, np.nan),
            cover_m=np.full(count, np.nan),
            top_sigma_m=np.full(count, np.nan),
            kind=np.zeros(count, dtype=np.int8),
            file=np.full(count, -1, dtype=np.int16),
        )
        for segment in self.segments:
            _lay_segment(segment, distance_m, out)
        ground_away = np.full(count, np.inf)
        top_away = np.full(count, np.inf)
        for hit in self.points:
            _lay_point(hit, distance_m, out, ground_away, top_away)
        return out


def _stretch(distance_m: Floats, start_m: float, stop_m: float) -> slice:
    first = np.searchsorted(distance_m, start_m - TOUCH_M, side="left")
    return slice(int(first), int(np.searchsorted(distance_m, stop_m + TOUCH_M, side="right")))


def _lay_segment(segment: SegmentHit, distance_m: Floats, out: Measured) -> None:
    first, second = segment.first, segment.second
    part = _stretch(distance_m, first.at_m, second.at_m)
    length = second.at_m - first.at_m
    share = np.clip((distance_m[part] - first.at_m) / length, 0.0, 1.0)

    def between(low: float, high: float) -> Floats:
        linear: Floats = low + (high - low) * share
        return linear

    error = between(first.row.error_m, second.row.error_m)
    if segment.has_top and first.row.top_m is not None and second.row.top_m is not None:
        # At a point shared by two segments the values agree, so that order does not matter.
        out.top_m[part] = between(first.row.top_m, second.row.top_m)
        out.top_sigma_m[part] = error
        kinds = (COVER_KINDS.index(first.row.kind), COVER_KINDS.index(second.row.kind))
        out.kind[part] = np.where(share < 0.5, *kinds)
        out.file[part] = first.file
    if segment.has_ground and first.row.ground_m is not None and second.row.ground_m is not None:
        out.ground_m[part] = between(first.row.ground_m, second.row.ground_m)
        out.ground_sigma_m[part] = error
        out.file[part] = first.file


def _lay_chord(segment: SegmentHit, distance_m: Floats, out: Chords) -> None:
    first, second = segment.first, segment.second
    part = _stretch(distance_m, first.at_m, second.at_m)
    share = np.clip((distance_m[part] - first.at_m) / (second.at_m - first.at_m), 0.0, 1.0)
    pairs = (
        (out.ground_m, first.row.ground_m, second.row.ground_m),
        (out.top_m, first.row.top_m, second.row.top_m),
        (out.cover_m, first.row.cover_m, second.row.cover_m),
    )
    for values, low, high in pairs:
        if low is not None and high is not None:
            values[part] = np.fmax(values[part], low + (high - low) * share)
    out.sigma_m[part] = np.maximum(out.sigma_m[part], max(first.row.error_m, second.row.error_m))
    kinds = (COVER_KINDS.index(first.row.kind), COVER_KINDS.index(second.row.kind))
    out.kind[part] = np.where(share < 0.5, *kinds)
    out.file[part] = first.file


def _lay_point(hit: PointHit, distance_m: Floats, out: Measured, ground_away: Floats, top_away: Floats) -> None:
    row = hit.row
    part = _stretch(distance_m, hit.at_m - hit.radius_m, hit.at_m + hit.radius_m)
    away = np.abs(distance_m[part] - hit.at_m)
    if hit.top and (row.top_m is not None or row.cover_m is not None):
        wins = away < top_away[part]
        top_away[part][wins] = away[wins]
        out.top_m[part][wins] = np.nan if row.top_m is None else row.top_m
        out.cover_m[part][wins] = np.nan if row.cover_m is None else row.cover_m
        out.top_sigma_m[part][wins] = row.error_m
        out.kind[part][wins] = COVER_KINDS.index(row.kind)
        missing = wins & (~np.isfinite(out.ground_m[part]) | (out.file[part] < 0))
        out.file[part][missing] = hit.file
    if hit.ground and row.ground_m is not None:
        wins = away < ground_away[part]
        ground_away[part][wins] = away[wins]
        out.ground_m[part][wins] = row.ground_m
        out.ground_sigma_m[part][wins] = row.error_m
        out.file[part][wins] = hit.file
