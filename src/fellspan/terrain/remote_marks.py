"""What tells one state of a raster behind an address from another, and what makes GDAL forget an old one.

Asks a network only about an address that somebody named. Knows nothing of heights.
"""

import hashlib
import threading
import time
from dataclasses import dataclass
from typing import Final

import numpy as np
from rasterio.io import DatasetReader
from rasterio.windows import Window

from fellspan.terrain.handles import forget, gdal, gdal_errors, open_dataset
from fellspan.terrain.remote import shown_address

_ASK_S: Final = 10.0
_SIZED_BLOCKS: Final = 4096
_READ_BLOCKS: Final = 16
_GOOD_FOR_S: Final = 60.0
_seen: dict[str, tuple[str, float]] = {}
"""Addresses that this process has opened, what their servers stated then (empty where nothing), and when."""
_seen_lock = threading.Lock()


@dataclass(frozen=True, slots=True, kw_only=True)
class RemoteMark:
    """What tells one state of a remote raster from another.

    `digest` begins with `server:` where it stands for the size, date and ETag that the server states, and with `sampled:`
    where it stands for the header, the sizes of blocks and the cells of some of them. `modified` and `size` are empty and
    None where nobody states them.
    """

    digest: str
    modified: str
    size: int | None


def refresh(path: str) -> None:
    """Have GDAL forget what it holds of an address that this process has read before and that may have changed since.

    GDAL keeps parts of remote files for as long as the process lives: a worker of a cluster would plan on a raster that was
    replaced days ago. Where the server states nothing to tell by, what is held is good for a minute.
    """
    _refresh(path, _stated(path), at_once=False)


def _refresh(path: str, stated: RemoteMark | None, *, at_once: bool) -> None:
    now = "" if stated is None else stated.digest
    moment = time.monotonic()
    with _seen_lock:
        known = _seen.get(path)
        if known is None:
            stale = False
        elif now:
            stale = now != known[0]
        else:
            stale = at_once or moment - known[1] > _GOOD_FOR_S
        if known is None or stale:
            _seen[path] = (now, moment)
    if stale:
        forget(path)


def remote_mark(path: str) -> RemoteMark:
    """Ask what the server states of a file, or read here and there where it states nothing.

    Raises
    ------
    RasterError
        It cannot be read.
    """
    stated = _stated(path)
    _refresh(path, stated, at_once=True)
    if stated is not None:
        return stated
    return RemoteMark(digest=f"sampled:{_sampled(path)}", modified="", size=None)


def _stated(path: str) -> RemoteMark | None:
    """Size, date and ETag of a file behind HTTP; None where the server does not state them."""
    address = path.removeprefix("/vsicurl/")
    if not address.lower().startswith(("http://", "https://")) or shown_address(address).lower().endswith(".vrt"):
        return None  # a .vrt stays as it is where the rasters that it names change
    import email.utils
    import http.client
    import urllib.request

    request = urllib.request.Request(address, method="HEAD", headers={"User-Agent": "fellspan"})
    try:
        with urllib.request.urlopen(request, timeout=_ASK_S) as answer:
            headers = answer.headers
    except (OSError, ValueError, http.client.HTTPException):
        return None
    size, date, tag = (headers.get(name, "") for name in ("Content-Length", "Last-Modified", "ETag"))
    if not size.isdigit() or not (date or tag):
        return None
    try:
        modified = email.utils.parsedate_to_datetime(date).strftime("%Y-%m-%dT%H:%M:%SZ") if date else ""
    except ValueError:
        modified = ""
    digest = hashlib.sha256("\n".join((size, date, tag)).encode()).hexdigest()
    return RemoteMark(digest=f"server:{digest}", modified=modified, size=int(size))


def _sampled(path: str) -> str:
    """A hash of a raster's header, of the sizes of its blocks, and of the cells of blocks spread over it."""
    name = shown_address(path)
    with gdal(), open_dataset(path, name) as dataset, gdal_errors(name, "read"):
        digest = hashlib.sha256(repr(_header_facts(dataset)).encode())
        if not dataset.count:
            return digest.hexdigest()
        height, width = dataset.block_shapes[0]
        down, across = -(-dataset.height // height), -(-dataset.width // width)
        for number in np.unique(np.linspace(0, down * across - 1, _SIZED_BLOCKS).astype(np.int64)).tolist():
            at = f"{number % across}_{number // across}"
            sizes = [dataset.get_tag_item(f"BLOCK_{what}_{at}", "TIFF", bidx=1) for what in ("OFFSET", "SIZE")]
            digest.update(repr(sizes).encode())
        bands = list(range(1, min(dataset.count, 4) + 1))
        for number in np.unique(np.linspace(0, down * across - 1, _READ_BLOCKS).astype(np.int64)).tolist():
            row, column = number // across * height, number % across * width
            window = Window(column, row, min(width, dataset.width - column), min(height, dataset.height - row))
            digest.update(np.ascontiguousarray(dataset.read(bands, window=window)).tobytes())
    return digest.hexdigest()


def _header_facts(dataset: DatasetReader) -> tuple[object, ...]:
    return (
        dataset.driver,
        (dataset.width, dataset.height, dataset.count),
        dataset.dtypes,
        tuple(dataset.transform),
        None if dataset.crs is None else dataset.crs.to_wkt(version="WKT2_2019"),
        dataset.nodatavals,
        (dataset.scales, dataset.offsets, dataset.units),
    )
