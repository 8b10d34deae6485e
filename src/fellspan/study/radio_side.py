"""The radio side of a study file: tables become radios, lines, noise floors, climate and power rules.

What cannot be raises the engine's own error, which names the thing; gathering the problems is `assembling`'s work.
"""

from dataclasses import replace
from pathlib import Path
from typing import Literal

from fellspan.climate.given import GivenClimate
from fellspan.errors import RuleError
from fellspan.links.feeders import Feeder
from fellspan.links.radio import CoChannel, Modulation, Radio, Signature
from fellspan.links.rule_types import PowerRule
from fellspan.links.rules import find_rule, load_rules
from fellspan.links.site import Antenna, Channel, Diversity, NoiseFloor, Sway
from fellspan.study.schema import (
    ClimateTable,
    CoChannelTable,
    DiversityTable,
    FeederTable,
    LinkTable,
    ModulationTable,
    RadioTable,
    SiteTable,
    SwayTable,
)


def radio_of(table: RadioTable, *, high_end: Literal["a", "b"] | None = None) -> Radio:
    """The radio of a table; where a link names the end with the higher frequency, the pair is turned so.

    Raises
    ------
    LinkError
        The radio cannot be, or a high end is named and there is no pair.
    """
    pair = table.transmit_a, table.transmit_b
    if high_end is not None and pair[0] is not None and pair[1] is not None:
        low, high = sorted((pair[0], pair[1]))
        pair = (high, low) if high_end == "a" else (low, high)
    return Radio(
        name=table.name,
        frequency_hz=table.frequency,
        power_dbm=table.power,
        threshold_dbm=table.threshold,
        polarization=table.polarization,
        bandwidth_hz=table.channel_width,
        emission_class=table.emission,
        power_per_chain_dbm=table.power_per_chain,
        chains=table.chains,
        dual_polarization=table.dual_polarization,
        co_channel=None if table.co_channel is None else _co_channel(table.co_channel),
        power_control_db=table.power_control,
        duplex=table.duplex,
        synchronised=table.synchronised,
        frequency_a_hz=pair[0],
        frequency_b_hz=pair[1],
        usable_share=table.usable_share,
        greatest_distance_m=table.greatest_distance,
        modulations=tuple(_modulation(row) for row in table.modulation),
        wanted=table.wanted,
        noise_figure_db=table.noise_figure,
        implementation_loss_db=table.implementation_loss,
    )


def _co_channel(table: CoChannelTable) -> CoChannel:
    return CoChannel(
        canceller_db=table.canceller,
        required_ratio_db=table.required_ratio,
        antenna_discrimination_db=table.discrimination,
    )


def _modulation(table: ModulationTable) -> Modulation:
    signature = table.signature
    return Modulation(
        name=table.name,
        threshold_dbm=table.threshold,
        throughput_bps=table.throughput,
        power_dbm=table.power,
        snr_db=table.snr,
        signature=None
        if signature is None
        else Signature(width_hz=signature.width, depth_db=signature.depth, delay_s=signature.delay),
    )


def with_line(antenna: Antenna, link: LinkTable, *, end: Literal["a", "b"]) -> Antenna:
    """An antenna with what its link states of the line, radome, mast and second antenna at that end."""
    at_a = end == "a"
    feeder = link.feeder_a if at_a else link.feeder_b
    sway = link.sway_a if at_a else link.sway_b
    second = link.diversity_a if at_a else link.diversity_b
    return replace(
        antenna,
        feeder=None if feeder is None else _feeder(feeder),
        branching_loss_db=link.branching_loss_a if at_a else link.branching_loss_b,
        radome_wet_db=link.radome_wet_a if at_a else link.radome_wet_b,
        radome_iced_db=link.radome_iced_a if at_a else link.radome_iced_b,
        sway=None if sway is None else _sway(sway),
        diversity=None if second is None else _diversity(second),
    )


def _feeder(table: FeederTable) -> Feeder:
    return Feeder(kind=table.kind, length_m=table.length, db_per_100_m=table.loss)


def _sway(table: SwayTable) -> Sway:
    return Sway(
        azimuth_sigma_deg=table.azimuth,
        elevation_sigma_deg=table.elevation,
        azimuth_offset_deg=table.azimuth_offset,
        elevation_offset_deg=table.elevation_offset,
    )


def _diversity(table: DiversityTable) -> Diversity:
    return Diversity(spacing_m=table.spacing, gain_dbi=table.gain, feeder_loss_db=table.feeder_loss)


def noise_floors(table: SiteTable) -> tuple[NoiseFloor, ...]:
    """What a survey heard at a site."""
    return tuple(
        NoiseFloor(
            level_dbm=row.level,
            bandwidth_hz=row.width,
            bearing_deg=row.bearing,
            width_deg=row.sector,
            low_hz=row.low,
            high_hz=row.high,
        )
        for row in table.noise_floor
    )


def unusable_channels(table: SiteTable) -> tuple[Channel, ...]:
    """Stretches of spectrum that a site cannot use."""
    return tuple(Channel(low_hz=row.low, high_hz=row.high, reason=row.reason) for row in table.unusable)


def climate_of(table: ClimateTable) -> GivenClimate:
    """What the study gives of the climate.

    Raises
    ------
    QuantityError
        A figure is outside what there is on Earth, or one list of months lacks the other.
    """
    return GivenClimate(
        rain_rate_001_mm_h=table.rain_rate,
        monthly_rain_mm=table.monthly_rain,
        monthly_temperature_c=table.monthly_temperature,
        dn1_n_per_km=table.dn1,
        dn75=table.dn75,
        log_k=table.log_k,
        terrain_roughness_m=table.terrain_roughness,
        gradient_median_n_per_km=table.gradient_median,
        gradient_tail_n_per_km=table.gradient_tail,
        temperature_c=table.temperature,
        total_pressure_hpa=table.pressure,
        vapour_g_m3=table.vapour,
        rain_height_m=table.rain_height,
        altitude_m=table.altitude,
    )


class PowerRules:
    """The power rules that links may name: those that come with Fellspan and a file of the user's, read when first asked."""

    def __init__(self, file: Path | None) -> None:
        self.file = file
        self._rows: tuple[PowerRule, ...] | None = None

    def read(self) -> tuple[PowerRule, ...]:
        """All rows; raises a RuleError where the user's file cannot be used."""
        if self._rows is None:
            if self.file is not None and not self.file.exists():
                raise RuleError(
                    f"there is no file '{self.file.name}'",
                    f"looked for at {self.file.absolute()}",
                    "paths are relative to the study file",
                )
            self._rows = load_rules(self.file)
        return self._rows

    def find(self, rule_id: str) -> PowerRule:
        """The row of an id; raises a RuleError where there is none."""
        return find_rule(rule_id, self.read())
