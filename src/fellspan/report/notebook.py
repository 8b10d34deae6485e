"""Results in a notebook: a verdict line, a small table, and for a planned link its path profile. Computes nothing.

The drawing is a picture inside the HTML, so that its styles and those of the notebook leave each other alone; colours of text
are the notebook's own.
"""

import base64
import re
from html import escape
from typing import Final

from fellspan.links import radio_words, words
from fellspan.links.result import LinkResult
from fellspan.links.words import state_of
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.report import wording
from fellspan.report.drawing_files import stand_alone
from fellspan.report.neighbours import left_by_neighbours
from fellspan.report.profile_drawing import draw_profile, profile_text
from fellspan.report.section import FULL
from fellspan.report.signal_section import availability_short
from fellspan.showing import Writers

_SVG = re.compile(r'<svg class="([^"]*)"([^>]*)>(.*)</svg>', re.DOTALL)
_CELL: Final = "text-align:left;padding:2px 10px"


def link_result_html(result: LinkResult) -> str:
    """The decision and its numbers."""
    return f"<div>{_decision(result)}{_numbers(result)}</div>"


def link_plan_html(plan: LinkPlan) -> str:
    """The decision, the path profile and the numbers of a planned link."""
    found = _SVG.search(draw_profile(plan, uid="profile", sheet=FULL))
    picture = ""
    if found:
        data = base64.b64encode(stand_alone(found[1], found[2], found[3]).encode("utf-8")).decode("ascii")
        alt = _text(profile_text(plan))
        picture = f'<img src="data:image/svg+xml;base64,{data}" alt="{alt}" style="width:100%;max-width:920px">'
    heights = "" if plan.heights is None else f"<p>{_text(plan.heights.decision)}</p>"
    return f"<div>{_decision(plan.result)}{picture}{heights}{_numbers(plan.result)}</div>"


def study_plan_html(plan: StudyPlan) -> str:
    """A row for each link of a study, and what could not be planned."""
    heads = ("Link", "Path", "Basis", "Length", "Clearance", "Signal", "Margin, dB", "Available")
    rows = [_row(link.result) for link in plan.links]
    lost = "".join(
        f"<p>Not planned: {_text(failure.link.name)}: {_text(failure.error.what)}</p>" for failure in plan.failures
    )
    return f"<div><p><b>{_text(plan.study.title)}</b></p>{_table(heads, rows)}{lost}</div>"


WRITERS: Final[Writers] = {LinkResult: link_result_html, LinkPlan: link_plan_html, StudyPlan: study_plan_html}


def _text(words: str) -> str:
    return escape(wording.clean(words))


def _decision(result: LinkResult) -> str:
    state = wording.STATE_WORD[state_of(result)]
    return (
        f"<p><b>{_text(result.name)}</b>: <b>{state}</b>, {wording.BASIS_WORD[result.basis]}; signal "
        f"{_text(wording.signal_words(result))}.<br>{_text(wording.headline(result))}</p>"
    )


def _numbers(result: LinkResult) -> str:
    governing = result.clearance[result.governing]
    received, margin, left = result.received_dbm, result.margin_db, left_by_neighbours(result)
    rows = [
        ("Length", wording.distance(result.distance_m)),
        (
            "Bearing A to B, B to A",
            f"{wording.bearing(result.bearing_ab_deg)}, {wording.bearing(result.bearing_ba_deg)}",
        ),
        ("Frequency", wording.frequency(result.frequency_hz)),
        ("Governing criterion", f"{governing.criterion}: {wording.decisive_words(governing)}"),
        (
            "Confidence",
            f"{wording.probability(result.confidence)}, {wording.probability(result.confidence_asked)} asked",
        ),
        ("Level at A, at B", f"{wording.decibels(received.at_a, 'dBm')}, {wording.decibels(received.at_b, 'dBm')}"),
        ("Margin at A, at B", f"{wording.decibels(margin.at_a)}, {wording.decibels(margin.at_b)}"),
        *(
            ()
            if left is None
            else (("With neighbours", f"{wording.decibels(left.at_a)}, {wording.decibels(left.at_b)}"),)
        ),
        ("Available", _available(result)),
    ]
    return _table((), rows)


def _available(result: LinkResult) -> str:
    """The share of the year; where there are neighbours, that it does not count them."""
    share = availability_short(result)
    out = share and result.signal is not None and radio_words.leaves_neighbours_out(result.signal)
    return f"{share}, neighbours left out" if out else share or "–"


def _margin(result: LinkResult) -> str:
    """What decides: the margin at the weaker end with neighbours, and without where they take what is seen."""
    alone, left = words.least_db(result.margin_db), words.least_db(words.decisive_margin_db(result))
    said = wording.decibels(left, "")
    return (
        f"{said} with neighbours, {wording.decibels(alone, '')} without" if words.are_told_apart(alone, left) else said
    )


def _row(result: LinkResult) -> tuple[str, ...]:
    return (
        result.name,
        wording.STATE_WORD[state_of(result)],
        result.basis,
        wording.distance(result.distance_m),
        wording.decisive_words(result.clearance[result.governing]),
        wording.signal_short(result),
        _margin(result),
        _available(result),
    )


def _table(heads: tuple[str, ...], rows: list[tuple[str, ...]] | list[tuple[str, str]]) -> str:
    head = "".join(f'<th scope="col" style="{_CELL}">{word}</th>' for word in heads)
    body = "".join(
        f'<tr><th scope="row" style="{_CELL}">{_text(row[0])}</th>'
        + "".join(f'<td style="{_CELL}">{_text(cell)}</td>' for cell in row[1:])
        + "</tr>"
        for row in rows
    )
    return f"<table>{f'<thead><tr>{head}</tr></thead>' if heads else ''}<tbody>{body}</tbody></table>"
