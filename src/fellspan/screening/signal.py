"""Signal of many pairs at once: level, margin, availability and verdict, each as planning works it out for one link.

Calls the functions that one link calls, on columns; holds no formula of its own. Neighbours are not counted here.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fellspan.links.receivers import row_power_dbm, row_threshold_dbm, rows_of, wanted_index
from fellspan.links.signal_verdict import verdict_codes
from fellspan.screening.laid import LaidBucket, pair_columns
from fellspan.screening.pairs import UNKNOWN, Candidates
from fellspan.screening.path_sets import PathSets
from fellspan.screening.signal_ends import PairEnds, best_sector, lines_dbm, pair_ends
from fellspan.screening.signal_fading import Shares, shares_of_year
from fellspan.screening.signal_level import Level, climate_of, level_of, spread_columns

__all__ = ["SignalColumns", "best_sector", "signal_columns"]

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class SignalColumns:
    """What arrives, shape (p,), as the columns of the same names in `PairResults`; NaN or `UNKNOWN` where not computed."""

    diffraction_db: Floats
    received_at_hub_dbm: Floats
    received_at_place_dbm: Floats
    margin_at_hub_db: Floats
    margin_at_place_db: Floats
    availability_percent: Floats
    signal_verdict: NDArray[np.int8]


def signal_columns(candidates: Candidates, *buckets: LaidBucket, sector: Index) -> SignalColumns:
    """Level, margin, availability and verdict of the pairs of one or more buckets, in their order.

    Parameters
    ----------
    candidates
        What the pairs are made of.
    buckets
        The pairs laid on the terrain, a bucket for each width.
    sector
        Index into `candidates.sectors` of the sector that serves each pair, shape (p,); from `best_sector`.

    Raises
    ------
    AntennaError
        An antenna cannot be mounted for the polarization asked.

    Notes
    -----
    Each row equals the result of planning that pair alone, but for what its neighbours would leave of it.
    """
    radio = candidates.radio
    bucket = pair_columns(buckets)
    ends = pair_ends(candidates, bucket, sector=sector)
    table = rows_of(radio)
    wanted = wanted_index(radio, table)
    powers = [row_power_dbm(radio, row) for row in table]
    weather_known = bool(table) and None not in powers
    has_gains = np.isfinite(ends.gain_a_dbi) & np.isfinite(ends.gain_b_dbi)
    climate = climate_of(candidates, bucket, has_margin=has_gains & weather_known)
    rows = PathSets.of(buckets)
    spread = spread_columns(rows, climate)
    level = level_of(candidates, rows, climate, spread)
    power = row_power_dbm(radio, None if wanted is None else table[wanted])
    at_place, at_hub = (
        _received_dbm(candidates, level, ends, sector=sector, power_dbm=power, to_place=to_place)
        for to_place in (True, False)
    )
    threshold = np.nan if wanted is None else row_threshold_dbm(radio, table[wanted])
    margin_place, margin_hub = at_place - threshold, at_hub - threshold
    shares = shares_of_year(
        candidates,
        rows,
        climate,
        ends,
        level=level,
        spread=spread,
        sector=sector,
        latitude_deg=bucket.middle_latitude_deg,
        margins_db=(margin_place, margin_hub),
        known=has_gains & weather_known,
    )
    return SignalColumns(
        diffraction_db=level.diffraction_db[:, level.at(radio.transmit_hz[0])],
        received_at_hub_dbm=at_hub,
        received_at_place_dbm=at_place,
        margin_at_hub_db=margin_hub,
        margin_at_place_db=margin_place,
        availability_percent=shares.both_percent,
        signal_verdict=np.where(
            has_gains if power is not None and wanted is not None else False,
            _verdict(candidates, bucket, shares, margins_db=(margin_place, margin_hub)),
            UNKNOWN,
        ).astype(np.int8),
    )


def _received_dbm(
    candidates: Candidates,
    level: Level,
    ends: PairEnds,
    *,
    sector: Index,
    power_dbm: float | None,
    to_place: bool,
) -> Floats:
    """Level in clear air, dBm; NaN where the power or a gain is unknown."""
    if power_dbm is None:
        return np.full(sector.shape, np.nan)
    frequency = candidates.radio.transmit_hz[0 if to_place else 1]
    lines = lines_dbm(candidates, power_dbm=power_dbm, sector=sector, frequency_hz=frequency, to_place=to_place)
    path = level.total_db[:, level.at(frequency)] + ends.polarization_db
    return np.asarray(lines + ends.gain_a_dbi + ends.gain_b_dbi - path)


def _verdict(
    candidates: Candidates, bucket: LaidBucket, shares: Shares, *, margins_db: tuple[Floats, Floats]
) -> NDArray[np.int8]:
    least = np.minimum(*margins_db)
    reach = candidates.radio.greatest_distance_m
    return verdict_codes(
        least,
        wanted_db=candidates.wanted_margin_db,
        trees=bucket.trees_in_zone,
        too_far=np.zeros(least.shape, dtype=np.bool_) if reach is None else bucket.length_m > reach,
        target_percent=candidates.target_availability_percent,
        shares_percent=shares.each_percent,
        nearly_percent=shares.nearly_percent,
    )
