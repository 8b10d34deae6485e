"""What holds the signal verdict of a link down, each with its words: margin, target, timing, channels, trees.

Judges what others worked out; knows no terrain and no pages.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.links.direction import Direction
from fellspan.links.receivers import blocked
from fellspan.links.result import AtEnds
from fellspan.links.signal_words import percent_text, wanted_words
from fellspan.links.site import Link
from fellspan.links.verdicts import SIGNAL_BAND_DB, signal_verdict
from fellspan.vocabulary import SignalVerdict

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

BETTER_TO_WORSE: Final[tuple[SignalVerdict, ...]] = ("meets", "marginal", "below")
TREES: Final = "trees stand in the required zone, and what they take changes with leaves, rain and growth"


@dataclass(frozen=True, slots=True, kw_only=True)
class Hold:
    """The best verdict that one cause leaves, and the cause in words; empty words for one that leaves 'meets'."""

    verdict: SignalVerdict
    why: str = ""


def worse_of(verdict: SignalVerdict | None, at_most: SignalVerdict | None) -> SignalVerdict | None:
    """A verdict held down to what else allows; None where no margin is known."""
    if verdict is None or at_most is None:
        return verdict
    return max(verdict, at_most, key=BETTER_TO_WORSE.index)


def holds_of(link: Link, there: Direction, back: Direction, *, length_m: float) -> tuple[Hold, ...]:
    """What the radio's timing, the channels and the target leave; empty where none of them says anything."""
    found: list[Hold] = []
    reach = link.radio.greatest_distance_m
    if reach is not None and length_m > reach:
        found.append(Hold(verdict="below", why="the path is longer than the timing of the radio allows"))
    for one, site in ((there, link.b), (back, link.a)):
        if blocked(site, link.radio, frequency_hz=one.result.frequency_hz) is not None:
            found.append(Hold(verdict="below", why=f"its channel is unusable at '{site.name}'"))
    target = link.target_availability_percent
    if target is not None:
        found += [_by_target(one, target=target) for one in (there, back) if one.result.margin_db is not None]
    return tuple(found)


def _by_target(one: Direction, *, target: float) -> Hold:
    share = one.result.availability_percent.year
    if share is None:
        return Hold(
            verdict="marginal", why=f"without an availability the target of {target:g} % of the year cannot be judged"
        )
    if share >= target:
        return Hold(verdict="meets")
    words = f"{percent_text(share)} of the year {one.result.direction}, {target:g} % wanted"
    nearly = one.nearly()
    if nearly is not None and nearly >= target:
        return Hold(verdict="marginal", why=f"{words}, which 3 dB more margin would reach")
    return Hold(verdict="below", why=words)


def at_most_of(link: Link, there: Direction, back: Direction, *, length_m: float) -> SignalVerdict | None:
    """The best verdict that the target, the radio's timing and the channels leave; None where they say nothing."""
    verdicts = [hold.verdict for hold in holds_of(link, there, back, length_m=length_m)]
    return max(verdicts, key=BETTER_TO_WORSE.index, default=None)


def judged(
    margin_db: AtEnds, *, wanted_db: float, trees: bool, holds: tuple[Hold, ...]
) -> tuple[SignalVerdict | None, str]:
    """The signal verdict, and everything that holds it down as far as it is; None and no words where no margin is known."""
    by_margin = signal_verdict(margin_db, wanted_db=wanted_db)
    if by_margin is None or margin_db.at_a is None or margin_db.at_b is None:
        return None, ""
    least = min(margin_db.at_a, margin_db.at_b)
    short = Hold(verdict=by_margin, why=wanted_words(least, wanted_db=wanted_db))
    all_of_them = (*holds, short, *((Hold(verdict="marginal", why=TREES),) if trees else ()))
    verdict = max((hold.verdict for hold in all_of_them), key=BETTER_TO_WORSE.index)
    if verdict == "meets":
        return verdict, "margin and availability wanted are there" if holds else "the margin wanted is there"
    return verdict, "; ".join(dict.fromkeys(hold.why for hold in all_of_them if hold.verdict == verdict))


def verdict_codes(
    least_margin_db: Floats,
    *,
    wanted_db: float,
    trees: Flags,
    too_far: Flags,
    target_percent: float | None,
    shares_percent: tuple[Floats, Floats],
    nearly_percent: tuple[Floats, Floats],
) -> NDArray[np.int8]:
    """`judged` on columns of links, without its words: indices into `BETTER_TO_WORSE`, shape (p,).

    Parameters
    ----------
    least_margin_db
        Of both directions, where it is known.
    trees, too_far
        Trees stand in the required zone; the path is longer than the timing of the radio allows.
    target_percent, shares_percent, nearly_percent
        Availability wanted, that of each direction, NaN where not computed, and what `NEAR_DB` more margin would make of it.
    """
    meets, marginal, below = range(len(BETTER_TO_WORSE))
    code = np.where(
        least_margin_db >= wanted_db,
        meets,
        np.where(least_margin_db >= wanted_db - SIGNAL_BAND_DB, marginal, below),
    )
    code = np.where(too_far, below, np.where(trees, np.maximum(code, marginal), code))
    if target_percent is not None:
        for share, nearly in zip(shares_percent, nearly_percent, strict=True):
            missed = np.where(nearly >= target_percent, marginal, below)
            by_target = np.where(np.isnan(share), marginal, np.where(share >= target_percent, meets, missed))
            code = np.maximum(code, by_target)
    return code.astype(np.int8)
