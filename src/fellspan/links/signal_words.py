"""What a signal result says to people: sentences, notes on what is not computed, and cautions.

Reads results; computes nothing.
"""

from typing import Final

from fellspan.climate.figures import ClimateFigures
from fellspan.links.fading import Fading, Geometry, regime
from fellspan.links.feeders import feeder_caution
from fellspan.links.ranges import gas_breaches, woodland_breaches
from fellspan.links.receivers import ASSUMED_NOISE_FIGURE_DB, blocked
from fellspan.links.result import AtEnds
from fellspan.links.signal_result import DirectionResult, SignalResult
from fellspan.links.site import Link
from fellspan.links.words import down_db, least_db, margin_words
from fellspan.propagation import out_of_range
from fellspan.terrain.profile import PathProfile

LEAST_PERCENT, LEAST_MINUTES = 0.001, 5.0
"""Outages of less are not told apart: the law of rain ends at 0.001 % of the year, some 5 minutes."""
MOST_RAIN_PERCENT: Final = 1.0
"""Where the law of rain ends at the other side; outages of less than it knows get a note instead of a caution."""
_CAUSES: Final = {"rain": "rain", "multipath": "multipath", "diffraction": "low k"}
LEVEL_BEGINS: Final = "Signal at the median k in clear air: "
AVAILABLE_BEGINS: Final = "Available "
"""How the sentences begin that neighbours change, so that planning can put those with neighbours in their place."""
TREES_HOLD: Final = "Trees in the required zone hold the signal verdict at 'marginal' at most."
LEFT_OUT: Final = "neighbours on the channel are left out of it"
"""What availability says where there are any."""
LEFT_OUT_NOTE: Final = "neighbours on the channel are left out of availability and throughput"


def signal_sentences(
    link: Link, result: SignalResult, *, received_dbm: AtEnds, margin_db: AtEnds, trees: bool
) -> tuple[str, ...]:
    """Level, margin, availability and throughput in plain sentences; empty where the level is unknown."""
    level = level_sentence(link, received_dbm=received_dbm, margin_db=margin_db, wanted=result.a_to_b.wanted)
    if level is None:
        return ()
    if margin_db.at_a is None or margin_db.at_b is None:
        return (level,)
    held = (TREES_HOLD,) if trees else ()
    return (level, *held, availability_sentence(result), *_throughput(result))


def level_sentence(
    link: Link, *, received_dbm: AtEnds, margin_db: AtEnds, wanted: str | None, left_db: AtEnds | None = None
) -> str | None:
    """The level and the margin over the `wanted` modulation, with what neighbours leave of it; None where no level is known."""
    at_a, at_b = received_dbm.at_a, received_dbm.at_b
    if at_a is None or at_b is None:
        return None
    at_a, at_b = down_db(at_a), down_db(at_b)
    if at_a == at_b:
        level = f"{LEVEL_BEGINS}{at_b:.1f} dBm at both ends"
    else:
        level = f"{LEVEL_BEGINS}{at_b:.1f} dBm at {link.b.name}, {at_a:.1f} dBm at {link.a.name}"
    if margin_db.at_a is None or margin_db.at_b is None:
        return f"{level}; no threshold is given, so there is no margin and no availability."
    least = "margin" if down_db(margin_db.at_a) == down_db(margin_db.at_b) else "least margin"
    of = "" if wanted is None else f" of {wanted}"
    margin = margin_words(least_db(margin_db), None if left_db is None else least_db(left_db))
    return f"{level}, {least}{of} {margin}, {link.wanted_margin_db:g} dB wanted."


def wanted_words(least_db: float, left_db: float | None = None, *, wanted_db: float) -> str:
    """'margin 8.2 dB, 10 dB wanted', with what neighbours leave of it: why a signal falls short."""
    return f"margin {margin_words(least_db, left_db)}, {wanted_db:g} dB wanted"


def availability_sentence(result: SignalResult, *, neighbours: bool = False) -> str:
    """The availability of the wanted modulation; `neighbours` says that there are some, which it leaves out."""
    year, worst, minutes = (
        result.availability_percent.year,
        result.availability_percent.worst_month,
        result.minutes_per_year,
    )
    target = result.target_availability_percent
    asked = ""
    if target is not None:
        said = {True: "is met", False: "is not met", None: "cannot be judged"}[result.target_met]
        asked = f" The target of {target:g} % of the year in each direction {said}."
    if year is None or worst is None or minutes is None:
        why = next((note for note in result.notes if note.startswith("no ")), "see the notes")
        return f"Availability is not computed: {why}.{asked}"
    if result.dominant_cause == "level":
        return f"The level is short even in clear air, so the link is not available.{asked}"
    cause = _CAUSES.get(result.dominant_cause or "", "")
    mostly = f", mostly by {cause}" if cause and minutes >= LEAST_MINUTES else ""
    return (
        f"{AVAILABLE_BEGINS}{percent_text(year)} of an average year both ways at once ({minutes_text(minutes)} out{mostly}), "
        f"{percent_text(worst)} of its worst month{f'; {LEFT_OUT}' if neighbours else ''}.{asked}"
    )


def _throughput(result: SignalResult) -> tuple[str, ...]:
    there, back = result.a_to_b.throughput_mean_bps, result.b_to_a.throughput_mean_bps
    if there is None or back is None:
        return ()
    return (f"Mean throughput over the year for users: {rate_text(there)} A to B, {rate_text(back)} B to A.",)


def percent_text(percent: float) -> str:
    """Rounded down so that an outage is never hidden: '99.993 %'; 'over 99.999 %' beyond, where the laws end."""
    outage = 100.0 - percent
    if outage < LEAST_PERCENT:
        return f"over {100.0 - LEAST_PERCENT:g} %"
    digits = 1 if outage >= 1.0 else 2 if outage >= 0.1 else 3
    step = 10.0**digits
    return f"{int(percent * step + 1e-6) / step:g} %"


def minutes_text(minutes: float) -> str:
    """'25 minutes', '14 hours', '20 days'; 'under 5 minutes' where the laws end."""
    if minutes < LEAST_MINUTES:
        return f"under {LEAST_MINUTES:g} minutes"
    if minutes < 120.0:
        return f"{minutes:.0f} minutes"
    return f"{minutes / 60.0:.3g} hours" if minutes < 4320.0 else f"{minutes / 1440.0:.3g} days"


def rate_text(rate_bps: float) -> str:
    """'450 Mbit/s'."""
    return f"{rate_bps / 1e9:.3g} Gbit/s" if rate_bps >= 1e9 else f"{rate_bps / 1e6:.3g} Mbit/s"


def notes_of(
    link: Link,
    figures: ClimateFigures,
    directions: tuple[DirectionResult, DirectionResult],
    *,
    fadings: tuple[Fading, ...],
    geometry: Geometry,
) -> tuple[str, ...]:
    """What was not computed and how to have it, and what else a person should know of the figures."""
    radio = link.radio
    found: list[str] = []
    if directions[0].margin_db is not None and directions[1].margin_db is not None:
        found += figures.notes
    if (
        regime(figures, geometry=geometry) == "combined"
        and figures.rain_height_m is not None
        and fadings[0].rain_001_db
    ):
        found.append(
            f"the antennas lie less than 3600 m below the mean rain height of {figures.rain_height_m.value:.0f} m: melting "
            "snow may add to the loss of rain, by a method that is not computed here (Rec. ITU-R P.530-19, section 2.4.2)"
        )
    rare = [one for one in directions if (share := _wanted_rain(one)) is not None and 0.0 < share < 0.001]
    if rare:
        found.append(
            "rain takes the wanted modulation down for less than 0.001 % of the year, 5 minutes: below that the law is an "
            "extrapolation (Rec. ITU-R P.530-19, section 2.4.1)"
        )
    if radio.power_control_db:
        found.append(f"levels are at full power; power control can lower them by {radio.power_control_db:g} dB")
    if (
        radio.bandwidth_hz is not None
        and radio.noise_figure_db is None
        and any(one.threshold_degradation_db for one in directions)
    ):
        found.append(
            f"a noise figure of {ASSUMED_NOISE_FIGURE_DB:g} dB was assumed for the rise of the threshold by the noise floor"
        )
    if (link.a.noise_floors or link.b.noise_floors) and radio.bandwidth_hz is None:
        found.append("noise floors at the sites are not counted: the radio states no channel width")
    iced = link.antenna_a.radome_iced_db + link.antenna_b.radome_iced_db
    if iced and directions[0].margin_db is not None and directions[1].margin_db is not None:
        least = min(directions[0].margin_db, directions[1].margin_db)
        found.append(
            f"with both radomes iced the least margin is {down_db(least - iced):.1f} dB; how often that is, is not computed"
        )
    if radio.modulations and not any(row.signature for row in radio.modulations) and _has_multipath(fadings):
        found.append("no signature is stated, so selective fading is not counted; it grows with the channel width")
    if radio.co_channel is not None and all(
        radio.co_channel.required_ratio_db is None and row.snr_db is None for row in radio.modulations
    ):
        found.append(
            "cross-polar outage is not counted: no carrier-to-interference ratio that the receiver needs is stated"
        )
    return tuple(dict.fromkeys(found))


def _wanted_rain(direction: DirectionResult) -> float | None:
    names = [row.name for row in direction.modulations]
    if not names:
        return None
    row = direction.modulations[names.index(direction.wanted) if direction.wanted in names else 0]
    return None if row.year is None else row.year.rain


def _has_multipath(fadings: tuple[Fading, ...]) -> bool:
    return any(fading.occurrence_percent for fading in fadings)


def signal_cautions(
    link: Link, profile: PathProfile, result: SignalResult, *, fadings: tuple[Fading, ...]
) -> tuple[str, ...]:
    """Ranges left and things that keep a radio from working, by name."""
    radio = link.radio
    found: list[str] = []
    reach = radio.greatest_distance_m
    if reach is not None and profile.length_m > reach:
        found.append(
            f"Timing: the path is {profile.length_m / 1000.0:.2f} km long, the timing of radio '{radio.name}' allows "
            f"{reach / 1000.0:.2f} km: it will not pass traffic, or slowly; set a longer distance or take another radio."
        )
    for direction, site in ((result.a_to_b, link.b), (result.b_to_a, link.a)):
        channel = blocked(site, radio, frequency_hz=direction.frequency_hz)
        if channel is not None:
            why = f" ({channel.reason})" if channel.reason else ""
            found.append(
                f"Channel: {direction.frequency_hz / 1e9:.6g} GHz cannot be received at '{site.name}': "
                f"{channel.low_hz / 1e9:.6g} to {channel.high_hz / 1e9:.6g} GHz is unusable there{why}."
            )
    for antenna in (link.antenna_a, link.antenna_b):
        for frequency in radio.transmit_hz:
            doubt = None if antenna.feeder is None else feeder_caution(antenna.feeder, frequency_hz=frequency)
            found += [] if doubt is None else [doubt]
        if antenna.sway is not None and antenna.pattern is None:
            found.append(f"Sway of antenna '{antenna.name}' is not counted: only its gain is known.")
    for fading in fadings:
        loss = fading.loss
        found += [f"Gases: {one}." for one in gas_breaches(frequency_hz=loss.frequency_hz, loss_db=loss.gases_db)]
        if loss.trees.way == "through" and loss.vegetation_db > 0.0:
            found += [f"Trees: {one}." for one in woodland_breaches(frequency_hz=loss.frequency_hz)]
        # Each figure is shown by itself, also where the availability lacks another one.
        found += [f"Rain: {one}." for one in fading.rain.breaches]
        found += [f"Multipath: {one}." for one in fading.multipath_breaches]
        found += [f"Second antenna: {one}." for one in _diversity_breaches(link, fading)]
        found += [f"Cross-polar outage in rain: {one}." for one in _cross_breaches(link, fading)]
    for direction in (result.a_to_b, result.b_to_a):
        share = _wanted_rain(direction)
        if share is not None and share > MOST_RAIN_PERCENT:
            found += [f"Rain: {one}." for one in out_of_range("p530-19-rain-percent", percent=share)]
    return tuple(dict.fromkeys(found))


def _diversity_breaches(link: Link, fading: Fading) -> tuple[str, ...]:
    if not fading.occurrence_percent:
        return ()
    found: list[str] = []
    for antenna in (link.antenna_a, link.antenna_b):
        if antenna.diversity is not None:
            found += out_of_range(
                "p530-19-space-diversity",
                distance_m=fading.geometry.length_m,
                frequency_hz=fading.frequency_hz,
                spacing_m=antenna.diversity.spacing_m,
            )
    return tuple(found)


def _cross_breaches(link: Link, fading: Fading) -> tuple[str, ...]:
    if link.radio.co_channel is None or not fading.rain_001_db:
        return ()
    return out_of_range("p530-19-cross-polar-rain", frequency_hz=fading.frequency_hz)
