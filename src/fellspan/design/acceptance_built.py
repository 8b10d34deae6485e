"""What a crew measured at each end against the plan: heights, place, bearing, tilt, power, line, antenna; as rows of text.

Subtracts and words; assesses nothing.
"""

from collections.abc import Iterator
from typing import Final

from fellspan.design.acceptance_aim import BEARING_DEG, COMPASS_DEG, TILT_DEG, off_plan_deg, true_bearing, turn_between
from fellspan.design.acceptance_hypotheses import ENDS, Numbers, label
from fellspan.design.acceptance_result import BuiltCheck
from fellspan.design.as_built import BuiltEnd, EndLetter
from fellspan.geodesy import geodesic
from fellspan.links.budget import line_loss_db
from fellspan.links.result import EndResult
from fellspan.links.site import Site

HEIGHT_M: Final = 0.5
"""Antenna heights that differ by less agree (common practice, no source: a tape or a range finder)."""
PLACE_M: Final = 10.0
"""Positions that lie nearer agree: a hand-held receiver is no better (common practice, no source)."""
LOSS_DB: Final = 0.5


def built_checks(numbers: Numbers, *, as_built_amsl_m: tuple[float | None, float | None]) -> tuple[BuiltCheck, ...]:
    """The rows of both ends; `as_built_amsl_m` are the levels of the antennas as measured, where they could be worked out."""
    return tuple(row for end, level in zip(ENDS, as_built_amsl_m, strict=True) for row in _rows(numbers, end, level))


def _rows(numbers: Numbers, end: EndLetter, amsl_m: float | None) -> Iterator[BuiltCheck]:
    built, place = numbers.built.end(end), numbers.place(end)
    site = numbers.link.a if end == "a" else numbers.link.b
    yield from _height(end, built, place, amsl_m)
    yield from _position(end, built, site)
    yield from _bearing(numbers, end, built)
    hung = numbers.mounted(end)
    if built.tilt_deg is not None and hung is not None:
        off = built.tilt_deg - hung.tilt_deg
        yield BuiltCheck(
            end=label(end),
            what="tilt, up is +",
            planned=f"{hung.tilt_deg:+.2f} deg",
            measured=f"{built.tilt_deg:+.2f} deg",
            difference=f"{off:+.2f} deg",
            differs=abs(off) > TILT_DEG,
        )
    if built.polarization is not None and hung is not None:
        same = "dual" in (built.polarization, hung.polarization) or built.polarization == hung.polarization
        yield _words(end, "polarization", hung.polarization, built.polarization, same=same)
    power = _power_dbm(numbers, end)
    if built.power_dbm is not None:
        apart = None if power is None else built.power_dbm - power
        yield BuiltCheck(
            end=label(end),
            what="power, all chains",
            planned="not stated" if power is None else f"{power:.1f} dBm",
            measured=f"{built.power_dbm:.1f} dBm",
            difference="-" if apart is None else f"{apart:+.1f} dB",
            differs=apart is not None and abs(apart) > LOSS_DB,
        )
    if built.feeder_loss_db is not None:
        line = line_loss_db(numbers.antenna(end), frequency_hz=numbers.result.frequency_hz)
        off = built.feeder_loss_db - line
        yield BuiltCheck(
            end=label(end),
            what="feeder and connectors",
            planned=f"{line:.1f} dB",
            measured=f"{built.feeder_loss_db:.1f} dB",
            difference=f"{off:+.1f} dB",
            differs=abs(off) > LOSS_DB,
        )
    if built.antenna:
        planned = numbers.antenna(end).name
        same = planned.casefold() in built.antenna.casefold()
        yield _words(end, "antenna", planned, built.antenna, same=same)


def _words(end: EndLetter, what: str, planned: str, measured: str, *, same: bool) -> BuiltCheck:
    return BuiltCheck(
        end=label(end),
        what=what,
        planned=planned,
        measured=measured,
        difference="as planned" if same else "differs",
        differs=not same,
    )


def _height(end: EndLetter, built: BuiltEnd, place: EndResult, amsl_m: float | None) -> Iterator[BuiltCheck]:
    if built.height_m is None and built.roof_m is None and built.ground_amsl_m is None:
        return
    above = "sea level" if built.height_reference == "sea" else built.height_reference
    given = (
        "as planned, over another roof or ground" if built.height_m is None else f"{built.height_m:.1f} m above {above}"
    )
    if built.roof_m is not None:
        given += f" ({built.roof_m:.1f} m)"
    off = None if amsl_m is None else amsl_m - place.antenna_amsl_m
    yield BuiltCheck(
        end=label(end),
        what="antenna height",
        planned=place.height_as_given,
        measured=given,
        difference="-" if off is None else f"{off:+.1f} m",
        differs=off is not None and abs(off) > HEIGHT_M,
        note="" if amsl_m is not None else "the link could not be worked out at this height",
    )


def _position(end: EndLetter, built: BuiltEnd, site: Site) -> Iterator[BuiltCheck]:
    if built.position is None:
        return
    away = geodesic.inverse(site.position, built.position)
    far = away.distance_m > PLACE_M
    yield BuiltCheck(
        end=label(end),
        what="position",
        planned=_place(site.position.latitude_deg, site.position.longitude_deg),
        measured=_place(built.position.latitude_deg, built.position.longitude_deg),
        difference=f"{away.distance_m:.0f} m" + (f" toward {away.bearing_ab_deg:03.0f} deg" if far else ""),
        differs=far,
        note=""
        if far
        else f"nearer than {PLACE_M:g} m, which a hand-held receiver cannot tell: the plan's position was kept",
    )


def _place(latitude_deg: float, longitude_deg: float) -> str:
    return f"{abs(latitude_deg):.5f} {'NS'[latitude_deg < 0]}, {abs(longitude_deg):.5f} {'EW'[longitude_deg < 0]}"


def _bearing(numbers: Numbers, end: EndLetter, built: BuiltEnd) -> Iterator[BuiltCheck]:
    hung, east = numbers.mounted(end), numbers.place(end).declination_deg
    if built.bearing_deg is None or hung is None:
        return
    found, off = true_bearing(numbers, end), off_plan_deg(numbers, end)
    error = COMPASS_DEG if built.bearing_is == "magnetic" else BEARING_DEG
    differs = off is not None and abs(off) > 1.5 * error
    yield BuiltCheck(
        end=label(end),
        what="bearing, true",
        planned=f"{hung.bearing_deg:05.1f} deg",
        measured=f"{built.bearing_deg:05.1f} deg {built.bearing_is}"
        + (f" = {found:05.1f} true" if built.bearing_is == "magnetic" and found is not None else ""),
        difference="declination not known" if off is None else f"{off:+.1f} deg",
        differs=differs,
        note=_bearing_note(numbers, end, off, east, error) if differs else "",
    )


def _bearing_note(numbers: Numbers, end: EndLetter, off: float | None, east: float | None, error: float) -> str:
    """What a wrong bearing looks like: the other end's, or out by the declination one way or the other."""
    if off is None:
        return ""
    other: EndLetter = "b" if end == "a" else "a"
    if abs(turn_between(off - 180.0)) < 12.0:
        return (
            f"this is the bearing planned at {label(other)}: the two sheets or the two ends of the file are exchanged"
        )
    if east is not None and abs(east) > error:
        if abs(off - east) < 1.5 * error:
            return "off by the declination: the true bearing was set on a compass"
        if abs(off + east) < 1.5 * error:
            return "this is the magnetic bearing of the plan: it may be written down as true by mistake"
    return ""


def _power_dbm(numbers: Numbers, end: EndLetter) -> float | None:
    signal = numbers.result.signal
    if signal is None:
        return None
    return (signal.a_to_b if end == "a" else signal.b_to_a).power_dbm
