"""The tables and keys of a study file, as pydantic models: names, types, allowed values, defaults, a line of help each.

Field names are the keys that a person types; values are SI once read. No file is opened here, and nothing is looked up
between tables: that is `reading`'s work.
"""

import datetime as dt
from typing import Annotated, Literal, TypeAlias

from pydantic import Field, model_validator

from fellspan.study.fields import (
    Day,
    Growth,
    InverseEarth,
    Length,
    LevelAboveSea,
    Name,
    Number,
    OneOrMany,
    Probability,
)
from fellspan.study.schema_candidates import CandidatesTable
from fellspan.study.schema_equipment import (
    AntennasTable,
    AntennaTable,
    CoChannelTable,
    DiversityTable,
    FeederTable,
    ModulationTable,
    RadioTable,
    SignatureTable,
    SwayTable,
)
from fellspan.study.schema_links import LinkTable, NoiseFloorTable, SiteTable, UnusableTable
from fellspan.study.schema_weather import ClimateTable, ExposureTable, PowerRulesTable, SignalTable
from fellspan.study.table import Table
from fellspan.vocabulary import CoverKind, CriteriaPreset, GapPolicy, LengthUnit

__all__ = [
    "AntennaTable",
    "AntennasTable",
    "CandidatesTable",
    "ClimateTable",
    "CoChannelTable",
    "CompleteKind",
    "CoverTable",
    "CriteriaTable",
    "DiversityTable",
    "ExposureTable",
    "FeederTable",
    "FileTable",
    "LinkTable",
    "MapTable",
    "ModulationTable",
    "NoiseFloorTable",
    "ObstacleTable",
    "OutlineTable",
    "PowerRulesTable",
    "RadioTable",
    "RasterTable",
    "RuleTable",
    "SignalTable",
    "SignatureTable",
    "SiteTable",
    "StudyFile",
    "StudyTable",
    "SwayTable",
    "Table",
    "TerrainTable",
    "UnusableTable",
    "WaterTable",
]

CompleteKind: TypeAlias = Literal["building", "tree"]
"""Kinds that a file of obstacles may hold all of."""


class StudyTable(Table):
    """[study]: the stamp of the issue."""

    title: str = Field(default="Untitled study", max_length=400, description="Heading of every page.")
    planner: str = Field(default="", max_length=400, description="Who answers for the plan.")
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


class OutlineTable(Table):
    """A file of areas of open water."""

    path: str = Field(min_length=1, description="GeoJSON file.", examples=["water.geojson"])


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


class WaterTable(Table):
    """[water]: open water, which mirrors rays; without it only flat ground is looked for."""

    level: LevelAboveSea | None = Field(default=None, description="Usual level of the water.", examples=["0 m"])
    low: LevelAboveSea | None = Field(default=None, description="Lowest level, at low tide.", examples=["-0.6 m"])
    high: LevelAboveSea | None = Field(default=None, description="Highest level, at high tide.", examples=["0.8 m"])
    outlines: Annotated[tuple[OutlineTable, ...], OneOrMany(OutlineTable)] = Field(
        default=(), description="GeoJSON files of areas of open water.", examples=["water.geojson"]
    )

    @model_validator(mode="after")
    def _levels_in_order(self) -> "WaterTable":
        if self.low is None and self.high is None:
            return self
        if self.level is None or self.low is None or self.high is None:
            missing = next(name for name in ("level", "low", "high") if getattr(self, name) is None)
            raise ValueError(f"{missing} is missing; lowest and highest water go together with the usual level")
        if not self.low <= self.level <= self.high:
            raise ValueError(
                f"low {self.low:g} m, level {self.level:g} m and high {self.high:g} m are not in rising order"
            )
        return self


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
    water: WaterTable = Field(default_factory=WaterTable)
    criteria: CriteriaTable = Field(default_factory=CriteriaTable)
    climate: ClimateTable = Field(default_factory=ClimateTable)
    signal: SignalTable = Field(default_factory=SignalTable)
    rules: PowerRulesTable = Field(default_factory=PowerRulesTable)
    exposure: ExposureTable = Field(default_factory=ExposureTable)
    site: tuple[SiteTable, ...] = Field(min_length=2)
    radio: tuple[RadioTable, ...] = Field(min_length=1)
    antennas: AntennasTable = Field(default_factory=AntennasTable)
    antenna: tuple[AntennaTable, ...] = ()
    link: tuple[LinkTable, ...] = Field(min_length=1)
    candidates: CandidatesTable = Field(default_factory=CandidatesTable)
    map: MapTable = Field(default_factory=MapTable)
