"""Reads files of hubs, places or pairs into rows of named texts: CSV, GeoJSON or KML; complaints name file and row.

Knows how columns are spelled, and nothing of what they mean.
"""

import csv
import difflib
import io
import json
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Final, NoReturn

from fellspan.errors import SitesFileError
from fellspan.terrain.tables import shown

MAX_FILE_BYTES: Final = 200_000_000
MAX_FIELD: Final = 1_000_000
_GEOJSON: Final = (".geojson", ".json")
_WIDEST_LIST: Final = 60
_TOLD: Final = 3
"""Rows whose problems a message tells; it has four lines."""
_NUMBERS: Final = (
    "height", "height_m", "roof", "roof_m", "gain", "azimuth_width", "elevation_width", "front_to_back", "bearing", "downtilt",
)  # fmt: skip
_COMMA: Final = re.compile(r"(?<![\d.,])(\d+),(\d{1,2}|\d{4,})(?![\d.,])")
"""A decimal comma; with three digits behind it, it may part thousands, and stays for the reader of quantities to refuse."""
_SHORT, _ALIKE = 3, 0.7
"""Names no longer than this are not guessed at; so alike is a slip (our own choice, no source)."""
OF_GEOMETRY: Final = ("latitude", "longitude")
POSITION: Final = (*OF_GEOMETRY, "position", "easting", "northing", "crs")
_OTHER_ENCODINGS: Final = ((b"\xff\xfe", "UTF-16"), (b"\xfe\xff", "UTF-16"))
_NOT_TEXT: Final = ((b"PK\x03\x04", "a ZIP archive (XLSX, KMZ)"), (b"\x1f\x8b", "a gzip archive"), (b"%PDF", "a PDF"))


@dataclass(frozen=True, slots=True)
class Row:
    """One row: where it stands, as a message names it, and its texts by column; a blank one is left out."""

    where: str
    values: Mapping[str, str]

    def text(self, column: str) -> str:
        """The text of a column, '' where there is none."""
        return self.values.get(column, "")


@dataclass(slots=True)
class Rows:
    """The rows of a file, with what is wrong or doubtful so far; `fail` stops at once, `raise_if_wrong` at the end."""

    file: str
    rows: list[Row] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)
    wrong: list[tuple[str, SitesFileError]] = field(default_factory=list)

    def add_problem(self, row: Row, what: str, *details: str) -> None:
        """Keep what is wrong with a row, so that one reading tells how many rows are wrong."""
        self.wrong.append((row.where, SitesFileError(f"{self.file}, {row.where}: {what}", *details[:2])))

    def raise_if_wrong(self) -> None:
        """Raise what is wrong in the first three rows that are, with the places of the others."""
        if not self.wrong:
            return
        of_row: dict[str, SitesFileError] = {}
        for where, error in self.wrong:
            of_row.setdefault(where, error)
        first, *others = of_row.values()
        if not others:
            raise first
        told = [error.what.removeprefix(f"{self.file}, ") for error in others[: _TOLD - 1]]
        if len(others) == 1:
            raise SitesFileError(first.what, *first.details[:1], *told, *others[0].details[:1])
        if len(others) < _TOLD:
            raise SitesFileError(first.what, *first.details[:1], *told)
        alike = {error.details[:1] for error in (first, *others[: _TOLD - 1])}
        # What mends them all is worth more than a third row that says the same.
        told = [*first.details[:1], *told[:1]] if len(alike) == 1 and first.details else told
        left = list(of_row)[_TOLD - (len(alike) == 1 and bool(first.details)) :]
        few = left[:1]
        for where in left[1:]:
            if len(", ".join((*few, where))) > _WIDEST_LIST:
                break
            few.append(where)
        more = len(left) - len(few)
        raise SitesFileError(first.what, *told, f"wrong too: {', '.join(few)}" + (f" and {more} more" if more else ""))


def read_place_rows(
    path: Path, columns: Sequence[str], aliases: Mapping[str, str], *, what: str, table_only: bool = False
) -> Rows:
    """The rows of a file.

    `columns` are the names that mean something, `aliases` other spellings of them; a further column is left out with a note,
    or refused where it looks like one of them mistyped. `what` is what the file holds, for messages.

    Raises
    ------
    SitesFileError
        The file cannot be read, is of no known kind, or holds no row.
    """
    data = _bytes_of(path, what)
    suffix = path.suffix.lower()
    if suffix == ".kmz":
        raise SitesFileError(f"{path.name} is a zipped KML file", "unzip it and name the .kml file inside")
    if table_only and suffix in (*_GEOJSON, ".kml"):
        raise SitesFileError(f"{path.name}: {what} are read from CSV, not from {suffix}")
    text = _text_of(data, path)
    rows = Rows(file=path.name)
    reader = _Columns(rows, columns, aliases)
    if suffix == ".kml" or (suffix not in _GEOJSON and text.lstrip()[:200].startswith("<")):
        from fellspan.study.place_kml import kml_records

        _take(reader, kml_records(text, path.name))
    elif suffix in _GEOJSON or text.lstrip().startswith("{"):
        _take(reader, _features(text, path.name))
    else:
        _read_csv(reader, text, path.name)
    reader.tell_unused()
    if not rows.rows and not rows.wrong:
        raise SitesFileError(f"{path.name} holds no {what}", "one row, feature or placemark stands for each")
    return rows


def _bytes_of(path: Path, what: str) -> bytes:
    if path.is_dir():
        raise SitesFileError(f"'{path}' is a folder, not a file of {what}", "name a CSV, GeoJSON or KML file")
    try:
        size = path.stat().st_size
        if size > MAX_FILE_BYTES:
            raise SitesFileError(
                f"{path.name} has {size / 1e6:.0f} MB; at most {MAX_FILE_BYTES / 1e6:.0f} MB can be read",
                "cut it into parts, and run each with its own --out",
            )
        data = path.read_bytes()
    except FileNotFoundError:
        raise SitesFileError(f"there is no file of {what} '{path}'", f"looked for at {path.absolute()}") from None
    except OSError as problem:
        raise SitesFileError(f"'{path}' cannot be read: {problem.strerror}") from None
    if not data.strip():
        raise SitesFileError(f"{path.name} is empty", f"it should hold {what}: CSV with a header, GeoJSON or KML")
    return data


def _text_of(data: bytes, path: Path) -> str:
    for mark, name in _NOT_TEXT:
        if data.startswith(mark):
            raise SitesFileError(f"{path.name} is {name}, not a text file", "save it as CSV in UTF-8, GeoJSON or KML")
    for mark, name in _OTHER_ENCODINGS:
        if data.startswith(mark):
            raise SitesFileError(f"{path.name} is text in {name}", "save it as UTF-8")
    if b"\0" in data:
        raise SitesFileError(f"{path.name} is not a text file", "give CSV in UTF-8, GeoJSON or KML")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as problem:
        line = data.count(b"\n", 0, problem.start) + 1
        around = data[max(0, problem.start - 12) : problem.start + 12].decode("cp1252", "replace")
        raise SitesFileError(
            f"{path.name}, row {line}: not UTF-8 text, at '{shown(around)}'",
            "spreadsheets often write Windows-1252: save it as 'CSV UTF-8' instead",
        ) from None
    return text


def column_key(name: str) -> str:
    """A column as it is compared: lower case, words joined by '_'."""
    return re.sub(r"[\s\-.]+", "_", name.strip().lower()).strip("_")


def plain(value: str) -> str:
    """A text without control characters and outer blanks, inner blanks single."""
    text = value if value.isprintable() else "".join(c if c.isprintable() else " " for c in value)
    return " ".join(text.split())


class _Columns:
    """Turns columns as a file spells them into the known ones, and remembers those that are left out."""

    def __init__(self, rows: Rows, columns: Sequence[str], aliases: Mapping[str, str]) -> None:
        self.rows = rows
        self.columns = columns
        self.aliases = aliases
        self.unused: dict[str, None] = {}

    def known(self, spelled: str) -> str | None:
        """The column that a spelling means; None for one that is left out."""
        key = column_key(spelled)
        key = self.aliases.get(key, key)
        if key in self.columns:
            return key
        if key and key not in self.unused:
            near = _mistyped(key, (*self.columns, *self.aliases))
            if near and key == "bearing":
                remedy = "only hubs have one: are --hubs and --places the wrong way round?"
                raise SitesFileError(f"{self.rows.file}: unknown column '{shown(spelled)}'", remedy)
            if near:
                raise SitesFileError(f"{self.rows.file}: unknown column '{shown(spelled)}'", f"did you mean '{near}'?")
            self.unused[key] = None
        return None

    def tell_unused(self) -> None:
        """A note on what was left out."""
        if self.unused:
            names = [shown(name, 30) for name in self.unused]
            listed = ", ".join(names[:5]) + (f" and {len(names) - 5} more" if names[5:] else "")
            self.rows.notes.append(f"{self.rows.file}: columns not used: {listed}")


def _mistyped(key: str, known: Sequence[str]) -> str:
    """The name that a key is a slip of; '' where it is more likely a word of its own, or of another language."""
    if len(key) <= _SHORT:
        return ""
    near = difflib.get_close_matches(key, [name for name in known if len(name) > _SHORT], n=1, cutoff=_ALIKE)
    return near[0] if near and abs(len(key) - len(near[0])) <= 2 else ""


def _take(reader: _Columns, records: Iterable[tuple[str, Mapping[str, str]]]) -> None:
    for where, spelled in records:
        values: dict[str, str] = {}
        for name, value in spelled.items():
            column = reader.known(name)
            if column in POSITION and name not in OF_GEOMETRY:
                continue  # a copy of the position among the properties; the geometry counts
            text = plain(value)
            if column is not None and text and values.setdefault(column, text) != text:
                reader.rows.add_problem(
                    Row(where, {}), f"{column} is given twice: '{shown(values[column])}', '{shown(text)}'"
                )
        reader.rows.rows.append(Row(where, values))


def _read_csv(reader: _Columns, text: str, file: str) -> None:
    head = next((line for line in text.splitlines() if line.strip() and not line.lstrip().startswith("#")), "")
    mark = next((mark for mark in (",", ";", "\t") if mark in head), ",")
    table = csv.reader(io.StringIO(text, newline=""), delimiter=mark)
    previous_limit = csv.field_size_limit(MAX_FIELD)
    header: list[str | None] | None = None
    try:
        for cells in table:
            if not any(cell.strip() for cell in cells) or cells[0].lstrip().startswith("#"):
                continue
            where = f"row {table.line_num}"
            if header is None:
                header = _header(reader, cells, file)
                continue
            row = Row(where, {})
            if len(cells) > len(header) and any(cell.strip() for cell in cells[len(header) :]):
                extra = shown(cells[len(header)])
                remedy = "put a text that holds the separator in double quotes; or does the first row lack a name?"
                if mark == "," and any(map(_is_cut_number, cells, cells[1:])):
                    remedy = "a decimal comma? Write numbers with a point, or part the columns by semicolons"
                reader.rows.add_problem(
                    row, f"{len(cells)} values for {len(header)} columns, first too many: '{extra}'", remedy
                )
                continue
            pairs = ((name, plain(cell)) for name, cell in zip(header, cells, strict=False) if name is not None)
            values = {name: cell for name, cell in pairs if cell}
            if mark == ";":
                # Spreadsheets that part cells by semicolons do so because their numbers have commas.
                values |= {name: _COMMA.sub(r"\1.\2", values[name]) for name in _NUMBERS if name in values}
            reader.rows.rows.append(Row(where, values))
    except csv.Error as problem:
        raise SitesFileError(f"{file}, row {table.line_num}: {problem}", "is a double quote left open?") from None
    finally:
        csv.field_size_limit(previous_limit)


def _is_cut_number(whole: str, decimals: str) -> bool:
    """Whether two cells look like degrees or metres that a decimal comma has cut in two."""
    return bool(re.fullmatch(r"[+-]?\d{1,3}", whole.strip()) and re.fullmatch(r"\d{3,}", decimals.strip()))


def _header(reader: _Columns, cells: Sequence[str], file: str) -> list[str | None]:
    header = [reader.known(cell) for cell in cells]
    for name in header:
        if name is not None and header.count(name) > 1:
            raise SitesFileError(f"{file}: column '{name}' stands there twice", "keep one of them")
    if not any(header):
        raise SitesFileError(
            f"{file}: the first row names no column that is known: '{shown(', '.join(cells))}'",
            f"columns: {', '.join(reader.columns)}",
        )
    return header


def _features(text: str, file: str) -> Iterable[tuple[str, Mapping[str, str]]]:
    try:
        data = json.loads(text, parse_int=str, parse_float=str, parse_constant=str)
    except json.JSONDecodeError as problem:
        raise SitesFileError(f"{file}, line {problem.lineno}: not JSON: {problem.msg}") from None
    except RecursionError:
        raise SitesFileError(f"{file}: not GeoJSON: brackets are nested too deep") from None
    listed = data.get("features") if isinstance(data, dict) else None
    if not isinstance(listed, list):
        raise SitesFileError(f"{file}: not a GeoJSON FeatureCollection", "it needs a list 'features' of points")
    crs = data.get("crs")
    if crs is not None and not re.search(r"CRS84|EPSG:+4326", json.dumps(crs), re.IGNORECASE):
        raise SitesFileError(
            f"{file}: its coordinates are in '{shown(json.dumps(crs))}'",
            "GeoJSON is WGS 84 longitude and latitude: convert it",
        )
    for number, feature in enumerate(listed, start=1):
        yield f"feature {number}", _feature(feature, f"{file}, feature {number}")


def _feature(feature: object, where: str) -> dict[str, str]:
    geometry = feature.get("geometry") if isinstance(feature, dict) else None
    kind = geometry.get("type") if isinstance(geometry, dict) else None
    place = geometry.get("coordinates") if isinstance(geometry, dict) else None
    if kind == "MultiPoint" and isinstance(place, list) and len(place) == 1:
        kind, place = "Point", place[0]
    if not isinstance(feature, dict) or kind != "Point":
        raise SitesFileError(f"{where}: a {shown(kind)} stands where a Point belongs")
    if not isinstance(place, list) or len(place) < 2 or not all(isinstance(value, str) for value in place[:2]):
        _no_numbers(where, place)
    given = feature.get("properties")
    values: dict[str, str] = {}
    for name, value in (given if isinstance(given, dict) else {}).items():
        if isinstance(value, list | dict | bool) and column_key(str(name)) in ("name", "height", "roof"):
            raise SitesFileError(f"{where}: {shown(name)} '{shown(value)}' is not a text")
        if isinstance(value, str):
            values[str(name)] = value
    return {**values, "longitude": place[0], "latitude": place[1]}


def _no_numbers(where: str, place: object) -> NoReturn:
    raise SitesFileError(f"{where}: '{shown(place)}' is no pair of longitude and latitude")
