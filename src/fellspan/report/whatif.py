"""What the script of a link page is fed so that it can answer what-if: the points that can govern, levels, criteria, the way.

Packs what planning found and works nothing out. Distances are whole millimetres and levels tenths of them, each number but
the first the difference to the one before, so that a long path stays small.
"""

import json
import math
from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
from markupsafe import Markup
from numpy.typing import ArrayLike, NDArray

from fellspan.errors import FellspanError
from fellspan.links.criteria import criteria_for, worst_month_k
from fellspan.links.result import EndResult
from fellspan.links.site import Site
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.planning.what_if import GROUND, SEA, WhatIf, cover_code, what_if_without_terrain
from fellspan.report import map_geometry as geometry
from fellspan.report.wording import clean, shorten
from fellspan.vocabulary import COVER_KINDS

Floats = NDArray[np.float64]

WHAT_IF_SCRIPTS = ("need.js", "whatif_words.js", "whatif_drawing.js", "whatif.js", "spot.js")
"""In the order in which they go by one another."""
SPOTS = 220
"""At so many places along the path the page can tell ground, surface and position."""
WAY_EVERY_M, MOST_WAY = 1_000.0, 129
"""Positions between points so far apart are straight to a few centimetres."""
HIGHEST_M = 150.0
"""How far above its height in the plan an antenna may be tried."""

_WORDS = {"building": "building", "tree": "trees", "other": "cover", "none": "cover"}


def what_if_data(plan: StudyPlan, link: LinkPlan) -> Markup | None:
    """The payload of one link as JSON, safe inside a script element; None where its points cannot be had."""
    found = link.what_if
    if found is None:
        try:
            found = what_if_without_terrain(link.link, link.profile, growth_years=plan.study.growth_years)
        except FellspanError:
            return None
    return script_json(_payload(plan, link, found))


def script_json(value: object) -> Markup:
    """JSON that no text in it can end early or open a comment in."""
    text = json.dumps(value, ensure_ascii=True, allow_nan=False, separators=(",", ":"))
    return Markup(text.replace("<", "\\u003c").replace(">", "\\u003e").replace("&", "\\u0026"))


def _payload(plan: StudyPlan, link: LinkPlan, found: WhatIf) -> dict[str, Any]:
    result, radio = link.result, link.link.radio
    labels, which = _labels(found)
    rates, pairs = _rates(found)
    isolated, extended = _criteria_sets(plan, link)
    return {
        "length": link.profile.length_m,
        "points": {
            "x": _steps(found.distance_m, 1000.0),
            "s": _steps(found.surface_m, 10_000.0),
            "what": _runs(which),
            "rate": _runs(pairs),
            "tree": _runs(found.is_tree.astype(int)),
        },
        "labels": labels,
        "rates": rates,
        "spots": _spots(link, found),
        "way": _way(link),
        "ground": "ground" if link.profile.ground_is_bare else "surface",
        "a": _end(link.link.a, result.ends.a),
        "b": _end(link.link.b, result.ends.b),
        "frequency": result.frequency_hz,
        "pair": radio.duplex == "frequency",
        "drawn": result.governing,
        "criteria": extended,
        "isolated": isolated,
        "worstK": worst_month_k(link.profile.length_m),
        "growth": {"years": found.growth_years, "grows": found.grows},
        "link": shorten(result.name, 80),
    }


def _labels(found: WhatIf) -> tuple[list[dict[str, str]], NDArray[np.int64]]:
    """What stands at the points, each kind or obstacle once, and which of them at each point."""
    codes, which = np.unique(found.what, return_inverse=True)
    kinds = {cover_code(kind): kind for kind in COVER_KINDS}
    labels = []
    for code in codes.tolist():
        if code >= 0:
            labels.append({"kind": "obstacle", "name": clean(found.obstacles[code])})
        elif code in (GROUND, SEA):
            labels.append({"kind": "ground" if code == GROUND else "sea", "name": ""})
        else:
            labels.append({"kind": "cover", "name": _WORDS[kinds[code]]})
    return labels, np.asarray(which, dtype=np.int64)


def _rates(found: WhatIf) -> tuple[list[list[float]], NDArray[np.int64]]:
    """The pairs of rates that occur, and which of them at each point."""
    both = np.column_stack((found.rate_before_m, found.rate_after_m))
    pairs, which = np.unique(both, axis=0, return_inverse=True)
    return pairs.tolist(), np.asarray(which, dtype=np.int64).reshape(-1)


def _criteria_sets(plan: StudyPlan, link: LinkPlan) -> tuple[list[dict[str, Any]] | None, list[dict[str, Any]]]:
    """The criteria for an isolated obstruction, None where there is no such difference, and those for an extended one."""
    stated = [_criterion(item.criterion, item.k, item.required_fraction) for item in link.result.clearance]
    study = plan.study
    if study.criteria or study.preset != "p530-temperate":
        return None, stated
    length_m = link.profile.length_m
    isolated, extended = (
        [
            _criterion(item.name, item.k, item.fraction)
            for item in criteria_for(study.preset, distance_m=length_m, median_k=study.median_k, extended=kind)
        ]
        for kind in (False, True)
    )
    return (isolated, extended) if stated in (isolated, extended) else (None, stated)


def _criterion(name: str, k: float | None, fraction: float) -> dict[str, Any]:
    return {"name": clean(name), "k": k if k is not None and math.isfinite(k) else None, "fraction": fraction}


def _end(site: Site, end: EndResult) -> dict[str, Any]:
    base = end.antenna_amsl_m - site.height_m
    least = end.ground_m - base if site.height_reference == "sea" else 0.0
    return {
        "site": shorten(site.name, 60),
        "height": site.height_m,
        "above": {"ground": "ground", "roof": "roof", "sea": "sea level"}[site.height_reference],
        "base": base,
        "least": least,
        "most": site.height_m + HIGHEST_M,
        "ground": end.ground_m,
        "roof": end.roof_m,
    }


def _spots(link: LinkPlan, found: WhatIf) -> dict[str, Any]:
    """Places along the path, the highest of each stretch, with the ground and what stands on it there."""
    profile, levels = link.profile, link.levels
    distance = profile.distance_m
    column = np.minimum((distance / distance[-1] * SPOTS).astype(np.intp), SPOTS - 1)
    order = np.lexsort((levels.surface_m, column))
    tops = order[np.r_[np.flatnonzero(np.diff(column[order]) > 0), order.size - 1]]
    exact = [int(np.argmin(np.abs(distance - item.worst_at_m))) for item in link.result.clearance]
    index = np.unique(np.concatenate([tops, np.asarray([0, distance.size - 1, *exact], dtype=np.intp)]))
    trees = np.flatnonzero(found.is_tree)
    tree = (profile.cover_kind[index] == COVER_KINDS.index("tree")) & (trees.size > 0)
    near = np.zeros(index.shape, dtype=np.int64)
    if trees.size:
        right = np.clip(np.searchsorted(found.distance_m[trees], distance[index]), 1, max(trees.size - 1, 1))
        left_m, right_m = found.distance_m[trees[right - 1]], found.distance_m[trees[np.minimum(right, trees.size - 1)]]
        nearer = np.where(distance[index] - left_m <= right_m - distance[index], right - 1, right)
        near = trees[np.minimum(nearer, trees.size - 1)]
    return {
        "x": _steps(distance[index], 100.0),
        "ground": _steps(profile.ground_m[index], 100.0),
        "cover": _steps(profile.cover_m[index], 100.0),
        "tree": _runs(np.where(tree, near, -1)),
    }


def _way(link: LinkPlan) -> list[int]:
    """Positions at even distances from A to B, latitudes and longitudes by turns, in 1e-7 degree."""
    profile = link.profile
    count = min(MOST_WAY, 2 + int(profile.length_m / WAY_EVERY_M))
    at = np.linspace(0.0, profile.length_m, count)
    places = geometry.places(link, at, link.result.ends.a.longitude_deg)
    return [round(value * 1e7) for place in places for value in place]


def _steps(values: ArrayLike, scale: float) -> list[int]:
    """Whole numbers of `1/scale`: the first, then differences."""
    whole = np.rint(np.asarray(values, dtype=np.float64) * scale).astype(np.int64)
    steps: list[int] = np.diff(whole, prepend=np.int64(0)).tolist()
    return steps


def _runs(values: NDArray[np.int64] | Sequence[int]) -> list[int]:
    """Where each run of one value begins, and the value, by turns."""
    array = np.asarray(values, dtype=np.int64)
    starts = np.flatnonzero(np.r_[True, np.diff(array) != 0])
    turns: Iterable[tuple[int, int]] = zip(starts.tolist(), array[starts].tolist(), strict=True)
    return [number for turn in turns for number in turn]
