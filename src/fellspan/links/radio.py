"""Radio: what transmits and receives at both ends of a link, with its modulations. Knows no sites, antennas or paths."""

import math
from dataclasses import dataclass
from typing import Final

from fellspan.errors import LinkError, QuantityError
from fellspan.links.emission import class_of_emission, necessary_bandwidth
from fellspan.vocabulary import Duplex, Polarization

SAME_POWER_DB: Final = 0.05
"""Total power and power per chain that differ by more than this contradict each other."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Signature:
    """How a receiver stands an echo: width of the notch it loses, Hz, depth, dB, and the delay it was measured at, s."""

    width_hz: float
    depth_db: float
    delay_s: float = 6.3e-9

    def __post_init__(self) -> None:
        if not (math.isfinite(self.width_hz) and self.width_hz > 0.0):
            raise LinkError(f"signature: width {self.width_hz:g} Hz must be above 0")
        if not (math.isfinite(self.depth_db) and self.depth_db >= 0.0):
            raise LinkError(f"signature: depth {self.depth_db:g} dB must be 0 or more")
        if not (math.isfinite(self.delay_s) and self.delay_s > 0.0):
            raise LinkError(f"signature: delay {self.delay_s:g} s must be above 0", "6.3e-9 (6.3 ns) is usual")


@dataclass(frozen=True, slots=True, kw_only=True)
class Modulation:
    """One row of a radio's table.

    Parameters
    ----------
    name
        As the data sheet calls it: '64-QAM 5/6', 'index 7'.
    threshold_dbm
        Received level it needs, dBm, both chains together as the data sheet states it; None where it follows from the radio's
        noise figure and `snr_db`.
    throughput_bps
        Rate over the air at the full channel width, bit/s; None where unknown.
    power_dbm
        Greatest total power at this modulation, dBm; None where it is the radio's.
    snr_db
        Signal-to-noise ratio it needs, dB; None where unknown.
    signature
        For selective fading; None where unknown: then only flat fading is counted.
    """

    name: str
    threshold_dbm: float | None = None
    throughput_bps: float | None = None
    power_dbm: float | None = None
    snr_db: float | None = None
    signature: Signature | None = None

    def __post_init__(self) -> None:
        rate = self.throughput_bps
        if rate is not None and not (math.isfinite(rate) and rate > 0.0):
            raise LinkError(f"modulation '{self.name}': {rate:g} bit/s must be above 0")
        for label, value in (
            ("threshold", self.threshold_dbm),
            ("power", self.power_dbm),
            ("signal-to-noise ratio", self.snr_db),
        ):
            if value is not None and not math.isfinite(value):
                raise LinkError(f"modulation '{self.name}': {label} {value:g} must be a number")


@dataclass(frozen=True, slots=True, kw_only=True)
class CoChannel:
    """Two different streams on both polarizations of one channel, which cross polarization can spoil.

    Parameters
    ----------
    canceller_db
        What the canceller of cross polarization improves, dB; 0 without one.
    required_ratio_db
        Carrier to interference that the receiver needs, dB; None takes the `snr_db` of the modulation.
    antenna_discrimination_db
        Cross-polar discrimination of the antennas toward each other, dB; None takes what their patterns say.
    """

    canceller_db: float = 0.0
    required_ratio_db: float | None = None
    antenna_discrimination_db: float | None = None

    def __post_init__(self) -> None:
        if not (math.isfinite(self.canceller_db) and self.canceller_db >= 0.0):
            raise LinkError(f"cross-polar canceller: {self.canceller_db:g} dB must be 0 or more")


@dataclass(frozen=True, slots=True, kw_only=True)
class Radio:
    """The radio at both ends of a link.

    Parameters
    ----------
    frequency_hz
        Carrier, Hz, > 0; zones and the drawing go by it. With a pair of frequencies it lies within the pair.
    power_dbm
        Total transmit power of all chains at the antenna port, dBm; None where unknown: then no level is computed. Worked out
        where `power_per_chain_dbm` is given instead.
    threshold_dbm
        Received level that the wanted modulation needs, dBm, where no `modulations` are listed; None where unknown: then no
        margin is computed.
    polarization
        'horizontal' or 'vertical'.
    bandwidth_hz
        Width of the channel, Hz, > 0; None where unknown: then no limit of power density is held against it, and thresholds do
        not follow from noise.
    emission_class
        Class of emission of the ITU Radio Regulations, Appendix 1, such as 'D7W'; None where unknown.
    power_per_chain_dbm, chains
        Power of each transmit chain, dBm, and their number.
    dual_polarization
        The chains use two polarizations at once.
    co_channel
        Where these carry different streams on one channel and cross-polar outage is to be counted.
    power_control_db
        How far the radio can lower its power by itself, dB; 0 where it cannot. Levels are at full power.
    duplex
        'time': both directions on one frequency; 'frequency': on two.
    synchronised
        With 'time': links that meet at a site, all of them so, send from there at the same moments, and listen alike.
    frequency_a_hz, frequency_b_hz
        Transmitted by A and by B, Hz; both, for 'frequency'. The end with the higher one is the high end.
    usable_share
        Share of the rate over the air that users get, above 0, at most 1.
    greatest_distance_m
        Longest path that the radio's timing allows, m; None where unknown.
    modulations
        From the most robust to the fastest, in any order; sorted by threshold when used.
    wanted
        Name of the modulation that margin and target apply to; None is the most robust.
    noise_figure_db, implementation_loss_db
        Of the receiver, dB: thresholds of modulations that state only a signal-to-noise ratio follow from them.

    Raises
    ------
    LinkError
        A value cannot be, or two of them contradict each other.
    """

    frequency_hz: float
    power_dbm: float | None = None
    threshold_dbm: float | None = None
    polarization: Polarization = "vertical"
    name: str = "radio"
    bandwidth_hz: float | None = None
    emission_class: str | None = None
    power_per_chain_dbm: float | None = None
    chains: int = 1
    dual_polarization: bool = False
    co_channel: CoChannel | None = None
    power_control_db: float = 0.0
    duplex: Duplex = "time"
    synchronised: bool = False
    frequency_a_hz: float | None = None
    frequency_b_hz: float | None = None
    usable_share: float = 1.0
    greatest_distance_m: float | None = None
    modulations: tuple[Modulation, ...] = ()
    wanted: str | None = None
    noise_figure_db: float | None = None
    implementation_loss_db: float = 0.0

    def __post_init__(self) -> None:
        self._check_frequencies()
        try:
            if self.bandwidth_hz is not None:
                necessary_bandwidth(self.bandwidth_hz)
            if self.emission_class is not None:
                class_of_emission(self.emission_class)
        except QuantityError as error:
            raise LinkError(f"radio '{self.name}': {error.what}", *error.details) from None
        self._check_numbers()
        self._set_power()
        self._check_modulations()

    @property
    def transmit_hz(self) -> tuple[float, float]:
        """Frequency that A and that B transmits on, Hz."""
        if self.frequency_a_hz is None or self.frequency_b_hz is None:
            return self.frequency_hz, self.frequency_hz
        return self.frequency_a_hz, self.frequency_b_hz

    @property
    def shares_frequency(self) -> bool:
        """Whether both directions use one frequency, and so fade together."""
        one, other = self.transmit_hz
        return one == other

    @property
    def high_end(self) -> str | None:
        """'A' or 'B', the end that transmits on the higher frequency; None where there is one frequency."""
        one, other = self.transmit_hz
        return None if one == other else ("A" if one > other else "B")

    def _refuse(self, what: str, *details: str) -> LinkError:
        return LinkError(f"radio '{self.name}': {what}", *details)

    def _check_frequencies(self) -> None:
        pair = self.frequency_a_hz, self.frequency_b_hz
        for frequency in (self.frequency_hz, *pair):
            if frequency is not None and not (math.isfinite(frequency) and frequency > 0.0):
                raise self._refuse(f"frequency {frequency:g} Hz must be above 0")
        one, other = pair
        if self.duplex == "time" and (one is not None or other is not None):
            raise self._refuse("a transmit frequency of one end is given, but duplex is 'time'", "say 'frequency'")
        if self.duplex == "frequency":
            if self.synchronised:
                raise self._refuse(
                    "it is synchronised, but duplex is 'frequency'", "radios keep step in time division only"
                )
            if one is None or other is None:
                raise self._refuse("duplex is 'frequency' without a pair", "give the frequency that each end transmits")
            if not min(one, other) <= self.frequency_hz <= max(one, other):
                raise self._refuse(
                    f"frequency {self.frequency_hz / 1e9:g} GHz lies outside its pair",
                    f"the ends transmit on {one / 1e9:g} and {other / 1e9:g} GHz",
                )

    def _check_numbers(self) -> None:
        if not (math.isfinite(self.usable_share) and 0.0 < self.usable_share <= 1.0):
            raise self._refuse(f"usable share {self.usable_share:g} must be above 0 and at most 1", "0.5 for half")
        if self.chains < 1:
            raise self._refuse(f"{self.chains} chains: there must be 1 or more")
        distance = self.greatest_distance_m
        if distance is not None and not (math.isfinite(distance) and distance > 0.0):
            raise self._refuse(f"greatest distance {distance:g} m must be above 0")
        for label, value in (
            ("power control", self.power_control_db),
            ("noise figure", self.noise_figure_db),
            ("implementation loss", self.implementation_loss_db),
        ):
            if value is not None and not (math.isfinite(value) and value >= 0.0):
                raise self._refuse(f"{label} {value:g} dB must be 0 or more")

    def _set_power(self) -> None:
        each = self.power_per_chain_dbm
        if each is None:
            return
        total = each + 10.0 * math.log10(self.chains)
        if self.power_dbm is None:
            object.__setattr__(self, "power_dbm", total)
        elif abs(self.power_dbm - total) > SAME_POWER_DB:
            raise self._refuse(
                f"total power {self.power_dbm:g} dBm and {each:g} dBm from each of {self.chains} chains do not agree",
                f"{self.chains} such chains make {total:.1f} dBm; give one of the two",
            )

    def _check_modulations(self) -> None:
        names = [modulation.name for modulation in self.modulations]
        for name in names:
            if names.count(name) > 1:
                raise self._refuse(f"two modulations are called '{name}'", "give each a name of its own")
        for modulation in self.modulations:
            if modulation.threshold_dbm is not None:
                continue
            if modulation.snr_db is None or self.noise_figure_db is None or self.bandwidth_hz is None:
                raise self._refuse(
                    f"modulation '{modulation.name}' has no threshold and none can be worked out",
                    "give its threshold, or its signal-to-noise ratio with the radio's noise figure and channel width",
                )
        if self.wanted is not None and self.wanted not in names:
            raise self._refuse(
                f"the wanted modulation '{self.wanted}' is not in its table",
                f"there are: {', '.join(names) if names else 'none'}",
            )
