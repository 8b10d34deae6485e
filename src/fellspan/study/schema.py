"""The tables and keys of a study file, as pydantic models: names, types, allowed values, defaults, a line of help each.

Field names are the keys that a person types; values are SI once read. No file is opened here, and nothing is looked up
between tables: that is `reading`'s work.
"""

import datetime as dt
from typing import Annotated, Literal, TypeAlias

from pydantic import BaseModel, ConfigDict, Field, model_validator

from fellspan.study.fields import (
    AntennaHeight,
    Coordinate,
    Day,
    Frequency,
    Gain,
    Growth,
    InverseEarth,
    Length,
    Level,
    LevelAboveSea,
    Loss,
    Name,
    Number,
    OneOrMany,
    Power,
    Probability,
)
from fellspan.vocabulary import (
    CoverKind,
    CriteriaPreset,
    GapPolicy,
    LengthUnit,
    MountedPolarization,
    Polarization,
)

CompleteKind: TypeAlias = Literal["building", "tree"]
"""Kinds that a file of obstacles may hold all of."""


class Table(BaseModel):
    """Base of all tables: an unknown key is an error, a number is finite, values do not change once read."""

    model_config = ConfigDict(extra="forbid", frozen=True, allow_inf_nan=False, str_strip_whitespace=True)


class StudyTable(Table):
    """[study]: the stamp of the issue."""

    title: str = Field(default="Untitled study", max_length=200, description="Heading of every page.")
    planner: str = Field(default="", max_length=200, description="Who answers for the plan.")
    revision: str = Field(default="", max_length=60, description="Issue of the plan, as you count them.")
    date: Day = Field(
        default_factory=dt.date.today,
        description="Day of the issue; the magnetic bearing is for this day.",
        examples=["2026-05-01"],
    )
    growth_years: Number = Field(default=0.0, ge=0.0, le=100.0, description="How many years ahead trees are grown.")


class RasterTable(Table):
    """A raster of terrain.ground or terrain.surface, in full."""

    path: str = Field(min_length=1, description="File, folder of tiles or URL.", examples=["terrain/ground.tif"])
    unit: LengthUnit | None = Field(default=None, description="Vertical unit, where the file does not state it.")
    datum: str | None = Field(
        default=None, description="Vertical datum, where the file does not state it.", examples=["EGM96"]
    )
    error: Length | None = Field(default=None, description="One standard error of the heights.", examples=["1.5 m"])
    band: int = Field(default=1, ge=1, description="Band of the file, counted from 1.")


class CoverTable(Table):
    """A raster of heights above ground, all of one kind."""

    path: str = Field(min_length=1, description="File, folder of tiles or URL.", examples=["terrain/trees.tif"])
    kind: CoverKind = Field(default="other", description="What the cover is.")
    unit: LengthUnit | None = Field(default=None, description="Vertical unit, where the file does not state it.")
    error: Length | None = Field(default=None, description="One standard error of the heights.", examples=["2 m"])
    growth: Growth = Field(default=0.0, description="Growth per year.", examples=["0.3 m per year"])
    band: int = Field(default=1, ge=1, description="Band of the file, counted from 1.")


class ObstacleTable(Table):
    """A file of obstacles."""

    path: str = Field(min_length=1, description="CSV or GeoJSON file.", examples=["obstacles.csv"])
    complete: tuple[CompleteKind, ...] = Field(
        default=(),
        description="Kinds of which the file holds all that stand near the links.",
        examples=[["building"]],
    )


class FileTable(Table):
    """A file of surveyed points."""

    path: str = Field(min_length=1, description="CSV file.", examples=["survey.csv"])


class TerrainTable(Table):
    """[terrain]: what the ground is known from."""

    ground: Annotated[tuple[RasterTable, ...], OneOrMany(RasterTable)] = Field(
        default=(), description="Rasters of bare ground.", examples=["terrain/ground.tif"]
    )
    surface: Annotated[tuple[RasterTable, ...], OneOrMany(RasterTable)] = Field(
        default=(),
        description="Rasters of the first surface: roofs and treetops included.",
        examples=["terrain/surface.tif"],
    )
    cover: Annotated[tuple[CoverTable, ...], OneOrMany(CoverTable)] = Field(
        default=(), description="Rasters of heights above ground.", examples=["terrain/trees.tif"]
    )
    obstacles: Annotated[tuple[ObstacleTable, ...], OneOrMany(ObstacleTable)] = Field(
        default=(), description="Files of obstacles.", examples=["obstacles.csv"]
    )
    survey: Annotated[tuple[FileTable, ...], OneOrMany(FileTable)] = Field(
        default=(), description="Files of surveyed points and profiles.", examples=["survey.csv"]
    )
    gaps: GapPolicy = Field(default="error", description="What a gap in the rasters is: an error, or sea.")
    sea_level: LevelAboveSea = Field(default=0.0, description="Level of the sea in gaps.", examples=["0 m"])
    step: Length | None = Field(default=None, gt=0.0, description="Sampling step along a path.", examples=["5 m"])


class RuleTable(Table):
    """One clearance rule of your own: at this k, this fraction of the first Fresnel zone is clear."""

    name: Name = Field(description="How the rule is called on the pages.", examples=["60 % at k = 4/3"])
    k: InverseEarth = Field(description="Effective Earth radius factor; inf is a flat Earth.", examples=[1.333])
    fraction: Number = Field(ge=0.0, le=5.0, description="Fraction of the first Fresnel zone radius.", examples=[0.6])


class CriteriaTable(Table):
    """[criteria]: what 'clear' means."""

    preset: CriteriaPreset | None = Field(default=None, description="A named set of rules.")
    rules: tuple[RuleTable, ...] | None = Field(
        default=None, min_length=1, description="Rules of your own, instead of a preset."
    )
    median_k: InverseEarth | None = Field(default=None, description="k of the ordinary day.", examples=[1.333])
    gradient: Number | None = Field(
        default=None,
        ge=-1000.0,
        le=1000.0,
        description="Refractivity gradient of the ordinary day, N/km, instead of median_k.",
        examples=[-39],
    )
    confidence: Probability = Field(default=0.9, description="Probability that 'clear' must hold with.", examples=[0.9])

    @model_validator(mode="after")
    def _one_of_each(self) -> "CriteriaTable":
        if self.preset is not None and self.rules is not None:
            raise ValueError("preset and rules are both given; keep one of them")
        if self.median_k is not None and self.gradient is not None:
            raise ValueError("median_k and gradient are both given; keep one of them")
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


class RadioTable(Table):
    """[[radio]]: the radio at both ends of a link."""

    name: Name = Field(description="How links call it.", examples=["5 GHz backhaul"])
    frequency: Frequency = Field(description="Carrier frequency.", examples=["5.8 GHz"])
    power: Power | None = Field(default=None, description="Transmit power at the antenna port.", examples=["23 dBm"])
    threshold: Level | None = Field(
        default=None, description="Received level that the radio needs.", examples=["-75 dBm"]
    )
    polarization: Polarization = Field(default="vertical", description="Polarization of the wave.")


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

    @model_validator(mode="after")
    def _ends_differ(self) -> "LinkTable":
        if self.a == self.b:
            raise ValueError(f"both ends are the site '{self.a}'; a link needs two sites")
        if self.antenna is not None and (self.antenna_a is not None or self.antenna_b is not None):
            raise ValueError("antenna is for both ends; use either antenna or antenna_a and antenna_b")
        return self


class MapTable(Table):
    """[map]: online map tiles that a reader of the report may switch on."""

    tiles_url: str | None = Field(
        default=None,
        pattern=r"^https?://\S*\{z\}\S*$",
        description="Address of a tile server, with {z}, {x} and {y} in it.",
        examples=["https://tiles.example/{z}/{x}/{y}.png"],
    )
    tiles_credit: str = Field(default="", max_length=300, description="Credit that the tile server asks for.")

    @model_validator(mode="after")
    def _credit_is_given(self) -> "MapTable":
        if self.tiles_url is not None and not self.tiles_credit:
            raise ValueError("tiles_url is given without tiles_credit; tile servers ask to be credited on the map")
        return self


class StudyFile(Table):
    """A whole study file."""

    study: StudyTable = Field(default_factory=StudyTable)
    terrain: TerrainTable
    criteria: CriteriaTable = Field(default_factory=CriteriaTable)
    site: tuple[SiteTable, ...] = Field(min_length=2)
    radio: tuple[RadioTable, ...] = Field(min_length=1)
    antennas: AntennasTable = Field(default_factory=AntennasTable)
    antenna: tuple[AntennaTable, ...] = ()
    link: tuple[LinkTable, ...] = Field(min_length=1)
    map: MapTable = Field(default_factory=MapTable)
