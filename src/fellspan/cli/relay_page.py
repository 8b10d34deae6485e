"""The terminal page of `fellspan relay`: whether a relay serves and where, each hop, what was searched, what to beware of.

Shows what the search found and computes nothing.
"""

from typing import Final

from fellspan.cli import figures
from fellspan.cli.layout import WIDTH, Ink, cut, labelled, printable, table, wrapped
from fellspan.links.words import STATE_WORDS, decisive_margin_db, least_db, state_of
from fellspan.planning.plan import LinkPlan
from fellspan.planning.relay_result import RelayResult, RelayRoute
from fellspan.report.relay_words import chains_tried, channel_words, decision, direct_words, searched

_WIDTHS: Final = (21, 9, 25, 8, 9)
_RIGHT: Final = (1, 3, 4)
_MOST_REFUSED: Final = 3


def relay_lines(result: RelayResult, *, ink: Ink) -> list[str]:
    """The page as lines without line ends."""
    lines = [ink.emphasise(cut(printable(f"Relay for {result.link_name}"), WIDTH))]
    lines += [ink.emphasise(line, "good" if result.routes else "bad") for line in wrapped(decision(result))]
    if result.direct is not None:
        lines += ["", *labelled("Direct path", direct_words(result))]
    for number, route in enumerate(result.routes, start=1):
        lines += ["", *_route(route, number, ink)]
    lines += ["", *labelled("Searched", searched(result))]
    if result.chains is not None:
        lines += labelled("Chains of two", chains_tried(result))
    for why in result.refused[:_MOST_REFUSED]:
        lines += labelled("Left out", why)
    if len(result.refused) > _MOST_REFUSED:
        lines += labelled("", f"and {len(result.refused) - _MOST_REFUSED} more")
    if result.cautions:
        lines += ["", *(line for text in result.cautions for line in wrapped(text, first="  ! ", rest="    "))]
    return lines


def _route(route: RelayRoute, number: int, ink: Ink) -> list[str]:
    lines = []
    for site, ground_m in zip(route.relays, route.ground_amsl_m, strict=True):
        where = figures.position(site.position.latitude_deg, site.position.longitude_deg)
        lines += [ink.emphasise(cut(f"{number}. {printable(site.name)}", WIDTH))]
        lines += wrapped(
            f"{where}; ground {ground_m:.1f} m above sea level, antenna {site.height_m:g} m above {site.height_reference}",
            first="   ",
            rest="   ",
        )
    lines += wrapped(
        f"{figures.distance(route.length_m)} in all, {figures.distance(route.off_path_m)} off the straight path",
        first="   ",
    )
    heads = ("Hop", "distance", "path", "to spare", "margin")
    rows = [_hop(hop) for hop in route.hops]
    lines += ["   " + line for line in table(heads, rows, widths=_WIDTHS, right=_RIGHT)]
    use = printable(channel_words(route))
    return lines + (wrapped(use, first="   ", rest="   ") if use else [])


def _hop(hop: LinkPlan) -> tuple[str, ...]:
    result = hop.result
    return (
        printable(f"to {result.ends.b.site}"),
        figures.distance(result.distance_m),
        STATE_WORDS[state_of(result)],
        figures.by_how_much(result.clearance[result.governing]).removesuffix(" to spare"),
        figures.decibels(least_db(decisive_margin_db(result))),
    )
