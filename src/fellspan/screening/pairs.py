"""What a batch of pairs is made of: columns of sites, sectors of hubs, the equipment they share; and the columns that come out.

Holds arrays and nothing else: no physics, no files. A pair is a hub (end A), one of its sectors, and a place (end B).
"""

from dataclasses import dataclass, field
from typing import Final, get_args

import numpy as np
from numpy.typing import NDArray

from fellspan.links.assess import AssessSettings
from fellspan.links.radio import Radio
from fellspan.links.rule_types import PowerRule
from fellspan.links.site import Antenna
from fellspan.vocabulary import Basis, HeightReference, PathVerdict, SignalVerdict

HEIGHT_REFERENCES: Final[tuple[HeightReference, ...]] = get_args(HeightReference)
PATH_VERDICTS: Final[tuple[PathVerdict, ...]] = get_args(PathVerdict)
SIGNAL_VERDICTS: Final[tuple[SignalVerdict, ...]] = get_args(SignalVerdict)
BASES: Final[tuple[Basis, ...]] = get_args(Basis)
STATUSES: Final = ("done", "gap", "same place", "refused")
"""Order is the code in `PairResults.status`."""

UNKNOWN: Final = -1
"""Code of a verdict or basis that was not reached."""

Floats = NDArray[np.float64]
Codes = NDArray[np.int8]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SiteColumns:
    """Sites as columns of shape (m,); names are unique within the columns.

    `height_m` is measured from `HEIGHT_REFERENCES[height_reference]`; `roof_m` is the roof above ground, NaN where unknown.
    """

    name: tuple[str, ...]
    latitude_deg: Floats
    longitude_deg: Floats
    height_m: Floats
    height_reference: Codes
    roof_m: Floats


@dataclass(frozen=True, slots=True, kw_only=True)
class Sector:
    """One antenna of a hub; its mounting says where it points (an `Aim` without bearing follows each place)."""

    hub: int
    name: str
    antenna: Antenna


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Candidates:
    """Everything that a pair's result depends on, terrain apart."""

    hubs: SiteColumns
    places: SiteColumns
    sectors: tuple[Sector, ...]
    """At least one a hub; of several, a pair takes the one with the most gain toward its place."""
    place_antenna: Antenna
    radio: Radio
    settings: AssessSettings = field(default_factory=AssessSettings)
    wanted_margin_db: float = 10.0
    target_availability_percent: float | None = None
    power_rule: PowerRule | None = None
    growth_years: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PairResults:
    """Columns of shape (n,), in the order of the pairs that were asked; NaN or `UNKNOWN` where not reached.

    Heights are m above what the plan counts them from, levels dBm, margins dB of the worse direction's end named.
    """

    hub: NDArray[np.int64]
    place: NDArray[np.int64]
    sector: NDArray[np.int64]
    """Index into `Candidates.sectors`."""
    status: Codes
    distance_m: Floats
    bearing_deg: Floats
    """True bearing from hub to place."""
    verdict: Codes
    signal_verdict: Codes
    basis: Codes
    confidence: Floats
    governing: Codes
    """Row of the criterion that governs."""
    worst_fraction: Floats
    """Least free share of the first zone under the governing criterion."""
    worst_at_m: Floats
    """Where, from the hub."""
    extra_at_place_m: Floats
    """Height to add at the place alone so that every criterion is met; 0 none, inf not possible there alone."""
    extra_for_confidence_m: Floats
    """The same so that every criterion holds with the confidence asked, and what else stands against 'clear' falls away.

    By errors that go together along the path: at least so much, since draws of errors are stricter than these on some paths.
    """
    diffraction_db: Floats
    received_at_hub_dbm: Floats
    received_at_place_dbm: Floats
    margin_at_hub_db: Floats
    margin_at_place_db: Floats
    availability_percent: Floats
    """Of an average year, both directions."""
    gap_from_m: Floats
    gap_to_m: Floats
    """First stretch without terrain, from the hub, where the status is 'gap'."""
    reason: tuple[str, ...]
    """Why, where the status is 'refused'; else empty."""
