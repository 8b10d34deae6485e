"""Terrain: the files a user brings, opened once, turned into profiles of paths, batch first.

Holds what was opened and says what is missing in words; `assemble` works out the samples. Knows nothing of radio.
"""

import math
import threading
from collections.abc import Iterator, Sequence
from dataclasses import replace
from types import TracebackType
from typing import Self

import numpy as np

from fellspan.errors import TerrainError
from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.position import Position
from fellspan.terrain.alongpath import Floats
from fellspan.terrain.assemble import Layers, PathWork
from fellspan.terrain.gaps import gap_error, gaps_of
from fellspan.terrain.listed import Listed, listed_obstacles, listed_rows
from fellspan.terrain.many import ManyPaths
from fellspan.terrain.opening import CoverLike, ObstaclesLike, RasterLike, SurveyLike, open_layers
from fellspan.terrain.profile import PathProfile
from fellspan.terrain.profile_notes import path_notes, surface_tells
from fellspan.terrain.samples import Samples, joined, merged

MAX_SAMPLES = 2_000_000
"""Most samples of one path; a finer step is made coarser, with a note."""


class Terrain:
    """Rasters, cover, obstacles and survey files, opened; make it with `Terrain.open`, close it after use."""

    def __init__(self, layers: Layers, *, vertical_datum: str | None, notes: tuple[str, ...]) -> None:
        self._layers = layers
        self._datum = vertical_datum
        self._notes = notes
        self._many: ManyPaths | None = None
        self._making = threading.Lock()

    @classmethod
    def open(
        cls,
        *,
        ground: RasterLike | None = None,
        surface: RasterLike | None = None,
        cover: CoverLike | None = None,
        obstacles: ObstaclesLike | None = None,
        survey: SurveyLike | None = None,
        gaps: str = "error",
        sea_level_m: float = 0.0,
        growth_years: float = 0.0,
    ) -> Self:
        """Open terrain data.

        Parameters
        ----------
        ground, surface, cover, obstacles, survey
            A path, a declared source (`fellspan.terrain.sources`) or a sequence of them. Bare ground and surface are heights
            above sea level, cover is height above ground. At least `ground` or `surface` is needed; `surface` alone is
            taken as the ground, and `ground_is_bare` then is False.
        gaps
            'error', or 'sea': where the ground rasters have no data, and the ground beside is about as low as `sea_level_m`,
            m, lies open water at that level.
        growth_years
            How far ahead trees are grown, years, by their own rates.

        Raises
        ------
        TerrainError
            No ground and no surface, or an option outside its range; subclasses as the files deserve.
        """
        layers, datum, notes = open_layers(
            ground=ground,
            surface=surface,
            cover=cover,
            obstacles=obstacles,
            survey=survey,
            gaps=gaps,
            sea_level_m=sea_level_m,
            growth_years=growth_years,
        )
        return cls(layers, vertical_datum=datum, notes=notes)

    @property
    def vertical_datum(self) -> str | None:
        """The vertical datum that the files state; None where none does."""
        return self._datum

    @property
    def ground_is_bare(self) -> bool:
        """False where a surface model stands in for the ground."""
        return self._layers.is_bare

    @property
    def layers(self) -> Layers:
        """What was opened, for others of this room."""
        return self._layers

    @property
    def many(self) -> ManyPaths:
        """The rasters as sheets of cells in memory, kept for batch after batch of paths."""
        with self._making:
            if self._many is None:
                self._many = ManyPaths(self._layers)
            return self._many

    @property
    def notes(self) -> tuple[str, ...]:
        """Things a person must know about the files, with the seams that profiles so far have met."""
        of_stacks = [note for stack in self._layers.stacks for note in stack.notes]
        return tuple(dict.fromkeys((*self._notes, *of_stacks)))

    @property
    def survey_links(self) -> tuple[str, ...]:
        """Names of the links that survey rows refer to by distance."""
        return self._layers.survey.links

    @property
    def listed(self) -> tuple[Listed, ...]:
        """Where the obstacles and survey rows stand."""
        return listed_obstacles(self._layers.obstacles.obstacles), listed_rows(self._layers.survey.rows)

    @property
    def growth_years(self) -> float:
        """How far ahead trees are grown, years."""
        return self._layers.growth_years

    @property
    def grows(self) -> bool:
        """Whether anything has a rate of growth."""
        layers = self._layers
        return (
            any(source.growth_m_per_year for source, _ in layers.cover)
            or any(obstacle.growth_m_per_year for obstacle in layers.obstacles.obstacles)
            or any(row.growth_m_per_year for row in layers.survey.rows)
        )

    def grown(self, growth_years: float) -> Self:
        """The same files with trees grown by another number of years; close one of the two only, they share what is open."""
        layers = self._layers
        again = replace(layers, growth_years=growth_years, survey=layers.survey.grown(growth_years))
        return type(self)(again, vertical_datum=self._datum, notes=self._notes)

    def close(self) -> None:
        """Close all files."""
        for stack in self._layers.stacks:
            stack.close()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def profiles(
        self,
        pairs: Sequence[tuple[Position, Position]],
        *,
        step_m: float | None = None,
        names: Sequence[str] | None = None,
    ) -> list[PathProfile]:
        """Profiles of many paths; a gap is that profile's `gaps`, with NaN heights, not an error.

        Parameters
        ----------
        pairs
            Ends A and B of each path.
        step_m
            Regular step, m; None for half the finest cell that the path touches. The step used divides the path evenly.
        names
            One for each pair; survey rows by link and distance apply to the path of that name.

        Raises
        ------
        SeamError
            Rasters disagree under a path, or a surface lies below its ground.
        TerrainError
            The ends of a pair are one place, the step is not above 0, or names and pairs differ in number.
        """
        return list(self.iter_profiles(pairs, step_m=step_m, names=names))

    def iter_profiles(
        self,
        pairs: Sequence[tuple[Position, Position]],
        *,
        step_m: float | None = None,
        names: Sequence[str] | None = None,
    ) -> Iterator[PathProfile]:
        """As `profiles`, one after the other, so that a batch of any size fits in memory."""
        if step_m is not None and not (math.isfinite(step_m) and step_m > 0.0):
            raise TerrainError(f"step {step_m:g} m is not a distance above 0", "leave it out for half the finest cell")
        if names is not None and len(names) != len(pairs):
            raise TerrainError(f"{len(names)} names for {len(pairs)} paths", "give one name for each path, or none")
        for number, (a, b) in enumerate(pairs):
            name = names[number] if names is not None else None
            yield self._profile(a, b, step_m, name, label=f"'{name}'" if name else f"path {number + 1}")

    def profile(self, *, a: Position, b: Position, step_m: float | None = None, name: str | None = None) -> PathProfile:
        """The profile of one path.

        Raises
        ------
        TerrainGapError
            The rasters have no data on part of the path; names the stretch, the raster and the remedy.
        TerrainError
            As `profiles`.
        """
        profile = next(self.iter_profiles([(a, b)], step_m=step_m, names=[name] if name else None))
        if profile.gaps:
            raise gap_error(profile)
        return profile

    def refine(self, profile: PathProfile, windows: Sequence[tuple[float, float]], *, step_m: float) -> PathProfile:
        """The same profile with more samples inside windows of distance from A, m; the samples it has stay as they are.

        New samples stand where `profile` with that step has them, so that refining again changes nothing.

        Raises
        ------
        TerrainError
            The step is not above 0, or the windows would need more than two million samples.
        """
        if not (math.isfinite(step_m) and step_m > 0.0):
            raise TerrainError(f"step {step_m:g} m is not a distance above 0", "a sixteenth of the cell is fine enough")
        step_m = profile.length_m / _steps(profile.length_m, step_m)
        ranges = []
        for start, stop in windows:
            first = math.ceil(max(min(start, stop), 0.0) / step_m)
            last = math.floor(min(max(start, stop), profile.length_m) / step_m)
            ranges.append((first, last))
        if (wanted := sum(max(0, last - first + 1) for first, last in ranges)) > MAX_SAMPLES:
            raise TerrainError(
                f"a step of {step_m:g} m asks for {wanted} samples; at most {MAX_SAMPLES} are taken",
                "use a coarser step or narrower windows",
            )
        ticks = np.unique(
            np.concatenate([np.zeros(0), *(np.arange(first, last + 1, dtype=np.float64) for first, last in ranges)])
        )
        everywhere = merged(profile.distance_m, np.zeros(0), ticks * step_m, profile.length_m)
        new = np.setdiff1d(everywhere, profile.distance_m)
        if new.size == 0:
            return profile
        path = GeodesicPath.between(profile.a, profile.b)
        work = PathWork(self._layers, path, name=profile.name, cell_m=profile.cell_m)
        old = _samples_of(profile)
        both = joined((old, work.samples(new)))
        return self._made(work, both, name=profile.name, step_m=profile.step_m, cell_m=profile.cell_m, was=profile)

    def resampled(self, profile: PathProfile) -> PathProfile:
        """The same samples of the same path, as this terrain has them: for one that is grown otherwise."""
        work = PathWork(
            self._layers, GeodesicPath.between(profile.a, profile.b), name=profile.name, cell_m=profile.cell_m
        )
        samples = work.samples(profile.distance_m)
        return self._made(work, samples, name=profile.name, step_m=profile.step_m, cell_m=profile.cell_m, was=profile)

    def _profile(self, a: Position, b: Position, step_m: float | None, name: str | None, *, label: str) -> PathProfile:
        path = GeodesicPath.between(a, b)
        if not path.length_m > 0.001:
            raise TerrainError(
                f"both ends of {label} are at {a.latitude_deg:.6f}, {a.longitude_deg:.6f}", "a path needs two places"
            )
        cell_m = min(stack.cell_along(path) for stack in self._layers.stacks)
        wanted = 0.5 * cell_m if step_m is None else step_m
        count = _steps(path.length_m, wanted)
        notes: tuple[str, ...] = ()
        if count > MAX_SAMPLES:
            count = MAX_SAMPLES
            notes = (
                f"step {path.length_m / count:.3g} m instead of {wanted:.3g} m: a path has at most {count} samples",
            )
        work = PathWork(self._layers, path, name=name, cell_m=cell_m)
        distance = work.distances(np.linspace(0.0, path.length_m, count + 1))
        samples = work.samples(distance)
        for step in samples.surface_steps:
            if step.is_refused:
                raise step.error()
        return self._made(work, samples, name=name, step_m=path.length_m / count, cell_m=cell_m, extra=notes)

    def _made(
        self,
        work: PathWork,
        samples: Samples,
        *,
        name: str | None,
        step_m: float,
        cell_m: float,
        extra: tuple[str, ...] = (),
        was: PathProfile | None = None,
    ) -> PathProfile:
        surface: Floats = samples.ground_m + samples.cover_m
        kept = was.notes if was is not None else ()
        return PathProfile(
            a=work.path.a,
            b=work.path.b,
            name=name,
            distance_m=samples.distance_m,
            latitude_deg=samples.latitude_deg,
            longitude_deg=samples.longitude_deg,
            ground_m=samples.ground_m,
            cover_m=samples.cover_m,
            cover_kind=samples.cover_kind,
            obstacle_index=samples.obstacle_index,
            surface_m=surface,
            source=samples.source,
            measured=samples.measured,
            sigma_m=samples.sigma_m,
            sources=self._layers.sources,
            obstacles=tuple(standing.shown for standing in work.standing),
            gaps=gaps_of(samples, self._layers.ground, reason=work.gap_reason),
            step_m=step_m,
            cell_m=cell_m,
            ground_is_bare=self._layers.is_bare,
            surface_is_known=bool(samples.known.all()) and (was is not None or surface_tells(work, samples)),
            vertical_datum=self._datum,
            beside=was.beside if was is not None else work.beside(),
            notes=tuple(
                dict.fromkeys((*self.notes, *kept, *extra, *path_notes(work, samples, refined=was is not None)))
            ),
        )


def _steps(length_m: float, step_m: float) -> int:
    """How many equal steps of at most `step_m` a path is divided into."""
    return max(1, math.ceil(length_m / step_m - 1e-9))


def _samples_of(profile: PathProfile) -> Samples:
    """A profile's own samples; whether its surface is known is one answer for all of them."""
    return Samples(
        distance_m=profile.distance_m,
        latitude_deg=profile.latitude_deg,
        longitude_deg=profile.longitude_deg,
        ground_m=profile.ground_m,
        cover_m=profile.cover_m,
        cover_kind=profile.cover_kind,
        obstacle_index=profile.obstacle_index,
        source=profile.source,
        measured=profile.measured,
        sigma_m=profile.sigma_m,
        known=np.full(profile.distance_m.shape, profile.surface_is_known),
        valued=np.full(profile.distance_m.shape, profile.surface_is_known),
    )
