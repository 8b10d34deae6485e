"""What stands together at one site: high and low ends that fight, antennas too near each other for their patterns to hold.

Works on stations; knows no terrain, levels or sentences.
"""

import math
from collections.abc import Iterator
from typing import Final

import numpy as np

from fellspan.geodesy import geodesic
from fellspan.links.interference_result import HighLowConflict, NearAntennas
from fellspan.links.stations import Station, share_a_sector

SAME_SITE_M: Final = 100.0
"""Antennas no further apart than this on the ground stand at one site, with no terrain between (our own rule)."""
CLEAR_WAVELENGTHS: Final = 10.0
"""Antennas on one mast keep this many wavelengths from edge to edge (common practice, no source)."""


def high_low_conflicts(stations: list[Station]) -> tuple[HighLowConflict, ...]:
    """Links of frequency division that at one site transmit in each other's receiving half of a band.

    Two pairs are of one band where the stretches from their lower to their higher frequency overlap (our own rule).
    """
    found = []
    for one, other, distance_m in _together(stations):
        one_is_high, other_is_high = one.transmit_hz > one.receive_hz, other.transmit_hz > other.receive_hz
        paired = one.transmit_hz != one.receive_hz and other.transmit_hz != other.receive_hz
        if not paired or one_is_high == other_is_high or not _one_band(one, other):
            continue
        high, low = (one, other) if one_is_high else (other, one)
        found.append(
            HighLowConflict(
                site=one.site.name,
                high_link=high.link,
                low_link=low.link,
                high_hz=high.transmit_hz,
                low_hz=low.transmit_hz,
                distance_m=distance_m,
            )
        )
    return tuple(found)


def near_antennas(stations: list[Station]) -> tuple[NearAntennas, ...]:
    """Antennas of one site that stand within the far field of one of them, or nearer than is good practice.

    The far field begins at 2 D^2 / wavelength of the larger one. The separation to keep is half of both antennas and
    `CLEAR_WAVELENGTHS` between their edges (common practice, no source).
    """
    found = []
    for one, other, distance_m in _together(stations):
        far_field_m = max(one.far_field_m, other.far_field_m)
        keep_m = 0.5 * (one.size_m + other.size_m) + CLEAR_WAVELENGTHS * max(one.wavelength_m, other.wavelength_m)
        if distance_m >= max(far_field_m, keep_m):
            continue
        found.append(
            NearAntennas(
                site=one.site.name,
                other_site=other.site.name,
                link=one.link,
                other_link=other.link,
                distance_m=distance_m,
                far_field_m=far_field_m,
                keep_m=keep_m,
                is_close=distance_m < keep_m,
            )
        )
    return tuple(found)


def _one_band(one: Station, other: Station) -> bool:
    low = max(min(one.transmit_hz, one.receive_hz), min(other.transmit_hz, other.receive_hz))
    return low <= min(max(one.transmit_hz, one.receive_hz), max(other.transmit_hz, other.receive_hz))


def _together(stations: list[Station]) -> Iterator[tuple[Station, Station, float]]:
    """Pairs of different links at one site, with the distance between the antennas, m; not those on one sector."""
    latitude = np.array([one.site.position.latitude_deg for one in stations])
    longitude = np.array([one.site.position.longitude_deg for one in stations])
    for index, one in enumerate(stations):
        # A degree of latitude is over 110 km: a cheap first look, so that the geodesic is asked of few.
        near = np.flatnonzero(np.abs(latitude[index + 1 :] - latitude[index]) * 110_000.0 <= SAME_SITE_M) + index + 1
        if not near.size:
            continue
        away = geodesic.inverse_many(latitude[index], longitude[index], latitude[near], longitude[near]).distance_m
        for number, on_ground_m in zip(near, away, strict=True):
            other = stations[int(number)]
            if on_ground_m <= SAME_SITE_M and other.link != one.link and not share_a_sector(one, other):
                yield one, other, math.hypot(float(on_ground_m), other.amsl_m - one.amsl_m)
