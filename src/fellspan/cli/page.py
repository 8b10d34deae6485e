"""The terminal page of a plan, at 80 columns: a summary of all links, then each link, decision first.

Shows what planning found and computes nothing.
"""

from collections.abc import Sequence

from fellspan.cli import figures
from fellspan.cli.layout import WIDTH, Ink, message_lines, padded, printable, rule, table, wrapped
from fellspan.cli.link_page import decision_lines, link_lines, state_tone
from fellspan.cli.neighbour_lines import neighbour_lines
from fellspan.links import words
from fellspan.links.radio_words import THROUGH, verdict_why
from fellspan.links.safety import RAISING
from fellspan.links.words import STATE_WORDS, state_of
from fellspan.planning.plan import LinkFailure, LinkPlan, StudyPlan

_FIXED = (7, 15, 9)
_RIGHT = (1, 4)
_DECISION_LINES = 6


def page_lines(plan: StudyPlan, *, ink: Ink, brief: bool = False) -> list[str]:
    """The page as lines without line ends; `brief` shows of each link its decision alone."""
    lines = _title(plan, ink)
    if len(plan.links) + len(plan.failures) > 1:
        lines += ["", *_summary(plan, ink)]
    if plan.interference is not None:
        lines += ["", *neighbour_lines(plan.interference, ink)]
    for link in plan.links:
        if brief:
            lines += ["", *decision_lines(link.result, ink, most=_DECISION_LINES)]
        else:
            lines += ["", rule(), *link_lines(link, ink=ink, told=plan.cautions)]
    for failure in plan.failures:
        lines += ["", rule(), *_failure(failure, ink)]
    if brief:
        lines += ["", rule(), *_what_is_left_out(plan)]
    if plan.cautions:
        lines += ["", rule(), ink.emphasise("For the whole study")]
        lines += [line for caution in plan.cautions for line in wrapped(caution, first="  ! ")]
    return lines


def _title(plan: StudyPlan, ink: Ink) -> list[str]:
    study = plan.study
    stamp = [
        f"revision {study.revision}" if study.revision else "",
        f"planner {study.planner}" if study.planner else "",
        study.date.isoformat(),
        f"fellspan {plan.version}",
    ]
    title = wrapped(study.title)
    return [ink.emphasise(title[0]), *title[1:], *wrapped(", ".join(part for part in stamp if part))]


def _summary(plan: StudyPlan, ink: Ink) -> list[str]:
    rows = [*(_summary_row(link) for link in plan.links), *(_failed_row(failure) for failure in plan.failures)]
    km, clearance, margin = _FIXED
    path = max(len(row[2]) for row in rows)
    widths = (WIDTH - 4 - sum(_FIXED) - path, km, path, clearance, margin)
    heads = table(("Link", "km", "Path", "Clearance", "Margin"), (), widths=widths, right=_RIGHT)
    tones = [*(state_tone(state_of(link.result)) for link in plan.links), *("bad" for _ in plan.failures)]
    lines = [_coloured(row, tone, ink, widths) for row, tone in zip(rows, tones, strict=True)]
    if any(row[4].endswith("*") for row in rows):
        lines += wrapped("* what neighbours on the same channel leave of it", first="  ", rest="    ")
    return [ink.emphasise(heads[0]), *lines]


def _what_is_left_out(plan: StudyPlan) -> list[str]:
    """Where to read on, and the one caution that no short page may leave out."""
    lines = wrapped("Criteria, levels, aiming and cautions: --full shows them for every link, --link NAME for one.")
    if any(RAISING in link.result.cautions for link in plan.links):
        lines += wrapped(RAISING, first="  ! ")
    return lines


def _coloured(row: Sequence[str], tone: str, ink: Ink, widths: Sequence[int]) -> str:
    """A summary line with its verdict in colour; filled to width first, since colour codes have none."""
    cells = [
        padded(printable(cell), width, right=index in _RIGHT)
        for index, (cell, width) in enumerate(zip(row, widths, strict=True))
    ]
    cells[2] = ink.emphasise(row[2], tone) + cells[2][len(row[2]) :]
    return " ".join(cells).rstrip()


def _summary_row(plan: LinkPlan) -> Sequence[str]:
    result = plan.result
    governing = result.clearance[result.governing] if result.clearance else None
    margin = words.least_db(words.decisive_margin_db(result))
    star = "*" if words.are_told_apart(words.least_db(result.margin_db), margin) else " "
    if verdict_why(result) == THROUGH:
        margin, star = None, ""  # worked out past what stands in the way: nothing to rely on
    return (
        result.name,
        f"{result.distance_m / 1000:.2f}",
        STATE_WORDS[state_of(result)],
        "" if governing is None else figures.by_how_much(governing),
        "-" if margin is None else f"{figures.decibels(margin)}{star}",
    )


def _failed_row(failure: LinkFailure) -> Sequence[str]:
    return (failure.link.name, "-", "not planned", "see below", "-")


def _failure(failure: LinkFailure, ink: Ink) -> list[str]:
    name = padded(printable(failure.link.name), 66).rstrip()
    what = [line for text in (failure.error.what, *failure.error.details) for line in message_lines(f"  {text}")]
    return [f"{ink.emphasise(name)}: {ink.emphasise('not planned', 'bad')}", *what]
