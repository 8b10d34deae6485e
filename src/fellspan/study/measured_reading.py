"""Reads a file of what was measured of a link: TOML or CSV in, `AsBuilt` in SI out, or an error that says what to mend.

Opens that file alone; knows the study's links by name only.
"""

import datetime as dt
import math
import tomllib
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from fellspan.design.as_built import AsBuilt, BuiltEnd, EndLetter, Reading
from fellspan.errors import CoordinateError, MeasuredFileError
from fellspan.geodesy.coordinates import parse_position
from fellspan.links.site import Link
from fellspan.study.measured_csv import tables_of_csv
from fellspan.study.measured_messages import refuse
from fellspan.study.measured_schema import EndTable, MeasuredFile, ReadingTable
from fellspan.study.messages import did_you_mean, shown

MOST_BYTES = 5_000_000
_HINT = "fellspan accept STUDY --link NAME --blank writes one to fill in"


def load_measured(path: str | Path, link: Link) -> AsBuilt:
    """Read the measured file of a link: CSV where its name ends so, else TOML.

    Raises
    ------
    MeasuredFileError
        The file is missing, empty, of another link, or has an unknown key, a wrong value or no level at all.
    """
    path = Path(path)
    return read_measured(_text_of(path), link, path=path)


def read_measured(text: str, link: Link, *, path: Path) -> AsBuilt:
    """Read the text of a measured file that stands at `path`."""
    name = path.name
    rows: dict[tuple[int | str, ...], int] = {}
    if path.suffix.lower() == ".csv":
        data, rows = tables_of_csv(text, name)
    else:
        data = _toml(text, name)
    try:
        found = MeasuredFile.model_validate(data)
    except ValidationError as error:
        refuse(name, error.errors(include_url=False), data, rows=rows)
    stated = found.measured.link
    if stated is not None and _key(stated) != _key(link.name):
        raise MeasuredFileError(
            f"{name}, measured, link: this file is of '{stated}', not of '{link.name}'",
            "name that link with --link, or give its own measured file",
        )
    readings = _readings(found)
    if not readings:
        raise MeasuredFileError(
            f"{name}: no level was read at either end",
            'add level = "-61.5 dBm" under [a] and [b], or a [[reading]] for each reading',
        )
    return AsBuilt(
        link=link.name,
        readings=readings,
        a=_end(found.a, link, "a", name),
        b=_end(found.b, link, "b", name),
        date=found.measured.date,
        by=found.measured.by,
        weather=found.measured.weather,
        modulation=_modulation(found.measured.modulation, link, name),
        power_control=found.measured.power_control,
        adaptive_modulation=found.measured.adaptive_modulation,
        levels_are=found.measured.levels_are,
        error_db=found.measured.level_error,
        band_db=found.measured.band,
        note=found.measured.note,
        file=name,
    )


def _text_of(path: Path) -> str:
    if path.is_dir():
        raise MeasuredFileError(f"{path} is a folder", "name the measured file in it")
    try:
        size = path.stat().st_size
        raw = path.read_bytes() if size <= MOST_BYTES else b""
    except FileNotFoundError:
        raise MeasuredFileError(f"there is no measured file {path}", _HINT) from None
    except OSError as error:
        raise MeasuredFileError(f"measured file {path} cannot be read: {error.strerror}") from None
    if size > MOST_BYTES:
        raise MeasuredFileError(f"measured file {path.name} has {size / 1e6:.0f} MB; at most 5 MB are read")
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise MeasuredFileError(
            f"{path.name}: not a text file in UTF-8 (byte {error.start + 1} is {raw[error.start]:#04x})", _HINT
        ) from None


def _toml(text: str, name: str) -> dict[str, Any]:
    if not text.strip():
        raise MeasuredFileError(f"{name}: the measured file is empty", _HINT)
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise MeasuredFileError(
            f"{name}: not valid TOML: {error}",
            'a value stands as key = "text" or key = 1.5, a reading under [[reading]]',
        ) from None
    except RecursionError:
        raise MeasuredFileError(f"{name}: not valid TOML: brackets are nested too deep") from None


def _key(name: str) -> str:
    return " ".join(name.split()).casefold()


def _readings(found: MeasuredFile) -> tuple[Reading, ...]:
    first = found.measured.date
    days = [one.date for one in found.reading if one.date is not None]
    start = min([*days, *([first] if first is not None else [])], default=None)
    listed: list[Reading] = []
    ends: tuple[tuple[EndLetter, EndTable], ...] = (("a", found.a), ("b", found.b))
    for end, table in ends:
        if table.level is not None:
            listed.append(Reading(end=end, level_dbm=table.level))
        listed += [
            Reading(end=end, level_dbm=level, chain=str(number))
            for number, level in enumerate(table.level_chains, start=1)
        ]
    listed += [
        Reading(
            end=one.at,
            level_dbm=one.level,
            chain=one.chain,
            hour=_hours(one, first=first, start=start),
            water_m=one.water,
            note=one.note,
        )
        for one in found.reading
    ]
    return tuple(listed)


def _hours(one: ReadingTable, *, first: dt.date | None, start: dt.date | None) -> float | None:
    if one.time is None:
        return None
    day = one.date or first
    return one.time + (24.0 * (day - start).days if day is not None and start is not None else 0.0)


def _modulation(text: str, link: Link, name: str) -> str | None:
    if not text:
        return None
    known = [row.name for row in link.radio.modulations]
    found = {"".join(row.casefold().split()): row for row in known}.get("".join(text.casefold().split()))
    if found is None:
        raise MeasuredFileError(
            f"{name}, measured, modulation: {shown(text)} is none of radio '{link.radio.name}'",
            *did_you_mean(text, known),
            f"it has: {', '.join(known) if known else 'none; leave the key out'}",
        )
    return found


def _end(table: EndTable, link: Link, end: EndLetter, name: str) -> BuiltEnd:
    position = None
    if table.at is not None:
        try:
            position = parse_position(table.at).position
        except CoordinateError as error:
            raise MeasuredFileError(f"{name}, {end}, at: {error.what}", *error.details[:2]) from None
    power = table.power
    if power is not None and table.power_is == "each chain":
        power += 10.0 * math.log10(link.radio.chains)
    height = table.height
    return BuiltEnd(
        height_m=None if height is None else height.height_m,
        height_reference=None if height is None else height.reference,
        roof_m=table.roof,
        ground_amsl_m=table.ground,
        position=position,
        bearing_deg=table.bearing,
        bearing_is=table.bearing_is,
        tilt_deg=table.tilt,
        polarization=table.polarization,
        power_dbm=power,
        feeder_loss_db=table.feeder_loss,
        antenna=table.antenna,
        radio=table.radio,
        serial=table.serial,
        note=table.note,
    )
