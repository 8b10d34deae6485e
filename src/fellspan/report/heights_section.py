"""The heights of one link on its page: the decision, the trade-off, a table and how sure it is. Computes nothing."""

from dataclasses import dataclass
from typing import Final

from markupsafe import Markup

from fellspan.design.confidence import ConfidenceResult
from fellspan.design.heights_result import HEIGHT_WORDS, HeightOption, HeightsResult, Pair
from fellspan.planning.plan import LinkPlan
from fellspan.report import wording
from fellspan.report.heights_drawing import draw_heights, heights_words, shows_what_works


@dataclass(frozen=True, slots=True, kw_only=True)
class HeightsSection:
    """What the link page shows; `rows` hold words, exact pair, pair to build, probability, what governs, what a metre buys."""

    decision: str
    chart: Markup
    key: str
    """How to read the chart."""
    pairs: str
    """The chart in words; on paper the table beside it says them."""
    rows: tuple[tuple[str, str, str, str, str, str], ...]
    notes: tuple[str, ...]
    governs: str
    """What governs every row, told once; '' where rows differ."""
    sure: str
    steps: tuple[tuple[str, str, str, str], ...]
    """Confidence, and what to add for it at A alone, at B alone, at both."""
    assumptions: tuple[str, ...]
    cautions: tuple[str, ...]


_SHADED: Final = "Shaded: works with the confidence asked. Broken line: exact on the heights in the data."
_BEYOND: Final = "No heights on this sheet work: those that would lie beyond it."


def heights_section(link: LinkPlan) -> HeightsSection | None:
    """The section of a link; None where heights were not worked out."""
    heights, confidence = link.heights, link.confidence
    if heights is None or confidence is None:
        return None
    ends = link.result.ends
    notes = dict.fromkeys(option.note for option in heights.options if option.note)
    told = tuple(_row(option) for option in heights.options)
    return HeightsSection(
        decision=heights.decision,
        chart=Markup(draw_heights(heights, uid="heights", names=(ends.a.site, ends.b.site))),
        key=_SHADED if shows_what_works(heights) else _BEYOND,
        pairs=heights_words(heights),
        rows=told,
        notes=(
            _legend(heights),
            *(f"{note[0].upper()}{note[1:]}." for note in notes),
            *((errors,) if (errors := _errors(heights)) else ()),
            heights.checked,
        ),
        governs=told[0][4] if len({row[4] for row in told}) == 1 else "",
        sure=f"As planned every criterion holds with {wording.probability(confidence.all_hold)} probability."
        f"{_lower(confidence)}",
        steps=_steps(confidence),
        assumptions=confidence.assumptions,
        cautions=heights.cautions,
    )


def _lower(confidence: ConfidenceResult) -> str:
    """What a minus means where the masts are higher than need be."""
    added = [value for one in confidence.heights for value in (one.a_m, one.b_m, one.both_m) if value is not None]
    return " A minus: by so much it could be lower." if any(value < 0.0 for value in added) else ""


def _legend(heights: HeightsResult) -> str:
    return (
        f"Exact: on the heights in the data. To build: with {wording.percent(heights.confidence)} confidence, up to whole "
        f"steps of {heights.step_m:g} m. Counted from: A {heights.base_a}; B {heights.base_b}."
    )


def _row(option: HeightOption) -> tuple[str, str, str, str, str, str]:
    touch = option.governs
    governs, more = "–", "–"
    if touch is not None:
        governs = f"{touch.cause}, {wording.distance(touch.at_m)} from A ({touch.criterion})"
        more = "; ".join(f"{item.end} {wording.metres(item.spare_m, 2)}" for item in option.more)
    likely = wording.probability(option.probability) if option.probability is not None else "–"
    return (HEIGHT_WORDS[option.kind], _pair(option.raw, 2), _pair(option.build, 1), likely, governs, more)


def _errors(heights: HeightsResult) -> str:
    """How well the points that govern are known, from the least to the most; '' where none governs."""
    touches = [option.governs for option in heights.options if option.governs is not None]
    if not touches:
        return ""
    sigmas, samplings = [one.sigma_m for one in touches], [one.sampling_m for one in touches]
    return f"Error of the data there {_range(sigmas)}, sampling {_range(samplings)}."


def _range(values_m: list[float]) -> str:
    least, most = _small(min(values_m)), _small(max(values_m))
    return least if least == most else f"{least} to {most}"


def _small(value_m: float) -> str:
    return wording.metres(value_m, 2) if value_m >= 0.05 else "under 0.05 m"


def _pair(pair: Pair | None, digits: int) -> str:
    return "–" if pair is None else f"{wording.number(pair.a_m, digits)} / {wording.metres(pair.b_m, digits)}"


def _steps(confidence: ConfidenceResult) -> tuple[tuple[str, str, str, str], ...]:
    def add(value_m: float | None) -> str:
        return wording.metres(value_m, sign=True)

    return tuple(
        (wording.percent(one.confidence), add(one.a_m), add(one.b_m), add(one.both_m)) for one in confidence.heights
    )
