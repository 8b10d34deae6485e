"""Reads the places of obstacles: rows of a CSV file or features of a GeoJSON file, as checked shapes.

Complaints name file, row or feature, value and remedy. Knows nothing of heights and paths.
"""

import json
import re
from collections.abc import Iterator, Sequence
from pathlib import Path

import numpy as np
import shapely
from shapely.geometry.base import BaseGeometry

from fellspan.errors import ObstacleFileError
from fellspan.terrain.tables import Fields, closest, read_rows, read_text, shown

PLACE_COLUMNS = ("latitude_deg", "longitude_deg", "wkt")


def table_shapes(file: Path, attributes: Sequence[str]) -> Iterator[tuple[Fields, BaseGeometry]]:
    """The rows of a CSV file: a point, or the shape of the column `wkt`."""
    for fields in read_rows(file, (*PLACE_COLUMNS, *attributes), ObstacleFileError, "obstacle"):
        wkt = fields.text("wkt")
        latitude = fields.number("latitude_deg", -90.0, 90.0)
        longitude = fields.number("longitude_deg", -360.0, 360.0)
        if wkt:
            if latitude is not None or longitude is not None:
                raise fields.fail("both wkt and latitude_deg/longitude_deg are given", "give one of them")
            try:
                shape = shapely.from_wkt(wkt)
            except (shapely.errors.GEOSException, ValueError, TypeError):
                raise fields.fail(
                    f"wkt '{shown(wkt)}' is not a shape", "example: LINESTRING (-45.2 36.0, -45.1 36.1)"
                ) from None
            yield fields, shape
        elif latitude is None or longitude is None:
            raise fields.fail("no place", "give latitude_deg and longitude_deg, or wkt")
        else:
            yield fields, shapely.Point(longitude, latitude)


def feature_shapes(file: Path, attributes: Sequence[str]) -> Iterator[tuple[Fields, BaseGeometry]]:
    """The features of a GeoJSON file (RFC 7946): longitude and latitude on WGS 84."""
    head = f"obstacle file '{file.name}'"
    for number, feature in enumerate(_loaded(file, head), start=1):
        where = f"{head}, feature {number}"
        if not isinstance(feature, dict):
            raise ObstacleFileError(f"{where}: '{shown(feature)}' is not a feature")
        properties = feature.get("properties") or {}
        if not isinstance(properties, dict):
            raise ObstacleFileError(f"{where}: properties '{shown(properties)}' are not named values")
        for name in properties:
            if name not in attributes:
                raise ObstacleFileError(f"{where}: unknown property '{shown(name)}'", closest(str(name), attributes))
        fields = Fields(where=where, values=properties, error=ObstacleFileError)
        geometry = feature.get("geometry")
        try:
            shape = shapely.from_geojson(json.dumps(geometry))
        except (shapely.errors.GEOSException, ValueError, TypeError, RecursionError):
            raise fields.fail(f"geometry '{shown(geometry)}' is not a shape") from None
        if shape is None or geometry is None:
            raise fields.fail("no geometry", "give a Point, LineString or Polygon")
        yield fields, shape


def _loaded(file: Path, head: str) -> list[object]:
    text = read_text(file, ObstacleFileError, "obstacle")
    try:
        data = json.loads(text)
    except json.JSONDecodeError as problem:
        raise ObstacleFileError(f"{head}, line {problem.lineno}: not JSON: {problem.msg}") from None
    except (RecursionError, ValueError):
        raise ObstacleFileError(f"{head}: not GeoJSON: nested too deep or a number too long") from None
    if not isinstance(data, dict) or data.get("type") not in ("FeatureCollection", "Feature"):
        kind = data.get("type") if isinstance(data, dict) else type(data).__name__
        raise ObstacleFileError(f"{head}: type '{shown(kind)}' is not GeoJSON features", "give a FeatureCollection")
    crs = data.get("crs")
    if crs is not None and not re.search(r"CRS84|4326", json.dumps(crs)[:500]):
        raise ObstacleFileError(
            f"{head}: coordinates in '{shown(json.dumps(crs))}'",
            "GeoJSON is in WGS 84 longitude and latitude; convert it",
        )
    features = data.get("features") if data["type"] == "FeatureCollection" else [data]
    if not isinstance(features, list):
        raise ObstacleFileError(f"{head}: 'features' is not a list")
    return features


def simple_parts(shape: BaseGeometry, fields: Fields, notes: list[str]) -> list[BaseGeometry]:
    """The simple shapes of a row: checked, unwrapped across 180 degrees, outlines made valid."""
    if shape is None or shape.is_empty:
        raise fields.fail("the shape is empty", "give a Point, LineString or Polygon")
    if shapely.has_z(shape):
        notes.append(f"{fields.file}: heights inside coordinates are ignored; only the named heights count")
        shape = shapely.force_2d(shape)
    parts: list[BaseGeometry] = []
    for part in shapely.get_parts(np.array([shape], dtype=object)):
        if part.geom_type not in ("Point", "LineString", "Polygon") or part.is_empty:
            raise fields.fail(f"shape '{shown(part.geom_type)}' cannot be used", "give a Point, LineString or Polygon")
        points = shapely.get_coordinates(part)
        if not np.isfinite(points).all():
            raise fields.fail("a coordinate is not a finite number")
        worst = points[np.argmax(np.maximum(np.abs(points[:, 0]) - 360.0, np.abs(points[:, 1]) - 90.0))]
        if abs(worst[0]) > 360.0 or abs(worst[1]) > 90.0:
            raise fields.fail(
                f"coordinate {worst[0]:.9g}, {worst[1]:.9g} is not longitude, latitude in degrees",
                "longitude comes first, within -180 to 180; are they swapped, or in metres?",
            )
        try:
            flat = _unwrapped(part)
        except shapely.errors.GEOSException:
            raise fields.fail("the outline goes round a pole", "cut it into parts, none of which does") from None
        if flat.geom_type == "Polygon" and not flat.is_valid:
            notes.append(f"{fields.where}: the outline crosses itself and was mended")
            mended = shapely.get_parts(np.array([shapely.make_valid(flat)], dtype=object))
            parts.extend(piece for piece in mended if piece.geom_type == "Polygon")
        else:
            parts.append(flat)
    if not parts:
        raise fields.fail("the outline has no area")
    return parts


def _unwrapped(shape: BaseGeometry) -> BaseGeometry:
    """Longitudes that run on across 180 degrees, beginning within -180 to 180."""
    points = shapely.get_coordinates(shape)
    west, east = points[:, 0].min(), points[:, 0].max()
    if west >= -180.0 and east < 180.0 and east - west <= 180.0:
        return shape
    # Whole turns, so that a ring still ends where it begins: unwrapping rounds.
    turns = np.round((np.unwrap(points[:, 0], period=360.0) - points[:, 0]) / 360.0)
    turns -= np.floor((points[0, 0] + 180.0) / 360.0)
    longitude = points[:, 0] + 360.0 * turns
    if np.array_equal(longitude, points[:, 0]):
        return shape
    moved: BaseGeometry = shapely.set_coordinates(shapely.force_2d(shape), np.column_stack((longitude, points[:, 1])))
    return moved
