"""LinkResult: the answer for one link, as frozen data; the keys are those of `results.json`, schema 1.

It holds numbers and sentences only, no arrays: `assess` returns the arrays that the drawings need beside it.
Numbers that are infinite or undefined are None.
"""

from dataclasses import dataclass

from fellspan.links.exposure import ExposureResult
from fellspan.links.rules import RuleCheck
from fellspan.links.signal_result import NOT_COMPUTED, Periods, SignalResult
from fellspan.showing import Shown
from fellspan.vocabulary import Basis, MountedPolarization, PathVerdict, SignalVerdict


@dataclass(frozen=True, slots=True, kw_only=True)
class ExtraHeight:
    """Height to add so that the criterion is met, m: at A alone, at B alone, at both alike; 0 where it is met already.

    None where no height at that end alone can do it (the point stands at the other end).
    """

    a: float | None
    b: float | None
    both: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Obstruction:
    """A stretch that reaches into the required zone of a criterion.

    `worst_at_m` is where the shortfall is greatest, `shortfall_m` how much is missing there; `cuts_sight` is True where the
    sight line itself is cut at this criterion's k.
    """

    from_m: float
    to_m: float
    worst_at_m: float
    shortfall_m: float
    cause: str
    cuts_sight: bool
    measured: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class CriterionResult:
    """One clearance criterion on one path.

    `worst_fraction` is the least (ray - surface - bulge) / F1 between the ends, at `worst_at_m` from A, where
    `clearance_m` is ray - surface - bulge and `required_m` is required_fraction * F1. `shortfall_m` is the greatest height
    missing anywhere (0 where met) and stands at `shortfall_at_m`. `probability` that the criterion holds, 0 to 1, from the
    stated height errors taken as fully correlated along the path.
    """

    criterion: str
    k: float | None
    required_fraction: float
    met: bool
    worst_fraction: float | None
    worst_at_m: float
    clearance_m: float
    required_m: float
    fresnel_radius_m: float
    surface_m: float
    bulge_m: float
    available_m: float
    latitude_deg: float
    longitude_deg: float
    shortfall_m: float
    shortfall_at_m: float
    cause: str
    extra_height_m: ExtraHeight
    probability: float | None
    obstructions: tuple[Obstruction, ...]
    source: str
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Ignored:
    """What stood on or beside the antenna's own building and was left out of the clearance."""

    end: str
    from_m: float
    to_m: float
    height_m: float
    what: str


@dataclass(frozen=True, slots=True, kw_only=True)
class EndResult:
    """One end: levels in m above sea level, heights in m above ground."""

    site: str
    latitude_deg: float
    longitude_deg: float
    ground_m: float
    roof_m: float | None
    antenna_amsl_m: float
    antenna_agl_m: float
    height_as_given: str
    magnetic_bearing_deg: float | None
    declination_deg: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Ends:
    """The two ends of a link."""

    a: EndResult
    b: EndResult


@dataclass(frozen=True, slots=True, kw_only=True)
class AtEnds:
    """A number at each end (received there); None where it cannot be computed."""

    at_a: float | None
    at_b: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Losses:
    """Losses between the two radios, dB, not less than 0; None where not computed. Later kinds are added as keys.

    In the clear-air level: free space, diffraction, vegetation, gases, polarization, and of both ends together pointing,
    feeders and branching; at the frequency that A transmits on. Not in it: `rain_001`, exceeded for 0.01 % of the year, and
    the radomes.
    """

    free_space: float
    diffraction: float
    polarization: float | None = None
    vegetation: float | None = None
    gases: float | None = None
    feeders: float | None = None
    branching: float | None = None
    pointing: float | None = None
    rain_001: float | None = None
    radomes_wet: float | None = None
    radomes_iced: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class AntennaResult:
    """The antenna at one end and what it gives toward the other end; None where unknown.

    `gain_dbi` is toward the other end, `peak_gain_dbi` at the maximum. `bearing_deg` (true) and `tilt_deg` (up positive) are
    those of the boresight. `azimuth_off_deg` (right positive) and `elevation_off_deg` (up positive) say where the other end
    lies, seen from the direction of the greatest gain. Half-power widths are in the planes as mounted.
    """

    name: str
    gain_dbi: float | None
    peak_gain_dbi: float | None
    bearing_deg: float
    tilt_deg: float
    azimuth_off_deg: float
    elevation_off_deg: float
    polarization: MountedPolarization
    azimuth_width_deg: float | None
    elevation_width_deg: float | None
    far_field_m: float | None
    source: str | None


@dataclass(frozen=True, slots=True, kw_only=True)
class AntennasResult:
    """The antennas at the two ends."""

    a: AntennaResult
    b: AntennaResult


@dataclass(frozen=True, slots=True, kw_only=True)
class PowerChecks:
    """What the power rule of the link says of each end, at the highest power of any modulation."""

    a: RuleCheck
    b: RuleCheck


@dataclass(frozen=True, slots=True, kw_only=True)
class ExposurePair:
    """Distances to keep from the antenna of each end; None where power or gain is unknown."""

    a: ExposureResult | None
    b: ExposureResult | None


@dataclass(frozen=True, slots=True, kw_only=True)
class LinkResult(Shown):
    """The decision on one link and its numbers (see results.json, schema 1, in docs/results.md)."""

    name: str
    a: str
    b: str
    verdict: PathVerdict
    signal_verdict: SignalVerdict | None
    basis: Basis
    confidence: float
    """Least probability over the criteria, 0 to 1."""
    confidence_asked: float
    reasons: tuple[str, ...]
    """Plain sentences, the decisive one first."""
    cautions: tuple[str, ...]
    distance_m: float
    bearing_ab_deg: float
    bearing_ba_deg: float
    tilt_ab_deg: float
    tilt_ba_deg: float
    frequency_hz: float
    polarization: str
    median_k: float
    ends: Ends
    clearance: tuple[CriterionResult, ...]
    governing: int
    """Index in `clearance` of the criterion that the drawing shows: the greatest shortfall, else the least spare height."""
    ignored: tuple[Ignored, ...]
    losses_db: Losses
    received_dbm: AtEnds
    margin_db: AtEnds
    wanted_margin_db: float
    magnetic_model: str | None
    step_m: float
    sources: tuple[str, ...]
    vertical_datum: str | None
    antennas: AntennasResult | None = None
    modulation: str | None = None
    """Name of the wanted modulation, to which margin and availability belong; None where the radio lists none."""
    availability_percent: Periods = NOT_COMPUTED
    """Of the wanted modulation, both ways at once."""
    signal: SignalResult | None = None
    """None in results of versions that did not compute it."""
    power: PowerChecks | None = None
    """None where the link goes by no rule."""
    exposure: ExposurePair | None = None
    """None where power or gains are unknown."""
    margin_with_neighbours_db: AtEnds | None = None
    """What other links of the study leave of `margin_db`: the margin that decides. None where none were compared."""
