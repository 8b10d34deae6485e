"""The pages of a plan: an overview with the map, and one page a link. Shows the plan and computes none of it."""

from collections.abc import Callable, Iterator, Sequence
from contextlib import closing
from dataclasses import dataclass, fields
from html import escape
from typing import Any, Literal
from urllib.parse import urlsplit

from jinja2 import Environment
from markupsafe import Markup

from fellspan.geodesy.coordinates import PositionStyle, format_position
from fellspan.geodesy.position import Position
from fellspan.links import radio_words
from fellspan.links.result import CriterionResult, LinkResult, Losses
from fellspan.links.safety import safety_lines
from fellspan.links.words import State, is_two_points, state_of
from fellspan.planning.accepting import as_built_issue
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.planning.processes import MANY, shared_work
from fellspan.planning.relay_result import RelayResult
from fellspan.report import assets, wording
from fellspan.report import map_geometry as geometry
from fellspan.report.ahead import ahead
from fellspan.report.antenna_section import antenna_section
from fellspan.report.as_built_section import as_built_section
from fellspan.report.crew_sheet import crew_sheet
from fellspan.report.decision_section import decision_section
from fellspan.report.drawing_files import with_list
from fellspan.report.equip_page import equip_view
from fellspan.report.heights_section import heights_section
from fellspan.report.horizon_section import horizon_section
from fellspan.report.map import MapMarkup, link_map
from fellspan.report.naming import crew_name, page_name, slug
from fellspan.report.neighbours import left_by_neighbours, neighbours_view
from fellspan.report.overview import overview_view
from fellspan.report.profile_drawing import draw_profile, exaggeration_words
from fellspan.report.reflection_section import reflection_section
from fellspan.report.relay_area import area_corners
from fellspan.report.relay_section import relays_view
from fellspan.report.relief import Relief, open_rasters, shaded_relief
from fellspan.report.section import FULL, NARROW
from fellspan.report.signal_section import availability_short, rules_section, signal_section
from fellspan.report.survey_section import survey_section
from fellspan.report.whatif import WHAT_IF_SCRIPTS, what_if_data
from fellspan.report.workings_section import workings_section
from fellspan.terrain.raster_file import RasterFile

Progress = Callable[[int, int, str], None]
"""Called with the number of pages done, the number of all, and the name of the one in hand."""

OVERVIEW = "index.html"
OVERVIEW_PIXELS, OVERVIEW_BYTES = 1200, 100_000
LINK_PIXELS, LINK_BYTES, KEY_PLAN_ASPECT = 640, 40_000, 1.3

_LOSS_WORDS = {"free_space": "Free-space loss", "diffraction": "Diffraction loss"}


NOTHING = Markup()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LinkView:
    """What templates show of one link."""

    plan: LinkPlan
    result: LinkResult
    governing: CriterionResult
    state: State
    page: str
    anchor: str
    profile_csv: str
    narrow: Markup = NOTHING
    full: Markup = NOTHING
    scale: str = ""


def render_pages(
    plan: StudyPlan, *, progress: Progress | None = None, relays: RelayResult | None = None, processes: int = 1
) -> dict[str, str]:
    """File names and HTML texts: `index.html`, then the page and both crew sheets of each link in the order of the study.

    `relays` is the search that the links of the plan come from; the overview then shows it. `processes` above 1 shares the
    pages of many links between so many processes; they are the same, byte for byte.
    """
    total = len(plan.links) + 1

    def tell(done: int, name: str) -> None:
        if progress is not None:
            progress(done, total, name)

    tell(0, OVERVIEW)
    desk = _Desk(plan)
    pages = {OVERVIEW: _overview(plan, desk.templates, desk.rasters, relays)}
    if processes > 1 and len(plan.links) >= MANY:
        made = shared_work(_Desk, _Desk.pages_of, plan, count=len(plan.links), processes=processes)
    else:
        made = desk.all_pages()
    for index, texts in enumerate(made):
        tell(index + 1, next(iter(texts)))
        pages |= texts
    tell(total, "")
    return pages


class _Desk:
    """What pages are made with: templates and rasters, opened once."""

    def __init__(self, plan: StudyPlan) -> None:
        self.plan = plan
        self.templates = _environment()
        self.rasters = open_rasters(plan.study.terrain.ground or plan.study.terrain.surface)

    def all_pages(self) -> Iterator[dict[str, str]]:
        """The pages of every link, the reliefs of the next ones shaded meanwhile."""
        with closing(ahead(lambda link: _relief_of(self.plan, link, self.rasters), self.plan.links)) as reliefs:
            for index, relief in enumerate(reliefs):
                yield self.pages_of(index, relief)

    def pages_of(self, index: int, relief: Relief | Literal["to shade"] | None = "to shade") -> dict[str, str]:
        """The page and both crew sheets of one link."""
        link = self.plan.links[index]
        if relief == "to shade":
            relief = _relief_of(self.plan, link, self.rasters)
        page = _link_page(as_built_issue(self.plan, link), index, link, self.templates, relief)
        return {page_name(index, link.result.name): page} | _crew_sheets(self.plan, index, link, self.templates)


def _overview(
    plan: StudyPlan, templates: Environment, rasters: list[RasterFile], relays: RelayResult | None = None
) -> str:
    chart = None
    if plan.links:
        places, size = _places(plan.links), 1
        window = geometry.window_of(places, margin=0.25)
        if relays is not None:
            # The area may reach far beyond the links; and room for names shows more around them, most on a phone.
            held = [] if relays.area is None else area_corners(relays.area, places[0][1])
            window, size = geometry.window_of([*places, *held], margin=0.8), 2
        relief = shaded_relief(
            rasters,
            window,
            pixels=size * OVERVIEW_PIXELS,
            most_bytes=size * OVERVIEW_BYTES,
            gaps_are_sea=_gaps_are_sea(plan),
        )
        chart = link_map(plan.links, name="overview", relief=relief, overview=True, relays=relays)
    return templates.get_template("index.html.j2").render(
        **_shared(plan, chart),
        view=overview_view(plan),
        notes=(*plan.study.notes, *plan.cautions),
        neighbours=neighbours_view(plan),
        relays=relays and relays_view(relays),
        quiet=False,
    )


def _link_page(plan: StudyPlan, index: int, link: LinkPlan, templates: Environment, relief: Relief | None) -> str:
    result = link.result
    chart = link_map([link], name="plan", relief=relief, first=index)
    view = _view(
        index,
        link,
        full=Markup(draw_profile(link, uid="profile", sheet=FULL)),
        narrow=Markup(draw_profile(link, uid="narrow", sheet=NARROW)),
        scale=exaggeration_words(link),
    )
    text = templates.get_template("link.html.j2").render(
        **_shared(plan, chart),
        link=view,
        obstructions=[(item.criterion, cut) for item in result.clearance for cut in item.obstructions],
        ends=[
            ("A", result.ends.a, result.bearing_ab_deg, result.tilt_ab_deg),
            ("B", result.ends.b, result.bearing_ba_deg, result.tilt_ba_deg),
        ],
        losses=_losses(result.losses_db),
        decision=decision_section(link, number=index + 1, growth_years=plan.study.growth_years),
        signal=signal_section(result),
        workings=workings_section(result),
        held=rules_section(result),
        antennas=antenna_section(link),
        neighbours=neighbours_view(plan, result.name),
        heights=heights_section(link),
        equipment=link.equipment and equip_view(link.equipment, told=safety_lines()),
        horizons=horizon_section(link),
        as_built=as_built_section(link),
        crew=[(letter, crew_name(index, result.name, letter.lower())) for letter in ("A", "B")],
        reflections=reflection_section(link),
        survey=survey_section(link, number=index + 1, growth_years=plan.study.growth_years),
        rests_on=[link.profile.sources[i] for i in sorted(set(link.profile.source.tolist())) if i >= 0],
        cautions=tuple(dict.fromkeys((*result.cautions, *link.profile.notes, *plan.cautions))),
        safety=safety_lines(),
        what_if=what_if_data(plan, link),
        plan_link=link,
        quiet=True,
    )
    return with_list(view.page, text)


def _crew_sheets(plan: StudyPlan, index: int, link: LinkPlan, templates: Environment) -> dict[str, str]:
    """The sheets of both ends."""
    name = link.result.name
    ends: tuple[Literal["A", "B"], ...] = ("A", "B")
    return {
        crew_name(index, name, letter.lower()): templates.get_template("crew.html.j2").render(
            plan=plan,
            sheet=crew_sheet(plan, link, letter),
            page=page_name(index, name),
            study=wording.shorten(plan.study.title, 60),
            revision=wording.shorten(plan.study.revision, 20) or "–",
            css=assets.asset("crew.css"),
        )
        for letter in ends
    }


def _gaps_are_sea(plan: StudyPlan) -> bool:
    return plan.study.terrain.gaps == "sea"


def _view(index: int, link: LinkPlan, **drawings: Any) -> LinkView:
    result = link.result
    tail = slug(result.name)
    return LinkView(
        plan=link,
        result=result,
        governing=result.clearance[result.governing],
        state=state_of(result),
        page=page_name(index, result.name),
        anchor=f"link-{index + 1:02d}",
        profile_csv=f"profile-{index + 1:02d}-{tail}.csv" if tail else f"profile-{index + 1:02d}.csv",
        **drawings,
    )


def _relief_of(plan: StudyPlan, link: LinkPlan, rasters: list[RasterFile]) -> Relief | None:
    """The land around one link, in the shape of the key plan."""
    window = geometry.window_of(_places([link]), margin=0.5, aspect=KEY_PLAN_ASPECT)
    return shaded_relief(rasters, window, pixels=LINK_PIXELS, most_bytes=LINK_BYTES, gaps_are_sea=_gaps_are_sea(plan))


def _places(links: Sequence[LinkPlan]) -> geometry.Places:
    reference = links[0].result.ends.a.longitude_deg
    return [place for link in links for place in geometry.path(link, reference)]


def _shared(plan: StudyPlan, chart: MapMarkup | None) -> dict[str, Any]:
    study = plan.study
    tiles = None
    origin = ""
    if study.tiles_url:
        # Leaflet takes the credit as HTML; it is the user's text and stays text.
        tiles = {"url": study.tiles_url, "credit": escape(wording.clean(study.tiles_credit))}
        origin = f" {urlsplit(study.tiles_url).scheme or 'https'}:"
    return {
        "plan": plan,
        "open_sea": _gaps_are_sea(plan),
        "map": chart and _safe_map(chart),
        "tiles": tiles,
        "coordination": any(link.result.received_dbm.at_a is not None for link in plan.links),
        "tile_origin": origin if origin in (" https:", " http:") else "",
        "css": {
            "leaflet": assets.leaflet_css(),
            "drawing": assets.asset("drawing.css"),
            "page": assets.asset("page.css"),
            "map": assets.asset("map.css"),
            "link": assets.asset("link.css"),
            "whatif": assets.asset("whatif.css"),
            "overview": assets.asset("overview.css"),
            "relays": assets.asset("relays.css"),
            "polar": assets.asset("polar.css"),
            "horizon": assets.asset("horizon.css"),
            "equip": assets.asset("equip.css"),
            "as_built": assets.asset("as_built.css"),
        },
        "js": {
            "leaflet": assets.leaflet_js(),
            "map": assets.asset("map.js"),
            "overview": assets.asset("overview.js"),
            "relays": assets.asset("relays.js"),
            "table": assets.asset("table.js"),
            "link": assets.asset("link.js"),
            "what_if": assets.packed(*WHAT_IF_SCRIPTS),
        },
    }


def _safe_map(chart: MapMarkup) -> dict[str, Any]:
    return {
        "name": Markup(chart.name),
        "html": Markup(chart.html.strip()),
        "script": Markup(chart.script),
        "bounds": chart.bounds,
        "credit": chart.credit,
    }


def _losses(losses: Losses) -> list[tuple[str, float | None]]:
    """Every loss that was computed, new kinds included, under a name for people."""
    named = []
    for field in fields(losses):
        value = getattr(losses, field.name)
        if value is not None:
            word = _LOSS_WORDS.get(field.name, field.name.replace("_", " ").capitalize() + " loss")
            named.append((word, value))
    return named


def _place(latitude_deg: float, longitude_deg: float, style: PositionStyle = "decimal") -> str:
    return format_position(Position(latitude_deg=latitude_deg, longitude_deg=longitude_deg), style)


def _unit(value: float | None, unit: str, *, sign: bool = False) -> str:
    return "–" if value is None else f"{wording.number(value, sign=sign)} {unit}"


def _bytes(size: int) -> str:
    if not size:
        return "size not stated"
    return f"{size} B" if size < 1000 else f"{size / 1e3:.0f} kB" if size < 1e6 else f"{size / 1e6:.1f} MB"


def _digest(sha256: str) -> str:
    head, colon, tail = sha256.rpartition(":")
    return f"{head}{colon} {tail[:12]}…" if head else f"{tail[:12]}…"


def _environment() -> Environment:
    made = assets.environment()
    made.filters.update(
        availability=availability_short,
        bearing=wording.bearing,
        breach=radio_words.breach_words,
        bytes=_bytes,
        criterion_words=wording.criterion_words,
        decisive_words=wording.decisive_words,
        decibels=wording.decibels,
        degrees=wording.degrees,
        digest=_digest,
        distance=wording.distance,
        frequency=wording.frequency,
        governing_words=wording.governing_words,
        headline=wording.headline,
        k_factor=wording.k_factor,
        left_by_neighbours=left_by_neighbours,
        km=lambda value, length: wording.kilometres(value, length_m=length),
        metres=wording.metres,
        minus=wording.true_minus,
        missing=wording.missing,
        number=wording.number,
        percent=wording.percent,
        probability=wording.probability,
        share=wording.share,
        signal_short=wording.signal_short,
        to_build=wording.to_build,
        unit=_unit,
    )
    made.globals.update(
        symbol=wording.STATE_SYMBOL,
        word=wording.STATE_WORD,
        basis=wording.BASIS_WORD,
        basis_short=wording.BASIS_SHORT,
        two_points=is_two_points,
        place=_place,
    )
    return made
