"""What obstacles and survey change in the answers on many paths: what stands beside them, and what was surveyed.

`links.doubts` and `links.verdicts` for the few paths on which it can matter. Opens nothing; knows no signal.
"""

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.links import clearance
from fellspan.links.criteria import are_extended
from fellspan.links.verdicts import UNLISTED_M
from fellspan.propagation.constants import SPEED_OF_LIGHT_M_S
from fellspan.screening.near_overlay import Overlaid
from fellspan.screening.pairs import BASES
from fellspan.screening.rays import Judged, Rules
from fellspan.screening.stand import Antennas, Standings
from fellspan.terrain.beside import Passed
from fellspan.terrain.profile import MEASURED_TOP

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]
Beside = tuple[Passed, float]
"""What stands beside a path, and its top, m above sea level; NaN where that is not known."""

SURVEYED: Final = BASES.index("surveyed")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Laid:
    """Rays between antennas over paths (q,) with all that stands on them."""

    over: Overlaid
    stands: Standings
    a: Antennas
    b: Antennas
    rules: Rules

    def clear_m(self, row: int, rule: int) -> Floats:
        """Ray less surface and bulge along one path under one criterion, (n,)."""
        distance, length = self.over.profiles.distance_m[row], float(self.over.profiles.length_m[row])
        a_amsl_m, b_amsl_m = float(self.a.amsl_m[row]), float(self.b.amsl_m[row])
        available = clearance.available_m(distance, a_amsl_m=a_amsl_m, b_amsl_m=b_amsl_m)
        return np.asarray(
            available - self.stands.surface_m[row] - distance * (length - distance) * self.rules.curve[row, rule]
        )

    def radius_m(self, distance_m: Floats) -> Floats:
        """Radius of the first zone along one path, (n,)."""
        return clearance.zone_radius_m(distance_m, frequency_hz=SPEED_OF_LIGHT_M_S / self.rules.wavelength_m)

    def fraction(self, row: int, rule: int) -> float:
        """What one criterion asks for of the zone on one path."""
        asked = float(self.rules.fraction[row, rule])
        if rule != 1 or math.isinf(self.rules.isolated[row]):
            return asked
        distance = self.over.profiles.distance_m[row]
        normalised = clearance.normalised_clearance(self.clear_m(row, rule), self.radius_m(distance))
        return asked if bool(are_extended(distance, normalised)) else float(self.rules.isolated[row])


def surveyed_rows(laid: Laid, own: Flags, found: Judged) -> Flags:
    """Paths (q,) whose verdict rests on a survey, as `links.verdicts.basis_of` has it; `own` as `near_standings` gives it."""
    over, rests = laid.over, np.zeros(own.shape[0], dtype=np.bool_)
    if over.measured is None:
        return rests
    measured = over.measured == MEASURED_TOP
    for row in np.flatnonzero((measured & ~own).any(axis=1)).tolist():
        rule = int(found.governing[row])
        spare = laid.clear_m(row, rule)
        spare -= laid.fraction(row, rule) * laid.radius_m(over.profiles.distance_m[row])
        spare += laid.stands.surface_m[row] - over.profiles.ground_m[row]
        rests[row] = bool(measured[row][~own[row] & (spare < UNLISTED_M)].all())
    return rests


def over_beside_m(laid: Laid, beside: Callable[[int], Sequence[Beside]]) -> dict[int, float]:
    """Paths that pass an obstacle in the part of the zone that a criterion asks for, with the height to add at B for it.

    As `links.doubts.beside_path` says; 0 where it is not known how high the obstacle is. `beside` gives those of a path.
    """
    found: dict[int, float] = {}
    for row, length in enumerate(laid.over.profiles.length_m.tolist()):
        for one, top in beside(row):
            edge = _lower_edge_m(laid, row, one)
            if math.isinf(edge):
                continue
            if not math.isfinite(top):
                found.setdefault(row, 0.0)
            elif top - edge > clearance.TOLERANCE_M:
                found[row] = max(found.get(row, 0.0), (top - edge) * length / one.along_m)
    return found


def count_beside(laid: Laid, rows: Sequence[int], beside: Callable[[int], Sequence[Beside]], spare_m: Floats) -> None:
    """Let what some paths pass in their zones count in `spare_m`, (q, n), at the nearest sample: draws of `design` count it."""
    for row in rows:
        distance = laid.over.profiles.distance_m[row]
        for one, top in beside(row):
            edge = _lower_edge_m(laid, row, one)
            if math.isfinite(edge) and math.isfinite(top):
                nearest = int(np.argmin(np.abs(distance - one.along_m)))
                spare_m[row, nearest] = min(float(spare_m[row, nearest]), edge - top)


def _lower_edge_m(laid: Laid, row: int, one: Passed) -> float:
    """Lowest edge of the zones asked for at an obstacle's offset, m above sea level; infinite where it stands outside them."""
    length = float(laid.over.profiles.length_m[row])
    square = laid.rules.wavelength_m * one.along_m * (length - one.along_m) / length
    share, lowest = one.along_m / length, math.inf
    for rule, most in enumerate(laid.rules.fraction[row].tolist()):
        if most**2 * square <= one.offset_m**2:
            continue
        half = laid.fraction(row, rule) ** 2 * square - one.offset_m**2
        if half > 0.0:
            ray = float(laid.a.amsl_m[row]) * (1.0 - share) + float(laid.b.amsl_m[row]) * share
            bulge = one.along_m * (length - one.along_m) * float(laid.rules.curve[row, rule])
            lowest = min(lowest, ray - bulge - math.sqrt(half))
    return lowest
