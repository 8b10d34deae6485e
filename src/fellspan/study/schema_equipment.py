"""Radios, antennas and what lies between them, as tables of a study file: names, types, allowed values, help.

Values are SI once read; nothing is looked up between tables here.
"""

from pydantic import Field, model_validator

from fellspan.study.fields import (
    Delay,
    Frequency,
    Gain,
    Length,
    Loss,
    LossOfLine,
    Name,
    Number,
    Power,
    Rate,
    Share,
    Threshold,
    Width,
)
from fellspan.study.table import Table
from fellspan.vocabulary import Duplex, FeederKind, MountedPolarization, Polarization


class SignatureTable(Table):
    """signature of a modulation: how the receiver stands an echo."""

    width: Width = Field(description="Width of the notch that it loses.", examples=["30 MHz"])
    depth: Loss = Field(description="Depth of the notch.", examples=["25 dB"])
    delay: Delay = Field(default=6.3e-9, description="Delay that it was measured at.", examples=["6.3 ns"])


class ModulationTable(Table):
    """[[radio.modulation]]: one row of a radio's table."""

    name: Name = Field(description="As the data sheet calls it.", examples=["64-QAM 5/6"])
    threshold: Threshold | None = Field(default=None, description="Received level that it needs.", examples=["-72 dBm"])
    snr: Loss | None = Field(
        default=None, description="Signal-to-noise ratio that it needs, instead of threshold.", examples=["24 dB"]
    )
    throughput: Rate | None = Field(
        default=None, description="Rate over the air at the full channel width.", examples=["150 Mbit/s"]
    )
    power: Power | None = Field(
        default=None, description="Greatest total power at this modulation.", examples=["21 dBm"]
    )
    signature: SignatureTable | None = Field(default=None, description="For selective fading.")


class CoChannelTable(Table):
    """co_channel of a radio: two streams on both polarizations of one channel."""

    canceller: Loss = Field(
        default=0.0, description="What the canceller of cross polarization improves.", examples=["20 dB"]
    )
    required_ratio: Loss | None = Field(
        default=None, description="Carrier to interference that it needs.", examples=["24 dB"]
    )
    discrimination: Loss | None = Field(
        default=None, description="Cross-polar discrimination of the antennas toward each other.", examples=["30 dB"]
    )


class RadioTable(Table):
    """[[radio]]: the radio at both ends of a link."""

    name: Name = Field(description="How links call it.", examples=["5 GHz backhaul"])
    frequency: Frequency = Field(description="Carrier frequency.", examples=["5.8 GHz"])
    power: Power | None = Field(
        default=None, description="Transmit power at the antenna port, all chains together.", examples=["23 dBm"]
    )
    threshold: Threshold | None = Field(
        default=None,
        description="Received level that the radio needs, where no modulations are listed.",
        examples=["-75 dBm"],
    )
    polarization: Polarization = Field(default="vertical", description="Polarization of the wave.")
    channel_width: Width | None = Field(default=None, description="Width of the channel.", examples=["40 MHz"])
    emission: str | None = Field(
        default=None, min_length=3, max_length=5, description="Class of emission as ITU writes it.", examples=["D7W"]
    )
    power_per_chain: Power | None = Field(
        default=None, description="Power of each transmit chain, instead of power.", examples=["20 dBm"]
    )
    chains: int = Field(default=1, ge=1, le=64, description="Number of transmit chains.", examples=[2])
    dual_polarization: bool = Field(default=False, description="Whether the chains use two polarizations at once.")
    co_channel: CoChannelTable | None = Field(
        default=None, description="Where two streams share one channel and cross-polar outage is to be counted."
    )
    power_control: Loss = Field(
        default=0.0, description="How far the radio can lower its power by itself.", examples=["10 dB"]
    )
    duplex: Duplex = Field(default="time", description="Both directions on one frequency (time) or on two.")
    synchronised: bool = Field(
        default=False, description="In time division: links that meet at a site send from there at the same moments."
    )
    transmit_a: Frequency | None = Field(
        default=None, description="Frequency that A transmits on, with duplex by frequency.", examples=["11.2 GHz"]
    )
    transmit_b: Frequency | None = Field(
        default=None, description="Frequency that B transmits on, with duplex by frequency.", examples=["11.69 GHz"]
    )
    usable_share: Share = Field(
        default=1.0, description="Share of the rate over the air that users get.", examples=["55 %"]
    )
    greatest_distance: Length | None = Field(
        default=None, gt=0.0, description="Longest path that the timing of the radio allows.", examples=["20 km"]
    )
    noise_figure: Loss | None = Field(default=None, description="Noise figure of the receiver.", examples=["6 dB"])
    implementation_loss: Loss = Field(
        default=0.0, description="What the receiver needs beyond theory.", examples=["2 dB"]
    )
    modulation: tuple[ModulationTable, ...] = Field(default=(), description="Table of modulations.")
    wanted: Name | None = Field(
        default=None,
        description="Modulation that margin and target are for; the most robust where not stated.",
        examples=["64-QAM 5/6"],
    )


class FeederTable(Table):
    """feeder_a and feeder_b of a link: a run of line of a known class."""

    kind: FeederKind = Field(description="Class of the line.")
    length: Length = Field(description="Length of the run.", examples=["20 m"])
    loss: LossOfLine | None = Field(
        default=None, description="By its data sheet, instead of the typical loss.", examples=["6.5 dB per 100 m"]
    )


class SwayTable(Table):
    """sway_a and sway_b of a link: how far an antenna is off its aim, degrees."""

    azimuth: Number = Field(default=0.0, ge=0.0, le=45.0, description="Standard deviation in azimuth.", examples=[0.3])
    elevation: Number = Field(
        default=0.0, ge=0.0, le=45.0, description="Standard deviation in elevation.", examples=[0.3]
    )
    azimuth_offset: Number = Field(
        default=0.0, ge=-90.0, le=90.0, description="Steady error in azimuth.", examples=[0.2]
    )
    elevation_offset: Number = Field(
        default=0.0, ge=-90.0, le=90.0, description="Steady error in elevation.", examples=[0.2]
    )


class DiversityTable(Table):
    """diversity_a and diversity_b of a link: a second receiving antenna on the same mast."""

    spacing: Length = Field(gt=0.0, description="Height between the two antennas.", examples=["8 m"])
    gain: Gain | None = Field(
        default=None, description="Of the second, where it is not as the first.", examples=["29 dBi"]
    )
    feeder_loss: Loss | None = Field(
        default=None, description="Of the second, where it is not as the first.", examples=["2 dB"]
    )


class AntennasTable(Table):
    """[antennas]: where antennas are looked up."""

    catalogue: str | None = Field(
        default=None, min_length=1, description="File of antennas of your own.", examples=["own-antennas.toml"]
    )


class AntennaTable(Table):
    """[[antenna]]: an antenna, known by its gain alone, a model, a pattern file or data-sheet numbers; and its mounting."""

    name: Name = Field(description="How links call it.", examples=["0.6 m dish"])
    gain: Gain | None = Field(default=None, description="Gain at the maximum.", examples=["29 dBi"])
    model: Name | None = Field(default=None, description="Name in the catalogue.", examples=["dish 0.6 m"])
    pattern: str | None = Field(default=None, min_length=1, description="Pattern file.", examples=["sector.csv"])
    azimuth_width: Number | None = Field(
        default=None,
        gt=0.0,
        le=360.0,
        description="Half-power width in azimuth, degrees; 360 is an omni.",
        examples=[65],
    )
    elevation_width: Number | None = Field(
        default=None, gt=0.0, le=180.0, description="Half-power width in elevation, degrees.", examples=[7]
    )
    front_to_back: Loss | None = Field(
        default=None, description="Peak over the level behind; an omni has none.", examples=["28 dB"]
    )
    cross_polar: Loss | None = Field(default=None, description="Cross-polar discrimination.", examples=["25 dB"])
    bearing: Number | None = Field(
        default=None, ge=0.0, le=360.0, description="True bearing it points to, degrees.", examples=[120]
    )
    tilt: Number | None = Field(
        default=None, ge=-90.0, le=90.0, description="Tilt, degrees, up positive.", examples=[-3]
    )
    polarization: MountedPolarization | None = Field(default=None, description="How it is mounted.")
    roll: Number | None = Field(
        default=None, ge=-180.0, le=180.0, description="Turn about its boresight by mistake, degrees.", examples=[5]
    )

    @model_validator(mode="after")
    def _one_description(self) -> "AntennaTable":
        sheet = ("azimuth_width", "elevation_width", "front_to_back", "cross_polar")
        numbers = [key for key in ("gain", *sheet) if getattr(self, key) is not None]
        for key in ("model", "pattern"):
            if getattr(self, key) is not None and numbers:
                raise ValueError(f"{numbers[0]} is given beside {key}, which says it already; keep one of them")
        if self.model is not None and self.pattern is not None:
            raise ValueError("model and pattern are both given; keep one of them")
        if set(numbers) & set(sheet) and (self.gain is None or self.elevation_width is None):
            missing = "gain" if self.gain is None else "elevation_width"
            raise ValueError(f"{missing} is missing; a pattern from a data sheet needs gain and elevation_width")
        return self
