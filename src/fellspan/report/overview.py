"""What the overview shows beside the map: a row for each link, totals, hubs, and the survey list of the whole study.

Sorts and words what planning found and works nothing out but sums and counts.
"""

from collections import Counter
from dataclasses import dataclass
from typing import Final

from fellspan.design.heights_result import HeightKind, HeightsResult
from fellspan.links import radio_words, words
from fellspan.links.result import LinkResult
from fellspan.links.verdicts import USUAL_MAST_M
from fellspan.links.words import State, state_of
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.report import wording
from fellspan.report.as_built_section import verdict_words
from fellspan.report.naming import page_name
from fellspan.report.network import HUB_FROM, STATE_ORDER, Hub, hubs_of
from fellspan.report.panel_drawing import Panel, draw_panel
from fellspan.report.signal_section import availability_short
from fellspan.report.survey_groups import SurveyGroup, survey_groups

_SIGNAL_ORDER: Final = ("meets", "marginal", "below")


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """A cell of the table: what it says, and the number it sorts by where that is not what it says."""

    text: str
    sort: str = ""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Row:
    """One link: its card, its row and its small profile."""

    result: LinkResult
    state: State
    page: str
    anchor: str
    panel: Panel
    order: int
    """Place of the path verdict, the best first; 0 is clear."""
    signal: Cell
    distance: Cell
    spare: Cell
    confidence: Cell
    levels: Cell
    margin: Cell
    """What neighbours leave of it, at the weaker end."""
    alone: str
    """The margin without neighbours, where they take what is seen."""
    availability: Cell
    build: str
    built: str
    """Verdict on the link as built, where it was measured."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class OverviewView:
    """What the template shows."""

    rows: tuple[Row, ...]
    states: Counter[State]
    signals: tuple[tuple[str, int], ...]
    """Words and count of each kind of signal verdict that occurs."""
    length_m: float
    hubs: tuple[Hub, ...]
    joints: tuple[Hub, ...]
    """Sites with two links."""
    survey: tuple[SurveyGroup, ...]
    points: int
    neighbours_left_out: bool
    """Whether any link has neighbours on its channel, which availability does not count."""


def overview_view(plan: StudyPlan) -> OverviewView:
    """Everything beside the map."""
    signals = Counter(_signal(link.result).text for link in plan.links)
    survey = survey_groups(plan)
    sites = hubs_of(plan)
    return OverviewView(
        rows=tuple(_row(index, link) for index, link in enumerate(plan.links)),
        states=Counter(state_of(link.result) for link in plan.links),
        signals=tuple((word, signals[word]) for word in sorted(signals, key=_signal_order)),
        length_m=sum(link.result.distance_m for link in plan.links),
        hubs=tuple(site for site in sites if len(site.links) >= HUB_FROM),
        joints=tuple(site for site in sites if len(site.links) < HUB_FROM),
        survey=survey,
        points=sum(len(group.rows) for group in survey),
        neighbours_left_out=any(
            link.result.signal is not None and radio_words.leaves_neighbours_out(link.result.signal)
            for link in plan.links
        ),
    )


def _row(index: int, link: LinkPlan) -> Row:
    result = link.result
    governing = result.clearance[result.governing]
    received = result.received_dbm
    at = " / ".join(wording.decibels(value, "") for value in (received.at_a, received.at_b))
    spare = max(governing.clearance_m - governing.required_m, 0.0) if governing.met else -governing.shortfall_m
    return Row(
        result=result,
        state=state_of(result),
        page=page_name(index, result.name),
        anchor=f"link-{index + 1:02d}",
        panel=draw_panel(link),
        order=STATE_ORDER.index(state_of(result)),
        signal=_signal(result),
        distance=Cell(text=wording.distance(result.distance_m), sort=f"{result.distance_m:.0f}"),
        spare=Cell(text=wording.decisive_words(governing), sort=f"{spare:.2f}"),
        confidence=Cell(text=wording.probability(result.confidence), sort=f"{result.confidence:.4f}"),
        levels=Cell(text="–" if received.at_a is None and received.at_b is None else at),
        margin=_margin(result),
        alone=_alone(result),
        availability=_availability(result),
        build=_build(link.heights),
        built="" if link.as_built is None else verdict_words(link.as_built),
    )


def _margin(result: LinkResult) -> Cell:
    least = words.least_db(words.decisive_margin_db(result))
    if least is None or radio_words.verdict_why(result) == radio_words.THROUGH:
        return Cell(text="–")  # worked out past what stands in the way: nothing to rely on
    return Cell(text=wording.decibels(least, ""), sort=f"{least:.2f}")


def _alone(result: LinkResult) -> str:
    alone = words.least_db(result.margin_db)
    told = words.are_told_apart(alone, words.least_db(words.decisive_margin_db(result)))
    return wording.decibels(alone, "") if told and _margin(result).sort else ""


def _signal(result: LinkResult) -> Cell:
    text = wording.signal_short(result)
    return Cell(text=text, sort=str(_signal_order(text)))


def _signal_order(text: str) -> int:
    return _SIGNAL_ORDER.index(text) if text in _SIGNAL_ORDER else len(_SIGNAL_ORDER) + (text != "not computed")


def _availability(result: LinkResult) -> Cell:
    year = result.availability_percent.year
    text = availability_short(result)
    return Cell(text=text or "–", sort=f"{year:.6f}" if text and year is not None else "")


def _build(heights: HeightsResult | None) -> str:
    """What to add to the masts as planned, a phrase; the page of the link says the rest."""
    if heights is None:
        return "–"
    if heights.planned_holds:
        return "as planned"
    planned = heights.planned
    ways = []
    kinds: tuple[tuple[HeightKind, str], ...] = (("a alone", "A"), ("b alone", "B"), ("alike", "both"))
    for kind, word in kinds:
        option = heights.option(kind)
        pair = option.build if option else None
        if pair is not None and max(pair.a_m, pair.b_m) <= USUAL_MAST_M:
            more = pair.b_m - planned.b_m if kind == "b alone" else pair.a_m - planned.a_m
            ways.append(f"{word} {wording.number(words.up_m(more), sign=True).removesuffix('.0')} m")
    return " or ".join(ways) if ways else "not by usual masts"
