"""Study: everything that planning needs, validated and in SI; made by the `study` room or by hand."""

import datetime as dt
from dataclasses import dataclass, field
from pathlib import Path
from typing import Literal

from fellspan.climate.given import GivenClimate
from fellspan.links.criteria import Criterion
from fellspan.links.site import Link
from fellspan.propagation.exposure import ExposureRule
from fellspan.propagation.rain import RainEdition, RainReading
from fellspan.terrain.sources import CoverSource, ObstacleSource, RasterSource, SurveySource
from fellspan.vocabulary import CriteriaPreset, GapPolicy


@dataclass(frozen=True, slots=True, kw_only=True)
class TerrainInputs:
    """The files of a study, paths resolved."""

    ground: tuple[RasterSource, ...] = ()
    surface: tuple[RasterSource, ...] = ()
    cover: tuple[CoverSource, ...] = ()
    obstacles: tuple[ObstacleSource, ...] = ()
    survey: tuple[SurveySource, ...] = ()
    gaps: GapPolicy = "error"
    sea_level_m: float = 0.0
    step_m: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Study:
    """A study: terrain, criteria, links and the stamp of the issue.

    `criteria` replaces `preset` where it is not empty. `growth_years` is how far ahead trees are grown.
    """

    title: str
    links: tuple[Link, ...]
    terrain: TerrainInputs
    date: dt.date
    planner: str = ""
    revision: str = ""
    preset: CriteriaPreset = "p530-temperate"
    criteria: tuple[Criterion, ...] = ()
    median_k: float = 4.0 / 3.0
    confidence: float = 0.9
    growth_years: float = 0.0
    water_level_m: float | None = None
    water_low_m: float | None = None
    water_high_m: float | None = None
    """Level of open water, and the lowest and highest it comes to, m above sea level; for reflections."""
    water_outlines: tuple[str | Path, ...] = ()
    """Files of areas of open water."""
    tiles_url: str | None = None
    tiles_credit: str = ""
    path: Path | None = None
    antenna_catalogue: Path | None = None
    """Antennas of the user's own, which models may name."""
    links_left_out: tuple[str, ...] = ()
    """Names of links of the study that are not planned this time."""
    notes: tuple[str, ...] = field(default=())
    """Warnings found while reading, such as coarse coordinates."""
    climate: GivenClimate = field(default_factory=GivenClimate)
    """What the study says of the climate; the rest comes from maps, where they are installed."""
    rain_edition: RainEdition = "19"
    rain_reading: RainReading = "A"
    """Edition of Rec. ITU-R P.530 for rain, and the reading of its equation (36)."""
    rules_file: Path | None = None
    """Power rules of the user's own, which links may name."""
    exposure_rule: ExposureRule | Literal["stricter"] = "stricter"
