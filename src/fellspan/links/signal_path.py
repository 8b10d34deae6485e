"""The path side of a signal, whatever antennas stand at its ends: climate, geometry, losses; and both directions over it.

Worked out once, it serves many antennas and radios of one frequency. Knows no terrain files, verdicts or pages.
"""

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.mounting import FIELD_ANGLE_DEG
from fellspan.climate.assembling import figures_for
from fellspan.climate.figures import ClimateFigures
from fellspan.climate.given import GivenClimate
from fellspan.geodesy.position import Position
from fellspan.links.antenna_gains import cross_discrimination_db
from fellspan.links.budget import path_terms
from fellspan.links.direction import Direction, End, direction_of
from fellspan.links.fading import Fading, Geometry, Rain, Spread, nodes_of, occurrence, rain_001, spread_of
from fellspan.links.own_building import Standing
from fellspan.links.path_loss import PathLoss, gases_db, path_loss
from fellspan.links.radio import Radio
from fellspan.links.ranges import multipath_breaches, multipath_inputs, rain_breaches
from fellspan.links.receivers import row_power_dbm, rows_of
from fellspan.links.result import AntennasResult
from fellspan.links.signal_result import TreeLoss
from fellspan.links.site import Link
from fellspan.links.ways_past_trees import mean_over_path_m
from fellspan.propagation import RainEdition, RainReading, free_space_loss_db
from fellspan.terrain.profile import PathProfile
from fellspan.vocabulary import MountedPolarization


@dataclass(frozen=True, slots=True, kw_only=True)
class Weather:
    """What the study says of the climate, and how rain is to be worked out."""

    given: GivenClimate
    rain_edition: RainEdition = "19"
    rain_reading: RainReading = "A"


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SignalPath:
    """One path worked out for the frequencies of a radio and its polarization; `losses` by frequency, Hz."""

    figures: ClimateFigures
    geometry: Geometry
    spread: Spread
    losses: Mapping[float, PathLoss]
    median_k: float


def path_of(
    link: Link,
    profile: PathProfile,
    standing: Standing,
    *,
    a_amsl_m: float,
    b_amsl_m: float,
    median_k: float,
    weather: Weather,
    maps: bool,
) -> SignalPath:
    """Climate, geometry and losses of a link's path; of the link only the radio's frequencies and polarization are asked.

    Without `maps` only the study's figures and defaults serve.
    """
    figures = _climate(profile, weather.given, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m, maps=maps)
    geometry = _geometry(profile, figures.position, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m)
    spread = spread_of(figures, length_m=geometry.length_m)
    nodes = nodes_of(spread)
    losses = {
        frequency: path_loss(
            profile,
            standing,
            a_amsl_m=a_amsl_m,
            b_amsl_m=b_amsl_m,
            median_k=median_k,
            frequency_hz=frequency,
            polarization=link.radio.polarization,
            air=figures,
            nodes_inverse_k=nodes,
        )
        for frequency in dict.fromkeys(link.radio.transmit_hz)
    }
    return SignalPath(figures=figures, geometry=geometry, spread=spread, losses=losses, median_k=median_k)


def free_path(
    link: Link,
    figures: ClimateFigures,
    *,
    length_m: float,
    a_amsl_m: float,
    b_amsl_m: float,
    mean_ground_m: float,
    median_k: float,
) -> SignalPath:
    """A path of any length on which nothing stands in the way at any k: free space, air, rain and multipath alone.

    `figures` holds all along it. Levels are those of the antennas and of the mean of the ground, m above sea level.
    """
    spread = spread_of(figures, length_m=length_m)
    nodes = nodes_of(spread)
    slant = math.hypot(length_m, b_amsl_m - a_amsl_m)
    losses = {
        frequency: PathLoss(
            frequency_hz=frequency,
            slant_m=slant,
            free_space_db=float(free_space_loss_db(slant, frequency_hz=frequency)),
            diffraction_db=0.0,
            vegetation_db=0.0,
            trees=TreeLoss(
                way="no trees", depth_m=0.0, through_db=0.0, over_db=0.0, least_through_db=0.0, most_through_db=0.0
            ),
            gases_db=gases_db(slant, frequency_hz=frequency, air=figures),
            sea_fraction=0.0,
            inverse_k=nodes,
            by_inverse_k_db=np.zeros(nodes.size),
        )
        for frequency in dict.fromkeys(link.radio.transmit_hz)
    }
    geometry = Geometry(
        length_m=length_m,
        a_amsl_m=a_amsl_m,
        b_amsl_m=b_amsl_m,
        mean_ground_m=mean_ground_m,
        latitude_deg=figures.position.latitude_deg,
    )
    return SignalPath(figures=figures, geometry=geometry, spread=spread, losses=losses, median_k=median_k)


def has_margin(link: Link, antennas: AntennasResult) -> bool:
    """Whether thresholds, powers and gains are known, so that the weather matters."""
    rows = rows_of(link.radio)
    return bool(rows) and None not in (
        antennas.a.gain_dbi,
        antennas.b.gain_dbi,
        *(row_power_dbm(link.radio, row) for row in rows),
    )


def both_directions(
    link: Link,
    path: SignalPath,
    *,
    antennas: AntennasResult,
    polarization_db: float | None,
    bearings_deg: tuple[float, float],
    tilts_deg: tuple[float, float],
    weather: Weather,
    workings: bool = True,
) -> tuple[tuple[Fading, Fading], tuple[Direction, Direction]]:
    """Fading and result of A to B and of B to A."""
    ends = (
        End(site=link.a, antenna=link.antenna_a, gain_dbi=antennas.a.gain_dbi, bearing_deg=bearings_deg[0]),
        End(site=link.b, antenna=link.antenna_b, gain_dbi=antennas.b.gain_dbi, bearing_deg=bearings_deg[1]),
    )
    discrimination = cross_discrimination_db(link, bearings_deg=bearings_deg, tilts_deg=tilts_deg)
    there_hz, back_hz = link.radio.transmit_hz
    fadings = (
        fading_over(link, path, frequency_hz=there_hz, antennas=antennas, weather=weather),
        fading_over(link, path, frequency_hz=back_hz, antennas=antennas, weather=weather),
    )
    there, back = (
        direction_of(
            link.radio,
            transmit,
            receive,
            name=name,
            frequency_hz=fading.frequency_hz,
            path=path_terms(fading.loss, median_k=path.median_k, polarization_db=polarization_db, air=path.figures),
            fading=fading,
            discrimination_db=discrimination,
            workings=workings,
        )
        for name, transmit, receive, fading in (
            ("A to B", ends[0], ends[1], fadings[0]),
            ("B to A", ends[1], ends[0], fadings[1]),
        )
    )
    return fadings, (there, back)


def air_level_m(a_amsl_m: NDArray[np.float64], b_amsl_m: NDArray[np.float64]) -> NDArray[np.float64]:
    """Height of the air of paths, m above sea level: the mean of the antennas, within what a climate can be asked for."""
    return np.clip(0.5 * (a_amsl_m + b_amsl_m), -500.0, 9000.0)


def _climate(
    profile: PathProfile, given: GivenClimate, *, a_amsl_m: float, b_amsl_m: float, maps: bool
) -> ClimateFigures:
    """Figures of the middle of the path; its air is at the mean level of the antennas unless the study says otherwise."""
    middle = int(np.argmin(np.abs(profile.distance_m - 0.5 * profile.length_m)))
    place = Position(
        latitude_deg=float(profile.latitude_deg[middle]), longitude_deg=float(profile.longitude_deg[middle])
    )
    if given.altitude_m is None:
        given = replace(given, altitude_m=float(air_level_m(np.asarray(a_amsl_m), np.asarray(b_amsl_m))))
    return figures_for(place, given=given, maps=maps)


def _geometry(profile: PathProfile, middle: Position, *, a_amsl_m: float, b_amsl_m: float) -> Geometry:
    return Geometry(
        length_m=profile.length_m,
        a_amsl_m=a_amsl_m,
        b_amsl_m=b_amsl_m,
        mean_ground_m=float(mean_over_path_m(profile.distance_m, profile.ground_m)),
        latitude_deg=middle.latitude_deg,
    )


def rain_tilt_deg(radio: Radio, *, a: MountedPolarization, b: MountedPolarization) -> float:
    """Angle of the field from horizontal that rain is worked out for, degrees: of several the one that rain hits hardest."""
    if radio.dual_polarization:
        return 0.0
    return min(0.0 if mounted == "dual" else abs(FIELD_ANGLE_DEG[mounted]) for mounted in (a, b))


def fading_over(
    link: Link, path: SignalPath, *, frequency_hz: float, antennas: AntennasResult, weather: Weather
) -> Fading:
    """Fading of the direction that is sent on `frequency_hz`."""
    figures, geometry, loss = path.figures, path.geometry, path.losses[frequency_hz]
    frequency, tilt = frequency_hz, rain_tilt_deg(link.radio, a=antennas.a.polarization, b=antennas.b.polarization)
    rate = figures.rain_rate_001_mm_h
    at_001 = rain_001(figures, geometry=geometry, frequency_hz=frequency, tilt_deg=tilt, edition=weather.rain_edition)
    share = occurrence(figures, geometry=geometry, frequency_hz=frequency)
    return Fading(
        frequency_hz=frequency,
        geometry=geometry,
        spread=path.spread,
        loss=loss,
        rain=Rain(
            edition=weather.rain_edition,
            reading=weather.rain_reading,
            rate_mm_h=None if rate is None else rate.value,
            provenance="not computed: no rain rate" if rate is None else rate.provenance,
            tilt_deg=tilt,
            breaches=rain_breaches(geometry, frequency_hz=frequency, edition=weather.rain_edition, loss_db=at_001),
        ),
        rain_001_db=at_001,
        occurrence_percent=share,
        edition=figures.multipath_edition,
        wet_radomes_db=link.antenna_a.radome_wet_db + link.antenna_b.radome_wet_db,
        multipath_inputs=multipath_inputs(figures, geometry=geometry),
        multipath_breaches=multipath_breaches(figures, geometry=geometry, frequency_hz=frequency, percent=share),
    )
