"""What a receiver needs: thresholds from the table or from noise, what the noise floor at its site adds, signatures as arrays.

Knows radios and sites; knows no paths, levels or weather.
"""

import math
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.links.outages import Cross, Receiver
from fellspan.links.radio import Modulation, Radio
from fellspan.links.site import Antenna, Channel, NoiseFloor, Site
from fellspan.propagation import sensitivity_dbm, thermal_noise_dbm, threshold_degradation_db

Floats = NDArray[np.float64]

ASSUMED_NOISE_FIGURE_DB: Final = 6.0
"""Of a receiver whose noise figure is not stated (common practice, no source)."""
UNNAMED: Final = "threshold"
"""Name of the one row that a radio without a table has."""


def rows_of(radio: Radio) -> tuple[Modulation, ...]:
    """The modulations, from the most robust to the fastest; a radio with a threshold alone has one row; none without."""
    if not radio.modulations:
        return () if radio.threshold_dbm is None else (Modulation(name=UNNAMED, threshold_dbm=radio.threshold_dbm),)
    return tuple(sorted(radio.modulations, key=lambda row: (row_threshold_dbm(radio, row), row.throughput_bps or 0.0)))


def wanted_index(radio: Radio, rows: tuple[Modulation, ...]) -> int | None:
    """Which row margin and target belong to; None where there are no rows."""
    if not rows:
        return None
    return next((index for index, row in enumerate(rows) if row.name == radio.wanted), 0)


def row_threshold_dbm(radio: Radio, row: Modulation) -> float:
    """Level that a row needs, dBm, without any noise from outside."""
    if row.threshold_dbm is not None:
        return row.threshold_dbm
    assert radio.bandwidth_hz is not None
    assert radio.noise_figure_db is not None
    assert row.snr_db is not None
    return float(
        sensitivity_dbm(
            radio.bandwidth_hz,
            noise_figure_db=radio.noise_figure_db,
            required_snr_db=row.snr_db,
            implementation_loss_db=radio.implementation_loss_db,
        )
    )


def row_power_dbm(radio: Radio, row: Modulation | None) -> float | None:
    """Total power that a row is sent with, dBm: the lesser of the radio's and its own; None where neither is known."""
    known = [power for power in (radio.power_dbm, row.power_dbm if row is not None else None) if power is not None]
    return min(known, default=None)


def noise_dbm(radio: Radio) -> float | None:
    """The receiver's own noise in its channel, dBm; None where no channel width is known."""
    if radio.bandwidth_hz is None:
        return None
    figure = ASSUMED_NOISE_FIGURE_DB if radio.noise_figure_db is None else radio.noise_figure_db
    return float(thermal_noise_dbm(radio.bandwidth_hz, noise_figure_db=figure))


def heard_dbm(site: Site, radio: Radio, *, frequency_hz: float, bearing_deg: float) -> float | None:
    """Strongest noise floor stated for that channel and direction, dBm in the channel; None where none is.

    One that holds for a part of the channel counts as if it held for all of it, on the safe side.
    """
    width = radio.bandwidth_hz
    half = (width or 0.0) / 2.0
    levels = [
        floor.level_dbm + (10.0 * math.log10(width / floor.bandwidth_hz) if width and floor.bandwidth_hz else 0.0)
        for floor in site.noise_floors
        if _holds(floor, low_hz=frequency_hz - half, high_hz=frequency_hz + half, bearing_deg=bearing_deg)
    ]
    return max(levels, default=None)


def _holds(floor: NoiseFloor, *, low_hz: float, high_hz: float, bearing_deg: float) -> bool:
    if floor.low_hz is not None and high_hz < floor.low_hz:
        return False
    if floor.high_hz is not None and low_hz > floor.high_hz:
        return False
    if floor.bearing_deg is None:
        return True
    off = abs((bearing_deg - floor.bearing_deg + 180.0) % 360.0 - 180.0)
    return off <= floor.width_deg / 2.0


def degradation_db(heard: float | None, own_noise: float | None) -> float:
    """How much more level the receiver needs because of what is heard, dB; 0 where either is unknown."""
    if heard is None or own_noise is None:
        return 0.0
    return float(threshold_degradation_db(heard, noise_dbm=own_noise))


def blocked(site: Site, radio: Radio, *, frequency_hz: float) -> Channel | None:
    """The first unusable stretch of spectrum at a site that the channel touches."""
    half = (radio.bandwidth_hz or 0.0) / 2.0
    low, high = frequency_hz - half, frequency_hz + half
    return next((one for one in site.unusable_channels if one.low_hz < high and one.high_hz > low), None)


def receiver_of(
    radio: Radio,
    rows: tuple[Modulation, ...],
    antenna: Antenna,
    *,
    discrimination_db: Floats | float,
    gain_dbi: Floats | float | None,
    line_loss_db: float,
) -> Receiver:
    """What the rows ask of fading, one entry each; for many links of one row, discrimination and gain are arrays."""
    signatures = [row.signature for row in rows]
    cross, ratios = None, np.full(len(rows), np.nan)
    if radio.co_channel is not None:
        stated = radio.co_channel
        found = stated.antenna_discrimination_db
        cross = Cross(discrimination_db=discrimination_db if found is None else found, canceller_db=stated.canceller_db)
        needs = [row.snr_db if stated.required_ratio_db is None else stated.required_ratio_db for row in rows]
        ratios = np.array([math.nan if need is None else need for need in needs], dtype=np.float64)
    second = antenna.diversity
    weaker: Floats | float = 0.0
    if second is not None and gain_dbi is not None:
        other_gain = gain_dbi if second.gain_dbi is None else second.gain_dbi
        other_line = line_loss_db if second.feeder_loss_db is None else second.feeder_loss_db
        weaker = (gain_dbi - line_loss_db) - (other_gain - other_line)
    return Receiver(
        width_hz=np.array([0.0 if one is None else one.width_hz for one in signatures], dtype=np.float64),
        depth_db=np.array([0.0 if one is None else one.depth_db for one in signatures], dtype=np.float64),
        delay_s=np.array([6.3e-9 if one is None else one.delay_s for one in signatures], dtype=np.float64),
        required_ratio_db=ratios,
        cross=cross,
        second=second,
        level_difference_db=weaker,
    )
