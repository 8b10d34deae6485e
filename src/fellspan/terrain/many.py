"""Terrain for many paths at once: ground and cover from rasters as `assemble` puts them together for one path.

For paths on which rasters alone count; those near an obstacle or a surveyed point are named, for the caller to take one by one.
Opens nothing itself; knows nothing of radio.
"""

import os
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Final, Protocol

import numpy as np
from numpy.typing import NDArray

from fellspan.terrain.assemble import Layers
from fellspan.terrain.cover import NONE, OTHER, CoverLayer, combine, may_be_refused, missing_kinds, rises_somewhere
from fellspan.terrain.raster_file import RasterFile
from fellspan.terrain.sea import SEA_ERROR_M, near_shores
from fellspan.terrain.sheet import Curves
from fellspan.terrain.stack_sheets import PathsOnStack, StackSheets, sigmas_of

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


def _most_bytes() -> int:
    """An eighth of the machine's memory, 300 MB at least: other processes may do the same work beside this one."""
    try:
        memory = os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES")
    except (AttributeError, OSError, ValueError):
        memory = 0
    return max(memory // 8, 300_000_000)


MOST_BYTES: Final = _most_bytes()
"""Tiles of all rasters together that stay in memory from one part of a batch to the next. Pairs spread over more than that are
read again and again: ten times slower."""


class Paths(Protocol):
    """A batch of paths that can say where it runs."""

    @property
    def size(self) -> int:
        """How many."""
        ...

    @property
    def length_m(self) -> Floats:
        """How long each is, m, (p,)."""
        ...

    def curves_on(self, file: RasterFile) -> Curves:
        """The paths on a raster."""
        ...


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ManySamples:
    """What stands along paths, arrays (q, n); those that are one value for all of a path may be (q, 1).

    Meanings as in `PathProfile`; `ground_m` is NaN in a gap, `cover_m` and `cover_kind` None where no raster tells of cover.
    """

    ground_m: Floats
    cover_m: Floats | None
    cover_kind: NDArray[np.int8] | None
    sigma_m: Floats
    """Standard error of what must be cleared."""
    ground_sigma_m: Floats
    source: NDArray[np.int16]
    known: NDArray[np.bool_]
    """Trees and buildings are both known here."""
    doubtful: NDArray[np.bool_]
    """Paths (q,) on which rasters disagree so that planning might refuse them."""
    wet: NDArray[np.bool_] | None
    """Whether what has no data between each sample and the next is sea; None where that was not asked or nowhere so."""
    tells: NDArray[np.bool_]
    """Paths (q,) on which the surface raster shows anything at all, or others tell of trees and buildings."""


class ManyPaths:
    """A terrain's rasters kept as sheets, for batch after batch."""

    def __init__(self, layers: Layers) -> None:
        self.layers = layers
        self._ground = StackSheets(layers.ground)
        self._surface = None if layers.surface is None else StackSheets(layers.surface)
        self._cover = tuple((source, StackSheets(stack)) for source, stack in layers.cover)
        self._users = 0
        self._turn = threading.Condition()

    @contextmanager
    def in_use(self) -> Iterator[None]:
        """For the time between reading and sampling, on each thread: tiles stay in memory inside.

        Where they take more than `MOST_BYTES`, whoever enters waits for the others to leave and gives all of it back first.
        """
        with self._turn:
            while self._users and self.held_bytes > MOST_BYTES:
                self._turn.wait()
            if self.held_bytes > MOST_BYTES:
                for sheets in self.stacks:
                    for sheet in sheets.sheets:
                        sheet.forget()
            self._users += 1
        try:
            yield
        finally:
            with self._turn:
                self._users -= 1
                self._turn.notify_all()

    @property
    def held_bytes(self) -> int:
        """What the tiles in memory take."""
        return sum(sheet.held_bytes for sheets in self.stacks for sheet in sheets.sheets)

    def lay(self, paths: Paths) -> "LaidPaths":
        """A batch of paths laid on the rasters."""
        return LaidPaths(self, paths)

    @property
    def stacks(self) -> tuple[StackSheets, ...]:
        """All stacks, ground first."""
        beside = () if self._surface is None else (self._surface,)
        return (self._ground, *beside, *(sheets for _, sheets in self._cover))


class LaidPaths:
    """A batch of paths on the rasters, ready to be sampled anywhere."""

    def __init__(self, many: ManyPaths, paths: Paths) -> None:
        self._many, self._paths = many, paths
        self._stacks = [sheets.over(paths) for sheets in many.stacks]
        self.usable = np.logical_and.reduce([stack.usable for stack in self._stacks])
        """Whether sheets serve all of a path, (p,)."""
        self.cell_m: Floats = np.minimum.reduce([stack.cell_m for stack in self._stacks])
        """The finest cell of each path, m, (p,)."""

    def read_for(self, t: Floats, which: Index) -> None:
        """Read what lies under places t, -1 at A to 1 at B, rising, (q, n), of paths `which`, and between them."""
        for stack in self._stacks:
            stack.read_for(t, which)

    def sample(
        self,
        t: Floats,
        which: Index,
        *,
        last: Index | None = None,
        wet: NDArray[np.bool_] | None = None,
    ) -> ManySamples:
        """Everything at t, -1 at A to 1 at B, (q, n), of the paths `which`, (q,).

        With `last`, (q,), the index of each path's last sample, `doubtful` and `tells` look at the surface raster all along and
        gaps are taken as sea by their shores; without, the places are some of the path's only, and gaps are sea where `wet`,
        (q, n), says so.
        """
        layers = self._many.layers
        ground = self._stacks[0].sample(t, which)
        value, source = ground.value_m, ground.source
        ground_sigma = sigmas_of(layers.ground.files, source)
        raster, along = value, None
        if layers.gaps == "sea" and (gap := ~np.isfinite(value)).any():
            if last is not None:
                before, after = near_shores(value, ground_sigma, _own(last, t.shape[1]), sea_level_m=layers.sea_level_m)
                # What a path is told must not hang on whether another beside it has a gap.
                along = before & np.concatenate((after[:, 1:], after[:, -1:]), axis=1) & gap.any(axis=1, keepdims=True)
                gap &= before & after
            else:
                gap &= False if wet is None else wet
            value = np.where(gap, layers.sea_level_m, value)
            ground_sigma = np.where(gap, SEA_ERROR_M, ground_sigma)
            source = np.where(gap, layers.sea, source).astype(np.int16)
        doubtful, tells = ground.doubtful, np.ones(which.size, dtype=np.bool_)
        if not layers.is_bare:
            known = np.isfinite(value)
            return self._bare(value, ground_sigma, source, known, doubtful, tells, along)
        covers: list[CoverLayer] = []
        cover_stacks = self._stacks[len(self._stacks) - len(layers.cover) :]
        for (declared, _), laid in zip(layers.cover, cover_stacks, strict=True):
            heights, sigma, doubt = _sampled(laid, t, which)
            growth = declared.growth_m_per_year * layers.growth_years
            covers.append(CoverLayer(kind=declared.kind, value_m=heights, sigma_m=sigma, growth_m=growth))
            doubtful = doubtful | doubt
        if layers.surface is None:
            if not covers:
                known = np.full((which.size, 1), not missing_kinds((), layers.complete)) | (source == layers.sea)
                return self._bare(value, ground_sigma, source, known, doubtful, tells, along)
            cover = combine(value, covers, None, None, complete=layers.complete)
        else:
            surface, sigma, doubt = _sampled(self._stacks[1], t, which)
            cover = combine(value, covers, surface, sigma, complete=layers.complete)
            step = surface - raster
            doubtful = doubtful | doubt
            if last is not None:
                one = len(layers.ground.files) == 1 and len(layers.surface.files) == 1
                doubtful |= may_be_refused(step, ground_sigma, sigma, inside=_own(last, t.shape[1]), is_one_pair=one)
                if missing_kinds([declared.kind for declared, _ in layers.cover], layers.complete):
                    tells = rises_somewhere(step, raster, self._paths.length_m[which], inside=_own(last, t.shape[1]))
        height = cover.height_m
        stands = height > 0.0
        kind = np.where(stands, np.where(cover.kind == NONE, OTHER, cover.kind), NONE).astype(np.int8)
        cover_sigma = np.where(stands, cover.sigma_m, 0.0)
        sigma = np.where(cover.from_surface, cover_sigma, np.hypot(ground_sigma, cover_sigma))
        return ManySamples(
            ground_m=value,
            cover_m=height,
            cover_kind=kind,
            sigma_m=sigma,
            ground_sigma_m=ground_sigma,
            source=source,
            known=(cover.known | (source == layers.sea)) & np.isfinite(value),
            wet=along,
            doubtful=doubtful,
            tells=tells,
        )

    @staticmethod
    def _bare(
        value: Floats,
        sigma: Floats,
        source: NDArray[np.int16],
        known: NDArray[np.bool_],
        doubtful: NDArray[np.bool_],
        tells: NDArray[np.bool_],
        wet: NDArray[np.bool_] | None,
    ) -> ManySamples:
        return ManySamples(
            ground_m=value,
            cover_m=None,
            cover_kind=None,
            sigma_m=sigma,
            ground_sigma_m=sigma,
            source=source,
            known=known,
            doubtful=doubtful,
            wet=wet,
            tells=tells,
        )


def _own(last: Index, width: int) -> NDArray[np.bool_]:
    """Which samples are a path's own, and not what fills up shorter ones, (q, width)."""
    return np.asarray(np.arange(width) <= last[:, np.newaxis])


def _sampled(laid: PathsOnStack, t: Floats, which: Index) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Heights, their standard errors, and the paths in doubt."""
    found = laid.sample(t, which)
    sigma = np.broadcast_to(sigmas_of(laid.sheets.stack.files, found.source), t.shape)
    return found.value_m, sigma, found.doubtful
