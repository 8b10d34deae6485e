"""What links of one study do to each other, as frozen data for `results.json`: numbers and sentences only.

Numbers that are infinite, undefined or not computed are None.
"""

from dataclasses import dataclass
from typing import Literal

PathStatus = Literal["terrain", "same site", "no terrain", "free space"]
"""How the path between two antennas was counted: over the terrain; too short for terrain; free space alone because the terrain
has a gap there; free space alone because there are too many paths."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Interferer:
    """A transmitter of another link, as one receiver hears it.

    Parameters
    ----------
    link, site, end
        The link that it serves, where it stands, and which end of that link it is, 'A' or 'B'.
    level_dbm
        Within the receiver's channel, at its port, dBm.
    c_i_db
        Carrier over this interferer alone, dB; None where the carrier is unknown.
    frequency_hz, power_dbm
        What it sends: centre, Hz, and greatest total power, dBm.
    overlap_db
        Share of its power that falls into the receiver's channel, dB, 0 or less.
    transmit_gain_dbi, receive_gain_dbi
        Co-polar gains of both antennas toward each other, dBi.
    polarization_db
        Loss from polarizations that differ, dB; below 0 where the leaks into the other polarization carry more.
    line_db
        Feeders and branching of both ends, dB.
    free_space_db, diffraction_db, gases_db
        Losses of the path, dB; None for `diffraction_db` where no terrain was counted.
    distance_m
        Between the antennas, m.
    bearing_deg, elevation_deg
        From the receiver to it: true bearing, and elevation at the median k, degrees.
    path
        How the path was counted.
    patterns_hold
        False where the two stand within the far-field distance of either antenna: the level is a rough figure.
    """

    link: str
    site: str
    end: str
    level_dbm: float
    c_i_db: float | None
    frequency_hz: float
    power_dbm: float
    overlap_db: float
    transmit_gain_dbi: float
    receive_gain_dbi: float
    polarization_db: float
    line_db: float
    free_space_db: float
    diffraction_db: float | None
    gases_db: float
    distance_m: float
    bearing_deg: float
    elevation_deg: float
    path: PathStatus
    patterns_hold: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class InterferenceResult:
    """What one receiver hears of other links.

    `interferers` are the strongest, the strongest first; `weaker` counts those that are in the sum and not listed. `noise_dbm`
    is the receiver's own noise with the noise floor stated for its site; None where no channel width is known, and then so is
    `threshold_degradation_db`. `effective_margin_db` is the margin less that.
    """

    link: str
    site: str
    end: str
    frequency_hz: float
    carrier_dbm: float | None
    noise_dbm: float | None
    noise_figure_is_assumed: bool
    interferers: tuple[Interferer, ...]
    weaker: int
    interference_dbm: float | None
    """Sum of powers; None where there is none."""
    c_i_db: float | None
    """Carrier over the sum."""
    threshold_degradation_db: float | None
    margin_db: float | None
    effective_margin_db: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class HighLowConflict:
    """At one site `high_link` transmits in the half of a band in which `low_link` receives, and the other way round."""

    site: str
    high_link: str
    low_link: str
    high_hz: float
    """What `high_link` transmits here, Hz."""
    low_hz: float
    """What `low_link` transmits here, Hz."""
    distance_m: float


@dataclass(frozen=True, slots=True, kw_only=True)
class NearAntennas:
    """Two antennas of a site nearer to each other than the distance from which their patterns hold.

    `keep_m` is the separation to keep; `is_close` says that they are nearer than that.
    """

    site: str
    other_site: str
    link: str
    other_link: str
    distance_m: float
    far_field_m: float
    keep_m: float
    is_close: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class StudyInterference:
    """Links of a study as neighbours: one result for each receiver that was looked at, the worst first."""

    receivers: tuple[InterferenceResult, ...]
    worst: str | None
    """The worst pair in a sentence; None where no link hears another."""
    high_low: tuple[HighLowConflict, ...]
    near: tuple[NearAntennas, ...]
    warnings: tuple[str, ...]
    """High/low conflicts and antennas too near each other, in sentences."""
    notes: tuple[str, ...]
    """Rules and what was not counted."""

    def at(self, link: str) -> tuple[InterferenceResult, ...]:
        """Receivers of one link, A first."""
        return tuple(sorted((one for one in self.receivers if one.link == link), key=lambda one: one.end))
