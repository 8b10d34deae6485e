"""Losses and levels of one link: free space and delta-Bullington diffraction at the median k, received level, tilt.

Arithmetic over a profile; knows nothing of verdicts. No fading, gases, rain or vegetation yet.
"""

import math
from dataclasses import dataclass

import numpy as np

from fellspan.links.causes import is_sea_level
from fellspan.links.own_building import Standing
from fellspan.links.result import AntennasResult, AtEnds, Losses
from fellspan.links.site import Link
from fellspan.propagation import delta_bullington_loss_db, free_space_loss_db
from fellspan.propagation.constants import EARTH_RADIUS_M
from fellspan.terrain.profile import PathProfile


@dataclass(frozen=True, slots=True, kw_only=True)
class Budget:
    """Losses, dB, and what arrives at each end, dBm, with its margin over the threshold, dB."""

    losses: Losses
    received_dbm: AtEnds
    margin_db: AtEnds


def sea_share(profile: PathProfile) -> float:
    """Share of the path, 0 to 1, that the study took as open sea, weighted by the length each sample stands for."""
    between = np.diff(profile.distance_m)
    weights = 0.5 * (np.append(between, 0.0) + np.append(0.0, between))
    return float(np.sum(weights[is_sea_level(profile)]) / np.sum(weights))


def budget(
    link: Link,
    profile: PathProfile,
    standing: Standing,
    *,
    a_amsl_m: float,
    b_amsl_m: float,
    median_k: float,
    antennas: AntennasResult,
    polarization_db: float | None = None,
) -> Budget:
    """Losses and levels at the median k.

    Diffraction is delta-Bullington (P.526-16, section 4.5.2) over the surface, own buildings taken out, so trees count as
    opaque; the smooth-Earth fit takes the ground. Free space is over the slant distance. Gains are those toward the other end.
    Levels are None where power or a gain is unknown, margins also where the threshold is.
    """
    frequency_hz = link.radio.frequency_hz
    free_space = float(free_space_loss_db(math.hypot(profile.length_m, b_amsl_m - a_amsl_m), frequency_hz=frequency_hz))
    diffraction = float(
        delta_bullington_loss_db(
            profile.distance_m,
            profile.ground_m,
            a_amsl_m=a_amsl_m,
            b_amsl_m=b_amsl_m,
            frequency_hz=frequency_hz,
            k=median_k,
            polarization=link.radio.polarization,
            sea_fraction=sea_share(profile),
            surface_m=standing.surface_m,
        )
    )
    losses = Losses(free_space=free_space, diffraction=max(diffraction, 0.0), polarization=polarization_db)
    level = _received_dbm(link, antennas, losses)
    threshold = link.radio.threshold_dbm
    margin = None if level is None or threshold is None else level - threshold
    return Budget(
        losses=losses,
        # The same radio stands at both ends and the path is reciprocal, so both receive alike.
        received_dbm=AtEnds(at_a=level, at_b=level),
        margin_db=AtEnds(at_a=margin, at_b=margin),
    )


def _received_dbm(link: Link, antennas: AntennasResult, losses: Losses) -> float | None:
    power, gain_a, gain_b = link.radio.power_dbm, antennas.a.gain_dbi, antennas.b.gain_dbi
    if power is None or gain_a is None or gain_b is None:
        return None
    feeders = link.antenna_a.feeder_loss_db + link.antenna_b.feeder_loss_db
    return power + (gain_a + gain_b - feeders) - (losses.free_space + losses.diffraction + (losses.polarization or 0.0))


def tilt_deg(*, distance_m: float, from_amsl_m: float, to_amsl_m: float, k: float) -> float:
    """Elevation angle at which the ray leaves one antenna towards the other, degrees, up positive.

    The straight line over an Earth of radius k * 6371 km, which falls away by half the path's angle at its middle.
    """
    curve = 0.5 * distance_m / (k * EARTH_RADIUS_M)
    return math.degrees(math.atan((to_amsl_m - from_amsl_m) / distance_m - curve))
