"""The crew sheet of one end of a link: one page to take up the mast, in grey. Computes nothing but differences of figures."""

import math
from dataclasses import dataclass
from typing import Final, Literal

import numpy as np

from fellspan.antennas.facts import CutFacts
from fellspan.antennas.mounting import turn_for
from fellspan.geodesy.coordinates import format_position
from fellspan.geodesy.position import Position
from fellspan.links.exposure import ExposureDistances
from fellspan.links.result import AntennaResult, LinkResult
from fellspan.links.safety import SafetyTopic, safety_lines
from fellspan.links.signal_result import DirectionResult
from fellspan.links.site import Antenna
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.report import wording
from fellspan.report.crew_banner import NO_LEVEL, Banner, banner_of, has_no_level, over_rule
from fellspan.report.crew_work import (
    BAND_DB,
    BLANKS,
    Pairs,
    accept_words,
    checks_of,
    ladder,
    over_db,
    power_words,
    work,
)
from fellspan.report.horizon_drawing import side_words
from fellspan.report.polar_drawing import Curve, curve_of

MOST_LANDMARKS: Final = 5
_LONGEST: Final = 60
_GROUPS: Final = {"public": "general public", "occupational": "trained workers"}
_TOPICS: Final[tuple[SafetyTopic, ...]] = (
    "climbing",
    "power lines",
    "lightning and earthing",
    "radio exposure",
    "local codes",
)

EndLetter = Literal["A", "B"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Misaimed:
    """One plane: what a wrong aim shows on the meter, and the first side lobe, which looks like a peak."""

    plane: str
    width: str
    rows: Pairs
    trap: str


@dataclass(frozen=True, slots=True, kw_only=True)
class CrewSheet:
    """All that the sheet shows; pairs are label and text."""

    letter: EndLetter
    banner: Banner | None
    is_tight: bool
    """Whether warnings take room, so that print is set closer."""
    link: str
    site: str
    other: str
    place: Pairs
    antenna: Pairs
    pointing: Pairs
    landmarks: Pairs
    no_landmarks: str
    state: Pairs
    level: Pairs
    misaimed: tuple[Misaimed, ...]
    no_pattern: str
    work: tuple[str, ...]
    accept: str
    has_band: bool
    ladder: Pairs
    distances: tuple[tuple[str, str, str, str], ...]
    no_distances: str
    cautions: tuple[str, ...]
    blanks: tuple[str, ...]


def crew_sheet(plan: StudyPlan, link: LinkPlan, letter: EndLetter) -> CrewSheet:
    """The sheet of end A or B."""
    result = link.result
    at_a = letter == "A"
    here, there = (result.ends.a, result.ends.b) if at_a else (result.ends.b, result.ends.a)
    kit = link.link.antenna_a if at_a else link.link.antenna_b
    mounted = None if result.antennas is None else result.antennas.a if at_a else result.antennas.b
    exposed = None if result.exposure is None else result.exposure.a if at_a else result.exposure.b
    received = _heard(result, letter)
    datum = result.vertical_datum or "vertical datum not stated by the data"
    none = has_no_level(result)
    banner = banner_of(result)
    groups = () if exposed is None else (exposed.public, exposed.occupational)
    return CrewSheet(
        letter=letter,
        banner=banner,
        is_tight=banner is not None or bool(over_rule(checks_of(result, letter)[0])),
        link=_short(result.name),
        site=_short(here.site),
        other=_short(there.site),
        place=(
            ("Position, WGS 84", format_position(_at(here.latitude_deg, here.longitude_deg))),
            ("the same", format_position(_at(here.latitude_deg, here.longitude_deg), "dms")),
            ("Ground", f"{wording.metres(here.ground_m)} above sea level, {datum}"),
            ("Antenna, centre", _short(here.height_as_given)),
            (
                "that is",
                f"{wording.metres(here.antenna_agl_m)} above ground, {wording.metres(here.antenna_amsl_m)} above sea",
            ),
        ),
        antenna=_antenna(link, letter, kit, mounted),
        pointing=_pointing(link, letter, mounted, date=plan.study.date.isoformat()),
        landmarks=_landmarks(link, letter),
        no_landmarks="" if _landmarks(link, letter) else _no_landmarks(link),
        state=_state(link, letter),
        level=_level(result, letter),
        misaimed=_misaimed(kit, mounted, None if none else received),
        no_pattern=""
        if kit.pattern is not None
        else "Only the gain is known: the study holds no pattern of this antenna.",
        work=work(is_stopped=banner is not None and banner.heavy, check=checks_of(result, letter)[0]),
        accept=f"{NO_LEVEL[0].upper()}{NO_LEVEL[1:]}." if none else accept_words(received),
        has_band=not none,
        ladder=() if none else ladder(_lobes(kit, mounted)),
        distances=tuple(_keep(one) for one in groups),
        no_distances=""
        if groups
        else "not computed, power or gain is unknown: switch off before work near the antenna",
        cautions=safety_lines(_TOPICS),
        blanks=BLANKS,
    )


def _at(latitude_deg: float, longitude_deg: float) -> Position:
    return Position(latitude_deg=latitude_deg, longitude_deg=longitude_deg)


def _short(text: str) -> str:
    return wording.shorten(text, _LONGEST)


def _antenna(link: LinkPlan, letter: EndLetter, kit: Antenna, mounted: AntennaResult | None) -> Pairs:
    sent, heard = _directions(link.result, letter)
    peak = kit.peak_gain_dbi
    gain = "gain not stated" if peak is None else f"{wording.number(peak)} dBi"
    turned = mounted.polarization if mounted is not None else link.result.polarization
    transmit = wording.frequency(link.result.frequency_hz if sent is None else sent.frequency_hz)
    receive = wording.frequency(link.result.frequency_hz if heard is None else heard.frequency_hz)
    same = transmit == receive
    return (
        ("Antenna", f"{_short(kit.name)}, {gain}"),
        ("Polarization", f"{turned}, the same at both ends"),
        ("Frequency", transmit if same else f"transmits {transmit}, receives {receive}"),
    )


def _directions(result: LinkResult, letter: EndLetter) -> tuple[DirectionResult | None, DirectionResult | None]:
    """What this end sends, and what it hears."""
    signal = result.signal
    if signal is None:
        return None, None
    return (signal.a_to_b, signal.b_to_a) if letter == "A" else (signal.b_to_a, signal.a_to_b)


def _pointing(link: LinkPlan, letter: EndLetter, mounted: AntennaResult | None, *, date: str) -> Pairs:
    result, at_a = link.result, letter == "A"
    here = result.ends.a if at_a else result.ends.b
    bearing = result.bearing_ab_deg if at_a else result.bearing_ba_deg
    tilt = result.tilt_ab_deg if at_a else result.tilt_ba_deg
    rows = [("True bearing", wording.bearing(bearing))]
    if here.declination_deg is None:
        rows.append(("Magnetic", "not computed"))
    else:
        model = result.magnetic_model or "model not named"
        rows.append(("Magnetic", wording.bearing(here.magnetic_bearing_deg)))
        rows.append(("Declination", f"{wording.degrees(here.declination_deg, sign=True)}, {model} for {date}"))
    rows += [
        ("Tilt, up is +", f"{wording.degrees(tilt, 2, sign=True)} at k {wording.k_factor(result.median_k)}"),
        ("Distance", wording.distance(result.distance_m)),
    ]
    if mounted is not None and max(abs(mounted.azimuth_off_deg), abs(mounted.elevation_off_deg)) >= 0.5:
        fixed = f"{wording.bearing(mounted.bearing_deg)} true, tilt {wording.degrees(mounted.tilt_deg, 2, sign=True)}"
        rows.append(("Antenna stays at", f"{fixed}, as planned: not at the other end"))
    return tuple(rows)


def _landmarks(link: LinkPlan, letter: EndLetter) -> Pairs:
    """The nearest to the link of the summits that the skyline found, from left to right."""
    if link.horizons is None:
        return ()
    seen = link.horizons.a if letter == "A" else link.horizons.b
    nearest = sorted(
        seen.landmarks, key=lambda mark: abs((mark.bearing_deg - seen.bearing_deg + 180.0) % 360.0 - 180.0)
    )
    chosen = [mark for mark in seen.landmarks if mark in nearest[:MOST_LANDMARKS]]
    return tuple(
        (
            wording.bearing(mark.bearing_deg),
            (
                f"{wording.shorten(mark.what, 24)}, {wording.distance(mark.distance_m)}, "
                f"{wording.degrees(mark.elevation_deg, 1, sign=True)}: {side_words(mark.bearing_deg, seen.bearing_deg)}"
            ),
        )
        for mark in chosen
    )


def _no_landmarks(link: LinkPlan) -> str:
    if link.horizons is None:
        return "No skyline was worked out: plan with --horizons to have landmarks, or take them from a map."
    return "No summit stands out within 30° of the link: take landmarks from a map."


def _state(link: LinkPlan, letter: EndLetter) -> Pairs:
    sent, heard = _directions(link.result, letter)
    radio = link.link.radio
    wanted = link.result.modulation
    power = None if sent is None else sent.power_dbm
    other = None if heard is None else heard.power_dbm
    chains = (
        f"{radio.chains} chains: levels below are of all together; each alone shows "
        f"{wording.number(10.0 * math.log10(radio.chains))} dB less"
        if radio.chains > 1
        else "one chain"
    )
    mine, theirs = checks_of(link.result, letter)
    shown = f"{power_words(mine, power)} here" + ("" if other is None else f", {power_words(theirs, other)} there")
    over = over_rule(mine)
    return (
        (
            "Modulation",
            f"fixed: {_short(wanted) if wanted else 'one that is stated in the study'}; adaptive modulation off",
        ),
        (
            "Power",
            f"fixed: {shown}, all chains together; automatic power control off at both ends",
        ),
        *((("OVER THE RULE", over),) if over else ()),
        ("Meter", chains),
        ("Air", "clear, no rain; note hour and tide, and look again later where the path crosses water"),
    )


def _heard(result: LinkResult, letter: EndLetter) -> float | None:
    """Level here, dBm, with no more power at the other end than its rule allows."""
    received = result.received_dbm.at_a if letter == "A" else result.received_dbm.at_b
    sender = _directions(result, letter)[1]
    over = over_db(checks_of(result, letter)[1], None if sender is None else sender.power_dbm)
    return None if received is None else received - over


def _level(result: LinkResult, letter: EndLetter) -> Pairs:
    other: EndLetter = "B" if letter == "A" else "A"
    rows = []
    for label, end in ((f"Expected here ({letter})", letter), ("Expected at the other end", other)):
        level = _heard(result, end)
        planned = result.received_dbm.at_a if end == "A" else result.received_dbm.at_b
        if level is None or planned is None:
            rows.append((label, "not computed: the study states no power or no gain"))
            continue
        cut = (
            ""
            if planned - level < 0.05
            else f" with the power that the rule allows ({wording.decibels(planned, '')} as planned)"
        )
        if has_no_level(result):
            rows.append((label, f"{wording.decibels(level, 'dBm')} as computed{cut}, not for acceptance"))
        else:
            low, high = wording.decibels(level - BAND_DB, ""), wording.decibels(level + BAND_DB, "")
            rows.append((label, f"{wording.decibels(level, 'dBm')}{cut}; accepted from {low} to {high} dBm"))
    if has_no_level(result):
        rows.append(("Acceptance", NO_LEVEL))
    if result.verdict == "obstructed":
        rows.append(("Mind", "the path is obstructed: the level comes over the obstacle and may differ by far more"))
    return tuple(rows)


def _lobes(kit: Antenna, mounted: AntennaResult | None) -> tuple[CutFacts, ...]:
    """Facts of the antenna in both planes; none where only its gain is known."""
    return tuple(curve.facts for _, curve in _planes(kit, mounted))


def _misaimed(kit: Antenna, mounted: AntennaResult | None, received: float | None) -> tuple[Misaimed, ...]:
    return tuple(_plane(word, curve, received) for word, curve in _planes(kit, mounted))


def _planes(kit: Antenna, mounted: AntennaResult | None) -> tuple[tuple[str, Curve], ...]:
    pattern = kit.pattern
    if pattern is None:
        return ()
    turned = mounted is not None and abs(turn_for(pattern, mounted.polarization)) == 90.0
    return (
        ("azimuth", curve_of(pattern, "horizontal", turned=turned)),
        ("elevation", curve_of(pattern, "vertical", turned=turned)),
    )


def _plane(word: str, curve: Curve, received: float | None) -> Misaimed:
    facts, data = curve.facts, curve.data
    width = facts.half_power_deg
    if width is None or width >= 180.0:
        return Misaimed(
            plane=word, width="no half-power width", rows=(), trap="It has no beam in this plane: no side lobe to meet."
        )
    rows = []
    for share in (0.25, 0.5, 0.75, 1.0):
        off = share * width
        sides = np.interp([facts.peak_deg - off, facts.peak_deg + off], data.angle_deg, data.gain_dbi)
        loss = max(curve.peak_dbi - float(sides.max()), 0.0)
        rows.append((f"{wording.number(off, 1 if width >= 2.0 else 2)}°", _meter(-loss, received)))
    trap = "No side lobe in the data."
    if facts.side_lobe_db is not None and facts.side_lobe_deg is not None:
        trap = (
            f"TRAP: the first side lobe, {wording.number(facts.side_lobe_deg)}° off, peaks like the beam but "
            f"{wording.number(-facts.side_lobe_db)} dB lower{_at_level(facts.side_lobe_db, received)}."
        )
    return Misaimed(plane=word, width=f"half power {wording.number(width)}° wide", rows=tuple(rows), trap=trap)


def _meter(change_db: float, received: float | None) -> str:
    words = f"{wording.number(change_db)} dB"
    return words if received is None else f"{words}: {wording.decibels(received + change_db, 'dBm')}"


def _at_level(change_db: float, received: float | None) -> str:
    return "" if received is None else f" (about {wording.decibels(received + change_db, 'dBm')})"


def _keep(one: ExposureDistances) -> tuple[str, str, str, str]:
    front, beside, behind = (
        wording.missing(value) if value is not None else "as in front"
        for value in (one.front_m, one.beside_m, one.behind_m)
    )
    return _GROUPS[one.group], front, beside, behind
