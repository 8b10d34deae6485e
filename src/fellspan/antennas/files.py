"""Pattern files: plain CSV of two cuts, or of a dense grid. The format is described in docs/antennas.md.

    # name: Panel P
    # frequency: 5.8 GHz
    # gain: 18 dBi             needed where the column is relative_db
    plane,angle_deg,gain_dbi
    azimuth,-180,-12.1
    ...

A dense file has the columns azimuth_deg, elevation_deg and gain_dbi or relative_db instead. Bad rows are refused by number.
"""

import csv
import difflib
import math
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.cuts import DenseGrid, MeasuredCut, finished, pattern_from_cuts
from fellspan.antennas.parts import no_cross_polar, wavelength_m
from fellspan.antennas.pattern import Pattern, Plane
from fellspan.errors import AntennaError, QuantityError
from fellspan.quantities import parse_frequency_hz, parse_gain_dbi, parse_length_m

PLANES = ("azimuth", "elevation", "azimuth-cross", "elevation-cross")
WIDEST_STEP_DEG = 5.0
"""A wider step between angles of a cut is taken for a gap."""
PLANES_AGREE_DB = 3.0
"""Straight ahead both planes show one beam: further apart than this they are not of one antenna on one scale (our own rule)."""

_SEAMS = (-180.0, 0.0)
"""Where the circle closes: -180 and 180, or 0 and 360, may both stand in a file, if they agree."""

_HEADER_KEYS = ("name", "frequency", "gain", "electric_plane", "size")


@dataclass(frozen=True, slots=True, kw_only=True)
class _Said:
    """A header value and the line it stands in."""

    line: int
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class _Row:
    line: int
    plane: str
    first: float
    second: float
    gain: float


def read_pattern(path: str | Path) -> Pattern:
    """Read a pattern file of either form.

    Raises
    ------
    AntennaError
        The file cannot be read, or a row is wrong: the message names file and line.
    """
    path = Path(path)
    try:
        text = path.read_text(encoding="utf-8-sig")
    except (OSError, UnicodeDecodeError) as problem:
        told = problem.strerror if isinstance(problem, OSError) and problem.strerror else problem
        raise AntennaError(f"cannot read pattern file {path.name}: {told}") from None
    return parse_pattern(text, file=path.name)


def parse_pattern(text: str, *, file: str) -> Pattern:
    """The same from text; `file` is its name in messages."""
    header, table = _split(text, file)
    _needed(header, "frequency", file)
    frequency = _quantity(header, "frequency", parse_frequency_hz, file)
    name = header["name"].text if "name" in header else Path(file).stem
    plane = _electric_plane(header, file)
    size = _quantity(header, "size", parse_length_m, file) if "size" in header else None
    reader = csv.reader((row for _, row in table), quoting=csv.QUOTE_NONE)
    lines = [number for number, _ in table]
    columns = [column.strip() for column in next(reader, [])]
    absolute = _gain_column(columns, f"{file}, line {lines[0]}" if lines else file)
    rows = list(_rows(reader, lines[1:], columns, file))
    if not rows:
        raise AntennaError(f"{file} holds no gains", "give at least one row for each angle of both planes")
    stated = _quantity(header, "gain", parse_gain_dbi, file) if "gain" in header else None
    if not absolute and stated is None:
        raise AntennaError(f"{file}: gains are relative, but no '# gain: ... dBi' line says relative to what")
    highest = max((row for row in rows if "cross" not in row.plane), key=lambda row: row.gain, default=None)
    if highest is None:
        raise AntennaError(f"{file} has cross-polar rows only", "give the azimuth and elevation planes too")
    peak = highest.gain
    if absolute and stated is not None and abs(stated - peak) > 0.5:
        raise AntennaError(
            f"{file}, line {highest.line}: the gain line says {stated:g} dBi, but the highest gain in the rows is {peak:g} dBi",
            "are the rows relative? then name the column relative_db",
        )
    if not absolute and abs(peak) > 0.5:
        raise AntennaError(
            f"{file}, line {highest.line}: relative gains must peak at 0 dB, but the highest is {peak:g} dB",
            "are the rows absolute? then name the column gain_dbi",
        )
    gain = peak if absolute else float(stated or 0.0)
    if "plane" in columns:
        cuts = {which: _cut(rows, which, peak, file) for which in PLANES if any(row.plane == which for row in rows)}
        for which in PLANES[:2]:
            if which not in cuts:
                raise AntennaError(
                    f"{file} has no rows of the {which} plane", "two cuts are needed: azimuth and elevation"
                )
        if ("azimuth-cross" in cuts) != ("elevation-cross" in cuts):
            raise AntennaError(f"{file} has cross-polar rows of one plane only", "give both cross-polar cuts, or none")
        _refuse_mixed(rows, cuts["azimuth"], cuts["elevation"], peak, file)
        return pattern_from_cuts(
            name=name,
            frequency_hz=frequency,
            gain_dbi=gain,
            azimuth=cuts["azimuth"],
            elevation=cuts["elevation"],
            cross_azimuth=cuts.get("azimuth-cross"),
            cross_elevation=cuts.get("elevation-cross"),
            electric_plane=plane,
            size_m=size,
        )
    grid = _grid(rows, peak, file)
    return finished(
        Pattern(
            name=name,
            kind="file",
            frequency_hz=frequency,
            peak_gain_dbi=gain,
            co_amplitude=grid.amplitude(),
            cross_amplitude=no_cross_polar,
            electric_plane=plane,
            size_m=size or wavelength_m(frequency) * 10.0 ** (gain / 20.0) / 3.0,
            efficiency=1.0,
            turns=False,
            source="dense measured pattern, interpolated in amplitude",
        )
    )


def _split(text: str, file: str) -> tuple[dict[str, _Said], list[tuple[int, str]]]:
    header: dict[str, _Said] = {}
    table: list[tuple[int, str]] = []
    for number, line in enumerate(text.splitlines(), start=1):
        if line.startswith("#"):
            key, found, value = line[1:].partition(":")
            key = key.strip().lower()
            if found and key in _HEADER_KEYS:
                if key in header:
                    raise AntennaError(f"{file}, line {number}: '{key}' is said twice")
                header[key] = _Said(line=number, text=value.strip())
            elif found and (meant := difflib.get_close_matches(key, _HEADER_KEYS, n=1, cutoff=0.8)):
                raise AntennaError(f"{file}, line {number}: '{key}' is no key; did you mean '{meant[0]}'?")
        elif line.strip():
            table.append((number, line))
    return header, table


def _needed(header: dict[str, _Said], key: str, file: str) -> None:
    if key not in header:
        raise AntennaError(
            f"{file} has no line '# {key}: ...'", f"add it above the table; keys: {', '.join(_HEADER_KEYS)}"
        )


def _quantity(header: dict[str, _Said], key: str, parse: Callable[[str], float], file: str) -> float:
    said = header[key]
    try:
        return parse(said.text)
    except QuantityError as problem:
        raise AntennaError(f"{file}, line {said.line}: {key}: {problem.what}", *problem.details[:2]) from None


def _electric_plane(header: dict[str, _Said], file: str) -> Plane:
    said = header.get("electric_plane")
    if said is None or said.text == "vertical":
        return "vertical"
    if said.text != "horizontal":
        raise AntennaError(
            f"{file}, line {said.line}: electric_plane '{said.text}' is neither 'vertical' nor 'horizontal'"
        )
    return "horizontal"


def _gain_column(columns: list[str], file: str) -> bool:
    both = {"gain_dbi", "relative_db"} & set(columns)
    if len(both) == 2:
        raise AntennaError(
            f"{file} mixes absolute and relative gain: it has both gain_dbi and relative_db columns", "keep one"
        )
    if not both:
        raise AntennaError(f"{file} has no gain_dbi or relative_db column; it has {', '.join(columns) or 'none'}")
    gain = next(iter(both))
    if sorted(columns) not in (sorted(["plane", "angle_deg", gain]), sorted(["azimuth_deg", "elevation_deg", gain])):
        raise AntennaError(
            f"{file} has the columns {', '.join(columns)}",
            f"give plane, angle_deg, {gain}, or azimuth_deg, elevation_deg, {gain}",
        )
    return gain == "gain_dbi"


def _rows(reader: Iterable[list[str]], lines: list[int], columns: list[str], file: str) -> Iterator[_Row]:
    for line, cells in zip(lines, reader, strict=False):
        if len(cells) != len(columns):
            raise AntennaError(f"{file}, line {line}: {len(cells)} values for {len(columns)} columns")
        values = dict(zip(columns, (cell.strip() for cell in cells), strict=True))
        numbers: dict[str, float] = {}
        for column, cell in values.items():
            if column == "plane":
                continue
            try:
                numbers[column] = float(cell)
            except ValueError:
                numbers[column] = math.nan
            if not math.isfinite(numbers[column]):
                raise AntennaError(f"{file}, line {line}: {column} '{cell}' is not a number")
        gain = numbers.get("gain_dbi", numbers.get("relative_db", math.nan))
        if "plane" in columns:
            if values["plane"] not in PLANES:
                raise AntennaError(f"{file}, line {line}: plane '{values['plane']}' is none of {', '.join(PLANES)}")
            angle = numbers["angle_deg"]
            if not -180.0 <= angle <= 360.0:
                raise AntennaError(f"{file}, line {line}: angle {angle:g} degrees is outside the circle, -180 to 360")
            yield _Row(line=line, plane=values["plane"], first=_around(angle), second=0.0, gain=gain)
        else:
            azimuth, elevation = numbers["azimuth_deg"], numbers["elevation_deg"]
            if not -180.0 <= azimuth <= 360.0 or not -90.0 <= elevation <= 90.0:
                raise AntennaError(
                    f"{file}, line {line}: direction {azimuth:g}, {elevation:g} degrees is outside the sphere",
                    "azimuth -180 to 360, elevation -90 to 90",
                )
            yield _Row(line=line, plane="", first=_around(azimuth), second=elevation, gain=gain)


def _refuse_mixed(rows: list[_Row], azimuth: MeasuredCut, elevation: MeasuredCut, peak: float, file: str) -> None:
    """Refuse planes that are not of one antenna on one scale, such as one plane absolute and the other relative."""
    for row in rows:
        if "cross" in row.plane and row.gain > peak:
            raise AntennaError(
                f"{file}, line {row.line}: cross-polar gain {row.gain:g} dB stands above the peak, {peak:g} dB",
                "are absolute and relative gain mixed?",
            )
    # An azimuth cut runs through the horizon or, of a tilted beam, through the middle of the beam: it has one of both levels.
    ahead = float(azimuth.at(np.array([0.0]))[0])
    levels = float(elevation.at(np.array([0.0]))[0]), float(np.max(elevation.relative_db))
    if min(abs(ahead - level) for level in levels) > PLANES_AGREE_DB:
        line = max((row for row in rows if row.plane == "elevation"), key=lambda row: row.gain).line
        top, level = (round(value + peak, 1) + 0.0 for value in (levels[1], ahead))
        raise AntennaError(
            f"{file}, line {line}: the elevation plane peaks at {top:.1f} dB, "
            f"but the azimuth plane has {level:.1f} dB at 0 degrees",
            "is one absolute and the other relative? or does the beam not stand at azimuth 0?",
        )


def _around(angle: float) -> float:
    return (angle + 180.0) % 360.0 - 180.0


def _cut(rows: list[_Row], plane: str, peak: float, file: str) -> MeasuredCut:
    own = sorted((row for row in rows if row.plane == plane), key=lambda row: row.first)
    previous = own[-1]
    for row in own:
        step = (row.first - previous.first) % 360.0
        if step == 0.0 and row is not previous:
            again, other = max(row.line, previous.line), min(row.line, previous.line)
            if row.first not in _SEAMS or abs(row.gain - previous.gain) > 0.05:
                gains = "" if row.gain == previous.gain else ", with different gains"
                raise AntennaError(
                    f"{file}, line {again}: the {plane} plane has {row.first:g} degrees twice{gains}",
                    f"the other one stands in line {other}",
                )
        elif step > WIDEST_STEP_DEG or row is previous:
            raise AntennaError(
                f"{file}, line {row.line}: the {plane} plane has a gap of {step or 360.0:g} degrees before {row.first:g}",
                f"steps up to {WIDEST_STEP_DEG:g} degrees around the full circle are needed",
            )
        previous = row
    angle, first = np.unique(np.array([row.first for row in own]), return_index=True)
    relative = np.array([row.gain - peak for row in own])[first]
    return MeasuredCut(angle_deg=angle, relative_db=relative)


def _grid(rows: list[_Row], peak: float, file: str) -> DenseGrid:
    azimuth: NDArray[np.float64] = np.unique(np.array([row.first for row in rows]))
    elevation: NDArray[np.float64] = np.unique(np.array([row.second for row in rows]))
    for label, values, span in (("azimuth", azimuth, 360.0), ("elevation", elevation, 180.0)):
        wanted = span / (values.size if label == "azimuth" else max(values.size - 1, 1))
        if values.size < 4 or np.max(np.abs(np.diff(values) - wanted)) > 1e-6 or wanted > WIDEST_STEP_DEG:
            raise AntennaError(
                f"{file}: the {label} angles are not an even grid over {span:g} degrees in steps up to {WIDEST_STEP_DEG:g}"
            )
    table = np.full((elevation.size, azimuth.size), np.nan)
    seen: dict[tuple[int, int], _Row] = {}
    for row in rows:
        at = int(np.searchsorted(elevation, row.second)), int(np.searchsorted(azimuth, row.first))
        other = seen.get(at)
        if other is not None and (row.first not in _SEAMS or abs(row.gain - other.gain) > 0.05):
            gains = "" if row.gain == other.gain else ", with different gains"
            raise AntennaError(
                f"{file}, line {row.line}: direction {row.first:g}, {row.second:g} degrees stands twice{gains}",
                f"the other one stands in line {other.line}",
            )
        seen[at] = row
        table[at] = row.gain - peak
    holes = np.argwhere(np.isnan(table))
    if holes.size:
        low, left = (int(index) for index in holes[0])
        raise AntennaError(
            f"{file} has no gain toward azimuth {azimuth[left]:g}, elevation {elevation[low]:g} degrees",
            f"{len(holes)} of {table.size} directions are missing; every direction of the grid is needed",
        )
    return DenseGrid(azimuth_deg=azimuth, elevation_deg=elevation, relative_db=table)
