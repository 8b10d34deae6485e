"""For how much of the year pairs carry the wanted modulation, one way and both ways, on columns.

Works weather and low k out only where a margin is there to be used up: elsewhere the answer is 0 without it.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.climate.columns import ClimateColumns
from fellspan.links import fades
from fellspan.links.budget import line_loss_db
from fellspan.links.direction import NEAR_DB
from fellspan.links.outages import Causes, outage_of_year
from fellspan.links.receivers import receiver_of, rows_of, wanted_index
from fellspan.links.site import Antenna
from fellspan.links.verdicts import SIGNAL_BAND_DB
from fellspan.links.ways_past_trees import depth_in_trees_m, most_db, ways_past_trees
from fellspan.propagation import Outage, one_way_outage, two_way_outage
from fellspan.screening.pairs import Candidates
from fellspan.screening.path_sets import PathSets
from fellspan.screening.signal_ends import PairEnds, groups_of_receivers
from fellspan.screening.signal_level import Level, SpreadColumns

Floats = NDArray[np.float64]
Index = NDArray[np.int64]

_ALL: Final = 100.0
_SURELY_DB: Final = 1e-6
"""So much below a margin that rounding does not matter."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Shares:
    """Availability of the year, %, shape (p,): of both ways at once, and to the place and to the hub; NaN where not computed.

    `nearly_percent` is that of each way with `NEAR_DB` more margin, where the target is missed and it can matter, else NaN.
    """

    both_percent: Floats
    each_percent: tuple[Floats, Floats]
    nearly_percent: tuple[Floats, Floats]


def shares_of_year(
    candidates: Candidates,
    rows: PathSets,
    climate: ClimateColumns,
    ends: PairEnds,
    *,
    level: Level,
    spread: SpreadColumns,
    sector: Index,
    latitude_deg: Floats,
    margins_db: tuple[Floats, Floats],
    known: NDArray[np.bool_],
) -> Shares:
    """Availability of pairs; `margins_db` are those at the place and at the hub, `known` where all that it takes is stated."""
    count = sector.size
    least = np.minimum(*margins_db)
    target, wanted_db = candidates.target_availability_percent, candidates.wanted_margin_db
    # A level that is short without any fading is down all the time. What nearly meets a target can only matter where the
    # margin alone does not say 'below' already.
    could_matter = least >= wanted_db - SIGNAL_BAND_DB
    asked = known & ((least >= 0.0) | (could_matter if target is not None else False))
    each = tuple(np.where(known & (margin < 0.0), 0.0, np.nan) for margin in margins_db)
    nearly = np.full(count, np.nan), np.full(count, np.nan)
    both = np.where(known & (least < 0.0), 0.0, np.nan)
    some = np.flatnonzero(asked)
    if some.size:
        margins = margins_db[0][some], margins_db[1][some]
        fading = _Fading(
            candidates,
            rows,
            climate.part(some),
            ends,
            level=level,
            spread=spread,
            sector=sector,
            latitude_deg=latitude_deg,
            margins_db=margins,
            some=some,
        )
        outages = fading.outages(margins)
        for share, outage, margin in zip(each, outages, margins, strict=True):
            share[some] = _share(outage, margin)
        joined = two_way_outage(*outages, common_multipath=candidates.radio.shares_frequency)
        both[some] = _share(joined, np.minimum(*margins))
        if target is not None:
            missed = could_matter[some] & ((each[0][some] < target) | (each[1][some] < target))
            if missed.any():
                more = np.where(missed, margins[0] + NEAR_DB, np.inf), np.where(missed, margins[1] + NEAR_DB, np.inf)
                for share, outage, margin in zip(nearly, fading.outages(more), more, strict=True):
                    share[some] = np.where(missed, _share(outage, margin), np.nan)
    return Shares(both_percent=both, each_percent=(each[0], each[1]), nearly_percent=nearly)


def _share(outage: Outage, margin_db: Floats) -> Floats:
    return np.where(margin_db < 0.0, 0.0, _ALL - np.asarray(outage.total_percent))


class _Fading:
    """What takes the level of some pairs down, in both directions; asked for as many margins as are wanted."""

    def __init__(
        self,
        candidates: Candidates,
        rows: PathSets,
        climate: ClimateColumns,
        ends: PairEnds,
        *,
        level: Level,
        spread: SpreadColumns,
        sector: Index,
        latitude_deg: Floats,
        margins_db: tuple[Floats, Floats],
        some: Index,
    ) -> None:
        self._candidates, self._ends, self._some, self._sector = candidates, ends, some, sector[some]
        radio, weather = candidates.radio, candidates.settings.weather
        columns = fades.PathColumns(
            length_m=rows.length_m[some],
            a_amsl_m=rows.a_amsl_m[some],
            b_amsl_m=rows.b_amsl_m[some],
            mean_ground_m=rows.mean_ground_m[some],
            latitude_deg=latitude_deg[some],
        )
        in_level = level.diffraction_db[some] + level.vegetation_db[some]
        rooms = tuple(
            margin + in_level[:, level.at(transmit_hz)]
            for margin, transmit_hz in zip(margins_db, radio.transmit_hz, strict=True)
        )
        cheaper = _by_inverse_k_db(candidates, rows, spread, level, some=some, rooms_db=rooms)
        spread = spread.part(some)
        self._causes: dict[float, Causes] = {}
        for frequency in dict.fromkeys(radio.transmit_hz):
            column = level.at(frequency)
            self._causes[frequency] = Causes(
                frequency_hz=frequency,
                rain_reading=weather.rain_reading,
                rain_001_db=fades.rain_001_db(
                    climate,
                    columns,
                    frequency_hz=frequency,
                    tilt_deg=ends.rain_tilt_deg[some],
                    edition=weather.rain_edition,
                ),
                wet_radomes_db=ends.wet_radomes_db[some],
                occurrence_percent=fades.occurrence_percent(climate, columns, frequency_hz=frequency),
                geographic=climate.edition_17,
                length_m=columns.length_m,
                latitude_deg=columns.latitude_deg,
                inclination_mrad=columns.inclination_mrad,
                median_n_per_km=spread.median_n_per_km,
                year_n_per_km=spread.year_n_per_km,
                worst_month_n_per_km=spread.worst_month_n_per_km,
                inverse_k=spread.inverse_k,
                by_inverse_k_db=cheaper[..., column],
                loss_in_level_db=in_level[:, column],
            )

    def outages(self, margins_db: tuple[Floats, Floats]) -> tuple[Outage, Outage]:
        """Of the year, to the place and to the hub."""
        there_hz, back_hz = self._candidates.radio.transmit_hz
        place = self._candidates.place_antenna
        groups = groups_of_receivers(self._candidates, self._sector)
        if there_hz == back_hz and place.diversity is None and all(one.diversity is None for one, _ in groups):
            # One frequency and no second antennas: both directions are the same path with the same margin.
            both = self._outage(
                np.minimum(*margins_db), there_hz, place, self._ends.gain_b_dbi, np.arange(self._some.size)
            )
            return both, both
        there = self._outage(margins_db[0], there_hz, place, self._ends.gain_b_dbi, np.arange(self._some.size))
        back = [
            (rows, self._outage(margins_db[1], back_hz, antenna, self._ends.gain_a_dbi, rows))
            for antenna, rows in groups
        ]
        return there, _joined(back, self._some.size)

    def _outage(
        self, margin_db: Floats, frequency_hz: float, antenna: Antenna, gain_dbi: Floats, rows: Index
    ) -> Outage:
        """Of some of the pairs, all of whose receivers have antennas of one kind."""
        radio = self._candidates.radio
        table = rows_of(radio)
        wanted = wanted_index(radio, table)
        assert wanted is not None
        receiver = receiver_of(
            radio,
            (table[wanted],),
            antenna,
            discrimination_db=self._ends.discrimination_db[self._some[rows]],
            gain_dbi=gain_dbi[self._some[rows]],
            line_loss_db=line_loss_db(antenna, frequency_hz=frequency_hz),
        )
        return outage_of_year(self._causes[frequency_hz].part(rows), margin_db[rows], receiver)


def _joined(parts: list[tuple[Index, Outage]], count: int) -> Outage:
    """One outage from those of parts of the pairs."""
    if len(parts) == 1:
        return parts[0][1]
    shares = np.empty((3, count))
    for rows, outage in parts:
        shares[:, rows] = outage.rain_percent, outage.multipath_percent, outage.diffraction_percent
    return one_way_outage(rain_percent=shares[0], multipath_percent=shares[1], diffraction_percent=shares[2])


def _by_inverse_k_db(
    candidates: Candidates,
    rows: PathSets,
    spread: SpreadColumns,
    level: Level,
    *,
    some: Index,
    rooms_db: tuple[Floats, ...],
) -> Floats:
    """Diffraction and trees by k of some pairs on the cheaper way, dB, shape (p, m, f).

    Left at 0 where they cannot use up at any k what each direction has room for: there is no outage then whatever they are.
    """
    frequency, polarization = level.frequency_hz, candidates.radio.polarization
    every = most_db(
        rows, level.lowest_k_db, inverse_k=spread.inverse_k, frequency_hz=frequency, polarization=polarization
    )
    most = every[some]
    enough = np.ones(some.size, dtype=np.bool_)
    for room, transmit_hz in zip(rooms_db, candidates.radio.transmit_hz, strict=True):
        enough &= most[:, level.at(transmit_hz)] < room - _SURELY_DB
    found = np.zeros((some.size, spread.inverse_k.shape[-1], frequency.size))
    short = np.flatnonzero(~enough)
    for place, few in rows.among(some[short]):
        ways = ways_past_trees(
            few,
            inverse_k=spread.inverse_k[some[short[place]]],
            frequency_hz=frequency,
            polarization=polarization,
            depth_m=depth_in_trees_m(few, k=candidates.settings.median_k),
        )
        found[short[place]] = ways.cheaper_db
    return found
