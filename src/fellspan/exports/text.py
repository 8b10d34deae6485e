"""Text and numbers made safe for the formats they go into; knows nothing of plans.

Names come from users. A spreadsheet runs a cell that begins like a formula, XML cannot hold control characters, and
JSON has no word for infinity.
"""

import csv
import io
import math
import re
from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r", "\n", "＝", "＋", "－", "＠")
_NOT_IN_XML = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f\ud800-\udfff￾￿]")

Cell = str | float | int | bool | None


def finite(value: float | None) -> float | None:
    """`value`, or None where it is missing, infinite or not a number."""
    return None if value is None or not math.isfinite(value) else float(value)


def rounded(value: float | None, digits: int = 3) -> float | None:
    """`value` rounded for a table; None where it is not finite, never a negative zero."""
    checked = finite(value)
    return None if checked is None else round(checked, digits) + 0.0


def xml_text(text: str) -> str:
    """`text` without the characters that XML 1.0 cannot hold; the writer escapes the rest."""
    return _NOT_IN_XML.sub("", text)


def utf8(text: str) -> str:
    """`text` with lone surrogates replaced, so that it can be encoded."""
    return text.encode("utf-8", "replace").decode("utf-8")


def csv_cell(value: Cell) -> str:
    """One cell: a number as it is, nothing for None, text that no spreadsheet takes for a formula."""
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, (int, float)):
        checked = finite(value)
        return "" if checked is None else repr(value)
    text = utf8(value).replace("\x00", "")
    if text.startswith(_FORMULA_STARTS) or text.lstrip().startswith(_FORMULA_STARTS):
        return "'" + text
    return text


def csv_text(header: Sequence[str], rows: Iterable[Sequence[Cell]]) -> str:
    """A table as CSV (RFC 4180 quoting, lines ended by a newline)."""
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    writer.writerow([csv_cell(name) for name in header])
    writer.writerows([csv_cell(cell) for cell in row] for row in rows)
    return buffer.getvalue()


def number_cells(values: NDArray[np.float64], digits: int = 3) -> list[str]:
    """A column of rounded numbers as cells, ready to be joined; empty where not finite, never a negative zero."""
    rounded_values = (np.round(values, digits) + 0.0).tolist()
    if np.isfinite(values).all():
        return [repr(value) for value in rounded_values]
    return [repr(value) if math.isfinite(value) else "" for value in rounded_values]


def text_cells(words: Sequence[str | None], codes: NDArray[np.integer[Any]]) -> list[str]:
    """A column of texts that `codes` number, as cells with their quotes, ready to be joined; -1 counts from the end."""
    cells = []
    for word in words:
        buffer = io.StringIO()
        # A second, empty cell: one alone would be quoted where it is empty.
        csv.writer(buffer, lineterminator="").writerow([csv_cell(word), ""])
        cells.append(buffer.getvalue()[:-1])
    return [cells[code] for code in codes.tolist()]
