"""Neighbours inside a study: carrier to interference at every receiver, from every transmitter of other links on its channel.

Strongest first, each path over the terrain, until what is left cannot matter. Knows no study files and no pages.
"""

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from fellspan.links.coupling import Indices, Pairs, pairs_of
from fellspan.links.interference_result import InterferenceResult, Interferer, PathStatus, StudyInterference
from fellspan.links.neighbour_words import rule_notes, warning_sentences, worst_sentence
from fellspan.links.result import LinkResult
from fellspan.links.same_site import SAME_SITE_M, high_low_conflicts, near_antennas
from fellspan.links.shielding import shielding_db
from fellspan.links.site import Link
from fellspan.links.stations import Station, stations_of
from fellspan.propagation import sum_powers_dbm, thermal_noise_dbm, threshold_degradation_db

if TYPE_CHECKING:
    from fellspan.terrain.terrain import Terrain

LEFT_OUT_DB: Final = 20.0
"""What is left out, added up without terrain, stays this far below noise and interference together (our own rule)."""
UNKNOWN_WIDTH_HZ: Final = 1e6
"""Channel width for that rule, and for order, where none is known; narrow, so that less is left out (our own rule)."""
MOST_PATHS: Final = 400
"""Paths laid over the terrain, the strongest first; those beyond count with free space alone (our own rule)."""
MOST_LISTED: Final = 20
"""Interferers listed for one receiver; the sum holds all."""
_AT_ONCE: Final = 8
"""Pairs of one receiver looked at in a round."""


def study_interference(
    planned: Sequence[tuple[Link, LinkResult]],
    *,
    terrain: "Terrain | None",
    median_k: float,
    prune: bool = True,
    not_planned: Sequence[str] = (),
) -> StudyInterference:
    """What the links of a study do to each other.

    Parameters
    ----------
    planned
        Links with their results.
    terrain
        What the interfering paths run over; None counts free space alone.
    median_k
        Effective Earth radius factor.
    prune
        False lays every path over the terrain, however weak and however many.
    not_planned
        Names of links that have no result, for the notes.
    """
    stations = stations_of(planned)
    pairs = pairs_of(stations, median_k=median_k)
    levels = None
    if pairs is not None:
        levels = _Levels(stations, pairs)
        if terrain is not None:
            levels.lay_over(terrain, median_k=median_k, prune=prune)
    results = [_receiver(one, stations, levels) for one in stations if one.has_gain]
    noise = {(one.link, one.end): _order_noise_dbm(one) for one in stations}
    results.sort(key=lambda one: _harm_db(one, noise[one.link, one.end]), reverse=True)
    conflicts, near = high_low_conflicts(stations), near_antennas(stations)
    return StudyInterference(
        receivers=tuple(results),
        worst=worst_sentence(results),
        high_low=conflicts,
        near=near,
        warnings=warning_sentences(conflicts, near),
        notes=rule_notes(
            stations,
            free_space_only=terrain is None,
            paths_left=0 if levels is None else levels.paths_left,
            with_gaps=0 if levels is None else levels.status.count("no terrain"),
            not_planned=not_planned,
        ),
    )


def _order_noise_dbm(station: Station) -> float:
    return float(thermal_noise_dbm(UNKNOWN_WIDTH_HZ)) if station.noise_dbm is None else station.noise_dbm


def _harm_db(result: InterferenceResult, noise_dbm: float) -> float:
    """Interference over noise: how much harm it does, whatever the carrier."""
    return -math.inf if result.interference_dbm is None else result.interference_dbm - noise_dbm


class _Levels:
    """Levels of all pairs, and which of them count."""

    def __init__(self, stations: list[Station], pairs: Pairs) -> None:
        self.stations, self.pairs = stations, pairs
        self.level_dbm = pairs.level_dbm.copy()
        self.diffraction_db = np.full(self.level_dbm.shape, np.nan)
        here = pairs.horizontal_m <= SAME_SITE_M
        self.status: list[PathStatus] = ["same site" if near else "free space" for near in here]
        self.counts = np.ones(here.shape, dtype=np.bool_)
        self.rows = [np.flatnonzero(pairs.receiver == one.number) for one in stations]
        self.paths_left = 0
        self._here = here

    def lay_over(self, terrain: "Terrain", *, median_k: float, prune: bool) -> None:
        """Lay paths over the terrain in rounds, of each receiver the strongest first, until what is left cannot matter."""
        known = self._here.copy()
        self.counts = known
        paths = self._paths()
        members = {int(path): np.flatnonzero((paths == path) & ~known) for path in np.unique(paths[~known])}
        noise_mw = [10.0 ** (_order_noise_dbm(one) / 10.0) for one in self.stations]
        laid = 0
        while wanted := self._wanted(known, paths, noise_mw, prune=prune):
            for path in wanted:
                rows = members[path]
                if prune and laid >= MOST_PATHS:
                    self.paths_left += 1
                else:
                    self._lay(rows, terrain, median_k=median_k)
                    laid += 1
                known[rows] = True

    def _wanted(self, known: NDArray[np.bool_], paths: Indices, noise_mw: list[float], *, prune: bool) -> list[int]:
        """Paths that cannot be left out yet, the most harmful first."""
        worst: dict[int, float] = {}
        for own, noise in zip(self.rows, noise_mw, strict=True):
            powers = 10.0 ** (self.level_dbm[own] / 10.0)
            found = float(np.sum(powers[known[own]]))
            left = own[~known[own]]
            left = left[np.argsort(-self.level_dbm[left], kind="stable")]
            rest = np.cumsum(10.0 ** (self.level_dbm[left][::-1] / 10.0))[::-1]
            if prune:
                left = left[rest > 10.0 ** (-LEFT_OUT_DB / 10.0) * (noise + found)][:_AT_ONCE]
            for pair in left:
                path = int(paths[pair])
                worst[path] = max(worst.get(path, -math.inf), float(self.level_dbm[pair]) - 10.0 * math.log10(noise))
        return sorted(worst, key=lambda path: (-worst[path], path))

    def _paths(self) -> Indices:
        """A number for each pair, the same for all pairs between the same two places, whichever way. Shape (m,)."""
        spots = [(one.site.position.latitude_deg, one.site.position.longitude_deg) for one in self.stations]
        numbers = {spot: number for number, spot in enumerate(dict.fromkeys(spots))}
        place = np.array([numbers[spot] for spot in spots], dtype=np.intp)
        ends = place[self.pairs.transmitter], place[self.pairs.receiver]
        return np.asarray(np.minimum(*ends) * len(numbers) + np.maximum(*ends), dtype=np.intp)

    def _lay(self, rows: Indices, terrain: "Terrain", *, median_k: float) -> None:
        """Take the loss of the terrain between two places from all pairs there; both ways at once."""
        stations, pairs = self.stations, self.pairs
        ends = [(stations[int(pairs.transmitter[row])], stations[int(pairs.receiver[row])]) for row in rows]
        start = min((one.site.position for one in ends[0]), key=lambda at: (at.latitude_deg, at.longitude_deg))
        couples = [(one, other) if one.site.position == start else (other, one) for one, other in ends]
        sent = np.array([one.transmit_hz for one, _ in ends])
        loss = shielding_db(couples, sent, terrain=terrain, median_k=median_k)
        for place, row in enumerate(rows):
            self.status[int(row)] = "no terrain" if loss is None else "terrain"
            if loss is not None:
                self.diffraction_db[row] = loss[place]
                self.level_dbm[row] -= loss[place]


def _receiver(station: Station, stations: list[Station], levels: _Levels | None) -> InterferenceResult:
    rows = np.zeros(0, dtype=np.intp) if levels is None else levels.rows[station.number]
    if levels is not None:
        rows = rows[levels.counts[rows]]
        rows = rows[np.argsort(-levels.level_dbm[rows], kind="stable")]
    total = float(sum_powers_dbm(levels.level_dbm[rows])) if levels is not None and rows.size else None
    carrier, noise = station.carrier_dbm, station.noise_dbm
    worse = None
    if noise is not None:
        worse = 0.0 if total is None else float(threshold_degradation_db(total, noise_dbm=noise))
    return InterferenceResult(
        link=station.link,
        site=station.site.name,
        end=station.end,
        frequency_hz=station.receive_hz,
        carrier_dbm=carrier,
        noise_dbm=noise,
        noise_figure_is_assumed=station.radio.noise_figure_db is None,
        interferers=tuple(_interferer(int(row), stations, levels, carrier) for row in rows[:MOST_LISTED] if levels),
        weaker=max(int(rows.size) - MOST_LISTED, 0),
        interference_dbm=total,
        c_i_db=None if carrier is None or total is None else carrier - total,
        threshold_degradation_db=worse,
        margin_db=station.margin_db,
        effective_margin_db=None if station.margin_db is None or worse is None else station.margin_db - worse,
    )


def _interferer(row: int, stations: list[Station], levels: _Levels, carrier_dbm: float | None) -> Interferer:
    pairs = levels.pairs
    sender, hearer = stations[int(pairs.transmitter[row])], stations[int(pairs.receiver[row])]
    assert sender.power_dbm is not None
    level, diffraction = float(levels.level_dbm[row]), float(levels.diffraction_db[row])
    distance_m = float(pairs.distance_m[row])
    return Interferer(
        link=sender.link,
        site=sender.site.name,
        end=sender.end,
        level_dbm=level,
        c_i_db=None if carrier_dbm is None else carrier_dbm - level,
        frequency_hz=sender.transmit_hz,
        power_dbm=sender.power_dbm,
        overlap_db=float(pairs.overlap_db[row]),
        transmit_gain_dbi=float(pairs.transmit_gain_dbi[row]),
        receive_gain_dbi=float(pairs.receive_gain_dbi[row]),
        polarization_db=float(pairs.polarization_db[row]),
        line_db=float(pairs.line_db[row]),
        free_space_db=float(pairs.free_space_db[row]),
        diffraction_db=None if math.isnan(diffraction) else diffraction,
        gases_db=float(pairs.gases_db[row]),
        distance_m=distance_m,
        bearing_deg=float(pairs.bearing_deg[row]),
        elevation_deg=float(pairs.elevation_deg[row]),
        path=levels.status[row],
        patterns_hold=distance_m >= max(sender.far_field_m, hearer.far_field_m),
    )
