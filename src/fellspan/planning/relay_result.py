"""What the search for an intermediate site was asked, and what it found. Data alone."""

from dataclasses import dataclass, field

import numpy as np
from affine import Affine
from numpy.typing import NDArray
from shapely.geometry.base import BaseGeometry

from fellspan.errors import LinkError
from fellspan.geodesy.position import Position
from fellspan.links.site import Site
from fellspan.planning.plan import LinkPlan


@dataclass(frozen=True, slots=True, kw_only=True)
class RelayRequest:
    """What is asked of an intermediate site.

    Parameters
    ----------
    mast_m
        Antenna height above ground at a relay, m, >= 0; for `sites` their own heights count instead.
    hop_m
        Longest hop, m; None for the length of the link.
    area
        Where a relay may stand, in degrees of longitude and latitude (WGS 84); None is anywhere within the hops.
    sites
        Candidate sites; where given, they alone are tried, and `area` still holds.
    count
        How many places to plan in full.
    apart_m
        Least distance between two of them, m; None for a twentieth of the link.
    margin_db
        Least margin at every end of both hops, dB, where levels are known; None for what the link wants.
    two_relays
        Look for chains of two relays where no single one serves.
    """

    mast_m: float = 10.0
    hop_m: float | None = None
    area: BaseGeometry | None = None
    sites: tuple[Site, ...] = ()
    count: int = 3
    apart_m: float | None = None
    margin_db: float | None = None
    two_relays: bool = True

    def __post_init__(self) -> None:
        for label, value, least in (("mast", self.mast_m, 0.0), ("longest hop", self.hop_m, 1.0)):
            if value is not None and not (np.isfinite(value) and value >= least):
                raise LinkError(f"relay: {label} {value:g} m must be {least:g} m or more")
        if self.apart_m is not None and not (np.isfinite(self.apart_m) and self.apart_m >= 0.0):
            raise LinkError(f"relay: distance between places {self.apart_m:g} m must be 0 or more")
        if not 1 <= self.count <= 20:
            raise LinkError(f"relay: {self.count} places is outside 1 to 20")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RelayArea:
    """The cells from which both hops are clear: a grid in the terrain's own cells.

    `clear` has shape (rows, columns). `exact` is True where every cell that the sweep let through was judged as `plan` judges
    it; else `clear` is the sweep's answer, and only the places that are planned are certain.
    """

    clear: NDArray[np.bool_]
    transform: Affine
    crs: str
    exact: bool
    cells: int
    """How many cells are clear."""
    area_m2: float
    looked_at: int
    """How many cells were asked."""


@dataclass(frozen=True, slots=True, kw_only=True)
class ChainsTried:
    """What a search for chains of two relays looked at, and so what it did not.

    Per end: `cells` that its sweep let through, those that were `judged`, those that `serve` it, and `places` that stand for
    them: the highest of each block of `block` by `block` cells. `pairs` of places within reach of each other were judged, all
    there are, and `chains` of them serve.
    """

    cells: tuple[int, int]
    judged: tuple[int, int]
    serve: tuple[int, int]
    places: tuple[int, int]
    block: tuple[int, int]
    cell_m: float
    pairs: int
    chains: int

    @property
    def every_cell(self) -> bool:
        """Whether no cell was stood for by another."""
        return self.cells == self.judged and self.serve == self.places


@dataclass(frozen=True, slots=True, kw_only=True)
class ChannelUse:
    """What is left of the margin of a way round where its hops are not alone on the air, dB; each is judged as if it were.

    `shared_db` is the least margin at any end, at `shared_at`, where all hops use the link's own channel; `beside_study_db`
    that of each hop by itself on that channel beside the other links of the study, None where there are none or they were not
    counted.
    """

    shared_db: float
    shared_at: str
    beside_study_db: float | None
    others_counted: bool


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RelayRoute:
    """One way round: the relays in order from A, and a plan for each hop."""

    relays: tuple[Site, ...]
    ground_amsl_m: tuple[float, ...]
    hops: tuple[LinkPlan, ...]
    worst_margin_db: float | None
    """Least margin of any hop at either end, each hop alone on a channel; None where levels are not known."""
    off_path_m: float
    """How far the farthest relay stands from the straight path."""
    channels: ChannelUse | None = None
    """None where levels are not known."""

    @property
    def length_m(self) -> float:
        """All hops together, m."""
        return sum(hop.result.distance_m for hop in self.hops)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RelayResult:
    """What was found for one link; `routes` best first."""

    request: RelayRequest
    direct: LinkPlan | None
    """The link as it stands; None where it cannot be planned."""
    link_name: str
    ends: tuple[Position, Position]
    hop_m: float
    routes: tuple[RelayRoute, ...]
    area: RelayArea | None
    """None where candidate sites were given."""
    tried: int
    """Places that were planned in full."""
    chains: ChainsTried | None = None
    """None where chains of two were not looked for."""
    refused: tuple[str, ...] = ()
    """Why places that looked clear were not reported."""
    cautions: tuple[str, ...] = field(default=())
