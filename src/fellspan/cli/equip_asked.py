"""What `fellspan equip` was asked: a link of a study, two points, or a distance; antennas and radios on offer; then compared.

Turns texts into what `planning` takes; prints nothing.
"""

import dataclasses
import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from fellspan.antennas.catalogue import load_catalogue
from fellspan.cli.sight_study import SightOptions, sight_study
from fellspan.climate.given import GivenClimate
from fellspan.design.equip_result import EquipEnd, EquipResult, EquipSettings
from fellspan.design.offers import offers_for, offers_named
from fellspan.errors import QuantityError, UsageError
from fellspan.geodesy.coordinates import parse_position
from fellspan.geodesy.geodesic import destination
from fellspan.geodesy.position import Position
from fellspan.links.radio import Radio
from fellspan.links.rules import find_rule, load_rules
from fellspan.links.site import Link, Site, Sway
from fellspan.planning.equipping import FreeWay, equip_distance, equip_link
from fellspan.planning.inputs import Study
from fellspan.quantities import (
    parse_frequency_hz,
    parse_length_m,
    parse_loss_db,
    parse_percent,
    parse_threshold_dbm,
    parse_transmit_power_dbm,
)
from fellspan.study.measures import parse_width_hz
from fellspan.study.messages import did_you_mean
from fellspan.study.reading import load_study
from fellspan.vocabulary import GapPolicy, Polarization

START_HEIGHT: Final = "10 m above ground"
_SPEEDS: Final = {"m/s": 1.0, "km/h": 1.0 / 3.6, "mph": 0.44704, "kn": 1852.0 / 3600.0, "knots": 1852.0 / 3600.0}
_SPEED = re.compile(r"\s*(\d+(?:\.\d*)?|\.\d+)\s*([a-z/]*)\s*", re.IGNORECASE)
_MOST_WIND_M_S: Final = 150.0
NOWHERE: Final = Position(latitude_deg=45.0, longitude_deg=0.0)
"""Where a distance lies that has no place; maps are not asked then."""


@dataclass(frozen=True, slots=True, kw_only=True)
class EquipAsked:
    """What was typed after `fellspan equip`; None or empty where nothing was."""

    where: Sequence[str]
    link: str | None
    ground: Sequence[str]
    surface: Sequence[str]
    gaps: GapPolicy
    height_a: str | None
    height_b: str | None
    distance: str | None
    at: str | None
    rain: float | None
    frequency: str | None
    polarization: Polarization
    antennas: Sequence[str]
    catalogue: Path | None
    radios: Sequence[str]
    power: str | None
    threshold: str | None
    channel: str | None
    rule: str | None
    target: str | None
    margin: str | None
    wind: str | None
    arm: str
    sway: float | None
    off_aim: float
    end: EquipEnd
    reach: bool


def compared(asked: EquipAsked) -> EquipResult:
    """Do what was asked.

    Raises
    ------
    UsageError
        Something is missing, or two things contradict each other.
    FellspanError
        As reading the study, planning the link or comparing would.
    """
    settings = EquipSettings(
        wind_speed_m_s=None if asked.wind is None else parse_speed_m_s(asked.wind),
        arm_m=parse_length_m(asked.arm),
        off_aim_deg=_degrees(asked.off_aim, "--off-aim"),
        end=asked.end,
        reach=asked.reach,
    )
    if asked.distance is not None:
        return _over_distance(asked, settings)
    study = _study(asked)
    link = _link_of(study, asked.link)
    radios = [_with_radio_options(radio, asked) for radio in _radios(study, link, asked.radios)]
    link = _with_link_options(dataclasses.replace(link, radio=radios[0]), asked, rules_file=study.rules_file)
    catalogue = load_catalogue(asked.catalogue or study.antenna_catalogue)
    offers = (
        offers_named(_names(asked.antennas), catalogue=catalogue, links=(link, *study.links))
        if asked.antennas
        else offers_for(tuple(radio.frequency_hz for radio in radios), catalogue=catalogue)
    )
    return equip_link(study, link, offers, radios, settings=settings)


def parse_speed_m_s(text: str) -> float:
    """'45 m/s', '160 km/h', '100 mph' or '90 knots' in m/s; a unit is asked for."""
    found = _SPEED.fullmatch(text)
    unit = _SPEEDS.get(found[2].lower()) if found else None
    if found is None or unit is None:
        raise QuantityError(
            f"wind '{text}' is no speed with its unit", "as in '45 m/s', '160 km/h', '100 mph' or '90 knots'"
        )
    speed = float(found[1]) * unit
    if speed > _MOST_WIND_M_S:
        raise QuantityError(f"wind '{text}' is more than any storm", f"0 to {_MOST_WIND_M_S:g} m/s are allowed")
    return speed


def _is_study(where: Sequence[str]) -> bool:
    return len(where) == 1 and (where[0].endswith(".toml") or Path(where[0]).is_file())


def _study(asked: EquipAsked) -> Study:
    if _is_study(asked.where):
        if asked.frequency is not None:
            raise UsageError(
                f"--frequency '{asked.frequency}' cannot stand beside a study",
                "radios of the study state their own: --radio NAME",
            )
        return load_study(Path(asked.where[0]))
    if not asked.where:
        raise UsageError(
            "equip needs a link",
            "a study file with --link NAME, two positions with --ground FILE, or --distance '12 km'",
        )
    _need_radio(asked)
    study, _ = sight_study(
        SightOptions(
            points=asked.where,
            crs=None,
            ground=asked.ground,
            surface=asked.surface,
            gaps=asked.gaps,
            frequency=asked.frequency,
            height_a=asked.height_a or START_HEIGHT,
            height_b=asked.height_b or START_HEIGHT,
            roof_a=None,
            roof_b=None,
            preset="p530-temperate",
        )
    )
    plain = dataclasses.replace(study.links[0].radio, polarization=asked.polarization)
    links = (dataclasses.replace(study.links[0], radio=plain),)
    return dataclasses.replace(study, links=links, climate=GivenClimate(rain_rate_001_mm_h=asked.rain))


def _need_radio(asked: EquipAsked) -> None:
    wanted = {"--frequency": asked.frequency, "--power": asked.power, "--threshold": asked.threshold}
    missing = [name for name, given in wanted.items() if given is None]
    if missing:
        raise UsageError(
            f"equip still needs: {', '.join(missing)}",
            "for instance: --frequency '5.8 GHz' --power '23 dBm' --threshold '-72 dBm'",
        )


def _link_of(study: Study, name: str | None) -> Link:
    names = [link.name for link in study.links]
    if name is None:
        if len(names) == 1:
            return study.links[0]
        raise UsageError(f"this study has {len(names)} links", f"name one with --link: {', '.join(names[:4])} ...")
    for link in study.links:
        if link.name == name:
            return link
    raise UsageError(
        f"there is no link named '{name}' in this study", *did_you_mean(name, names), f"links: {', '.join(names)}"
    )


def _radios(study: Study, link: Link, names: Sequence[str]) -> list[Radio]:
    # The link first: another one may use the same radio on another channel.
    known = {one.radio.name: one.radio for one in (*study.links, link)}
    found = []
    for name in _names(names):
        if name not in known:
            raise UsageError(
                f"no link of this study uses a radio named '{name}'",
                *did_you_mean(name, known),
                f"radios: {', '.join(known)}",
            )
        found.append(known[name])
    return found or [link.radio]


def _names(texts: Sequence[str]) -> tuple[str, ...]:
    """Names, each option by itself or several in one with semicolons between them (names have commas in them)."""
    return tuple(name.strip() for text in texts for name in text.split(";") if name.strip())


def _with_radio_options(radio: Radio, asked: EquipAsked) -> Radio:
    if asked.power is not None:
        radio = dataclasses.replace(radio, power_dbm=parse_transmit_power_dbm(asked.power), power_per_chain_dbm=None)
    if asked.threshold is not None:
        radio = dataclasses.replace(
            radio, threshold_dbm=parse_threshold_dbm(asked.threshold), modulations=(), wanted=None
        )
    if asked.channel is not None:
        radio = dataclasses.replace(radio, bandwidth_hz=parse_width_hz(asked.channel))
    return radio


def _with_link_options(link: Link, asked: EquipAsked, *, rules_file: Path | None) -> Link:
    if asked.target is not None:
        link = dataclasses.replace(link, target_availability_percent=_percent(asked.target))
    if asked.margin is not None:
        link = dataclasses.replace(link, wanted_margin_db=parse_loss_db(asked.margin))
    if asked.rule is not None:
        link = dataclasses.replace(link, power_rule=find_rule(asked.rule, load_rules(rules_file)))
    if asked.sway is not None:
        sigma = _degrees(asked.sway, "--sway")
        sway = Sway(azimuth_sigma_deg=sigma, elevation_sigma_deg=sigma)
        ends = (dataclasses.replace(antenna, sway=sway) for antenna in (link.antenna_a, link.antenna_b))
        antenna_a, antenna_b = ends
        link = dataclasses.replace(link, antenna_a=antenna_a, antenna_b=antenna_b)
    return link


def _percent(text: str) -> float:
    return parse_percent(text if "%" in text else f"{text} %")


def _degrees(value: float, option: str) -> float:
    if not 0.0 <= value <= 45.0:
        raise UsageError(f"{option} {value:g} degrees is outside 0 to 45", "0.5 is a stiff mast in strong wind")
    return value


def _over_distance(asked: EquipAsked, settings: EquipSettings) -> EquipResult:
    if asked.where or asked.link or asked.radios:
        raise UsageError(
            "--distance stands for a link without terrain", "leave out the study, the positions, --link and --radio"
        )
    _need_radio(asked)
    assert asked.frequency is not None
    assert asked.distance is not None
    length_m = parse_length_m(asked.distance)
    if not 1.0 <= length_m <= 1_000_000.0:
        raise UsageError(f"--distance '{asked.distance}' is outside 1 m to 1000 km")
    place = NOWHERE if asked.at is None else parse_position(asked.at).position
    radio = _with_radio_options(
        Radio(name="radio", frequency_hz=parse_frequency_hz(asked.frequency), polarization=asked.polarization), asked
    )
    far = destination(place, 90.0, length_m)
    link = Link(
        name=f"{asked.distance} of free path",
        a=Site(name="A", position=place, height_m=30.0),
        b=Site(name="B", position=far, height_m=30.0),
        radio=radio,
    )
    link = _with_link_options(link, asked, rules_file=None)
    catalogue = load_catalogue(asked.catalogue)
    offers = (
        offers_named(_names(asked.antennas), catalogue=catalogue)
        if asked.antennas
        else offers_for((radio.frequency_hz,), catalogue=catalogue)
    )
    free = FreeWay(given=GivenClimate(rain_rate_001_mm_h=asked.rain), maps=asked.at is not None)
    return equip_distance(link, offers, free=free, settings=settings)
