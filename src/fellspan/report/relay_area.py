"""The cells of a relay search as areas in degrees, for the map and for GeoJSON. Judges no cell."""

import numpy as np
import rasterio.features
import shapely
import shapely.affinity
from shapely.geometry.base import BaseGeometry

from fellspan.geodesy.transforms import WGS84, transformer
from fellspan.planning.relay_result import RelayArea

MOST_CORNERS = 6_000
"""Corners of an area on a map; one of more is drawn a little simpler."""

Rings = list[list[list[float]]]
"""The rings of one polygon, the outer one first, as latitude and longitude pairs."""


def area_outline(area: RelayArea) -> BaseGeometry:
    """The cells of an area as polygons, degrees of longitude and latitude (WGS 84).

    Exact to a ten-millionth of a degree; outer rings run anticlockwise, and an area across the antimeridian is cut there.
    """
    whole = _joined(area)
    west, _, east, _ = whole.bounds
    if west >= -180.0 and east <= 180.0:
        return whole
    turns = [shapely.affinity.translate(whole, turn) for turn in (-360.0, 0.0, 360.0)]
    within = [shapely.intersection(turn, shapely.box(-180.0, -90.0, 180.0, 90.0)) for turn in turns]
    return _tidy(shapely.union_all(np.array(within, dtype=object)))


def area_rings(area: RelayArea, reference_deg: float) -> list[Rings]:
    """The same for a map whose longitudes run on around `reference_deg`, with no more corners than a page can carry."""
    whole = _joined(area)
    middle = 0.5 * (whole.bounds[0] + whole.bounds[2])
    by = 360.0 * round((reference_deg - middle) / 360.0)
    cell_deg = np.sqrt(area.area_m2 / max(area.cells, 1)) / 111_132.0
    allowed = 0.0
    drawn = whole
    while shapely.get_num_coordinates(drawn) > MOST_CORNERS and allowed < 64.0 * cell_deg:
        allowed = max(0.5 * cell_deg, 2.0 * allowed)
        drawn = shapely.simplify(whole, allowed)
    return [
        [[[round(y, 6), round(x + by, 6)] for x, y in ring.coords] for ring in (part.exterior, *part.interiors)]
        for part in shapely.get_parts(drawn)
        if part.geom_type == "Polygon" and not part.is_empty
    ]


def area_corners(area: RelayArea, reference_deg: float) -> list[tuple[float, float]]:
    """Corners (latitude, longitude) of the rectangle that holds its cells, on a map as for `area_rings`; none of no cells."""
    if not area.cells:
        return []
    rows, columns = (np.flatnonzero(area.clear.any(axis=axis)) for axis in (1, 0))
    corners = [(column, row) for row in (rows[0], rows[-1] + 1) for column in (columns[0], columns[-1] + 1)]
    x, y = zip(*(area.transform @ (float(column), float(row)) for column, row in corners), strict=True)
    longitude, latitude = transformer(area.crs, WGS84).transform(np.array(x), np.array(y))
    turned = np.asarray(longitude) + 360.0 * np.round((reference_deg - np.asarray(longitude)) / 360.0)
    return list(zip(np.asarray(latitude).tolist(), turned.tolist(), strict=True))


def _joined(area: RelayArea) -> BaseGeometry:
    """All cells as one shape, its longitudes running on across the antimeridian."""
    to_degrees = transformer(area.crs, WGS84)
    shapes = rasterio.features.shapes(area.clear.astype("uint8"), mask=area.clear, transform=area.transform)
    parts = [shapely.geometry.shape(geometry) for geometry, value in shapes if value]
    reference: list[float] = []

    def degrees(at: np.ndarray) -> np.ndarray:
        longitude, latitude = (np.asarray(one) for one in to_degrees.transform(at[:, 0], at[:, 1]))
        if longitude.size and not reference:
            reference.append(float(longitude[0]))
        turns = np.round((reference[0] - longitude) / 360.0) if longitude.size else longitude
        return np.column_stack((longitude + 360.0 * turns, latitude))

    joined: BaseGeometry = shapely.transform(shapely.GeometryCollection(parts), degrees)
    return _tidy(shapely.unary_union(joined))


def _tidy(shape: BaseGeometry) -> BaseGeometry:
    rounded: BaseGeometry = shapely.orient_polygons(shapely.set_precision(shape, 1e-7))
    return rounded
