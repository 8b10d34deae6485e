"""Around one site: where could the other end stand, and how high? Counts what the sweep found; draws and writes nothing.

The height at a cell is for the rasters as they are: their errors, surveyed points and what moves belong to the plan of a link.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan import __version__
from fellspan.design.sweep import HeightField, height_field
from fellspan.errors import LinkError
from fellspan.geodesy.position import Position
from fellspan.geodesy.transforms import crs_of
from fellspan.links.criteria import COMMON_PRACTICE, TROPICAL_FROM_M, Criterion, criteria_for, range_cautions
from fellspan.links.site import Site
from fellspan.planning.inputs import Study
from fellspan.planning.planner import open_terrain
from fellspan.propagation.constants import EARTH_RADIUS_M, K_FORMULA_LOW_M
from fellspan.terrain.cover import missing_kinds
from fellspan.terrain.terrain import Terrain
from fellspan.vocabulary import Basis

MASTS_M: Final = (5.0, 10.0, 15.0, 20.0, 30.0)
"""Heights that shares, contours and classes are told for, m above ground, where none are asked."""
MOST_MASTS: Final = 6
SECTORS: Final = ("N", "NE", "E", "SE", "S", "SW", "W", "NW")
"""Eighths of the compass, each 45 degrees wide around its name."""
TALL_M: Final = 500.0
"""Masts above it are looked for, but hardly meant (common practice, no source)."""
_HIGHEST_GROUND_M: Final = 9_000.0
_ROWS: Final = 256


@dataclass(frozen=True, slots=True, kw_only=True)
class Farthest:
    """The farthest place that a mast of the height asked for reaches."""

    distance_m: float
    bearing_deg: float
    position: Position
    needed_m: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Sector:
    """One eighth of the compass; `shares` as in `Around`, None where it has no answer at all."""

    name: str
    known_share: float
    shares: tuple[float, ...] | None
    farthest: Farthest | None


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Around:
    """What can be reached from one site.

    `masts_m` rises; `other_m`, one of them, is the one that the decision is about. Areas are of the circle, without what gaps
    make open water. `shares` are of the area with an answer, `sight_shares` the same for the bare sight line at the median k,
    `known_share` is the part that has an answer.
    """

    title: str
    study: Study
    field: HeightField
    basis: Basis
    masts_m: tuple[float, ...]
    other_m: float
    shares: tuple[float, ...]
    sight_shares: tuple[float, ...]
    known_share: float
    sectors: tuple[Sector, ...]
    farthest: Farthest | None
    cautions: tuple[str, ...]
    sea_level_m: float | None = None
    """Level of the open water that gaps are, m above sea level; None where they are not."""
    height_from: str = ""
    """Who says how high the antenna at the site is; empty where nobody told."""
    version: str = __version__

    @property
    def site(self) -> Site:
        """Where the rays start."""
        return self.field.site

    def on_land(self, rows: slice = slice(None)) -> NDArray[np.bool_]:
        """Cells of some rows where a mast could stand: all but the open water that gaps are."""
        ground = self.field.ground_m[rows]
        if self.sea_level_m is None:
            return np.ones(ground.shape, dtype=np.bool_)
        return np.asarray(ground != np.float32(self.sea_level_m))

    @property
    def share(self) -> float:
        """Of the area with an answer, what a mast of `other_m` reaches."""
        return self.shares[self.masts_m.index(self.other_m)]


def look_around(
    study: Study,
    site: Site,
    *,
    frequency_hz: float,
    radius_m: float,
    other_m: float = 10.0,
    masts_m: Sequence[float] = MASTS_M,
    cell_m: float | None = None,
    height_from: str = "",
) -> Around:
    """Sweep the terrain of a study around a site and count what masts of some heights reach.

    Raises
    ------
    LinkError
        A mast height, the radius or the frequency makes no sense.
    TerrainError
        The terrain cannot be opened, or does not hold the site.
    """
    masts = tuple(sorted({*masts_m, other_m}))
    if not all(0.0 <= mast <= 1_000.0 for mast in masts) or len(masts) > MOST_MASTS:
        raise LinkError(
            f"mast heights of {', '.join(f'{mast:g}' for mast in masts)} m",
            f"from 0 to 1000 m, and at most {MOST_MASTS} of them",
        )
    if study.median_k > 0.0 and radius_m > (most_m := _farthest_sight_m(study.median_k)):
        raise LinkError(
            f"radius {radius_m / 1000.0:.0f} km: no two masts on Earth see each other so far",
            f"at most {most_m / 1000.0:.0f} km at k = {study.median_k:.3g}, as in 15 km",
        )
    criteria = area_criteria(study, radius_m)
    with open_terrain(study) as terrain:
        field = height_field(
            terrain,
            site=site,
            frequency_hz=frequency_hz,
            criteria=criteria,
            radius_m=radius_m,
            cell_m=cell_m,
            sight_k=study.median_k,
        )
        basis = _basis(terrain)
        tall = [mast for mast in masts if mast > TALL_M]
        said = (
            [] if not tall else [f"Few masts on Earth are higher than {TALL_M:g} m: see that {tall[-1]:g} m was meant."]
        )
        cautions = tuple(dict.fromkeys((*said, *_cautions(study, field, basis, terrain), *study.notes, *terrain.notes)))
    sea_level_m = study.terrain.sea_level_m if study.terrain.gaps == "sea" else None
    tally = _Tally(field, masts, other_m, sea_level_m)
    return Around(
        title=study.title,
        study=study,
        field=field,
        basis=basis,
        masts_m=masts,
        other_m=other_m,
        shares=tally.shares(),
        sight_shares=tally.sight_shares(),
        known_share=tally.known_share(),
        sectors=tuple(tally.sector(number) for number in range(len(SECTORS))),
        farthest=tally.farthest(),
        cautions=cautions,
        sea_level_m=sea_level_m,
        height_from=height_from,
    )


def _farthest_sight_m(k: float) -> float:
    """How far two antennas on the highest ground and masts of all see each other over a smooth Earth, m."""
    return 2.0 * math.sqrt(2.0 * k * EARTH_RADIUS_M * (_HIGHEST_GROUND_M + 1_000.0))


def area_criteria(study: Study, radius_m: float) -> tuple[Criterion, ...]:
    """What must hold at every distance up to `radius_m`: rules whose k depends on the distance at their strictest."""
    if study.criteria:
        return study.criteria
    if study.preset == "p530-tropical":
        at_m = radius_m if radius_m <= TROPICAL_FROM_M else TROPICAL_FROM_M + 1.0
    else:
        at_m = min(radius_m, K_FORMULA_LOW_M)
    found = criteria_for(study.preset, distance_m=at_m, median_k=study.median_k, extended=True)
    if at_m == radius_m or study.preset == "sixty-percent":
        return found
    return (
        found[0],
        *(replace(rule, note=f"{rule.note}; taken for all distances, the strictest") for rule in found[1:]),
    )


def _basis(terrain: Terrain) -> Basis:
    """What is known of trees and buildings: both, or not both."""
    layers = terrain.layers
    if layers.surface is not None or not layers.is_bare:
        return "surface raster"
    told = missing_kinds((source.kind for source, _ in layers.cover), layers.complete)
    return "bare ground only" if told else "surface raster"


def _cautions(study: Study, field: HeightField, basis: Basis, terrain: Terrain) -> list[str]:
    found = []
    if basis == "bare ground only":
        found.append(
            "Bare ground only: trees and buildings are not all in the data, and a place that is free here may be blocked."
        )
    found.append(
        "The site walk decides: a raster shows where to look. Plan each place that is chosen with fellspan plan, which "
        "counts the errors of the heights, what was surveyed and the signal."
    )
    sigma_m = max(source.error_m or 0.0 for source in (*study.terrain.ground, *study.terrain.surface))
    stated = f"their stated standard error of {sigma_m:g} m" if sigma_m > 0.0 else "their error, which is not stated,"
    found.append(
        f"What is free here is free on the heights in the data; {stated} is not added. The plan asks for more height to be "
        "clear with the confidence wanted, and far more at the other end where the obstacle stands near the site: one metre "
        "at a tenth of the way takes ten there. Build no mast on these heights."
    )
    if not terrain.ground_is_bare:
        found.append("Heights are above the surface raster, which takes roofs and treetops for ground.")
    if any(item.rule == "span" or item.moves for item in terrain.layers.obstacles.obstacles):
        found.append("Hanging wires, and what comes and goes, were not looked at here; the plan of a link does.")
    if study.terrain.survey:
        found.append("Surveyed points were not used here; the plan of a link uses them.")
    if not field.criteria[0].source.startswith(COMMON_PRACTICE):
        found += range_cautions(study.preset, frequency_hz=field.frequency_hz) if not study.criteria else ()
    found += [f"{note[0].upper()}{note[1:]}." for note in field.notes]
    return found


class _Tally:
    """Area by sector and by the first mast that is high enough."""

    def __init__(
        self, field: HeightField, masts_m: tuple[float, ...], other_m: float, sea_level_m: float | None
    ) -> None:
        self._field, self._masts, self._other = field, masts_m, other_m
        self._sea_level = None if sea_level_m is None else np.float32(sea_level_m)
        count, classes = len(SECTORS), len(masts_m) + 1
        self._area = np.zeros((count, classes))
        self._sight = np.zeros(classes)
        self._unknown = np.zeros(count)
        self._best: list[tuple[float, int, int]] = [(-1.0, 0, 0)] * count
        easts, norths, columns = field.grid.around(field.site.position, cell_m=field.cell_m)
        self._polynomials = easts, norths, columns
        is_degrees = crs_of(field.crs).is_geographic
        for first in range(0, field.shape[0], _ROWS):
            rows = slice(first, min(first + _ROWS, field.shape[0]))
            east, north = _place(easts[rows], columns), _place(norths[rows], columns)
            weight = np.ones(east.shape)
            if is_degrees:
                middle = np.full(rows.stop - first, field.shape[1] / 2.0)
                latitude, _ = field.grid.positions(middle, np.arange(first, rows.stop, dtype=np.float64) + 0.5)
                weight *= np.cos(np.radians(latitude))[:, None]
            self._add(rows, np.degrees(np.arctan2(east, north)) % 360.0, weight)

    def _add(self, rows: slice, bearing_deg: NDArray[np.float64], weight: NDArray[np.float64]) -> None:
        field, count = self._field, len(SECTORS)
        needed, away = field.needed_m[rows], field.distance_m[rows]
        sector = ((bearing_deg + 22.5) // 45.0).astype(np.int64) % count
        inside = away <= field.radius_m
        if self._sea_level is not None:  # nobody builds a mast on open water
            inside &= field.ground_m[rows] != self._sea_level
        known = inside & np.isfinite(needed)
        step = np.searchsorted(self._masts, needed[known].astype(np.float64))
        classes = len(self._masts) + 1
        self._area += np.bincount(sector[known] * classes + step, weight[known], minlength=count * classes).reshape(
            count, classes
        )
        self._unknown += np.bincount(sector[inside & ~known], weight[inside & ~known], minlength=count)
        if field.sight_needed_m is not None:
            sight = field.sight_needed_m[rows][known].astype(np.float64)
            self._sight += np.bincount(np.searchsorted(self._masts, sight), weight[known], minlength=classes)
        reached = np.where(known & (needed <= self._other), away, -1.0)
        for number in range(count):
            here = np.where(sector == number, reached, -1.0)
            at = int(np.argmax(here))
            best = float(here.flat[at])
            if best > self._best[number][0]:
                row, column = divmod(at, here.shape[1])
                self._best[number] = best, rows.start + row, column

    def shares(self) -> tuple[float, ...]:
        """Of the area with an answer, by mast."""
        return _shares(self._area.sum(axis=0))

    def sight_shares(self) -> tuple[float, ...]:
        """As `shares`, for the sight line alone."""
        return _shares(self._sight)

    def known_share(self) -> float:
        """Of the circle, the part with an answer."""
        known = float(self._area.sum())
        return known / max(known + float(self._unknown.sum()), 1e-9)

    def sector(self, number: int) -> Sector:
        """What one eighth of the compass holds."""
        known = float(self._area[number].sum())
        return Sector(
            name=SECTORS[number],
            known_share=known / max(known + float(self._unknown[number]), 1e-9),
            shares=_shares(self._area[number]) if known > 0.0 else None,
            farthest=self._farthest(number),
        )

    def farthest(self) -> Farthest | None:
        """Of all sectors."""
        return self._farthest(max(range(len(SECTORS)), key=lambda number: self._best[number][0]))

    def _farthest(self, number: int) -> Farthest | None:
        away, row, column = self._best[number]
        if away < 0.0:
            return None
        field = self._field
        easts, norths, columns = self._polynomials
        east = float(np.polyval(easts[row], columns[column]))
        north = float(np.polyval(norths[row], columns[column]))
        latitude, longitude = field.grid.positions(np.array([column + 0.5]), np.array([row + 0.5]))
        turned = (float(longitude[0]) + 180.0) % 360.0 - 180.0
        return Farthest(
            distance_m=away,
            bearing_deg=float(np.degrees(np.arctan2(east, north)) % 360.0),
            position=Position(latitude_deg=float(latitude[0]), longitude_deg=turned),
            needed_m=float(field.needed_m[row, column]),
        )


def _place(polynomials: NDArray[np.float64], columns: NDArray[np.float64]) -> NDArray[np.float64]:
    value = np.broadcast_to(polynomials[:, :1], (polynomials.shape[0], columns.size))
    for power in range(1, polynomials.shape[1]):
        value = value * columns + polynomials[:, power : power + 1]
    return value


def _shares(area: NDArray[np.float64]) -> tuple[float, ...]:
    """Of an area by the first mast that is enough, the last for none: the share up to each."""
    total = max(float(area.sum()), 1e-9)
    return tuple(float(value) for value in np.cumsum(area)[:-1] / total)
