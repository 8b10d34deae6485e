"""The map: folium without its default scripts and styles, a relief below, paths, zones and sites as vectors above.

Everything is inside the page. Ids are counted, not random, so that the same plan makes the same bytes.
"""

import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from html import escape
from typing import Any

import folium
from branca.element import MacroElement
from jinja2 import Template
from jinja2.utils import htmlsafe_json_dumps

from fellspan.links.result import Obstruction
from fellspan.links.words import state_of
from fellspan.planning.plan import LinkPlan
from fellspan.planning.relay_result import RelayResult
from fellspan.report import map_geometry as geometry
from fellspan.report.relay_section import map_overlay
from fellspan.report.relief import Relief
from fellspan.report.wording import clean, shorten

TOLD_APART = 0.01
"""Gaps shorter than this share of a path are not seen between two cuts on the map of all links."""
_TEXT = re.compile(r'"(?:[^"\\]|\\.)*"')
_RANDOM_ID = re.compile(r"\b([a-z_]+)_([0-9a-f]{32})\b")


@dataclass(frozen=True, slots=True, kw_only=True)
class MapMarkup:
    """A map ready to be put into a page: its element, the script that fills it, and the name of its global variable."""

    name: str
    html: str
    script: str
    bounds: tuple[tuple[float, float], tuple[float, float]]
    credit: str
    """What the map names as its source, as HTML."""


class SiteNames(MacroElement):
    """Sites as dots with their names, made by the page's own script: no picture of a default marker is ever asked for."""

    _template = Template(
        """
        {% macro script(this, kwargs) %}
            addSites({{ this._parent.get_name() }}, {{ this.sites }});
            {% if this.relays %}markRelays({{ this._parent.get_name() }});{% endif %}
        {% endmacro %}
        """
    )

    def __init__(self, marks: Sequence[geometry.SiteMark], *, relays: bool = False) -> None:
        super().__init__()  # type: ignore[no-untyped-call]
        self._name = "SiteNames"
        self.relays = relays
        self.sites = _no_template(
            [
                round(mark.latitude_deg, 6), round(mark.longitude_deg, 6), shorten(mark.name, 34),
                _full(mark.name), mark.side, mark.links,
            ]
            for mark in marks
        )  # fmt: skip


def _no_template(value: Iterable[list[Any]] | dict[str, Any]) -> str:
    """JSON for the script with no brace in its texts: the map library reads what it is given as a template, names included."""
    written = str(htmlsafe_json_dumps(value if isinstance(value, dict) else list(value)))
    return _TEXT.sub(lambda text: text[0].replace("{", "\\u007b").replace("}", "\\u007d"), written)


def _full(name: str) -> str:
    """The whole name where the map shows a part of it, else nothing."""
    whole = clean(name)
    return "" if shorten(name, 34) == whole else whole


def link_map(
    plans: Sequence[LinkPlan],
    *,
    name: str,
    relief: Relief | None,
    first: int = 0,
    overview: bool = False,
    relays: RelayResult | None = None,
) -> MapMarkup:
    """A map of some links; `first` is the number of the first of them in the study, `name` an identifier.

    `relays` are those of a search whose report has its links in the order of `relay_section.hop_ranks`.
    """
    reference = plans[0].result.ends.a.longitude_deg
    paths = [geometry.path(plan, reference) for plan in plans]
    places = [place for line in paths for place in line]
    south, north = min(y for y, _ in places), max(y for y, _ in places)
    west, east = min(x for _, x in places), max(x for _, x in places)
    chart = folium.Map(
        location=[(south + north) / 2.0, (west + east) / 2.0], tiles=None, zoom_start=10, control_scale=False,
        max_zoom=19, min_zoom=2, zoom_snap=0.05, attribution_control=True,
    )  # fmt: skip
    chart.default_js, chart.default_css = [], []
    chart._id = name
    if relief is not None and relief.url:
        _add_relief(chart, relief)
    if relays is not None:
        RelayMarks(map_overlay(relays, reference)).add_to(chart)
    LinkLines(
        [
            _drawn(plan, line, index=index, reference=reference, overview=overview)
            for index, (plan, line) in enumerate(zip(plans, paths, strict=True), start=first)
        ],
        choose=overview,
    ).add_to(chart)
    SiteNames(geometry.sites(plans, reference, first=first), relays=relays is not None).add_to(chart)
    figure: Any = chart.get_root()
    figure.render()
    return MapMarkup(
        name=f"map_{name}",
        html=figure.html.render(),
        script=_counted(figure.script.render(), name),
        bounds=((south, west), (north, east)),
        credit=_credit(relief),
    )


def _add_relief(chart: folium.Map, relief: Relief) -> None:
    window = relief.window
    folium.raster_layers.ImageOverlay(
        image=relief.url,
        bounds=[[window.south_deg, window.west_deg], [window.north_deg, window.east_deg]],
        pixelated=False,
        alt="Shaded relief of the study's own terrain",
    ).add_to(chart)


def _credit(relief: Relief | None) -> str:
    if relief is None:
        return "No relief: the rasters have no data here"
    words = [f"Relief: {_names(relief.rasters)}"] if relief.rasters else []
    if relief.left_out:
        words.append(
            f"no relief of {_names(relief.left_out)}: too large to shade without overviews (gdaladdo makes them)"
        )
    return escape("; ".join(words))


def _names(names: Sequence[str]) -> str:
    few = [*names[:2], f"and {len(names) - 2} more"] if len(names) > 3 else list(names)
    return ", ".join(shorten(name, 40) for name in few)


class RelayMarks(MacroElement):
    """Area, numbers and diamonds of a search for a relay, below the lines."""

    _template = Template(
        """
        {% macro script(this, kwargs) %}
            addRelays({{ this._parent.get_name() }}, {{ this.found }});
        {% endmacro %}
        """
    )

    def __init__(self, found: dict[str, Any]) -> None:
        super().__init__()  # type: ignore[no-untyped-call]
        self._name = "RelayMarks"
        self.found = _no_template(found)


class LinkLines(MacroElement):
    """Paths, cuts and governing points of links as one list, which the page's own script draws: a hundred links stay small."""

    _template = Template(
        """
        {% macro script(this, kwargs) %}
            addLinks({{ this._parent.get_name() }}, {{ this.links|tojson }}, {{ this.choose|tojson }});
        {% endmacro %}
        """
    )

    def __init__(self, links: list[dict[str, Any]], *, choose: bool) -> None:
        super().__init__()  # type: ignore[no-untyped-call]
        self._name = "LinkLines"
        self.links = links
        self.choose = choose


def _drawn(plan: LinkPlan, line: geometry.Places, *, index: int, reference: float, overview: bool) -> dict[str, Any]:
    """What the script draws of one link: number, state, path, governing point, cuts, and close by also the zone."""
    result = plan.result
    criterion = result.clearance[result.governing]
    drawn: dict[str, Any] = {
        "n": index,
        "s": state_of(result),
        "p": _short(line),
        "g": _short([geometry.point(plan, criterion.worst_at_m, reference)])[0],
    }
    cuts = [
        ["sight" if item.cuts_sight else "zone", *_short(geometry.stretch(plan, item.from_m, item.to_m, reference))]
        for item in _told_apart(criterion.obstructions, plan.profile.length_m, overview=overview)
    ]
    if cuts:
        drawn["c"] = cuts
    if not overview:
        drawn["z"] = _short(geometry.zone(plan, reference))
    return drawn


def _told_apart(cuts: Sequence[Obstruction], length_m: float, *, overview: bool) -> list[Obstruction]:
    """The cuts; on the map of all links those of a kind that cannot be told apart there are one."""
    if not overview:
        return list(cuts)
    joined: list[Obstruction] = []
    for cut in cuts:
        last = joined[-1] if joined else None
        if last and last.cuts_sight == cut.cuts_sight and cut.from_m - last.to_m < length_m * TOLD_APART:
            joined[-1] = replace(last, to_m=max(last.to_m, cut.to_m))
        else:
            joined.append(cut)
    return joined


def _short(places: geometry.Places) -> list[list[float]]:
    """To a tenth of a metre, which no map shows."""
    return [[round(latitude, 6), round(longitude, 6)] for latitude, longitude in places]


def _counted(script: str, name: str) -> str:
    """The script with folium's random ids replaced by numbers in the order of their first use."""
    seen: dict[str, str] = {}

    def numbered(match: re.Match[str]) -> str:
        return f"{match[1]}_{name}_{seen.setdefault(match[2], str(len(seen) + 1))}"

    return _RANDOM_ID.sub(numbered, script)
