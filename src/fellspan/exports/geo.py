"""links.geojson: paths, sites, governing points and obstructed stretches (RFC 7946); shows results and computes none.

Positions are WGS 84 longitude and latitude. They have no third member: RFC 7946 makes that a height above the ellipsoid,
and ours are above sea level; heights are in the properties.
"""

import json
from typing import Any

from fellspan.exports.places import Place, path_places, places, split_at_antimeridian
from fellspan.exports.text import finite
from fellspan.links.result import CriterionResult, EndResult
from fellspan.links.words import STATE_WORDS, state_of
from fellspan.planning.plan import LinkPlan, StudyPlan
from fellspan.report.naming import page_name

Feature = dict[str, Any]


def links_geojson(plan: StudyPlan) -> str:
    """A FeatureCollection; the property `what` is 'site', 'path', 'governing point' or 'obstruction'.

    A link that could not be assessed is a path between its sites with the verdict null and the reason in `error`.
    """
    features: list[Feature] = []
    for index, linked in enumerate(plan.links):
        features += _link_features(linked, page_name(index, linked.result.name))
    features = [*_sites(plan), *features]
    for failure in plan.failures:
        features += [
            {
                "type": "Feature",
                "geometry": {
                    "type": "MultiPoint",
                    "coordinates": [
                        [site.position.longitude_deg, site.position.latitude_deg]
                        for site in (failure.link.a, failure.link.b)
                    ],
                },
                "properties": {
                    "what": "path",
                    "link": failure.link.name,
                    "verdict": None,
                    "error": str(failure.error),
                },
            }
        ]
    text = json.dumps(
        {"type": "FeatureCollection", "features": features}, ensure_ascii=False, allow_nan=False, indent=1
    )
    return text.encode("utf-8", "backslashreplace").decode("utf-8") + "\n"


def _feature(geometry: dict[str, Any], properties: dict[str, Any]) -> Feature:
    return {"type": "Feature", "geometry": geometry, "properties": properties}


def _point(longitude_deg: float, latitude_deg: float) -> dict[str, Any]:
    return {"type": "Point", "coordinates": [round(longitude_deg, 7) + 0.0, round(latitude_deg, 7) + 0.0]}


def _line(vertices: tuple[Place, ...]) -> dict[str, Any]:
    """A line, cut where it crosses longitude 180; a point where it has no length."""
    if len(vertices) == 1:
        return _point(vertices[0].longitude_deg, vertices[0].latitude_deg)
    parts = [[list(place.lonlat) for place in part] for part in split_at_antimeridian(vertices)]
    if len(parts) == 1:
        return {"type": "LineString", "coordinates": parts[0]}
    return {"type": "MultiLineString", "coordinates": parts}


def _sites(plan: StudyPlan) -> list[Feature]:
    """Each site once for each antenna height it is used with."""
    seen: dict[tuple[str, float, float, float], EndResult] = {}
    for linked in plan.links:
        for end in (linked.result.ends.a, linked.result.ends.b):
            seen.setdefault((end.site, end.latitude_deg, end.longitude_deg, end.antenna_amsl_m), end)
    return [
        _feature(
            _point(end.longitude_deg, end.latitude_deg),
            {
                "what": "site",
                "name": end.site,
                "ground_amsl_m": finite(end.ground_m),
                "roof_agl_m": finite(end.roof_m),
                "antenna_amsl_m": finite(end.antenna_amsl_m),
                "antenna_agl_m": finite(end.antenna_agl_m),
            },
        )
        for end in seen.values()
    ]


def _link_features(linked: LinkPlan, page: str) -> list[Feature]:
    result = linked.result
    features = [
        _feature(
            _line(path_places(linked)),
            {
                "what": "path",
                "link": result.name,
                "a": result.a,
                "b": result.b,
                "verdict": result.verdict,
                "state": STATE_WORDS[state_of(result)],
                "signal_verdict": result.signal_verdict,
                "basis": result.basis,
                "confidence": finite(result.confidence),
                "distance_m": finite(result.distance_m),
                "bearing_ab_deg": finite(result.bearing_ab_deg),
                "bearing_ba_deg": finite(result.bearing_ba_deg),
                "frequency_hz": finite(result.frequency_hz),
                "reason": result.reasons[0] if result.reasons else None,
                "page": page,
            },
        )
    ]
    for index, criterion in enumerate(result.clearance):
        features.append(_governing(linked, criterion, governs=index == result.governing))
        for obstruction in criterion.obstructions:
            features.append(
                _feature(
                    _line(places(linked, obstruction.from_m, obstruction.to_m)),
                    {
                        "what": "obstruction",
                        "link": result.name,
                        "criterion": criterion.criterion,
                        "cause": obstruction.cause,
                        "from_m": finite(obstruction.from_m),
                        "to_m": finite(obstruction.to_m),
                        "worst_at_m": finite(obstruction.worst_at_m),
                        "shortfall_m": finite(obstruction.shortfall_m),
                        "cuts_sight": obstruction.cuts_sight,
                        "measured": obstruction.measured,
                    },
                )
            )
    return features


def _governing(linked: LinkPlan, criterion: CriterionResult, *, governs: bool) -> Feature:
    return _feature(
        _point(criterion.longitude_deg, criterion.latitude_deg),
        {
            "what": "governing point",
            "link": linked.result.name,
            "criterion": criterion.criterion,
            "governs": governs,
            "met": criterion.met,
            "at_m": finite(criterion.worst_at_m),
            "worst_fraction": finite(criterion.worst_fraction),
            "clearance_m": finite(criterion.clearance_m),
            "required_m": finite(criterion.required_m),
            "surface_amsl_m": finite(criterion.surface_m),
            "cause": criterion.cause,
        },
    )
