"""Sites, what was heard there, and links, as tables of a study file: names, types, allowed values, help.

Values are SI once read; nothing is looked up between tables here.
"""

from typing import Literal

from pydantic import Field, model_validator

from fellspan.study.fields import (
    AntennaHeight,
    Coordinate,
    Frequency,
    Length,
    Level,
    LevelAboveSea,
    Loss,
    Name,
    Number,
    Percent,
    Width,
)
from fellspan.study.schema_equipment import DiversityTable, FeederTable, SwayTable
from fellspan.study.table import Table


class NoiseFloorTable(Table):
    """[[site.noise_floor]]: noise and interference that a survey heard at the site."""

    level: Level = Field(description="Power in width, at the port of the radio.", examples=["-92 dBm"])
    width: Width | None = Field(
        default=None, description="Width that it was measured in; the channel's where not stated.", examples=["20 MHz"]
    )
    bearing: Number | None = Field(
        default=None, ge=0.0, le=360.0, description="True bearing that the antenna looked to, degrees.", examples=[120]
    )
    sector: Number = Field(
        default=90.0, gt=0.0, le=360.0, description="Width of the sector about bearing, degrees.", examples=[90]
    )
    low: Frequency | None = Field(default=None, description="From this frequency on.", examples=["5.725 GHz"])
    high: Frequency | None = Field(default=None, description="Up to this frequency.", examples=["5.85 GHz"])


class UnusableTable(Table):
    """[[site.unusable]]: a stretch of spectrum that the site cannot use."""

    low: Frequency = Field(description="From this frequency on.", examples=["5.6 GHz"])
    high: Frequency = Field(description="Up to this frequency.", examples=["5.65 GHz"])
    reason: str = Field(default="", max_length=200, description="Why.", examples=["weather radar"])

    @model_validator(mode="after")
    def _low_before_high(self) -> "UnusableTable":
        if self.low >= self.high:
            raise ValueError(f"low, {self.low / 1e9:g} GHz, is not below high, {self.high / 1e9:g} GHz")
        return self


class SiteTable(Table):
    """[[site]]: a place where an antenna stands."""

    name: Name = Field(description="How you call it.", examples=["North Light"])
    at: str | None = Field(default=None, min_length=1, description="Position.", examples=["36.04217 N, 45.19876 W"])
    latitude: Coordinate | None = Field(default=None, description="Latitude, degrees north.", examples=[36.04217])
    longitude: Coordinate | None = Field(default=None, description="Longitude, degrees east.", examples=[-45.19876])
    easting: Number | None = Field(
        default=None, description="Easting in the system that crs names.", examples=[482100.0]
    )
    northing: Number | None = Field(
        default=None, description="Northing in the system that crs names.", examples=[3988400.0]
    )
    crs: str | None = Field(
        default=None, min_length=1, description="Coordinate system of easting and northing.", examples=["EPSG:32623"]
    )
    height: AntennaHeight | None = Field(
        default=None, description="Height of the antenna and what it is measured from.", examples=["12 m above roof"]
    )
    roof: Length | None = Field(default=None, description="Height of the roof above ground.", examples=["8 m"])
    ground: LevelAboveSea | None = Field(
        default=None, description="Measured ground level above the datum.", examples=["23.4 m"]
    )
    datum: str | None = Field(
        default=None, description="Vertical datum of ground and of a height above sea.", examples=["EGM96"]
    )
    roof_edge: Length | None = Field(
        default=None, description="From the antenna to the roof edge, toward the link.", examples=["3 m"]
    )
    parapet: Length | None = Field(
        default=None, description="Height of the parapet above the roof.", examples=["1.1 m"]
    )

    noise_floor: tuple[NoiseFloorTable, ...] = Field(default=(), description="What a survey heard there.")
    unusable: tuple[UnusableTable, ...] = Field(default=(), description="Spectrum that cannot be used there.")

    @model_validator(mode="after")
    def _one_position(self) -> "SiteTable":
        ways = {
            "at": self.at is not None,
            "latitude and longitude": self.latitude is not None or self.longitude is not None,
            "easting and northing": self.easting is not None or self.northing is not None,
        }
        given = [way for way, is_given in ways.items() if is_given]
        if not given:
            raise ValueError('no position is given; add at = "36.04217 N, 45.19876 W"')
        if len(given) > 1:
            raise ValueError(f"the position is given as {' and as '.join(given)}; keep one of them")
        if given[0] == "latitude and longitude" and (self.latitude is None or self.longitude is None):
            raise ValueError(f"{'latitude' if self.latitude is None else 'longitude'} is missing beside the other")
        if given[0] == "easting and northing":
            if self.easting is None or self.northing is None:
                raise ValueError(f"{'easting' if self.easting is None else 'northing'} is missing beside the other")
            if self.crs is None:
                raise ValueError(
                    'easting and northing need their coordinate system; add crs = "EPSG:32623" or the like'
                )
        if given[0] == "latitude and longitude" and self.crs is not None:
            raise ValueError("crs belongs to easting and northing; latitude and longitude are WGS 84")
        return self


class LinkTable(Table):
    """[[link]]: two sites and what joins them."""

    name: Name = Field(description="How you call it.", examples=["Harbour - North Light"])
    a: Name = Field(description="Name of the site at end A.", examples=["Harbour"])
    b: Name = Field(description="Name of the site at end B.", examples=["North Light"])
    radio: Name = Field(description="Name of the radio.", examples=["5 GHz backhaul"])
    antenna: Name | None = Field(default=None, description="Name of the antenna at both ends.", examples=["0.6 m dish"])
    antenna_a: Name | None = Field(default=None, description="Name of the antenna at A.", examples=["0.6 m dish"])
    antenna_b: Name | None = Field(default=None, description="Name of the antenna at B.", examples=["0.6 m dish"])
    feeder_loss_a: Loss = Field(default=0.0, description="Loss of cable and connectors at A.", examples=["1.5 dB"])
    feeder_loss_b: Loss = Field(default=0.0, description="Loss of cable and connectors at B.", examples=["1.5 dB"])
    wanted_margin: Loss = Field(default=10.0, description="Margin that the signal must have.", examples=["10 dB"])
    height_a: AntennaHeight | None = Field(
        default=None, description="Height at A for this link alone.", examples=["12 m above ground"]
    )
    height_b: AntennaHeight | None = Field(
        default=None, description="Height at B for this link alone.", examples=["12 m above ground"]
    )
    roof_edge_a: Length | None = Field(
        default=None, description="Roof edge at A for this link alone.", examples=["3 m"]
    )
    roof_edge_b: Length | None = Field(
        default=None, description="Roof edge at B for this link alone.", examples=["3 m"]
    )
    parapet_a: Length | None = Field(default=None, description="Parapet at A for this link alone.", examples=["1.1 m"])
    parapet_b: Length | None = Field(default=None, description="Parapet at B for this link alone.", examples=["1.1 m"])

    feeder_a: FeederTable | None = Field(
        default=None, description="Run of line at A; its loss is added to feeder_loss_a."
    )
    feeder_b: FeederTable | None = Field(
        default=None, description="Run of line at B; its loss is added to feeder_loss_b."
    )
    branching_loss_a: Loss = Field(default=0.0, description="Filters and couplers at A.", examples=["1 dB"])
    branching_loss_b: Loss = Field(default=0.0, description="Filters and couplers at B.", examples=["1 dB"])
    radome_wet_a: Loss = Field(default=0.0, description="What a wet radome costs at A.", examples=["1.5 dB"])
    radome_iced_a: Loss = Field(default=0.0, description="What an iced radome costs at A.", examples=["4 dB"])
    radome_wet_b: Loss = Field(default=0.0, description="What a wet radome costs at B.", examples=["1.5 dB"])
    radome_iced_b: Loss = Field(default=0.0, description="What an iced radome costs at B.", examples=["4 dB"])
    sway_a: SwayTable | None = Field(default=None, description="Errors of aim and sway at A.")
    sway_b: SwayTable | None = Field(default=None, description="Errors of aim and sway at B.")
    diversity_a: DiversityTable | None = Field(default=None, description="Second receiving antenna at A.")
    diversity_b: DiversityTable | None = Field(default=None, description="Second receiving antenna at B.")
    target_availability: Percent | None = Field(
        default=None,
        gt=0.0,
        lt=100.0,
        description="Share of the year for which each direction must carry the wanted modulation.",
        examples=["99.99 %"],
    )
    frequency: Frequency | None = Field(
        default=None, description="Channel of this link, where it is not the radio's.", examples=["5.745 GHz"]
    )
    high_end: Literal["a", "b"] | None = Field(
        default=None, description="End that transmits the higher frequency of the radio's pair, for this link."
    )
    rule: Name | None = Field(
        default=None, description="Power rule that the link goes by, for this link alone.", examples=["fcc-15.407-5g8"]
    )

    @model_validator(mode="after")
    def _ends_differ(self) -> "LinkTable":
        if self.a == self.b:
            raise ValueError(f"both ends are the site '{self.a}'; a link needs two sites")
        if self.antenna is not None and (self.antenna_a is not None or self.antenna_b is not None):
            raise ValueError("antenna is for both ends; use either antenna or antenna_a and antenna_b")
        return self
