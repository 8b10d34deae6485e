"""links.kml: sites, rays, obstructed stretches and governing points for an Earth viewer (KML 2.2, OGC 07-147r2).

Altitudes are above sea level, as KML's `absolute` has them. Shows results and computes none.
"""

import xml.etree.ElementTree as ET

from fellspan.exports.places import Place, path_places, places, split_at_antimeridian
from fellspan.exports.text import xml_text
from fellspan.links import words
from fellspan.links.result import EndResult, LinkResult
from fellspan.links.words import State
from fellspan.planning.plan import LinkPlan, StudyPlan

NAMESPACE = "http://www.opengis.net/kml/2.2"
_WIDTH: dict[State, str] = {"clear": "2", "clear-bare": "1", "marginal": "4", "obstructed": "6"}
_COLOUR: dict[State, str] = {
    "clear": "ffb27200", "clear-bare": "ffe9b456", "marginal": "ff009fe6", "obstructed": "ff005ed5",
}  # fmt: skip
"""aabbggrr; told apart without seeing red from green, and by width in greyscale."""


def links_kml(plan: StudyPlan) -> str:
    """A document with a folder for each link."""
    root = ET.Element("kml", xmlns=NAMESPACE)
    document = _child(root, "Document")
    _child(document, "name", plan.study.title)
    for state, width in _WIDTH.items():
        _line_style(document, state, _COLOUR[state], width)
    _line_style(document, "cut", "ff000000", "8")
    for linked in plan.links:
        _link_folder(document, linked)
    for failure in plan.failures:
        folder = _child(document, "Folder")
        _child(folder, "name", failure.link.name)
        _child(folder, "description", str(failure.error))
        for site in (failure.link.a, failure.link.b):
            mark = _placemark(folder, site.name, "not assessed")
            _point(mark, site.position.longitude_deg, site.position.latitude_deg, None)
    ET.indent(root, " ")
    return '<?xml version="1.0" encoding="UTF-8"?>\n' + ET.tostring(root, encoding="unicode") + "\n"


def _child(parent: ET.Element, tag: str, text: str | None = None) -> ET.Element:
    element = ET.SubElement(parent, tag)
    if text is not None:
        element.text = xml_text(text)
    return element


def _line_style(document: ET.Element, name: str, colour: str, width: str) -> None:
    style = ET.SubElement(document, "Style", id=name)
    line = _child(style, "LineStyle")
    _child(line, "color", colour)
    _child(line, "width", width)


def _placemark(folder: ET.Element, name: str, description: str, style: str | None = None) -> ET.Element:
    mark = _child(folder, "Placemark")
    _child(mark, "name", name)
    _child(mark, "description", description)
    if style is not None:
        _child(mark, "styleUrl", f"#{style}")
    return mark


def _point(mark: ET.Element, longitude_deg: float, latitude_deg: float, amsl_m: float | None) -> None:
    point = _child(mark, "Point")
    if amsl_m is None:
        _child(point, "coordinates", f"{longitude_deg:.7f},{latitude_deg:.7f}")
        return
    _child(point, "altitudeMode", "absolute")
    _child(point, "coordinates", f"{longitude_deg:.7f},{latitude_deg:.7f},{amsl_m:.2f}")


def _line(mark: ET.Element, vertices: tuple[Place, ...]) -> None:
    if len(vertices) == 1:
        only = vertices[0]
        _point(mark, only.longitude_deg, only.latitude_deg, only.ray_amsl_m)
        return
    parts = split_at_antimeridian(vertices)
    parent = mark if len(parts) == 1 else _child(mark, "MultiGeometry")
    for part in parts:
        line = _child(parent, "LineString")
        _child(line, "altitudeMode", "absolute")
        _child(
            line,
            "coordinates",
            " ".join(f"{place.longitude_deg:.7f},{place.latitude_deg:.7f},{place.ray_amsl_m:.2f}" for place in part),
        )


def _end(folder: ET.Element, end: EndResult) -> None:
    heights = f"antenna {end.antenna_agl_m:.1f} m above ground, {end.antenna_amsl_m:.1f} m above sea level"
    mark = _placemark(folder, end.site, heights)
    point = _child(mark, "Point")
    _child(point, "extrude", "1")
    _child(point, "altitudeMode", "absolute")
    _child(point, "coordinates", f"{end.longitude_deg:.7f},{end.latitude_deg:.7f},{end.antenna_amsl_m:.2f}")


def _state(result: LinkResult) -> str:
    """The state in words, and what it rests on where the state does not say it."""
    state = words.state_of(result)
    return words.STATE_WORDS[state] if state == "clear-bare" else f"{words.STATE_WORDS[state]}, {result.basis}"


def _link_folder(document: ET.Element, linked: LinkPlan) -> None:
    result = linked.result
    governing = result.clearance[result.governing]
    folder = _child(document, "Folder")
    _child(folder, "name", result.name)
    _child(folder, "description", "\n".join((_state(result), *result.reasons)))
    _end(folder, result.ends.a)
    _end(folder, result.ends.b)
    ray = _placemark(
        folder,
        f"{result.name}: ray",
        f"{_state(result)}; drawn as it runs for {governing.criterion}",
        words.state_of(result),
    )
    _line(ray, path_places(linked))
    for obstruction in governing.obstructions:
        cut = _placemark(
            folder,
            obstruction.cause,
            f"{words.up_m(obstruction.shortfall_m):.1f} m short of the required clearance at "
            f"{obstruction.worst_at_m / 1000:.3f} km from "
            f"{result.a}; {obstruction.from_m / 1000:.3f} to {obstruction.to_m / 1000:.3f} km ({governing.criterion})",
            "cut",
        )
        _line(cut, places(linked, obstruction.from_m, obstruction.to_m))
    for criterion in result.clearance:
        spare = words.spare_m(criterion, length_m=result.distance_m)
        said = f"{spare:.1f} m to spare" if spare >= 0.0 else f"{-spare:.1f} m short of the required clearance"
        mark = _placemark(
            folder,
            f"Governing point, {criterion.criterion}",
            f"{criterion.cause} at {criterion.worst_at_m / 1000:.3f} km from {result.a}: {said}",
        )
        _point(mark, criterion.longitude_deg, criterion.latitude_deg, criterion.surface_m)
