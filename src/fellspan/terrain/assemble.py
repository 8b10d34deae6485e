"""Puts rasters, cover, obstacles and survey together along one path.

Every sample is worked out from its own distance alone, so that a profile may be sampled in parts and joined.
Opens nothing; knows nothing of radio.
"""

import math
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
import shapely
from numpy.typing import NDArray

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.terrain.alongpath import Floats
from fellspan.terrain.beside import beside
from fellspan.terrain.cover import NONE, OTHER, Cover, CoverLayer, SurfaceStep, combine, surface_steps
from fellspan.terrain.many_obstacles import ManyObstacles
from fellspan.terrain.obstacle_tops import EDGE_M, Standing, nodes, stand
from fellspan.terrain.obstacles import Crossing, crossings_of
from fellspan.terrain.profile import MEASURED_GROUND, MEASURED_NOTHING, MEASURED_TOP, BesidePath
from fellspan.terrain.samples import Samples, merged
from fellspan.terrain.sea import SEA_ERROR_M, Shores
from fellspan.terrain.sources import CoverSource
from fellspan.terrain.stack import RasterStack, StackSample
from fellspan.terrain.survey_hits import Chords, Measured, SurveyHits, chord_m
from fellspan.terrain.survey_index import SurveyIndex
from fellspan.vocabulary import COVER_KINDS, CoverKind, GapPolicy

_REMOVABLE: Final = ("building", "tree")
_MOST_SHORES = 200_000


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Layers:
    """Everything that was opened. `ground` is the surface stack where that is all there is (`is_bare` False)."""

    ground: RasterStack
    is_bare: bool
    surface: RasterStack | None
    cover: tuple[tuple[CoverSource, RasterStack], ...]
    obstacles: ManyObstacles
    survey: SurveyIndex
    sources: tuple[str, ...]
    gaps: GapPolicy
    sea_level_m: float
    growth_years: float
    complete: frozenset[CoverKind] = frozenset()
    """Kinds of which the obstacle files hold all there is."""

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
class Ground:
    """The ground at samples, arrays (n,); `raster_m` is what the rasters (or the sea) say, `raster` their samples as such."""

    value_m: Floats
    sigma_m: Floats
    source: NDArray[np.int16]
    raster_m: Floats
    raster: StackSample
    measured: Measured
    chords: Chords


class PathWork:
    """One path with its obstacles and survey found, ready to be sampled anywhere, any number of times."""

    def __init__(self, layers: Layers, path: GeodesicPath, *, name: str | None, cell_m: float) -> None:
        self.layers = layers
        self.path = path
        self.cell_m = cell_m
        self.node_step_m = max(0.5 * cell_m, 0.05)
        self.longest_chord_m = chord_m(cell_m)
        self.hits: SurveyHits = layers.survey.on_path(path, name, longest_m=self.longest_chord_m)
        self._shores: Shores | None = None
        self._near = layers.obstacles.near(path)
        self.standing: tuple[Standing, ...] = stand(
            crossings_of(self._near, path),
            ground_along=lambda distance_m: self.ground(distance_m).value_m,
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
        """The obstacles that the path passes without crossing them there."""
        return beside(
            self._near,
            [standing.crossing for standing in self.standing],
            self.path,
            ground_at=lambda latitude, longitude: self.layers.ground.sample_positions(latitude, longitude).value_m,
            growth_years=self.layers.growth_years,
        )

    def samples(self, distance_m: Floats) -> Samples:
        """Everything at rising distances, shape (n,)."""
        layers = self.layers
        latitude, longitude = self.path.positions(distance_m)
        ground = self.ground(distance_m)
        cover, steps = self.cover(distance_m, ground)
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
        # A line between points that lie far apart may only raise what stands there.
        chords = ground.chords
        chord = np.fmax(chords.top_m - value, chords.cover_m)
        raises = ~said & np.isfinite(chord) & (chord > height)
        height = np.where(raises, chord, height)
        cover_sigma = np.where(raises, chords.sigma_m, cover_sigma)
        absolute &= ~raises
        kind = np.where(raises & (chords.kind != NONE), chords.kind, kind)

        removed: set[int] = set()
        tops_at_m = np.array([hit.at_m for hit in self.hits.ends() if hit.row.has_top])
        index = np.full(distance_m.shape, -1, dtype=np.int32)
        for number, standing in enumerate(self.standing):
            part = standing.covers(distance_m)
            above = standing.top_m(distance_m[part], value[part]) - value[part]
            wins = above > height[part]
            if is_removed(standing, tops_at_m, cell_m=self.cell_m) and (gone := wins & said[part]).any():
                removed.add(number)
                wins &= ~gone
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
            valued=cover.valued | said | (source == layers.sea),
            negative_cover=cover.negative,
            removed=frozenset(removed),
            surface_steps=steps,
        )

    def ground(self, distance_m: Floats) -> Ground:
        """The ground at rising distances: survey before raster before sea."""
        layers = self.layers
        sample = layers.ground.sample(self.path, distance_m)
        measured = self.hits.measured(distance_m)
        value, sigma, source = sample.value_m, sample.sigma_m, sample.source
        if layers.gaps == "sea" and (gap := ~np.isfinite(value)).any():
            gap[gap] = self.shores().are_sea(distance_m[gap])
            value = np.where(gap, layers.sea_level_m, value)
            sigma = np.where(gap, SEA_ERROR_M, sigma)
            source = np.where(gap, layers.sea, source).astype(np.int16)
        raster = value
        told = np.isfinite(measured.ground_m)
        if told.any():
            value = np.where(told, measured.ground_m, value)
            sigma = np.where(told, measured.ground_sigma_m, sigma)
            source = np.where(told, layers.first_survey + measured.file, source).astype(np.int16)
        chords = self.hits.chords(distance_m)
        raised = ~told & (chords.ground_m > value)
        if raised.any():
            value = np.where(raised, chords.ground_m, value)
            sigma = np.where(raised, np.maximum(sigma, chords.sigma_m), sigma)
            source = np.where(raised, layers.first_survey + chords.file, source).astype(np.int16)
        return Ground(
            value_m=value,
            sigma_m=sigma,
            source=source,
            raster_m=raster,
            raster=sample,
            measured=measured,
            chords=chords,
        )

    def shores(self) -> Shores:
        """The ground beside the gaps of this path, looked up once."""
        if self._shores is None:
            count = min(max(16, math.ceil(self.path.length_m / self.node_step_m)), _MOST_SHORES)
            regular = np.linspace(0.0, self.path.length_m, count + 1)
            distance = merged(self.hits.nodes(), self.hits.edges(), regular, self.path.length_m)
            sample, measured = self.layers.ground.sample(self.path, distance), self.hits.measured(distance)
            told = np.isfinite(measured.ground_m)
            self._shores = Shores.of(
                distance,
                np.where(told, measured.ground_m, sample.value_m),
                np.where(told, measured.ground_sigma_m, sample.sigma_m),
                sea_level_m=self.layers.sea_level_m,
            )
        return self._shores

    def gap_reason(self, from_m: float, to_m: float) -> str:
        """Why a gap was not taken as sea; '' where sea was not asked for."""
        return self.shores().reason(from_m, to_m) if self.layers.gaps == "sea" else ""

    def cover(self, distance_m: Floats, ground: Ground) -> tuple[Cover, tuple[SurfaceStep, ...]]:
        """What rasters say stands at rising distances, and how the surface raster stands against that of the ground."""
        layers = self.layers
        covers: list[CoverLayer] = []
        for source, stack in layers.cover:
            sample = stack.sample(self.path, distance_m)
            growth = source.growth_m_per_year * layers.growth_years
            covers.append(CoverLayer(kind=source.kind, value_m=sample.value_m, sigma_m=sample.sigma_m, growth_m=growth))
        if not layers.is_bare:
            cover = combine(ground.raster_m, covers, None, None)
            finite = np.isfinite(ground.raster_m)
            return replace(cover, known=finite, valued=finite), ()
        if layers.surface is None:
            return combine(ground.raster_m, covers, None, None, complete=layers.complete), ()
        surface = layers.surface.sample(self.path, distance_m)
        cover = combine(ground.raster_m, covers, surface.value_m, surface.sigma_m, complete=layers.complete)
        names = (layers.ground.names, layers.surface.names)
        return cover, surface_steps(distance_m, ground.raster, surface, names)

    def _ground_at_supports(self, crossing: Crossing, spans: NDArray[np.int64]) -> Floats:
        """Ground under both ends of the spans of a crossing's line, m, (k, 2)."""
        line = shapely.get_coordinates(crossing.obstacle.shape)
        ends = np.stack((line[spans], line[spans + 1]), axis=1).reshape(-1, 2)
        # No sea here: a support without ground hangs its line level, from the highest ground under the crossing.
        value = self.layers.ground.sample_positions(ends[:, 1], ends[:, 0]).value_m
        return np.asarray(value, dtype=np.float64).reshape(-1, 2)


def is_removed(standing: Standing, tops_at_m: Floats, *, cell_m: float) -> bool:
    """Whether a survey looked at the very spot: a top was measured within a cell of a building or tree."""
    crossing = standing.crossing
    if crossing.obstacle.moves or crossing.obstacle.kind not in _REMOVABLE:
        return False
    return bool(np.any((tops_at_m >= crossing.from_m - cell_m) & (tops_at_m <= crossing.to_m + cell_m)))
