"""AcceptanceResult: a link as built held against its plan, as frozen data with plain sentences; no physics.

For `results.json`: numbers and sentences only. Numbers that are not known are None.
"""

from dataclasses import dataclass
from typing import Literal

from fellspan.vocabulary import PathVerdict

LevelVerdict = Literal["accepted", "not accepted", "cannot be judged"]
Fit = Literal["stated by the crew", "fits well", "possible", "cannot be told apart"]
"""How far a cause can be trusted: what the crew wrote down, one cause alone fits, one of several, one of a like group."""


@dataclass(frozen=True, slots=True, kw_only=True)
class DirectionCheck:
    """One direction: level of all chains together, dBm, measured and expected in the state that it was measured in.

    `planned_dbm` is the level of the plan; `expected_dbm` what it becomes with the power and the modulation stated by the crew.
    `difference_db` is measured less expected; `band_db` is the band that it was held to, either way.
    """

    direction: str
    received_at: str
    measured_dbm: float | None
    planned_dbm: float | None
    expected_dbm: float | None
    difference_db: float | None
    band_db: float
    verdict: LevelVerdict
    why: str
    readings: int
    swing_db: float
    """How far readings of different times lie apart."""
    chains: tuple[tuple[str, float], ...]
    """Mean level of each chain that was read by itself, dBm."""
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class BuiltCheck:
    """One thing measured at one end against the plan, as text; `differs` where it is off by more than it can be read to."""

    end: str
    what: str
    planned: str
    measured: str
    difference: str
    differs: bool
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Cause:
    """One likely cause of what was measured.

    `share` is the part of the likelihood of all causes considered that it has, 0 to 1; a guide to the order, not a
    probability to rely on. `change_a_db` and `change_b_db` are what it predicts for the level received at A and at B;
    None where it predicts no figure. `alike` names what cannot be told apart from it by what was measured, `tells_apart`
    what would.
    """

    key: str
    title: str
    fit: Fit
    share: float
    change_a_db: float | None
    change_b_db: float | None
    why: str
    alike: tuple[str, ...]
    tells_apart: str
    checks: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class PathAsBuilt:
    """The path with the antennas where they were measured; None where the plan could not be worked out there."""

    verdict: PathVerdict | None
    planned_verdict: PathVerdict
    confidence: float | None
    missing_m: float | None
    """Height missing to the governing criterion; 0 where it is met."""
    planned_missing_m: float
    """The same as planned."""
    sentence: str
    remeasured: bool
    """Whether heights or positions were measured at all."""


@dataclass(frozen=True, slots=True, kw_only=True)
class AcceptanceResult:
    """A link as built. `accepted` where both directions are and nothing of `holds` stands against it."""

    link: str
    revision: str
    measured_on: str
    measured_by: str
    file: str
    accepted: bool
    decision: str
    holds: tuple[str, ...]
    directions: tuple[DirectionCheck, ...]
    built: tuple[BuiltCheck, ...]
    path: PathAsBuilt
    causes: tuple[Cause, ...]
    next_steps: tuple[str, ...]
    """What to do, in the order of the ladder: at the desk, from the ground, then up the mast."""
    notes: tuple[str, ...]
