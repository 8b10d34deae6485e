"""The commented starter that `fellspan init` writes. Gives text; writes nothing itself."""

import datetime as dt
from importlib.resources import files


def starter_text(*, date: dt.date) -> str:
    """The starter study file, dated."""
    template = files("fellspan.study").joinpath("starter.toml").read_text(encoding="utf-8")
    return template.replace("DATE_OF_TODAY", date.isoformat())
