"""Values as the text of TOML, so that they read back the same. Knows no keys and no tables of a study."""

import math
import re

_BANDS = (("GHz", 1e9), ("MHz", 1e6), ("kHz", 1e3))
_MUST_ESCAPE = re.compile(r'["\\\x00-\x1f\x7f]')
_SHORT_ESCAPES = {'"': '\\"', "\\": "\\\\", "\n": "\\n", "\t": "\\t", "\r": "\\r"}


def quoted(text: str) -> str:
    """A TOML basic string: quotes, backslashes and control characters escaped."""
    return '"' + _MUST_ESCAPE.sub(lambda found: _SHORT_ESCAPES.get(found[0], f"\\u{ord(found[0]):04x}"), text) + '"'


def table(heading: str, *pairs: tuple[str, str | None]) -> str:
    """A table; pairs without a value are left out."""
    return "\n".join([heading, *(f"{key} = {value}" for key, value in pairs if value is not None), ""])


def inline(*pairs: tuple[str, str | None]) -> str:
    """A table on one line; pairs without a value are left out."""
    return f"{{ {', '.join(f'{key} = {value}' for key, value in pairs if value is not None)} }}"


def number(value: float) -> str:
    """The shortest text that reads back to the same float, without a needless '.0'."""
    if math.isinf(value):
        return "inf" if value > 0 else "-inf"
    text = repr(float(value))
    return text[:-2] if text.endswith(".0") else text


def plain(value: float | None) -> str | None:
    """A number without a unit, or nothing."""
    return None if value is None else number(value)


def with_unit(value: float | None, unit: str) -> str | None:
    """A quantity as text with its unit, or nothing."""
    return None if value is None else f'"{number(value)} {unit}"'


def metres(value: float | None) -> str | None:
    """A length, or nothing."""
    return with_unit(value, "m")


def decibels(value: float | None) -> str | None:
    """A loss, or nothing where there is none."""
    return with_unit(value, "dB") if value else None


def hertz(frequency_hz: float | None) -> str | None:
    """A frequency or a width in the largest unit that reads back to the same float."""
    if frequency_hz is None:
        return None
    for unit, scale in _BANDS:
        text = number(round(frequency_hz / scale, 9))
        if frequency_hz >= scale and float(text) * scale == frequency_hz:
            return f'"{text} {unit}"'
    return f'"{number(frequency_hz)} Hz"'


def worded(text: str | None) -> str | None:
    """Text in quotes, or nothing."""
    return quoted(text) if text else None
