"""Coupling: what every transmitter lays into every other receiver before terrain, as flat arrays over pairs of stations.

Geometry, gains of both antennas, polarization, free space, overlap. Knows no terrain, sums or sentences.
"""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from fellspan.antennas import mounting as hung
from fellspan.geodesy import geodesic
from fellspan.links.same_site import SAME_SITE_M
from fellspan.links.stations import Floats, Station, overlap_db, share_a_sector
from fellspan.propagation import free_space_loss_db
from fellspan.propagation.constants import EARTH_RADIUS_M

Indices = NDArray[np.intp]

UNKNOWN_BESIDE_DBI: Final = 0.0
"""Most that an antenna of which only the gain is known gives to others at its own site: the mean over all directions, since
none looks at its neighbour (our own rule)."""

LEAST_DISTANCE_M: Final = 1.0
"""Antennas typed nearer than this are taken to hang one above the other, this far apart (our own rule)."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Pairs:
    """Transmitters and receivers whose channels overlap; arrays of shape (m,). `level_dbm` is without terrain."""

    transmitter: Indices
    receiver: Indices
    overlap_db: Floats
    horizontal_m: Floats
    distance_m: Floats
    bearing_deg: Floats
    """At the receiver, toward the transmitter."""
    elevation_deg: Floats
    transmit_gain_dbi: Floats
    receive_gain_dbi: Floats
    polarization_db: Floats
    line_db: Floats
    free_space_db: Floats
    gases_db: Floats
    level_dbm: Floats


def pairs_of(stations: list[Station], *, median_k: float) -> Pairs | None:
    """All pairs of different links that could hear each other; None where there are none.

    Ends of one link are no pair, nor links that share a sector (`share_a_sector`), nor stations that keep step (`_in_step`).
    """
    transmitter, receiver, overlap = _overlapping(stations)
    if not transmitter.size:
        return None
    latitude, longitude, amsl = (
        np.array(values)
        for values in zip(
            *((one.site.position.latitude_deg, one.site.position.longitude_deg, one.amsl_m) for one in stations),
            strict=True,
        )
    )
    # Measured from the lower number to the higher, so that a path is one and the same both ways.
    first, second = np.minimum(transmitter, receiver), np.maximum(transmitter, receiver)
    line = geodesic.inverse_many(latitude[first], longitude[first], latitude[second], longitude[second])
    turned = first == receiver
    toward_transmitter = np.where(turned, line.bearing_ab_deg, line.bearing_ba_deg)
    toward_receiver = np.where(turned, line.bearing_ba_deg, line.bearing_ab_deg)
    higher, horizontal = amsl[transmitter] - amsl[receiver], line.distance_m
    one_point = np.hypot(horizontal, higher) < LEAST_DISTANCE_M
    higher = np.where(one_point, np.where(turned, -LEAST_DISTANCE_M, LEAST_DISTANCE_M), higher)
    horizontal = np.where(one_point, 0.0, horizontal)
    slant = np.hypot(horizontal, higher)
    up = elevation_deg(horizontal, higher, k=median_k)
    down = elevation_deg(horizontal, -higher, k=median_k)
    transmit_gain, transmit_below = _gains(stations, transmitter, toward_receiver, down)
    receive_gain, receive_below = _gains(stations, receiver, toward_transmitter, up)
    beside = horizontal <= SAME_SITE_M
    bare = np.array([one.antenna.pattern is None for one in stations])
    transmit_gain = np.where(beside & bare[transmitter], np.minimum(transmit_gain, UNKNOWN_BESIDE_DBI), transmit_gain)
    receive_gain = np.where(beside & bare[receiver], np.minimum(receive_gain, UNKNOWN_BESIDE_DBI), receive_gain)
    polarization = polarization_coupling_loss_db(
        _angles(stations, transmitter, receiver), transmit_below, receive_below
    )
    sent = np.array([one.transmit_hz for one in stations])[transmitter]
    free_space = np.asarray(free_space_loss_db(slant, frequency_hz=sent))
    line_db = (
        np.array([one.transmit_line_db for one in stations])[transmitter]
        + np.array([one.receive_line_db for one in stations])[receiver]
    )
    # Both links tell what the air takes; the lesser is the cautious one, and the same both ways.
    per_m = np.array([one.gases_db_per_m for one in stations])
    gases = np.minimum(per_m[transmitter], per_m[receiver]) * slant
    power = np.array([np.nan if one.power_dbm is None else one.power_dbm for one in stations])[transmitter]
    level = power + transmit_gain + receive_gain - line_db - polarization - free_space - gases + overlap
    return Pairs(
        transmitter=transmitter,
        receiver=receiver,
        overlap_db=overlap,
        horizontal_m=horizontal,
        distance_m=slant,
        bearing_deg=toward_transmitter,
        elevation_deg=up,
        transmit_gain_dbi=transmit_gain,
        receive_gain_dbi=receive_gain,
        polarization_db=polarization,
        line_db=line_db,
        free_space_db=free_space,
        gases_db=gases,
        level_dbm=np.minimum(level, power + overlap),  # no antenna takes in more than was sent
    )


def elevation_deg(distance_m: ArrayLike, higher_m: ArrayLike, *, k: float) -> Floats:
    """Elevation at which a ray leaves toward something `higher_m` above, degrees, over an Earth of radius k * 6371 km."""
    distance, higher = np.asarray(distance_m, dtype=np.float64), np.asarray(higher_m, dtype=np.float64)
    sunk = 0.5 * distance**2 / (k * EARTH_RADIUS_M)
    return np.asarray(np.degrees(np.arctan2(higher - sunk, distance)))


def polarization_coupling_loss_db(
    angle_deg: ArrayLike, transmit_below_db: ArrayLike, receive_below_db: ArrayLike
) -> Floats:
    """Loss of two linearly polarized antennas against their co-polar gains toward each other, dB.

    Parameters
    ----------
    angle_deg
        Between the electric fields, degrees.
    transmit_below_db, receive_below_db
        How far the cross-polar gain of each lies below its co-polar one in that direction, dB; negative in the nulls.

    Notes
    -----
    Malus's law. Crossed antennas couple by the leaks of both, added in phase, the worst case (`combined_discrimination_db`);
    parallel ones by their co-polar gains, or by both cross-polar ones where these are more.
    """
    angle = np.radians(np.asarray(angle_deg, dtype=np.float64))
    sent, heard = np.asarray(transmit_below_db, dtype=np.float64), np.asarray(receive_below_db, dtype=np.float64)
    parallel = 10.0 ** (np.maximum(-(sent + heard), 0.0) / 10.0)
    crossed = 10.0 ** (-np.asarray(hung.combined_discrimination_db(sent, heard)) / 10.0)
    return np.asarray(-10.0 * np.log10(np.cos(angle) ** 2 * parallel + np.sin(angle) ** 2 * crossed) + 0.0)


def _overlapping(stations: list[Station]) -> tuple[Indices, Indices, Floats]:
    """Pairs of stations of different links with power and gains known, whose channels overlap, and by how much."""
    channels: dict[tuple[float, float | None, float, float | None], float | None] = {}
    found: list[tuple[int, int, float]] = []
    apart, silent = _sharing(stations)
    ends = [one.site.name for one in stations]
    usable = [one for one in stations if one.has_gain]
    for sender in usable:
        if sender.power_dbm is None or sender.number in silent:
            continue
        for hearer in usable:
            key = (sender.transmit_hz, sender.radio.bandwidth_hz, hearer.receive_hz, hearer.radio.bandwidth_hz)
            if key not in channels:
                channels[key] = overlap_db(*key)
            share = channels[key]
            links = sender.number // 2, hearer.number // 2
            if share is not None and links[0] != links[1] and links not in apart and not _in_step(sender, hearer, ends):
                found.append((sender.number, hearer.number, share))
    numbers = np.array([pair[:2] for pair in found], dtype=np.intp).reshape(-1, 2)
    return numbers[:, 0], numbers[:, 1], np.array([pair[2] for pair in found], dtype=np.float64)


def _in_step(sender: Station, hearer: Station, ends: list[str]) -> bool:
    """Whether both send at the same moments: both at the site where their links meet, or both at the far ends from it.

    `ends` is the site of each station, by number: those of one link stand side by side.
    """
    if not (sender.radio.synchronised and hearer.radio.synchronised):
        return False
    other_sender, other_hearer = ends[sender.number ^ 1], ends[hearer.number ^ 1]
    return sender.site.name == hearer.site.name or other_sender == other_hearer


def _sharing(stations: list[Station]) -> tuple[set[tuple[int, int]], set[int]]:
    """Numbers of links, both ways round, that one sector serves in turn; and stations that are the sector of another once more.

    A sector sends once, whatever the number of its links: with the greatest power that one of them states.
    """
    by_site: dict[str, list[Station]] = {}
    for one in stations:
        by_site.setdefault(one.site.name, []).append(one)
    shared = [
        (one, other)
        for together in by_site.values()
        for one in together
        for other in together
        if share_a_sector(one, other)
    ]
    apart = {(one.number // 2, other.number // 2) for one, other in shared}
    return apart, {one.number for one, other in shared if _loudness(one) < _loudness(other)}


def _loudness(station: Station) -> tuple[float, int]:
    """Order among the links of one sector: by power, then the one that stands first in the study."""
    return -math.inf if station.power_dbm is None else station.power_dbm, -station.number


def _gains(stations: list[Station], whose: Indices, bearing: Floats, elevation: Floats) -> tuple[Floats, Floats]:
    """Co-polar gain and what the cross-polar one lies below it, of each pair's station; one call for each antenna."""
    gain, below = np.empty(whose.shape), np.empty(whose.shape)
    order = np.argsort(whose, kind="stable")
    cuts = np.flatnonzero(np.diff(whose[order])) + 1
    for rows in np.split(order, cuts):
        gain[rows], below[rows] = stations[int(whose[rows[0]])].gains_toward(bearing[rows], elevation[rows])
    return gain, below


def _angles(stations: list[Station], transmitter: Indices, receiver: Indices) -> Floats:
    """Angle between the electric fields of each pair, degrees; 0 where a radio uses both polarizations."""
    kinds: dict[tuple[str, float, bool], int] = {}
    which, mountings = [], []
    for one in stations:
        key = (one.mounting.polarization, one.mounting.roll_deg, one.radio.dual_polarization)
        if key not in kinds:
            kinds[key] = len(kinds)
            mountings.append((one.mounting, one.radio.dual_polarization))
        which.append(kinds[key])
    table = np.array(
        [
            [0.0 if dual or other_dual else hung.field_angle_between_deg(one, other) for other, other_dual in mountings]
            for one, dual in mountings
        ]
    )
    kind = np.array(which, dtype=np.intp)
    return np.asarray(table[kind[transmitter], kind[receiver]])
