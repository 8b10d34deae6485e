"""The page of a run over pairs: a map of places by their best hub, what each hub would carry, a list of places.

Shows what was counted; its size is bounded: beyond `MOST_DOTS` places the map counts them in squares, and the list is cut.
"""

import json
import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from markupsafe import Markup
from numpy.typing import NDArray

from fellspan import __version__
from fellspan.links.words import STATE_WORDS
from fellspan.planning.inputs import Study
from fellspan.report import assets
from fellspan.report.map_geometry import nearest_turn, window_of
from fellspan.report.relief import open_rasters, shaded_relief
from fellspan.report.wording import clean, shorten
from fellspan.runs.summary import STATE_CODES, RunSummary
from fellspan.screening.pairs import HEIGHT_REFERENCES, SIGNAL_VERDICTS, Candidates, SiteColumns

MOST_DOTS: Final = 20_000
MOST_LISTED: Final = 2_000
MOST_HUBS: Final = 500
SQUARES: Final = 72
"""Squares along the longer side of the map where places are counted."""
_RELIEF_PIXELS, _RELIEF_BYTES = 1200, 160_000
_LONGEST_NAME: Final = 60

STATE_LABEL: Final[dict[str, str]] = {
    **{state: words.capitalize() for state, words in STATE_WORDS.items()},
    "no answer": "No answer: gap or refused",
    "no hub in reach": "No hub in reach",
}


@dataclass(frozen=True, slots=True, kw_only=True)
class StateCount:
    """A state with its number of places, for the key."""

    code: int
    key: str
    label: str
    places: int
    share: str


def render_candidates_page(summary: RunSummary, study: Study, candidates: Candidates, *, notes: Sequence[str]) -> str:
    """The HTML text of index.html."""
    turned = _turned(candidates)
    data = _data(summary, candidates, turned)
    listed = min(len(candidates.places.name), MOST_LISTED)
    return (
        assets.environment()
        .get_template("candidates.html.j2")
        .render(
            title=study.title,
            stamp=[part for part in (study.planner, f"revision {study.revision}" if study.revision else "") if part],
            version=__version__,
            summary=summary,
            clear=summary.by_best_state["clear"] + summary.by_best_state["clear-bare"],
            bare_places=summary.by_best_state["clear-bare"],
            bare_pairs=summary.by_state["clear-bare"],
            unanswered=summary.pairs - sum(summary.by_state.values()),
            bare=summary.by_basis["bare ground only"],
            confidence=f"{100.0 * candidates.settings.confidence:g} %",
            states=_states(summary),
            labels=STATE_LABEL,
            signal=any(summary.by_signal.values()),
            hubs=sorted(summary.hubs, key=lambda hub: (-hub.best_for, hub.name))[:MOST_HUBS],
            hubs_left=max(0, len(summary.hubs) - MOST_HUBS),
            listed=listed,
            squares=data["squares"] is not None,
            notes=[(clean(note), _begins_with_a_file(note)) for note in notes],
            data=_json(data),
            relief=_json(_relief(study, turned)),
            css={name: assets.asset(f"{name}.css") for name in ("drawing", "page", "map", "candidates")},
            leaflet_css=assets.leaflet_css(),
            leaflet_js=assets.leaflet_js(),
            script=assets.asset("candidates.js"),
        )
    )


def _begins_with_a_file(note: str) -> bool:
    """Whether a note starts with the name of a file, whose first letter is to stay as it is."""
    first = note.split(" ", 1)[0].rstrip(":,")
    return "." in first[:-1]


def _json(value: object) -> Markup:
    """JSON that cannot end the script it stands in."""
    text = json.dumps(value, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    return Markup(text.replace("<", "\\u003c").replace("\u2028", "\\u2028").replace("\u2029", "\\u2029"))


def _states(summary: RunSummary) -> list[StateCount]:
    total = max(summary.places, 1)
    return [
        StateCount(
            code=code,
            key=key.replace(" ", "-"),
            label=STATE_LABEL[key],
            places=summary.by_best_state[key],
            share=f"{100.0 * summary.by_best_state[key] / total:.0f} %",
        )
        for code, key in enumerate(STATE_CODES)
        if summary.by_best_state[key] or key in STATE_WORDS
    ]


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Turned:
    """Latitudes, and longitudes that run on across the antimeridian, of hubs and places."""

    hub_latitude: NDArray[np.float64]
    hub_longitude: NDArray[np.float64]
    latitude: NDArray[np.float64]
    longitude: NDArray[np.float64]


def _turned(candidates: Candidates) -> _Turned:
    reference = float(candidates.hubs.longitude_deg[0])
    hub, place = (
        np.array([nearest_turn(value, reference) for value in sites.longitude_deg.tolist()])
        for sites in (candidates.hubs, candidates.places)
    )
    return _Turned(
        hub_latitude=candidates.hubs.latitude_deg,
        hub_longitude=hub,
        latitude=candidates.places.latitude_deg,
        longitude=place,
    )


def _data(summary: RunSummary, candidates: Candidates, turned: _Turned) -> dict[str, Any]:
    """What the script draws: hubs, places or squares, and the list."""
    best, count = summary.best, len(candidates.places.name)
    dots = count <= MOST_DOTS
    shown = slice(0, count if dots else MOST_LISTED)
    hubs_shown = [shorten(name, _LONGEST_NAME) for name in candidates.hubs.name]
    return {
        "states": [{"key": key.replace(" ", "-"), "label": STATE_LABEL[key]} for key in STATE_CODES],
        "signals": list(SIGNAL_VERDICTS),
        "hubs": {
            "name": hubs_shown,
            "lat": _rounded(turned.hub_latitude, 6),
            "lon": _rounded(turned.hub_longitude, 6),
            "high": _height_words(candidates.hubs, len(hubs_shown)),
        },
        "sectors": [shorten(sector.name, _LONGEST_NAME) for sector in candidates.sectors],
        "places": {
            "name": [shorten(name, _LONGEST_NAME) for name in candidates.places.name[shown]],
            "lat": _rounded(turned.latitude[shown], 6),
            "lon": _rounded(turned.longitude[shown], 6),
            "state": best.state[shown].tolist(),
            "hub": best.hub[shown].tolist(),
            "signal": best.signal[shown].tolist(),
            "margin": _rounded(np.floor(best.margin_db[shown] * 10.0 + 1e-6) / 10.0, 1),  # down, as everywhere
            "km": _rounded(best.distance_m[shown] / 1000.0, 2),
            "extra": _heights(best.extra_m[shown]),
            "sure": _sure_heights(best.extra_m[shown], best.extra_sure_m[shown], best.state[shown]),
            "clear": best.clear_hubs[shown].tolist(),
            "sector": best.sector[shown].tolist(),
            "bearing": _rounded(best.bearing_deg[shown], 1),
            "others": [[hub for hub in hubs if hub >= 0] for hubs in best.others[shown].tolist()],
            "high": _height_words(candidates.places, MOST_DOTS if dots else MOST_LISTED),
        },
        "listed": min(count, MOST_LISTED),
        "confidence": f"{100.0 * candidates.settings.confidence:g} %",
        "squares": None if dots else _squares(summary, turned),
    }


def _rounded(values: NDArray[np.float64], decimals: int) -> list[float | None]:
    return [round(value, decimals) + 0.0 if math.isfinite(value) else None for value in values.tolist()]


def _height_words(sites: SiteColumns, most: int) -> list[str]:
    """Antenna heights as the files state them."""
    references = sites.height_reference[:most].tolist()
    return [
        f"{height:g} m above {'sea level' if HEIGHT_REFERENCES[code] == 'sea' else HEIGHT_REFERENCES[code]}"
        for height, code in zip(np.round(sites.height_m[:most], 2).tolist(), references, strict=True)
    ]


def _heights(values: NDArray[np.float64]) -> list[float | str | None]:
    """Heights to add, rounded up to a tenth; 'no' where none helps."""
    return [
        None if math.isnan(value) else "no" if math.isinf(value) else math.ceil(value * 10.0 - 1e-6) / 10.0 + 0.0
        for value in values.tolist()
    ]


def _sure_heights(
    meets: NDArray[np.float64], sure: NDArray[np.float64], state: NDArray[np.integer]
) -> list[float | str | None]:
    """Heights to add for the confidence asked; 'unsure' where one meets the criteria and none is sure to, 'some' where the
    bound is 0 and the path marginal all the same."""
    marginal = STATE_CODES.index("marginal")
    return [
        "unsure"
        if height == "no" and math.isfinite(value)
        else "some"
        if height == 0.0 and code == marginal
        else height
        for height, value, code in zip(_heights(sure), meets.tolist(), state.tolist(), strict=True)
    ]


def _squares(summary: RunSummary, turned: _Turned) -> dict[str, Any]:
    """Places counted by state in squares of the map."""
    south, west = float(turned.latitude.min()), float(turned.longitude.min())
    shrink = max(0.05, math.cos(math.radians(float(turned.latitude.mean()))))
    high, wide = float(np.ptp(turned.latitude)), float(np.ptp(turned.longitude)) * shrink
    side = max(high, wide, 1e-6) / SQUARES
    row = np.minimum((turned.latitude - south) / side, SQUARES - 1).astype(np.int64)
    column = np.minimum((turned.longitude - west) * shrink / side, SQUARES - 1).astype(np.int64)
    cell, where = np.unique(row * SQUARES + column, return_inverse=True)
    counts = np.zeros((cell.size, len(STATE_CODES)), dtype=np.int64)
    np.add.at(counts, (where, summary.best.state), 1)
    return {
        "lat": _rounded(south + (cell // SQUARES) * side, 6),
        "lon": _rounded(west + (cell % SQUARES) * side / shrink, 6),
        "high": side,
        "wide": side / shrink,
        "counts": counts.tolist(),
    }


def _relief(study: Study, turned: _Turned) -> dict[str, Any]:
    latitudes = np.concatenate((turned.hub_latitude, turned.latitude))
    longitudes = np.concatenate((turned.hub_longitude, turned.longitude))
    corners = [
        (float(latitudes.min()), float(longitudes.min())),
        (float(latitudes.max()), float(longitudes.max())),
    ]
    window = window_of(corners, margin=0.06)
    relief = shaded_relief(
        open_rasters(study.terrain.ground or study.terrain.surface),
        window,
        pixels=_RELIEF_PIXELS,
        most_bytes=_RELIEF_BYTES,
        gaps_are_sea=study.terrain.gaps == "sea",
    )
    names = [] if relief is None else [clean(name) for name in relief.rasters[:3]]
    return {
        "url": "" if relief is None else relief.url,
        "bounds": [[window.south_deg, window.west_deg], [window.north_deg, window.east_deg]],
        "fit": [list(corner) for corner in corners],
        "credit": f"Relief: {', '.join(names)}" if names else "No relief: the rasters have no data here",
        "sea": study.terrain.gaps == "sea",
    }
