"""Reads the CSV tables and checks the numbers that people write by hand; every complaint names file, row and column.

Knows nothing of what the rows mean.
"""

import csv
import difflib
import io
import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from fellspan.errors import TerrainError
from fellspan.vocabulary import COVER_KINDS, CoverKind

MAX_FILE_BYTES = 200_000_000
_MAX_FIELD = 20_000_000


def shown(value: object, limit: int = 40) -> str:
    """A value as a message may quote it: one line, printable, short."""
    text = "".join(letter if letter.isprintable() else "?" for letter in str(value))
    return text if len(text) <= limit else text[: limit - 3] + "..."


def closest(word: str, allowed: Sequence[str]) -> str:
    """'did you mean ...' or the list of what is allowed."""
    near = difflib.get_close_matches(word.lower(), allowed, n=1, cutoff=0.6)
    return f"did you mean '{near[0]}'?" if near else "allowed: " + ", ".join(allowed)


def read_text(path: Path, error: type[TerrainError], what: str) -> str:
    """The text of a file (UTF-8, with or without a byte order mark)."""
    try:
        size = path.stat().st_size
        if size > MAX_FILE_BYTES:
            raise error(
                f"{what} file '{path.name}' has {size / 1e6:.0f} MB; at most {MAX_FILE_BYTES / 1e6:.0f} MB can be read",
                "cut it to the area of the links",
            )
        data = path.read_bytes()
    except OSError as problem:
        raise error(f"{what} file '{path}' cannot be read: {problem.strerror}") from None
    if not data.strip():
        raise error(f"{what} file '{path.name}' is empty")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as problem:
        line = data.count(b"\n", 0, problem.start) + 1
        raise error(f"{what} file '{path.name}', line {line}: not UTF-8 text", "save it as UTF-8") from None
    if "\0" in text:
        raise error(f"{what} file '{path.name}' is not a text file", "give CSV or GeoJSON")
    return text


@dataclass(frozen=True, slots=True, kw_only=True)
class Fields:
    """The named values of one row or feature, with what a message needs to point at it."""

    where: str
    values: dict[str, object]
    error: type[TerrainError]

    def fail(self, what: str, *details: str) -> TerrainError:
        """The error, with file and row in front."""
        return self.error(f"{self.where}: {what}", *details)

    @property
    def file(self) -> str:
        """The file part of `where`."""
        return self.where.rsplit(", ", 1)[0]

    def text(self, name: str) -> str:
        """The text of a column, '' where blank; control characters become blanks, so that no terminal obeys them."""
        value = self.values.get(name)
        if value is None:
            return ""
        if isinstance(value, list | dict | bool):
            raise self.fail(f"{name} '{shown(value)}' is not a text")
        text = str(value)
        return (text if text.isprintable() else "".join(c if c.isprintable() else " " for c in text)).strip()

    def number(self, name: str, low: float, high: float) -> float | None:
        """A finite number in low..high, None where blank."""
        text = self.text(name)
        return None if text == "" else self._number(name, text, low, high)

    def numbers(self, name: str, low: float, high: float) -> tuple[float, ...] | None:
        """Several numbers: a JSON list, or a text with ';' or blanks between them; None where blank."""
        value = self.values.get(name)
        parts = [str(item) for item in value] if isinstance(value, list) else self.text(name).replace(";", " ").split()
        return tuple(self._number(name, part, low, high) for part in parts) or None

    def kind(self, default: CoverKind) -> CoverKind:
        """The kind of cover."""
        text = self.text("kind").lower()
        if not text:
            return default
        for kind in COVER_KINDS[1:]:
            if text == kind:
                return kind
        raise self.fail(f"kind '{shown(text)}' is unknown", closest(text, COVER_KINDS[1:]))

    def _number(self, name: str, text: str, low: float, high: float) -> float:
        try:
            number = float(text)
        except ValueError:
            hint = ("write the decimals with a point",) if "," in text else ("give a plain number, without a unit",)
            raise self.fail(f"{name} '{shown(text)}' is not a number", *hint) from None
        if not math.isfinite(number) or not low <= number <= high:
            raise self.fail(f"{name} {shown(text)} is outside {low:g} to {high:g}")
        return number


def read_rows(path: Path, columns: Sequence[str], error: type[TerrainError], what: str) -> Iterator[Fields]:
    """The rows of a CSV file with a header; blank rows and rows that start with '#' are left out.

    The separator is a comma, or a semicolon where the header has no comma. Unknown and repeated columns are refused.
    """
    text = read_text(path, error, what)
    head = next((line for line in text.splitlines() if line.strip() and not line.lstrip().startswith("#")), "")
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=";" if ";" in head and "," not in head else ",")
    previous_limit = csv.field_size_limit(_MAX_FIELD)
    try:
        header: list[str] | None = None
        for row in reader:
            if not any(cell.strip() for cell in row) or row[0].lstrip().startswith("#"):
                continue
            where = f"{what} file '{path.name}', row {reader.line_num}"
            if header is None:
                header = [cell.strip().lower() for cell in row]
                _check_header(header, columns, error, where)
                continue
            if len(row) > len(header):
                extra = shown(row[len(header)])
                raise error(f"{where}: {len(row)} values for {len(header)} columns, first too many: '{extra}'")
            yield Fields(where=where, values=dict(zip(header, row, strict=False)), error=error)
    except csv.Error as problem:
        raise error(f"{what} file '{path.name}', row {reader.line_num}: {problem}") from None
    finally:
        csv.field_size_limit(previous_limit)


def _check_header(header: list[str], columns: Sequence[str], error: type[TerrainError], where: str) -> None:
    for name in header:
        if name not in columns:
            raise error(f"{where}: unknown column '{shown(name)}'", closest(name, columns))
        if header.count(name) > 1:
            raise error(f"{where}: column '{name}' stands there twice")
