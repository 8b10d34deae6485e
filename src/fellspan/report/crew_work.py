"""What a crew does with its sheet: order of work, power to set, acceptance, ladder, blanks. Words and differences only."""

from typing import Final

from fellspan.antennas.facts import CutFacts
from fellspan.links.result import LinkResult
from fellspan.links.rules import RuleCheck
from fellspan.report import wording
from fellspan.report.crew_banner import most_allowed_dbm

BAND_DB: Final = 3.0
"""Within this of the expected level an alignment is accepted (common practice, no source)."""
Pairs = tuple[tuple[str, str], ...]

BLANKS: Final = (
    "Level here, each chain, dBm",
    "Level there, each chain, dBm",
    "Power shown, dBm; power control off?",
    "Modulation set",
    "Antenna centre, m above what",
    "Roof or ground measured, m",
    "Bearing as built; true or magnetic?",
    "Tilt as built, up is +",
    "Antenna, polarization, feeder loss",
    "Radio, serial numbers, position",
    "Date, hour, weather, tide",
    "Names, signature",
)
"""Each has a key in the measured file that `fellspan accept` reads."""


def checks_of(result: LinkResult, letter: str) -> tuple[RuleCheck | None, RuleCheck | None]:
    """What the power rule says of this end, and of the other."""
    power = result.power
    if power is None:
        return None, None
    return (power.a, power.b) if letter == "A" else (power.b, power.a)


def over_db(check: RuleCheck | None, power_dbm: float | None) -> float:
    """How far the power planned is over the most that the rule allows, dB; 0 where it is not."""
    most = most_allowed_dbm(check)
    return 0.0 if most is None or power_dbm is None else max(power_dbm - most, 0.0)


def work(*, is_stopped: bool, check: RuleCheck | None) -> tuple[str, ...]:
    """The order of work at one end; a crew is stopped before anything else, and told the power that it may set."""
    most = most_allowed_dbm(check)
    power = (
        "Fix the radios of both ends in the state above."
        if most is None
        else f"Fix the radios in the state above, but never above the {wording.number(most)} dBm that the rule allows here."
    )
    first = ("Do not install before the plan is changed: see the top of this sheet.",) if is_stopped else ()
    return (
        *first,
        "Read the cautions; transmitter off. Check position, height and polarization against this sheet.",
        "Point by landmark first, by true bearing on a map second. A compass is last: steel of mast and roof spoils it.",
        f"Set tilt with an inclinometer on the mounting face. {power}",
        "One end moves at a time. Sweep azimuth wide, past a fall on both sides, and find the highest of all peaks.",
        "Then elevation in the same way, then azimuth again; then the other end does the same.",
        "Tighten, and see that the level did not move. Read the level at both ends, each chain, and write it down.",
        "Power control and adaptive modulation back on. Photograph mount, aim and labels.",
    )


def power_words(check: RuleCheck | None, power_dbm: float | None) -> str:
    """The power to set at an end: the planned one, or the most that the rule allows."""
    if power_dbm is None:
        return "not stated"
    most = most_allowed_dbm(check)
    if most is None or power_dbm <= most:
        return f"{wording.number(power_dbm)} dBm"
    return f"at most {wording.number(most)} dBm (planned {wording.number(power_dbm)} dBm)"


def accept_words(received_dbm: float | None) -> str:
    """When a level will do."""
    if received_dbm is None:
        return "No level could be computed: compare both ends with each other, and sweep both planes."
    return (
        f"Accept when both ends read within {BAND_DB:g} dB of the level expected and within {BAND_DB:g} dB of each other "
        "once the difference planned is allowed for. If not, from the top:"
    )


def ladder(lobes: tuple[CutFacts, ...]) -> Pairs:
    """Likely causes from what is most often met to what is least; with the side lobes of the antenna itself."""
    levels = sorted({round(-one.side_lobe_db, 1) for one in lobes if one.side_lobe_db is not None})
    own = f" ({' or '.join(wording.number(level) for level in levels)} dB low with this antenna)" if levels else ""
    return (
        (
            "Both ways 15 to 25 dB low",
            f"an antenna stands on a side lobe{own}, or polarizations differ: sweep wider, then compare feeds",
        ),
        ("Both ways low by less", "feeder, height or position as built, something new in the path, aim in elevation"),
        ("One way low", "power at the sending end, noise or fault at the receiving end"),
        ("One chain low", "its cable, connector or polarization port; water in a connector"),
        (
            "Changes with tide or hour",
            "reflection from water or layers in the air: log it for a day before moving anything",
        ),
    )
