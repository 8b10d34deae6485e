"""The map: folium without its default scripts and styles, a relief below, paths, zones and sites as vectors above.

Everything is inside the page. Ids are counted, not random, so that the same plan makes the same bytes.
"""

import re
from collections.abc import Sequence
from dataclasses import dataclass
from html import escape
from typing import Any

import folium
from branca.element import MacroElement
from jinja2 import Template

from fellspan.links.words import state_of
from fellspan.planning.plan import LinkPlan
from fellspan.report import map_geometry as geometry
from fellspan.report.relief import Relief
from fellspan.report.wording import clean, shorten

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


class SiteLabel(MacroElement):
    """A site as a dot with its name; made in one step, so that no picture of a default marker is ever asked for."""

    _template = Template(
        """
        {% macro script(this, kwargs) %}
            L.marker({{ this.place|tojson }}, {keyboard: false, interactive: false, icon: L.divIcon(
                {className: {{ this.class_name|tojson }}, iconSize: [0, 0], html: {{ this.markup|tojson }}}
            )}).addTo({{ this._parent.get_name() }});
        {% endmacro %}
        """
    )

    def __init__(self, mark: geometry.SiteMark) -> None:
        super().__init__()  # type: ignore[no-untyped-call]
        self._name = "SiteLabel"
        self.place = [mark.latitude_deg, mark.longitude_deg]
        self.class_name = " ".join(["site-mark", *(f"of-link-{index}" for index in mark.links)])
        name, full = shorten(mark.name, 34), escape(clean(mark.name))
        self.markup = (
            f'<i class="site-dot"></i><bdi class="site-name {mark.side}" data-side="{mark.side}" '
            f'title="{full}">{escape(name)}</bdi>'
        )


def link_map(
    plans: Sequence[LinkPlan], *, name: str, relief: Relief | None, first: int = 0, overview: bool = False
) -> MapMarkup:
    """A map of some links; `first` is the number of the first of them in the study, `name` an identifier."""
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
    for index, (plan, line) in enumerate(zip(plans, paths, strict=True), start=first):
        _add_link(chart, plan, line, index=index, reference=reference, overview=overview)
    for mark in geometry.sites(plans, reference, first=first):
        SiteLabel(mark).add_to(chart)
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


def _line(chart: folium.Map, places: geometry.Places, class_name: str, *, interactive: bool = False) -> None:
    element = folium.PolyLine(places, weight=3, smooth_factor=0.6)  # type: ignore[no-untyped-call]
    _classed(element, class_name, interactive=interactive).add_to(chart)


def _classed(element: Any, class_name: str, *, interactive: bool = False) -> Any:
    element.options["className"] = class_name
    element.options["interactive"] = interactive
    return element


def _add_link(
    chart: folium.Map, plan: LinkPlan, line: geometry.Places, *, index: int, reference: float, overview: bool
) -> None:
    result = plan.result
    criterion = result.clearance[result.governing]
    which = f"of-link-{index}"
    outline = geometry.zone(plan, reference)
    _classed(folium.Polygon(outline, weight=1, fill=True), f"map-zone {which}").add_to(chart)
    _line(chart, line, f"map-casing {which}")
    state = state_of(result)
    _line(chart, line, f"map-path {state} {which}")
    for item in criterion.obstructions:
        places = geometry.stretch(plan, item.from_m, item.to_m, reference)
        _line(chart, places, f"map-cut {'sight' if item.cuts_sight else 'zone'} {state} {which}")
    spot = geometry.point(plan, criterion.worst_at_m, reference)
    _classed(folium.CircleMarker(spot, radius=4, weight=2, fill=True), f"map-governing {which}").add_to(chart)
    if overview:
        _line(chart, line, f"map-hit {which}", interactive=True)


def _counted(script: str, name: str) -> str:
    """The script with folium's random ids replaced by numbers in the order of their first use."""
    seen: dict[str, str] = {}

    def numbered(match: re.Match[str]) -> str:
        return f"{match[1]}_{name}_{seen.setdefault(match[2], str(len(seen) + 1))}"

    return _RANDOM_ID.sub(numbered, script)
