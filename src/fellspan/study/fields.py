"""The kinds of value that a study file holds: quantities as text with a unit, names, days, one-or-many lists.

Each kind is an annotated type that pydantic reads into SI and that the JSON Schema shows as people type it. Which unit
words exist is `quantities`' business.
"""

import datetime as dt
import math
import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    Field,
    GetCoreSchemaHandler,
    GetJsonSchemaHandler,
    WithJsonSchema,
)
from pydantic_core import CoreSchema, core_schema

from fellspan import quantities
from fellspan.study import measures


def _text_to(parse: Callable[[str], Any], example: str) -> BeforeValidator:
    """A validator that wants text with a unit: a bare number is refused, because its unit would be a guess."""

    def read(value: object) -> Any:
        if isinstance(value, bool) or not isinstance(value, int | float | str):
            raise ValueError(f'a {_kind_of(value)} stands where text such as "{example}" belongs')
        if not isinstance(value, str):
            raise ValueError(f'{value} has no unit; write it as text with its unit, for instance "{example}"')
        return parse(value)

    return BeforeValidator(read)


def _kind_of(value: object) -> str:
    if isinstance(value, bool):
        return "true or false"
    if isinstance(value, dict):
        return "table"
    return "list" if isinstance(value, list) else "date" if isinstance(value, dt.date | dt.time) else "value"


def _shown_as_text(*examples: str) -> WithJsonSchema:
    return WithJsonSchema({"type": "string", "examples": list(examples)})


_PER_YEAR = re.compile(r"\s*(?:/|per|a)\s*(?:year|yr|y|a)\s*$", re.IGNORECASE)


def _growth_m(text: str) -> float:
    """Metres a year of '0.3 m per year', '0.3 m/year' or '0.3 m'."""
    return quantities.parse_length_m(_PER_YEAR.sub("", text))


def _above_sea_m(text: str) -> float:
    """A level of ground or water, which may lie below the sea's."""
    return quantities.parse_antenna_height(text if "sea" in text else f"{text} above sea level").height_m


def _antenna_height(text: str) -> quantities.AntennaHeight:
    height = quantities.parse_antenna_height(text)
    if height.reference is None:
        raise ValueError(
            f"height '{text}' does not say above what; write '{text} above ground', 'above roof' or 'above sea level'"
        )
    return height


def _coordinate_text(value: object) -> str:
    """A coordinate as text, so that numbers and text are read by the same parser."""
    if isinstance(value, str) and value.strip():
        return value.strip()
    if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
        raise ValueError(f"{value!r} is no coordinate; give degrees, for instance 36.04217")
    return f"{value:.9f}".rstrip("0").rstrip(".")


def _probability(value: object) -> float:
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        raise ValueError(f'a {_kind_of(value)} stands where a probability such as "90 %" belongs')
    return quantities.parse_probability(value)


def _share(value: object) -> float:
    share = _probability(value)
    if share == 0.0:
        raise ValueError('a share of 0 leaves nothing; give more than 0, for instance "55 %"')
    return share


def _known_k(value: float) -> float:
    if math.isnan(value) or value == 0.0:
        raise ValueError(
            f"k = {value:g} is no Earth radius factor; give a number such as 1.333, or inf for a flat Earth"
        )
    return value


def _day(value: object) -> object:
    if isinstance(value, dt.datetime):
        return value.date()
    if isinstance(value, str):
        try:
            return dt.date.fromisoformat(value.strip())
        except ValueError:
            raise ValueError(f"'{value}' is no date; write year-month-day, for instance 2026-05-01") from None
    if not isinstance(value, dt.date):
        raise ValueError(f"{value!r} is no date; write year-month-day, for instance 2026-05-01")
    return value


Frequency = Annotated[float, _text_to(quantities.parse_frequency_hz, "5.8 GHz"), _shown_as_text("5.8 GHz", "900 MHz")]
Length = Annotated[float, _text_to(quantities.parse_length_m, "12 m"), _shown_as_text("12 m", "40 ft")]
LevelAboveSea = Annotated[float, _text_to(_above_sea_m, "12 m"), _shown_as_text("12 m", "-1.5 m")]
Growth = Annotated[float, _text_to(_growth_m, "0.3 m per year"), _shown_as_text("0.3 m per year")]
Power = Annotated[float, _text_to(quantities.parse_transmit_power_dbm, "23 dBm"), _shown_as_text("23 dBm", "200 mW")]
Threshold = Annotated[float, _text_to(quantities.parse_threshold_dbm, "-72 dBm"), _shown_as_text("-72 dBm")]
Level = Annotated[float, _text_to(quantities.parse_level_dbm, "-72 dBm"), _shown_as_text("-72 dBm")]
Gain = Annotated[float, _text_to(quantities.parse_gain_dbi, "29 dBi"), _shown_as_text("29 dBi")]
Loss = Annotated[float, _text_to(quantities.parse_loss_db, "1.5 dB"), _shown_as_text("1.5 dB")]
AntennaHeight = Annotated[
    quantities.AntennaHeight,
    _text_to(_antenna_height, "12 m above roof"),
    _shown_as_text("12 m above ground", "3 m above roof", "140 m above sea level"),
]
Probability = Annotated[
    float, Field(gt=0.0, lt=1.0), BeforeValidator(_probability), WithJsonSchema({"type": ["number", "string"]})
]
Share = Annotated[float, BeforeValidator(_share), WithJsonSchema({"type": ["number", "string"]})]
Percent = Annotated[float, _text_to(quantities.parse_percent, "99.99 %"), _shown_as_text("99.99 %")]
Width = Annotated[float, _text_to(measures.parse_width_hz, "40 MHz"), _shown_as_text("40 MHz")]
Rate = Annotated[float, _text_to(measures.parse_rate_bps, "150 Mbit/s"), _shown_as_text("150 Mbit/s")]
Delay = Annotated[float, _text_to(measures.parse_delay_s, "6.3 ns"), _shown_as_text("6.3 ns")]
RainRate = Annotated[float, _text_to(measures.parse_rain_rate_mm_h, "30 mm/h"), _shown_as_text("30 mm/h")]
Temperature = Annotated[float, _text_to(measures.parse_temperature_c, "14 C"), _shown_as_text("14 C", "57 F")]
Pressure = Annotated[float, _text_to(measures.parse_pressure_hpa, "1013 hPa"), _shown_as_text("1013 hPa")]
Vapour = Annotated[float, _text_to(measures.parse_vapour_g_m3, "9 g/m3"), _shown_as_text("9 g/m3")]
LossOfLine = Annotated[
    float, _text_to(measures.parse_db_per_100_m, "6.5 dB per 100 m"), _shown_as_text("6.5 dB per 100 m")
]
Number = Annotated[float, Field(strict=True)]
InverseEarth = Annotated[float, Field(strict=True, allow_inf_nan=True), AfterValidator(_known_k)]
Day = Annotated[dt.date, BeforeValidator(_day)]
Coordinate = Annotated[str, BeforeValidator(_coordinate_text), WithJsonSchema({"type": ["number", "string"]})]
Name = Annotated[str, Field(min_length=1, max_length=400)]


@dataclass(frozen=True, slots=True)
class OneOrMany:
    """A file name, a table with a path, or a list of either, read as a tuple of tables."""

    table: type[BaseModel]

    def _as_list(self, value: object) -> object:
        items = value if isinstance(value, list | tuple) else [value]
        return tuple({"path": item} if isinstance(item, str) else item for item in items)

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.no_info_before_validator_function(self._as_list, handler(source))

    def __get_pydantic_json_schema__(self, schema: CoreSchema, handler: GetJsonSchemaHandler) -> dict[str, Any]:
        many = handler(schema)
        item = {"anyOf": [{"type": "string"}, many["items"]]}
        return {"anyOf": [*item["anyOf"], {"type": "array", "items": item}]}
