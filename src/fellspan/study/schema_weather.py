"""Climate, signal, power rules and exposure, as tables of a study file: names, types, allowed values, help.

Values are SI once read. The climate keys are those that the notes of `climate` name.
"""

from typing import Annotated, Literal

from pydantic import Field

from fellspan.propagation.rain import RainEdition, RainReading
from fellspan.study.fields import (
    Length,
    LevelAboveSea,
    Name,
    Number,
    Pressure,
    RainRate,
    Temperature,
    Vapour,
)
from fellspan.study.table import Table

ExposureChoice = Literal["stricter", "icnirp-2020", "fcc-1.1310"]
Twelve = Annotated[tuple[Number, ...], Field(min_length=12, max_length=12)]


class ClimateTable(Table):
    """[climate]: weather and air of the study's area; what is left out comes from maps, where they are installed."""

    rain_rate: RainRate | None = Field(
        default=None, description="Rain rate exceeded for 0.01 % of the year.", examples=["30 mm/h"]
    )
    monthly_rain: Twelve | None = Field(
        default=None,
        description="Mean rain of each month, mm, January to December; used without a rain_rate.",
        examples=[[110, 95, 80, 70, 60, 45, 30, 40, 75, 110, 120, 125]],
    )
    monthly_temperature: Twelve | None = Field(
        default=None,
        description="Mean temperature of each month, degrees Celsius, January to December.",
        examples=[[14, 14, 14, 15, 17, 19, 22, 23, 22, 20, 17, 15]],
    )
    dn1: Number | None = Field(
        default=None,
        description="Gradient of refractivity over 65 m not exceeded for 1 % of the year, N/km.",
        examples=[-150],
    )
    dn75: Number | None = Field(default=None, description="Refractivity over 75 m by P.530-19, N-units.", examples=[12])
    log_k: Number | None = Field(default=None, description="Logarithm of K by P.530-19.", examples=[-3.2])
    terrain_roughness: Length | None = Field(
        default=None, description="Standard deviation of terrain heights within 110 km.", examples=["40 m"]
    )
    gradient_median: Number | None = Field(
        default=None, description="Gradient of refractivity of the median day, N/km.", examples=[-39]
    )
    gradient_tail: Number | None = Field(
        default=None,
        description="Gradient of refractivity not exceeded for 99.9 % of the year, N/km.",
        examples=[20],
    )
    temperature: Temperature | None = Field(
        default=None, description="Annual mean temperature near the ground.", examples=["18 C"]
    )
    pressure: Pressure | None = Field(
        default=None, description="Air pressure at the place, not reduced to sea level.", examples=["1013 hPa"]
    )
    vapour: Vapour | None = Field(
        default=None, description="Annual mean density of water vapour.", examples=["11 g/m3"]
    )
    rain_height: LevelAboveSea | None = Field(
        default=None, description="Mean height of the melting layer above sea level.", examples=["3200 m"]
    )
    altitude: LevelAboveSea | None = Field(
        default=None, description="Height of the place, from which its air follows.", examples=["50 m"]
    )


class SignalTable(Table):
    """[signal]: which published methods the signal is reckoned by."""

    rain_edition: RainEdition = Field(default="19", description="Edition of Rec. ITU-R P.530 for rain.")
    rain_reading: RainReading = Field(default="A", description="Reading of equation (36) of P.530-19.")


class PowerRulesTable(Table):
    """[rules]: power rules that links are held against."""

    rule: Name | None = Field(
        default=None, description="Row that every link goes by which names none itself.", examples=["fcc-15.407-5g8"]
    )
    file: str | None = Field(
        default=None, min_length=1, description="File of rules of your own.", examples=["own-rules.toml"]
    )


class ExposureTable(Table):
    """[exposure]: which limits of radio exposure count."""

    rule: ExposureChoice = Field(
        default="stricter", description="Limits that distances are for; the stricter of all known ones by default."
    )
