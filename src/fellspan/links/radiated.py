"""What each end of a link radiates, held against its power rule and the limits of exposure; and what to say of a breach.

Asks `rules` and `exposure`; knows no paths, levels or pages.
"""

from dataclasses import replace
from typing import Literal

from fellspan.links.budget import line_loss_db
from fellspan.links.exposure import exposure
from fellspan.links.radio import Radio
from fellspan.links.receivers import row_power_dbm, rows_of
from fellspan.links.result import ExposurePair, PowerChecks
from fellspan.links.rules import RuleCheck, check_power
from fellspan.links.site import Antenna, Link
from fellspan.propagation.exposure import ExposureRule


def highest_power_dbm(radio: Radio) -> float | None:
    """The most total power that a radio sends with in any of its modulations, dBm; None where none is known.

    Rules and people are held against this one, whatever modulation is wanted.
    """
    rows = rows_of(radio)
    powers = [row_power_dbm(radio, row) for row in rows] if rows else [radio.power_dbm]
    return max((power for power in powers if power is not None), default=None)


def power_checks(link: Link) -> PowerChecks | None:
    """Both ends held against the rule of the link; None where it names none."""
    rule = link.power_rule
    if rule is None:
        return None
    radio = link.radio
    a, b = (
        check_power(
            rule,
            frequency_hz=frequency_hz,
            bandwidth_hz=radio.bandwidth_hz,
            power_dbm=highest_power_dbm(radio),
            gain_dbi=antenna.peak_gain_dbi,
            feeder_loss_db=_to_antenna_db(antenna, frequency_hz),
        )
        for antenna, frequency_hz in zip((link.antenna_a, link.antenna_b), radio.transmit_hz, strict=True)
    )
    return PowerChecks(a=a, b=b)


def exposure_pair(link: Link, *, rule: ExposureRule | Literal["stricter"]) -> ExposurePair | None:
    """Distances to keep at both ends; None where they are known at neither."""
    radio = link.radio
    a, b = (
        exposure(
            replace(antenna, feeder_loss_db=_to_antenna_db(antenna, frequency_hz)),
            frequency_hz=frequency_hz,
            power_dbm=highest_power_dbm(radio),
            rule=rule,
        )
        for antenna, frequency_hz in zip((link.antenna_a, link.antenna_b), radio.transmit_hz, strict=True)
    )
    return None if a is None and b is None else ExposurePair(a=a, b=b)


def power_cautions(checks: PowerChecks | None) -> tuple[str, ...]:
    """What breaks the rule, or why it could not be held against an end."""
    if checks is None:
        return ()
    said = {"A": _doubt(checks.a), "B": _doubt(checks.b)}
    if said["A"] == said["B"]:
        return () if said["A"] is None else (f"Power at both ends: {said['A']}",)
    return tuple(f"Power at {end}: {doubt}" for end, doubt in said.items() if doubt is not None)


def _doubt(check: RuleCheck) -> str | None:
    return check.sentence if check.is_breach or check.reason else None


def _to_antenna_db(antenna: Antenna, frequency_hz: float) -> float:
    return antenna.branching_loss_db + line_loss_db(antenna, frequency_hz=frequency_hz)
