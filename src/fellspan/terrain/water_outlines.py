"""Outlines of open water, or of other areas, from a GeoJSON file, and which places lie within them.

Knows nothing of levels, paths and reflections.
"""

import json
import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import shapely
from numpy.typing import NDArray
from shapely.geometry.base import BaseGeometry

from fellspan.errors import TerrainError
from fellspan.terrain.obstacle_shapes import simple_parts
from fellspan.terrain.tables import Fields, read_text, shown

Floats = NDArray[np.float64]


class WaterFileError(TerrainError):
    """A file of water outlines cannot be used."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class WaterOutlines:
    """Areas of open water, longitude and latitude on WGS 84."""

    shape: BaseGeometry

    def inside(self, latitude_deg: Floats, longitude_deg: Floats) -> NDArray[np.bool_]:
        """Which places lie within an outline; shape of the inputs."""
        within = np.zeros(latitude_deg.shape, dtype=np.bool_)
        west, _, east, _ = self.shape.bounds
        for turn in (-360.0, 0.0, 360.0):
            longitude = longitude_deg + turn
            if longitude.max() >= west and longitude.min() <= east:
                within |= shapely.contains_xy(self.shape, longitude, latitude_deg)
        return within


def read_outlines(paths: tuple[str | Path, ...], *, what: str = "water") -> WaterOutlines | None:
    """The outlines of all files together; None where no file is given.

    Properties of the features are not read, so any file of areas will do; `what` is what messages call them.

    Raises
    ------
    WaterFileError
        A file cannot be read, is no GeoJSON on WGS 84, or holds something else than areas.
    """
    parts: list[BaseGeometry] = []
    for path in paths:
        parts += _areas(Path(path), what)
    if not parts:
        return None
    shape = shapely.union_all(np.array(parts, dtype=object))
    shapely.prepare(shape)
    return WaterOutlines(shape=shape)


def _areas(file: Path, what: str) -> list[BaseGeometry]:
    head = f"{what} file '{file.name}'"
    try:
        data = json.loads(read_text(file, WaterFileError, what))
    except (ValueError, RecursionError) as problem:
        if isinstance(problem, WaterFileError):
            raise
        raise WaterFileError(f"{head}: not GeoJSON", "give a FeatureCollection of Polygons") from None
    if not isinstance(data, dict) or data.get("type") not in ("FeatureCollection", "Feature"):
        raise WaterFileError(f"{head}: not GeoJSON features", "give a FeatureCollection of Polygons")
    crs = json.dumps(data.get("crs"))
    if data.get("crs") is not None and not re.search(r"CRS84|4326", crs[:500]):
        raise WaterFileError(
            f"{head}: coordinates in '{shown(crs)}'", "GeoJSON is in WGS 84 longitude and latitude; convert it"
        )
    features = data.get("features") if data["type"] == "FeatureCollection" else [data]
    if not isinstance(features, list) or not features:
        raise WaterFileError(f"{head}: it holds no features", "give a FeatureCollection of Polygons")
    return [
        part
        for number, feature in enumerate(features, start=1)
        for part in _parts(feature, f"{head}, feature {number}")
    ]


def _parts(feature: object, where: str) -> list[BaseGeometry]:
    fields = Fields(where=where, values={}, error=WaterFileError)
    geometry = feature.get("geometry") if isinstance(feature, dict) else None
    if not isinstance(geometry, dict):
        raise fields.fail("no geometry", "give a Polygon")
    try:
        shape = shapely.from_geojson(json.dumps(geometry))
    except (shapely.errors.GEOSException, ValueError, TypeError, RecursionError):
        raise fields.fail(f"geometry '{shown(geometry)}' is not a shape", "give a Polygon") from None
    parts = simple_parts(shape, fields, [])
    for part in parts:
        if part.geom_type != "Polygon":
            raise fields.fail(f"a {part.geom_type} is no area", "give a Polygon")
    return parts
