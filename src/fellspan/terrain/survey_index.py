"""Finds the surveyed rows that count on a path, and what of them counts as measured.

Knows nothing of files and rasters.
"""

from collections.abc import Iterator, Sequence
from dataclasses import replace

import numpy as np
import shapely
from numpy.typing import NDArray

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.terrain.alongpath import Floats, along_across, near_lines, near_path, reach_boxes
from fellspan.terrain.survey import SurveyFile, SurveyRow, link_key
from fellspan.terrain.survey_hits import NEAR_M, TOUCH_M, PointHit, SegmentHit, SurveyHits


class SurveyIndex:
    """Finds the surveyed rows that count on a path, among many."""

    def __init__(self, files: Sequence[SurveyFile], *, radius_m: float, growth_years: float = 0.0) -> None:
        self._files, self._radius_m = files, radius_m
        self._rows = [(number, row.grown(growth_years)) for number, file in enumerate(files) for row in file.rows]
        self._before = self._preceding()
        self._by_link: dict[str, list[int]] = {}
        placed: list[int] = []
        for i, (_, row) in enumerate(self._rows):
            if row.distance_m is None:
                placed.append(i)
            else:
                self._by_link.setdefault(link_key(row.link), []).append(i)
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
                key = (number, row.profile, link_key(row.link))
                if key in last:
                    before[i] = last[key]
                last[key] = i
        return before

    def grown(self, growth_years: float) -> "SurveyIndex":
        """The same rows with trees grown by another number of years."""
        return SurveyIndex(self._files, radius_m=self._radius_m, growth_years=growth_years)

    @property
    def rows(self) -> tuple[SurveyRow, ...]:
        """All rows, in the order of the files."""
        return tuple(row for _, row in self._rows)

    @property
    def links(self) -> tuple[str, ...]:
        """Names of links that rows refer to, in the order of the files."""
        return tuple(dict.fromkeys(row.link for _, row in self._rows if row.link))

    def meets(self, longitude_deg: Floats, latitude_deg: Floats) -> NDArray[np.bool_]:
        """Which of many paths, nodes in arrays (p, m), come near any row with a position, (p,)."""
        if not self._placed.size:
            return np.zeros(longitude_deg.shape[0], dtype=np.bool_)
        return near_lines(self._tree, longitude_deg, latitude_deg)

    def names(self, link: str) -> bool:
        """Whether rows go by the name of a link."""
        return link_key(link) in self._by_link

    def on_path(self, path: GeodesicPath, name: str | None, *, longest_m: float) -> SurveyHits:
        """The rows that count on a path: positions near it, and distances along the link of that name.

        What reaches farther than `longest_m` from its point, or runs farther between two, does not count as measured.
        """
        hits: dict[int, PointHit] = {}
        wide: list[SegmentHit] = []
        unused: list[SurveyRow] = []
        for i in self._by_link.get(link_key(name), ()) if name else ():
            number, row = self._rows[i]
            if row.distance_m is None or row.distance_m > path.length_m + max(self._radius(row), NEAR_M):
                unused.append(row)
            else:
                hits[i] = PointHit(row=row, file=number, at_m=row.distance_m, radius_m=self._radius(row))
        if self._placed.size:
            found, shifts = near_path(self._tree, path)
            along, across = along_across(path, self._latitude[found], self._longitude[found] + shifts)
            beyond = np.maximum(np.maximum(-along, along - path.length_m), 0.0)
            away = np.hypot(across, beyond)
            for j in np.flatnonzero(away <= self._reach[found]):
                number, row = self._rows[i := int(self._placed[found[j]])]
                hit = PointHit(row=row, file=number, at_m=float(along[j]), radius_m=self._radius(row))
                if away[j] <= max(longest_m, NEAR_M):
                    hits[i] = hit
                else:
                    wide.append(_own_stretch(hit))
        both = tuple(self._segments(hits))
        segments = tuple(one for one in both if one.length_m <= longest_m + TOUCH_M)
        wide += [one for one in both if one.length_m > longest_m + TOUCH_M]
        alone = tuple(_alone(hits, segments, path.length_m))
        wide += [_own_stretch(hit) for hit in alone if hit.radius_m > longest_m]
        points = tuple(replace(hit, radius_m=min(hit.radius_m, longest_m)) for hit in alone)
        return SurveyHits(points=points, segments=segments, wide=tuple(wide), beyond=tuple(unused))

    def _radius(self, row: SurveyRow) -> float:
        return self._radius_m if row.radius_m is None else row.radius_m

    def _segments(self, hits: dict[int, PointHit]) -> Iterator[SegmentHit]:
        """Stretches between points that follow one another in a profile and both count on the path."""
        for i in sorted(hits):
            if (j := self._before.get(i)) is None or j not in hits:
                continue
            first, second = sorted((hits[j], hits[i]), key=lambda hit: hit.at_m)
            segment = SegmentHit(first=first, second=second)
            if second.at_m - first.at_m > TOUCH_M and (segment.has_ground or segment.has_top):
                yield segment


def _own_stretch(hit: PointHit) -> SegmentHit:
    """What a single row says of all that its radius reaches, as one stretch."""
    first, second = (replace(hit, at_m=hit.at_m + side * hit.radius_m) for side in (-1.0, 1.0))
    return SegmentHit(first=first, second=second)


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
