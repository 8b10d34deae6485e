"""The study as a network: what each site that joins several links carries. Counts and sums what planning found."""

import math
from dataclasses import dataclass
from typing import Final

from fellspan.links import radio_words
from fellspan.links.result import LinkResult
from fellspan.links.signal_result import DirectionResult
from fellspan.links.signal_words import rate_text
from fellspan.links.words import State, state_of
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.report.naming import page_name
from fellspan.report.signal_section import availability_short
from fellspan.report.wording import signal_short

HUB_FROM: Final = 3
"""A site with so many links is a hub; one with two joins them, as a relay does."""
STATE_ORDER: Final[tuple[State, ...]] = ("clear", "clear-bare", "marginal", "obstructed")
_SIGNAL_ORDER: Final = ("meets", "marginal", "below", "through an obstruction")


@dataclass(frozen=True, slots=True, kw_only=True)
class Hub:
    """A site that carries several links."""

    site: str
    links: tuple[tuple[str, str, State], ...]
    """Name, page and state of each."""
    length_m: float
    worst: State
    signal: str
    """The worst signal verdict, and of how many links it is not known."""
    rate: str
    """What all links carry together in clear air, where their radios state rates."""
    available: str
    """The least share of the year of any link, where it is known."""


def hubs_of(plan: StudyPlan) -> tuple[Hub, ...]:
    """Sites that carry two links or more, those with the most first; a site is a name at a place."""
    carried: dict[tuple[str, float, float], list[tuple[int, LinkPlan]]] = {}
    for index, link in enumerate(plan.links):
        for end in (link.result.ends.a, link.result.ends.b):
            spot = (end.site, round(end.latitude_deg, 4), round(end.longitude_deg, 4))
            carried.setdefault(spot, []).append((index, link))
    hubs = [_hub(spot[0], links) for spot, links in carried.items() if len(links) >= 2]
    return tuple(sorted(hubs, key=lambda hub: -len(hub.links)))


def clear_air_rate_bps(result: LinkResult) -> float | None:
    """What the slower direction carries in clear air: its fastest modulation that gets through; None where no rate is stated.

    0 where none gets through; a path through an obstruction, on which nobody should build, has none.
    """
    if result.signal is None or radio_words.verdict_why(result) == radio_words.THROUGH:
        return None
    rates = [_fastest_bps(one) for one in (result.signal.a_to_b, result.signal.b_to_a)]
    return None if None in rates else min(rate for rate in rates if rate is not None)


def _fastest_bps(direction: DirectionResult) -> float | None:
    rows = [row for row in direction.modulations if row.margin_db is not None]
    through = [row for row in rows if row.margin_db is not None and row.margin_db >= 0.0]
    if not rows or any(row.throughput_bps is None for row in through):
        return None
    return max((row.throughput_bps or 0.0 for row in through), default=0.0)


def _hub(site: str, links: list[tuple[int, LinkPlan]]) -> Hub:
    results = [link.result for _, link in links]
    return Hub(
        site=site,
        links=tuple(
            (link.result.name, page_name(index, link.result.name), state_of(link.result)) for index, link in links
        ),
        length_m=sum(result.distance_m for result in results),
        worst=max((state_of(result) for result in results), key=STATE_ORDER.index),
        signal=_signal(results),
        rate=_rate(results),
        available=_available(results),
    )


def _signal(results: list[LinkResult]) -> str:
    known = [signal_short(result) for result in results if result.signal_verdict is not None]
    if not known:
        return "not computed"
    worst = max(known, key=_SIGNAL_ORDER.index)
    left = len(results) - len(known)
    return f"{worst}; {left} not computed" if left else worst


def _rate(results: list[LinkResult]) -> str:
    rates = [rate for rate in map(clear_air_rate_bps, results) if rate is not None]
    if not rates:
        return "–"
    said = rate_text(math.fsum(rates))
    return said if len(rates) == len(results) else f"{said} by {len(rates)} of {len(results)}"


def _available(results: list[LinkResult]) -> str:
    known = [
        result for result in results if result.availability_percent.year is not None and availability_short(result)
    ]
    if not known:
        return "–"
    worst = availability_short(min(known, key=lambda result: result.availability_percent.year or 0.0))
    return worst if len(known) == len(results) else f"{worst} of {len(known)} of {len(results)}"
