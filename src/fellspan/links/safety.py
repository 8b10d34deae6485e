"""The usual cautions about work that can hurt someone, as data, in one place for every view; knows no link and no numbers.

They remind and refer to others. They replace neither the local code nor the people licensed for the work.
"""

from dataclasses import dataclass
from typing import Final, Literal

SafetyTopic = Literal[
    "desk study",
    "climbing",
    "power lines",
    "lightning and earthing",
    "structure and wind",
    "radio exposure",
    "aviation",
    "licensed practice",
    "local codes",
    "permission to transmit",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class SafetyCaution:
    """One caution: what it is about, and the sentence that views show."""

    topic: SafetyTopic
    text: str


SAFETY: Final = (
    SafetyCaution(
        topic="desk study",
        text="This plan is a desk study. Verify heights, obstacles and positions on site before anything is ordered or built.",
    ),
    SafetyCaution(
        topic="climbing",
        text="Work at height: only trained people with fall protection, never alone, never in wind, ice or thunder; "
        "nobody climbs near a live antenna or line.",
    ),
    SafetyCaution(
        topic="power lines",
        text="Keep clear of power lines, above and below ground; ask their operator for the distance to keep.",
    ),
    SafetyCaution(
        topic="lightning and earthing",
        text="Earthing and lightning protection: as local codes and a licensed electrician say.",
    ),
    SafetyCaution(
        topic="structure and wind",
        text="Masts, brackets, roofs and foundations must carry antenna, wind and ice: a qualified structural engineer "
        "decides, before anything is fixed or raised.",
    ),
    SafetyCaution(
        topic="radio exposure",
        text="Radio-frequency exposure: keep people away from the front of an antenna that transmits; check the limits that "
        "apply; switch off before work near it.",
    ),
    SafetyCaution(
        topic="aviation",
        text="Structures near airfields or flight routes may need notice, a permit, marking or lights; ask the aviation "
        "authority.",
    ),
    SafetyCaution(
        topic="licensed practice",
        text="Electrical, structural and rigging work is for qualified and, where required, licensed people.",
    ),
    SafetyCaution(
        topic="local codes",
        text="Local building, electrical and safety codes, and planning rules, go before anything this plan says.",
    ),
    SafetyCaution(
        topic="permission to transmit",
        text="Frequency, power and antenna must be allowed where they are used: check the rules of the regulator.",
    ),
)
"""All cautions, in the order in which views show them."""

RAISING: Final = (
    "Height to add means work at height: structure and wind load, power lines, lightning protection, aviation marking and "
    "planning rules go by local codes and are for licensed people; nobody climbs near a live antenna or line."
)
"""Stands beside every height that people may build to."""

ANTENNA_TOPICS: Final[tuple[SafetyTopic, ...]] = (
    "climbing",
    "power lines",
    "lightning and earthing",
    "structure and wind",
    "radio exposure",
    "licensed practice",
    "local codes",
)
"""What matters beside an antenna that belongs to no link yet."""


def safety_lines(topics: tuple[SafetyTopic, ...] | None = None) -> tuple[str, ...]:
    """The sentences of some topics, or of all, in the order of `SAFETY`."""
    return tuple(caution.text for caution in SAFETY if topics is None or caution.topic in topics)
