"""Laying out text on a terminal: wrapping, columns, rules, emphasis. Knows nothing of links."""

import os
import re
import sys
import textwrap
from collections.abc import Iterable, Sequence

WIDTH = 80
_RUN_ON = "    "
_BEGINS_PATH = re.compile(r"(?:~|\.{1,2})?/")
_HAS_ENDING = re.compile(r"\.\w{1,5}[:,;]?$")
_BOLD, _GREEN, _YELLOW, _RED, _PLAIN = "\x1b[1m", "\x1b[32m", "\x1b[33m", "\x1b[31m", "\x1b[0m"
_TONES = {"good": _GREEN, "doubt": _YELLOW, "bad": _RED, "strong": ""}


class Ink:
    """Emphasis for a terminal; text as it is where colours are off. Words always say what a colour says."""

    def __init__(self, *, colours: bool) -> None:
        self.colours = colours

    def emphasise(self, text: str, tone: str = "strong") -> str:
        """Text in bold and in the colour of `tone`: 'good', 'doubt', 'bad' or 'strong' (no colour)."""
        return f"{_BOLD}{_TONES[tone]}{text}{_PLAIN}" if self.colours else text


def colours_wanted() -> bool:
    """Colours only on a terminal that shows them, and not where the reader asked for none (NO_COLOR)."""
    return sys.stdout.isatty() and not os.environ.get("NO_COLOR") and os.environ.get("TERM") != "dumb"


def printable(text: str) -> str:
    """A user's text on one line, without control characters that a terminal would obey."""
    return "".join(char if char.isprintable() else " " for char in text)


def columns_of(text: str) -> int:
    """How many columns a terminal gives to the text."""
    if text.isascii():
        return len(text)
    import unicodedata

    return sum(
        0 if unicodedata.combining(char) else 2 if unicodedata.east_asian_width(char) in "WF" else 1 for char in text
    )


def cut(text: str, width: int) -> str:
    """Text of at most `width` columns, ending in '...' where it was longer."""
    if columns_of(text) <= width:
        return text
    kept = ""
    for char in text:
        if columns_of(kept + char) > width - 3:
            break
        kept += char
    return kept + "..."


def padded(text: str, width: int, *, right: bool = False) -> str:
    """Text cut or filled to exactly `width` columns."""
    text = cut(text, width)
    fill = " " * (width - columns_of(text))
    return fill + text if right else text + fill


def wrapped(text: str, *, first: str = "", rest: str | None = None) -> list[str]:
    """A paragraph in lines of at most 80 columns: `first` before the first line, `rest` (else blanks) before the others."""
    lines = textwrap.wrap(
        printable(text),
        width=WIDTH,
        initial_indent=first,
        subsequent_indent=" " * len(first) if rest is None else rest,
        break_on_hyphens=False,
    )
    return [part for line in lines or [first.rstrip()] for part in _within_width(line)]


def message_lines(message: str) -> list[str]:
    """A message for standard error in lines of 80 columns, a detail with its indentation and what runs on four blanks in.

    Broken between words alone, and never inside a path or a quoted value, so that both can be copied: one that is longer
    than a line stands out over it.
    """
    return [part for line in message.splitlines() for part in _message_line(line)]


def _message_line(line: str) -> Iterable[str]:
    text = printable(line).rstrip()
    words = _kept_together(text.split())
    shown = text[: len(text) - len(text.lstrip())]
    for number, word in enumerate(words):
        too_long = columns_of(shown) + 1 + columns_of(word) > WIDTH
        # A word too long for any line stays behind the name of the program.
        if number and too_long and (number > 1 or columns_of(word) <= WIDTH - len(_RUN_ON)):
            yield shown
            shown = f"{_RUN_ON}{word}"
        else:
            shown += f" {word}" if number else word
    yield shown


def _kept_together(words: Sequence[str]) -> list[str]:
    """Words, those of one quoted value or of one path joined again."""
    kept: list[str] = []
    at = 0
    while at < len(words):
        last = max(_end_of_quoted(words, at), _end_of_path(words, at))
        kept.append(" ".join(words[at : last + 1]))
        at = last + 1
    return kept


def _end_of_quoted(words: Sequence[str], at: int) -> int:
    """Index of the word that closes the quote opened in the word `at`; `at` itself where none is."""
    opened = re.match(r"""[(\[{<=]*(?:--?[\w-]+=|[\w.]+=)?(['"])""", words[at])
    if opened is None:
        return at
    closes = re.compile(rf"{opened[1]}[\])}}>.,:;?!]*$")
    rest = (words[at][opened.end() :], *words[at + 1 :])
    return next((at + step for step, word in enumerate(rest) if closes.search(word)), at)


def _end_of_path(words: Sequence[str], at: int) -> int:
    """Index of the last word of the path that begins with the word `at`: blanks in its folders, and before its ending."""
    if not _BEGINS_PATH.match(words[at]):
        return at
    last = at
    for index in range(at, len(words)):
        if index > at and _BEGINS_PATH.match(words[index]):
            break
        if "/" in words[index]:
            last = index
        if words[index].endswith((":", ",", ";")):
            break
    if "." in words[last].rpartition("/")[2] or words[last].endswith((":", ",", ";")):
        return last
    # What it says of a file stands behind a colon; without one a name of a few words is taken for part of it.
    rest = range(last + 1, len(words))
    told = (index for index in rest if _HAS_ENDING.search(words[index]) and words[index].endswith(":"))
    near = (index for index in rest[:3] if _HAS_ENDING.search(words[index]))
    return next(told, next(near, last))


def _within_width(line: str) -> Iterable[str]:
    """Lines of wide characters are broken again, since wrapping counts characters."""
    while columns_of(line) > WIDTH:
        fits = next(count for count in range(len(line), 0, -1) if columns_of(line[:count]) <= WIDTH)
        yield line[:fits]
        line = line[fits:]
    yield line


def labelled(label: str, text: str, *, indent: int = 2, label_width: int = 14) -> list[str]:
    """A paragraph with its label to the left."""
    return wrapped(text, first=" " * indent + padded(label, label_width) + " ")


def table(
    heads: Sequence[str], rows: Iterable[Sequence[str]], *, widths: Sequence[int], right: Sequence[int] = ()
) -> list[str]:
    """Rows in columns of the given widths, one blank apart; the columns listed in `right` are set to the right."""
    listed = [tuple(heads), *(tuple(map(printable, row)) for row in rows)]
    return [
        " ".join(
            padded(cell, width, right=index in right)
            for index, (cell, width) in enumerate(zip(row, widths, strict=True))
        ).rstrip()
        for row in listed
    ]


def rule() -> str:
    """A line across the page."""
    return "-" * WIDTH
