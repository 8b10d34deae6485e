"""What a power rule is, as data: a row of the rule file in SI; knows nothing of files and judges no radio."""

import math
from dataclasses import dataclass
from typing import Literal

RuleStatus = Literal["rule text seen", "unconfirmed"]
"""Whether the text of the rule was read. An unconfirmed row never gives a number."""

RulePlace = Literal["anywhere", "fixed outdoors", "not fixed outdoors", "indoors"]
RuleUse = Literal["any", "fixed point-to-point"]
"""A row for any use is the plain limit of its band; one for fixed point-to-point may be kinder and asks for nothing else."""

MeasuredAt = Literal["conducted", "eirp"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Density:
    """A limit of power in any `per_hz` of the spectrum: `power_dbm` conducted at the port of the radio, or as EIRP."""

    power_dbm: float
    per_hz: float
    of: MeasuredAt


@dataclass(frozen=True, slots=True, kw_only=True)
class BackOff:
    """Conducted power goes down by `lower_by_db` for each `for_each_db` of antenna gain over `above_dbi`.

    With `density` the limits of conducted density go down alike.
    """

    above_dbi: float
    lower_by_db: float
    for_each_db: float
    density: bool = False

    def reduction_db(self, gain_dbi: float) -> float:
        """What an antenna of this gain costs, dB, >= 0."""
        return max(gain_dbi - self.above_dbi, 0.0) * self.lower_by_db / self.for_each_db


@dataclass(frozen=True, slots=True, kw_only=True)
class EirpFall:
    """EIRP goes down by `lower_by_db` for each `for_each_db` that the antenna stays under `below_dbi`, to a floor.

    `peak_floor_dbm` is the floor of the limit of peak EIRP, which goes down alike.
    """

    below_dbi: float
    lower_by_db: float
    for_each_db: float
    floor_dbm: float
    peak_floor_dbm: float | None = None

    def limit_dbm(self, limit_dbm: float, gain_dbi: float) -> float:
        """The limit that is left of `limit_dbm` with an antenna of this gain, dBm."""
        return self._fallen(limit_dbm, gain_dbi, self.floor_dbm)

    def peak_limit_dbm(self, limit_dbm: float, gain_dbi: float) -> float:
        """The same for the limit of peak EIRP, dBm."""
        floor = self.floor_dbm if self.peak_floor_dbm is None else self.peak_floor_dbm
        return self._fallen(limit_dbm, gain_dbi, floor)

    def _fallen(self, limit_dbm: float, gain_dbi: float, floor_dbm: float) -> float:
        short = max(self.below_dbi - gain_dbi, 0.0)
        return min(limit_dbm, max(limit_dbm - short * self.lower_by_db / self.for_each_db, floor_dbm))


@dataclass(frozen=True, slots=True, kw_only=True)
class PowerRule:
    """One row: what one paragraph allows in one band.

    Parameters
    ----------
    id
        How a study names the row.
    authority, region, title
        Who made the rule, where it holds, and what it is about.
    low_hz, high_hz
        The band; the whole channel must lie inside, ends included.
    citation, seen
        Document and paragraph, and the date or years in which its text was seen, or 'not seen'.
    status
        'rule text seen' or 'unconfirmed'.
    use, place
        For which use and place the row is.
    conditions
        What else the rule asks, in words; a machine does not check these.
    eirp_max_dbm, peak_eirp_max_dbm, conducted_max_dbm
        Limits of average EIRP, of peak EIRP and of power at the port of the radio, dBm; None where there is none.
    densities
        Limits of spectral density.
    back_off, eirp_fall
        How limits go down with the gain of the antenna.
    gain_min_dbi
        Least gain that the row asks for, dBi.
    origin
        Name of the file that holds the row.
    """

    id: str
    authority: str
    region: str
    title: str
    low_hz: float
    high_hz: float
    citation: str
    seen: str
    status: RuleStatus
    use: RuleUse = "any"
    place: RulePlace = "anywhere"
    conditions: tuple[str, ...] = ()
    eirp_max_dbm: float | None = None
    peak_eirp_max_dbm: float | None = None
    conducted_max_dbm: float | None = None
    densities: tuple[Density, ...] = ()
    back_off: BackOff | None = None
    eirp_fall: EirpFall | None = None
    gain_min_dbi: float | None = None
    origin: str = ""

    def holds_for(self, frequency_hz: float, bandwidth_hz: float = 0.0) -> bool:
        """Whether a whole channel lies in the band; its edges may touch those of the band (to 1 Hz)."""
        half = 0.5 * bandwidth_hz
        return (
            math.isfinite(frequency_hz)
            and frequency_hz - half >= self.low_hz - 1.0
            and frequency_hz + half <= self.high_hz + 1.0
        )

    @property
    def band_words(self) -> str:
        """The band for people: '2400 to 2483.5 MHz'."""
        return f"{self.low_hz / 1e6:.10g} to {self.high_hz / 1e6:.10g} MHz"
