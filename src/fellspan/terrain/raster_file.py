"""What the header of one raster says, checked and taken to metres: the raster as a thing to sample.

Reads headers only; `blocks` reads cells. Knows nothing of paths, nor of other rasters.
"""

import os
from dataclasses import dataclass
from typing import Any, cast

import numpy as np
from affine import Affine
from numpy.typing import NDArray
from rasterio.enums import ColorInterp, MaskFlags
from rasterio.io import DatasetReader

from fellspan.errors import RasterError
from fellspan.geodesy.geodesic import inverse_many
from fellspan.geodesy.transforms import WGS84, transformer
from fellspan.terrain.error_model import default_error_m
from fellspan.terrain.handles import gdal, gdal_errors, open_dataset
from fellspan.terrain.remote import shown_address
from fellspan.terrain.sources import CoverSource, RasterSource
from fellspan.terrain.units import METRES_PER, metres_per_unit, reference_system
from fellspan.vocabulary import RasterRole


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RasterFile:
    """One band of one raster.

    `transform` takes (column, row), counted from the outer corner of the first cell, to coordinates of `crs_text`;
    the centre of the first cell is therefore at (0.5, 0.5). `bounds` are x_min, y_min, x_max, y_max there.
    """

    path: str
    name: str
    role: RasterRole
    band: int
    width: int
    height: int
    block_height: int
    block_width: int
    dtype: str
    driver: str
    transform: Affine
    bounds: tuple[float, float, float, float]
    crs_name: str
    crs_text: str
    period: float | None
    """A full turn in units of the CRS, None unless it is geographic."""
    nodata: float | None
    has_mask: bool
    scale: float
    offset: float
    unit_m: float
    """Metres in one unit of `scale * cell + offset`."""
    unit_is_stated: bool
    vertical_datum: str | None
    cell_x_m: float
    cell_y_m: float
    sigma_m: float
    sigma_is_stated: bool

    @property
    def cell_m(self) -> float:
        """The shorter side of a cell on the ground at the raster's centre, m."""
        return min(self.cell_x_m, self.cell_y_m)

    @property
    def cell_crs(self) -> float:
        """The narrowest width of a cell in units of the CRS."""
        t = self.transform
        return float(abs(t.determinant) / max(np.hypot(t.a, t.d), np.hypot(t.b, t.e)))

    def cell_at_m(self, x: float, y: float) -> tuple[float, float]:
        """Sides of a cell on the ground, m, along columns and along rows, at a point in the raster's CRS."""
        return _cell_on_ground(self.transform, self.crs_text, x, y)


def read_header(source: RasterSource | CoverSource, *, path: str, name: str, role: RasterRole) -> RasterFile:
    """Open `path`, check that its band can serve as heights on Earth, and close it.

    Raises
    ------
    RasterError
        No raster, no such band, no CRS, no placement on Earth, a picture, or a unit that is no length.
    """
    with gdal(), open_dataset(path, name) as dataset, gdal_errors(name, "read"):
        return _header(source, dataset, path=path, name=name, role=role)


def _header(
    source: RasterSource | CoverSource, dataset: DatasetReader, *, path: str, name: str, role: RasterRole
) -> RasterFile:
    _check_band(dataset, source.band, name)
    _check_placement(dataset, name)
    _check_length(dataset, path, name)
    system = reference_system(dataset.crs.to_wkt(version="WKT2_2019"), name)
    band = source.band - 1
    unit_m, stated = _unit(source, dataset.units[band], system.vertical_unit_m, name)
    transform = dataset.transform
    width, height = dataset.width, dataset.height
    xs, ys = on_plane(transform, np.array([0, width, 0, width]), np.array([0, 0, height, height]))
    x, y = (float(v) for v in on_plane(transform, np.array(width / 2.0), np.array(height / 2.0)))
    cell_x, cell_y = _cell_on_ground(transform, system.horizontal, x, y)
    if not (np.isfinite(cell_x) and np.isfinite(cell_y) and min(cell_x, cell_y) > 0.0):
        raise RasterError(
            f"{name} does not lie on Earth by its own coordinate reference system ({system.name})",
            f"its centre is at {x:g}, {y:g} there",
            "the CRS is probably wrong; assign the right one, for instance with: gdal_edit.py -a_srs EPSG:CODE FILE",
        )
    datum = source.vertical_datum if isinstance(source, RasterSource) else None
    flags = dataset.mask_flag_enums[band]
    block_height, block_width = dataset.block_shapes[band]
    return RasterFile(
        path=path,
        name=name,
        role=role,
        band=source.band,
        width=width,
        height=height,
        block_height=int(block_height),
        block_width=int(block_width),
        dtype=str(dataset.dtypes[band]),
        driver=str(dataset.driver),
        transform=transform,
        bounds=(float(xs.min()), float(ys.min()), float(xs.max()), float(ys.max())),
        crs_name=system.name,
        crs_text=system.horizontal,
        period=system.period,
        nodata=cast("float | None", dataset.nodatavals[band]),
        has_mask=MaskFlags.per_dataset in flags,  # GDAL counts alpha bands among these
        scale=float(dataset.scales[band]),
        offset=float(dataset.offsets[band]),
        unit_m=unit_m,
        unit_is_stated=stated,
        vertical_datum=None if role == "cover" else (datum or system.vertical_datum),
        cell_x_m=cell_x,
        cell_y_m=cell_y,
        sigma_m=source.error_m if source.error_m is not None else default_error_m(min(cell_x, cell_y), role),
        sigma_is_stated=source.error_m is not None,
    )


def _check_band(dataset: DatasetReader, band: int, name: str) -> None:
    if dataset.count == 0:
        inside = dataset.subdatasets
        raise RasterError(
            f"{name} holds {len(inside)} rasters instead of one" if inside else f"{name} holds no band",
            *((f"name one of them, for instance {inside[0]}",) if inside else ("bring a raster with heights in it",)),
        )
    if not 1 <= band <= dataset.count:
        raise RasterError(f"{name} has no band {band}", f"allowed are 1 to {dataset.count}")
    kind = dataset.colorinterp[band - 1]
    if kind in (ColorInterp.red, ColorInterp.green, ColorInterp.blue, ColorInterp.palette) and dataset.count != 1:
        raise RasterError(
            f"{name} is a picture (band {band} is '{kind.name}'), not heights",
            "bring the elevation raster itself, not its shaded or coloured drawing",
        )
    if dataset.dtypes[band - 1].startswith("complex"):
        raise RasterError(f"{name} holds complex numbers ({dataset.dtypes[band - 1]}), not heights")


def _check_placement(dataset: DatasetReader, name: str) -> None:
    unplaced = dataset.transform == Affine.identity()
    if unplaced and (dataset.gcps[0] or dataset.rpcs is not None):
        how = "ground control points" if dataset.gcps[0] else "a camera model (RPC)"
        raise RasterError(
            f"{name} is placed on Earth by {how} only and has no regular grid",
            "warp it to a grid first, for instance with: gdalwarp -t_srs EPSG:CODE FILE OUT.tif",
        )
    if dataset.crs is None:
        raise RasterError(
            f"{name} has no coordinate reference system",
            "assign the one it was made in, for instance with: gdal_edit.py -a_srs EPSG:CODE FILE",
        )
    if unplaced or dataset.transform.is_degenerate:
        raise RasterError(
            f"{name} does not say where its cells lie (no geotransform)",
            "bring it with its world file or georeferenced, as a GeoTIFF for instance",
        )


def _check_length(dataset: DatasetReader, path: str, name: str) -> None:
    """Find a GeoTIFF cut short by where its last block should end, before some path happens to cross the end."""
    if dataset.driver != "GTiff" or not os.path.isfile(path):
        return
    rows, columns = dataset.block_shapes[0]
    block = f"{-(-dataset.width // columns) - 1}_{-(-dataset.height // rows) - 1}"
    at, size = (dataset.get_tag_item(f"BLOCK_{what}_{block}", "TIFF", bidx=1) for what in ("OFFSET", "SIZE"))
    if at is not None and size is not None and int(at) + int(size) > os.path.getsize(path):
        raise RasterError(
            f"{name} is cut short: it has {os.path.getsize(path)} bytes and should have {int(at) + int(size)} or more",
            "copy or download it again",
        )


def _unit(
    source: RasterSource | CoverSource, of_band: str | None, of_crs_m: float | None, name: str
) -> tuple[float, bool]:
    """Metres in one unit, and whether anybody states it."""
    if source.vertical_unit is not None:
        return METRES_PER[source.vertical_unit], True
    if of_band:
        metres = metres_per_unit(of_band)
        if metres is None:
            raise RasterError(
                f"{name} states '{of_band[:40]}' as the unit of its values, which is no length",
                'if the values are heights, state their unit with unit = "m", "ft" or "us-ft"',
            )
        return metres, True
    if of_crs_m is not None:
        return of_crs_m, True
    return 1.0, False


def _cell_on_ground(transform: Affine, crs_text: str, x: float, y: float) -> tuple[float, float]:
    along_columns, along_rows = cells_on_ground(transform, crs_text, np.array([x]), np.array([y]))
    return float(along_columns[0]), float(along_rows[0])


def cells_on_ground(
    transform: Affine, crs_text: str, x: NDArray[np.float64], y: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Sides of a cell on the ground, m, along columns and along rows, at points (n,) in a CRS."""
    a, b, d, e = (0.5 * value for value in (transform.a, transform.b, transform.d, transform.e))
    xs, ys = np.stack((x - a, x + a, x - b, x + b)), np.stack((y - d, y + d, y - e, y + e))
    lon, lat = transformer(crs_text, WGS84).transform(xs, ys)
    lengths = inverse_many(lat[0::2], lon[0::2], lat[1::2], lon[1::2]).distance_m
    return lengths[0], lengths[1]


def on_plane(transform: Affine, column: NDArray[Any], row: NDArray[Any]) -> tuple[NDArray[Any], NDArray[Any]]:
    """What `transform` makes of arrays of columns and rows; inverse transforms go the other way."""
    t = transform
    return t.a * column + t.b * row + t.c, t.d * column + t.e * row + t.f


def chained(outer: Affine, inner: Affine) -> Affine:
    """The transform that does `inner` first; the sign for it differs between releases of affine."""
    o, i = outer, inner
    return Affine(
        o.a * i.a + o.b * i.d,
        o.a * i.b + o.b * i.e,
        o.a * i.c + o.b * i.f + o.c,
        o.d * i.a + o.e * i.d,
        o.d * i.b + o.e * i.e,
        o.d * i.c + o.e * i.f + o.f,
    )


def base_name(path: str) -> str:
    """What to call a raster before people."""
    path = shown_address(path)
    return os.path.basename(path.rstrip("/\\")) or path
