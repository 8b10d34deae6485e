"""Hubs and places from files: positions, heights and roofs as columns, and what each hub's sectors are made of.

Which antennas there are is not known here: a sector keeps what its row says, for `screening_study` to look up.
"""

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Final, TypeVar

import numpy as np
from numpy.typing import NDArray

from fellspan.errors import FellspanError
from fellspan.geodesy.coordinates import parse_position
from fellspan.geodesy.position import Position
from fellspan.quantities import AntennaHeight, parse_antenna_height, parse_length_m
from fellspan.screening.pairs import HEIGHT_REFERENCES, SiteColumns
from fellspan.study.messages import did_you_mean
from fellspan.study.place_rows import POSITION, Row, Rows, read_place_rows
from fellspan.terrain.tables import shown
from fellspan.vocabulary import HeightReference

PLACE_COLUMNS: Final = ("name", *POSITION, "height", "height_m", "height_above", "roof", "roof_m")
SECTOR_COLUMNS: Final = (
    "sector",
    "antenna",
    "model",
    "gain",
    "azimuth_width",
    "elevation_width",
    "front_to_back",
    "bearing",
    "downtilt",
    "polarization",
)
HUB_COLUMNS: Final = (*PLACE_COLUMNS, *SECTOR_COLUMNS)
_POSITION_ALIASES: Final = {
    "at": "position",
    "lat": "latitude",
    "latitude_deg": "latitude",
    "lon": "longitude",
    "long": "longitude",
    "lng": "longitude",
    "longitude_deg": "longitude",
    "x": "easting",
    "y": "northing",
    "height_reference": "height_above",
}
PLACE_ALIASES: Final = {"place": "name", "site": "name", **_POSITION_ALIASES}
HUB_ALIASES: Final = {
    "hub": "name",
    "site": "name",
    **_POSITION_ALIASES,
    "beam_width": "azimuth_width",
    "beamwidth": "azimuth_width",
    "azimuth": "bearing",
    "bearing_deg": "bearing",
    "downtilt_deg": "downtilt",
}
LONGEST_NAME: Final = 120
_ABOVE: Final[dict[str, HeightReference]] = {
    "ground": "ground",
    "agl": "ground",
    "roof": "roof",
    "sea": "sea",
    "sea level": "sea",
    "amsl": "sea",
}
_PLAIN_DEGREES: Final = re.compile(r"[+-]?[0-9]{1,3}\.[0-9]{3,}")
_DECIMAL_COMMA: Final = re.compile(r"[+-]?[0-9]+,[0-9]+")
_FEW: Final = 3
_MOST_COMPARED: Final = 5_000
"""Names among which the nearest is looked for; more would take seconds."""

_T = TypeVar("_T")
Indices = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True)
class SectorRow:
    """One sector as a file gives it: index of its hub in the columns, and the texts of its row."""

    hub: int
    name: str
    row: Row


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PlaceFile:
    """Sites of a file in the order of their names, their sectors where they are hubs, and what is doubtful."""

    sites: SiteColumns
    sectors: tuple[SectorRow, ...]
    rows: Rows
    where: NDArray[np.str_]
    """Row, feature or placemark of each site; the first of a hub's."""
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class _Site:
    name: str
    where: str
    position: Position
    height: AntennaHeight
    roof_m: float


def read_places(path: Path, *, crs: str | None = None, height: AntennaHeight | None = None) -> PlaceFile:
    """Places, one a row; `crs` is the system of easting and northing, `height` that of rows which state none.

    Raises
    ------
    SitesFileError
        The file cannot be read, or a row is wrong or stands there twice.
    """
    rows = read_place_rows(path, PLACE_COLUMNS, PLACE_ALIASES, what="places")
    reader = _Reader(rows, crs=crs, height=height, kind="place")
    seen: dict[str, Row] = {}
    for row in rows.rows:
        if (site := reader.site(row)) is None:
            continue
        if site.name in seen:
            rows.add_problem(
                row, f"place '{shown(site.name)}' stands in {seen[site.name].where} too", "give each one a name of its own"
            )  # fmt: skip
        seen.setdefault(site.name, row)
    return reader.finish(())


def read_hubs(path: Path, *, crs: str | None = None, height: AntennaHeight | None = None) -> PlaceFile:
    """Hubs; several rows of one name are its sectors, and agree in what else they state.

    Raises
    ------
    SitesFileError
        The file cannot be read, or a row is wrong, contradicts another of its hub, or repeats a sector.
    """
    rows = read_place_rows(path, HUB_COLUMNS, HUB_ALIASES, what="hubs")
    reader = _Reader(rows, crs=crs, height=height, kind="hub")
    first: dict[str, Row] = {}
    of_hub: dict[str, dict[str, Row]] = {}
    for row in rows.rows:
        name = row.text("name")
        known = first.get(name)
        if known is None:
            if (site := reader.site(row)) is None:
                continue
            first[site.name] = row
        else:
            for column in PLACE_COLUMNS[1:]:
                if row.text(column) and row.text(column) != known.text(column):
                    rows.add_problem(
                        row,
                        f"hub '{shown(name)}' has {column} '{shown(row.text(column))}' here and "
                        f"'{shown(known.text(column))}' in {known.where}",
                        "rows of one name are sectors of one hub; give another hub another name",
                    )
        sectors = of_hub.setdefault(name, {})
        sector = row.text("sector") or (str(len(sectors) + 1) if known is not None else "")
        if sector in sectors:
            rows.add_problem(
                row,
                f"sector '{shown(sector)}' of hub '{shown(name)}' stands in {sectors[sector].where} too",
                "give each sector of a hub a name of its own",
            )
        sectors.setdefault(sector, row)
    order = sorted(first)
    return reader.finish(
        tuple(
            SectorRow(hub=hub, name=sector, row=row)
            for hub, name in enumerate(order)
            for sector, row in of_hub[name].items()
        )
    )


def read_pairs(path: Path, *, hubs: SiteColumns, places: SiteColumns) -> tuple[Indices, Indices, tuple[str, ...]]:
    """Indices of hub and place of each pair of a CSV file with the columns hub and place, sorted; and notes.

    Raises
    ------
    SitesFileError
        The file cannot be read, names what the other files lack, or lists a pair twice.
    """
    rows = read_place_rows(path, ("hub", "place"), {}, what="pairs", table_only=True)
    by_hub = {name: index for index, name in enumerate(hubs.name)}
    by_place = {name: index for index, name in enumerate(places.name)}
    seen: dict[tuple[int, int], Row] = {}
    for row in rows.rows:
        found: list[int] = []
        for column, known in (("hub", by_hub), ("place", by_place)):
            name = row.text(column)
            if name in known:
                found.append(known[name])
            elif not name:
                rows.add_problem(row, f"{column} is missing", "each row names a hub and a place")
            else:
                few = len(known) <= _MOST_COMPARED and len(rows.wrong) < _FEW
                near = did_you_mean(name, known) if few else ()
                rows.add_problem(row, f"there is no {column} named '{shown(name)}' in the file of {column}s", *near)
        if len(found) == 2:
            pair = (found[0], found[1])
            if pair in seen:
                rows.add_problem(row, f"this pair stands in {seen[pair].where} too")
            seen[pair] = row
    rows.raise_if_wrong()
    listed = np.array(sorted(seen), dtype=np.int64).reshape(-1, 2)
    return listed[:, 0], listed[:, 1], tuple(rows.notes)


class _Reader:
    """Reads the sites of rows, and gathers what is wrong and doubtful."""

    def __init__(self, rows: Rows, *, crs: str | None, height: AntennaHeight | None, kind: str) -> None:
        self.rows = rows
        self.crs = crs
        self.height = height
        self.kind = kind
        self.sites: dict[str, _Site] = {}
        self.coarse: list[str] = []

    def site(self, row: Row) -> _Site | None:
        """The site of a row; None, and a problem, where it is wrong."""
        name = row.text("name")
        if not name or len(name) > LONGEST_NAME:
            what = (
                "there is no name"
                if not name
                else f"the name has {len(name)} letters, at most {LONGEST_NAME} are allowed"
            )
            self.rows.add_problem(row, what, f"each {self.kind} needs a name of its own")
            return None
        position = self._try(row, f"'{shown(name)}'", lambda: self._position(row, name))
        height = self._try(row, f"'{shown(name)}'", lambda: self._height(row))
        roof_m = self._try(row, f"'{shown(name)}', roof", lambda: _roof_m(row))
        if position is None or height is None or roof_m is None:
            return None
        site = _Site(name=name, where=row.where, position=position, height=height, roof_m=roof_m)
        self.sites.setdefault(name, site)
        return site

    def _try(self, row: Row, where: str, read: Callable[[], _T]) -> _T | None:
        try:
            return read()
        except FellspanError as error:
            self.rows.add_problem(row, f"{where}: {error.what}", *error.details)
        return None

    def _position(self, row: Row, name: str) -> Position:
        text, crs = row.text("position"), row.text("crs") or self.crs
        latitude, longitude = row.text("latitude"), row.text("longitude")
        easting, northing = row.text("easting"), row.text("northing")
        ways = [bool(text), bool(latitude or longitude), bool(easting or northing)]
        if sum(ways) != 1:
            said = "the position is given in two ways" if any(ways) else "no position is given"
            raise _Wrong(said, "give latitude and longitude, or position, or x and y with --crs")
        if ways[1]:
            if not (latitude and longitude):
                raise _Wrong(
                    f"{'longitude' if latitude else 'latitude'} is missing", "give latitude and longitude in every row"
                )
            if _PLAIN_DEGREES.fullmatch(latitude) and _PLAIN_DEGREES.fullmatch(longitude):
                numbers = float(latitude), float(longitude)
                if abs(numbers[0]) <= 90.0 and abs(numbers[1]) <= 180.0:
                    return Position(latitude_deg=numbers[0], longitude_deg=numbers[1])
            text, crs = f"{_with_point(latitude)}; {_with_point(longitude)}", None
        elif ways[2]:
            if not (easting and northing):
                raise _Wrong(f"{'y' if easting else 'x'} is missing", "give x and y in every row")
            if crs is None:
                raise _Wrong("x and y are given, and no system that they are in", "add --crs EPSG:32623 or the like")
            text = f"{_with_point(easting)}; {_with_point(northing)}"
        elif not row.text("crs"):
            crs = None
        parsed = parse_position(text, crs=crs)
        if parsed.caution:
            self.coarse.append(f"{self.kind} '{name}': {parsed.caution}")
        return parsed.position

    def _height(self, row: Row) -> AntennaHeight:
        text, metres, above = row.text("height"), row.text("height_m"), row.text("height_above")
        if text and metres:
            raise _Wrong("height and height_m are both given", "keep one of them")
        if not text and not metres:
            if self.height is None:
                raise _Wrong(
                    "there is no antenna height",
                    f"add a column height, as '6 m above ground', or give --{self.kind}-height for all that state none",
                )
            return self.height
        height = parse_antenna_height(text or f"{metres} m")
        if above:
            word = re.sub(r"^(above|over)\s+(the\s+)?", "", above.lower())
            if word not in _ABOVE:
                raise _Wrong(f"height_above '{shown(above)}' is not allowed", "allowed: ground, roof, sea")
            if height.reference not in (None, _ABOVE[word]):
                raise _Wrong(f"height '{shown(text)}' and height_above '{shown(above)}' do not agree")
            return (
                parse_antenna_height(f"{text or f'{metres} m'} above {_ABOVE[word]}")
                if height.reference is None
                else height
            )
        if height.reference is None:
            raise _Wrong(
                f"height '{shown(text or metres)}' does not say above what",
                "write '6 m above ground', 'above roof' or 'above sea', or add a column height_above",
            )
        return height

    def finish(self, sectors: tuple[SectorRow, ...]) -> PlaceFile:
        """The sites as columns, sorted by name, unless anything was wrong."""
        self.rows.raise_if_wrong()
        sites = [self.sites[name] for name in sorted(self.sites)]
        columns = SiteColumns(
            name=tuple(site.name for site in sites),
            latitude_deg=np.array([site.position.latitude_deg for site in sites]),
            longitude_deg=np.array([site.position.longitude_deg for site in sites]),
            height_m=np.array([site.height.height_m for site in sites]),
            height_reference=np.array(
                [HEIGHT_REFERENCES.index(site.height.reference or "ground") for site in sites], dtype=np.int8
            ),
            roof_m=np.array([site.roof_m for site in sites]),
        )
        return PlaceFile(
            sites=columns,
            sectors=sectors,
            rows=self.rows,
            where=np.array([site.where for site in sites], dtype=np.str_),
            notes=(*self.rows.notes, *self._coarse(), *_at_one_spot(sites, self.kind)),
        )

    def _coarse(self) -> Sequence[str]:
        left = len(self.coarse) - _FEW
        return (*self.coarse[:_FEW], *([f"{left} more {self.kind}s have coarse positions"] if left > 0 else ()))


class _Wrong(FellspanError, ValueError):
    """What is wrong with a value of a row; the reader adds file and row."""


def _with_point(number: str) -> str:
    return number.replace(",", ".") if _DECIMAL_COMMA.fullmatch(number) else number


def _roof_m(row: Row) -> float:
    text, metres = row.text("roof"), row.text("roof_m")
    if text and metres:
        raise _Wrong("roof and roof_m are both given", "keep one of them")
    if not text and not metres:
        return float("nan")
    return parse_length_m(text or f"{metres} m")


def _at_one_spot(sites: Sequence[_Site], kind: str) -> Sequence[str]:
    seen: dict[tuple[float, float], str] = {}
    same = [
        (site.name, first)
        for site in sites
        if (first := seen.setdefault((site.position.latitude_deg, site.position.longitude_deg), site.name)) != site.name
    ]
    if not same:
        return ()
    more = f", and {len(same) - 1} more" if len(same) > 1 else ""
    return (f"{kind}s '{same[0][1]}' and '{same[0][0]}' stand at the same position{more}",)
