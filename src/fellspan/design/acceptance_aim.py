"""Causes that lie in where the antennas point: side lobes, off the peak, bearing, declination, ends swapped, tilt.

Asks the patterns of the link's own antennas; knows no levels that were measured.
"""

from collections.abc import Iterator
from dataclasses import replace
from typing import Final

import numpy as np

from fellspan.antennas.mounting import Mounting, gain_toward_dbi, turn_for
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
    joined,
    label,
)
from fellspan.design.as_built import EndLetter
from fellspan.links.antenna_gains import is_omni, pattern_facts

USUAL_LOBE_DB: Final = -19.0
"""First side lobe of an antenna whose data hold none (common practice, no source: 15 to 25 dB down)."""
COMPASS_DEG: Final = 3.0
"""Standard error of a bearing taken by compass beside a mast (common practice, no source)."""
BEARING_DEG: Final = 1.5
"""Of one taken by landmark, map or satellite compass (common practice, no source)."""
TILT_DEG: Final = 0.7
BACK_FROM_DEG: Final = 120.0
SWEEP: Final = Check(
    rung=MAST,
    text="sweep azimuth wide at one end, past a fall on both sides, and keep the highest of all peaks; then elevation; then "
    "the other end, one at a time",
)
_LOOK: Final = Check(
    rung=GROUND,
    text="hold the aim of both antennas against the landmark bearings of the crew sheet, from behind the mast",
)
_SETTLED: Final = "a wide sweep in both planes at one end at a time: a side lobe has a higher peak beside it"


def turn_between(deg: float) -> float:
    """An angle as -180 to 180 degrees."""
    return (deg + 180.0) % 360.0 - 180.0


def true_bearing(numbers: Numbers, end: EndLetter) -> float | None:
    """Bearing as built from true north, degrees; None where none was read, or where the declination is not known."""
    built = numbers.built.end(end)
    if built.bearing_deg is None:
        return None
    if built.bearing_is != "magnetic":
        return built.bearing_deg
    east = numbers.place(end).declination_deg
    return None if east is None else (built.bearing_deg + east) % 360.0


def off_plan_deg(numbers: Numbers, end: EndLetter) -> float | None:
    """Bearing as built less the one planned for the antenna, degrees."""
    found, hung = true_bearing(numbers, end), numbers.mounted(end)
    return None if found is None or hung is None else turn_between(found - hung.bearing_deg)


def change_for_aim(numbers: Numbers, end: EndLetter, *, across_deg: float, up_deg: float = 0.0) -> float | None:
    """What turning one antenna away from its planned aim does to the level, dB; None without a pattern."""
    pattern, hung = numbers.antenna(end).pattern, numbers.mounted(end)
    if pattern is None or hung is None:
        return None
    aimed = Mounting(
        bearing_deg=(hung.bearing_deg + across_deg) % 360.0,
        tilt_deg=float(np.clip(hung.tilt_deg + up_deg, -90.0, 90.0)),
        polarization=hung.polarization,
    )
    toward = numbers.bearing_deg(end), numbers.tilt_deg(end)
    planned = replace(aimed, bearing_deg=hung.bearing_deg, tilt_deg=hung.tilt_deg)
    return float(gain_toward_dbi(pattern, aimed, *toward)) - float(gain_toward_dbi(pattern, planned, *toward))


def _spread_for_aim(
    numbers: Numbers, end: EndLetter, *, across_deg: float, up_deg: float, error_deg: float, of: str
) -> tuple[float, float] | None:
    """Change of the level and its standard deviation where the aim is known to an error only."""
    steps = np.linspace(-1.5, 1.5, 7) * error_deg
    changes = [
        change_for_aim(
            numbers,
            end,
            across_deg=across_deg + (step if of == "across" else 0.0),
            up_deg=up_deg + (step if of == "up" else 0.0),
        )
        for step in steps.tolist()
    ]
    if any(one is None for one in changes):
        return None
    # A null is met exactly by nobody: power, not decibels, is what averages.
    known = np.array([one for one in changes if one is not None])
    mean = 10.0 * float(np.log10(np.mean(10.0 ** (known / 10.0))))
    return mean, max(1.5, min(float(np.std(np.maximum(known, mean - 10.0))), 6.0))


def lobes(numbers: Numbers, end: EndLetter) -> list[tuple[str, float, float | None, str]]:
    """First side lobe of one antenna in each plane as mounted: plane, level, dB, angle, degrees, and where it comes from."""
    pattern, hung = numbers.antenna(end).pattern, numbers.mounted(end)
    usual = ("either plane", USUAL_LOBE_DB, None, "no side lobe in its data: 15 to 25 dB is usual")
    if pattern is None:
        return [usual]
    if is_omni(pattern):
        return []
    facts = pattern_facts(pattern)
    planes = [("azimuth", facts.azimuth), ("elevation", facts.elevation)]
    if hung is not None and abs(turn_for(pattern, hung.polarization)) == 90.0:
        planes = [("azimuth", facts.elevation), ("elevation", facts.azimuth)]
    found = [
        (plane, one.side_lobe_db, one.side_lobe_deg, "from its pattern")
        for plane, one in planes
        if one.side_lobe_db is not None and one.side_lobe_deg is not None and one.side_lobe_deg <= BACK_FROM_DEG
    ]
    return [(plane, level, angle, origin) for plane, level, angle, origin in found] or [usual]


def aim_causes(numbers: Numbers) -> Iterator[Hypothesis]:
    """Everything that aim can do."""
    yield from _side_lobes(numbers)
    yield from _off_peak(numbers)
    for end in ENDS:
        yield from _bearing(numbers, end)
        yield from _tilt(numbers, end)
    yield from _declination(numbers)


def _side_lobes(numbers: Numbers) -> Iterator[Hypothesis]:
    checks = (_LOOK, SWEEP)
    sets = {end: lobes(numbers, end) for end in ENDS}
    for end in ENDS:
        for plane, level, angle, origin in sets[end]:
            where = "" if angle is None else f", {angle:.1f} degrees off the beam"
            off = off_plan_deg(numbers, end)
            seen = angle is not None and off is not None and abs(abs(off) - angle) < 2.0 and plane == "azimuth"
            yield Hypothesis(
                key="side lobe",
                title="an antenna aimed by its first side lobe",
                where=(end,),
                a_db=level,
                b_db=level,
                spread_db=(2.0 if angle is not None else 3.5, 0.0, 0.0),
                weight=0.16 / len(sets[end]) * (0.25 if angle is None else 0.5 * (4.0 if seen else 1.0)),
                why=f"the first side lobe of the antenna at {label(end)} in {plane} lies {db(-level)} down{where} "
                f"({origin}), and both directions lose as much"
                + (f"; the bearing read there is {abs(off or 0.0):.1f} degrees off the plan" if seen else ""),
                settled_by=_SETTLED,
                checks=checks,
            )
    if all(sets.values()):
        a, b = sets["a"][0][1], sets["b"][0][1]
        yield Hypothesis(
            key="both side lobes",
            title="both antennas aimed by a side lobe",
            a_db=a + b,
            b_db=a + b,
            spread_db=(3.0, 0.0, 0.0),
            weight=0.04,
            why=f"the first side lobes of both antennas together cost {db(-a - b)}, in both directions",
            settled_by=_SETTLED,
            checks=checks,
        )


def _off_peak(numbers: Numbers) -> Iterator[Hypothesis]:
    if all(is_omni(numbers.antenna(end).pattern) for end in ENDS):
        return
    yield Hypothesis(
        key="off the peak",
        title="an antenna beside the peak of its main lobe",
        a_db=-3.5,
        b_db=-3.5,
        spread_db=(2.0, 0.0, 0.0),
        weight=0.05,
        why="an aim some half a beamwidth off costs a few decibels in both directions",
        settled_by="a slow sweep in both planes: if it was off its peak, the level rises",
        checks=(
            _LOOK,
            Check(rung=MAST, text="sweep slowly through the peak in both planes at each end and tighten there"),
        ),
        sharp=False,
    )


def _bearing(numbers: Numbers, end: EndLetter) -> Iterator[Hypothesis]:
    off = off_plan_deg(numbers, end)
    if off is None:
        return
    built = numbers.built.end(end)
    error = COMPASS_DEG if built.bearing_is == "magnetic" else BEARING_DEG
    if abs(off) <= 1.5 * error:
        return
    found = _spread_for_aim(numbers, end, across_deg=off, up_deg=0.0, error_deg=error, of="across")
    if found is None or found[0] > -LEAST_DB:
        return
    change, spread = found
    swapped = abs(turn_between(off - 180.0)) < 12.0
    east = numbers.place(end).declination_deg
    if not swapped and east is not None and abs(abs(off) - abs(east)) < 1.5 * error and abs(east) > error:
        return  # the declination is the better name for it
    yield Hypothesis(
        key="swapped bearing" if swapped else "bearing",
        title=f"antenna at {label(end)} points the other way: the bearing of the other end was used"
        if swapped
        else f"bearing at {label(end)} off the plan",
        a_db=change,
        b_db=change,
        spread_db=(spread, 0.0, 0.0),
        weight=0.10,
        why=f"the bearing read at {label(end)} is {abs(off):.1f} degrees {'right' if off > 0 else 'left'} of the plan, where "
        f"its pattern gives {db(-change)} less",
        settled_by="the bearing taken again by a landmark, or a wide sweep in azimuth",
        checks=(
            Check(rung=DESK, text="see that each end worked from its own crew sheet"),
            Check(rung=GROUND, text=f"take the bearing at {label(end)} again by landmark, away from steel"),
            SWEEP,
        ),
    )


def _tilt(numbers: Numbers, end: EndLetter) -> Iterator[Hypothesis]:
    built, hung = numbers.built.end(end), numbers.mounted(end)
    if built.tilt_deg is None or hung is None:
        return
    off = built.tilt_deg - hung.tilt_deg
    found = _spread_for_aim(numbers, end, across_deg=0.0, up_deg=off, error_deg=TILT_DEG, of="up")
    if abs(off) <= TILT_DEG or found is None or found[0] > -LEAST_DB:
        return
    change, spread = found
    sign = abs(built.tilt_deg + hung.tilt_deg) < TILT_DEG and abs(hung.tilt_deg) > TILT_DEG
    yield Hypothesis(
        key="tilt",
        title=f"tilt at {label(end)} off the plan" + (", up taken for down" if sign else ""),
        a_db=change,
        b_db=change,
        spread_db=(spread, 0.0, 0.0),
        weight=0.10,
        why=f"the tilt read at {label(end)} is {abs(off):.1f} degrees {'above' if off > 0 else 'below'} the plan, where its "
        f"pattern gives {db(-change)} less",
        settled_by="an inclinometer on the mounting face, then a slow sweep in elevation",
        checks=(
            Check(rung=MAST, text=f"set the tilt at {label(end)} again with an inclinometer, then sweep elevation"),
        ),
    )


def _declination(numbers: Numbers) -> Iterator[Hypothesis]:
    """A compass bearing taken for a true one: at A, at B, or at both alike."""
    found: dict[EndLetter, tuple[float, float, float]] = {}
    for end in ENDS:
        east, hung = numbers.place(end).declination_deg, numbers.mounted(end)
        if east is None or hung is None or is_omni(numbers.antenna(end).pattern):
            continue
        change = _spread_for_aim(numbers, end, across_deg=east, up_deg=0.0, error_deg=BEARING_DEG, of="across")
        if change is None or change[0] > -LEAST_DB:
            continue
        off = off_plan_deg(numbers, end)
        built, weight = numbers.built.end(end), 0.015
        if off is not None:
            error = COMPASS_DEG if built.bearing_is == "magnetic" else BEARING_DEG
            shows = abs(abs(off) - abs(east)) < 1.5 * error and abs(east) > error
            weight = 0.6 if shows else 0.012 if built.bearing_is != "magnetic" and abs(off) < 2.0 * error else 0.003
        found[end] = (change[0], change[1], weight)
    sets: list[tuple[EndLetter, ...]] = [(end,) for end in found]
    if len(found) == 2:
        sets.append(("a", "b"))
    shown = [end for end, (_, _, weight) in found.items() if weight > 0.5]
    for ends in sets:
        # Where the bearings of both ends show it, both ends have it: one alone is then not what was read.
        weight = min(found[end][2] for end in ends) if len(ends) == 2 else found[ends[0]][2]
        weight *= 0.02 if len(shown) == 2 and len(ends) == 1 else 1.0
        lost = sum(found[end][0] for end in ends)
        spread = float(np.hypot.reduce([found[end][1] for end in ends]))
        east = numbers.place(ends[0]).declination_deg or 0.0
        at = joined(ends)
        read = [end for end in ends if end in shown]
        yield Hypothesis(
            key="declination",
            title="a magnetic bearing taken for a true one",
            where=ends,
            a_db=lost,
            b_db=lost,
            spread_db=(spread, 0.0, 0.0),
            weight=weight,
            why=f"the declination there is {abs(east):.1f} degrees {'east' if east > 0 else 'west'}; an antenna that far off "
            f"its bearing{'s' if len(ends) > 1 else ''} gives {db(-lost)} less"
            + (
                f"; the bearing read at {' and '.join(label(end) for end in read)} is off the plan by just that"
                if read
                else ""
            ),
            settled_by="the bearing by a landmark, or by compass with the declination of the crew sheet applied",
            checks=(
                Check(
                    rung=DESK,
                    text="ask which bearing was set on the compass: the magnetic one of the crew sheet is for it",
                ),
                Check(rung=GROUND, text=f"take the bearing at {at} again by landmark, away from steel"),
                SWEEP,
            ),
        )
