"""Says why the availability target of a run cannot be judged, and what to set so that it can. Counts nothing."""

from typing import Final

from fellspan.climate.given import GivenClimate
from fellspan.climate.maps import maps_available
from fellspan.screening.pairs import SIGNAL_VERDICTS, Candidates

_BELOW: Final = SIGNAL_VERDICTS.index("below")
UNJUDGED_SQL: Final = f"signal_verdict IS NOT NULL AND signal_verdict IS NOT {_BELOW} AND availability_percent IS NULL"
"""Pairs of the store that only the missing availability holds at marginal; those below by their margin need none."""


def is_unjudged(candidates: Candidates, *, signal_verdict: int | None, availability_percent: float | None) -> bool:
    """`UNJUDGED_SQL` on one pair, of a run that has a target."""
    judged = signal_verdict is None or SIGNAL_VERDICTS[signal_verdict] == "below" or availability_percent is not None
    return candidates.target_availability_percent is not None and not judged


def unjudged_words(candidates: Candidates) -> str:
    """What is missing and what to set, to follow a count and a colon; '' where no target is asked."""
    if candidates.target_availability_percent is None:
        return ""
    given = candidates.settings.weather.given
    maps = maps_available()
    rain, multipath = not (maps or _has_rain(given)), not (maps or _has_multipath(given))
    if rain:
        missing = "no rain rate is known"
        remedy = f"set climate.rain_rate in the study{', above 5 km climate.dn1 too' if multipath else ''}"
    elif multipath:
        missing, remedy = (
            "no refractivity gradient is known, which paths above 5 km need",
            "set climate.dn1 in the study",
        )
    else:
        return "no availability can be worked out; fellspan plan says why"
    return f'{missing}, so no availability; {remedy}, or install the maps: .venv/bin/pip install -e ".[climate]"'


def _has_rain(given: GivenClimate) -> bool:
    return given.rain_rate_001_mm_h is not None or given.monthly_rain_mm is not None


def _has_multipath(given: GivenClimate) -> bool:
    return given.dn1_n_per_km is not None or (given.log_k is not None and given.dn75 is not None)
