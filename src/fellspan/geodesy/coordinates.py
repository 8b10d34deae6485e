"""Positions from text as people write it, and back into text for people.

Knows nothing of the command line or of study files; both hand their text in here.
"""

import math
import re
from dataclasses import dataclass
from typing import Literal

from pyproj.exceptions import ProjError

from fellspan.errors import CoordinateError
from fellspan.geodesy.notation import LATITUDE_EXAMPLES, Reading, quoted, read_angles, read_grid, tidy
from fellspan.geodesy.position import Position
from fellspan.geodesy.transforms import WGS84, crs_of, transformer

PositionStyle = Literal["decimal", "dms"]

_NAMED_CRS = r"(?P<crs>(?:epsg|esri|ogc|ignf|iau_[0-9]+)\s*:\s*[a-z0-9_]+)"
_CRS_FIRST = re.compile(rf"{_NAMED_CRS}[\s,;:]+(?P<rest>.+)", re.IGNORECASE)
_CRS_LAST = re.compile(rf"(?P<rest>.+?)[\s,;]+{_NAMED_CRS}", re.IGNORECASE)
_COARSE_DEG = 0.01
"""A last digit worth this much or more, two decimals of a degree, draws a caution."""
_METRES_PER_DEG = 111_320.0


@dataclass(frozen=True, slots=True, kw_only=True)
class ParsedPosition:
    """A position and, where the text leaves a doubt about it, one sentence saying which."""

    position: Position
    caution: str | None = None


def parse_position(text: str, *, crs: str | None = None) -> ParsedPosition:
    """Read a position as people write it.

    Parameters
    ----------
    text
        Latitude and longitude in decimal degrees or degrees-minutes-seconds, with signs or N, S, E, W before or after;
        or easting and northing of a named system, `EPSG:32623 480000 3990000`. Latitude comes first, easting comes
        first, unless letters say otherwise. Comma, space or semicolon between; a decimal comma is read where it
        cannot be mistaken.
    crs
        The system that the numbers are in, in place of one named in the text; WGS 84 by default.

    Raises
    ------
    CoordinateError
        The text is no position, can be read in two ways, or lies outside its range.
    """
    cleaned = tidy(text)
    named = _CRS_FIRST.fullmatch(cleaned) or _CRS_LAST.fullmatch(cleaned)
    if named is not None:
        stated = re.sub(r"\s+", "", named["crs"])
        if crs is not None and crs_of(crs) != crs_of(stated):
            raise CoordinateError(f"the text names {stated}, but the system given beside it is {quoted(crs)}")
        crs, cleaned = stated, named["rest"]
    if not cleaned:
        raise CoordinateError("the position is empty", *LATITUDE_EXAMPLES)
    if crs is None:
        latitude, longitude = _by_axis(*read_angles(cleaned), text=cleaned, first="north")
        _check_range(latitude.value, longitude.value)
        position = Position(latitude_deg=latitude.value, longitude_deg=longitude.value)
        return ParsedPosition(position=position, caution=_coarseness(latitude.step, longitude.step, position))
    system = crs_of(crs)
    if system.is_geographic and len(system.axis_info) == 2:
        latitude, longitude = _by_axis(*read_angles(cleaned), text=cleaned, first="north")
        _check_range(latitude.value, longitude.value)
        position = _transformed(longitude.value, latitude.value, crs=crs)
        return ParsedPosition(position=position, caution=_coarseness(latitude.step, longitude.step, position))
    if not system.is_projected or len(system.axis_info) != 2:
        raise CoordinateError(
            f"{system.name} is not a system of map coordinates",
            "name a projected or geographic system without heights, for instance EPSG:32623",
        )
    northing, easting = _by_axis(*read_grid(cleaned), text=cleaned, first="east")
    position = _transformed(easting.value, northing.value, crs=crs)
    return ParsedPosition(position=position, caution=_outside(position, easting.value, northing.value, crs=crs))


def parse_pair(latitude: float, longitude: float) -> ParsedPosition:
    """A position from two numbers in degrees, with the checks and cautions of `parse_position`.

    A number does not remember its trailing zeros, so 36.10000 counts as one decimal.
    """
    latitude, longitude = float(latitude), float(longitude)
    if math.isfinite(latitude) and math.isfinite(longitude):
        _check_range(latitude, longitude)
    position = Position(latitude_deg=latitude, longitude_deg=longitude)
    return ParsedPosition(position=position, caution=_coarseness(_repr_step(latitude), _repr_step(longitude), position))


def format_position(position: Position, style: PositionStyle = "decimal") -> str:
    """A position for people: `36.04217 N, 45.19876 W` (to 1 m) or `36°02'31.81" N, 45°11'55.54" W` (to 0.3 m)."""
    halves = ((position.latitude_deg, "NS"), (position.longitude_deg, "EW"))
    write = _decimal if style == "decimal" else _dms
    return ", ".join(f"{write(abs(value))} {letters[value < 0.0]}" for value, letters in halves)


def _decimal(value: float) -> str:
    return f"{value:.5f}"


def _dms(value: float) -> str:
    hundredths = round(value * 360_000.0)  # rounded once, so that 59.999" carries into the minute
    minutes, rest = divmod(hundredths, 6000)
    return f"{minutes // 60}°{minutes % 60:02d}'{rest / 100.0:05.2f}\""


def _by_axis(one: Reading, two: Reading, *, text: str, first: Literal["north", "east"]) -> tuple[Reading, Reading]:
    """North reading, east reading: letters decide, else the order written."""
    if one.axis is not None and one.axis == two.axis:
        raise CoordinateError(f"{quoted(text)} gives two values for the same axis", *LATITUDE_EXAMPLES[:1])
    other = "east" if first == "north" else "north"
    one_axis = one.axis or {"north": "east", "east": "north"}.get(two.axis or other)
    return (one, two) if one_axis == "north" else (two, one)


def _check_range(latitude_deg: float, longitude_deg: float) -> None:
    if abs(latitude_deg) > 360.0 or abs(longitude_deg) > 360.0:
        raise CoordinateError(
            f"{latitude_deg:.10g}, {longitude_deg:.10g} are not degrees",
            "if they are easting and northing, name their system: EPSG:32623 480000 3990000",
        )
    if abs(latitude_deg) > 90.0:
        swapped = abs(longitude_deg) <= 90.0 and abs(latitude_deg) <= 180.0
        raise CoordinateError(
            f"latitude {latitude_deg:.10g} is outside -90 to 90 degrees",
            *(
                [f"latitude comes first; did you mean {longitude_deg:.10g}, {latitude_deg:.10g}?"]
                if swapped
                else LATITUDE_EXAMPLES[:1]
            ),
        )
    if abs(longitude_deg) > 180.0:
        turned = longitude_deg - math.copysign(360.0, longitude_deg)
        raise CoordinateError(
            f"longitude {longitude_deg:.10g} is outside -180 to 180 degrees", f"the same meridian is {turned:.10g}"
        )


def _repr_step(value: float) -> float:
    mantissa, _, exponent = repr(value).partition("e")
    decimals = mantissa.partition(".")[2].rstrip("0")
    return float(10.0 ** (int(exponent or 0) - len(decimals)))


def _coarseness(latitude_step_deg: float, longitude_step_deg: float, position: Position) -> str | None:
    """A caution where the last digit written is worth half a kilometre or more either way."""
    coarse = 0.999 * _COARSE_DEG
    if max(latitude_step_deg, longitude_step_deg) < coarse:
        return None
    off_m = [latitude_step_deg / 2.0 * _METRES_PER_DEG]
    off_m.append(longitude_step_deg / 2.0 * _METRES_PER_DEG * math.cos(math.radians(position.latitude_deg)))
    axes = [
        name for name, step in (("latitude", latitude_step_deg), ("longitude", longitude_step_deg)) if step >= coarse
    ]
    worst = max(off for off, step in zip(off_m, (latitude_step_deg, longitude_step_deg), strict=True) if step >= coarse)
    shown = f"{round(worst, -1):.0f} m" if worst < 1000.0 else f"{worst / 1000.0:.1f} km"
    return (
        f"the {' and '.join(axes)} of {format_position(position)} {'are' if len(axes) == 2 else 'is'} coarse: "
        f"the point may be {shown} off; five decimals of a degree are good to 1 m"
    )


def _transformed(x: float, y: float, *, crs: str) -> Position:
    try:
        longitude, latitude = transformer(crs, WGS84).transform(x, y, errcheck=True)
    except ProjError as error:
        raise CoordinateError(f"{x:.10g}, {y:.10g} is no point of {crs_of(crs).name}") from error
    if not (math.isfinite(longitude) and math.isfinite(latitude)):
        raise CoordinateError(f"{x:.10g}, {y:.10g} is no point of {crs_of(crs).name}")
    return Position(latitude_deg=latitude, longitude_deg=longitude)


def _inside(position: Position, crs: str) -> bool:
    area = crs_of(crs).area_of_use
    if area is None:
        return True
    margin = 3.0  # a grid is commonly used some way past its edge
    width = (area.east - area.west) % 360.0 or 360.0
    turned = (position.longitude_deg - area.west + margin) % 360.0
    in_longitude = width + 2.0 * margin >= 360.0 or turned <= width + 2.0 * margin
    return in_longitude and area.south - margin <= position.latitude_deg <= area.north + margin


def _outside(position: Position, easting: float, northing: float, *, crs: str) -> str | None:
    """Nothing inside the system's area; an error where the swapped pair would lie inside; else a caution."""
    if _inside(position, crs):
        return None
    name = crs_of(crs).name
    try:
        swapped_inside = _inside(_transformed(northing, easting, crs=crs), crs)
    except CoordinateError:
        swapped_inside = False
    if swapped_inside:
        raise CoordinateError(
            f"{easting:.10g}, {northing:.10g} lies far outside {name}",
            f"easting comes first; did you mean {northing:.10g}, {easting:.10g}?",
        )
    return f"{format_position(position)} lies outside the area that {name} is made for"
