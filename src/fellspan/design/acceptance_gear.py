"""Causes that lie in radios, lines and antennas: power, receiver, chains, feeders, polarization, another antenna, the reading.

From the link's own radio and antennas; knows no levels that were measured.
"""

import math
from collections.abc import Iterator

from fellspan.design.acceptance_hypotheses import (
    DESK,
    ENDS,
    GROUND,
    LEAST_DB,
    MAST,
    Check,
    Hypothesis,
    Numbers,
    db,
    label,
)
from fellspan.design.as_built import EndLetter
from fellspan.links.budget import line_loss_db
from fellspan.vocabulary import MountedPolarization

_READ_POWER = Check(rung=DESK, text="read the transmit power that each radio shows, and set it as planned")
_CONNECTORS = Check(
    rung=MAST,
    text="open and dry the connectors, look for water and kinks, and measure the line with a power meter or a sweep",
)
QUARTER_TURN: dict[MountedPolarization, MountedPolarization] = {
    "vertical": "horizontal",
    "horizontal": "vertical",
    "slant+45": "slant-45",
    "slant-45": "slant+45",
}


def gear_causes(numbers: Numbers) -> Iterator[Hypothesis]:
    """Everything that equipment and settings can do."""
    yield from _power(numbers)
    yield from _both_powers(numbers)
    yield from _power_control(numbers)
    yield from _chains(numbers)
    yield from _read_per_chain(numbers)
    yield from _feeders(numbers)
    yield from _polarization(numbers)
    yield from _other_antenna(numbers)


def _only(end: EndLetter, change: float) -> tuple[float, float]:
    """A change of the level at one end alone."""
    return (change, 0.0) if end == "a" else (0.0, change)


def _power(numbers: Numbers) -> Iterator[Hypothesis]:
    """What changes one direction alone."""
    for end in ENDS:
        other: EndLetter = "b" if end == "a" else "a"
        stated = numbers.built.end(other).power_dbm is not None
        for low, mean, weight in ((True, -6.0, 0.06), (False, 4.5, 0.02)):
            a_db, b_db = _only(end, mean)
            yield Hypothesis(
                key="power",
                title=f"{label(other)} transmits with {'less' if low else 'more'} power than stated",
                a_db=a_db,
                b_db=b_db,
                spread_db=(0.0, *_only(end, 3.5 if low else 2.0)),
                weight=weight * (0.6 if stated else 1.0),
                why=f"only the level at {label(end)} is {'low' if low else 'high'}: aim, lines and path act on both directions "
                f"alike, the power of {label(other)} on this one alone"
                + ("; power that a radio shows may be of each chain, or before a limit" if stated else ""),
                settled_by=f"the transmit power that the radio at {label(other)} shows, all chains together",
                checks=(
                    Check(
                        rung=DESK,
                        text=f"read the transmit power at {label(other)}, per chain or together, and any limit set",
                    ),
                    *(
                        ()
                        if low
                        else (Check(rung=DESK, text="hold that power against the power rule before anything else"),)
                    ),
                ),
                sharp=False,
            )
        a_db, b_db = _only(end, -8.0)
        yield Hypothesis(
            key="receiver",
            title=f"receiver at {label(end)} shows too little",
            a_db=a_db,
            b_db=b_db,
            spread_db=(0.0, *_only(end, 6.0)),
            weight=0.02,
            why=f"a fault behind the antenna port of the receiver at {label(end)} lowers what it shows and not what it sends; "
            "an interferer raises the noise, it does not lower the level",
            settled_by="the two radios exchanged, or a known level fed into the receiver",
            checks=(
                Check(rung=DESK, text=f"compare the level at {label(end)} with its noise and error counts"),
                Check(rung=MAST, text=f"exchange the radio at {label(end)}, and read again"),
            ),
            sharp=False,
        )


def _both_powers(numbers: Numbers) -> Iterator[Hypothesis]:
    """A level that is too high both ways: seldom a fault of the path, and a matter of the rule."""
    yield Hypothesis(
        key="power",
        title="both ends transmit with more power than stated",
        a_db=5.0,
        b_db=5.0,
        spread_db=(3.0, 0.0, 0.0),
        weight=0.04,
        why="both levels are above the plan, and power set too high raises both",
        settled_by="the transmit power that both radios show, all chains together",
        checks=(
            _READ_POWER,
            Check(rung=DESK, text="hold the power of both ends against the power rule before anything else"),
        ),
        sharp=False,
    )


def _power_control(numbers: Numbers) -> Iterator[Hypothesis]:
    state, reach = numbers.built.power_control, numbers.link.radio.power_control_db
    weight = 2.0 if state == "on" else 0.002 if state == "off" else 0.4 if reach > 0.0 else 0.06
    mean, spread = (-0.55 * reach, 0.3 * reach) if reach > 0.0 else (-8.0, 4.5)
    a, b = numbers.expected_a_dbm, numbers.expected_b_dbm
    # Both ends settle on the same level, so the one that would be stronger loses more.
    apart = 0.0 if a is None or b is None else a - b
    said = (
        "was on when the levels were read"
        if state == "on"
        else "was not said to be off"
        if state is None
        else "is said off"
    )
    yield Hypothesis(
        key="power control",
        title="automatic power control on: both ends lower their power",
        a_db=mean - 0.5 * apart,
        b_db=mean + 0.5 * apart,
        spread_db=(spread, 0.0, 0.0),
        weight=weight,
        why=f"power control {said}; it holds both ends at one level"
        + (f" and can take up to {db(reach)}" if reach > 0.0 else ", however good the path is"),
        settled_by="the levels read again with power control off at both ends",
        checks=(
            Check(rung=DESK, text="switch power control off at both ends, fix the power as planned, and read again"),
        ),
        sharp=state == "on",
    )


def _chains(numbers: Numbers) -> Iterator[Hypothesis]:
    count = numbers.link.radio.chains
    if count < 2:
        return
    lost = 10.0 * math.log10((count - 1) / count)
    sets: tuple[tuple[EndLetter, ...], ...] = (("a",), ("b",), ("a", "b"))
    for ends in sets:
        at = " and at ".join(label(end) for end in ends)
        yield Hypothesis(
            key="one chain",
            title="one chain low",
            where=ends,
            a_db=lost if "a" in ends else 0.0,
            b_db=lost if "b" in ends else 0.0,
            spread_db=(0.0, 1.0 if "a" in ends else 0.0, 1.0 if "b" in ends else 0.0),
            weight=0.02,
            why=f"without one of its {count} chains the level of all together falls by {db(-lost)} at {at}"
            + (
                "; low at both ends, it is a line, a port or a polarization that both directions share"
                if len(ends) == 2
                else "; low at one end only, it is what sends it or what receives it"
            ),
            settled_by="the level of each chain at both ends",
            checks=(
                Check(rung=DESK, text="read each chain by itself at both ends; set both to transmit"),
                Check(
                    rung=MAST,
                    text="exchange the two chain cables at one end: if the weak chain moves with the cable, it is the cable or "
                    "port; look for water in its connectors",
                ),
            ),
            chain_at=ends,
        )


def _read_per_chain(numbers: Numbers) -> Iterator[Hypothesis]:
    count, told = numbers.link.radio.chains, numbers.built.levels_are
    bare = any(one.chain is None for one in numbers.built.readings)
    if count < 2 or not bare:
        return
    step = 10.0 * math.log10(count)
    down = told != "each chain"
    change = -step if down else step
    yield Hypothesis(
        key="per chain",
        title="the levels are of each chain" if down else "the levels are of all chains together",
        a_db=change,
        b_db=change,
        spread_db=(0.5, 0.0, 0.0),
        weight=0.05 if told is None else 0.02,
        why=f"a radio of {count} chains shows each of them {db(step)} under all together, and "
        + ("the file does not say which was read" if told is None else f"the file says '{told}'"),
        settled_by="the handbook of the radio, or the level of each chain beside the total",
        checks=(
            Check(rung=DESK, text="see whether the radio shows each chain or all together, and say so in the file"),
        ),
    )


def _feeders(numbers: Numbers) -> Iterator[Hypothesis]:
    hz = numbers.result.frequency_hz
    planned = {end: line_loss_db(numbers.antenna(end), frequency_hz=hz) for end in ENDS}
    stated = [end for end in ENDS if numbers.built.end(end).feeder_loss_db is not None]
    total = sum(planned.values())
    yield Hypothesis(
        key="feeder",
        title="feeder or connectors lose more than planned",
        a_db=-4.2,
        b_db=-4.2,
        spread_db=(2.2, 0.0, 0.0),
        weight=(0.2 if total > 0.0 else 0.12) * (0.5 if len(stated) == 2 else 1.0),
        why=(
            f"the plan counts {db(total)} for the lines of both ends together"
            if total > 0.0
            else "the plan counts no line between radio and antenna at either end"
        )
        + "; a longer line, a bad connector or water in one costs both directions the same few decibels",
        settled_by="the loss of each line measured by itself, and the length of what was put up",
        checks=(
            Check(rung=GROUND, text="read the kind and length of both lines as built, and hold them against the plan"),
            _CONNECTORS,
        ),
        sharp=False,
    )


def _polarization(numbers: Numbers) -> Iterator[Hypothesis]:
    crossed = numbers.crossed
    if crossed is None or crossed.a_db > -LEAST_DB:
        return
    dual = numbers.link.radio.dual_polarization
    told = [end for end in ENDS if numbers.built.end(end).polarization is not None]
    yield Hypothesis(
        key="polarization",
        title="polarizations a quarter turn apart",
        a_db=crossed.a_db,
        b_db=crossed.b_db,
        spread_db=(2.5, 0.0, 0.0),
        weight=0.10 * (0.8 if dual else 1.0) * (0.8 if len(told) == 2 else 1.0),
        why=f"with one antenna turned a quarter turn the cross-polar discrimination of both leaves {db(-crossed.a_db)} less, "
        "in both directions" + ("; a radio on two polarizations may find its chains exchanged instead" if dual else ""),
        settled_by="the marks of polarization on both antennas, or one of them turned a quarter turn",
        checks=(
            Check(rung=GROUND, text="compare the polarization marks or photographs of both antennas"),
            Check(rung=MAST, text="turn one antenna (or its feed) by 90 degrees, and read again"),
        ),
    )


def _other_antenna(numbers: Numbers) -> Iterator[Hypothesis]:
    changed = [one for one in numbers.others if abs(one.gain_db) >= LEAST_DB]
    for other in changed:
        named = bool(numbers.built.end(other.end).antenna)
        yield Hypothesis(
            key="other antenna",
            title="another antenna than planned",
            where=(other.end,),
            a_db=other.gain_db,
            b_db=other.gain_db,
            spread_db=(0.8, 0.0, 0.0),
            weight=0.04 / len(changed) * (0.3 if named else 1.0),
            why=f"'{other.name}' at {label(other.end)} would give {db(abs(other.gain_db))} "
            f"{'less' if other.gain_db < 0 else 'more'} than the antenna planned, in both directions",
            settled_by="the label of each antenna",
            checks=(Check(rung=GROUND, text="read the labels of both antennas, or measure their diameter"),),
        )
