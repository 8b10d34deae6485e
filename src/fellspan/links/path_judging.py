"""The path of one link judged: every criterion, the sight line, doubts, and the verdict they add up to; no signal, no words.

Apart from `assess`, so that a search over heights asks for the verdict alone, which takes a part of the work.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.links import verdicts
from fellspan.links.criteria import Criterion
from fellspan.links.doubts import Doubt, below_left_out, beside_path
from fellspan.links.ends import EndLevel
from fellspan.links.evaluate import criterion_result
from fellspan.links.levels import PathLevels
from fellspan.links.own_building import Standing
from fellspan.links.result import CriterionResult
from fellspan.links.verdicts import SightLine
from fellspan.terrain.profile import PathProfile
from fellspan.vocabulary import PathVerdict


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PathJudgement:
    """What is decided of a path; `confidence` is the least probability over the criteria, 0 to 1."""

    results: tuple[CriterionResult, ...]
    sight: SightLine
    confidence: float
    doubts: tuple[Doubt, ...]
    beside: tuple[str, ...]
    """Cautions of what stands beside the path."""
    verdict: PathVerdict


def judge_path(
    profile: PathProfile,
    stands: Standing,
    levels: PathLevels,
    criteria: tuple[Criterion, ...],
    *,
    ends: tuple[EndLevel, EndLevel],
    errors_m: NDArray[np.float64],
    median_k: float,
    frequency_hz: float,
    confidence_asked: float,
) -> PathJudgement:
    """Judge the levels of one path; `errors_m` is the standard error of the clearance at each of its samples."""
    results = tuple(
        criterion_result(criterion, row, profile=profile, standing=stands, levels=levels, errors_m=errors_m)
        for row, criterion in enumerate(criteria)
    )
    confidence = min(result.probability or 0.0 for result in results)
    sight = verdicts.sight_line(profile, stands, levels, median_k=median_k)
    beside, cautions = beside_path(profile, levels, criteria, median_k=median_k, frequency_hz=frequency_hz)
    roofs = (Doubt(clause=clause, extra=None) for level in ends for clause in level.doubts)
    doubts = (*below_left_out(profile, stands, levels, median_k=median_k), *beside, *roofs)
    verdict = verdicts.path_verdict(
        results, sight, confidence=confidence, confidence_asked=confidence_asked, doubts=doubts
    )
    return PathJudgement(
        results=results, sight=sight, confidence=confidence, doubts=doubts, beside=cautions, verdict=verdict
    )
