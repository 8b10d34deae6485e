"""What the two ends of many pairs give and take: gain toward each other, lines, polarizations, the sector that serves.

Asks antennas and mountings; knows no terrain, paths or weather.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.mounting import (
    Mountings,
    field_angle_between_deg,
    gain_toward_dbi,
    polarization_loss_db,
    refuse_unfit,
)
from fellspan.links.antenna_gains import all_mounted, discriminations_db
from fellspan.links.budget import level_dbm, line_terms
from fellspan.links.signal_path import rain_tilt_deg
from fellspan.links.site import Antenna
from fellspan.screening.laid import LaidBucket
from fellspan.screening.pairs import Candidates
from fellspan.vocabulary import Polarization

Floats = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class PairEnds:
    """Both ends of pairs, A the hub with its sector and B the place; arrays of shape (p,)."""

    gain_a_dbi: Floats
    """Toward the other end; NaN where unknown."""
    gain_b_dbi: Floats
    polarization_db: Floats
    """Lost where polarizations differ; 0 where nothing is known of them."""
    discrimination_db: Floats
    """Of the worse antenna; NaN where nobody asks for it."""
    rain_tilt_deg: Floats
    wet_radomes_db: Floats


def best_sector(candidates: Candidates, *, hub: Index, bearing_deg: Floats, tilt_deg: Floats) -> Index:
    """The sector that serves each pair: of its hub's sectors the one with the most gain toward the place.

    Parameters
    ----------
    candidates
        With at least one sector for each hub asked.
    hub
        Index of the hub, shape (p,).
    bearing_deg, tilt_deg
        True bearing and elevation angle of the place from the hub, degrees, shape (p,).

    Returns
    -------
    sector
        Index into `candidates.sectors`, shape (p,); of equals the first, and the first where no gain is known.

    Raises
    ------
    AntennaError
        An antenna cannot be mounted for the polarization asked.
    """
    chosen = np.full(hub.shape, -1, dtype=np.int64)
    order = np.argsort(hub, kind="stable")
    present, starts = np.unique(hub[order], return_index=True)
    rows_of = dict(zip(present.tolist(), np.split(order, starts[1:]), strict=True))
    most: dict[int, Floats] = {}
    served = [sector.hub for sector in candidates.sectors]
    several = {one for one in rows_of if served.count(one) > 1}
    for number, sector in enumerate(candidates.sectors):
        rows = rows_of.get(sector.hub)
        if rows is None:
            continue
        if sector.hub not in several:
            chosen[rows] = number
            continue
        gain, _ = _gains_dbi(
            sector.antenna, bearing_deg[rows], tilt_deg[rows], polarization=candidates.radio.polarization
        )
        gain = np.where(np.isnan(gain), -np.inf, gain)
        if sector.hub not in most:
            most[sector.hub], chosen[rows] = gain, number
            continue
        better = gain > most[sector.hub]
        most[sector.hub] = np.where(better, gain, most[sector.hub])
        chosen[rows[better]] = number
    return chosen


def _gains_dbi(
    antenna: Antenna, bearing_deg: Floats, tilt_deg: Floats, *, polarization: Polarization
) -> tuple[Floats, Mountings]:
    """Gain toward each of many other ends, NaN where unknown, and how the antenna hangs toward each."""
    hung = all_mounted(antenna, bearing_deg=bearing_deg, tilt_deg=tilt_deg, polarization=polarization)
    if antenna.pattern is None:
        known = np.nan if antenna.gain_dbi is None else antenna.gain_dbi
        return np.full(bearing_deg.shape, known), hung
    refuse_unfit(antenna.pattern, hung)
    return np.asarray(gain_toward_dbi(antenna.pattern, hung, bearing_deg, tilt_deg)), hung


def pair_ends(candidates: Candidates, bucket: LaidBucket, *, sector: Index) -> PairEnds:
    """What both ends of a bucket's pairs give, as `antennas_of` and its neighbours say of one link."""
    radio, place = candidates.radio, candidates.place_antenna
    count = sector.size
    gain_b, hung_b = _gains_dbi(place, bucket.bearing_ba_deg, bucket.tilt_ba_deg, polarization=radio.polarization)
    gain_a, lost, discrimination = np.empty(count), np.zeros(count), np.full(count, np.nan)
    tilt, wet = np.empty(count), np.empty(count)
    asked = radio.co_channel is not None and radio.co_channel.antenna_discrimination_db is None
    for number in np.unique(sector).tolist():
        rows = np.flatnonzero(sector == number)
        antenna = candidates.sectors[number].antenna
        bearing, up = bucket.bearing_ab_deg[rows], bucket.tilt_ab_deg[rows]
        gain_a[rows], hung_a = _gains_dbi(antenna, bearing, up, polarization=radio.polarization)
        tilt[rows] = rain_tilt_deg(radio, a=hung_a.polarization, b=hung_b.polarization)
        wet[rows] = antenna.radome_wet_db + place.radome_wet_db
        turned = field_angle_between_deg(hung_a, hung_b)
        nothing_known = all(one.pattern is None and one.mounting is None for one in (antenna, place))
        differ = turned != 0.0 and not nothing_known
        if not (asked or differ):
            continue
        here = Mountings(
            bearing_deg=hung_b.bearing_deg[rows],
            tilt_deg=hung_b.tilt_deg[rows],
            polarization=hung_b.polarization,
            roll_deg=hung_b.roll_deg,
        )
        apart_a = discriminations_db(antenna, hung_a, bearing, up)
        apart_b = discriminations_db(place, here, bucket.bearing_ba_deg[rows], bucket.tilt_ba_deg[rows])
        discrimination[rows] = np.minimum(apart_a, apart_b)
        if differ:
            loss = polarization_loss_db(turned, discrimination_a_db=apart_a, discrimination_b_db=apart_b)
            lost[rows] = np.maximum(loss, 0.0)
    return PairEnds(
        gain_a_dbi=gain_a,
        gain_b_dbi=gain_b,
        polarization_db=lost,
        discrimination_db=discrimination,
        rain_tilt_deg=tilt,
        wet_radomes_db=wet,
    )


def lines_dbm(
    candidates: Candidates, *, power_dbm: float, sector: Index, frequency_hz: float, to_place: bool
) -> Floats:
    """The power less all that both ends' lines and aim take, gains apart, dBm, shape (p,)."""
    place = _line_db(candidates.place_antenna, frequency_hz, transmits=not to_place)
    numbers, back = np.unique(sector, return_inverse=True)
    hub = [_line_db(candidates.sectors[one].antenna, frequency_hz, transmits=to_place) for one in numbers.tolist()]
    return np.asarray(power_dbm + np.array(hub)[back.reshape(-1)] + place)


@lru_cache(maxsize=512)
def _line_db(antenna: Antenna, frequency_hz: float, *, transmits: bool) -> float:
    level = level_dbm(line_terms(antenna, gain_dbi=0.0, frequency_hz=frequency_hz, transmits=transmits, site=""))
    assert level is not None
    return level


def groups_of_receivers(candidates: Candidates, sector: Index) -> tuple[tuple[Antenna, Index], ...]:
    """Rows whose hubs' antennas ask the same of fading, with one of those antennas: all of them but for second antennas."""
    found: dict[object, tuple[Antenna, list[int]]] = {}
    for number in np.unique(sector).tolist():
        antenna = candidates.sectors[number].antenna
        second = antenna.diversity
        key = None if second is None else (second, antenna.feeder_loss_db, antenna.feeder)
        found.setdefault(key, (antenna, []))[1].append(number)
    return tuple((antenna, np.flatnonzero(np.isin(sector, numbers))) for antenna, numbers in found.values())
