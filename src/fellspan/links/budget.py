"""The line budget of one direction: signed terms whose sum is the received level, each with its working.

Adds up what others worked out; knows no weather and no verdicts.
"""

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.mounting import pointing_loss
from fellspan.antennas.pattern import Pattern
from fellspan.climate.figures import ClimateFigures
from fellspan.links.feeders import feeder_run_loss_db
from fellspan.links.path_loss import PathLoss, sea_share
from fellspan.links.signal_result import Working, WorkingInput
from fellspan.links.site import Antenna, Sway
from fellspan.propagation.constants import EARTH_RADIUS_M

__all__ = [
    "Term",
    "eirp_dbm",
    "level_dbm",
    "line_loss_db",
    "line_terms",
    "path_terms",
    "pointing_db",
    "sea_share",
    "tilt_deg",
]


@dataclass(frozen=True, slots=True, kw_only=True)
class Term:
    """One signed term of a budget, dB or dBm; `value` None where it is unknown."""

    key: str
    label: str
    value: float | None
    sign: int
    formula: str
    unit: str = "dB"
    inputs: tuple[WorkingInput, ...] = ()
    source_key: str = ""
    note: str = ""

    @property
    def signed(self) -> float | None:
        """What it adds to the level; None where it is unknown."""
        return None if self.value is None else self.sign * self.value + 0.0

    def working(self) -> Working:
        """The working of this term."""
        return Working(
            key=self.key,
            label=self.label,
            value=self.value,
            unit=self.unit,
            formula=self.formula,
            inputs=self.inputs,
            source_key=self.source_key,
            note=self.note,
            in_level_db=self.signed,
        )


def level_dbm(terms: tuple[Term, ...]) -> float | None:
    """Sum of the terms, dBm; None where the power or a gain is unknown. Unknown losses count nothing."""
    needed = [term for term in terms if term.sign > 0]
    if any(term.value is None for term in needed):
        return None
    return sum(term.signed for term in terms if term.signed is not None)


def eirp_dbm(terms: tuple[Term, ...]) -> float | None:
    """Power radiated toward the receiver, dBm: the terms up to the transmitting antenna; None where one is unknown."""
    end = next(index for index, term in enumerate(terms) if term.key == "transmit_gain")
    return level_dbm(terms[: end + 1])


def line_loss_db(antenna: Antenna, *, frequency_hz: float) -> float:
    """Feeder with its connectors, and the run of known length where there is one, dB; branching is apart."""
    run = 0.0 if antenna.feeder is None else feeder_run_loss_db(antenna.feeder, frequency_hz=frequency_hz)
    return antenna.feeder_loss_db + run


@lru_cache(maxsize=256)
def _mean_pointing_db(pattern: Pattern, sway: Sway) -> float:
    loss = pointing_loss(
        pattern,
        azimuth_sigma_deg=sway.azimuth_sigma_deg,
        elevation_sigma_deg=sway.elevation_sigma_deg,
        azimuth_offset_deg=sway.azimuth_offset_deg,
        elevation_offset_deg=sway.elevation_offset_deg,
    )
    return max(loss.mean_db, 0.0)


def pointing_db(antenna: Antenna) -> float | None:
    """Loss by errors of aim and sway, dB, on average in power; None where sway is stated but no pattern is known."""
    if antenna.sway is None or antenna.sway == Sway():
        return 0.0
    return None if antenna.pattern is None else _mean_pointing_db(antenna.pattern, antenna.sway)


def line_terms(
    antenna: Antenna, *, gain_dbi: float | None, frequency_hz: float, transmits: bool, site: str
) -> tuple[Term, ...]:
    """Terms of one end, from the radio outward where it transmits, else inward."""
    end, word = ("transmit", "transmitting") if transmits else ("receive", "receiving")
    feeder = antenna.feeder
    runs = [WorkingInput(label="feeder and connectors as stated", value=antenna.feeder_loss_db, unit="dB")]
    if feeder is not None:
        runs += [
            WorkingInput(label="kind of line", value=feeder.kind, unit=""),
            WorkingInput(label="length of line", value=feeder.length_m, unit="m"),
            WorkingInput(label="frequency", value=frequency_hz / 1e9, unit="GHz"),
        ]
    sway = antenna.sway or Sway()
    pointing = pointing_db(antenna)
    terms = (
        Term(
            key=f"{end}_branching",
            label=f"branching at {site}",
            value=antenna.branching_loss_db,
            sign=-1,
            formula="as stated",
        ),
        Term(
            key=f"{end}_feeder",
            label=f"feeder at {site}",
            value=line_loss_db(antenna, frequency_hz=frequency_hz),
            sign=-1,
            formula="as stated" if feeder is None else "as stated + length / 100 m x (a sqrt(f) + b f)",
            inputs=tuple(runs),
            note="" if feeder is None else "typical values of the class, common practice, no source",
        ),
        Term(
            key=f"{end}_gain",
            label=f"gain of the {word} antenna toward the other end",
            value=gain_dbi,
            sign=1,
            unit="dBi",
            formula="pattern in the direction of the other end" if antenna.pattern is not None else "as stated",
            inputs=(WorkingInput(label="antenna", value=antenna.name, unit=""),),
        ),
        Term(
            key=f"{end}_pointing",
            label=f"error of aim and sway at {site}",
            value=pointing,
            sign=-1,
            formula="mean over normal errors of aim, from the pattern",
            inputs=(
                WorkingInput(label="azimuth, standard deviation", value=sway.azimuth_sigma_deg, unit="degrees"),
                WorkingInput(label="elevation, standard deviation", value=sway.elevation_sigma_deg, unit="degrees"),
                WorkingInput(label="azimuth, steady", value=sway.azimuth_offset_deg, unit="degrees"),
                WorkingInput(label="elevation, steady", value=sway.elevation_offset_deg, unit="degrees"),
            ),
            note="" if pointing is not None else "not computed: the antenna has no pattern",
        ),
    )
    return terms if transmits else terms[::-1]


def path_terms(
    loss: PathLoss, *, median_k: float, polarization_db: float | None, air: ClimateFigures
) -> tuple[Term, ...]:
    """Terms of the path, with nothing of either end."""
    frequency = WorkingInput(label="frequency", value=loss.frequency_hz / 1e9, unit="GHz")
    distance = WorkingInput(label="distance between the antennas", value=loss.slant_m, unit="m")
    trees = loss.trees
    way = {
        "no trees": "no trees in the way",
        "through": "over everything but trees: the way through them costs less",
        "over": "over everything, trees taken as solid: the way through them costs more",
    }[trees.way]
    return (
        Term(
            key="free_space",
            label="free-space loss",
            value=loss.free_space_db,
            sign=-1,
            formula="20 log(4 pi d f / c)",
            inputs=(distance, frequency),
            source_key="p525-free-space",
        ),
        Term(
            key="diffraction",
            label="diffraction at the median k",
            value=loss.diffraction_db,
            sign=-1,
            formula="delta-Bullington: La + max(Lsph - Ls, 0)",
            inputs=(
                frequency,
                WorkingInput(label="k", value=_finite(median_k), unit=""),
                WorkingInput(label="share that the study takes as sea", value=loss.sea_fraction, unit=""),
            ),
            source_key="p526-16-delta-bullington",
            note=way,
        ),
        Term(
            key="vegetation",
            label="trees on the way",
            value=loss.vegetation_db,
            sign=-1,
            formula="lesser of (over ground and buildings + Am (1 - exp(-d g / Am))) and (over everything)",
            inputs=(
                frequency,
                WorkingInput(label="depth of the ray in trees", value=trees.depth_m, unit="m"),
                WorkingInput(label="through the trees", value=trees.through_db, unit="dB"),
                WorkingInput(label="over the trees", value=trees.over_db, unit="dB"),
            ),
            source_key="trees-through-or-over",
            note="" if trees.way != "through" else f"woods of this depth differ: {_spread(loss)}",
        ),
        Term(
            key="gases",
            label="oxygen and water vapour",
            value=loss.gases_db,
            sign=-1,
            formula="(oxygen + vapour, line by line) x d",
            inputs=(
                distance,
                frequency,
                WorkingInput(label="dry pressure", value=air.dry_pressure_hpa.value, unit="hPa"),
                WorkingInput(label="temperature", value=air.temperature_k.value, unit="K"),
                WorkingInput(label="water vapour", value=air.vapour_g_m3.value, unit="g/m3"),
            ),
            source_key="p676-12-gases",
            note=f"temperature: {air.temperature_k.provenance}; vapour: {air.vapour_g_m3.provenance}",
        ),
        Term(
            key="polarization",
            label="polarizations that differ",
            value=polarization_db,
            sign=-1,
            formula="-10 log(cos2 + sin2 x leak of both antennas)",
            note=""
            if polarization_db is not None
            else "nothing is known of the antennas but their gain: taken as none",
        ),
    )


def _spread(loss: PathLoss) -> str:
    low = loss.trees.least_through_db - loss.diffraction_db
    return f"{low:.1f} to {loss.trees.most_through_db - loss.diffraction_db:.1f} dB"


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None


def tilt_deg(*, distance_m: float, from_amsl_m: float, to_amsl_m: float, k: float) -> float:
    """Elevation angle at which the ray leaves one antenna towards the other, degrees, up positive.

    The straight line over an Earth of radius k * 6371 km, which falls away by half the path's angle at its middle.
    """
    return float(
        tilts_deg(
            distance_m=np.asarray(distance_m), from_amsl_m=np.asarray(from_amsl_m), to_amsl_m=np.asarray(to_amsl_m), k=k
        )
    )


def tilts_deg(
    *,
    distance_m: NDArray[np.float64],
    from_amsl_m: NDArray[np.float64],
    to_amsl_m: NDArray[np.float64],
    k: float,
) -> NDArray[np.float64]:
    """As `tilt_deg`, for arrays of one shape."""
    curve = 0.5 * distance_m / (k * EARTH_RADIUS_M)
    return np.asarray(np.degrees(np.arctan((to_amsl_m - from_amsl_m) / distance_m - curve)))
