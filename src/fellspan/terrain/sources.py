"""What a user declares about each terrain file; no file is opened here."""

from dataclasses import dataclass
from pathlib import Path

from fellspan.vocabulary import CoverKind, LengthUnit, RasterRole


@dataclass(frozen=True, slots=True, kw_only=True)
class RasterSource:
    """One elevation raster, or a folder of tiles, as declared.

    `path` may be anything that GDAL opens (a file, a folder of tiles, an object-store URL). `vertical_unit` and
    `vertical_datum` replace what the file states or fails to state; `error_m` is one standard error, m, and None takes the
    documented default for the cell size. `band` counts from 1.
    """

    path: str | Path
    role: RasterRole = "ground"
    vertical_unit: LengthUnit | None = None
    vertical_datum: str | None = None
    error_m: float | None = None
    band: int = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class CoverSource:
    """One raster of cover heights above ground, all of one kind; `growth_m_per_year` is for trees."""

    path: str | Path
    kind: CoverKind = "other"
    vertical_unit: LengthUnit | None = None
    error_m: float | None = None
    growth_m_per_year: float = 0.0
    band: int = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class ObstacleSource:
    """A CSV or GeoJSON file of obstacles.

    `complete` names the kinds, 'building' and 'tree', of which the file holds all that stand anywhere near the paths: only
    then does their absence from it count as knowledge.
    """

    path: str | Path
    complete: tuple[CoverKind, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class SurveySource:
    """A CSV file of surveyed points or profiles."""

    path: str | Path
