"""What a search for a relay says in sentences, on the terminal and on the page alike. Computes nothing."""

from fellspan.links.words import STATE_WORDS, down_db, state_of
from fellspan.planning.relay_result import RelayResult
from fellspan.report.wording import distance, signal_short


def decision(result: RelayResult) -> str:
    """One or two sentences: what was found, and whether a relay is needed at all."""
    mast = "" if result.request.sites else f" with {result.request.mast_m:g} m of mast"
    if not result.routes:
        chain = "neither one relay nor two" if result.request.two_relays and not result.request.sites else "no relay"
        return (
            f"No way round found: {chain}{mast} joins the ends with hops that are clear and have the margin, each of at "
            f"most {distance(result.hop_m)}.{_needless(result)}"
        )
    best = result.routes[0]
    bare = any(state_of(hop.result) == "clear-bare" for hop in best.hops)
    names = " and ".join(site.name for site in best.relays)
    margin = "" if best.worst_margin_db is None else f", least margin {down_db(best.worst_margin_db):.1f} dB"
    how = "One relay serves" if len(best.relays) == 1 else "It takes a chain of two relays"
    return f"{how}{mast}: best is {names}, every hop clear{' on bare ground only' if bare else ''}{margin}.{_needless(result)}"


def _needless(result: RelayResult) -> str:
    direct = result.direct
    if direct is None or direct.result.verdict != "clear" or direct.result.signal_verdict not in (None, "meets"):
        return ""
    return " The direct path is clear as it stands: see whether a relay is needed."


def direct_words(result: RelayResult) -> str:
    """The link as it stands: length, path and signal; empty where it could not be planned."""
    if result.direct is None:
        return ""
    direct = result.direct.result
    signal = f", signal {signal_short(direct)}" if direct.signal_verdict else ""
    return f"{distance(direct.distance_m)}, {STATE_WORDS[state_of(direct)]}{signal}"


def searched(result: RelayResult) -> str:
    """What was asked and how much of it serves."""
    area = result.area
    hop = f"hops up to {distance(result.hop_m)}"
    if result.request.sites:
        return f"{len(result.request.sites)} candidate sites, {hop}; {result.tried} planned in full"
    if area is None:
        return f"chains of two relays, {hop}; {result.tried} planned in full"
    part = "each judged as plan judges it" if area.exact else "by the sweep, not judged one by one"
    return (
        f"{area.looked_at} cells, {hop}; both ends clear from {area.cells} of them "
        f"({area.area_m2 / 1e6:.3g} km2), {part}; {result.tried} planned in full"
    )


def legend_words(result: RelayResult) -> str:
    """What the area on the map is."""
    bare = any(state_of(hop.result) == "clear-bare" for route in result.routes for hop in route.hops)
    part = "" if result.area is None or result.area.exact else ", by the sweep"
    return (
        f"both ends clear from here with a {result.request.mast_m:g} m mast{', on bare ground' if bare else ''}{part}"
    )
