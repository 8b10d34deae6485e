"""HeightsResult: how high the antennas must be, as frozen data; numbers and sentences only. Knows no arithmetic."""

import math
from dataclasses import dataclass, field
from typing import Final, Literal

from fellspan.errors import LinkError

HeightKind = Literal["a alone", "b alone", "equal", "alike", "least total", "least cost"]
HEIGHT_WORDS: Final[dict[HeightKind, str]] = {
    "a alone": "lowest at A, B as planned",
    "b alone": "lowest at B, A as planned",
    "equal": "equal heights",
    "alike": "both changed alike",
    "least total": "least total height",
    "least cost": "least cost",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Limits:
    """Lowest and highest mast at one site, m above what it stands on (ground or roof); None leaves the usual ones.

    The lowest is 0 unless stated, the highest has no end.
    """

    low_m: float | None = None
    high_m: float | None = None

    def __post_init__(self) -> None:
        low, high = self.low_m or 0.0, math.inf if self.high_m is None else self.high_m
        if not (math.isfinite(low) and low >= 0.0 and high >= low):
            raise LinkError(
                f"mast limits {low:g} to {high:g} m do not make a range", "give 0 m or more, the lower limit first"
            )


@dataclass(frozen=True, slots=True, kw_only=True)
class HeightSettings:
    """How heights are searched.

    Parameters
    ----------
    step_m
        Heights to build to are rounded up to this step, m, > 0.
    limits_a, limits_b
        Of the mast at each site.
    cost_a_per_m, cost_b_per_m, cost_per_section, section_m
        What a metre of mast and each begun section cost, in any currency; None per metre asks for no least cost.
    """

    step_m: float = 1.0
    limits_a: Limits = field(default_factory=Limits)
    limits_b: Limits = field(default_factory=Limits)
    cost_a_per_m: float | None = None
    cost_b_per_m: float | None = None
    cost_per_section: float = 0.0
    section_m: float = 3.0

    def __post_init__(self) -> None:
        if not (math.isfinite(self.step_m) and 0.01 <= self.step_m <= 100.0):
            raise LinkError(f"mast step {self.step_m:g} m is outside 0.01 m to 100 m", "1 m is usual")
        if not (math.isfinite(self.section_m) and self.section_m >= 0.1):
            raise LinkError(f"mast section {self.section_m:g} m is too short", "3 m and 6 m are usual")
        for cost in (self.cost_a_per_m, self.cost_b_per_m, self.cost_per_section):
            if cost is not None and not (math.isfinite(cost) and cost >= 0.0):
                raise LinkError(f"cost {cost:g} is not a number of 0 or more")

    @property
    def counts_cost(self) -> bool:
        """Whether any cost was stated."""
        return self.cost_a_per_m is not None or self.cost_b_per_m is not None or self.cost_per_section > 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Pair:
    """Heights of the two masts above what they stand on (ground or roof), and the antennas' levels above sea level, m."""

    a_m: float
    b_m: float
    a_amsl_m: float
    b_amsl_m: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Touch:
    """What governs a pair of heights: where the ray touches what it needs."""

    cause: str
    at_m: float
    criterion: str
    k: float | None
    fresnel_radius_m: float
    sigma_m: float
    """Standard error of the clearance there, from the stated errors of the rasters."""
    sampling_m: float
    """How far the ground between two samples, anywhere along the path, may stand into what is asked for."""


@dataclass(frozen=True, slots=True, kw_only=True)
class MetreMore:
    """What one metre more at one end buys: height to spare along the whole path, and as a part of the first zone."""

    end: str
    spare_m: float
    fraction: float | None
    """Of the first Fresnel zone at the point that then is tightest; None at the ends, where the zone has no width."""
    next_cause: str
    next_at_m: float


@dataclass(frozen=True, slots=True, kw_only=True)
class HeightOption:
    """One answer. `raw` is exact on the heights in the data; `build` holds with the confidence asked and is rounded up.

    Both are None where no height within the limits is enough; `note` then says why.
    """

    kind: HeightKind
    raw: Pair | None
    build: Pair | None
    governs: Touch | None
    more: tuple[MetreMore, ...] = ()
    probability: float | None = None
    """That every criterion holds at `build`, 0 to 1."""
    cost: float | None = None
    """Of the two masts at `build`, where costs were given."""
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class HeightsResult:
    """How high the antennas of a link must be.

    `boundary` and `boundary_confident` are the lower edge of what works, as pairs of mast heights (A, B) above what they stand
    on, A rising: exact on the heights in the data, and with the confidence asked. `decision` is the one sentence.
    """

    decision: str
    planned: Pair
    planned_holds: bool
    """Whether the heights as planned meet every criterion with the confidence asked."""
    base_a: str
    base_b: str
    confidence: float
    step_m: float
    growth_years: float
    options: tuple[HeightOption, ...]
    boundary: tuple[tuple[float, float], ...]
    boundary_confident: tuple[tuple[float, float], ...]
    checked: str
    """How the heights were checked against the clearance engine."""
    cautions: tuple[str, ...]

    def option(self, kind: HeightKind) -> HeightOption | None:
        """The option of a kind, None where it was not asked for."""
        return next((option for option in self.options if option.kind == kind), None)
