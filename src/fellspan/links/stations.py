"""Stations: each end of each link as something that transmits and receives, for the study of neighbours.

Takes links and their results; knows no terrain and no levels between stations.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.antennas.mounting import Mounting
from fellspan.links.antenna_gains import ASSUMED_DISCRIMINATION_DB, gains_toward_db, is_omni, mounted
from fellspan.links.budget import line_loss_db
from fellspan.links.radio import Radio
from fellspan.links.receivers import noise_dbm, row_power_dbm, rows_of
from fellspan.links.result import LinkResult
from fellspan.links.site import Aim, Antenna, Link, Site
from fellspan.propagation.constants import SPEED_OF_LIGHT_M_S

Floats = NDArray[np.float64]

SAME_FREQUENCY: Final = 1e-5
"""Where a channel width is unknown, channels are one if their frequencies differ by no more than this share (our own rule)."""
SAME_HEIGHT_M: Final = 0.01


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Station:
    """One end of a link; levels None where unknown. `gases_db_per_m` is that of its own link's path."""

    number: int
    link: str
    end: str
    site: Site
    amsl_m: float
    antenna: Antenna
    mounting: Mounting
    radio: Radio
    transmit_hz: float
    receive_hz: float
    power_dbm: float | None
    transmit_line_db: float
    receive_line_db: float
    carrier_dbm: float | None
    margin_db: float | None
    noise_dbm: float | None
    gases_db_per_m: float

    @property
    def has_gain(self) -> bool:
        """Whether anything is known of the antenna."""
        return self.antenna.peak_gain_dbi is not None

    @property
    def far_field_m(self) -> float:
        """From where its pattern holds, m; 0 where no pattern is known."""
        return 0.0 if self.antenna.pattern is None else self.antenna.pattern.far_field_m

    @property
    def size_m(self) -> float:
        """Largest dimension of the antenna, m; 0 where no pattern is known."""
        return 0.0 if self.antenna.pattern is None else self.antenna.pattern.size_m

    @property
    def wavelength_m(self) -> float:
        """The longer one of what it sends and receives, m."""
        return SPEED_OF_LIGHT_M_S / min(self.transmit_hz, self.receive_hz)

    def gains_toward(self, bearing_deg: Floats, elevation_deg: Floats) -> tuple[Floats, Floats]:
        """Co-polar gain, dBi, and how far the cross-polar one lies below it, dB, toward true directions, shape (m,).

        Of an antenna of which only the gain is known, that is its gain in any direction: the worst case.
        """
        pattern = self.antenna.pattern
        if pattern is None:
            gain = self.antenna.gain_dbi
            assert gain is not None
            return np.full(bearing_deg.shape, gain), np.full(bearing_deg.shape, ASSUMED_DISCRIMINATION_DB)
        return gains_toward_db(pattern, self.mounting, bearing_deg, elevation_deg)


def stations_of(planned: Iterable[tuple[Link, LinkResult]]) -> list[Station]:
    """Both ends of every link, A first, numbered from 0."""
    return [
        _station(2 * number + (end == "B"), link, result, end)
        for number, (link, result) in enumerate(planned)
        for end in ("A", "B")
    ]


def _station(number: int, link: Link, result: LinkResult, end: str) -> Station:
    at_a, radio = end == "A", link.radio
    antenna = link.antenna_a if at_a else link.antenna_b
    sent = radio.transmit_hz
    transmit_hz, receive_hz = sent if at_a else sent[::-1]
    toward = (
        (result.bearing_ab_deg, result.tilt_ab_deg) if at_a else (result.bearing_ba_deg, result.tilt_ba_deg)
    )  # of the other end
    gases = result.losses_db.gases
    return Station(
        number=number,
        link=link.name,
        end=end,
        site=link.a if at_a else link.b,
        amsl_m=(result.ends.a if at_a else result.ends.b).antenna_amsl_m,
        antenna=antenna,
        mounting=mounted(antenna, bearing_deg=toward[0], tilt_deg=toward[1], polarization=radio.polarization),
        radio=radio,
        transmit_hz=transmit_hz,
        receive_hz=receive_hz,
        power_dbm=_greatest_power_dbm(radio),
        transmit_line_db=_line_db(antenna, transmit_hz),
        receive_line_db=_line_db(antenna, receive_hz),
        carrier_dbm=result.received_dbm.at_a if at_a else result.received_dbm.at_b,
        margin_db=result.margin_db.at_a if at_a else result.margin_db.at_b,
        noise_dbm=_noise_dbm(radio, result, at_a=at_a),
        gases_db_per_m=0.0 if gases is None else gases / result.distance_m,
    )


def _line_db(antenna: Antenna, frequency_hz: float) -> float:
    return antenna.branching_loss_db + line_loss_db(antenna, frequency_hz=frequency_hz)


def _greatest_power_dbm(radio: Radio) -> float | None:
    powers = [row_power_dbm(radio, row) for row in rows_of(radio)] or [radio.power_dbm]
    return max((power for power in powers if power is not None), default=None)


def _noise_dbm(radio: Radio, result: LinkResult, *, at_a: bool) -> float | None:
    """The receiver's own noise, with the noise floor that its site states where the signal counted one."""
    own = noise_dbm(radio)
    if own is None or result.signal is None:
        return own
    return own + (result.signal.b_to_a if at_a else result.signal.a_to_b).threshold_degradation_db


def overlap_db(
    sent_hz: float, sent_width_hz: float | None, heard_hz: float, heard_width_hz: float | None
) -> float | None:
    """Share of what is sent that falls into the receiver's channel, dB, 0 or less; None where nothing does.

    Parameters
    ----------
    sent_hz, sent_width_hz
        Centre and channel width of the transmitter, Hz; None where the width is unknown.
    heard_hz, heard_width_hz
        Those of the receiver.

    Notes
    -----
    Our own rule: the spectrum is flat over its channel and nothing outside it, and the receiver takes its channel and nothing
    more. Where a width is unknown, channels are one if the frequencies agree to `SAME_FREQUENCY`, else apart.
    """
    if sent_width_hz is None or heard_width_hz is None:
        return 0.0 if abs(sent_hz - heard_hz) <= SAME_FREQUENCY * max(sent_hz, heard_hz) else None
    low = max(sent_hz - sent_width_hz / 2.0, heard_hz - heard_width_hz / 2.0)
    high = min(sent_hz + sent_width_hz / 2.0, heard_hz + heard_width_hz / 2.0)
    # Channels side by side touch but for rounding.
    if high - low <= 1e-9 * heard_hz:
        return None
    return float(10.0 * np.log10(min((high - low) / sent_width_hz, 1.0)))


def share_a_sector(one: Station, other: Station) -> bool:
    """Whether two links hang on one antenna with one radio, which serves them in turn.

    One site and height, one kind of antenna mounted alike, one transmit frequency; and an antenna that is not aimed at the far
    end of its link: it has a bearing of its own, or is an omni. Heights are one if they were typed alike or come to one level:
    a roof read from an outline stands on the highest ground under each link's own path, so its level is not one on all.
    """
    return (
        one.link != other.link
        and one.site.name == other.site.name
        and one.site.position == other.site.position
        and (_typed(one.site) == _typed(other.site) or abs(one.amsl_m - other.amsl_m) <= SAME_HEIGHT_M)
        and one.transmit_hz == other.transmit_hz
        and (one.antenna.name, one.antenna.gain_dbi, one.antenna.origin, one.antenna.mounting)
        == (other.antenna.name, other.antenna.gain_dbi, other.antenna.origin, other.antenna.mounting)
        and _hangs_for_good(one.antenna)
    )


def _typed(site: Site) -> tuple[float, str, float | None, float | None]:
    """The height as it was given, before any path was looked at."""
    return site.height_m, site.height_reference, site.roof_m, site.ground_amsl_m


def _hangs_for_good(antenna: Antenna) -> bool:
    stated = antenna.mounting
    if isinstance(stated, Mounting) or (isinstance(stated, Aim) and stated.bearing_deg is not None):
        return True
    return is_omni(antenna.pattern)
