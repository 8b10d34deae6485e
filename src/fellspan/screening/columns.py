"""Columns in the making: filled pair by pair or bucket by bucket, then handed out as PairResults.

Knows which column means what, and no physics.
"""

from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.screening.pairs import STATUSES, UNKNOWN, PairResults

Index = NDArray[np.int64]

DONE, GAP, SAME_PLACE, REFUSED = (STATUSES.index(word) for word in ("done", "gap", "same place", "refused"))
_CODES: Final = ("verdict", "signal_verdict", "basis", "governing")
_FLOATS: Final = (
    "distance_m",
    "bearing_deg",
    "back_bearing_deg",
    "confidence",
    "worst_fraction",
    "worst_at_m",
    "extra_at_place_m",
    "extra_for_confidence_m",
    "diffraction_db",
    "received_at_hub_dbm",
    "received_at_place_dbm",
    "margin_at_hub_db",
    "margin_at_place_db",
    "availability_percent",
    "gap_from_m",
    "gap_to_m",
)

_WAYS: Final = ("distance_m", "bearing_deg", "back_bearing_deg")


class Columns:
    """One row a pair; numbers start as NaN, codes as `UNKNOWN`, the status as 'done'. Threads may fill rows of their own."""

    __slots__ = (*_FLOATS, *_CODES, "hub", "place", "reason", "sector", "status")

    distance_m: NDArray[np.float64]
    bearing_deg: NDArray[np.float64]
    back_bearing_deg: NDArray[np.float64]
    confidence: NDArray[np.float64]
    worst_fraction: NDArray[np.float64]
    worst_at_m: NDArray[np.float64]
    extra_at_place_m: NDArray[np.float64]
    extra_for_confidence_m: NDArray[np.float64]
    diffraction_db: NDArray[np.float64]
    received_at_hub_dbm: NDArray[np.float64]
    received_at_place_dbm: NDArray[np.float64]
    margin_at_hub_db: NDArray[np.float64]
    margin_at_place_db: NDArray[np.float64]
    availability_percent: NDArray[np.float64]
    gap_from_m: NDArray[np.float64]
    gap_to_m: NDArray[np.float64]
    verdict: NDArray[np.int8]
    signal_verdict: NDArray[np.int8]
    basis: NDArray[np.int8]
    governing: NDArray[np.int8]

    def __init__(self, hub: Index, place: Index) -> None:
        count = hub.size
        self.hub, self.place = hub, place
        self.sector: Index = np.full(count, UNKNOWN, dtype=np.int64)
        self.status = np.full(count, DONE, dtype=np.int8)
        self.reason = [""] * count
        for name in _FLOATS:
            setattr(self, name, np.full(count, np.nan))
        for name in _CODES:
            setattr(self, name, np.full(count, UNKNOWN, dtype=np.int8))

    def refuse(self, row: int, why: str) -> None:
        """A pair that cannot be assessed as given, and why."""
        self._clear(row)
        self.status[row] = REFUSED
        self.reason[row] = why

    def gap(self, row: int, from_m: float, to_m: float) -> None:
        """A pair with terrain missing; its first stretch, from the hub."""
        self._clear(row)
        self.status[row] = GAP
        self.gap_from_m[row], self.gap_to_m[row] = from_m, to_m

    def _clear(self, row: int) -> None:
        """Take back what was filled in of the answers."""
        for name in _FLOATS:
            if name not in _WAYS:
                getattr(self, name)[row] = np.nan
        for name in _CODES:
            getattr(self, name)[row] = UNKNOWN
        self.sector[row] = UNKNOWN

    def results(self) -> PairResults:
        """What was filled in; the arrays are handed over, not copied."""
        return PairResults(
            hub=self.hub,
            place=self.place,
            sector=self.sector,
            status=self.status,
            distance_m=self.distance_m,
            bearing_deg=self.bearing_deg,
            verdict=self.verdict,
            signal_verdict=self.signal_verdict,
            basis=self.basis,
            confidence=self.confidence,
            governing=self.governing,
            worst_fraction=self.worst_fraction,
            worst_at_m=self.worst_at_m,
            extra_at_place_m=self.extra_at_place_m,
            extra_for_confidence_m=self.extra_for_confidence_m,
            diffraction_db=self.diffraction_db,
            received_at_hub_dbm=self.received_at_hub_dbm,
            received_at_place_dbm=self.received_at_place_dbm,
            margin_at_hub_db=self.margin_at_hub_db,
            margin_at_place_db=self.margin_at_place_db,
            availability_percent=self.availability_percent,
            gap_from_m=self.gap_from_m,
            gap_to_m=self.gap_to_m,
            reason=tuple(self.reason),
        )
