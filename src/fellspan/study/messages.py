"""Sentences about what is wrong in a study file: where, the value, what is allowed, the likely meant key.

Turns pydantic's findings into a StudyError of at most four lines. Reads no file.
"""

import difflib
import typing
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from pydantic import BaseModel
from pydantic_core import ErrorDetails

from fellspan.errors import FellspanError, StudyError
from fellspan.study.schema import StudyFile

_LISTS = ("site", "radio", "antenna", "link")
_WIDEST_VALUE = 60
_WIDEST_LIST = 150


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing that is wrong: where in the file, what, and lines of help."""

    where: str
    what: str
    details: tuple[str, ...] = ()


def raise_problems(file_name: str, problems: Sequence[Problem]) -> typing.NoReturn:
    """Raise the first problem in full, with the places of the others."""
    first, others = problems[0], problems[1:]
    what = f"{file_name}, {first.where}: {first.what}" if first.where else f"{file_name}: {first.what}"
    more = (f"wrong too: {_places(others)}",) if others else ()
    raise StudyError(what, *first.details[: 3 - len(more)], *more)


def _places(problems: Sequence[Problem]) -> str:
    """Where problems stand, each place once, as many as a line holds; one without a place is told by what it is."""
    places = list(dict.fromkeys(problem.where or problem.what for problem in problems))
    listed = places[:1]
    for place_of in places[1:]:
        if len("; ".join((*listed, place_of))) > _WIDEST_LIST:
            break
        listed.append(place_of)
    left = len(places) - len(listed)
    return "; ".join(listed) + (f"; and {left} more" if left else "")


def problems_of(errors: Iterable[ErrorDetails], data: Mapping[str, Any]) -> list[Problem]:
    """Pydantic's findings as problems; unknown keys first, since a mistyped key also shows as a missing one."""
    listed = list(errors)
    # A list with a wrong row is also reported as too short; the row says more.
    telling = [error for error in listed if error["type"] != "too_short" or not _has_inner(error, listed)]
    ordered = sorted(telling, key=lambda error: error["type"] != "extra_forbidden")
    return [_problem(error, data) for error in ordered]


def _has_inner(outer: ErrorDetails, errors: Iterable[ErrorDetails]) -> bool:
    depth = len(outer["loc"])
    return any(len(error["loc"]) > depth and error["loc"][:depth] == outer["loc"] for error in errors)


def did_you_mean(word: str, choices: Iterable[str]) -> tuple[str, ...]:
    """A line that suggests the nearest choice, or nothing."""
    by_folded = {choice.casefold(): choice for choice in choices}
    near = difflib.get_close_matches(word.casefold(), by_folded, n=1, cutoff=0.5)
    return (f"did you mean '{by_folded[near[0]]}'?",) if near else ()


def shown(value: object) -> str:
    """A value as it would stand in the file, cut where it is long."""
    if isinstance(value, Mapping):
        return "a table"
    if isinstance(value, list | tuple):
        return "a list"
    if isinstance(value, bool):
        return str(value).lower()
    text = f"'{value}'" if isinstance(value, str) else str(value)
    return text if len(text) <= _WIDEST_VALUE else text[: _WIDEST_VALUE - 3] + "..."


def place(loc: Sequence[int | str], data: Mapping[str, Any]) -> str:
    """A path of keys for people: "site 'North Light', height" or "terrain.ground, number 2, path"."""
    if len(loc) > 1 and loc[0] in _LISTS and isinstance(loc[1], int):
        return ", ".join([_row(str(loc[0]), loc[1], data), *_within(loc[2:], _row_of(str(loc[0]), loc[1], data))])
    words, previous = "", ""
    for key in loc:
        if isinstance(key, int):
            words += f", number {key + 1}" if key or _has_many(previous, data) else ""
        else:
            words += f", {key}" if previous == "#" else f".{key}" if words else key
        previous = "#" if isinstance(key, int) else key
    return words


def _within(loc: Sequence[int | str], row: object) -> Iterator[str]:
    """Keys inside a row; of a list in it, the name of the entry or its number: "modulation '64-QAM', threshold"."""
    key = ""
    for step in loc:
        if isinstance(step, str):
            if key:
                yield key
            key, row = step, row.get(step) if isinstance(row, Mapping) else None
            continue
        row = row[step] if isinstance(row, list) and step < len(row) else None
        name = row.get("name") if isinstance(row, Mapping) else None
        yield f"{key} {shown(name)}" if isinstance(name, str) and name else f"{key}, number {step + 1}"
        key = ""
    if key:
        yield key


def _row_of(table: str, index: int, data: Mapping[str, Any]) -> object:
    rows = data.get(table)
    return rows[index] if isinstance(rows, list) and index < len(rows) else None


def _row(table: str, index: int, data: Mapping[str, Any]) -> str:
    row = _row_of(table, index, data)
    name = row.get("name") if isinstance(row, Mapping) else None
    return f"{table} {shown(name)}" if isinstance(name, str) and name else f"[[{table}]] number {index + 1}"


def _has_many(key: str, data: Mapping[str, Any]) -> bool:
    terrain = data.get("terrain")
    value = terrain.get(key) if isinstance(terrain, Mapping) else None
    return isinstance(value, list) and len(value) > 1


def _problem(error: ErrorDetails, data: Mapping[str, Any]) -> Problem:
    loc, kind, value = error["loc"], error["type"], shown(error["input"])
    where = place(loc, data)
    if kind == "extra_forbidden":
        return _unknown_key(loc, data)
    if kind == "missing":
        return _missing(loc, data)
    if kind == "literal_error":
        allowed = [str(choice) for choice in typing.get_args(_field_type(loc)) if isinstance(choice, str)]
        return Problem(
            where,
            f"{value} is not allowed",
            (*did_you_mean(str(error["input"]), allowed), f"allowed: {', '.join(allowed)}"),
        )
    if kind == "value_error":
        cause = error["ctx"]["error"]
        if isinstance(cause, FellspanError):
            return Problem(where, cause.what, cause.details)
        return Problem(where, str(cause))
    if kind == "too_short":
        needed, found = error["ctx"]["min_length"], error["ctx"]["actual_length"]
        return Problem(where, f"{needed} or more are needed, and there {'is' if found == 1 else 'are'} {found}")
    if kind == "string_pattern_mismatch":
        return Problem(where, f"{value} has the wrong form", _help(loc))
    if kind == "tuple_type" and len(loc) == 1:
        return Problem(where, f"{value} stands where tables belong", (f"write each one under a heading [[{loc[0]}]]",))
    if kind in {"model_type", "model_attributes_type", "dataclass_type"}:
        return Problem(
            where,
            f"{value} stands where a table belongs",
            (f"write it under a heading [{loc[0]}]",) if len(loc) == 1 else (),
        )
    return Problem(where, f"{value}: {error['msg'].replace('Input should', 'should')}", _help(loc))


def _unknown_key(loc: Sequence[int | str], data: Mapping[str, Any]) -> Problem:
    key, table = str(loc[-1]), _table_at(loc[:-1])
    keys = list(table.model_fields) if table is not None else []
    noun = "table" if len(loc) == 1 else "key"
    return Problem(
        place(loc[:-1], data),
        f"unknown {noun} '{key}'",
        (*did_you_mean(key, keys), f"{noun}s allowed here: {', '.join(keys)}"),
    )


def _missing(loc: Sequence[int | str], data: Mapping[str, Any]) -> Problem:
    key = str(loc[-1])
    if len(loc) == 1:
        heading = f"[[{key}]]" if key in _LISTS else f"[{key}]"
        return Problem("", f"there is no {heading} table", ("fellspan init writes a starter that shows every table",))
    return Problem(place(loc[:-1], data), f"{key} is missing", _help(loc))


def _help(loc: Sequence[int | str]) -> tuple[str, ...]:
    """The key's line of help, with an example."""
    table = _table_at(loc[:-1])
    field = table.model_fields.get(str(loc[-1])) if table is not None else None
    if field is None or not field.description:
        return ()
    examples = [f'"{item}"' if isinstance(item, str) else str(item) for item in field.examples or ()]
    example = f" For instance: {loc[-1]} = {examples[0]}" if examples else ""
    return (f"{field.description}{example}",)


def _table_at(loc: Sequence[int | str]) -> type[BaseModel] | None:
    model: type[BaseModel] | None = StudyFile
    for key in loc:
        if isinstance(key, str) and model is not None:
            field = model.model_fields.get(key)
            model = _model_within(field.annotation) if field is not None else None
    return model


def _model_within(annotation: object) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    return next((found for part in typing.get_args(annotation) if (found := _model_within(part)) is not None), None)


def _field_type(loc: Sequence[int | str]) -> object:
    """The Literal behind a key (without its None)."""
    table = _table_at(loc[:-1])
    annotation = table.model_fields[str(loc[-1])].annotation if table is not None else None
    if typing.get_origin(annotation) is typing.Literal:
        return annotation
    return next((part for part in typing.get_args(annotation) if typing.get_origin(part) is typing.Literal), None)
