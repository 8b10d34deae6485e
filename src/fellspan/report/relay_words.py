"""What a search for a relay says in sentences, on the terminal and on the page alike. Computes nothing."""

from fellspan.links.words import STATE_WORDS, down_db, state_of
from fellspan.planning.relay_channels import own_channels_hz
from fellspan.planning.relay_result import RelayResult, RelayRoute
from fellspan.report.wording import distance, signal_short


def decision(result: RelayResult) -> str:
    """One or two sentences: what was found, and whether a relay is needed at all."""
    mast = "" if result.request.sites else f" with {result.request.mast_m:g} m of mast"
    if not result.routes:
        chain = "neither one relay nor two" if result.request.two_relays and not result.request.sites else "no relay"
        return (
            f"No way round found: {chain}{mast} joins the ends with hops that are clear and have the margin, each of at "
            f"most {distance(result.hop_m)}.{_needless(result) or _else(result)}"
        )
    best = result.routes[0]
    bare = any(state_of(hop.result) == "clear-bare" for hop in best.hops)
    names = " and ".join(site.name for site in best.relays)
    margin = "" if best.worst_margin_db is None else f", least margin {down_db(best.worst_margin_db):.1f} dB"
    how = "One relay serves" if len(best.relays) == 1 else "It takes a chain of two relays"
    return f"{how}{mast}: best is {names}, every hop clear{' on bare ground only' if bare else ''}{margin}.{_needless(result)}"


def _else(result: RelayResult) -> str:
    """What may find a way where none was found."""
    if result.request.sites:
        return " Longer hops (--hop), or a search without --sites, may find one."
    return " A taller mast (--mast) or longer hops (--hop) may find one."


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


def chains_tried(result: RelayResult) -> str:
    """What was tried of chains of two, and what was not; empty where they were not looked for."""
    tried = result.chains
    if tried is None:
        return ""
    found = f"{tried.pairs} hops between them judged, all within reach; {tried.chains} chains serve"
    if tried.every_cell:
        return f"all {tried.places[0]} cells that serve the one end with all {tried.places[1]} that serve the other: {found}"
    ends = [
        f"{places} places for the {serve} of {judged} judged cells that serve {end}, the sweep let {cells} through{block}"
        for end, places, serve, judged, cells, block in zip(
            ("the one end", "the other"),
            tried.places,
            tried.serve,
            tried.judged,
            tried.cells,
            (f" (blocks of {distance(side * tried.cell_m)})" if side > 1 else "" for side in tried.block),
            strict=True,
        )
    ]
    return f"{ends[0]}; {ends[1]}: {found}; other cells and chains of three were not tried"


def channel_words(route: RelayRoute) -> str:
    """What is left of the margin where the hops are not alone on the air; empty where levels are not known."""
    use = route.channels
    if use is None:
        return ""
    words = f"all hops on the link's one channel: {down_db(use.shared_db):.1f} dB of margin left, at {use.shared_at}"
    if use.beside_study_db is not None:
        words += f"; each hop alone on it beside the study's other links: {down_db(use.beside_study_db):.1f} dB"
    elif not use.others_counted:
        words += "; the study's other links are too many to be counted here: plan the hops with them"
    return words


def study_words(route: RelayRoute) -> str:
    """What channels the study of one way round is written with, or that it needs them before it is planned."""
    links = [hop.link for hop in route.hops]
    channels, rule = own_channels_hz(links), links[0].power_rule
    if channels is None or rule is None:
        return (
            "give each hop a channel of its own in the study (frequency = ...): as written all use one, on which a relay "
            "hears itself"
        )
    others = " and ".join(f"{at / 1e9:.9g} GHz" for at in channels[1:])
    return (
        f"in the study the first hop keeps {channels[0] / 1e9:.9g} GHz, {'hops' if len(channels) > 2 else 'the hop'} after it "
        f"got {others}, within {rule.band_words}: see that it is free there and that the radio can use it"
    )


def legend_words(result: RelayResult) -> str:
    """What the area on the map is."""
    bare = any(state_of(hop.result) == "clear-bare" for route in result.routes for hop in route.hops)
    part = "" if result.area is None or result.area.exact else ", by the sweep"
    return (
        f"both ends clear from here with a {result.request.mast_m:g} m mast{', on bare ground' if bare else ''}{part}"
    )
