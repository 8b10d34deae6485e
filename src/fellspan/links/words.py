"""How numbers and states of a result are said, everywhere the same: sentences, terminal, pages and exports all ask here.

Rounded toward caution: what is missing goes up, what is spare goes down. Formats results and works nothing out.
"""

import math
from typing import Final, Literal

from fellspan.links.result import CriterionResult, LinkResult

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
    return math.ceil(value_m * 10.0 - _FUZZ) / 10.0 + 0.0


def down_m(value_m: float) -> float:
    """To a tenth of a metre, rounded down: for what there is."""
    return math.floor(value_m * 10.0 + _FUZZ) / 10.0 + 0.0


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


def to_build(value_m: float | None) -> str:
    """A height to add at an end: '1.8 m' rounded up, 'not practical' above `PRACTICAL_M`, 'cannot' where none helps."""
    if value_m is None:
        return CANNOT
    return f"{up_m(value_m):.1f} m" if value_m <= PRACTICAL_M else NOT_PRACTICAL
