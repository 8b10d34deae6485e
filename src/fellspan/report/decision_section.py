"""The head of a link's page: what was decided, what to build, what could change it, what to check first.

Sorts the sentences that planning made under these heads, and says each once; works nothing out.
"""

from dataclasses import dataclass
from typing import Final, Literal

from fellspan.design.survey_list import SurveyPoint, label_of
from fellspan.links import radio_words, words
from fellspan.links.result import AntennaResult, EndResult, LinkResult
from fellspan.links.signal_words import AVAILABLE_BEGINS, LEVEL_BEGINS, TREES_HOLD
from fellspan.links.verdicts import RAISING_BEGINS
from fellspan.links.words import State
from fellspan.planning.plan import LinkPlan
from fellspan.report import wording

MOST_CHECKS: Final = 3
_SIGNAL_BEGINS: Final = (
    LEVEL_BEGINS,
    TREES_HOLD,
    AVAILABLE_BEGINS,
    "Availability ",
    "The level is short",
    "Mean throughput",
)
_WATER: Final = ("sea", "Earth bulge over the sea")
"""What cannot be measured as a top: the names that causes give to open water."""
_DOUBT_BEGINS: Final = (
    "Basis:",
    "Against 'clear'",
    "The confidence is",
    "Left out at",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class EndToBuild:
    """One end as it is to be built: name of the site, what hangs where, and which way it looks."""

    letter: str
    site: str
    mount: str
    aim: str


@dataclass(frozen=True, slots=True, kw_only=True)
class DecisionSection:
    """What the head shows; `build` is empty where the masts stay as planned. `more` counts the points that are not shown."""

    path: tuple[str, ...]
    signal: tuple[str, ...]
    signal_state: State | Literal["failed"]
    """The look of the signal's word: that of the path's verdict that says as much."""
    build: str
    ends: tuple[EndToBuild, ...]
    changes: tuple[str, ...]
    checks: tuple[tuple[str, str, str], ...]
    more: int
    probabilities: tuple[float | None, ...]
    """Of each criterion alone, in the order of the result: from the draws where they were made."""
    drawn: bool


def decision_section(link: LinkPlan, *, number: int, growth_years: float) -> DecisionSection:
    """The head of a link's page, `number` being its place in the study from 1."""
    result = link.result
    reasons = result.reasons[1:]
    signal = tuple(line for line in reasons if line.startswith(_SIGNAL_BEGINS))
    raising = next((line for line in reasons if line.startswith(RAISING_BEGINS)), "")
    doubts = tuple(line for line in reasons if line.startswith(_DOUBT_BEGINS))
    rest = tuple(line for line in reasons if line not in signal and line != raising and line not in doubts)
    known = {} if link.confidence is None else {one.criterion: one.probability for one in link.confidence.criteria}
    to_check = [point for point in link.survey if point.highest_top_m is not None]
    return DecisionSection(
        path=rest,
        signal=signal,
        signal_state=_signal_state(result),
        build=raising,
        ends=_ends(result),
        changes=(*doubts, *_more_changes(link, growth_years)),
        checks=tuple(_check(point, number, link.profile.length_m) for point in to_check[:MOST_CHECKS]),
        more=len(link.survey) - min(len(to_check), MOST_CHECKS),
        probabilities=tuple(known.get(item.criterion, item.probability) for item in result.clearance),
        drawn=bool(known) and all(item.criterion in known for item in result.clearance),
    )


def _signal_state(result: LinkResult) -> State | Literal["failed"]:
    if radio_words.verdict_why(result) == radio_words.THROUGH or result.signal_verdict == "below":
        return "obstructed"
    if result.signal_verdict is None:
        return "failed"
    return "clear" if result.signal_verdict == "meets" else "marginal"


def _ends(result: LinkResult) -> tuple[EndToBuild, ...]:
    antennas = result.antennas
    return (
        _end("A", result.ends.a, None if antennas is None else antennas.a, result.bearing_ab_deg, result.tilt_ab_deg),
        _end("B", result.ends.b, None if antennas is None else antennas.b, result.bearing_ba_deg, result.tilt_ba_deg),
    )


def _end(letter: str, end: EndResult, antenna: AntennaResult | None, bearing_deg: float, tilt_deg: float) -> EndToBuild:
    if antenna is not None:
        # What the antenna points to, which is not the other end where it is a sector or aimed between two.
        bearing_deg, tilt_deg = antenna.bearing_deg, antenna.tilt_deg
    return EndToBuild(
        letter=letter,
        site=end.site,
        mount=f"{end.height_as_given}{f', {antenna.name}' if antenna is not None and antenna.name else ''}",
        aim=f"{wording.bearing(bearing_deg)} true, tilt {wording.degrees(tilt_deg, 1, sign=True)}",
    )


def _more_changes(link: LinkPlan, growth_years: float) -> list[str]:
    found = []
    if growth_years > 0.0:
        found.append(f"Trees are taken as they will stand in {growth_years:g} years.")
    reflections = link.reflections
    fades = [] if reflections is None else [line for line in reflections.sentences if "fades reach" in line]
    return found + fades[:1]


def _to_do(point: SurveyPoint) -> str:
    return "check high water and both antenna heights" if point.stands_there in _WATER else "measure the top"


def _check(point: SurveyPoint, number: int, length_m: float) -> tuple[str, str, str]:
    """Label, place and what it is, and the figure to hold it against."""
    assert point.highest_top_m is not None
    limit = wording.metres(words.down_m(point.highest_top_m))
    place = f"{wording.kilometres(point.from_a_m, length_m=length_m)} km from A: {point.stands_there}"
    if point.spare_m is not None and point.spare_m < 0.0:
        told = f"in the data {wording.missing(-point.spare_m)} too high, {limit} at most; {_to_do(point)}"
    else:
        told = f"top no higher than {limit}, {wording.metres(point.top_m)} in the data"
    return label_of(number, point.rank), place, told
