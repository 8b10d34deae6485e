"""Feeders: what a run of coaxial cable or waveguide of a common class loses. Knows no makers, antennas or links."""

import math
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

from fellspan.errors import LinkError
from fellspan.vocabulary import FeederKind


@dataclass(frozen=True, slots=True, kw_only=True)
class FeederClass:
    """A class of line: dB per 100 m = `root` sqrt(f) + `linear` f with f in GHz, between the frequencies that it is used at."""

    title: str
    root: float
    linear: float
    low_hz: float
    high_hz: float


FEEDER_CLASSES: Final[Mapping[FeederKind, FeederClass]] = MappingProxyType(
    {
        "coaxial 6 mm": FeederClass(title="coaxial, 6 mm", root=30.0, linear=3.0, low_hz=0.0, high_hz=6e9),
        "coaxial 10 mm": FeederClass(title="coaxial, 10 mm", root=12.4, linear=1.0, low_hz=0.0, high_hz=8e9),
        "coaxial 13 mm": FeederClass(title='coaxial, 1/2"', root=6.8, linear=0.5, low_hz=0.0, high_hz=8.8e9),
        "coaxial 22 mm": FeederClass(title='coaxial, 7/8"', root=3.6, linear=0.3, low_hz=0.0, high_hz=5e9),
        "coaxial 28 mm": FeederClass(title='coaxial, 1 1/4"', root=2.6, linear=0.3, low_hz=0.0, high_hz=3.3e9),
        "coaxial 41 mm": FeederClass(title='coaxial, 1 5/8"', root=2.1, linear=0.3, low_hz=0.0, high_hz=2.5e9),
        "waveguide 6 GHz": FeederClass(title="waveguide, 6 GHz", root=1.65, linear=0.0, low_hz=5.6e9, high_hz=7.2e9),
        "waveguide 8 GHz": FeederClass(title="waveguide, 8 GHz", root=2.0, linear=0.0, low_hz=7.1e9, high_hz=8.6e9),
        "waveguide 11 GHz": FeederClass(title="waveguide, 11 GHz", root=2.9, linear=0.0, low_hz=10e9, high_hz=11.8e9),
        "waveguide 13 GHz": FeederClass(title="waveguide, 13 GHz", root=3.4, linear=0.0, low_hz=11.7e9, high_hz=13.3e9),
        "waveguide 18 GHz": FeederClass(title="waveguide, 18 GHz", root=4.6, linear=0.0, low_hz=17.3e9, high_hz=19.8e9),
        "waveguide 23 GHz": FeederClass(title="waveguide, 23 GHz", root=5.8, linear=0.0, low_hz=21.2e9, high_hz=23.7e9),
    }
)  # fmt: skip
"""Typical values of each class, rounded, from memory: common practice, no source. A data sheet goes before them."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Feeder:
    """A run of line between radio and antenna: its class and length, m; connectors are counted in `Antenna.feeder_loss_db`.

    `db_per_100_m` of the data sheet at the frequency of the link replaces the class's own figure.
    """

    kind: FeederKind
    length_m: float
    db_per_100_m: float | None = None

    def __post_init__(self) -> None:
        if not (math.isfinite(self.length_m) and self.length_m >= 0.0):
            raise LinkError(f"feeder '{self.kind}': length {self.length_m:g} m must be 0 m or more")
        each = self.db_per_100_m
        if each is not None and not (math.isfinite(each) and each >= 0.0):
            raise LinkError(f"feeder '{self.kind}': {each:g} dB per 100 m must be 0 dB or more")


def feeder_db_per_100_m(kind: FeederKind, *, frequency_hz: float) -> float:
    """Loss of a class of line, dB per 100 m, by a sqrt(f) + b f; used as it stands outside the frequencies of the class.

    Skin effect goes with the root of the frequency, the dielectric with the frequency. Common practice, no source.
    """
    line, ghz = FEEDER_CLASSES[kind], frequency_hz / 1e9
    return line.root * math.sqrt(ghz) + line.linear * ghz


def feeder_run_loss_db(feeder: Feeder, *, frequency_hz: float) -> float:
    """Loss of a run of line, dB, without connectors."""
    each = feeder.db_per_100_m
    if each is None:
        each = feeder_db_per_100_m(feeder.kind, frequency_hz=frequency_hz)
    return each * feeder.length_m / 100.0


def feeder_caution(feeder: Feeder, *, frequency_hz: float) -> str | None:
    """What to doubt of a run of line at a frequency; None where nothing is."""
    line = FEEDER_CLASSES[feeder.kind]
    if feeder.db_per_100_m is not None or line.low_hz <= frequency_hz <= line.high_hz:
        return None
    span = (
        f"{line.low_hz / 1e9:g} to {line.high_hz / 1e9:g} GHz" if line.low_hz else f"up to {line.high_hz / 1e9:g} GHz"
    )
    return f"Feeder '{feeder.kind}' is used {span}, not at {frequency_hz / 1e9:.4g} GHz: check its data sheet."
