"""Names of rasters that are no local files: which can be read, how to print them, and what to say where one cannot be opened.

Opens nothing and asks no network.
"""

import os
import re
from typing import Final

from fellspan.errors import RasterError

_SCHEME: Final = re.compile(r"([a-z][a-z0-9.+-]*)://", re.IGNORECASE)
_KNOWN: Final = ("http", "https", "ftp", "s3", "gs", "az", "oss", "file", "zip", "tar", "gzip")
"""What rasterio resolves; two of them may be joined, as in zip+https://."""
_LOGIN_WORDS: Final = (
    "AWS_SECRET_ACCESS_KEY",
    "AZURE_STORAGE",
    "GS_SECRET",
    "OSS_SECRET",
    "credentials",
    "InvalidAccess",
)
_ABSENT_WORDS: Final = ("No such file", "does not exist", "NoSuchKey", "NoSuchBucket")
_DENIED_WORDS: Final = ("Access Denied", "AccessDenied", "Forbidden", "Unauthorized")

SETTINGS: Final = {
    "GDAL_HTTP_CONNECTTIMEOUT": "15",
    "GDAL_HTTP_LOW_SPEED_TIME": "30",
    "GDAL_HTTP_LOW_SPEED_LIMIT": "1",
    "GDAL_HTTP_MAX_RETRY": "3",
    "GDAL_HTTP_RETRY_DELAY": "0.5",
}
"""GDAL's settings for a server that is slow, busy or gone; one that the environment states is left alone."""


UNCACHED: Final = {
    "CPL_VSIL_CURL_NON_CACHED": "/vsicurl/:/vsis3/:/vsigs/:/vsiaz/:/vsiadls/:/vsioss/:/vsiswift/:/vsihdfs/:/vsiwebhdfs/",
    "GDAL_DISABLE_READDIR_ON_OPEN": "EMPTY_DIR",
}
"""Settings under which a file that is closed leaves nothing of it in memory."""


def settings() -> dict[str, str]:
    """`SETTINGS` but for those that the environment states."""
    return {name: value for name, value in SETTINGS.items() if name not in os.environ}


def is_remote(path: str) -> bool:
    """True for what is no plain local path: GDAL's virtual systems, URLs, names of subdatasets."""
    return path.startswith("/vsi") or "://" in path or (":" in path[2:] and not os.path.exists(path))


def shown_address(path: str) -> str:
    """An address as it may be printed: without a login or a signature in it; a local path as it is."""
    if not is_address(path):
        return path
    inner = re.match(r"/vsicurl\?(?:.*&)?url=([^&]*)", path)
    if inner is not None:
        from urllib.parse import unquote

        path = unquote(inner[1])
    address = re.sub(r"//[^/@]*@", "//", path)
    return re.split(r"[?#]", address, maxsplit=1)[0]


def see_to_scheme(path: str) -> None:
    """Raise RasterError where an address begins with a scheme that cannot be read."""
    wrong = unknown_scheme(path)
    if wrong is not None:
        raise RasterError(*wrong)


def unknown_scheme(path: str) -> tuple[str, str] | None:
    """What is wrong with the scheme of an address, and what is known; None where nothing is."""
    found = _SCHEME.match(path)
    if found is None:
        return None
    unknown = [part for part in found[1].lower().split("+") if part not in _KNOWN]
    if not unknown:
        return None
    return (
        f"{shown_address(path)}: the scheme '{unknown[0]}' is unknown",
        f"known: {', '.join(_KNOWN[:8])}, zip+https, and GDAL's /vsi...",
    )


def refusal(path: str, said: str) -> RasterError:
    """Why a raster behind an address was not opened, in two lines."""
    address = shown_address(path)
    code = re.search(r"(?:response code|HTTP/1\.\d|error)\D{0,40}?\b([45]\d\d)\b", said)
    if (code is not None and code[1] in ("404", "410")) or any(words in said for words in _ABSENT_WORDS):
        return RasterError(
            f"there is nothing at {address}",
            "check the address; of a folder of tiles, name the files or a .vrt",
        )
    if (code is not None and code[1] in ("401", "403", "407")) or any(words in said for words in _DENIED_WORDS):
        return RasterError(
            f"{address} may not be read",
            "a login is needed, which GDAL takes from the environment",
        )
    if code is not None:
        return RasterError(f"{address} cannot be read", f"the server answers {code[1]}: try again later")
    if any(word in said for word in _LOGIN_WORDS):
        return RasterError(
            f"{address} cannot be read without a login",
            "set AWS_ACCESS_KEY_ID and so on; AWS_NO_SIGN_REQUEST=YES if public",
        )
    if "CURL error" in said or ("curl" in said.lower() and "/vsicurl" not in said):
        reason = said.replace("CURL error: ", "").replace(path, address)
        reason = re.sub(r" after \d+ ms", "", reason)
        return RasterError(f"{address} cannot be reached", reason[:160])
    if "Range downloading not supported" in said:
        return RasterError(
            f"{address} cannot be read in parts: its server sends whole files only",
            "download the raster, or put it on a server that answers range requests",
        )
    return RasterError(
        f"{address} is not a raster that can be opened",
        "no GeoTIFF nor another raster that GDAL reads: a page, or cut short?",
    )


def is_address(path: str) -> bool:
    """True for a URL or a virtual file of GDAL, and not for what may be a local file."""
    return _SCHEME.match(path) is not None or path.startswith("/vsi")
