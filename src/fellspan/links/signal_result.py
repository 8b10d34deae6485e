"""SignalResult: what arrives in each direction, for how much of the year, and how each figure was worked out.

Frozen data for `results.json`; numbers and sentences only. Numbers that are infinite, undefined or not computed are None, and
the notes say why.
"""

from dataclasses import dataclass
from typing import Final

from fellspan.vocabulary import TreeWay


@dataclass(frozen=True, slots=True, kw_only=True)
class WorkingInput:
    """One number that a working took; text where it is a word."""

    label: str
    value: float | str | None
    unit: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Working:
    """How one figure was worked out.

    Parameters
    ----------
    key
        Stable name of the figure within its direction: 'free_space', 'rain_001', 'margin:64-QAM'.
    label, value, unit
        For people; None where it is not computed.
    formula
        In plain letters, with the edition where there are several.
    inputs
        What went in, in the order of the formula.
    source_key
        Key of the citation registry (`propagation.source`); empty for what the study states.
    note
        Breaches of the published range, doubts, where an input comes from.
    in_level_db
        The signed part that it has in the received level, dB; None where it has none. Their sum is the level.
    """

    key: str
    label: str
    value: float | None
    unit: str
    formula: str
    inputs: tuple[WorkingInput, ...] = ()
    source_key: str = ""
    note: str = ""
    in_level_db: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Periods:
    """A share of the average year and of its average worst month, %."""

    year: float | None
    worst_month: float | None


NOT_COMPUTED: Final = Periods(year=None, worst_month=None)


@dataclass(frozen=True, slots=True, kw_only=True)
class Shares:
    """An outage by cause, % of one period, and their sum. `dominant` is 'rain', 'multipath', 'diffraction' or 'none'."""

    rain: float | None
    multipath: float | None
    diffraction: float | None
    total: float | None
    dominant: str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class ModulationResult:
    """One modulation in one direction.

    `power_dbm` is the total power it is sent with, `threshold_dbm` what the receiver needs with its noise floor counted,
    `received_dbm` the level at the median k in clear air, `margin_db` the difference. `throughput_bps` is what users get.
    `carried_percent` is the share of the year for which it is the fastest one that gets through.
    """

    name: str
    power_dbm: float | None
    threshold_dbm: float
    received_dbm: float | None
    margin_db: float | None
    throughput_bps: float | None
    year: Shares | None
    worst_month: Shares | None
    availability_percent: Periods
    carried_percent: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class DirectionResult:
    """One direction of a link; all figures at full power.

    `modulations` run from the most robust to the fastest. Availability, minutes, margin and dominant cause are those of the
    `wanted` modulation. `losses_db` of feeders and the like are in the workings.
    """

    direction: str
    """'A to B' or 'B to A'."""
    transmitter: str
    receiver: str
    frequency_hz: float
    power_dbm: float | None
    eirp_dbm: float | None
    """Toward the receiver."""
    received_dbm: float | None
    noise_dbm: float | None
    """Of the receiver itself in the channel; None where no channel width is known."""
    threshold_degradation_db: float
    """By the noise floor heard at the receiver; 0 where none is stated."""
    wanted: str | None
    threshold_dbm: float | None
    margin_db: float | None
    rain_001_db: float | None
    """Rain loss exceeded for 0.01 % of the year."""
    multipath_occurrence_percent: float | None
    modulations: tuple[ModulationResult, ...]
    throughput_mean_bps: float | None
    """Over an average year, for users: each modulation for the time for which it is the fastest that gets through."""
    availability_percent: Periods
    minutes_per_year: float | None
    dominant_cause: str | None
    workings: tuple[Working, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class ClimateUsed:
    """One figure of the climate at the middle of the path, and where it comes from."""

    key: str
    value: float
    unit: str
    provenance: str
    source_key: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Editions:
    """Which published editions the figures rest on; None where the figure is not computed."""

    diffraction: str
    gases: str
    rain: str | None
    rain_reading: str | None
    multipath: str | None
    worst_month: str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class TreeLoss:
    """How trees were counted, once.

    `through_db` is diffraction over ground and buildings plus woodland along `depth_m` of the ray, `over_db` diffraction over
    everything, trees taken as solid; the lesser counts, and `way` says which. `least_through_db` and `most_through_db` span
    what woods of that depth differ by.
    """

    way: TreeWay
    depth_m: float
    through_db: float
    over_db: float
    least_through_db: float
    most_through_db: float


@dataclass(frozen=True, slots=True, kw_only=True)
class SignalResult:
    """The radio side of one link: both directions, and the link as a whole.

    `availability_percent`, `minutes_per_year` and `dominant_cause` are those of the wanted modulation both ways at once;
    `target_met` is for each direction by itself, None without a target or an availability.
    """

    a_to_b: DirectionResult
    b_to_a: DirectionResult
    availability_percent: Periods
    minutes_per_year: float | None
    dominant_cause: str | None
    target_availability_percent: float | None
    target_met: bool | None
    editions: Editions
    climate: tuple[ClimateUsed, ...]
    trees: TreeLoss
    notes: tuple[str, ...]
    """What was not computed and how to have it, and what else a person should know of the figures."""
    verdict_reason: str = ""
    """What decided the signal verdict of the link, in words; empty where no margin is known."""
    workings: tuple[Working, ...] = ()
    """Of the figures of both ways at once."""
