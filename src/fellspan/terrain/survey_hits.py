"""Lays surveyed points and profiles on a path: what they say at each sample, in place of the raster.

Knows nothing of files and rasters.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
import shapely
from numpy.typing import NDArray

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.terrain.alongpath import Floats, along_across, near_path, reach_boxes
from fellspan.terrain.obstacle_tops import EDGE_M
from fellspan.terrain.survey import SurveyFile, SurveyRow
from fellspan.vocabulary import COVER_KINDS

NEAR_M = 10.0
"""A surveyed position counts on a path that passes within this or within its radius, m."""
_TOUCH_M = 1e-3


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


@dataclass(frozen=True, slots=True, kw_only=True)
class SegmentHit:
    """Two consecutive points of a measured profile."""

    first: PointHit
    second: PointHit

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
    beyond: tuple[SurveyRow, ...] = ()
    """Rows of this link whose distance from A is longer than the path."""

    def nodes(self) -> Floats:
        """Distances at which a sample must stand, those at points first."""
        exact = [hit.at_m for hit in self.points]
        exact += [end.at_m for segment in self.segments for end in (segment.first, segment.second)]
        return np.array(exact, dtype=np.float64)

    def edges(self) -> Floats:
        """Distances just inside and outside the stretches that the survey speaks for."""
        ends = [hit.at_m + side * hit.radius_m for hit in self.points for side in (-1.0, 1.0)]
        out = [hit.at_m + side * (hit.radius_m + EDGE_M) for hit in self.points for side in (-1.0, 1.0)]
        out += [segment.first.at_m - EDGE_M for segment in self.segments]
        out += [segment.second.at_m + EDGE_M for segment in self.segments]
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
    first = np.searchsorted(distance_m, start_m - _TOUCH_M, side="left")
    return slice(int(first), int(np.searchsorted(distance_m, stop_m + _TOUCH_M, side="right")))


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


class SurveyIndex:
    """Finds the surveyed rows that count on a path, among many."""

    def __init__(self, files: Sequence[SurveyFile], *, radius_m: float) -> None:
        self._radius_m = radius_m
        self._rows = [(number, row) for number, file in enumerate(files) for row in file.rows]
        self._before = self._preceding()
        self._by_link: dict[str, list[int]] = {}
        placed: list[int] = []
        for i, (_, row) in enumerate(self._rows):
            if row.distance_m is None:
                placed.append(i)
            else:
                self._by_link.setdefault(row.link.casefold(), []).append(i)
        self._placed = np.array(placed, dtype=np.int64)
        rows = [self._rows[i][1] for i in placed]
        self._latitude = np.array([row.latitude_deg for row in rows], dtype=np.float64)
        self._longitude = np.array([row.longitude_deg for row in rows], dtype=np.float64)
        self._reach = np.array([max(self._radius(row), NEAR_M) for row in rows], dtype=np.float64)
        bounds = np.column_stack((self._longitude, self._latitude, self._longitude, self._latitude))
        self._tree = shapely.STRtree(reach_boxes(bounds, self._reach))

    def _preceding(self) -> dict[int, int]:
        """For each row of a profile but its first, the row before it."""
        last: dict[tuple[int, str, str], int] = {}
        before: dict[int, int] = {}
        for i, (number, row) in enumerate(self._rows):
            if row.profile:
                key = (number, row.profile, row.link.casefold())
                if key in last:
                    before[i] = last[key]
                last[key] = i
        return before

    @property
    def links(self) -> tuple[str, ...]:
        """Names of links that rows refer to, in the order of the files."""
        return tuple(dict.fromkeys(row.link for _, row in self._rows if row.link))

    def on_path(self, path: GeodesicPath, name: str | None) -> SurveyHits:
        """The rows that count on a path: positions near it, and distances along the link of that name."""
        hits: dict[int, PointHit] = {}
        unused: list[SurveyRow] = []
        for i in self._by_link.get(name.casefold(), ()) if name else ():
            number, row = self._rows[i]
            if row.distance_m is None or row.distance_m > path.length_m + max(self._radius(row), NEAR_M):
                unused.append(row)
            else:
                hits[i] = PointHit(row=row, file=number, at_m=row.distance_m, radius_m=self._radius(row))
        if self._placed.size:
            found, shifts = near_path(self._tree, path)
            along, across = along_across(path, self._latitude[found], self._longitude[found] + shifts)
            beyond = np.maximum(np.maximum(-along, along - path.length_m), 0.0)
            for j in np.flatnonzero(np.hypot(across, beyond) <= self._reach[found]):
                number, row = self._rows[i := int(self._placed[found[j]])]
                hits[i] = PointHit(row=row, file=number, at_m=float(along[j]), radius_m=self._radius(row))
        segments = tuple(self._segments(hits))
        return SurveyHits(points=tuple(_alone(hits, segments, path.length_m)), segments=segments, beyond=tuple(unused))

    def _radius(self, row: SurveyRow) -> float:
        return self._radius_m if row.radius_m is None else row.radius_m

    def _segments(self, hits: dict[int, PointHit]) -> Iterator[SegmentHit]:
        """Stretches between points that follow one another in a profile and both count on the path."""
        for i in sorted(hits):
            if (j := self._before.get(i)) is None or j not in hits:
                continue
            first, second = sorted((hits[j], hits[i]), key=lambda hit: hit.at_m)
            segment = SegmentHit(first=first, second=second)
            if second.at_m - first.at_m > _TOUCH_M and (segment.has_ground or segment.has_top):
                yield segment


def _alone(hits: dict[int, PointHit], segments: Sequence[SegmentHit], length_m: float) -> Iterator[PointHit]:
    """What stands for itself: single points, and of a profile's points what no stretch beside them carries."""
    ground: set[int] = set()
    top: set[int] = set()
    for segment in segments:
        for end in (segment.first, segment.second):
            if segment.has_ground:
                ground.add(id(end.row))
            if segment.has_top:
                top.add(id(end.row))
    for i in sorted(hits):
        hit = hits[i]
        alone_ground, alone_top = id(hit.row) not in ground, id(hit.row) not in top
        if -hit.radius_m - NEAR_M <= hit.at_m <= length_m + hit.radius_m + NEAR_M and (alone_ground or alone_top):
            yield PointHit(
                row=hit.row,
                file=hit.file,
                at_m=min(max(hit.at_m, 0.0), length_m) if hit.radius_m < NEAR_M else hit.at_m,
                radius_m=hit.radius_m,
                ground=alone_ground,
                top=alone_top,
            )
