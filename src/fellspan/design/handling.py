"""What an antenna costs beside decibels in clear air: errors of aim, sway, wind. Knows no paths and no radios."""

import numpy as np

from fellspan.antennas.mounting import pointing_loss
from fellspan.antennas.pattern import Pattern
from fellspan.design.equip_result import EquipSettings, WindLoad
from fellspan.design.offers import Offer
from fellspan.design.wind import DRAG, shape_of, wind_force_n, wind_moment_nm
from fellspan.links.antenna_gains import pattern_facts
from fellspan.links.site import Sway


def off_aim_db(pattern: Pattern, off_deg: float) -> float:
    """What a steady error of aim costs, dB: the worst of left, right, up and down from the maximum of the main beam."""
    facts = pattern_facts(pattern)
    across, up = facts.azimuth.peak_deg, facts.elevation.peak_deg
    azimuth = across + off_deg * np.array([0.0, -1.0, 1.0, 0.0, 0.0])
    elevation = np.clip(up + off_deg * np.array([0.0, 0.0, 0.0, -1.0, 1.0]), -90.0, 90.0)
    gain = np.asarray(pattern.gain_dbi(azimuth, elevation))
    return max(float(gain[0] - np.min(gain)), 0.0)


def sway_loss_db(pattern: Pattern | None, sway: Sway | None) -> tuple[float, float] | None:
    """Mean loss by sway and that not exceeded for 99.9 % of the time, dB; None where none is stated or no pattern is known."""
    if pattern is None or sway is None or sway == Sway():
        return None
    loss = pointing_loss(
        pattern,
        azimuth_sigma_deg=sway.azimuth_sigma_deg,
        elevation_sigma_deg=sway.elevation_sigma_deg,
        azimuth_offset_deg=sway.azimuth_offset_deg,
        elevation_offset_deg=sway.elevation_offset_deg,
    )
    return max(loss.mean_db, 0.0), max(loss.p999_db, 0.0)


def wind_on(offer: Offer, settings: EquipSettings) -> WindLoad | None:
    """Wind from the front on an antenna; None where its size or the wind is not known."""
    model, speed = offer.model, settings.wind_speed_m_s
    if model is None or speed is None:
        return None
    drag = DRAG[shape_of(model.kind, grid=model.is_grid, width_m=model.width_m, height_m=model.height_m)]
    force = float(wind_force_n(model.frontal_area_m2, speed_m_s=speed, drag_coefficient=drag.coefficient))
    return WindLoad(
        speed_m_s=speed,
        force_n=force,
        arm_m=settings.arm_m,
        moment_nm=float(wind_moment_nm(force, arm_m=settings.arm_m)),
        drag_coefficient=drag.coefficient,
        drag_source=drag.source,
        confirmed=drag.confirmed,
    )
