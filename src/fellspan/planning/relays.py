"""Where a relay would go: for a link that fails, the places from which both hops are clear, the best planned in full.

Sweeps from both ends let cells through, the batch engine judges each as `plan` would, the best few that stand apart are
planned; only those that pass are reported. Where no single place serves, chains of two are sought among places that an end
sees. Writes nothing.
"""

import dataclasses
import itertools
from collections.abc import Callable, Iterator
from typing import Final

import numpy as np
import shapely

from fellspan.design.relay_picks import spread_picks, thinned
from fellspan.errors import LinkError
from fellspan.geodesy.coordinates import format_position
from fellspan.geodesy.geodesic import GeodesicPath, inverse
from fellspan.geodesy.position import Position
from fellspan.links.site import Link, Site
from fellspan.planning.around import TALL_M
from fellspan.planning.inputs import Study
from fellspan.planning.plan import LinkPlan
from fellspan.planning.planner import open_terrain, plan_study, settings_of
from fellspan.planning.relay_cells import Cells, Ground, cells_between
from fellspan.planning.relay_chains import ChainSearch, chains_of_two
from fellspan.planning.relay_channels import channel_use, other_links
from fellspan.planning.relay_hops import End, HopColumns, affordable, chosen_places, columns_of, hop_link, screen_hop
from fellspan.planning.relay_result import ChainsTried, RelayArea, RelayRequest, RelayResult, RelayRoute
from fellspan.screening.pairs import Floats, SiteColumns
from fellspan.terrain.alongpath import along_across
from fellspan.terrain.terrain import Terrain

_ALWAYS: Final = (
    "a relay needs ground that may be built on, power, access and a right to stand there: none of it is in the data",
    "each hop is judged on a channel of its own, with no other link on the air: on one channel a relay hears itself",
    "antennas are aimed anew; radios, powers and rules are the link's",
    "every hop adds delay and its own outage: the chain is available less than its worst hop",
)

Progress = Callable[[int, int, str], None]
"""Called with the number of places judged, of all, and what is in hand."""

JUDGE_AT_MOST: Final = 60_000
"""Cells that are judged one by one; of more, the best of each block of cells stands for it."""
JUDGE_SAMPLES: Final = 250_000_000
"""Samples of all hops from one end that are judged; over fine rasters and long hops that is fewer cells."""
LONGEST_NAME: Final = 400
"""Letters of a link's name that a study file takes."""
_TRIES: Final = 8
"""Places planned in full for each one asked, before the search gives up."""


def find_relay(study: Study, link_name: str, request: RelayRequest, *, progress: Progress | None = None) -> RelayResult:
    """Search intermediate sites for one link of a study.

    Raises
    ------
    LinkError
        The study has no such link, or the longest hop is too short for the distance.
    TerrainError
        The terrain cannot be opened.
    """
    link = _named(study, link_name)
    length_m = inverse(link.a.position, link.b.position).distance_m
    hop_m = request.hop_m if request.hop_m is not None else length_m
    most = 3 if request.two_relays else 2
    if most * hop_m <= length_m:
        raise LinkError(
            f"link '{link.name}' is {length_m / 1000.0:.2f} km long: {most} hops of {hop_m / 1000.0:.2f} km do not reach",
            "allow longer hops, or plan towards a site of your own in between",
        )
    search = _Search(study=study, link=link, request=request, length_m=length_m, hop_m=hop_m, progress=progress)
    return search.run()


def _named(study: Study, name: str) -> Link:
    for link in study.links:
        if link.name == name:
            return link
    raise LinkError(
        f"there is no link named '{name}' in this study", f"links: {', '.join(x.name for x in study.links)}"
    )


def _free(name: str, taken: set[str]) -> str:
    """A name for a relay that no end of the link bears."""
    while name in taken:
        name += "'"
    return name


def _hop_name(one: Site, two: Site, *, way: int, hop: int) -> str:
    """The names of both ends; where they are too long for a name together, which hop of which way it is."""
    name = f"{one.name} - {two.name}"
    return name if len(name) <= LONGEST_NAME else f"Way {way}, hop {hop}"


@dataclasses.dataclass(frozen=True, slots=True, kw_only=True)
class _Search:
    study: Study
    link: Link
    request: RelayRequest
    length_m: float
    hop_m: float
    progress: Progress | None

    @property
    def margin_db(self) -> float:
        asked = self.request.margin_db
        return self.link.wanted_margin_db if asked is None else asked

    @property
    def apart_m(self) -> float:
        asked = self.request.apart_m
        return 0.05 * self.length_m if asked is None else asked

    def tell(self, done: int, total: int, what: str) -> None:
        if self.progress is not None:
            self.progress(done, total, what)

    def run(self) -> RelayResult:
        direct = self._direct()
        refused: list[str] = []
        with open_terrain(self.study) as terrain:
            area: RelayArea | None = None
            ranked: Iterator[Site] = iter(())
            if self.request.sites:
                ranked = self._ranked_sites(terrain, refused)
            elif 2.0 * self.hop_m < self.length_m:
                refused.append(f"one relay: two hops of {self.hop_m / 1000.0:.2f} km do not reach from end to end")
            else:
                area, ranked = self._ranked_cells(terrain, refused)
            routes, tried = self._planned(([site] for site in ranked), refused)
            chains: ChainsTried | None = None
            if not routes and self.request.two_relays and not self.request.sites:
                chains, pairs = chains_of_two(
                    ChainSearch(
                        study=self.study,
                        link=self.link,
                        terrain=terrain,
                        mast_m=self.request.mast_m,
                        hop_m=self.hop_m,
                        area=self.request.area,
                        margin_db=self.margin_db,
                        apart_m=self.apart_m,
                        tell=self.tell,
                    )
                )
                routes, more = self._planned(pairs, refused)
                tried += more
            routes = self._with_channels(routes, terrain)
        self.tell(1, 1, "")
        return RelayResult(
            request=self.request,
            direct=direct,
            link_name=self.link.name,
            ends=(self.link.a.position, self.link.b.position),
            hop_m=self.hop_m,
            routes=tuple(routes),
            area=area,
            tried=tried,
            chains=chains,
            refused=tuple(dict.fromkeys(refused)),
            cautions=self._cautions(routes, area, chains),
        )

    def _direct(self) -> LinkPlan | None:
        self.tell(0, 1, "the link itself")
        plan = plan_study(self._study_of((self.link,)))
        return plan.links[0] if plan.links else None

    def _study_of(self, links: tuple[Link, ...]) -> Study:
        return dataclasses.replace(self.study, links=links, links_left_out=())

    # cells ----------------------------------------------------------------------------------------------------------

    def _ranked_cells(self, terrain: Terrain, refused: list[str]) -> tuple[RelayArea, Iterator[Site]]:
        self.tell(0, 1, "sweep from both ends")
        cells = all_cells = cells_between(
            Ground(
                study=self.study,
                link=self.link,
                ends=(self.link.a, self.link.b),
                hop_m=self.hop_m,
                mast_m=self.request.mast_m,
                area=self.request.area,
                terrain=terrain,
            )
        )
        if cells.row.size:
            samples = max(1.0, self.hop_m / (0.5 * min(stack.cell_m for stack in terrain.layers.stacks)))
            most = min(JUDGE_AT_MOST, max(1000, int(JUDGE_SAMPLES / samples)))
            ends = (self.link.a, self.link.b)
            most = affordable(ends, cells.latitude_deg, cells.longitude_deg, terrain, most=most)
            if cells.row.size > most:
                cells = cells.chosen(thinned(cells.spare_m, cells.row, cells.column, most=most))
        hops = self._both_hops(cells.columns(self.request.mast_m), terrain)
        exact = all_cells.whole and cells.row.size == all_cells.row.size
        clear = np.zeros(cells.shape, dtype=np.bool_)
        if exact:
            seen = hops[0].clear & hops[1].clear
            clear[cells.row[seen], cells.column[seen]] = True
        elif all_cells.seen is not None:
            clear = all_cells.seen
        else:
            seen = all_cells.spare_m >= 0.0
            clear[all_cells.row[seen], all_cells.column[seen]] = True
        count = int(clear.sum()) if all_cells.seen is None else all_cells.seen_cells
        area = RelayArea(
            clear=clear,
            transform=cells.transform,
            crs=cells.crs,
            exact=exact,
            cells=count,
            area_m2=count * cells.cell_area_m2,
            looked_at=cells.looked_at,
        )
        return area, self._best_cells(cells, hops, refused)

    def _hop(self, end: End, places: SiteColumns, terrain: Terrain, *, before: int, total: int) -> HopColumns:
        return screen_hop(
            self.link,
            end=end,
            places=places,
            terrain=terrain,
            settings=settings_of(self.study),
            margin_db=self.margin_db,
            growth_years=self.study.growth_years,
            progress=lambda done: self.tell(before + done, total, "places judged"),
        )

    def _both_hops(self, places: SiteColumns, terrain: Terrain) -> tuple[HopColumns, HopColumns]:
        count = len(places.name)
        there = self._hop("a", places, terrain, before=0, total=2 * count)
        # The far end is asked only of places that the near end sees.
        asked = np.flatnonzero(there.clear).astype(np.int64)
        back = self._hop("b", chosen_places(places, asked), terrain, before=count, total=count + asked.size)
        return there, back.of_some(asked, count)

    def _best_cells(self, cells: Cells, hops: tuple[HopColumns, HopColumns], refused: list[str]) -> Iterator[Site]:
        score = self._score(hops, refused)
        picks = spread_picks(score, cells.x_m, cells.y_m, apart_m=self.apart_m, count=self.request.count * _TRIES)
        for index in picks.tolist():
            yield Site(
                name="relay",
                position=Position(
                    latitude_deg=round(float(cells.latitude_deg[index]), 7),
                    longitude_deg=round(float(cells.longitude_deg[index]), 7),
                ),
                height_m=self.request.mast_m,
            )

    def _ranked_sites(self, terrain: Terrain, refused: list[str]) -> Iterator[Site]:
        area = self.request.area
        ends = {self.link.a.name, self.link.b.name}
        named = [site.name for site in self.request.sites if site.name in ends]
        refused += [
            f"candidate site '{name}' bears the name of an end of the link: rename it to try it" for name in named
        ]
        sites = [
            site
            for site in self.request.sites
            if site.name not in ends
            and (area is None or shapely.contains_xy(area, site.position.longitude_deg, site.position.latitude_deg))
            and all(inverse(end.position, site.position).distance_m <= self.hop_m for end in (self.link.a, self.link.b))
        ]
        left_out = len(self.request.sites) - len(named) - len(sites)
        if left_out:
            refused.append(f"{left_out} of {len(self.request.sites)} candidate sites lie outside the hops or the area")
        if not sites:
            return iter(())
        score = self._score(self._both_hops(columns_of(tuple(sites)), terrain), refused)
        order = np.argsort(-score, kind="stable")
        return iter([sites[index] for index in order.tolist() if np.isfinite(score[index])])

    def _score(self, hops: tuple[HopColumns, HopColumns], refused: list[str]) -> Floats:
        """What the weaker hop is worth (`HopColumns.worth`); -inf where one fails."""
        there, back = hops
        serves = there.serves & back.serves
        seen = there.clear & back.clear
        short = int((seen & ~serves).sum())
        if short:
            best = float(np.max(np.fmin(there.margin_db, back.margin_db)[seen]))
            refused.append(
                f"{short} places see both ends, but the signal falls short there (best margin {best:.1f} dB of "
                f"{self.margin_db:g} dB wanted)"
            )
        value = np.fmin(there.worth(self.margin_db), back.worth(self.margin_db))
        return np.where(serves, value, -np.inf)

    # plans ----------------------------------------------------------------------------------------------------------

    def _planned(self, chains: Iterator[list[Site]], refused: list[str]) -> tuple[list[RelayRoute], int]:
        routes: list[RelayRoute] = []
        tried = 0
        for chain in chains:
            if len(routes) == self.request.count or tried >= self.request.count * _TRIES:
                break
            tried += 1
            self.tell(len(routes), self.request.count, "places planned in full")
            route, why = self._route(chain, number=len(routes) + 1)
            if route is None:
                refused.append(why)
            else:
                routes.append(route)
        return routes, tried

    def _route(self, chain: list[Site], *, number: int) -> tuple[RelayRoute | None, str]:
        letters = "" if len(chain) == 1 else "ab"
        taken = {self.link.a.name, self.link.b.name}
        relays = [
            site
            if self.request.sites
            else dataclasses.replace(site, name=_free(f"Relay {number}{letters[at : at + 1]}", taken))
            for at, site in enumerate(chain)
        ]
        stations = [self.link.a, *relays, self.link.b]
        links = tuple(
            hop_link(self.link, name=_hop_name(one, two, way=number, hop=at), a=one, b=two)
            for at, (one, two) in enumerate(itertools.pairwise(stations), start=1)
        )
        where = relays[0].position
        at = f"a place at {format_position(where)}: planned in full"
        hops: list[LinkPlan] = []
        for link in links:
            # Each hop alone: they need a channel each, for on one channel a relay hears itself.
            plan = plan_study(self._study_of((link,)))
            if plan.failures:
                return None, f"{at}, '{link.name}': {plan.failures[0].error.what}"
            hops += plan.links
        for hop in hops:
            if hop.result.verdict != "clear":
                return None, f"{at}, '{hop.result.name}' is {hop.result.verdict}"
        margins = [
            margin
            for hop in hops
            for margin in (hop.result.margin_db.at_a, hop.result.margin_db.at_b)
            if margin is not None
        ]
        for hop in hops:
            if hop.result.signal_verdict not in (None, "meets"):
                least = f", margin {min(margins):.1f} dB" if margins else ""
                return None, f"{at}, the signal of '{hop.result.name}' is {hop.result.signal_verdict}{least}"
        if margins and min(margins) < self.margin_db:
            return None, f"{at}, its margin is {min(margins):.1f} dB of {self.margin_db:g} dB wanted"
        path = GeodesicPath.between(self.link.a.position, self.link.b.position)
        _, across = along_across(
            path,
            np.array([site.position.latitude_deg for site in relays]),
            np.array([site.position.longitude_deg for site in relays]),
        )
        return (
            RelayRoute(
                relays=tuple(relays),
                ground_amsl_m=tuple(hop.result.ends.b.ground_m for hop in hops[:-1]),
                hops=tuple(hops),
                worst_margin_db=min(margins) if margins else None,
                off_path_m=float(np.max(np.abs(across))),
            ),
            "",
        )

    def _with_channels(self, routes: list[RelayRoute], terrain: Terrain) -> list[RelayRoute]:
        if all(route.worst_margin_db is None for route in routes):
            return routes
        self.tell(0, 1, "hops on one channel")
        others = other_links(self.study, self.link.name)
        return [
            dataclasses.replace(route, channels=channel_use(route.hops, others, terrain, median_k=self.study.median_k))
            for route in routes
        ]

    def _cautions(
        self, routes: list[RelayRoute], area: RelayArea | None, chains: ChainsTried | None
    ) -> tuple[str, ...]:
        said = []
        if self.request.mast_m > TALL_M and not self.request.sites:
            said.append(
                f"few masts on Earth are higher than {TALL_M:g} m: see that {self.request.mast_m:g} m was meant"
            )
        if area is not None and not area.exact:
            said.append(
                "more cells could serve than can be judged one by one: the area is that of the sweep, and of each block of "
                "cells the best one was judged"
            )
        if chains is not None and not chains.every_cell:
            said.append(
                "chains of two were tried from the highest cell of each block only: another may hide between cells of a block"
            )
        if routes:
            said += _ALWAYS
        return tuple(said)
