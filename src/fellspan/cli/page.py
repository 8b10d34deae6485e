"""The terminal page of a plan, at 80 columns: a summary of all links, then each link, decision first.

Shows what planning found and computes nothing.
"""

from collections.abc import Sequence

from fellspan.cli import figures
from fellspan.cli.layout import Ink, padded, printable, rule, table, wrapped
from fellspan.cli.link_page import link_lines, verdict_tone
from fellspan.planning.plan import LinkFailure, LinkPlan, StudyPlan

_WIDTHS = (31, 7, 11, 19, 8)
_RIGHT = (1, 4)


def page_lines(plan: StudyPlan, *, ink: Ink) -> list[str]:
    """The page as lines without line ends."""
    lines = _title(plan, ink)
    if len(plan.links) + len(plan.failures) > 1:
        lines += ["", *_summary(plan, ink)]
    for link in plan.links:
        lines += ["", rule(), *link_lines(link, ink=ink, told=plan.cautions)]
    for failure in plan.failures:
        lines += ["", rule(), *_failure(failure, ink)]
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
    heads = table(("Link", "km", "Path", "Clearance", "Margin"), (), widths=_WIDTHS, right=_RIGHT)
    tones = [*(verdict_tone(link.result.verdict) for link in plan.links), *("bad" for _ in plan.failures)]
    return [ink.emphasise(heads[0]), *(_coloured(row, tone, ink) for row, tone in zip(rows, tones, strict=True))]


def _coloured(row: Sequence[str], tone: str, ink: Ink) -> str:
    """A summary line with its verdict in colour; filled to width first, since colour codes have none."""
    cells = [
        padded(printable(cell), width, right=index in _RIGHT)
        for index, (cell, width) in enumerate(zip(row, _WIDTHS, strict=True))
    ]
    cells[2] = ink.emphasise(row[2], tone) + cells[2][len(row[2]) :]
    return " ".join(cells).rstrip()


def _summary_row(plan: LinkPlan) -> Sequence[str]:
    result = plan.result
    governing = result.clearance[result.governing] if result.clearance else None
    margins = [value for value in (result.margin_db.at_a, result.margin_db.at_b) if value is not None]
    return (
        result.name,
        f"{result.distance_m / 1000:.2f}",
        result.verdict,
        "" if governing is None else figures.by_how_much(governing),
        f"{min(margins):.1f} dB" if margins else "-",
    )


def _failed_row(failure: LinkFailure) -> Sequence[str]:
    return (failure.link.name, "-", "not planned", "see below", "-")


def _failure(failure: LinkFailure, ink: Ink) -> list[str]:
    name = padded(printable(failure.link.name), 66).rstrip()
    what = [line for text in (failure.error.what, *failure.error.details) for line in wrapped(text, first="  ")]
    return [f"{ink.emphasise(name)}: {ink.emphasise('not planned', 'bad')}", *what]
