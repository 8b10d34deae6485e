"""Placemarks of a KML file as named texts; entities, external references and document types are refused.

Knows nothing of what the texts mean.
"""

from collections.abc import Iterator
from typing import Final
from xml.etree.ElementTree import Element, ParseError

from defusedxml import DefusedXmlException
from defusedxml.ElementTree import fromstring

from fellspan.errors import SitesFileError
from fellspan.terrain.tables import shown

_KEPT: Final = ("name",)


def kml_records(text: str, file: str) -> Iterator[tuple[str, dict[str, str]]]:
    """Where each placemark stands, and its name, extended data, longitude and latitude.

    Raises
    ------
    SitesFileError
        The text is no KML, defines entities, or a placemark is no point.
    """
    try:
        root = fromstring(text.encode("utf-8"), forbid_dtd=True)
    except DefusedXmlException:
        raise SitesFileError(
            f"{file}: the file defines entities or a document type, which no KML needs; not read",
            "export it again from the program that it came from",
        ) from None
    except (ParseError, LookupError, ValueError, RecursionError) as problem:
        raise SitesFileError(f"{file}: not KML: {shown(problem, 80)}") from None
    if _tag(root) != "kml":
        raise SitesFileError(f"{file}: not KML: its first element is <{shown(_tag(root))}>")
    marks = (element for element in root.iter() if _tag(element) == "Placemark")
    for number, mark in enumerate(marks, start=1):
        where = f"placemark {number}"
        yield where, _values(mark, f"{file}, {where}")


def _tag(element: Element) -> str:
    return element.tag.rsplit("}", 1)[-1] if isinstance(element.tag, str) else ""


def _values(mark: Element, where: str) -> dict[str, str]:
    values = {tag: child.text or "" for child in mark if (tag := _tag(child)) in _KEPT}
    for element in mark.iter():
        if _tag(element) == "Data" and (name := element.get("name")):
            values[name] = next((child.text or "" for child in element if _tag(child) == "value"), "")
        elif _tag(element) == "SimpleData" and (name := element.get("name")):
            values[name] = element.text or ""
    points = [element for element in mark.iter() if _tag(element) == "Point"]
    name = shown(values.get("name", "").strip() or "without a name")
    if len(points) != 1:
        shapes = ("LineString", "Polygon", "LinearRing", "Model", "Track")
        kind = next((tag for element in mark.iter() if (tag := _tag(element)) in shapes), "")
        found = f"{len(points)} points" if points else f"a {kind}" if kind else "no place"
        raise SitesFileError(f"{where} '{name}': {found} where one Point belongs")
    text = next((child.text or "" for child in points[0] if _tag(child) == "coordinates"), "")
    parts = [part.strip() for part in text.split(",")]
    if len(parts) not in (2, 3):
        raise SitesFileError(f"{where} '{name}': '{shown(text.strip())}' is no longitude,latitude")
    return {**values, "longitude": parts[0], "latitude": parts[1]}
