"""What `fellspan around` writes: needed heights as a GeoTIFF, contours as GeoJSON, numbers as JSON, beside the page.

All files are written beside their places first and moved there when all are whole, around.json last. Computes no height.
"""

import json
import os
from contextlib import suppress
from pathlib import Path
from typing import Any, Final

import numpy as np
import rasterio
from numpy.typing import NDArray
from rasterio import features
from rasterio.crs import CRS
from shapely import MultiPolygon, Polygon, box
from shapely.affinity import translate
from shapely.geometry import mapping
from shapely.geometry.polygon import orient

from fellspan import __version__
from fellspan.design.sweep import HeightField
from fellspan.errors import OutputError
from fellspan.exports.text import finite, rounded, utf8
from fellspan.geodesy.transforms import WGS84, transformer
from fellspan.planning.around import Around, Farthest
from fellspan.report.around_page import render_around_page
from fellspan.terrain.raster_file import on_plane

RASTER, CONTOURS, PAGE, NUMBERS = "heights.tif", "contours.geojson", "index.html", "around.json"
NAMES: Final = (PAGE, RASTER, CONTOURS, NUMBERS)
NODATA: Final = -9999.0
MOST_SIDE: Final = 1_500
"""Contours are drawn on cells joined so that a side has no more; a joined cell counts where most of it does."""
_PART: Final = ".part"


def around_dict(around: Around) -> dict[str, Any]:
    """The answer as plain data; null for what is unknown."""
    field, site = around.field, around.site
    return {
        "schema": 1,
        "fellspan": __version__,
        "around": {
            "site": site.name,
            "latitude_deg": site.position.latitude_deg,
            "longitude_deg": site.position.longitude_deg,
            "antenna_amsl_m": rounded(field.antenna_amsl_m),
            "antenna_m": rounded(site.height_m),
            "above": site.height_reference,
            "height_from": utf8(around.height_from) or None,
            "frequency_hz": field.frequency_hz,
            "radius_m": field.radius_m,
            "cell_m": rounded(field.cell_m),
            "basis": around.basis,
            "criteria": [
                {"criterion": rule.name, "k": finite(rule.k), "required_fraction": rule.fraction, "source": rule.source}
                for rule in field.criteria
            ],
            "masts_m": list(around.masts_m),
            "other_height_m": around.other_m,
            "shares": [rounded(value, 5) for value in around.shares],
            "sight_shares": [rounded(value, 5) for value in around.sight_shares],
            "known_share": rounded(around.known_share, 5),
            "farthest": _farthest(around.farthest),
            "sectors": [
                {
                    "sector": sector.name,
                    "known_share": rounded(sector.known_share, 5),
                    "shares": None if sector.shares is None else [rounded(value, 5) for value in sector.shares],
                    "farthest": _farthest(sector.farthest),
                }
                for sector in around.sectors
            ],
            "cautions": list(around.cautions),
        },
    }


def _farthest(found: Farthest | None) -> dict[str, Any] | None:
    if found is None:
        return None
    return {
        "distance_m": rounded(found.distance_m, 1),
        "bearing_deg": rounded(found.bearing_deg, 2),
        "latitude_deg": rounded(found.position.latitude_deg, 7),
        "longitude_deg": rounded(found.position.longitude_deg, 7),
        "needed_m": rounded(found.needed_m, 2),
    }


def around_json(around: Around) -> str:
    """The text of around.json."""
    return utf8(json.dumps(around_dict(around), ensure_ascii=False, allow_nan=False, indent=1) + "\n")


def contours_geojson(around: Around) -> str:
    """A FeatureCollection (RFC 7946) of areas: for each mast, lowest first, where it is enough; and where no answer is known.

    Positions are WGS 84; outlines follow cells, joined where there are many, and do not cross longitude 180.
    """
    field = around.field
    factor = max(1, -(-max(field.shape) // MOST_SIDE))
    land = around.on_land()
    made = []
    for mast in around.masts_m:
        shapes = _areas(field, np.asarray((field.needed_m <= mast) & land), factor)
        made.append(_feature(shapes, {"what": "reached", "mast_m": mast, "cell_m": round(field.cell_m * factor, 3)}))
    unknown = np.isnan(field.needed_m) & (field.distance_m <= field.radius_m)
    made.append(_feature(_areas(field, unknown, factor), {"what": "no answer", "mast_m": None}))
    site = around.site.position
    point = {"type": "Point", "coordinates": [round(site.longitude_deg, 7), round(site.latitude_deg, 7)]}
    properties = {"what": "site", "name": utf8(around.site.name), "antenna_amsl_m": rounded(field.antenna_amsl_m)}
    made.append({"type": "Feature", "geometry": point, "properties": properties})
    text = json.dumps({"type": "FeatureCollection", "features": made}, ensure_ascii=False, allow_nan=False)
    return text + "\n"


def _feature(shapes: MultiPolygon, properties: dict[str, Any]) -> dict[str, Any]:
    return {"type": "Feature", "geometry": mapping(shapes), "properties": properties}


def _areas(field: HeightField, mask: NDArray[np.bool_], factor: int) -> MultiPolygon:
    """Outlines of what is true in a mask of the field's cells, degrees."""
    rows, columns = mask.shape
    high, wide = -(-rows // factor), -(-columns // factor)
    if factor > 1:
        padded = np.zeros((high * factor, wide * factor), dtype=np.float32)
        padded[:rows, :columns] = mask
        mask = padded.reshape(high, factor, wide, factor).mean(axis=(1, 3)) > 0.5
    found: list[Polygon] = []
    for outline, _ in features.shapes(mask.astype(np.uint8), mask=mask, connectivity=4):
        found += _on_earth(Polygon(*_in_degrees(field, outline["coordinates"], factor)))
    return MultiPolygon(found)


def _in_degrees(
    field: HeightField, rings: list[list[tuple[float, float]]], factor: int
) -> tuple[NDArray[np.float64], list[NDArray[np.float64]]]:
    """Outer and inner rings in cells as longitude and latitude, which run on across the antimeridian."""
    here, placed = field.site.position.longitude_deg, []
    for ring in rings:
        corners = np.asarray(ring, dtype=np.float64) * factor
        x, y = on_plane(field.transform, corners[:, 0], corners[:, 1])
        longitude, latitude = (np.asarray(v) for v in transformer(field.crs, WGS84).transform(x, y))
        longitude = longitude - 360.0 * np.round((longitude - here) / 360.0)
        placed.append(np.round(np.column_stack((longitude, latitude)), 6))
    return placed[0], placed[1:]


def _on_earth(polygon: Polygon) -> list[Polygon]:
    """Cut at longitude 180 and wound as RFC 7946 has it."""
    west, _, east, _ = polygon.bounds
    if west >= -180.0 and east <= 180.0:
        return [orient(polygon)]
    parts = []
    for turn in (-360.0, 0.0, 360.0):
        cut = polygon.buffer(0).intersection(box(turn - 180.0, -90.0, turn + 180.0, 90.0))
        for piece in getattr(cut, "geoms", [cut]):
            if isinstance(piece, Polygon) and not piece.is_empty:
                parts.append(orient(translate(piece, -turn)))
    return parts


def write_around(around: Around, folder: Path) -> tuple[str, ...]:
    """Write page, raster, contours and numbers into a folder, all or none; the names, around.json last.

    Raises
    ------
    OutputError
        The folder cannot be made or written, or holds a file of one of the names that Fellspan did not write.
    """
    texts = {PAGE: render_around_page(around), CONTOURS: contours_geojson(around), NUMBERS: around_json(around)}
    parts = {name: folder / f".{name}{_PART}" for name in NAMES}
    try:
        folder.mkdir(parents=True, exist_ok=True)
        _refuse_foreign(folder)
        for name, text in texts.items():
            with parts[name].open("w", encoding="utf-8", newline="\n") as stream:
                stream.write(utf8(text))
                stream.flush()
                os.fsync(stream.fileno())
        write_raster(around, parts[RASTER])
        (folder / NUMBERS).unlink(missing_ok=True)
        for name in NAMES:
            parts[name].replace(folder / name)
    except OutputError:
        raise
    except (OSError, rasterio.errors.RasterioError) as error:
        raise OutputError(
            f"the answer cannot be written to '{folder}': {getattr(error, 'strerror', None) or error}",
            "check that the disk has room and that you may write there",
        ) from error
    finally:
        for part in parts.values():
            with suppress(OSError):
                part.unlink(missing_ok=True)
    return NAMES


def _refuse_foreign(folder: Path) -> None:
    """Files of these names are replaced only beside an around.json of ours."""
    there = [name for name in NAMES if os.path.lexists(folder / name)]
    if not there:
        return
    try:
        found = json.loads((folder / NUMBERS).read_text(encoding="utf-8"))
    except (OSError, ValueError, RecursionError):
        found = None
    if not (isinstance(found, dict) and {"schema", "fellspan", "around"} <= found.keys()):
        raise OutputError(
            f"'{folder / there[0]}' is there already and was not written by fellspan around",
            "give another folder, or move that file away",
        )


def write_raster(around: Around, path: Path) -> None:
    """Needed heights as a GeoTIFF: float32, m above ground, `NODATA` where no answer is, in the cells of the ground raster."""
    field = around.field
    rows, columns = field.shape
    rules = "; ".join(rule.name for rule in field.criteria)
    layout = {"tiled": True, "blockxsize": 256, "blockysize": 256, "compress": "deflate", "predictor": 3, "zlevel": 5}
    with rasterio.open(
        path, "w", driver="GTiff", width=columns, height=rows, count=1, dtype="float32", nodata=NODATA,
        crs=CRS.from_user_input(field.crs), transform=field.transform, **layout,
    ) as dataset:  # fmt: skip
        for first in range(0, rows, 256):
            part = field.needed_m[first : first + 256]
            cells = np.where(np.isfinite(part), part, np.float32(NODATA))
            dataset.write(cells, 1, window=rasterio.windows.Window(0, first, columns, part.shape[0]))
        dataset.units = ("m",)
        dataset.set_band_description(1, "antenna height above ground at which everything asked is free")
        dataset.update_tags(
            SITE=utf8(around.site.name), FREQUENCY_HZ=f"{field.frequency_hz:.0f}", CRITERIA=rules, BASIS=around.basis,
            ANTENNA_AMSL_M=f"{field.antenna_amsl_m:.2f}", SOFTWARE=f"Fellspan {__version__}",
        )  # fmt: skip
