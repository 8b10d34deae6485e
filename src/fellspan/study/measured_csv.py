"""A measured file as a table, one row a measurement: end, what, value, and for levels chain, time, water, note.

Turns rows into the tables of the TOML form, and remembers the row of each; judges no value.
"""

import csv
import io
from typing import Any, Final

from fellspan.errors import MeasuredFileError
from fellspan.study.measured_schema import EndTable, MeasuredTable
from fellspan.study.messages import did_you_mean, shown

COLUMNS: Final = ("end", "what", "value", "chain", "date", "time", "water", "note")
_NUMBERS: Final = ("bearing", "tilt")
_OF_READING: Final = ("chain", "date", "time", "water", "note")


def tables_of_csv(text: str, file: str) -> tuple[dict[str, Any], dict[tuple[int | str, ...], int]]:
    """Tables as a TOML file would hold them, and the row, counted from the head, at which each value stood."""
    try:
        rows = list(csv.reader(io.StringIO(text), strict=True))
    except csv.Error as error:
        raise MeasuredFileError(f"{file}: not a table: {error}") from None
    rows = [(number, row) for number, row in enumerate(rows, start=1) if any(cell.strip() for cell in row)]  # type: ignore[misc]
    if not rows:
        raise MeasuredFileError(f"{file}: the measured file is empty", f"its columns are: {', '.join(COLUMNS)}")
    heads = [cell.strip().lower() for cell in rows[0][1]]
    for head in heads:
        if head not in COLUMNS:
            raise MeasuredFileError(
                f"{file}, row 1: unknown column {shown(head)}",
                *did_you_mean(head, COLUMNS),
                f"columns are: {', '.join(COLUMNS)}",
            )
    for head in ("what", "value"):
        if head not in heads:
            raise MeasuredFileError(f"{file}, row 1: column '{head}' is missing", f"columns are: {', '.join(COLUMNS)}")
    data: dict[str, Any] = {}
    places: dict[tuple[int | str, ...], int] = {}
    for number, cells in rows[1:]:
        if len(cells) > len(heads):
            raise MeasuredFileError(
                f"{file}, row {number}: {len(cells)} cells under {len(heads)} heads",
                'a text with a comma stands in "quotes"',
            )
        _take(
            {head: cell.strip() for head, cell in zip(heads, cells, strict=False)}, int(str(number)), file, data, places
        )
    return data, places


def _take(
    row: dict[str, str],
    number: int,
    file: str,
    data: dict[str, Any],
    places: dict[tuple[int | str, ...], int],
) -> None:
    what, end, value = row.get("what", "").lower(), row.get("end", "").lower(), row.get("value", "")
    if end not in ("", "a", "b"):
        raise MeasuredFileError(f"{file}, row {number}: end {shown(row['end'])} is neither A nor B")
    known = list((EndTable if end else MeasuredTable).model_fields)
    if what not in known:
        whose = f"end {end.upper()}" if end else "the link as a whole"
        raise MeasuredFileError(
            f"{file}, row {number}: {shown(what)} is nothing to measure of {whose}",
            *did_you_mean(what, known),
            f"allowed: {', '.join(known)}",
        )
    if not value:
        return
    if end and what == "level":
        readings = data.setdefault("reading", [])
        places[("reading", len(readings))] = number
        readings.append({"at": end, "level": value, **{key: row[key] for key in _OF_READING if row.get(key)}})
        return
    table = end or "measured"
    if what in data.setdefault(table, {}):
        raise MeasuredFileError(f"{file}, row {number}: {what} stands twice, also in row {places[(table, what)]}")
    places[(table, what)] = number
    data[table][what] = _number(value) if what in _NUMBERS else value


def _number(value: str) -> object:
    try:
        return float(value)
    except ValueError:
        return value
