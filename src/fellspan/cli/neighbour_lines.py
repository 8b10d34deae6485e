"""The terminal block on neighbours: the worst pair, who hears whom, what fights at one site.

Shows what planning found and computes nothing.
"""

from typing import Final

from fellspan.cli import figures
from fellspan.cli.layout import Ink, table, wrapped
from fellspan.links.interference_result import InterferenceResult, StudyInterference

_WIDTHS: Final = (24, 24, 8, 9, 9)
_MOST_ROWS, _MOST_WARNINGS = 5, 3


def neighbour_lines(found: StudyInterference, ink: Ink) -> list[str]:
    """The block as lines without line ends; only the worst receivers are listed."""
    heard = [one for one in found.receivers if one.interferers]
    lines = [ink.emphasise("Neighbours")]
    if found.worst is None:
        lines += wrapped("No link of this study hears another on its channel.", first="  ")
    else:
        lines += wrapped(found.worst, first="  ")
        heads = ("Heard at", "from most of all", "C/I dB", "raised dB", "margin dB")
        rows = [_row(one) for one in heard[:_MOST_ROWS]]
        lines += ["  " + line for line in table(heads, rows, widths=_WIDTHS, right=(2, 3, 4))]
        if len(heard) > _MOST_ROWS:
            lines += wrapped(f"and {len(heard) - _MOST_ROWS} more, all in results.json.", first="  ")
    fights = found.warnings[: len(found.high_low)]
    told = [*fights[:_MOST_WARNINGS], *_more(len(fights) - _MOST_WARNINGS), *_too_near(found)]
    return lines + [line for warning in told for line in wrapped(warning, first="  ! ", rest="    ")]


def _more(count: int) -> list[str]:
    return [f"{count} more high/low conflicts, all in results.json."] if count > 0 else []


def _too_near(found: StudyInterference) -> list[str]:
    """Where antennas stand nearer than the separation to keep; the far field is left to the pages."""
    sites = list(dict.fromkeys(pair.site for pair in found.near if pair.is_close))
    if not sites:
        return []
    named = ", ".join(f"'{site}'" for site in sites[:_MOST_WARNINGS])
    rest = len(sites) - _MOST_WARNINGS
    keep_m = max(pair.keep_m for pair in found.near if pair.is_close)
    if rest > 0:
        named += f" and {rest} more sites"
    words = (
        f"Antennas of different links are typed too near each other at {named}: keep up to {keep_m:.1f} m (common practice, "
        "no source), and give each its own position and height."
    )
    return [words]


def _row(one: InterferenceResult) -> tuple[str, ...]:
    return (
        f"{one.end} of {one.link}",
        f"{one.interferers[0].end} of {one.interferers[0].link}",
        _number(one.c_i_db),
        _number(one.threshold_degradation_db),
        figures.decibels(one.effective_margin_db, ""),
    )


def _number(value: float | None) -> str:
    return "-" if value is None else f"{value + 0.0:.1f}".replace("-0.0", "0.0")
