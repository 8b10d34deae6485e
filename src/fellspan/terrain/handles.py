"""Open GDAL datasets: one handle a thread and file, few at once, and never a GDAL message as a traceback.

Knows nothing of heights.
"""

import os
import threading
import warnings
import weakref
from collections import OrderedDict
from collections.abc import Iterator
from contextlib import contextmanager

import rasterio
from rasterio._err import CPLE_BaseError
from rasterio.errors import NotGeoreferencedWarning, RasterioError
from rasterio.io import DatasetReader

from fellspan.errors import RasterError
from fellspan.terrain import remote
from fellspan.terrain.remote import is_remote

GDAL_CACHE_MB = 64
_KEPT_OPEN = 24
"""Handles a thread keeps; a folder may hold thousands of tiles, and systems allow some hundred open files."""

_MOST_PARTS = 100
_FAULTS = (RasterioError, CPLE_BaseError, OSError)

_warning_filters = threading.Lock()
_inside = threading.local()


@contextmanager
def gdal() -> Iterator[None]:
    """GDAL's settings for everything read inside; cheap inside itself."""
    if getattr(_inside, "depth", 0):
        yield
        return
    _inside.depth = 1
    try:
        with _settings():
            yield
    finally:
        _inside.depth = 0


def _settings() -> rasterio.Env:
    # without its list of the folder GDAL asks for the few side files by name: in a folder of many tiles far faster
    return rasterio.Env(GDAL_CACHEMAX=GDAL_CACHE_MB, GDAL_DISABLE_READDIR_ON_OPEN="TRUE", **remote.settings())


@contextmanager
def gdal_errors(name: str, doing: str) -> Iterator[None]:
    """Turn whatever GDAL throws inside into a RasterError that names the file."""
    try:
        yield
    except (RasterioError, CPLE_BaseError, OSError, MemoryError) as error:
        reason = str(error.__cause__ or error).split("\n")[0].strip() or type(error).__name__
        if isinstance(error, MemoryError):
            reason = "one block does not fit into memory"
        raise RasterError(
            f"{name} cannot be {doing}",
            f"GDAL says: {reason[:160]}",
            "is the file complete and a raster? copy or download it again, or check it with: gdalinfo -checksum FILE",
        ) from error


def open_dataset(path: str, name: str) -> DatasetReader:
    """Open a file that may be anything.

    Raises
    ------
    RasterError
        There is no such file, it is empty, or GDAL does not take it for a raster.
    """
    remote.see_to_scheme(path)
    if not is_remote(path):
        if not os.path.exists(path):
            raise RasterError(
                f"there is no raster file {path}", "check its spelling; paths in a study start from the study's folder"
            )
        if os.path.isfile(path) and os.path.getsize(path) == 0:
            raise RasterError(f"{name} is empty (0 bytes)", "copy or download the raster again")
    try:
        return _opened(path)
    except _FAULTS as error:
        if remote.is_address(path):
            return _opened_anew(path, error)
        reason = str(error).split("\n")[0].replace(path, name)
        raise RasterError(
            f"{name} is not a raster that can be opened",
            f"GDAL says: {reason[:160]}",
            "bring a GeoTIFF or another raster that GDAL reads, and check that the file is complete",
        ) from error


def forget(path: str) -> None:
    """Leave nothing in GDAL's memory of what is behind an address, nor of the rasters that a .vrt there names."""
    try:
        for part in _opened_and_forgotten(path):
            _opened_and_forgotten(part)
    except _FAULTS:
        return  # whoever opens it next says so


def _opened(path: str) -> DatasetReader:
    # the filters are the interpreter's, not the thread's: hence the lock
    with _warning_filters, warnings.catch_warnings():
        warnings.simplefilter("ignore", NotGeoreferencedWarning)
        return rasterio.open(path)


def _opened_anew(path: str, first: Exception) -> DatasetReader:
    """Ask again: GDAL remembers a server that was not there as a file that is not there."""
    error = first
    try:
        _opened_and_forgotten(path)
        return _opened(path)
    except _FAULTS as again:
        error = again
    raise remote.refusal(path, str(error).split("\n")[0]) from error


def _opened_and_forgotten(path: str) -> list[str]:
    """The rasters that a .vrt names; empty for others."""
    with rasterio.Env(**remote.UNCACHED, **remote.settings()), _opened(path) as dataset:
        named = dataset.files if dataset.driver == "VRT" else []
        return [part for part in named if part != dataset.name][:_MOST_PARTS]


class HandlePool:
    """Datasets by path, each thread with its own, the least recently used closed first."""

    def __init__(self) -> None:
        self._local = threading.local()
        self._all: weakref.WeakSet[_Handles] = weakref.WeakSet()
        self._lock = threading.Lock()

    def dataset(self, path: str, name: str) -> DatasetReader:
        """The calling thread's handle on `path`, opened if need be."""
        handles: _Handles | None = getattr(self._local, "handles", None)
        if handles is None:
            handles = self._local.handles = _Handles()
            with self._lock:
                self._all.add(handles)
        found = handles.by_path.get(path)
        if found is not None and not found.closed:
            handles.by_path.move_to_end(path)
            return found
        opened = open_dataset(path, name)
        handles.by_path[path] = opened
        if len(handles.by_path) > _KEPT_OPEN:
            handles.by_path.popitem(last=False)[1].close()
        return opened

    def close(self) -> None:
        """Close the handles of all threads; a later `dataset` opens anew."""
        with self._lock:
            every = list(self._all)
        for handles in every:
            while handles.by_path:
                handles.by_path.popitem()[1].close()


class _Handles:
    """What one thread has open; goes with the thread."""

    __slots__ = ("__weakref__", "by_path")

    def __init__(self) -> None:
        self.by_path: OrderedDict[str, DatasetReader] = OrderedDict()
