"""Reads a file of power rules (TOML) into rows; every error names the file and the row. Judges no radio.

The format is described in docs/rules.md; the rows that come with Fellspan and a user's own are read alike.
"""

import math
import re
import tomllib
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any, Final, TypeVar, get_args

from fellspan.errors import QuantityError, RuleError
from fellspan.links.rule_types import (
    BackOff,
    Density,
    EirpFall,
    MeasuredAt,
    PowerRule,
    RulePlace,
    RuleStatus,
    RuleUse,
)
from fellspan.quantities import parse_gain_dbi, parse_power_dbm

_T = TypeVar("_T")

_ID: Final = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]{0,59}")
_SEEN: Final = re.compile(r"(?:19|20)[0-9]{2}(?:-[0-9]{2}(?:-[0-9]{2})?)?(?: to (?:19|20)[0-9]{2})?")
_WIDTH: Final = re.compile(r"([0-9]+(?:\.[0-9]+)?)\s*(Hz|kHz|MHz|GHz)")
_HERTZ: Final = {"Hz": 1.0, "kHz": 1e3, "MHz": 1e6, "GHz": 1e9}
_NOT_SEEN: Final = "not seen"
_LONGEST_FILE: Final = 2_000_000
_LONGEST_TEXT: Final = 500

_REQUIRED: Final = ("id", "authority", "region", "title", "band", "citation", "seen", "status")
_OPTIONAL: Final = (
    "use",
    "place",
    "conditions",
    "eirp_max",
    "peak_eirp_max",
    "conducted_max",
    "density",
    "back_off",
    "eirp_fall",
    "gain_min",
)
_BACK_OFF: Final = (("above", "lower_by_db", "for_each_db"), ("density",))
_EIRP_FALL: Final = (("below", "lower_by_db", "for_each_db", "floor"), ("peak_floor",))
_DENSITY: Final = (("power", "per", "of"), ())


class _Wrong(Exception):
    """A value that cannot be used: what is wrong, then the remedy."""

    def __init__(self, what: str, remedy: str) -> None:
        super().__init__(what)
        self.what, self.remedy = what, remedy


def read_rules(path: Path) -> tuple[PowerRule, ...]:
    """The rows of a rule file.

    Raises
    ------
    RuleError
        The file cannot be read, is no TOML, or a row has an unknown, missing or wrong value, or an id that stands twice.
    """
    return rules_of(_text_of(path), name=path.name)


def rules_of(text: str, *, name: str) -> tuple[PowerRule, ...]:
    """The rows of a text in the format of a rule file; `name` is what errors call it; raises as `read_rules`."""
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise RuleError(
            f"{name}: not valid TOML: {error}", 'each row starts with [[rule]], a value stands as key = "text"'
        ) from None
    except RecursionError:
        raise RuleError(f"{name}: not valid TOML: brackets are nested too deep") from None
    tables = data.get("rule")
    strange = sorted(set(data) - {"rule"})
    if strange or not isinstance(tables, list) or not tables or not all(isinstance(one, dict) for one in tables):
        found = f"it holds {_shown(strange[0])}" if strange else "it holds no row"
        raise RuleError(f"{name}: {found}", "a rule file holds rows only, each starting with [[rule]]")
    rows: dict[str, PowerRule] = {}
    for number, table in enumerate(tables, start=1):
        called = table.get("id")
        where = f"{name}, row {number}"
        if isinstance(called, str) and _ID.fullmatch(called):
            where += f" ('{called}')"
        try:
            row = _row(table, origin=name)
        except _Wrong as wrong:
            raise RuleError(f"{where}: {wrong.what}", wrong.remedy) from None
        if row.id in rows:
            raise RuleError(
                f"{where}: the id '{row.id}' stands in an earlier row too", "give each row an id of its own"
            )
        rows[row.id] = row
    return tuple(rows.values())


def _text_of(path: Path) -> str:
    try:
        if path.stat().st_size > _LONGEST_FILE:
            raise RuleError(
                f"{path.name}: {path.stat().st_size} bytes are no file of power rules", "at most 2 MB are read"
            )
        return path.read_bytes().decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise RuleError(
            f"{path.name}: not a text file in UTF-8 (byte {error.start + 1})", "rules are plain text"
        ) from None
    except OSError as error:
        raise RuleError(f"power rules cannot be read from '{path}': {error.strerror or error}") from None


def _row(table: Mapping[str, Any], *, origin: str) -> PowerRule:
    _keys(table, _REQUIRED, _OPTIONAL, "")
    identity = _text(table["id"], "id")
    if not _ID.fullmatch(identity):
        raise _Wrong(f"id {_shown(identity)} has other signs than a-z, 0-9, point, dash and underscore", "shorten it")
    seen = _text(table["seen"], "seen")
    status: RuleStatus = _choice(table["status"], "status", get_args(RuleStatus))
    if seen == _NOT_SEEN and status != "unconfirmed":
        raise _Wrong(
            f"the text was not seen, but status is {status!r}", 'say when you read it, or write status = "unconfirmed"'
        )
    if seen != _NOT_SEEN and not _SEEN.fullmatch(seen):
        raise _Wrong(
            f"seen = {_shown(seen)} is no date", 'write when you read the rule: "2026-05-01", "2026" or "2024 to 2026"'
        )
    low, high = _band(table["band"])
    row = PowerRule(
        id=identity,
        authority=_text(table["authority"], "authority"),
        region=_text(table["region"], "region"),
        title=_text(table["title"], "title"),
        low_hz=low,
        high_hz=high,
        citation=_text(table["citation"], "citation"),
        seen=seen,
        status=status,
        use=_choice(table.get("use", "any"), "use", get_args(RuleUse)),
        place=_choice(table.get("place", "anywhere"), "place", get_args(RulePlace)),
        conditions=tuple(_text(one, "conditions") for one in _list(table.get("conditions", []), "conditions")),
        eirp_max_dbm=_quantity(table, "eirp_max", parse_power_dbm),
        peak_eirp_max_dbm=_quantity(table, "peak_eirp_max", parse_power_dbm),
        conducted_max_dbm=_quantity(table, "conducted_max", parse_power_dbm),
        densities=tuple(_density(one) for one in _list(table.get("density", []), "density")),
        back_off=_back_off(table.get("back_off")),
        eirp_fall=_eirp_fall(table.get("eirp_fall")),
        gain_min_dbi=_quantity(table, "gain_min", parse_gain_dbi),
        origin=origin,
    )
    _consistent(row)
    return row


def _consistent(row: PowerRule) -> None:
    limits = (row.eirp_max_dbm, row.conducted_max_dbm, *row.densities)
    # A row may say of a band only that it is closed outdoors.
    if all(limit is None for limit in limits) and row.place != "indoors":
        raise _Wrong(
            "the row limits nothing", "add eirp_max, conducted_max or density; without a limit leave the row out"
        )
    if row.back_off is not None and row.conducted_max_dbm is None:
        raise _Wrong(
            "back_off lowers conducted power, but conducted_max is missing", 'add conducted_max = "1 W" or the like'
        )
    fall = row.eirp_fall
    if fall is not None and row.eirp_max_dbm is None:
        raise _Wrong("eirp_fall lowers EIRP, but eirp_max is missing", 'add eirp_max = "82 dBm" or the like')
    if fall is not None and row.eirp_max_dbm is not None and fall.floor_dbm > row.eirp_max_dbm:
        raise _Wrong(
            f"the floor {fall.floor_dbm:g} dBm is above eirp_max {row.eirp_max_dbm:g} dBm", "correct one of them"
        )
    if row.peak_eirp_max_dbm is not None and fall is not None and fall.peak_floor_dbm is None:
        raise _Wrong("peak_eirp_max stands beside eirp_fall without a peak_floor", "add peak_floor to eirp_fall")


def _density(table: Any) -> Density:
    checked = _inner(table, _DENSITY, "density")
    power = _quantity(checked, "power", parse_power_dbm, prefix="density.")
    assert power is not None
    return Density(
        power_dbm=power,
        per_hz=_width(checked["per"], "density.per"),
        of=_choice(checked["of"], "density.of", get_args(MeasuredAt)),
    )


def _back_off(table: Any) -> BackOff | None:
    if table is None:
        return None
    checked = _inner(table, _BACK_OFF, "back_off")
    above = _quantity(checked, "above", parse_gain_dbi, prefix="back_off.")
    assert above is not None
    density = checked.get("density", False)
    if not isinstance(density, bool):
        raise _Wrong(f"back_off.density = {_shown(density)} is neither true nor false", "write density = true")
    return BackOff(above_dbi=above, density=density, **_slope(checked, "back_off"))


def _eirp_fall(table: Any) -> EirpFall | None:
    if table is None:
        return None
    checked = _inner(table, _EIRP_FALL, "eirp_fall")
    below = _quantity(checked, "below", parse_gain_dbi, prefix="eirp_fall.")
    floor = _quantity(checked, "floor", parse_power_dbm, prefix="eirp_fall.")
    assert below is not None
    assert floor is not None
    return EirpFall(
        below_dbi=below,
        floor_dbm=floor,
        peak_floor_dbm=_quantity(checked, "peak_floor", parse_power_dbm, prefix="eirp_fall."),
        **_slope(checked, "eirp_fall"),
    )


def _slope(table: Mapping[str, Any], inside: str) -> dict[str, float]:
    found = {}
    for key in ("lower_by_db", "for_each_db"):
        value = table[key]
        if (
            isinstance(value, bool)
            or not isinstance(value, (int, float))
            or not (math.isfinite(value) and 0 < value <= 100)
        ):
            raise _Wrong(
                f"{inside}.{key} = {_shown(value)} is no number of dB above 0 and up to 100", "write 1, 2 or 3"
            )
        found[key] = float(value)
    return found


def _inner(table: Any, keys: tuple[tuple[str, ...], tuple[str, ...]], name: str) -> Mapping[str, Any]:
    if not isinstance(table, dict):
        raise _Wrong(f"{name} = {_shown(table)} is no table", f"write it as {{ {keys[0][0]} = ... }}")
    _keys(table, *keys, f"{name}.")
    return table


def _keys(table: Mapping[str, Any], required: tuple[str, ...], optional: tuple[str, ...], prefix: str) -> None:
    allowed = (*required, *optional)
    for key in table:
        if key not in allowed:
            raise _Wrong(f"unknown key {_shown(prefix + key)}", f"allowed are {', '.join(allowed)}")
    for key in required:
        if key not in table:
            raise _Wrong(f"'{prefix}{key}' is missing", f"a row needs {', '.join(required)}")


def _text(value: Any, key: str) -> str:
    if not isinstance(value, str) or not value.strip():
        raise _Wrong(f"{key} = {_shown(value)} is no text", f'write {key} = "..."')
    if len(value) > _LONGEST_TEXT or not value.isprintable():
        raise _Wrong(
            f"{key} is longer than {_LONGEST_TEXT} letters or holds control characters", "shorten it to one line"
        )
    return value.strip()


def _list(value: Any, key: str) -> list[Any]:
    if not isinstance(value, list):
        raise _Wrong(f"{key} = {_shown(value)} is no list", f"write {key} = [ ... ]")
    return value


def _choice(value: Any, key: str, allowed: tuple[_T, ...]) -> _T:
    for one in allowed:
        if value == one:
            return one
    raise _Wrong(f"{key} = {_shown(value)} is not known", f"allowed are {', '.join(map(repr, allowed))}")


def _quantity(table: Mapping[str, Any], key: str, parse: Callable[[str], float], *, prefix: str = "") -> float | None:
    if key not in table:
        return None
    text = _text(table[key], prefix + key)
    try:
        return parse(text)
    except QuantityError as error:
        raise _Wrong(
            f"{prefix}{key}: {error.what}", "; ".join(error.details) or "write a number and its unit"
        ) from None


def _width(value: Any, key: str) -> float:
    match = _WIDTH.fullmatch(value.strip()) if isinstance(value, str) else None
    if match is None or float(match[1]) <= 0.0:
        raise _Wrong(
            f"{key} = {_shown(value)} is no frequency", 'write a number and a unit, such as "1 MHz" or "3 kHz"'
        )
    return float(match[1]) * _HERTZ[match[2]]


def _band(value: Any) -> tuple[float, float]:
    ends = _list(value, "band")
    if len(ends) != 2:
        raise _Wrong(f"band has {len(ends)} ends", 'write band = ["2400 MHz", "2483.5 MHz"]')
    low, high = (_width(end, "band") for end in ends)
    if not 1e6 <= low < high <= 1e12:
        raise _Wrong(
            f"band {_shown(ends[0])} to {_shown(ends[1])} does not rise", "the lower end comes first; 1 MHz to 1 THz"
        )
    return low, high


def _shown(value: Any) -> str:
    words = repr(value)
    return words if len(words) <= 60 else words[:57] + "..."
