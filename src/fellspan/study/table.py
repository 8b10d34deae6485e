"""The base of all tables of a study file. Knows no keys."""

from pydantic import BaseModel, ConfigDict


class Table(BaseModel):
    """Base of all tables: an unknown key is an error, a number is finite, values do not change once read."""

    model_config = ConfigDict(extra="forbid", frozen=True, allow_inf_nan=False, str_strip_whitespace=True)
