"""What a search for a relay leaves behind: JSON, GeoJSON of places and area, a study to plan on with, the report folder.

Shows what was found and computes nothing.
"""

import dataclasses
import json
import textwrap
from pathlib import Path
from typing import Any, Final

import shapely

from fellspan import __version__
from fellspan.design.equip_words import capital
from fellspan.errors import OutputError
from fellspan.exports.folder import RESULTS, Progress, check_files, links_in, report_files, write_files
from fellspan.exports.results_json import link_result_dict
from fellspan.exports.text import finite, utf8
from fellspan.planning.inputs import Study
from fellspan.planning.plan import StudyPlan
from fellspan.planning.planner import open_terrain
from fellspan.planning.relay_channels import on_own_channels
from fellspan.planning.relay_result import RelayResult, RelayRoute
from fellspan.planning.stamp import input_files
from fellspan.planning.what_if import ages_of, what_if_of
from fellspan.report.relay_area import area_outline
from fellspan.report.relay_section import relay_study_name
from fellspan.report.relay_words import study_words
from fellspan.report.wording import shorten
from fellspan.study.writing import study_text

JSON: Final = "relay.json"
GEOJSON: Final = "relay.geojson"
_SCHEMA: Final = 1
_STUDY_HEAD: Final = "# One way round, found by `fellspan relay`, each hop judged alone.\n{channels}\n\n"


def relay_json(result: RelayResult) -> str:
    """The result as JSON; each hop has the keys of `results.json`."""
    area = result.area
    data: dict[str, Any] = {
        "schema": _SCHEMA,
        "fellspan": __version__,
        "link": result.link_name,
        "longest_hop_m": finite(result.hop_m),
        "mast_m": None if result.request.sites else finite(result.request.mast_m),
        "direct_verdict": None if result.direct is None else result.direct.result.verdict,
        "relays": [_route(route) for route in result.routes],
        "area": None
        if area is None
        else {
            "cells": area.cells,
            "area_m2": finite(area.area_m2),
            "looked_at": area.looked_at,
            "each_cell_judged_as_planned": area.exact,
        },
        "chains": None if result.chains is None else dataclasses.asdict(result.chains),
        "planned_in_full": result.tried,
        "left_out": list(result.refused),
        "cautions": list(result.cautions),
    }
    return utf8(json.dumps(data, ensure_ascii=False, allow_nan=False, indent=1) + "\n")


def relay_geojson(result: RelayResult) -> str:
    """A FeatureCollection (RFC 7946): the ends, relays and hops of every route, and the area from which both ends are clear."""
    features = []
    for end, position in zip("ab", result.ends, strict=True):
        features.append(_feature(_point(position.longitude_deg, position.latitude_deg), {"what": "end", "end": end}))
    for rank, route in enumerate(result.routes, start=1):
        for site, ground_m in zip(route.relays, route.ground_amsl_m, strict=True):
            features.append(
                _feature(
                    _point(site.position.longitude_deg, site.position.latitude_deg),
                    {
                        "what": "relay",
                        "rank": rank,
                        "name": site.name,
                        "antenna_m": finite(site.height_m),
                        "above": site.height_reference,
                        "ground_amsl_m": finite(ground_m),
                        "worst_margin_db": finite(route.worst_margin_db),
                    },
                )
            )
        for hop in route.hops:
            ends = hop.result.ends
            line = [[round(end.longitude_deg, 7), round(end.latitude_deg, 7)] for end in (ends.a, ends.b)]
            features.append(
                _feature(
                    {"type": "LineString", "coordinates": line},
                    {"what": "hop", "rank": rank, "name": hop.result.name, "verdict": hop.result.verdict},
                )
            )
    if result.area is not None and result.area.cells:
        outline = area_outline(result.area)
        features.append(
            _feature(
                json.loads(shapely.to_geojson(outline)),
                {
                    "what": "both ends clear from here",
                    "mast_m": finite(result.request.mast_m),
                    "cells": result.area.cells,
                },
            )
        )
    text = json.dumps(
        {"type": "FeatureCollection", "features": features}, ensure_ascii=False, allow_nan=False, indent=1
    )
    return utf8(text + "\n")


def check_relay_folder(out: Path) -> None:
    """See, before anything is searched, that a report of relays may go into a folder.

    Raises
    ------
    OutputError
        The folder cannot be written to, holds files that Fellspan did not write, or the report of something else.
    """
    check_files(("index.html", JSON, GEOJSON, relay_study_name(1), RESULTS), out)
    held = links_in(out)
    if held and not (out / GEOJSON).exists():
        listed = ", ".join(f"'{name}'" for name in held[:3]) + (f" and {len(held) - 3} more" if held[3:] else "")
        raise OutputError(
            f"'{out}' holds the report of {listed}",
            "its pages would be lost: give another folder for the relays",
        )


def write_relay_folder(
    result: RelayResult, study: Study, out: Path, *, progress: Progress | None = None
) -> tuple[str, ...]:
    """The report of all hops, with the relays as JSON, GeoJSON and studies beside it; errors as `exports.folder.write_folder`.

    Returns
    -------
    names
        Names of the files.
    """
    plan = relay_plan(result, study)
    texts = report_files(plan, progress=progress, relays=result)
    last = texts.pop(RESULTS)
    texts[JSON] = relay_json(result)
    texts[GEOJSON] = relay_geojson(result)
    for rank, route in enumerate(result.routes, start=1):
        texts[relay_study_name(rank)] = _study_text(result, route, study, out)
    texts[RESULTS] = last
    write_files(texts, out)
    return tuple(texts)


def _study_text(result: RelayResult, route: RelayRoute, study: Study, out: Path) -> str:
    head = _STUDY_HEAD.format(channels="# " + "\n# ".join(textwrap.wrap(f"{capital(study_words(route))}.", 100)))
    return head + study_text(relay_study(result, route, study), folder=out)


def relay_study(result: RelayResult, route: RelayRoute, study: Study) -> Study:
    """A study of the hops of one way round alone, each on a channel of its own where one is known, to plan on with."""
    return dataclasses.replace(
        study,
        title=shorten(f"{study.title}: relay for {result.link_name}", 400),
        links=on_own_channels([hop.link for hop in route.hops]),
        links_left_out=(),
    )


def relay_plan(result: RelayResult, study: Study) -> StudyPlan:
    """The link itself and the hops of every way as one plan: ways are alternatives, so none is another's neighbour."""
    direct = () if result.direct is None else (result.direct,)
    plans = (*direct, *(hop for route in result.routes for hop in route.hops))
    with open_terrain(study) as terrain:
        ages = ages_of(terrain)
        plans = tuple(
            dataclasses.replace(plan, what_if=what_if_of(plan.link, plan.profile, terrain, ages=ages)) for plan in plans
        )
    made = dataclasses.replace(
        study,
        title=shorten(f"{study.title}: relay for {result.link_name}", 400),
        links=tuple(plan.link for plan in plans),
        links_left_out=(),
    )
    return StudyPlan(
        study=made,
        links=plans,
        failures=(),
        files=input_files(study),
        version=__version__,
        cautions=tuple(study.notes),
        interference=None,
    )


def _route(route: RelayRoute) -> dict[str, Any]:
    return {
        "sites": [
            {
                "name": site.name,
                "latitude_deg": site.position.latitude_deg,
                "longitude_deg": site.position.longitude_deg,
                "antenna_m": finite(site.height_m),
                "above": site.height_reference,
                "ground_amsl_m": finite(ground_m),
            }
            for site, ground_m in zip(route.relays, route.ground_amsl_m, strict=True)
        ],
        "length_m": finite(route.length_m),
        "off_path_m": finite(route.off_path_m),
        "worst_margin_db": finite(route.worst_margin_db),
        "channels": None if route.channels is None else dataclasses.asdict(route.channels),
        "hops": [link_result_dict(hop.result) for hop in route.hops],
    }


def _feature(geometry: dict[str, Any], properties: dict[str, Any]) -> dict[str, Any]:
    return {"type": "Feature", "geometry": geometry, "properties": properties}


def _point(longitude_deg: float, latitude_deg: float) -> dict[str, Any]:
    return {"type": "Point", "coordinates": [round(longitude_deg, 7) + 0.0, round(latitude_deg, 7) + 0.0]}
