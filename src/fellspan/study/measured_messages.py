"""What is wrong in a measured file as one error of few lines: the key or row, the value, what is allowed. Reads no file."""

import typing
from collections.abc import Mapping, Sequence
from typing import Any, NoReturn

from pydantic_core import ErrorDetails

from fellspan.errors import FellspanError, MeasuredFileError
from fellspan.study.measured_schema import EndTable, MeasuredFile, MeasuredTable, ReadingTable
from fellspan.study.messages import did_you_mean, shown
from fellspan.study.table import Table

_TABLES: Mapping[str, type[Table]] = {"measured": MeasuredTable, "a": EndTable, "b": EndTable, "reading": ReadingTable}
Path = tuple[int | str, ...]


def refuse(file: str, errors: Sequence[ErrorDetails], data: Mapping[str, Any], *, rows: Mapping[Path, int]) -> NoReturn:
    """Raise the first error, unknown keys first; `rows` says at which row of a table a value stood."""
    ordered = sorted(errors, key=lambda error: error["type"] != "extra_forbidden")
    error = ordered[0]
    unknown = error["type"] == "extra_forbidden"
    where = _place(error["loc"][:-1] if unknown else error["loc"], data, rows)
    what, help_text = _words(error)
    more = [_place(other["loc"], data, rows) for other in ordered[1:4]]
    raise MeasuredFileError(
        ", ".join(part for part in (file, where) if part) + f": {what}",
        *help_text,
        *([f"wrong too: {'; '.join(more)}"] if more else []),
    )


def _place(loc: Sequence[int | str], data: Mapping[str, Any], rows: Mapping[Path, int]) -> str:
    """'reading 3, level' or, of a table, 'row 7, level'."""
    for length in range(len(loc), 0, -1):
        row = rows.get(tuple(loc[:length]))
        if row is not None:
            keys = [str(key) for key in loc if isinstance(key, str) and key not in ("reading", "measured", "a", "b")]
            return ", ".join([f"row {row}", *keys])
    words: list[str] = []
    for index, key in enumerate(loc):
        if isinstance(key, int):
            if index and loc[index - 1] == "reading":
                words[-1] = f"reading {key + 1}{_of(data, key)}"
            else:
                words.append(f"number {key + 1}")
        else:
            words.append(key)
    return ", ".join(words)


def _of(data: Mapping[str, Any], index: int) -> str:
    """Which reading it is, in words of its own: its time where it has one."""
    rows = data.get("reading")
    row = rows[index] if isinstance(rows, list) and index < len(rows) else None
    time = row.get("time") if isinstance(row, Mapping) else None
    return f" ({time})" if isinstance(time, str) and len(time) < 12 else ""


def _words(error: ErrorDetails) -> tuple[str, tuple[str, ...]]:
    """What is wrong, and at most two lines of help."""
    loc, kind, value = error["loc"], error["type"], shown(error["input"])
    table = _TABLES.get(str(loc[0])) if loc else None
    if kind == "extra_forbidden":
        keys = list((table if len(loc) > 1 and table is not None else MeasuredFile).model_fields)
        noun = "key" if len(loc) > 1 else "table"
        return f"unknown {noun} '{loc[-1]}'", (*did_you_mean(str(loc[-1]), keys), f"allowed here: {', '.join(keys)}")
    field = (
        table.model_fields.get(str(next((key for key in reversed(loc) if isinstance(key, str)), ""))) if table else None
    )
    example = f"for instance {field.examples[0]!r}".replace("'", '"') if field is not None and field.examples else ""
    help_text = tuple(text for text in (field.description if field is not None else None, example) if text)
    if kind == "missing":
        return f"{loc[-1]} is missing", help_text
    if kind == "literal_error":
        allowed = [str(one) for one in _choices(field.annotation if field is not None else None)]
        return f"{value} is not allowed", (
            *did_you_mean(str(error["input"]), allowed),
            f"allowed: {', '.join(allowed)}",
        )
    if kind == "value_error":
        cause = error["ctx"]["error"]
        if isinstance(cause, FellspanError):
            return cause.what, cause.details[:2]
        return str(cause), ()
    if kind in {"model_type", "model_attributes_type", "tuple_type"}:
        return f"{value} stands where a table or a list belongs", help_text
    return f"{value}: {error['msg'].replace('Input should', 'should')}", help_text


def _choices(annotation: object) -> tuple[object, ...]:
    if typing.get_origin(annotation) is typing.Literal:
        return typing.get_args(annotation)
    found: tuple[object, ...] = ()
    for part in typing.get_args(annotation):
        found = found or _choices(part)
    return found
