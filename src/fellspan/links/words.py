"""How numbers and states of a result are said, everywhere the same: sentences, terminal, pages and exports all ask here.

Rounded toward caution: what is missing goes up, what is spare goes down. Formats results and works nothing out.
"""

import math
from typing import Final, Literal

from fellspan.links.result import AtEnds, CriterionResult, LinkResult
from fellspan.links.tenths import down_tenth, up_tenth

State = Literal["clear", "clear-bare", "marginal", "obstructed"]
STATE_WORDS: Final[dict[State, str]] = {
    "clear": "clear",
    "clear-bare": "clear on bare ground only",
    "marginal": "marginal",
    "obstructed": "obstructed",
}
PRACTICAL_M: Final = 100.0
"""More than this to build at an end is called not practical (common practice, no source)."""
NOT_PRACTICAL: Final = "not practical"
CANNOT: Final = "cannot"
_SAME_POINT: Final = 0.002
"""Two points nearer to each other than this share of the path are told as one."""
_FUZZ: Final = 1e-6


def state_of(result: LinkResult) -> State:
    """The verdict, and whether a clear one knows of no trees and buildings: that one is never just 'clear'."""
    if result.verdict == "clear" and result.basis == "bare ground only":
        return "clear-bare"
    return result.verdict


def up_m(value_m: float) -> float:
    """To a tenth of a metre, rounded up: for what is missing and what is to be built."""
    return up_tenth(value_m)


def down_m(value_m: float) -> float:
    """To a tenth of a metre, rounded down: for what there is."""
    return down_tenth(value_m)


def down_db(value_db: float) -> float:
    """A margin, or a level, to a tenth of a decibel, rounded down: -30.46 is -30.5, in sentences as in rows."""
    return down_tenth(value_db)


def up_db(value_db: float) -> float:
    """To a tenth of a decibel, rounded up: for what is missing, or over a limit."""
    return up_tenth(value_db)


def least_db(margin_db: AtEnds) -> float | None:
    """The margin at the weaker end; None where none is known."""
    return min((one for one in (margin_db.at_a, margin_db.at_b) if one is not None), default=None)


def decisive_margin_db(result: LinkResult) -> AtEnds:
    """The margin that decides: what neighbours leave of it, where any were looked at."""
    return result.margin_db if result.margin_with_neighbours_db is None else result.margin_with_neighbours_db


def are_told_apart(alone_db: float | None, left_db: float | None) -> bool:
    """Whether a margin reads differently with neighbours and without."""
    return alone_db is not None and left_db is not None and down_db(alone_db) != down_db(left_db)


def neighbours_take(result: LinkResult) -> bool:
    """Whether neighbours take, at either end, what is seen in a margin."""
    left = decisive_margin_db(result)
    return are_told_apart(result.margin_db.at_a, left.at_a) or are_told_apart(result.margin_db.at_b, left.at_b)


def zone_share(fraction: float) -> float:
    """A share of the first zone that is free, to a hundredth, rounded down."""
    return math.floor(fraction * 100.0 + _FUZZ) / 100.0 + 0.0


def is_two_points(criterion: CriterionResult, *, length_m: float) -> bool:
    """Whether the greatest missing height stands elsewhere than the least share of the zone, which governs."""
    apart_m = abs(criterion.shortfall_at_m - criterion.worst_at_m)
    return criterion.shortfall_m > 0.0 and apart_m > _SAME_POINT * length_m


def spare_m(criterion: CriterionResult, *, length_m: float) -> float:
    """Height to spare at the governing point as it is shown, m; below 0 where it is missing.

    Where the greatest missing height stands at that point too, it is that height, so that a page says one number.
    """
    spare = criterion.clearance_m - criterion.required_m
    if criterion.met:
        return down_m(max(spare, 0.0))
    if not is_two_points(criterion, length_m=length_m):
        return -up_m(criterion.shortfall_m)
    return down_m(spare) if spare >= 0.0 else -up_m(-spare)


def margin_words(alone_db: float | None, left_db: float | None) -> str:
    """'14.2 dB', or '14.2 dB, 11.0 dB with neighbours' where they take what is seen; a dash where no margin is known."""
    if alone_db is None:
        return "-"
    words = f"{down_db(alone_db):.1f} dB"
    if left_db is None or not are_told_apart(alone_db, left_db):
        return words
    return f"{words}, {down_db(left_db):.1f} dB with neighbours"


def to_build(value_m: float | None) -> str:
    """A height to add at an end: '1.8 m' rounded up, 'not practical' above `PRACTICAL_M`, 'cannot' where none helps."""
    if value_m is None:
        return CANNOT
    return f"{up_m(value_m):.1f} m" if value_m <= PRACTICAL_M else NOT_PRACTICAL
