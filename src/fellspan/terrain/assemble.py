"""Puts rasters, cover, obstacles and survey together along one path.

Every sample is worked out from its own distance alone, so that a profile may be sampled in parts and joined.
Opens nothing; knows nothing of radio.
"""

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from typing import Final

import numpy as np
import shapely
from numpy.typing import NDArray

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.terrain.alongpath import Floats
from fellspan.terrain.beside import beside
from fellspan.terrain.cover import NONE, OTHER, Cover, CoverLayer, combine
from fellspan.terrain.obstacle_tops import EDGE_M, Standing, nodes, stand
from fellspan.terrain.obstacles import Crossing, ObstacleIndex, crossings_of
from fellspan.terrain.profile import MEASURED_GROUND, MEASURED_NOTHING, MEASURED_TOP, BesidePath
from fellspan.terrain.sources import CoverSource
from fellspan.terrain.stack import RasterStack
from fellspan.terrain.survey_hits import Measured, SurveyHits, SurveyIndex
from fellspan.vocabulary import COVER_KINDS, GapPolicy

SEA_ERROR_M: Final = 0.5
"""Standard error of a sea level that fills gaps, m: waves and the tide left over (common practice, no source)."""
_SAME_M = 5e-4


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Layers:
    """Everything that was opened. `ground` is the surface stack where that is all there is (`is_bare` False)."""

    ground: RasterStack
    is_bare: bool
    surface: RasterStack | None
    cover: tuple[tuple[CoverSource, RasterStack], ...]
    obstacles: ObstacleIndex
    survey: SurveyIndex
    sources: tuple[str, ...]
    gaps: GapPolicy
    sea_level_m: float
    growth_years: float

    @property
    def first_survey(self) -> int:
        """Index in `sources` of the first survey file."""
        return len(self.ground.names)

    @property
    def sea(self) -> int:
        """Index in `sources` of 'sea level'."""
        return len(self.sources) - 1

    @property
    def stacks(self) -> tuple[RasterStack, ...]:
        """Every raster stack, ground first."""
        beside = (self.surface,) if self.surface is not None else ()
        return (self.ground, *beside, *(stack for _, stack in self.cover))


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Samples:
    """What stands at distances along a path; arrays (n,), meanings as in `PathProfile`."""

    distance_m: Floats
    latitude_deg: Floats
    longitude_deg: Floats
    ground_m: Floats
    cover_m: Floats
    cover_kind: NDArray[np.int8]
    obstacle_index: NDArray[np.int32]
    source: NDArray[np.int16]
    measured: NDArray[np.int8]
    sigma_m: Floats
    known: NDArray[np.bool_]
    negative_cover: bool = False


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Ground:
    value_m: Floats
    sigma_m: Floats
    source: NDArray[np.int16]
    raster_m: Floats
    measured: Measured


def merged(exact_m: Floats, beside_m: Floats, regular_m: Floats, length_m: float) -> Floats:
    """Distances, rising by at least half a millimetre: of those that crowd, exact ones stay first, then those beside."""
    kept = np.array([0.0, length_m])
    for group in (exact_m, beside_m, regular_m):
        inside = np.unique(group[(group > 0.0) & (group < length_m)])
        if inside.size == 0:
            continue
        inside = inside[np.concatenate(([True], np.diff(inside) > _SAME_M))]
        after = np.searchsorted(kept, inside)
        away = np.minimum(kept[after] - inside, inside - kept[after - 1])
        kept = np.union1d(kept, inside[away > _SAME_M])
    return kept


class PathWork:
    """One path with its obstacles and survey found, ready to be sampled anywhere, any number of times."""

    def __init__(self, layers: Layers, path: GeodesicPath, *, name: str | None, cell_m: float) -> None:
        self.layers = layers
        self.path = path
        self.node_step_m = max(0.5 * cell_m, 0.05)
        self.hits: SurveyHits = layers.survey.on_path(path, name)
        self._near = layers.obstacles.near(path)
        self.standing: tuple[Standing, ...] = stand(
            crossings_of(self._near, path),
            ground_along=lambda distance_m: self._ground(distance_m).value_m,
            ground_at_supports=self._ground_at_supports,
            step_m=self.node_step_m,
            growth_years=layers.growth_years,
        )

    def distances(self, regular_m: Floats) -> Floats:
        """The regular distances with the nodes of obstacles and survey among them."""
        crossings = [standing.crossing for standing in self.standing]
        inside = [nodes(crossing, self.node_step_m) for crossing in crossings]
        outside = [(crossing.from_m - EDGE_M, crossing.to_m + EDGE_M) for crossing in crossings]
        exact = np.concatenate([self.hits.nodes(), *inside])
        beside = np.concatenate([self.hits.edges(), np.array(outside, dtype=np.float64).ravel()])
        return merged(exact, beside, regular_m, self.path.length_m)

    def beside(self) -> tuple[BesidePath, ...]:
        """The obstacles that the path passes without crossing them."""
        crossed = {id(standing.crossing.obstacle) for standing in self.standing}
        return beside(
            [one for one in self._near if id(one.obstacle) not in crossed],
            self.path,
            ground_at=lambda latitude, longitude: self.layers.ground.sample_positions(latitude, longitude).value_m,
            growth_years=self.layers.growth_years,
        )

    def samples(self, distance_m: Floats) -> Samples:
        """Everything at rising distances, shape (n,)."""
        layers = self.layers
        latitude, longitude = self.path.positions(distance_m)
        ground = self._ground(distance_m)
        cover = self._cover(distance_m, ground)
        value = ground.value_m
        measured = ground.measured
        height, kind = cover.height_m, cover.kind
        cover_sigma, absolute = cover.sigma_m, cover.from_surface & ~np.isfinite(measured.ground_m)

        has_top, has_cover = np.isfinite(measured.top_m), np.isfinite(measured.cover_m)
        # A top without a ground below it, or lower than the raster's ground, is the best ground there is.
        bare = has_top & ~np.isfinite(measured.ground_m) & ~(value <= measured.top_m)
        value = np.where(bare, measured.top_m, value)
        source = np.where(bare, layers.first_survey + measured.file, ground.source).astype(np.int16)
        said = has_top | has_cover
        height = np.where(
            has_top, np.maximum(measured.top_m - value, 0.0), np.where(has_cover, measured.cover_m, height)
        )
        cover_sigma = np.where(said, measured.top_sigma_m, cover_sigma)
        absolute = (absolute & ~has_cover) | has_top
        kind = np.where(said & (measured.kind != NONE), measured.kind, kind)

        index = np.full(distance_m.shape, -1, dtype=np.int32)
        for number, standing in enumerate(self.standing):
            part = standing.covers(distance_m)
            above = standing.top_m(distance_m[part], value[part]) - value[part]
            wins = (above > height[part]) & ~(said[part] & (not standing.crossing.obstacle.moves))
            height[part] = np.where(wins, above, height[part])
            kind[part] = np.where(wins, COVER_KINDS.index(standing.shown.kind), kind[part])
            index[part] = np.where(wins, number, index[part])
            cover_sigma[part] = np.where(wins, standing.shown.sigma_m, cover_sigma[part])
            absolute[part] = np.where(wins, standing.is_absolute, absolute[part])

        kind = np.where(height > 0.0, np.where(kind == NONE, OTHER, kind), NONE).astype(np.int8)
        cover_sigma = np.where((height > 0.0) | has_top, cover_sigma, 0.0)
        sigma = np.where(absolute, cover_sigma, np.hypot(ground.sigma_m, cover_sigma))
        ground_is_measured = np.isfinite(measured.ground_m)
        code = np.where(
            has_top & (index < 0), MEASURED_TOP, np.where(ground_is_measured, MEASURED_GROUND, MEASURED_NOTHING)
        )
        gap = ~np.isfinite(value)
        return Samples(
            distance_m=distance_m,
            latitude_deg=latitude,
            longitude_deg=longitude,
            ground_m=value,
            cover_m=np.where(gap, 0.0, height),
            cover_kind=np.where(gap, NONE, kind).astype(np.int8),
            obstacle_index=np.where(gap, -1, index).astype(np.int32),
            source=np.where(gap, -1, source).astype(np.int16),
            measured=np.where(gap, MEASURED_NOTHING, code).astype(np.int8),
            sigma_m=np.where(gap, np.nan, sigma),
            known=(cover.known | said | (source == layers.sea)) & ~gap,
            negative_cover=cover.negative,
        )

    def _ground(self, distance_m: Floats) -> _Ground:
        """The ground: survey before raster before sea."""
        layers = self.layers
        sample = layers.ground.sample(self.path, distance_m)
        measured = self.hits.measured(distance_m)
        value, sigma, source = sample.value_m, sample.sigma_m, sample.source
        if layers.gaps == "sea":
            gap = ~np.isfinite(value)
            value = np.where(gap, layers.sea_level_m, value)
            sigma = np.where(gap, SEA_ERROR_M, sigma)
            source = np.where(gap, layers.sea, source).astype(np.int16)
        raster = value
        told = np.isfinite(measured.ground_m)
        if told.any():
            value = np.where(told, measured.ground_m, value)
            sigma = np.where(told, measured.ground_sigma_m, sigma)
            source = np.where(told, layers.first_survey + measured.file, source).astype(np.int16)
        return _Ground(value_m=value, sigma_m=sigma, source=source, raster_m=raster, measured=measured)

    def _cover(self, distance_m: Floats, ground: _Ground) -> Cover:
        layers = self.layers
        covers: list[CoverLayer] = []
        for source, stack in layers.cover:
            sample = stack.sample(self.path, distance_m)
            growth = source.growth_m_per_year * layers.growth_years
            covers.append(CoverLayer(kind=source.kind, value_m=sample.value_m, sigma_m=sample.sigma_m, growth_m=growth))
        if not layers.is_bare:
            cover = combine(ground.raster_m, covers, None, None)
            return replace(cover, known=np.isfinite(ground.raster_m))
        if layers.surface is None:
            return combine(ground.raster_m, covers, None, None)
        surface = layers.surface.sample(self.path, distance_m)
        return combine(ground.raster_m, covers, surface.value_m, surface.sigma_m)

    def _ground_at_supports(self, crossing: Crossing, spans: NDArray[np.int64]) -> Floats:
        """Ground under both ends of the spans of a crossing's line, m, (k, 2)."""
        line = shapely.get_coordinates(crossing.obstacle.shape)
        ends = np.stack((line[spans], line[spans + 1]), axis=1).reshape(-1, 2)
        value = self.layers.ground.sample_positions(ends[:, 1], ends[:, 0]).value_m
        if self.layers.gaps == "sea":
            value = np.where(np.isfinite(value), value, self.layers.sea_level_m)
        return np.asarray(value, dtype=np.float64).reshape(-1, 2)


def joined(parts: Sequence[Samples]) -> Samples:
    """Samples of one path, taken in parts, in the order of their distance."""
    order = np.argsort(np.concatenate([part.distance_m for part in parts]), kind="stable")
    arrays = {
        field.name: np.concatenate([getattr(part, field.name) for part in parts])[order]
        for field in fields(Samples)
        if field.name != "negative_cover"
    }
    return Samples(**arrays, negative_cover=any(part.negative_cover for part in parts))
