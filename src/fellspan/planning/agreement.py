"""One voice: the verdict and its sentences take over what the closer look at errors and heights found.

`links` judges with errors that hang together all along the path; `design` draws them as they are. Where the draws are less
sure, they count, and the heights to build to are those that passed them. Works out nothing itself.
"""

from dataclasses import replace

from fellspan.design.confidence import ConfidenceResult
from fellspan.design.heights_result import HeightKind, HeightsResult
from fellspan.links.result import ExtraHeight, LinkResult
from fellspan.links.verdicts import RAISING_BEGINS, met_sentence, raise_sentence


def one_voice(result: LinkResult, heights: HeightsResult, confidence: ConfidenceResult) -> LinkResult:
    """The result with the lesser of both confidences, the verdict that it allows, and the heights of the closer look."""
    sure = min(result.confidence, confidence.all_hold)
    verdict = "marginal" if result.verdict == "clear" and sure < result.confidence_asked else result.verdict
    sentences = list(result.reasons)
    told = met_sentence(
        result.verdict, result.basis, confidence=result.confidence, confidence_asked=result.confidence_asked
    )
    if sentences[0] == told:
        sentences[0] = met_sentence(verdict, result.basis, confidence=sure, confidence_asked=result.confidence_asked)
    raising = next((place for place, words in enumerate(sentences) if words.startswith(RAISING_BEGINS)), None)
    if verdict != "clear":
        words = raise_sentence(
            _extra(heights), heights.confidence, step_m=0.1
        )  # the masts themselves are in whole steps
        if raising is not None:
            sentences[raising] = words
        elif verdict != result.verdict:
            sentences.insert(min(2, len(sentences)), words)
    return replace(result, confidence=sure, verdict=verdict, reasons=tuple(sentences))


def _extra(heights: HeightsResult) -> ExtraHeight:
    """What to add to the masts as planned, m; None where no height at that end alone will do."""
    a, b, alike = (_build(heights, kind) for kind in ("a alone", "b alone", "alike"))
    planned = heights.planned
    return ExtraHeight(
        a=None if a is None else a[0] - planned.a_m,
        b=None if b is None else b[1] - planned.b_m,
        both=None if alike is None else max(alike[0] - planned.a_m, alike[1] - planned.b_m),
    )


def _build(heights: HeightsResult, kind: HeightKind) -> tuple[float, float] | None:
    option = heights.option(kind)
    return None if option is None or option.build is None else (option.build.a_m, option.build.b_m)
