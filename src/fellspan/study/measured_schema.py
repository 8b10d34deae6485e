"""The file of what was measured of one link as built: tables, keys, types, allowed values, help. Values are SI once read.

Every blank of the crew sheet has a key here.
"""

import datetime as dt
import re
from typing import Annotated, Literal

from pydantic import AfterValidator, BeforeValidator, Field, WithJsonSchema, model_validator

from fellspan.design.as_built import BAND_DB, LEVEL_ERROR_DB
from fellspan.study.fields import AntennaHeight, Day, Length, Level, LevelAboveSea, Loss, Name, Number, Power
from fellspan.study.table import Table
from fellspan.vocabulary import MountedPolarization

_TIME = re.compile(r"([01]?[0-9]|2[0-4])[:.h]([0-5][0-9])(?::[0-5][0-9])?")


def _hour(value: object) -> float:
    """'14:20' or a TOML time to hours."""
    if isinstance(value, dt.time):
        return value.hour + value.minute / 60.0
    found = _TIME.fullmatch(value.strip()) if isinstance(value, str) else None
    if found is None or (found[1] == "24" and found[2] != "00"):
        raise ValueError(f"{value!r} is no time of day; write hours and minutes, for instance '14:20'")
    return int(found[1]) + int(found[2]) / 60.0


def _received(value: float) -> float:
    if value > 0.0:
        raise ValueError(
            f"{value:g} dBm is more than any link receives: the sign was lost; did you mean '{-value:g} dBm'?"
        )
    return value


def _letter(value: object) -> object:
    return value.strip().lower() if isinstance(value, str) else value


def _chain_name(value: object) -> object:
    return str(value) if isinstance(value, int) and not isinstance(value, bool) else value


Hour = Annotated[float, BeforeValidator(_hour), WithJsonSchema({"type": "string", "examples": ["14:20"]})]
Received = Annotated[Level, AfterValidator(_received)]
EndName = Annotated[Literal["a", "b"], BeforeValidator(_letter)]
Switch = Annotated[Literal["on", "off"], BeforeValidator(_letter)]
Chain = Annotated[str, Field(min_length=1, max_length=40), BeforeValidator(_chain_name)]
Words = Annotated[str, Field(max_length=300)]


class MeasuredTable(Table):
    """[measured]: which link, when, by whom, and the state of the radios when the levels were read."""

    link: Name | None = Field(default=None, description="Name of the link in the study.", examples=["Harbour - Light"])
    date: Day | None = Field(default=None, description="Day of the measurement.", examples=["2026-05-20"])
    by: Words = Field(default="", description="Who measured.", examples=["N. N., N. N."])
    weather: Words = Field(default="", description="Weather and air.", examples=["clear, light wind"])
    modulation: Words = Field(default="", description="Modulation that was set.", examples=["64-QAM 5/6"])
    power_control: Switch | None = Field(default=None, description="Automatic power control.", examples=["off"])
    adaptive_modulation: Switch | None = Field(default=None, description="Adaptive modulation.", examples=["off"])
    levels_are: Literal["all chains", "each chain"] | None = Field(
        default=None, description="What a level without a chain is of.", examples=["all chains"]
    )
    level_error: Loss = Field(
        default=LEVEL_ERROR_DB, ge=0.2, le=10.0, description="Standard error of a level read.", examples=["1.5 dB"]
    )
    band: Loss = Field(
        default=BAND_DB, gt=0.0, le=20.0, description="Band that is accepted, either way.", examples=["3 dB"]
    )
    note: Words = Field(default="", description="Anything else.", examples=["scaffold on the hotel"])


class EndTable(Table):
    """[a] and [b]: one end as it was built."""

    level: Received | None = Field(default=None, description="Level received here, once.", examples=["-61.5 dBm"])
    level_chains: tuple[Received, ...] = Field(
        default=(), max_length=16, description="Level of each chain received here, in order.", examples=["-64 dBm"]
    )
    height: AntennaHeight | None = Field(
        default=None, description="Centre of the antenna, and above what.", examples=["12 m above ground"]
    )
    roof: Length | None = Field(default=None, description="Height of the roof above ground.", examples=["8.2 m"])
    ground: LevelAboveSea | None = Field(
        default=None, description="Measured ground level, above the datum of the study.", examples=["23.4 m"]
    )
    at: str | None = Field(default=None, min_length=1, description="Position.", examples=["36.04217 N, 45.19876 W"])
    bearing: Number | None = Field(
        default=None, ge=0.0, le=360.0, description="Bearing of the antenna, degrees.", examples=[231.5]
    )
    bearing_is: Literal["true", "magnetic"] | None = Field(
        default=None, description="From which north bearing was taken.", examples=["magnetic"]
    )
    tilt: Number | None = Field(
        default=None, ge=-90.0, le=90.0, description="Tilt of the antenna, degrees, up is positive.", examples=[-0.4]
    )
    polarization: MountedPolarization | None = Field(
        default=None, description="As mounted, by the marks on the antenna.", examples=["vertical"]
    )
    power: Power | None = Field(default=None, description="Power that the radio shows.", examples=["23 dBm"])
    power_is: Literal["all chains", "each chain"] | None = Field(
        default=None, description="What power is of; all chains where not stated.", examples=["all chains"]
    )
    feeder_loss: Loss | None = Field(
        default=None, description="Loss of line and connectors as measured.", examples=["1.5 dB"]
    )
    antenna: Words = Field(default="", description="By its label.", examples=["dish 0.6 m"])
    radio: Words = Field(default="", description="By its label.", examples=["5 GHz"])
    serial: Words = Field(default="", description="Serial numbers.", examples=["A1234"])
    note: Words = Field(default="", description="Anything else of this end.", examples=["guy wire renewed"])

    @model_validator(mode="after")
    def _says_which_north(self) -> "EndTable":
        if self.bearing is not None and self.bearing_is is None:
            raise ValueError("bearing is given without its north; add bearing_is = 'true' or 'magnetic'")
        return self


class ReadingTable(Table):
    """[[reading]]: one level, read at one end at one time."""

    at: EndName = Field(description="End that received it: A or B.", examples=["A"])
    level: Received = Field(description="Level received.", examples=["-61.5 dBm"])
    chain: Chain | None = Field(
        default=None, description="Chain or polarization; all together where left out.", examples=["1"]
    )
    date: Day | None = Field(default=None, description="Day, where not that of [measured].", examples=["2026-05-21"])
    time: Hour | None = Field(default=None, description="Time of day.", examples=["14:20"])
    water: LevelAboveSea | None = Field(
        default=None, description="Level of tide or water at that time.", examples=["0.4 m"]
    )
    note: Words = Field(default="", description="Anything else.", examples=["ship in the way"])


class MeasuredFile(Table):
    """The whole file."""

    measured: MeasuredTable = Field(default=MeasuredTable(), description="Link, day, state of the radios.")
    a: EndTable = Field(default=EndTable(), description="End A as built.")
    b: EndTable = Field(default=EndTable(), description="End B as built.")
    reading: tuple[ReadingTable, ...] = Field(default=(), max_length=20_000, description="Levels over time.")
