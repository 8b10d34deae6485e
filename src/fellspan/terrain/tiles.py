"""What files a declared path stands for: one raster, or a folder of tiles.

Reads names and headers; no cells.
"""

import os
from collections import Counter
from collections.abc import Sequence
from typing import Final

from fellspan.errors import RasterError
from fellspan.terrain.handles import gdal
from fellspan.terrain.raster_file import RasterFile, base_name, read_header
from fellspan.terrain.remote import is_remote
from fellspan.terrain.remote_marks import refresh
from fellspan.terrain.sources import CoverSource, RasterSource
from fellspan.vocabulary import RasterRole

# fmt: off
_CERTAIN: Final = frozenset({
    ".tif", ".tiff", ".gtiff", ".vrt", ".asc", ".hgt", ".img", ".dem", ".bil", ".bip", ".bsq", ".flt", ".dt0", ".dt1",
    ".dt2", ".grd", ".rst", ".sdat", ".ter", ".kea", ".bag", ".ers", ".bt", ".gxf",
})
# fmt: on
"""Endings of a folder's files that must open: one that does not is an error, not a tile fewer."""
_POSSIBLE: Final = frozenset(
    (".png", ".jpg", ".jp2", ".gpkg", ".map", ".nc", ".xyz", ".sgrd", ".mbtiles", ".h5", ".hdf", ".ddf", ".gsb", "")
)
"""Endings that may be something else: taken where they open as heights, passed over where not."""


def open_source(source: RasterSource | CoverSource, *, role: RasterRole) -> list[RasterFile]:
    """The headers of all rasters that a source stands for, in the order of their names.

    Raises
    ------
    RasterError
        A file cannot serve, or a folder holds no raster.
    """
    path = os.fspath(source.path)
    if not path.strip():
        raise RasterError("the path of a raster is empty", "give a file or a folder of tiles")
    if is_remote(path):
        refresh(path)
        return [read_header(source, path=path, name=base_name(path), role=role)]
    if not os.path.isdir(path) or _is_grid_folder(path):
        return [read_header(source, path=path, name=base_name(path), role=role)]
    found: list[RasterFile] = []
    with gdal():
        for candidate in _files(path):
            suffix = os.path.splitext(candidate)[1].lower()
            try:
                found.append(read_header(source, path=candidate, name=base_name(candidate), role=role))
            except RasterError:
                if suffix in _CERTAIN:
                    raise
    if not found:
        raise RasterError(
            f"folder {path} holds no raster",
            "it should hold tiles such as *.tif, *.asc, *.hgt or *.img, in itself or in folders inside",
        )
    return found


def names_of(files: Sequence[RasterFile]) -> tuple[str, ...]:
    """A name for each file, short where that is enough to tell them apart."""
    shared = Counter(file.name for file in files)
    return tuple(
        file.name if shared[file.name] == 1 else os.path.join(*file.path.replace("\\", "/").split("/")[-2:])
        for file in files
    )


def _files(folder: str) -> list[str]:
    return sorted(
        os.path.join(parent, name)
        for parent, _, names in os.walk(folder)
        for name in names
        if not name.startswith(".") and os.path.splitext(name)[1].lower() in _CERTAIN | _POSSIBLE
    )


def _is_grid_folder(path: str) -> bool:
    """True for grid formats in which the folder itself is the raster."""
    return any(os.path.exists(os.path.join(path, name)) for name in ("hdr.adf", "HDR.ADF"))
