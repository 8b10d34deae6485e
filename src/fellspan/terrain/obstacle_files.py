"""Reads obstacle files, CSV or GeoJSON, into `Obstacle`s; complaints name file, row or feature, value and remedy.

Knows nothing of paths and rasters.
"""

import re
from pathlib import Path
from typing import Final

from shapely.geometry import LineString
from shapely.geometry.base import BaseGeometry

from fellspan.terrain.obstacle_shapes import feature_shapes, simple_parts, table_shapes
from fellspan.terrain.obstacles import Obstacle, TopRule
from fellspan.terrain.tables import Fields, shown
from fellspan.vocabulary import CoverKind

ATTRIBUTES: Final = (
    "name",
    "kind",
    "envelope",
    "height_m",
    "top_amsl_m",
    "heights_m",
    "tops_amsl_m",
    "sag_m",
    "radius_m",
    "width_m",
    "growth_m_per_year",
    "error_m",
    "source",
    "note",
    "vertical_datum",
)
"""Columns of a CSV file and properties of a GeoJSON feature."""

MIN_AMSL_M, MAX_AMSL_M, MAX_HEIGHT_M = -500.0, 9500.0, 2000.0
MIN_RADIUS_M = 0.05
"""A point stands for at least this, m: a mast without any width would never be met."""
DEFAULT_RADIUS_M, DEFAULT_WIDTH_M = 2.0, 1.0
"""Radius of a point and width of a line whose row states none, m (common practice, no source)."""

_SUFFIXES: Final = (".geojson", ".json")
_ENVELOPE_HEIGHT = re.compile(r"(?<![\w.])(\d+(?:\.\d+)?)\s*m\b")
_SPANNED = re.compile(r"\b(power|wire|cable|conductor|catenary|overhead)", re.IGNORECASE)


def read_obstacles(path: str | Path) -> tuple[tuple[Obstacle, ...], tuple[str, ...], tuple[str, ...]]:
    """The obstacles of a file, the vertical datums its rows state, and notes.

    Raises
    ------
    ObstacleFileError
        The file cannot be read, has an unknown column or property, or a row that cannot be used.
    """
    file = Path(path)
    notes: list[str] = []
    datums: list[str] = []
    obstacles: list[Obstacle] = []
    records = feature_shapes(file, ATTRIBUTES) if file.suffix.lower() in _SUFFIXES else table_shapes(file, ATTRIBUTES)
    for fields, shape in records:
        datum = fields.text("vertical_datum")
        if datum and datum not in datums:
            datums.append(datum)
        for part in simple_parts(shape, fields, notes):
            obstacles.append(_obstacle(fields, part, file))
    return tuple(obstacles), tuple(datums), tuple(dict.fromkeys(notes))


def _obstacle(fields: Fields, shape: BaseGeometry, file: Path) -> Obstacle:
    form = shape.geom_type
    envelope = fields.text("envelope")
    name = fields.text("name")
    height = fields.number("height_m", 0.0, MAX_HEIGHT_M)
    top = fields.number("top_amsl_m", MIN_AMSL_M, MAX_AMSL_M)
    heights = fields.numbers("heights_m", 0.0, MAX_HEIGHT_M)
    tops = fields.numbers("tops_amsl_m", MIN_AMSL_M, MAX_AMSL_M)
    sag = fields.number("sag_m", 0.0, 500.0)
    radius = fields.number("radius_m", 0.0, 50_000.0)
    width = fields.number("width_m", 0.0, 50_000.0)
    if (stated := _ENVELOPE_HEIGHT.search(envelope)) and height is None and top is None:
        height = float(stated.group(1))
        if height > MAX_HEIGHT_M:
            raise fields.fail(f"envelope '{shown(envelope)}' is outside 0 to {MAX_HEIGHT_M:g} m")
    given = [
        label
        for label, value in zip(
            ("height_m", "top_amsl_m", "heights_m", "tops_amsl_m"), (height, top, heights, tops), strict=True
        )
        if value is not None
    ]
    if len(given) != 1:
        said = " and ".join(given) if given else "no height"
        raise fields.fail(f"{said} given", "give one of height_m (above ground) and top_amsl_m (above sea level)")
    if radius is not None and form != "Point":
        raise fields.fail(f"radius_m {radius:g} given for a {form}", "radius_m belongs to points; lines take width_m")
    for label, value in (("width_m", width), ("sag_m", sag), ("heights_m", heights), ("tops_amsl_m", tops)):
        if value is not None and form != "LineString":
            raise fields.fail(f"{label} {shown(value)} given for a {form}", f"{label} belongs to lines")
    supports = len(shape.coords) if isinstance(shape, LineString) else 0
    for label, many in (("heights_m", heights), ("tops_amsl_m", tops)):
        if many is not None and len(many) != supports:
            raise fields.fail(f"{label} has {len(many)} values for {supports} points of the line", "give one a point")
    default: CoverKind = "building" if form == "Polygon" and not envelope else "other"
    kind = fields.kind(default)
    spanned = form == "LineString" and (
        sag is not None or heights is not None or tops is not None or bool(_SPANNED.search(f"{envelope} {name}"))
    )
    if spanned and top is not None:
        tops, top = (top,) * supports, None
    growth = fields.number("growth_m_per_year", 0.0, 10.0)
    return Obstacle(
        name=name or envelope or f"{kind} {fields.where.rsplit(', ', 1)[1]}",
        kind=kind,
        shape=shape,
        rule=_rule(form, kind, envelope=bool(envelope), sea=top is not None, spanned=spanned),
        source=fields.text("source") or file.name,
        height_m=height,
        top_amsl_m=top,
        heights_m=heights,
        tops_amsl_m=tops,
        sag_m=sag or 0.0,
        radius_m=(DEFAULT_RADIUS_M if radius is None else max(radius, MIN_RADIUS_M)) if form == "Point" else 0.0,
        width_m=max(DEFAULT_WIDTH_M if width is None else width, 0.02) if form == "LineString" else 0.0,
        growth_m_per_year=growth or 0.0,
        error_m=fields.number("error_m", 0.0, 1000.0),
        moves=bool(envelope) or form == "LineString",
    )


def _rule(form: str, kind: CoverKind, *, envelope: bool, sea: bool, spanned: bool) -> TopRule:
    if spanned:
        return "span"
    if sea:
        return "sea"
    if form == "LineString" or (form == "Polygon" and (kind == "tree" or envelope)):
        return "follow"
    return "level"
