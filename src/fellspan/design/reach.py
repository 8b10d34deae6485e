"""How far a pair of antenna and radio reaches at the target: margin against distance over a free path, and where it is used up.

The path is taken as clear at every k, over ground of the mean level of the link and with its antenna levels and climate all
along. Asks `links` for losses and fading; knows no terrain, ranking or pages.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
from scipy.optimize import brentq

from fellspan.design.equip_result import Reach
from fellspan.design.needed_margin import needed_margin_db, unpowered
from fellspan.links.fading import Fading, Receiver
from fellspan.links.result import AntennasResult
from fellspan.links.signal_path import SignalPath, Weather, fading_over, free_path
from fellspan.links.site import Link

REACH_M: Final[tuple[float, ...]] = tuple(float(at) for at in np.geomspace(100.0, 100_000.0, 61))
"""Distances at which margins are worked out for charts, m; beyond the last nothing is looked for."""
ASSUMED: Final = (
    "Reach is over a path that is clear at every k: masts high enough for it are taken for granted. Climate, antenna levels "
    "and mean ground are those of this link at every distance."
)
TO_M: Final = 0.01
"""Reach is solved to this, m."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class ReachEnd:
    """One direction of a pair on the link itself: frequency, margin, what its receiver asks of fading."""

    frequency_hz: float
    margin_db: float
    receiver: Receiver


class Reacher:
    """Finds reach; pairs that fade alike share what distance does."""

    def __init__(self, weather: Weather) -> None:
        self.weather = weather
        self._seen: dict[tuple[object, ...], tuple[tuple[float, float | None], ...]] = {}

    def reach(
        self, link: Link, path: SignalPath, ends: tuple[ReachEnd, ReachEnd], *, antennas: AntennasResult
    ) -> Reach:
        """Reach of the antennas and the radio of a link, from what they have left on the path of the link."""
        wanted, target = link.wanted_margin_db, link.target_availability_percent

        def spare_db(distance_m: float) -> float | None:
            found = [
                _left(end, path, *self._at(link, path, end, antennas, distance_m, exact=True), wanted, target)
                for end in ends
            ]
            return None if None in found else min(one for one in found if one is not None)

        tables = [self._table(link, path, end, antennas) for end in ends]
        spare: list[float | None] = []
        for index in range(len(REACH_M)):
            both = [_left(end, path, *table[index], wanted, target) for end, table in zip(ends, tables, strict=True)]
            spare.append(None if None in both else min(one for one in both if one is not None))
        distance_m, limited_by = _solved(spare, spare_db)
        timing = link.radio.greatest_distance_m
        if timing is not None and distance_m is not None and timing < distance_m:
            distance_m, limited_by = timing, "timing"
        if limited_by == "margin" and distance_m is not None and target is not None:
            limited_by = self._limit(link, path, ends, antennas, distance_m)
        return Reach(distance_m=distance_m, limited_by=limited_by, spare_db=tuple(spare))

    def _at(
        self, link: Link, path: SignalPath, end: ReachEnd, antennas: AntennasResult, distance_m: float, *, exact: bool
    ) -> tuple[float, float | None]:
        """Loss of free space and air at a distance, dB, and the margin that the target asks there."""
        fading = self._fading(link, path, end, antennas, distance_m)
        target = link.target_availability_percent
        need = None
        if target is not None:
            need = needed_margin_db(fading, end.receiver, target_percent=target, exact=exact)
        return fading.loss.free_space_db + fading.loss.gases_db, need

    def _fading(
        self, link: Link, path: SignalPath, end: ReachEnd, antennas: AntennasResult, distance_m: float
    ) -> Fading:
        here = path.geometry
        free = free_path(
            link,
            path.figures,
            length_m=distance_m,
            a_amsl_m=here.a_amsl_m,
            b_amsl_m=here.b_amsl_m,
            mean_ground_m=here.mean_ground_m,
            median_k=path.median_k,
        )
        return fading_over(link, free, frequency_hz=end.frequency_hz, antennas=antennas, weather=self.weather)

    def _table(
        self, link: Link, path: SignalPath, end: ReachEnd, antennas: AntennasResult
    ) -> tuple[tuple[float, float | None], ...]:
        receiver = end.receiver
        key = (
            unpowered(link.radio),
            end.frequency_hz,
            link.target_availability_percent,
            antennas.a.polarization,
            antennas.b.polarization,
            link.antenna_a.radome_wet_db + link.antenna_b.radome_wet_db,
            receiver.second,
            receiver.level_difference_db,
            receiver.cross,
        )
        if key not in self._seen:
            self._seen[key] = tuple(self._at(link, path, end, antennas, at, exact=False) for at in REACH_M)
        return self._seen[key]

    def _limit(
        self,
        link: Link,
        path: SignalPath,
        ends: tuple[ReachEnd, ReachEnd],
        antennas: AntennasResult,
        distance_m: float,
    ) -> str:
        """What the last decibels go to: the margin asked, else the weather that the target is lost to."""
        for end in ends:
            _, need = self._at(link, path, end, antennas, distance_m, exact=True)
            if need is not None and need > link.wanted_margin_db:
                fading = self._fading(link, path, end, antennas, distance_m)
                year, _ = fading.outage(np.array([need]), end.receiver)
                return str(np.atleast_1d(year.dominant)[0])
        return "margin"


def _left(
    end: ReachEnd, path: SignalPath, loss_db: float, need_db: float | None, wanted_db: float, target: float | None
) -> float | None:
    """What is left over margin and target of one direction, dB."""
    if target is not None and need_db is None:
        return None
    here = path.losses[end.frequency_hz]
    without = end.margin_db + here.free_space_db + here.gases_db + here.diffraction_db + here.vegetation_db
    return without - loss_db - max(wanted_db, need_db or 0.0)


def _solved(spare: list[float | None], spare_db: Callable[[float], float | None]) -> tuple[float | None, str]:
    """First distance at which nothing is left, seen from short ones, and what kind of end that is."""

    def left(distance_m: float) -> float:
        found = spare_db(distance_m)
        return -1.0 if found is None else found

    if all(one is None for one in spare):
        return None, "not computed"
    used_up = next((index for index, one in enumerate(spare) if one is None or one < 0.0), None)
    if used_up is None:
        return REACH_M[-1], "beyond"
    if used_up == 0:
        return None, "margin"
    low, high = REACH_M[used_up - 1], REACH_M[used_up]
    if left(low) <= 0.0:
        return low, "margin"
    if left(high) >= 0.0:
        return high, "margin"
    return float(brentq(left, low, high, xtol=TO_M)), "margin"
