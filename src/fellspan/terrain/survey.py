"""Reads survey files: points and profiles that a crew measured, by position or by distance along a named link.

Complaints name file, row, value and remedy. Knows nothing of paths and rasters: `survey_hits` lays the rows on a path.
"""

from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Final

from fellspan.errors import SurveyFileError
from fellspan.terrain.tables import Fields, read_rows
from fellspan.vocabulary import CoverKind

COLUMNS: Final = (
    "latitude_deg",
    "longitude_deg",
    "link",
    "distance_m",
    "ground_m",
    "top_m",
    "top_above_ground_m",
    "kind",
    "note",
    "profile",
    "radius_m",
    "source",
    "error_m",
    "growth_m_per_year",
    "vertical_datum",
)
DEFAULT_ERROR_M = 0.1
"""Standard error of a surveyed height whose row states none, m (common practice, no source)."""

_MIN_AMSL_M, _MAX_AMSL_M = -500.0, 9500.0


def link_key(name: str) -> str:
    """What two spellings of one link's name have in common: letter case and the width of blanks do not matter."""
    return " ".join(name.split()).casefold()


@dataclass(frozen=True, slots=True, kw_only=True)
class SurveyRow:
    """One measured point: at a position, or at a distance from A of a link.

    `top_m` is above sea level; `cover_m` is a top above ground where the ground itself was not measured.
    """

    where: str
    file: str
    latitude_deg: float | None
    longitude_deg: float | None
    link: str
    distance_m: float | None
    ground_m: float | None
    top_m: float | None
    cover_m: float | None
    kind: CoverKind
    note: str
    profile: str
    radius_m: float | None
    source: str
    error_m: float
    growth_m_per_year: float | None = None
    """Of a tree; None where the row does not say."""

    @property
    def has_top(self) -> bool:
        """True where a top was measured, above sea level or above ground."""
        return self.top_m is not None or self.cover_m is not None

    def grown(self, years: float) -> "SurveyRow":
        """The row with its tree so many years older."""
        growth = (self.growth_m_per_year or 0.0) * years
        if growth == 0.0:
            return self
        top = self.top_m
        if top is not None and (self.ground_m is None or top > self.ground_m):
            top += growth
        return replace(self, top_m=top, cover_m=self.cover_m + growth if self.cover_m else self.cover_m)


@dataclass(frozen=True, slots=True, kw_only=True)
class SurveyFile:
    """The rows of one file and the vertical datums they state."""

    name: str
    rows: tuple[SurveyRow, ...]
    datums: tuple[str, ...] = field(default=())


def read_survey(path: str | Path) -> SurveyFile:
    """Read one survey file.

    Raises
    ------
    SurveyFileError
        The file cannot be read, has an unknown column, or a row that cannot be used.
    """
    file = Path(path)
    rows: list[SurveyRow] = []
    datums: list[str] = []
    last: dict[tuple[str, str], float] = {}
    for fields in read_rows(file, COLUMNS, SurveyFileError, "survey"):
        row = _row(fields, file.name)
        if row.profile and row.distance_m is not None:
            key = (row.profile, link_key(row.link))
            if row.distance_m <= last.get(key, -1.0):
                raise fields.fail(
                    f"distance_m {row.distance_m:g} of profile '{row.profile}' does not rise from {last[key]:g}",
                    "put the rows of a profile in the order of their distance from A",
                )
            last[key] = row.distance_m
        datum = fields.text("vertical_datum")
        if datum and datum not in datums:
            datums.append(datum)
        rows.append(row)
    return SurveyFile(name=file.name, rows=tuple(rows), datums=tuple(datums))


def _row(fields: Fields, file: str) -> SurveyRow:
    latitude = fields.number("latitude_deg", -90.0, 90.0)
    longitude = fields.number("longitude_deg", -360.0, 360.0)
    link = fields.text("link")
    distance = fields.number("distance_m", 0.0, 2.1e7)
    by_position = latitude is not None and longitude is not None
    by_distance = bool(link) and distance is not None
    if by_position == by_distance or (latitude is None) != (longitude is None) or bool(link) != (distance is not None):
        said = "both a position and a distance" if by_position and by_distance else "no complete place"
        raise fields.fail(f"{said} given", "give latitude_deg and longitude_deg, or link and distance_m (from A)")
    ground = fields.number("ground_m", _MIN_AMSL_M, _MAX_AMSL_M)
    top = fields.number("top_m", _MIN_AMSL_M, _MAX_AMSL_M)
    above = fields.number("top_above_ground_m", 0.0, 2000.0)
    if ground is None and top is None and above is None:
        raise fields.fail("nothing measured", "give ground_m, top_m (above sea level) or top_above_ground_m")
    if top is not None and above is not None:
        raise fields.fail("both top_m and top_above_ground_m given", "give one of them")
    if top is not None and ground is not None and top < ground:
        raise fields.fail(f"top_m {top:g} lies below ground_m {ground:g}", "top_m is above sea level, not above ground")
    if above is not None and ground is not None:
        top, above = ground + above, None
    error = fields.number("error_m", 0.0, 1000.0)
    kind = fields.kind("none")
    growth = fields.number("growth_m_per_year", 0.0, 10.0)
    if growth is not None and kind != "tree":
        raise fields.fail(f"growth_m_per_year {growth:g} given for what is no tree", "write kind tree, or leave it out")
    return SurveyRow(
        where=fields.where,
        file=file,
        latitude_deg=latitude,
        longitude_deg=longitude,
        link=link,
        distance_m=distance,
        ground_m=ground,
        top_m=top,
        cover_m=above,
        kind=kind,
        note=fields.text("note"),
        profile=fields.text("profile"),
        radius_m=fields.number("radius_m", 0.0, 10_000.0),
        source=fields.text("source"),
        error_m=DEFAULT_ERROR_M if error is None else error,
        growth_m_per_year=growth,
    )
