"""The relays of a search on the overview: a table of ways round, best first, and what the map draws of them.

Shows what the search found and computes nothing.
"""

from dataclasses import dataclass
from typing import Any, Final

from fellspan.design.equip_words import capital
from fellspan.geodesy.coordinates import format_position
from fellspan.links.words import State, decisive_margin_db, least_db, state_of
from fellspan.planning.plan import LinkPlan
from fellspan.planning.relay_result import RelayResult, RelayRoute
from fellspan.report import map_geometry as geometry
from fellspan.report import relay_words, wording
from fellspan.report.naming import page_name
from fellspan.report.relay_area import area_rings


@dataclass(frozen=True, slots=True, kw_only=True)
class RelaySite:
    """One relay: its name, where it stands, its ground and its mast."""

    name: str
    where: str
    ground: str
    mast: str


@dataclass(frozen=True, slots=True, kw_only=True)
class RelayHop:
    """One hop, and the page that shows it."""

    name: str
    page: str
    state: State
    distance: str
    spare: str
    signal: str
    margin: str


@dataclass(frozen=True, slots=True, kw_only=True)
class RelayWay:
    """One way round; `rank` 1 is the best."""

    rank: int
    sites: tuple[RelaySite, ...]
    hops: tuple[RelayHop, ...]
    length: str
    off_path: str
    channels: str
    """What is left of the margin on one channel; empty where levels are not known."""


@dataclass(frozen=True, slots=True, kw_only=True)
class RelaysView:
    """What the template shows."""

    link: str
    decision: str
    direct: str
    searched: str
    ways: tuple[RelayWay, ...]
    left_out: tuple[str, ...]
    cautions: tuple[str, ...]
    legend: str
    """What the area on the map is; empty where there is none."""
    files: tuple[str, ...]
    """Studies of the ways round, best first."""
    studies: tuple[str, ...]
    """Sentences on the channels of these studies."""


def hop_ranks(result: RelayResult) -> tuple[int, ...]:
    """The rank of the way that each link of the report belongs to, in the order of the report; 0 is the link itself."""
    direct = () if result.direct is None else (0,)
    return direct + tuple(rank for rank, route in enumerate(result.routes, start=1) for _ in route.hops)


def relay_study_name(rank: int) -> str:
    """The file name of the study of one way round."""
    return "relay.toml" if rank == 1 else f"relay-{rank}.toml"


def relays_view(result: RelayResult) -> RelaysView:
    """The section of the overview; the report holds the link itself first, then the hops of each way."""
    first = 0 if result.direct is None else 1
    ways = []
    for rank, route in enumerate(result.routes, start=1):
        ways.append(_way(rank, route, first=first))
        first += len(route.hops)
    return RelaysView(
        link=result.link_name,
        decision=relay_words.decision(result),
        direct=relay_words.direct_words(result),
        searched="; ".join(
            part for part in (relay_words.searched(result).replace("km2", "km²"), _chains(result)) if part
        ),
        ways=tuple(ways),
        left_out=result.refused,
        cautions=result.cautions,
        legend=relay_words.legend_words(result) if result.area is not None and result.area.cells else "",
        files=tuple(relay_study_name(way.rank) for way in ways),
        studies=tuple(dict.fromkeys(capital(relay_words.study_words(route)) for route in result.routes)),
    )


def _chains(result: RelayResult) -> str:
    tried = relay_words.chains_tried(result)
    return f"chains of two: {tried}" if tried else ""


def _way(rank: int, route: RelayRoute, *, first: int) -> RelayWay:
    return RelayWay(
        rank=rank,
        sites=tuple(
            RelaySite(
                name=site.name,
                where=format_position(site.position, "decimal"),
                ground=f"{wording.metres(ground_m)} above sea level",
                mast=f"{site.height_m:g} m above {_ABOVE[site.height_reference]}",
            )
            for site, ground_m in zip(route.relays, route.ground_amsl_m, strict=True)
        ),
        hops=tuple(_hop(index, hop) for index, hop in enumerate(route.hops, start=first)),
        length=wording.distance(route.length_m),
        off_path=wording.distance(route.off_path_m),
        channels=capital(relay_words.channel_words(route)),
    )


_ABOVE: Final = {"ground": "ground", "roof": "roof", "sea": "sea level"}


def _hop(index: int, hop: LinkPlan) -> RelayHop:
    result = hop.result
    margin = least_db(decisive_margin_db(result))
    return RelayHop(
        name=result.name,
        page=page_name(index, result.name),
        state=state_of(result),
        distance=wording.distance(result.distance_m),
        spare=wording.decisive_words(result.clearance[result.governing]),
        signal=result.signal_verdict or "",
        margin="" if margin is None else wording.decibels(margin),
    )


def map_overlay(result: RelayResult, reference_deg: float) -> dict[str, Any]:
    """What the page's script draws: `area` as polygons, `places` (latitude, longitude, rank), `hops` (link, rank, middle)."""
    ranks = hop_ranks(result)
    hops = [hop for route in result.routes for hop in route.hops]
    numbered = [(index, rank) for index, rank in enumerate(ranks) if rank]
    area = result.area
    return {
        "area": area_rings(area, reference_deg) if area is not None and area.cells else [],
        "places": [
            [
                round(site.position.latitude_deg, 6),
                round(geometry.nearest_turn(site.position.longitude_deg, reference_deg), 6),
                rank,
            ]
            for rank, route in enumerate(result.routes, start=1)
            for site in route.relays
        ],
        "hops": [
            [index, rank, *(round(at, 6) for at in geometry.point(hop, 0.5 * hop.profile.length_m, reference_deg))]
            for (index, rank), hop in zip(numbered, hops, strict=True)
        ],
    }
