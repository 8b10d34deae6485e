"""How far to keep people away from one antenna of a link, by direction: its pattern, power and feeder against the limits.

Planning figures for continuous transmission at full power (duty 100 %). Asks `propagation.exposure` for limits and distances
and the pattern for gains; knows nothing of paths or pages. The local code, the maker's instructions and a licensed engineer go
first.
"""

import math
from dataclasses import dataclass
from functools import lru_cache
from typing import Final, Literal

import numpy as np

from fellspan.antennas.pattern import Pattern
from fellspan.antennas.sphere import direction_from_boresight
from fellspan.links.site import Antenna
from fellspan.links.tenths import up_tenth
from fellspan.propagation.exposure import (
    EXPOSURE_LIMITS,
    ExposureGroup,
    ExposureRule,
    dish_distance_to_limit_m,
    dish_surface_density_w_m2,
    distance_to_limit_m,
    exposure_limit_w_m2,
)
from fellspan.propagation.free_space import wavelength_m

FRONT_CONE_DEG: Final = 15.0
BESIDE_BAND_DEG: Final = 15.0
BACK_CONE_DEG: Final = 30.0
"""Nobody stands at exactly 0, 90 or 180 degrees: the highest level so near to them counts (our choice, no source)."""

RULE_WORDS: Final[dict[ExposureRule, str]] = {"icnirp-2020": "ICNIRP 2020", "fcc-1.1310": "47 CFR 1.1310"}
FREE_SPACE_NOTE: Final = (
    "Continuous transmission at full power, one antenna, free space, from the nearest part of the antenna. A roof or wall that "
    "reflects can double these distances, and other antennas on the mast add to them."
)
DISH_NOTE: Final = (
    "Near field of a dish: unconfirmed, from memory of FCC OET Bulletin 65. Not for decisions; the distances by direction do "
    "not use it."
)


@dataclass(frozen=True, slots=True, kw_only=True)
class SectorGains:
    """Highest gain, dBi, co-polar and cross-polar power together, by direction off the boresight; None where not known."""

    front_dbi: float
    beside_dbi: float | None
    behind_dbi: float | None
    largest_dbi: float


@dataclass(frozen=True, slots=True, kw_only=True)
class ExposureDistances:
    """Distances, m, beyond which the power density is below a limit; beside and behind None where no pattern is known.

    In front is within 15 degrees of the boresight, beside from 75 to 105 degrees off it, behind within 30 degrees of straight
    behind: the worst direction there, all around. `largest_m` is that of the greatest gain wherever it lies. `rule` is the
    rule whose limit decides, `averaging_min` over how many minutes it averages.
    """

    group: ExposureGroup
    rule: ExposureRule
    limit_w_m2: float
    averaging_min: float
    front_m: float
    beside_m: float | None
    behind_m: float | None
    largest_m: float


@dataclass(frozen=True, slots=True, kw_only=True)
class DishNearField:
    """Near field of a dish. UNCONFIRMED, from memory of FCC OET Bulletin 65: `note` says so and must be shown beside it.

    `surface_w_m2` is the highest power density at the mouth; the distances are along the boresight.
    """

    surface_w_m2: float
    public_m: float
    occupational_m: float
    note: str = DISH_NOTE


@dataclass(frozen=True, slots=True, kw_only=True)
class ExposureResult:
    """Exposure distances of one antenna: the far-field formula, which is too large rather than too small near a beam's axis.

    `eirp_dbm` is the greatest in any direction. `sources` are keys of the citation registry.
    """

    frequency_hz: float
    power_dbm: float
    feeder_loss_db: float
    eirp_dbm: float
    public: ExposureDistances
    occupational: ExposureDistances
    dish_near_field: DishNearField | None
    notes: tuple[str, ...]
    sources: tuple[str, ...]

    @property
    def sentence(self) -> str:
        """For people, rounded up: what to keep clear for the general public, from the nearest part of the antenna."""
        far = self.public
        if far.beside_m is None or far.behind_m is None:
            parts = [f"{_up(far.front_m)} m on every side, since only its gain is known"]
        else:
            parts = [
                f"{_up(far.front_m)} m in front",
                f"{_up(far.beside_m)} m beside",
                f"{_up(far.behind_m)} m behind",
            ]
        if _up(far.largest_m) != _up(far.front_m):
            parts.append(f"{_up(far.largest_m)} m in the direction of its greatest gain")
        return (
            f"Keep people away from every part of this antenna while it transmits: {', '.join(parts)} "
            f"({RULE_WORDS[far.rule]}, general public)."
        )


def exposure(
    antenna: Antenna,
    *,
    frequency_hz: float,
    power_dbm: float | None,
    rule: ExposureRule | Literal["stricter"] = "stricter",
) -> ExposureResult | None:
    """Exposure distances of one end.

    Parameters
    ----------
    antenna
        With a pattern, all directions; with a gain alone, in front only.
    frequency_hz
        Hz.
    power_dbm
        Power at the port of the radio, dBm, all chains together, transmitting all the time.
    rule
        "icnirp-2020", "fcc-1.1310", or "stricter": the lower limit of those that reach to this frequency.

    Returns
    -------
    result
        None where power or gain is unknown, or no rule asked for reaches to this frequency.
    """
    gains = _gains(antenna)
    if gains is None or power_dbm is None or not math.isfinite(power_dbm):
        return None
    at_antenna_dbm = power_dbm - antenna.feeder_loss_db
    public = _distances(gains, at_antenna_dbm, group="public", frequency_hz=frequency_hz, rule=rule)
    occupational = _distances(gains, at_antenna_dbm, group="occupational", frequency_hz=frequency_hz, rule=rule)
    if public is None or occupational is None:
        return None
    near = _near_field(antenna.pattern, at_antenna_dbm, frequency_hz=frequency_hz, limits=(public, occupational))
    rules = dict.fromkeys((public.rule, occupational.rule))
    return ExposureResult(
        frequency_hz=frequency_hz,
        power_dbm=power_dbm,
        feeder_loss_db=antenna.feeder_loss_db,
        eirp_dbm=at_antenna_dbm + gains.largest_dbi,
        public=public,
        occupational=occupational,
        dish_near_field=near,
        notes=_notes(antenna.pattern, public),
        sources=(*(one.replace(".", "-") for one in rules), "far-field-density", *(("oet65-dish",) if near else ())),
    )


def _gains(antenna: Antenna) -> SectorGains | None:
    if antenna.pattern is not None:
        return sector_gains(antenna.pattern)
    if antenna.gain_dbi is None or not math.isfinite(antenna.gain_dbi):
        return None
    return SectorGains(
        front_dbi=antenna.gain_dbi, beside_dbi=None, behind_dbi=None, largest_dbi=antenna.gain_dbi
    )  # fmt: skip


@lru_cache(maxsize=256)
def sector_gains(pattern: Pattern) -> SectorGains:
    """Highest gain of a pattern in front, beside and behind, all around the boresight, in steps of 1 by 5 degrees."""
    largest = max(pattern.peak_gain_dbi, *(_highest_dbi(pattern, *ends) for ends in _SECTORS))
    front, beside, behind = (_highest_dbi(pattern, *ends) for ends in _SECTORS)
    return SectorGains(front_dbi=front, beside_dbi=beside, behind_dbi=behind, largest_dbi=largest)


_SECTORS: Final = (
    (0.0, FRONT_CONE_DEG),
    (90.0 - BESIDE_BAND_DEG, 90.0 + BESIDE_BAND_DEG),
    (180.0 - BACK_CONE_DEG, 180.0),
)


def _highest_dbi(pattern: Pattern, from_deg: float, to_deg: float) -> float:
    theta = np.radians(np.linspace(from_deg, to_deg, round(to_deg - from_deg) + 1))
    around = np.radians(np.arange(0.0, 360.0, 5.0))
    azimuth, elevation = direction_from_boresight(theta[:, None], around)
    power = pattern.co_amplitude(azimuth, elevation) ** 2 + pattern.cross_amplitude(azimuth, elevation) ** 2
    return pattern.peak_gain_dbi + 10.0 * math.log10(max(float(np.max(power)), 1e-20))


def _distances(
    gains: SectorGains,
    at_antenna_dbm: float,
    *,
    group: ExposureGroup,
    frequency_hz: float,
    rule: ExposureRule | Literal["stricter"],
) -> ExposureDistances | None:
    limit = float(exposure_limit_w_m2(frequency_hz, group=group, rule=rule))
    if math.isnan(limit):
        return None

    def reach(gain_dbi: float) -> float:
        return float(distance_to_limit_m(eirp_dbm=at_antenna_dbm + gain_dbi, limit_w_m2=limit))

    decides: ExposureRule = _deciding(limit, group=group, frequency_hz=frequency_hz) if rule == "stricter" else rule
    return ExposureDistances(
        group=group,
        rule=decides,
        limit_w_m2=limit,
        averaging_min=next(
            row.averaging_min for row in EXPOSURE_LIMITS if (row.rule, row.group, row.body) == (decides, group, "whole")
        ),
        front_m=reach(gains.front_dbi),
        beside_m=None if gains.beside_dbi is None else reach(gains.beside_dbi),
        behind_m=None if gains.behind_dbi is None else reach(gains.behind_dbi),
        largest_m=reach(gains.largest_dbi),
    )


def _deciding(limit_w_m2: float, *, group: ExposureGroup, frequency_hz: float) -> ExposureRule:
    """The rule whose limit is the lower one; the first named where both agree."""
    return next(
        rule for rule in RULE_WORDS if float(exposure_limit_w_m2(frequency_hz, group=group, rule=rule)) == limit_w_m2
    )


def _near_field(
    pattern: Pattern | None,
    at_antenna_dbm: float,
    *,
    frequency_hz: float,
    limits: tuple[ExposureDistances, ExposureDistances],
) -> DishNearField | None:
    if pattern is None or pattern.kind != "dish":
        return None
    electrical = math.pi * pattern.size_m / float(wavelength_m(frequency_hz))
    efficiency = min(10.0 ** (pattern.peak_gain_dbi / 10.0) / electrical**2, 1.0)
    power_w = 10.0 ** ((at_antenna_dbm - 30.0) / 10.0)
    public, occupational = (
        float(
            dish_distance_to_limit_m(
                limit_w_m2=one.limit_w_m2,
                power_w=power_w,
                diameter_m=pattern.size_m,
                aperture_efficiency=efficiency,
                frequency_hz=frequency_hz,
            )
        )
        for one in limits
    )
    surface = float(dish_surface_density_w_m2(power_w=power_w, diameter_m=pattern.size_m))
    return DishNearField(surface_w_m2=surface, public_m=public, occupational_m=occupational)


def _notes(pattern: Pattern | None, public: ExposureDistances) -> tuple[str, ...]:
    notes = [FREE_SPACE_NOTE]
    if pattern is None:
        notes.append("Only the gain of this antenna is known: treat every side as its front.")
    elif pattern.is_envelope:
        notes.append(
            "From an envelope, which real antennas stay under: the distances are too large rather than too small."
        )
    if pattern is not None and public.front_m < pattern.far_field_m:
        notes.append(
            f"These distances lie within the near field of the antenna (up to {pattern.far_field_m:.1f} m), where the "
            "far-field formula is too high on the axis and a pattern does not hold beside it: nobody reaches into the "
            "space right before it or at its rim."
        )
    return tuple(notes)


def _up(value_m: float) -> str:
    """Up to the next tenth of a metre."""
    return f"{up_tenth(value_m):.1f}"
