"""Hubs and places far from every raster: refused with their rows before a run begins, with the slip that would explain them.

Compares positions with the outlines of rasters; reads no cell and changes no position.
"""

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from fellspan.errors import SitesFileError
from fellspan.geodesy.transforms import WGS84, transformer
from fellspan.links.cautions import LONGEST_M
from fellspan.planning.far_away import FAR_M, RADIUS_M, unit_vectors
from fellspan.screening.pairs import Candidates, SiteColumns
from fellspan.terrain.raster_file import RasterFile, on_plane
from fellspan.terrain.tables import shown
from fellspan.terrain.terrain import Terrain

_FEW: Final = 3
_PARTS: Final = 8
"""Parts of a side that a raster is compared by, where there are few rasters."""
_MANY_FILES: Final = 64

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SiteRows:
    """Where each site of the columns stands in its file."""

    file: str
    where: NDArray[np.str_]


def refuse_far_places(candidates: Candidates, hub_rows: SiteRows, place_rows: SiteRows, terrain: Terrain) -> None:
    """Refuse hubs and places that no link could reach from the terrain, or that a slip brought away from it.

    Farther than `LONGEST_M` from every raster is refused always; farther than `FAR_M` where swapped coordinates or a lost
    sign explain it. What lies nearer runs, and is a gap or out of reach.

    Raises
    ------
    SitesFileError
        Names up to three rows of the first file that has such.
    """
    outline = _Outline([file for stack in terrain.layers.stacks[:1] for file in stack.files])
    for sites, rows, kind in ((candidates.hubs, hub_rows, "hub"), (candidates.places, place_rows, "place")):
        told = list(_told(sites, rows, outline))
        if told:
            first, *others = told
            left = len(told) - _FEW
            more = [f"and {left} more {kind}{'s' if left > 1 else ''} far away"] if left > 0 else []
            raise SitesFileError(first, *others[: _FEW - 1], *more)


def _told(sites: SiteColumns, rows: SiteRows, outline: "_Outline") -> Iterator[str]:
    """What to say of each site that is refused, in the order of the file's rows."""
    latitude, longitude = sites.latitude_deg, sites.longitude_deg
    away = outline.away_m(latitude, longitude)
    far = np.flatnonzero(away > FAR_M)
    if not far.size:
        return
    order = np.argsort([int(text.rsplit(" ", 1)[-1]) for text in rows.where[far].tolist()], kind="stable")
    for index in far[order].tolist():
        slip = _slip(float(latitude[index]), float(longitude[index]), outline)
        if slip or away[index] > LONGEST_M:
            yield (
                f"{rows.file}, {rows.where[index]}, '{shown(sites.name[index], 30)}': "
                f"{_degrees(latitude[index], 'NS')} {_degrees(longitude[index], 'EW')} is {away[index] / 1000.0:.0f} km "
                f"from the terrain: {slip or 'latitude and longitude swapped, or a sign lost?'}"
            )


def _slip(latitude: float, longitude: float, outline: "_Outline") -> str:
    """The slip that would explain a far position; '' where none does."""
    slips = (
        ("latitude and longitude swapped?", longitude, latitude),
        ("a minus lost before the longitude?", latitude, -longitude),
        ("a minus lost before the latitude?", -latitude, longitude),
        ("a minus lost before both?", -latitude, -longitude),
        ("latitude and longitude swapped, and a minus lost?", longitude, -latitude),
        ("latitude and longitude swapped, and a minus lost?", -longitude, latitude),
    )
    likely = [slip for slip in slips if abs(slip[1]) <= 90.0]
    away = outline.away_m(np.array([slip[1] for slip in likely]), np.array([slip[2] for slip in likely]))
    return next((slip[0] for slip, one in zip(likely, away.tolist(), strict=True) if one <= FAR_M), "")


def _degrees(value: float, letters: str) -> str:
    return f"{abs(value):.4f} {letters[int(value < 0.0)]}"


class _Outline:
    """Parts of rasters as middles and one radius that reaches over each: distances to them are never too long."""

    def __init__(self, files: list[RasterFile]) -> None:
        parts = _PARTS if len(files) <= _MANY_FILES else 1
        found = [_parts_of(file, parts) for file in files]
        middles = np.concatenate([middle for middle, _ in found])
        self._radius_m = max(radius for _, radius in found)
        self._tree = cKDTree(middles) if len(middles) else None

    def away_m(self, latitude_deg: Floats, longitude_deg: Floats) -> Floats:
        """How far each position lies from the nearest raster at least, (n,)."""
        if self._tree is None or not np.isfinite(self._radius_m):
            return np.zeros(latitude_deg.size)
        chord, _ = self._tree.query(unit_vectors(latitude_deg, longitude_deg))
        return np.asarray(np.maximum(2.0 * RADIUS_M * np.arcsin(np.minimum(chord / 2.0, 1.0)) - self._radius_m, 0.0))


def _parts_of(file: RasterFile, parts: int) -> tuple[Floats, float]:
    """Middles of the parts as unit vectors, (m, 3), and how far any corner is from its middle; without end where unknown."""
    at = np.linspace(0.0, 1.0, 2 * parts + 1)
    column, row = np.meshgrid(at * file.width, at * file.height)
    x, y = on_plane(file.transform, column.ravel(), row.ravel())
    longitude, latitude = (np.asarray(one) for one in transformer(file.crs_text, WGS84).transform(x, y))
    if not (np.isfinite(longitude) & np.isfinite(latitude)).all():
        return np.empty((0, 3)), np.inf
    places = unit_vectors(latitude, longitude).reshape(*column.shape, 3)
    middles = places[1::2, 1::2]
    cosine = np.stack([(middles * places[i::2, j::2][:parts, :parts]).sum(axis=-1) for i in (0, 2) for j in (0, 2)])
    radius = float(RADIUS_M * np.arccos(np.clip(cosine.min(), -1.0, 1.0)))
    return middles.reshape(-1, 3), radius
