"""Which antennas and radios close a link: each pair over one path by the engine that plans links, ranked by a stated policy.

Replaces antennas and radios on a link and asks `links`; holds no formula of levels. Knows no study files and no pages.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np

from fellspan.antennas.pattern import Pattern
from fellspan.design.equip_result import POLICY, EquipResult, EquipRow, EquipSettings, Reach, ShortOf
from fellspan.design.equip_words import assumptions_of, cautions_of, changes_of, decision_of
from fellspan.design.handling import off_aim_db, sway_loss_db, wind_on
from fellspan.design.needed_margin import needed_margin_db, unpowered, wanted_receiver
from fellspan.design.offers import Offer, on_the_line
from fellspan.design.reach import REACH_M, ReachEnd, Reacher
from fellspan.errors import AntennaError, LinkError
from fellspan.links.antenna_gains import antennas_of, cross_discrimination_db, polarization_loss_db
from fellspan.links.assess import Assessment, trees_in_zone
from fellspan.links.budget import line_loss_db
from fellspan.links.direction import Direction
from fellspan.links.fading import Fading, Receiver
from fellspan.links.own_building import standing
from fellspan.links.radiated import highest_power_dbm, power_checks
from fellspan.links.radio import Radio
from fellspan.links.receivers import rows_of
from fellspan.links.result import AtEnds, PowerChecks
from fellspan.links.signal import at_most_of, both_ways, worse_of
from fellspan.links.signal_path import SignalPath, Weather, both_directions, path_of
from fellspan.links.site import Link
from fellspan.links.verdicts import signal_verdict
from fellspan.vocabulary import PathVerdict

_SAME_DB: Final = 1e-9


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class EquipPath:
    """The way between the two ends for one radio: losses and climate, where the ends lie, whether trees reach into the zone.

    `verdict` is that of the terrain; None on a free path.
    """

    path: SignalPath
    bearings_deg: tuple[float, float]
    tilts_deg: tuple[float, float]
    trees: bool = False
    verdict: PathVerdict | None = None


def path_over(link: Link, assessment: Assessment, *, median_k: float, weather: Weather) -> EquipPath:
    """The path of a link that was assessed with a radio of the same frequency and polarization."""
    result, stands = assessment.result, standing(assessment.profile)
    path = path_of(
        link,
        assessment.profile,
        stands,
        a_amsl_m=result.ends.a.antenna_amsl_m,
        b_amsl_m=result.ends.b.antenna_amsl_m,
        median_k=median_k,
        weather=weather,
        maps=True,
    )
    return EquipPath(
        path=path,
        bearings_deg=(result.bearing_ab_deg, result.bearing_ba_deg),
        tilts_deg=(result.tilt_ab_deg, result.tilt_ba_deg),
        trees=trees_in_zone(stands, assessment.levels),
        verdict=result.verdict,
    )


def compare_equipment(
    link: Link,
    offers: Sequence[Offer],
    radios: Sequence[Radio] = (),
    *,
    way: Callable[[Link], EquipPath],
    weather: Weather,
    settings: EquipSettings | None = None,
) -> EquipResult:
    """Compare antennas and radios on a link.

    Parameters
    ----------
    link
        With sites, lines, target, margin and power rule; its antennas and radio are those that others are put in place of.
    offers
        Antennas, the same one at both ends unless `settings.end` says otherwise.
    radios
        The link's own radio where empty.
    way
        Gives the path of the link as it stands with a radio; asked once for each set of frequencies and polarization.
    weather
        Climate as given, and how rain is worked out; the same that `way` uses.
    settings
        Wind, mast arm, error of aim, end, reach.

    Raises
    ------
    LinkError
        A radio states no power or no threshold, nothing can be compared, or the end that keeps its antenna has none.
    """
    settings = settings or EquipSettings()
    radios = tuple(radios) or (link.radio,)
    for radio in radios:
        _refuse_incomplete(radio)
    bench = _Bench(link, way, weather, settings)
    rows: list[EquipRow] = []
    passed_over: list[str] = []
    for radio in radios:
        for offer in offers:
            try:
                rows.append(bench.row(offer, radio))
            except AntennaError as error:
                passed_over.append("; ".join((error.what, *error.details)))
    if not rows:
        raise LinkError(
            f"none of {len(offers)} antennas can be compared on '{link.name}'",
            *dict.fromkeys(passed_over[:2]),
            "`fellspan antenna --list` shows which antennas there are and for which frequencies",
        )
    order = sorted(range(len(rows)), key=lambda index: _rank_key(rows[index], index))
    ranked = tuple(replace(rows[index], rank=place) for place, index in enumerate(order, start=1))
    best = 0 if ranked[0].meets else None
    first = bench.way_for(replace(link, radio=radios[0]))
    return EquipResult(
        link=link.name,
        distance_m=first.path.geometry.length_m,
        frequency_hz=radios[0].frequency_hz,
        target_availability_percent=link.target_availability_percent,
        wanted_margin_db=link.wanted_margin_db,
        end=settings.end,
        path_verdict=first.verdict,
        decision=decision_of(link, ranked, path_verdict=first.verdict),
        changes=changes_of(ranked),
        policy=POLICY,
        rows=ranked,
        best=best,
        passed_over=tuple(dict.fromkeys(passed_over)),
        cautions=cautions_of(
            link, ranked, first.path.figures, trees=first.trees, distance_m=first.path.geometry.length_m
        ),
        assumptions=assumptions_of(settings, ranked, first.path),
        reach_distance_m=REACH_M if settings.reach else (),
    )


def _rank_key(row: EquipRow, index: int) -> tuple[float, ...]:
    missing = float("inf") if row.spare_db is None else -row.spare_db
    area = float("inf") if row.frontal_area_m2 is None else row.frontal_area_m2
    mass = float("inf") if row.mass_kg is None else row.mass_kg
    return (
        0.0 if row.meets else 1.0,
        0.0 if row.meets else missing,
        area,
        mass,
        row.peak_gain_dbi or 0.0,
        float(index),
    )


def _refuse_incomplete(radio: Radio) -> None:
    if not rows_of(radio):
        raise LinkError(
            f"radio '{radio.name}' states no threshold, so that no margin can be worked out",
            "give it modulations, or a threshold such as '-72 dBm'",
        )
    if highest_power_dbm(radio) is None:
        raise LinkError(f"radio '{radio.name}' states no power, so that no level can be worked out", "as in '23 dBm'")


class _Bench:
    """The link on which pairs are tried, with what many of them share."""

    def __init__(self, link: Link, way: Callable[[Link], EquipPath], weather: Weather, settings: EquipSettings) -> None:
        self.link, self.weather, self.settings = link, weather, settings
        self._way = way
        self._ways: dict[tuple[object, ...], EquipPath] = {}
        self._needed: dict[tuple[object, ...], float | None] = {}
        self._off_aim: dict[int, tuple[Pattern, float]] = {}
        self._reacher = Reacher(weather)

    def way_for(self, link: Link) -> EquipPath:
        """The path for the radio of the link, worked out once."""
        radio = link.radio
        key = (radio.frequency_hz, radio.transmit_hz, radio.polarization)
        if key not in self._ways:
            self._ways[key] = self._way(link)
        return self._ways[key]

    def row(self, offer: Offer, radio: Radio) -> EquipRow:
        """One antenna with one radio."""
        antenna = offer.at(radio.frequency_hz)
        link = replace(
            self.link,
            radio=radio,
            antenna_a=self.link.antenna_a if self.settings.end == "b" else on_the_line(antenna, self.link.antenna_a),
            antenna_b=self.link.antenna_b if self.settings.end == "a" else on_the_line(antenna, self.link.antenna_b),
        )
        checks = power_checks(link)
        link, lowered = _within_rule(link, checks)
        way = self.way_for(link)
        aim = {"bearings_deg": way.bearings_deg, "tilts_deg": way.tilts_deg}
        antennas = antennas_of(link, **aim)
        if antennas.a.gain_dbi is None or antennas.b.gain_dbi is None:
            raise LinkError(
                f"link '{link.name}': the end that keeps its antenna states no gain",
                "state its antenna, or compare with the same antenna at both ends",
            )
        polarization_db = polarization_loss_db(link, **aim)
        fadings, (there, back) = both_directions(
            link,
            way.path,
            antennas=antennas,
            polarization_db=polarization_db,
            weather=self.weather,
            workings=False,
            **aim,
        )
        margin = AtEnds(at_a=back.result.margin_db, at_b=there.result.margin_db)
        at_most = at_most_of(link, there, back, length_m=way.path.geometry.length_m)
        wanted = link.wanted_margin_db
        periods, minutes, _ = both_ways(there, back, common=link.radio.shares_frequency)
        discrimination = cross_discrimination_db(link, **aim)
        receivers = _receivers(link, fadings, (there, back), discrimination)
        needed = self._needed_both(link, fadings, receivers)
        spare, short_of, cause = _spare(link, (there, back), needed)
        throughputs = [one.result.throughput_mean_bps for one in (there, back)]
        mounted = antennas.b if self.settings.end == "b" else antennas.a
        end = link.antenna_b if self.settings.end == "b" else link.antenna_a
        sway = sway_loss_db(end.pattern, end.sway)
        reach: Reach | None = None
        if self.settings.reach:
            ends = tuple(
                ReachEnd(frequency_hz=one.result.frequency_hz, margin_db=one.result.margin_db or 0.0, receiver=receiver)
                for one, receiver in zip((there, back), receivers, strict=True)
            )
            reach = self._reacher.reach(link, way.path, (ends[0], ends[1]), antennas=antennas)
        model = offer.model
        return EquipRow(
            antenna=offer.name,
            kind="gain only" if end.pattern is None else ("grid dish" if model and model.is_grid else end.pattern.kind),
            radio=radio.name,
            rank=0,
            meets=worse_of(signal_verdict(margin, wanted_db=wanted), at_most) == "meets",
            signal_verdict=worse_of(signal_verdict(margin, wanted_db=wanted, trees=way.trees), at_most),
            power_dbm=there.result.power_dbm,
            lowered_db=lowered,
            highest_setting_dbm=_highest_setting(checks),
            rule=None if checks is None else (checks.a.sentence if self.settings.end != "b" else checks.b.sentence),
            received_dbm=AtEnds(at_a=back.result.received_dbm, at_b=there.result.received_dbm),
            margin_db=margin,
            spare_db=spare,
            short_of=short_of,
            cause=cause,
            availability_percent=periods,
            minutes_per_year=minutes,
            modulation=there.result.wanted,
            throughput_mean_bps=None if None in throughputs else min(one for one in throughputs if one is not None),
            peak_gain_dbi=end.peak_gain_dbi,
            azimuth_width_deg=mounted.azimuth_width_deg,
            elevation_width_deg=mounted.elevation_width_deg,
            off_aim_deg=self.settings.off_aim_deg,
            off_aim_db=self._off_aim_db(end.pattern),
            sway_mean_db=None if sway is None else sway[0],
            sway_p999_db=None if sway is None else sway[1],
            far_field_m=None if end.pattern is None else end.pattern.far_field_m,
            width_m=None if model is None else model.width_m,
            height_m=None if model is None else model.height_m,
            mass_kg=None if model is None else model.mass_kg,
            frontal_area_m2=None if model is None else model.frontal_area_m2,
            wind=wind_on(offer, self.settings),
            reach=reach,
        )

    def _needed_both(
        self, link: Link, fadings: tuple[Fading, Fading], receivers: tuple[Receiver, Receiver]
    ) -> tuple[float | None, float | None]:
        """Margin that the target asks of A to B and of B to A; pairs that fade alike share it."""
        target = link.target_availability_percent
        if target is None:
            return None, None
        found: list[float | None] = []
        for fading, receiver in zip(fadings, receivers, strict=True):
            key = (
                unpowered(link.radio),
                fading.frequency_hz,
                fading.rain.tilt_deg,
                fading.wet_radomes_db,
                receiver.second,
                receiver.level_difference_db,
                receiver.cross,
            )
            if key not in self._needed:
                self._needed[key] = needed_margin_db(fading, receiver, target_percent=target)
            found.append(self._needed[key])
        return found[0], found[1]

    def _off_aim_db(self, pattern: Pattern | None) -> float | None:
        if pattern is None:
            return None
        if id(pattern) not in self._off_aim:
            self._off_aim[id(pattern)] = pattern, off_aim_db(pattern, self.settings.off_aim_deg)
        return self._off_aim[id(pattern)][1]


def _receivers(
    link: Link, fadings: tuple[Fading, Fading], ways: tuple[Direction, Direction], discrimination_db: float
) -> tuple[Receiver, Receiver]:
    """What the wanted modulation asks of fading at B and at A."""
    there, back = (
        wanted_receiver(
            link.radio,
            antenna,
            discrimination_db=discrimination_db,
            gain_dbi=next((term.value for term in way.terms if term.key == "receive_gain"), None),
            line_loss_db=line_loss_db(antenna, frequency_hz=fading.frequency_hz),
        )
        for fading, way, antenna in zip(fadings, ways, (link.antenna_b, link.antenna_a), strict=True)
    )
    assert there is not None
    assert back is not None
    return there, back


def _within_rule(link: Link, checks: PowerChecks | None) -> tuple[Link, float]:
    """The link with its power lowered to what the rule allows both ends, and by how much."""
    highest = _highest_setting(checks)
    stated = highest_power_dbm(link.radio)
    if highest is None or stated is None or stated <= highest + _SAME_DB:
        return link, 0.0
    radio = link.radio
    each = None if radio.power_per_chain_dbm is None else highest - 10.0 * float(np.log10(radio.chains))
    return replace(link, radio=replace(radio, power_dbm=highest, power_per_chain_dbm=each)), stated - highest


def _highest_setting(checks: PowerChecks | None) -> float | None:
    if checks is None:
        return None
    known = [check.highest_setting_dbm for check in (checks.a, checks.b) if check.highest_setting_dbm is not None]
    return min(known, default=None)


def _spare(
    link: Link, ways: tuple[Direction, Direction], needed: tuple[float | None, float | None]
) -> tuple[float | None, ShortOf | None, str | None]:
    """What is left over margin and target in the worse direction, dB; what it is short of; what takes it."""
    worst: tuple[float, ShortOf, str | None] | None = None
    for one, need in zip(ways, needed, strict=True):
        margin = one.result.margin_db
        if margin is None or (link.target_availability_percent is not None and need is None):
            return None, None, one.result.dominant_cause
        asked: list[tuple[float, ShortOf, str | None]] = [(margin - link.wanted_margin_db, "margin", None)]
        if need is not None:
            asked.append((margin - need, "availability", one.result.dominant_cause))
        worst = min((*asked, *((worst,) if worst else ())), key=lambda found: found[0])
    assert worst is not None
    spare, short_of, cause = worst
    return (spare, None, None) if spare >= 0.0 else (spare, short_of, cause)
