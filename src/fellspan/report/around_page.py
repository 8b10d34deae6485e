"""The page of a look around a site: the map of needed heights, shares by mast and by bearing, what to check first.

Shows what was counted; opened with no network it makes no request.
"""

import json
from typing import Any

from markupsafe import Markup

from fellspan import __version__
from fellspan.geodesy.coordinates import format_position
from fellspan.planning.around import Around, Farthest
from fellspan.quantities import format_bearing, format_height
from fellspan.report import assets, wording
from fellspan.report.around_map import height_map, rim
from fellspan.report.map_geometry import window_of
from fellspan.report.relief import open_rasters, shaded_relief
from fellspan.report.wording import clean, shorten

_RELIEF_PIXELS, _RELIEF_BYTES = 1200, 220_000


def decision(around: Around) -> str:
    """The answer in one sentence."""
    if around.known_share == 0.0:
        return "The terrain has no data around this site: nothing can be said."
    field = around.field
    where = " on bare ground" if around.basis == "bare ground only" else ""
    what = "area" if around.sea_level_m is None else "land"
    return (
        f"With a mast of {around.other_m:g} m at the other end, {share_words(around.share)} of the {what} within "
        f"{wording.distance(field.radius_m)} can be reached{where}, on the heights in the data without their errors."
    )


def share_words(share: float) -> str:
    """A share in percent, rounded down: never more than there is."""
    if share <= 0.0:
        return "none"
    return "under 1 %" if share < 0.01 else f"{int(share * 100.0 + 1e-9)} %"


def farthest_words(found: Farthest | None) -> str:
    """Where the farthest place lies."""
    if found is None:
        return "–"
    return f"{wording.distance(found.distance_m)} at {format_bearing(found.bearing_deg)}"


def rules_words(around: Around) -> tuple[str, ...]:
    """What is asked of every place."""
    return tuple(
        f"{rule.name} ({f'k = {rule.k:.3g}' if abs(rule.k) < 1e6 else 'k infinite'})" for rule in around.field.criteria
    )


def render_around_page(around: Around) -> str:
    """The HTML text of index.html."""
    made = assets.environment()
    made.filters.update(
        frequency=wording.frequency, distance=wording.distance, share=share_words, farthest=farthest_words
    )
    picture = height_map(around)
    site, field = around.site, around.field
    return made.get_template("around.html.j2").render(
        around=around,
        decision=decision(around),
        rules=rules_words(around),
        classes=picture.classes,
        height=format_height(site.height_m, site.height_reference),
        position=format_position(site.position),
        level=f"{field.antenna_amsl_m:.1f} m above sea level",
        place=None if around.farthest is None else format_position(around.farthest.position),
        stamp=[
            part
            for part in (around.study.planner, around.study.revision and f"revision {around.study.revision}")
            if part
        ],
        version=__version__,
        data=_json(_data(around, picture.url, picture.window, picture.classes)),
        css={name: assets.asset(f"{name}.css") for name in ("drawing", "page", "map", "around")},
        leaflet_css=assets.leaflet_css(),
        leaflet_js=assets.leaflet_js(),
        script=assets.asset("around.js"),
    )


def _json(value: object) -> Markup:
    """JSON that cannot end the script it stands in."""
    text = json.dumps(value, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    return Markup(text.replace("<", "\\u003c").replace("\u2028", "\\u2028").replace("\u2029", "\\u2029"))


def _data(around: Around, url: str, window: Any, classes: Any) -> dict[str, Any]:
    """What the script draws."""
    site, study = around.site, around.study
    outer = rim(around, around.field.radius_m)
    shown = window_of(outer, margin=0.06, aspect=1.5)
    relief = shaded_relief(
        open_rasters(study.terrain.ground or study.terrain.surface),
        shown,
        pixels=_RELIEF_PIXELS,
        most_bytes=_RELIEF_BYTES,
        gaps_are_sea=study.terrain.gaps == "sea",
    )
    names = [] if relief is None else [clean(name) for name in relief.rasters[:3]]
    bounds = [[window.south_deg, window.west_deg], [window.north_deg, window.east_deg]]
    farthest = around.farthest
    return {
        "relief": "" if relief is None else relief.url,
        "reliefBounds": [[shown.south_deg, shown.west_deg], [shown.north_deg, shown.east_deg]],
        "heights": url,
        "bounds": bounds,
        "credit": f"Relief: {', '.join(names)}" if names else "No relief: the rasters have no data here",
        "sea": study.terrain.gaps == "sea",
        "site": {
            "name": shorten(site.name, 40),
            "at": [site.position.latitude_deg, site.position.longitude_deg],
        },
        "rim": outer,
        "ring": rim(around, 0.5 * around.field.radius_m),
        "radius_m": around.field.radius_m,
        "farthest": None
        if farthest is None
        else [farthest.position.latitude_deg, outer_turn(farthest.position.longitude_deg, site.position.longitude_deg)],
        "classes": [{"label": item.label, "colour": list(item.colour)} for item in classes],
    }


def outer_turn(longitude_deg: float, reference_deg: float) -> float:
    """The longitude as the map has it, on the site's side of the antimeridian."""
    return longitude_deg + 360.0 * round((reference_deg - longitude_deg) / 360.0)
