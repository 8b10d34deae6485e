"""Each direction of a link as built: what was read, what is expected in the state it was read in, and whether it will do.

Compares levels; looks for no causes.
"""

import math
from dataclasses import dataclass
from typing import Final

from fellspan.design.acceptance_result import DirectionCheck, LevelVerdict
from fellspan.design.as_built import AsBuilt, EndLetter, LevelRead, level_read
from fellspan.links.result import LinkResult
from fellspan.links.signal_result import DirectionResult, ModulationResult
from fellspan.links.site import Link
from fellspan.links.words import down_db

STATE_DB: Final = 1.0
"""What the band grows by for each thing of the state that differs from the plan: the plan is corrected for what the crew says
of it, and that is worth a decibel of doubt (our own figure)."""
SAME_POWER_DB: Final = 0.5
IMBALANCE_DB: Final = 6.0
"""Chains that lie this far apart are not accepted (common practice, no source: 3 dB is usual, 6 dB is a fault)."""
SWING_DB: Final = 4.0
"""Readings of different times that lie this far apart are worth a word (our own figure)."""
SWING_HELD_DB: Final = 6.0
"""Readings that lie this far apart are not accepted before it is known why (our own figure: the width of the usual band)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Judged:
    """A direction with what the search for causes needs of it; `expected_dbm` is None where the plan has no level."""

    check: DirectionCheck
    read: LevelRead | None
    expected_dbm: float | None
    stated_change_db: float
    """What the power and the modulation stated by the crew change of the level planned, dB."""

    @property
    def difference_db(self) -> float | None:
        """Measured less expected."""
        return self.check.difference_db

    @property
    def is_off(self) -> bool:
        """Whether it is outside its band, whatever else stands against judging it."""
        off = self.check.difference_db
        return off is not None and abs(off) > self.check.band_db


def judge(link: Link, result: LinkResult, built: AsBuilt, *, refuse: str) -> tuple[Judged, Judged]:
    """A to B and B to A; `refuse` says why no level of this link can be accepted, and is empty where one can."""
    return _one(link, result, built, at="b", refuse=refuse), _one(link, result, built, at="a", refuse=refuse)


def row_of(direction: DirectionResult, name: str | None) -> ModulationResult | None:
    """The modulation of a direction by its name, capitals and blanks aside; None where there is none such."""
    if name is None:
        return None
    wanted = "".join(name.casefold().split())
    return next((row for row in direction.modulations if "".join(row.name.casefold().split()) == wanted), None)


def _one(link: Link, result: LinkResult, built: AsBuilt, *, at: EndLetter, refuse: str) -> Judged:
    signal = result.signal
    heard = None if signal is None else signal.a_to_b if at == "b" else signal.b_to_a
    sender: EndLetter = "a" if at == "b" else "b"
    planned = None if heard is None else heard.received_dbm
    notes: list[str] = []
    band, change = built.band_db, 0.0
    if heard is not None and planned is not None:
        row = row_of(heard, built.modulation)
        power = heard.power_dbm
        if row is not None and row.power_dbm is not None and power is not None and row.name != heard.wanted:
            change += row.power_dbm - power
            power, band = row.power_dbm, band + STATE_DB
            notes.append(f"read at {row.name} where {heard.wanted or 'the radio'} is planned ({change:+.1f} dB)")
        stated = built.end(sender).power_dbm
        if stated is not None and power is not None and abs(stated - power) > SAME_POWER_DB:
            change += stated - power
            band += STATE_DB
            notes.append(
                f"sent with {stated:.1f} dBm where {power:.1f} dBm is planned: the level expected is {stated - power:+.1f} dB, "
                "and so is the margin until the power is set as planned"
            )
    read = level_read(built.at(at), chains=link.radio.chains, each=built.levels_are == "each chain")
    # As the crew sheet told it: the band that a crew reads there is the band that it is held to.
    expected = None if planned is None else down_db(planned + change)
    off = None if expected is None or read is None else read.level_dbm - expected
    verdict, why = _verdict(off, expected=expected, read=read, band=band, built=built, refuse=refuse, at=at)
    if read is not None and read.swing_db >= SWING_DB:
        notes.append(f"readings of different times lie {read.swing_db:.1f} dB apart")
    return Judged(
        check=DirectionCheck(
            direction="A to B" if at == "b" else "B to A",
            received_at=(link.b if at == "b" else link.a).name,
            measured_dbm=None if read is None else read.level_dbm,
            planned_dbm=planned,
            expected_dbm=expected,
            difference_db=off,
            band_db=band,
            verdict=verdict,
            why=why,
            readings=0 if read is None else read.count,
            swing_db=0.0 if read is None else read.swing_db,
            chains=() if read is None else read.chains,
            notes=tuple(notes),
        ),
        read=read,
        expected_dbm=expected,
        stated_change_db=change,
    )


def _verdict(
    off: float | None,
    *,
    expected: float | None,
    read: LevelRead | None,
    band: float,
    built: AsBuilt,
    refuse: str,
    at: EndLetter,
) -> tuple[LevelVerdict, str]:
    if read is None:
        return "cannot be judged", f"no level was read at {at.upper()}"
    if expected is None or off is None:
        return "cannot be judged", "the plan has no level: the study states no power or no gain"
    words = f"{abs(off):.1f} dB {'above' if off > 0 else 'below'} the level expected, band {band:g} dB"
    if refuse:
        return "cannot be judged", f"{refuse}; it is {words}"
    if math.isclose(abs(off), band) or abs(off) < band:
        return "accepted", words
    if built.power_control == "on" and off < 0.0:
        return "cannot be judged", f"{words}, but power control was on: read again with it off"
    return "not accepted", words
