"""From numbers to the decision: path verdict, basis, signal verdict, and the plain sentences that say why.

Reads results and levels; computes no physics. Sentences are for a person on a roof: the decision first, then what to do.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from fellspan.links import clearance
from fellspan.links.causes import cause_at
from fellspan.links.doubts import Doubt
from fellspan.links.levels import PathLevels
from fellspan.links.own_building import ROOF_SOURCE, Standing
from fellspan.links.result import AtEnds, CriterionResult, ExtraHeight, Ignored
from fellspan.links.words import down_m, up_m, zone_share
from fellspan.terrain.profile import MEASURED_TOP, PathProfile
from fellspan.vocabulary import Basis, PathVerdict, SignalVerdict

UNLISTED_M: Final = 25.0
"""What a tree or building that no data list may reach above ground, m (common practice, no source)."""
USUAL_MAST_M: Final = 60.0
"""More extra height than this is called beyond usual masts (common practice, no source)."""
SIGNAL_BAND_DB: Final = 3.0


@dataclass(frozen=True, slots=True, kw_only=True)
class SightLine:
    """The sight line at the median k: how far it is cut (negative: free by that much), where, and by what."""

    cut_m: float
    at_m: float
    cause: str


def sight_line(profile: PathProfile, standing: Standing, levels: PathLevels, *, median_k: float) -> SightLine:
    """The worst point of the sight line itself, zone left aside, at the median k."""
    bulge = clearance.bulge_m(levels.distance_m, k=median_k)
    cut = (levels.surface_m + bulge - levels.available_m)[1:-1]
    ends = (levels.surface_m - levels.available_m)[[0, -1]]
    index = 1 + clearance.worst_index(-cut, levels.distance_m[1:-1])
    if ends.max() > max(float(cut.max()), clearance.TOLERANCE_M):
        index = 0 if ends[0] >= ends[1] else levels.distance_m.size - 1
    available, surface = float(levels.available_m[index]), float(levels.surface_m[index])
    return SightLine(
        cut_m=surface + float(bulge[index]) - available,
        at_m=float(levels.distance_m[index]),
        cause=cause_at(
            profile,
            standing,
            index,
            available_m=available,
            bulge_m=float(bulge[index]),
            need_m=surface + float(bulge[index]),
        ),
    )


def path_verdict(
    results: tuple[CriterionResult, ...],
    sight: SightLine,
    *,
    confidence: float,
    confidence_asked: float,
    doubts: tuple[Doubt, ...] = (),
) -> PathVerdict:
    """'clear', 'marginal' or 'obstructed' (see docs/architecture.md, Verdicts)."""
    if sight.cut_m > clearance.TOLERANCE_M:
        return "obstructed"
    if all(result.met for result in results) and confidence >= confidence_asked and not doubts:
        return "clear"
    return "marginal"


def basis_of(profile: PathProfile, standing: Standing, levels: PathLevels, *, row: int) -> Basis:
    """What the verdict rests on.

    'surveyed' when, wherever an unlisted tree or building of 25 m on the bare ground could reach the required zone of the
    governing criterion, ground and top were measured, and something on the path was; the antennas' own spots are left aside.
    """
    typed = np.asarray([*(obstacle.source == ROOF_SOURCE for obstacle in profile.obstacles), False])
    looked_at = ~standing.own & ~typed[standing.obstacle_index]
    spare = levels.available_m - (levels.need_m[row] - standing.cover_m)
    measured = profile.measured == MEASURED_TOP
    if np.any(measured & looked_at) and np.all(measured[looked_at & (spare < UNLISTED_M)]):
        return "surveyed"
    return "surface raster" if profile.surface_is_known or not profile.ground_is_bare else "bare ground only"


def not_held(profile: PathProfile) -> str | None:
    """What the notes of a profile say that its data do not hold; None where they say nothing of it."""
    said = [note.split(": ")[0] for note in profile.notes if "cover is not known" in note or "not in the data" in note]
    return " and ".join(said) or None


def signal_verdict(margin_db: AtEnds, *, wanted_db: float, trees: bool = False) -> SignalVerdict | None:
    """'meets', 'marginal' (within 3 dB below the wanted margin) or 'below'; None where no margin is known.

    With `trees` in the required zone it is 'marginal' at most: what they take changes with leaves, rain and growth.
    """
    if margin_db.at_a is None or margin_db.at_b is None:
        return None
    least = min(margin_db.at_a, margin_db.at_b)
    if least >= wanted_db and not trees:
        return "meets"
    return "marginal" if least >= wanted_db - SIGNAL_BAND_DB else "below"


def reasons(
    *,
    verdict: PathVerdict,
    basis: Basis,
    results: tuple[CriterionResult, ...],
    governing: int,
    sight: SightLine,
    raising: ExtraHeight,
    confidence: float,
    confidence_asked: float,
    ignored: tuple[Ignored, ...],
    doubts: tuple[Doubt, ...] = (),
    not_held: str | None = None,
) -> tuple[str, ...]:
    """Plain sentences, the decisive one first; `not_held` says what the data do not hold, where that is known."""
    rule = results[governing]
    sentences = []
    more = [f"Against 'clear' stands too: {doubt.clause}." for doubt in doubts]
    asked = f"{100.0 * confidence_asked:.0f} % asked"
    if verdict == "obstructed":
        sentences.append(
            f"Obstructed: {sight.cause} cuts the sight line by {up_m(sight.cut_m):.1f} m at {place(sight.at_m)}."
        )
    elif not rule.met:
        left = (
            ""
            if rule.worst_fraction is None
            else f"{zone_share(rule.worst_fraction):.2f} F1 where {rule.required_fraction:g} is required"
        )
        sentences.append(
            f"Marginal: the sight line is free, but {rule.cause} at {place(rule.worst_at_m)} leaves {left} "
            f"({rule.criterion})."
        )
    elif verdict == "marginal" and doubts:
        sentences.append(f"Marginal: every criterion is met, but {doubts[0].clause}.")
        more = more[1:]
        if confidence < confidence_asked:
            more.append(f"The confidence is {percent(confidence)} ({asked}).")
    else:
        sentences.append(met_sentence(verdict, basis, confidence=confidence, confidence_asked=confidence_asked))
    if rule.met:
        sentences.append(
            f"{down_m(max(rule.clearance_m - rule.required_m, 0.0)):.1f} m to spare under {rule.criterion}; nearest the ray: "
            f"{rule.cause}, {place(rule.worst_at_m)}."
        )
    else:
        told_m = sight.at_m if verdict == "obstructed" else rule.worst_at_m
        missing, where = f"{up_m(rule.shortfall_m):.1f} m", place(rule.shortfall_at_m)
        if where == place(told_m):
            sentences.append(f"{missing} is missing there under {rule.criterion}.")
        else:
            sentences.append(f"The most is missing at another point: {missing}, {where}, under {rule.criterion}.")
    if verdict != "clear" and raising.both != 0.0:
        sentences.append(raise_sentence(raising, confidence_asked))
    sentences.append(_basis_sentence(basis, not_held))
    sentences += [
        f"Left out at {item.end}, as the antenna's own building or cover: {item.what}, up to {item.height_m:.1f} m high."
        for item in ignored
    ]
    return tuple(sentences)


def met_sentence(verdict: PathVerdict, basis: Basis, *, confidence: float, confidence_asked: float) -> str:
    """The decisive sentence where every criterion is met on the heights in the data: clear, or too unsure to be called so."""
    asked = f"{100.0 * confidence_asked:.0f} % asked"
    if verdict == "marginal":
        return (
            f"Marginal: every criterion is met on the heights in the data, but with {percent(confidence)} confidence only "
            f"({asked})."
        )
    clear = "Clear on bare ground only" if basis == "bare ground only" else "Clear"
    return f"{clear}: every criterion is met with {percent(confidence)} confidence ({asked})."


def place(at_m: float) -> str:
    """'4.21 km from A', or '830 m from A' on the first kilometre."""
    return f"{at_m / 1000.0:.2f} km from A" if at_m >= 1000.0 else f"{at_m:.0f} m from A"


RAISING_BEGINS: Final = ("Raise ", "Raising both ends", "No height at the ends")
"""How `raise_sentence` begins, so that planning can put better heights in its place."""


def raise_sentence(extra: ExtraHeight, confidence: float, *, step_m: float = 1.0) -> str:
    """Heights to add at the confidence asked, rounded up to `step_m` of mast."""
    options = [
        f"{words} by {math.ceil(height_m / step_m - 1e-6) * step_m:.6g} m"
        for words, height_m in (("A", extra.a), ("B", extra.b), ("both", extra.both))
        if height_m is not None and height_m <= USUAL_MAST_M
    ]
    if options:
        return f"Raise {', or '.join(options)}, to be clear with {100.0 * confidence:.0f} % confidence."
    if extra.both is not None:
        return (
            f"Raising both ends would take {math.ceil(extra.both)} m each, more than usual masts give: "
            "look for another site or a relay."
        )
    return "No height at the ends makes this path clear: look for another site or a relay."


def percent(probability: float) -> str:
    """Rounded down; near certainty is not called 100 %, for the error model is not that good."""
    if probability > 0.999:
        return "over 99.9 %"
    return f"{math.floor(1000.0 * probability + 1e-9) / 10.0:g} %"


def _basis_sentence(basis: Basis, not_held: str | None) -> str:
    if basis == "surveyed":
        return (
            "Basis: surveyed, ground and tops were measured wherever an unlisted tree or building could reach the zone."
        )
    if basis == "surface raster":
        return "Basis: surface raster; what grew or was built since it was flown is not in it."
    without = not_held or "trees and buildings are not in the data"
    return (
        f"Basis: bare ground only; {without} (but for obstacles listed by name), so walk the path before trusting this."
    )
