"""The one door to PROJ's transformations: network off, axes always east-north, no ballpark heights.

Rasters and coordinate text both come through here. Knows nothing of either.
"""

from functools import lru_cache

from pyproj import CRS, Transformer
from pyproj.exceptions import CRSError, ProjError
from pyproj.network import set_network_enabled  # type: ignore[attr-defined]  # public, but not re-exported to mypy

from fellspan.errors import CoordinateError

# a plan made offline must equal one made online: grids that are not installed are an error, never a download
set_network_enabled(active=False)

WGS84 = "EPSG:4326"


@lru_cache(maxsize=256)
def crs_of(text: str) -> CRS:
    """The coordinate reference system that a name, code or WKT stands for.

    Raises
    ------
    CoordinateError
        PROJ knows no such system.
    """
    try:
        return CRS.from_user_input(text.strip())
    except CRSError as error:
        shown = text if len(text) <= 60 else text[:57] + "..."
        raise CoordinateError(
            f"{shown!r} is not a coordinate reference system that PROJ knows",
            "name it by its code, for instance EPSG:32623 (UTM zone 23 north)",
        ) from error


@lru_cache(maxsize=256)
def transformer(crs_from: str, crs_to: str) -> Transformer:
    """A cached transformation between two systems named by code or WKT.

    Parameters
    ----------
    crs_from, crs_to
        Text that `crs_of` accepts.

    Returns
    -------
    transformer
        Axes are always longitude-latitude or easting-northing, in that order. Where either system has a vertical
        axis, approximations ("ballpark" transformations) are refused.

    Raises
    ------
    CoordinateError
        A system is unknown, or no transformation leads from one to the other with the grids installed.
    """
    source, target = crs_of(crs_from), crs_of(crs_to)
    vertical = any(crs.is_vertical or crs.is_compound or len(crs.axis_info) == 3 for crs in (source, target))
    try:
        return Transformer.from_crs(source, target, always_xy=True, allow_ballpark=not vertical)
    except ProjError as error:
        raise CoordinateError(
            f"no transformation leads from {source.name} to {target.name}",
            "a height grid may be missing; convert the data to a common system first",
        ) from error
