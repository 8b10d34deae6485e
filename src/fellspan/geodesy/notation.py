"""The grammar of coordinates as people write them: one text in, two signed numbers with their axes out.

Knows nothing of Earth models or of coordinate reference systems: it reads notation, `coordinates.py` gives it meaning.
"""

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal, TypeVar

from fellspan.errors import CoordinateError

Axis = Literal["north", "east"]

LATITUDE_EXAMPLES = (
    "write latitude first: 36.04217 -45.19876, or 36.04217 N, 45.19876 W",
    "or 36°02'31.8\"N 45°11'55.5\"W, or with a named system: EPSG:32623 480000 3990000",
)

_TYPOGRAPHY = str.maketrans(
    dict.fromkeys("′’‘´`ʹ", "'") | dict.fromkeys("″”“ʺ", '"') | dict.fromkeys("º˚", "°") | dict.fromkeys("−–‒‐‑", "-")
    | dict.fromkeys("\xa0\u2009\u202f\t\r\n", " ") | dict.fromkeys("\u200e\u200f\ufeff\u200b", None)
)  # fmt: skip
# atomic, so that a number is never read as two
_NUMBER = r"(?>[0-9]+(?:[.,][0-9]+)?|\.[0-9]+)"
_LABEL = r"(?:(?P<label>latitude|lat|longitude|long|lon|lng)\s*[:=]?\s*)?"
_ANGLE = re.compile(
    rf"{_LABEL}(?P<before>[nsew])?\s*(?P<sign>[+-])?\s*(?P<degrees>{_NUMBER})"
    rf"(?:(?:\s*(?P<degree_mark>deg|[°d:])\s*|\s+)(?P<minutes>{_NUMBER})"
    rf"(?:(?:\s*(?P<minute_mark>min|['m:])\s*|\s+)(?P<seconds>{_NUMBER}))?)?"
    rf"\s*(?P<mark>deg|min|sec|''|[°d'm\"s])?\s*(?P<after>north|south|east|west|[nsew])?",
    re.IGNORECASE,
)
_GRID = re.compile(
    rf"(?P<before>[ne])?\s*[:=]?\s*(?P<sign>[+-])?\s*(?P<value>{_NUMBER})\s*m?\s*(?P<after>[ne])?", re.IGNORECASE
)
_EXPONENT = re.compile(r"[0-9][eE][+-]?[0-9]")


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """One of the two numbers of a position: value in degrees or grid units, the axis its letter named, its fineness.

    `step` is the unit of the last digit written, in the unit of the value; `parts` counts degrees, minutes, seconds.
    """

    value: float
    axis: Axis | None
    step: float
    parts: int
    marked: bool


_Half = Callable[[str], "Reading | None"]
_T = TypeVar("_T")


def quoted(text: str) -> str:
    """A text made fit for one line of a message."""
    return repr(text if len(text) <= 60 else text[:57] + "...")


def tidy(text: str) -> str:
    """Typographic variants of quotes, degree signs, minus and spaces folded into one; outer brackets dropped."""
    return text.translate(_TYPOGRAPHY).strip().strip("()[]").strip()


def read_angles(text: str) -> tuple[Reading, Reading]:
    """The two angles of a tidied text, in the order written; raises CoordinateError."""
    if _EXPONENT.search(text) and not re.search(r"[nNsS]", text):
        raise CoordinateError(f"{quoted(text)} has an exponent, which no position needs", *LATITUDE_EXAMPLES)
    return _read_two(text, _read_angle, LATITUDE_EXAMPLES)


def read_grid(text: str) -> tuple[Reading, Reading]:
    """The two grid values of a tidied text, in the order written; raises CoordinateError."""
    return _read_two(text, _read_grid, ("write easting first: 480000 3990000, or 3990000 N 480000 E",))


def _read_two(text: str, half: _Half, examples: tuple[str, ...]) -> tuple[Reading, Reading]:
    """Try every place where the text may divide; exactly one reading must make sense."""
    found: list[tuple[Reading, Reading]] = []
    complaint: CoordinateError | None = None
    if len(text) <= 200:
        for left, right in _divisions(text):
            try:
                first, second = half(left), half(right)
            except CoordinateError as error:
                complaint = complaint or error
                continue
            if first is None or second is None:
                continue
            # without marks, '36 02 31.8 45 11 55.5' divides only where both sides have as many parts
            if first.parts != second.parts and not (first.marked and second.marked):
                continue
            if (first, second) not in found:
                found.append((first, second))
    if len(found) == 1:
        return found[0]
    if found:
        raise CoordinateError(
            f"{quoted(text)} can be read in more than one way",
            "put a semicolon between the two numbers, or use decimal points, or give both letters",
        )
    if complaint is not None:
        raise complaint
    raise CoordinateError(f"{quoted(text)} is not a position", *examples)


def _divisions(text: str) -> list[tuple[str, str]]:
    """Where the text may be cut in two: at a semicolon or slash if there is one, else at commas, spaces and letters."""
    hard = [match.span() for match in re.finditer(r"\s*[;/|]\s*", text)]
    if not hard:
        hard = [match.span() for match in re.finditer(r"\s*,\s+|\s+,", text)]
    spans = hard or [match.span() for match in re.finditer(r"\s*,\s*|\s+", text)]
    if not hard:
        spans += [(match.end(), match.end()) for match in re.finditer(r"[nsewNSEW'\"°]", text)]
        spans += [(match.start(), match.start()) for match in re.finditer(r"[nsewNSEW]", text)]
    return [(text[:start].strip(), text[end:].strip()) for start, end in sorted(set(spans))]


def _number(text: str) -> float:
    return float(text.replace(",", "."))


def _step(text: str) -> float:
    return float(10.0 ** -len(re.split("[.,]", text)[1])) if re.search("[.,]", text) else 1.0


def _one_of(*values: _T | None) -> _T | None:
    given = [value for value in values if value is not None]
    return given[0] if given else None


def _read_grid(text: str) -> Reading | None:
    match = _GRID.fullmatch(text)
    if match is None or (match["before"] and match["after"]):
        return None
    letter = (match["before"] or match["after"] or "").lower()
    value = _number(match["value"])
    return Reading(
        value=-value if match["sign"] == "-" else value,
        axis={"n": "north", "e": "east"}.get(letter),  # type: ignore[arg-type]  # dict.get widens the literals
        step=_step(match["value"]),
        parts=1,
        marked=False,
    )


def _read_angle(text: str) -> Reading | None:
    match = _ANGLE.fullmatch(text)
    if match is None:
        return None
    after, mark = match["after"], match["mark"]
    minute_mark = match["minute_mark"] or ""
    if mark in ("s", "S") and minute_mark.lower() not in ("m", "min"):
        if after:
            return None
        after, mark = mark, None  # 36 02 31 S and 36°02'31S mean south
    if mark == "S" and not after:
        raise CoordinateError(f"the S in {quoted(text)} may mean seconds or south", "write 36°02'31\"S or 36d02m31s S")
    fields = [match[name] for name in ("degrees", "minutes", "seconds") if match[name] is not None]
    expected = {1: ("°", "d", "deg"), 2: ("'", "m", "min"), 3: ('"', "''", "s", "sec")}[len(fields)]
    if mark and mark.lower() not in expected:
        return None
    if match["before"] and after:
        return None
    letter = (match["before"] or after or "")[:1].lower()
    label = (match["label"] or "")[:2].lower()
    axis = _axis(letter, label, text)
    if letter and match["sign"] == "-":
        raise CoordinateError(f"{quoted(text)} has both a minus and a letter", "drop one of the two")
    value = _angle_deg(fields, text)
    if value is None:
        return None
    return Reading(
        value=-value if match["sign"] == "-" or letter in ("s", "w") else value,
        axis=axis,
        step=_step(fields[-1]) / 60.0 ** (len(fields) - 1),
        parts=len(fields),
        marked=bool(mark or match["degree_mark"] or letter or label),
    )


def _axis(letter: str, label: str, text: str) -> Axis | None:
    by_letter: Axis | None = None if not letter else "north" if letter in "ns" else "east"
    by_label: Axis | None = None if not label else "north" if label == "la" else "east"
    if by_letter and by_label and by_letter != by_label:
        raise CoordinateError(f"the name and the letter in {quoted(text)} contradict each other")
    return _one_of(by_letter, by_label)


def _angle_deg(fields: list[str], text: str) -> float | None:
    """Degrees from one to three fields; None where any but the last has decimals."""
    if any(not field.isdigit() for field in fields[:-1]):
        return None
    numbers = [_number(field) for field in fields]
    for name, number in zip(("minutes", "seconds"), numbers[1:], strict=False):
        if number >= 60.0:
            raise CoordinateError(f"{number:g} {name} in {quoted(text)}: {name} run from 0 to below 60")
    return sum(number / 60.0**power for power, number in enumerate(numbers))
