"""Hypothesis: one thing that may be wrong with a link as built, and what the level would then do. Data and small helpers only.

Weights before any measurement and the spreads are those of common practice, no source, unless a line says otherwise; what a
cause does to the level comes from the link's own numbers.
"""

from dataclasses import dataclass
from typing import Final, Literal

from fellspan.design.as_built import AsBuilt, EndLetter
from fellspan.design.reflection_result import ReflectionResult
from fellspan.links.result import AntennaResult, EndResult, LinkResult
from fellspan.links.site import Antenna, Link

Rung = Literal[0, 1, 2]
"""Where a check is done: 0 at the desk or the radio's page, 1 from the ground, 2 up the mast."""
Varies = Literal["steady", "with the hour", "with the water"]
DESK: Final[Rung] = 0
GROUND: Final[Rung] = 1
MAST: Final[Rung] = 2
LEAST_DB: Final = 1.0
"""What changes the level by less than this explains nothing that a radio shows."""
ENDS: Final[tuple[EndLetter, EndLetter]] = ("a", "b")


@dataclass(frozen=True, slots=True, kw_only=True)
class Check:
    """What to look at, and where that is done."""

    rung: Rung
    text: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Hypothesis:
    """One cause with what it predicts.

    `a_db` and `b_db` are the changes of the level received at A and at B; `spread_db` the standard deviations of what is open
    about them: common to both, at A alone, at B alone. `weight` is how likely it is before any level was read, relative to the
    others. `where` are the ends it stands at, where the title does not say so. `varies` says whether readings of other hours
    or water levels would differ. `chain_at` are the ends where one chain would stand low. `sharp` is False where it would fit
    almost any level, so that a fit says little.
    """

    key: str
    title: str
    a_db: float
    b_db: float
    spread_db: tuple[float, float, float]
    weight: float
    why: str
    settled_by: str
    checks: tuple[Check, ...]
    varies: Varies = "steady"
    where: tuple[EndLetter, ...] = ()
    chain_at: tuple[EndLetter, ...] = ()
    sharp: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """What the engine makes of the link with one thing changed: change of the level received at A and at B, dB."""

    words: str
    a_db: float
    b_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class OtherAntenna:
    """An antenna that might have been put up instead: its name, and its peak gain less that of the one planned, dB."""

    name: str
    end: EndLetter
    gain_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Numbers:
    """All that causes are made from: the plan of the link, what was measured, and what the engine says of changes.

    `low_k` is the link at `low_k_value`, the k of the worst month; None where it is as at the median. `lower` are antennas
    that stand lower than planned by a likely slip; `crossed` the loss of polarizations a quarter turn apart.
    """

    link: Link
    result: LinkResult
    built: AsBuilt
    reflections: ReflectionResult | None
    low_k: Change | None
    low_k_value: float
    lower: tuple[Change, ...]
    crossed: Change | None
    others: tuple[OtherAntenna, ...]
    expected_a_dbm: float | None
    expected_b_dbm: float | None

    def antenna(self, end: EndLetter) -> Antenna:
        """The antenna planned at an end."""
        return self.link.antenna_a if end == "a" else self.link.antenna_b

    def mounted(self, end: EndLetter) -> AntennaResult | None:
        """How it is planned to hang."""
        both = self.result.antennas
        return None if both is None else both.a if end == "a" else both.b

    def place(self, end: EndLetter) -> EndResult:
        """Where an end stands."""
        return self.result.ends.a if end == "a" else self.result.ends.b

    def bearing_deg(self, end: EndLetter) -> float:
        """True bearing of the other end."""
        return self.result.bearing_ab_deg if end == "a" else self.result.bearing_ba_deg

    def tilt_deg(self, end: EndLetter) -> float:
        """Elevation of the other end."""
        return self.result.tilt_ab_deg if end == "a" else self.result.tilt_ba_deg


def label(end: EndLetter) -> str:
    """A or B."""
    return end.upper()


def joined(ends: tuple[EndLetter, ...]) -> str:
    """'A' or 'A and B'."""
    return " and ".join(label(end) for end in ends)


def db(value: float) -> str:
    """'-3.1 dB', with a plain minus; figures in sentences have one decimal."""
    text = f"{value:.1f}"
    return f"{'0.0' if text == '-0.0' else text} dB"
