"""How links are judged: the settings of a study that assessment asks for. Holds them and checks them; judges nothing."""

import datetime as dt
import math
from dataclasses import dataclass
from typing import Literal

from fellspan.climate.given import GivenClimate
from fellspan.errors import LinkError
from fellspan.links.criteria import Criterion
from fellspan.links.signal_path import Weather
from fellspan.propagation.exposure import ExposureRule
from fellspan.propagation.rain import RainEdition, RainReading
from fellspan.vocabulary import CriteriaPreset


@dataclass(frozen=True, slots=True, kw_only=True)
class AssessSettings:
    """How links are judged.

    `criteria` replaces `preset` where it is not empty. `confidence` is the probability asked of every criterion, above 0 and
    below 1. `date` is for magnetic bearings; None leaves them out. `step_m` is the regular step along paths, None for half
    the finest cell. `climate` is what is known of it; None leaves all to the maps, where they are installed. `rain_edition` is
    that of Rec. ITU-R P.530, `rain_reading` that of its equation (36). `exposure_rule` says whose limits distances are for.
    """

    preset: CriteriaPreset = "p530-temperate"
    criteria: tuple[Criterion, ...] = ()
    median_k: float = 4.0 / 3.0
    confidence: float = 0.9
    date: dt.date | None = None
    step_m: float | None = None
    climate: GivenClimate | None = None
    rain_edition: RainEdition = "19"
    rain_reading: RainReading = "A"
    exposure_rule: ExposureRule | Literal["stricter"] = "stricter"

    def __post_init__(self) -> None:
        if math.isnan(self.median_k) or self.median_k == 0.0:
            raise LinkError(f"median k {self.median_k:g} must be a number other than 0", "4/3 if nothing is known")
        if not 0.0 < self.confidence < 1.0:
            raise LinkError(f"confidence {self.confidence:g} is outside 0 to 1", "0.9 asks for 90 %")

    @property
    def weather(self) -> Weather:
        """The part that the signal asks for."""
        return Weather(
            given=self.climate or GivenClimate(), rain_edition=self.rain_edition, rain_reading=self.rain_reading
        )
