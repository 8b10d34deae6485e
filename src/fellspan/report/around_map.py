"""The map of heights around a site: classes of needed height as a picture on the grid of a web map, over a relief.

Darker is lower, so that classes are told apart without colour too. Reads the field and computes no height.
"""

import base64
import math
import warnings
from dataclasses import dataclass
from typing import Final

import numpy as np
from affine import Affine
from numpy.typing import NDArray
from rasterio.errors import NotGeoreferencedWarning
from rasterio.io import MemoryFile

from fellspan.geodesy.geodesic import WGS84_GEOD
from fellspan.geodesy.transforms import WGS84, transformer
from fellspan.planning.around import Around
from fellspan.report.map_geometry import Places, nearest_turn, window_of
from fellspan.report.relief import SPHERE_M, MapWindow, mercator_y
from fellspan.terrain.raster_file import on_plane

PIXELS: Final = 1_000
_RAMP: Final = (
    (0.0, (8, 58, 69)),
    (0.3, (30, 112, 122)),
    (0.6, (104, 164, 148)),
    (0.8, (196, 196, 128)),
    (1.0, (244, 222, 150)),
)
"""From the lowest mast to the highest: luminance rises all along."""
NO_ANSWER: Final = (92, 84, 96)
_OPAQUE, _STRIPE = 190, 6


@dataclass(frozen=True, slots=True, kw_only=True)
class HeightClass:
    """One class of the map: heights above `from_m` up to `to_m`, its colour, and its share of the area with an answer."""

    from_m: float
    to_m: float
    colour: tuple[int, int, int]
    share: float

    @property
    def label(self) -> str:
        """`5 to 10 m`."""
        return f"up to {self.to_m:g} m" if self.from_m <= 0.0 else f"{self.from_m:g} to {self.to_m:g} m"


@dataclass(frozen=True, slots=True, kw_only=True)
class HeightMap:
    """The picture as a data URI, the window it fills, its classes, and whether some of it has no answer."""

    url: str
    window: MapWindow
    classes: tuple[HeightClass, ...]


def luminance(colour: tuple[int, int, int]) -> float:
    """What is left of a colour in grey, 0 to 255 (Rec. ITU-R BT.601, luma)."""
    return 0.299 * colour[0] + 0.587 * colour[1] + 0.114 * colour[2]


def classes_of(around: Around) -> tuple[HeightClass, ...]:
    """The classes, lowest first: one for each mast height."""
    count = len(around.masts_m)
    stops = [stop for stop, _ in _RAMP]
    found = []
    low_m = low_share = 0.0
    for number, (mast, share) in enumerate(zip(around.masts_m, around.shares, strict=True)):
        at = number / max(count - 1, 1)
        red, green, blue = (round(float(np.interp(at, stops, [c[i] for _, c in _RAMP]))) for i in range(3))
        found.append(HeightClass(from_m=low_m, to_m=mast, colour=(red, green, blue), share=share - low_share))
        low_m, low_share = mast, share
    return tuple(found)


def rim(around: Around, radius_m: float) -> Places:
    """Places all around the site at one distance; longitudes run on across the antimeridian."""
    at, reference = around.site.position, around.site.position.longitude_deg
    bearing = np.linspace(0.0, 360.0, 121)
    start = np.full(bearing.shape, at.longitude_deg), np.full(bearing.shape, at.latitude_deg)
    longitude, latitude, _ = WGS84_GEOD.fwd(*start, bearing, np.full(bearing.shape, radius_m))
    return [
        (round(float(y), 6), round(nearest_turn(float(x), reference), 6))
        for y, x in zip(latitude, longitude, strict=True)
    ]


def height_map(around: Around) -> HeightMap:
    """The picture of the classes; each of its points says what the cell under it says."""
    window = window_of(rim(around, around.field.radius_m), margin=0.02, aspect=1.0)
    half = math.radians(window.east_deg - window.middle_deg) * SPHERE_M
    south, north = mercator_y(window.south_deg), mercator_y(window.north_deg)
    size = max(2.0 * half, north - south) / PIXELS
    width, height = max(2, round(2.0 * half / size)), max(2, round((north - south) / size))
    x = (np.arange(width) + 0.5) * (2.0 * half / width) - half
    y = north - (np.arange(height) + 0.5) * ((north - south) / height)
    longitude = window.middle_deg + np.degrees(x / SPHERE_M)
    latitude = np.degrees(np.arctan(np.sinh(y / SPHERE_M)))
    classes = classes_of(around)
    return HeightMap(url=_picture(around, latitude, longitude, classes), window=window, classes=classes)


def _picture(
    around: Around, latitude: NDArray[np.float64], longitude: NDArray[np.float64], classes: tuple[HeightClass, ...]
) -> str:
    field, land = around.field, around.on_land()
    back: Affine = ~field.transform
    tops = np.array([item.to_m for item in classes])
    colours = np.array([(*item.colour, _OPAQUE) for item in classes] + [(0, 0, 0, 0)], dtype=np.uint8)
    to_crs = transformer(WGS84, field.crs)
    picture = np.zeros((4, latitude.size, longitude.size), dtype=np.uint8)
    columns = np.arange(longitude.size)
    turned = (longitude + 180.0) % 360.0 - 180.0
    for row, lat in enumerate(latitude.tolist()):
        place_x, place_y = to_crs.transform(turned, np.full(turned.shape, lat))
        place_x = np.asarray(place_x)
        if to_crs.target_crs is not None and to_crs.target_crs.is_geographic:
            middle = field.transform.c + field.transform.a * field.shape[1] / 2.0
            place_x = place_x + 360.0 * np.round((middle - place_x) / 360.0)
        column, line = (np.floor(v) for v in on_plane(back, place_x, np.asarray(place_y)))
        inside = (column >= 0) & (column < field.shape[1]) & (line >= 0) & (line < field.shape[0])
        at = np.where(inside, line, 0).astype(np.int64), np.where(inside, column, 0).astype(np.int64)
        needed, away = field.needed_m[at], field.distance_m[at]
        inside &= (away <= field.radius_m) & land[at]
        known = inside & np.isfinite(needed)
        colour = colours[np.where(known, np.searchsorted(tops, needed), len(classes))]
        # no answer is striped, so that it is not taken for a height
        striped = inside & ~known & ((columns + row) % _STRIPE < 2)
        colour[striped] = (*NO_ANSWER, 230)
        picture[:, row, :] = colour.T
    return "data:image/png;base64," + base64.b64encode(_png(picture)).decode("ascii")


def _png(picture: NDArray[np.uint8]) -> bytes:
    bands, height, width = picture.shape
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", NotGeoreferencedWarning)
        with MemoryFile() as memory:
            with memory.open(driver="PNG", width=width, height=height, count=bands, dtype="uint8", zlevel=9) as file:
                file.write(picture)
            return bytes(memory.read())
