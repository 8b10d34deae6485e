"""AsBuilt: what a crew measured of one link, in SI. Holds what was read and what it means; compares it with nothing.

None is a blank that nobody filled in. What is measured at an end is received there.
"""

import datetime as dt
import math
from dataclasses import dataclass, field
from typing import Final, Literal

from fellspan.geodesy.position import Position
from fellspan.vocabulary import HeightReference, MountedPolarization

EndLetter = Literal["a", "b"]
PowerOf = Literal["all chains", "each chain"]
BearingOf = Literal["true", "magnetic"]
OnOff = Literal["on", "off"]

LEVEL_ERROR_DB: Final = 1.5
"""Standard error of a level that a radio shows (common practice, no source)."""
BAND_DB: Final = 3.0
"""Within this of the expected level a direction is accepted (common practice, no source)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading:
    """One level read at one end.

    `chain` is the chain or polarization that it is of; None is all of them together, or not told (`AsBuilt.levels_are`).
    `hour` counts from the first midnight, so that a reading of the next night is above 24. `water_m` is the level of the
    water or tide at the time, m.
    """

    end: EndLetter
    level_dbm: float
    chain: str | None = None
    hour: float | None = None
    water_m: float | None = None
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class BuiltEnd:
    """One end as it was built; heights, m, as in `Site`; `bearing_deg` as it was read, `bearing_is` says from which north."""

    height_m: float | None = None
    height_reference: HeightReference | None = None
    roof_m: float | None = None
    ground_amsl_m: float | None = None
    position: Position | None = None
    bearing_deg: float | None = None
    bearing_is: BearingOf | None = None
    tilt_deg: float | None = None
    polarization: MountedPolarization | None = None
    power_dbm: float | None = None
    """Of all chains together."""
    feeder_loss_db: float | None = None
    antenna: str = ""
    radio: str = ""
    serial: str = ""
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class AsBuilt:
    """One link as built: the readings, both ends, and the state of the radios when they were read."""

    link: str
    readings: tuple[Reading, ...]
    a: BuiltEnd = field(default_factory=BuiltEnd)
    b: BuiltEnd = field(default_factory=BuiltEnd)
    date: dt.date | None = None
    by: str = ""
    weather: str = ""
    modulation: str | None = None
    power_control: OnOff | None = None
    adaptive_modulation: OnOff | None = None
    levels_are: PowerOf | None = None
    """What a reading without a chain is of; None where nobody said."""
    error_db: float = LEVEL_ERROR_DB
    band_db: float = BAND_DB
    note: str = ""
    file: str = ""
    """Name of the file that it was read from."""

    def end(self, letter: EndLetter) -> BuiltEnd:
        """One of both ends."""
        return self.a if letter == "a" else self.b

    def at(self, letter: EndLetter) -> tuple[Reading, ...]:
        """The readings of one end, in the order of the file."""
        return tuple(one for one in self.readings if one.end == letter)


@dataclass(frozen=True, slots=True, kw_only=True)
class LevelRead:
    """What the readings of one end come to, dBm of all chains together, and how they differ.

    `swing_db` is the greatest difference of readings at different times, after what chains differ by; `chains` the mean level
    of each chain, in the order they first appear; `imbalance_db` how far the weakest lies under the best of the others.
    """

    level_dbm: float
    count: int
    swing_db: float
    lowest_dbm: float
    highest_dbm: float
    chains: tuple[tuple[str, float], ...]
    weakest: str | None
    imbalance_db: float


def level_read(readings: tuple[Reading, ...], *, chains: int, each: bool) -> LevelRead | None:
    """Level of all chains together from readings; None without any.

    `chains` is how many the radio has. `each` says that a reading without a chain is of one chain alone. A chain that was not
    read is taken as the mean of those that were.
    """
    if not readings:
        return None
    moments: dict[tuple[float | None, float | None], list[Reading]] = {}
    for one in readings:
        moments.setdefault((one.hour, one.water_m), []).append(one)
    totals = [_together(group, chains=chains, each=each) for group in moments.values()]
    levels = [total for group in totals for total in group]
    by_chain: dict[str, list[float]] = {}
    for one in readings:
        if one.chain is not None:
            by_chain.setdefault(one.chain, []).append(one.level_dbm)
    means = tuple((name, sum(values) / len(values)) for name, values in by_chain.items())
    weakest, gap = None, 0.0
    if len(means) > 1:
        weakest, low = min(means, key=lambda mean: mean[1])
        gap = max(level for _, level in means) - low
    moment_means = [sum(group) / len(group) for group in totals]
    return LevelRead(
        level_dbm=sum(levels) / len(levels),
        count=len(levels),
        swing_db=max(moment_means) - min(moment_means),
        lowest_dbm=min(levels),
        highest_dbm=max(levels),
        chains=means,
        weakest=weakest,
        imbalance_db=gap,
    )


def moments_of(
    readings: tuple[Reading, ...], *, chains: int, each: bool
) -> list[tuple[float | None, float | None, float]]:
    """Hour, water level and level of all chains together at each time that was read, in the order of the file."""
    moments: dict[tuple[float | None, float | None], list[Reading]] = {}
    for one in readings:
        moments.setdefault((one.hour, one.water_m), []).append(one)
    found = []
    for (hour, water), group in moments.items():
        totals = _together(group, chains=chains, each=each)
        found.append((hour, water, sum(totals) / len(totals)))
    return found


def _together(group: list[Reading], *, chains: int, each: bool) -> list[float]:
    """Levels of all chains together of one moment: those read as such, else the sum of the chains."""
    whole = [one.level_dbm + (10.0 * math.log10(chains) if each else 0.0) for one in group if one.chain is None]
    if whole:
        return whole
    named: dict[str, list[float]] = {}
    for one in group:
        named.setdefault(one.chain or "", []).append(one.level_dbm)
    means = [sum(values) / len(values) for values in named.values()]
    power = sum(10.0 ** (level / 10.0) for level in means)
    return [10.0 * math.log10(power * max(chains, len(means)) / len(means))]
