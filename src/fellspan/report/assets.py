"""Templates, styles and scripts of the pages, and the map library's own, made to need no other file."""

import base64
import re
import zlib
from functools import cache
from importlib import resources
from pathlib import Path

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from fellspan.report.wording import clean

_URL = re.compile(r"url\([^)]*\)")
_LICENCE = re.compile(r"\s*/\*.*?\*/", re.DOTALL)
_CSS_NOTE = re.compile(r"/\*.*?\*/", re.DOTALL)
_CSS_ROOM = re.compile(r"\s*([{};,])\s*|(:)\s+|\s+")
_SCRIPT_NOTE = re.compile(r"^(?:\s*//[^\n]*\n|\s+)", re.MULTILINE)
_MAP_COMMENT = re.compile(r"^//[#@] sourceMappingURL=.*$", re.MULTILINE)


@cache
def asset(name: str) -> Markup:
    """A style or script of the templates folder, without its notes and its layout, which a page need not carry."""
    written = resources.files("fellspan.report").joinpath("templates", name).read_text(encoding="utf-8")
    return Markup(_close_css(written) if name.endswith(".css") else _SCRIPT_NOTE.sub("", written))


@cache
def colours() -> Markup:
    """The names of colours, light and dark, that every drawing goes by: for a drawing that stands in a file of its own."""
    written = resources.files("fellspan.report").joinpath("templates", "drawing.css").read_text(encoding="utf-8")
    return Markup(_close_css(written[written.index(":root") : written.index("/* end of colours */")]))


def _close_css(written: str) -> str:
    """A style without comments and layout; a comma in a string of ours has no space behind it."""
    return (
        _CSS_ROOM.sub(lambda match: match[1] or match[2] or " ", _CSS_NOTE.sub("", written)).replace(";}", "}").strip()
    )


def _leaflet(name: str) -> str:
    from xstatic.pkg import leaflet

    return (Path(leaflet.BASE_DIR) / name).read_text(encoding="utf-8")


@cache
def leaflet_js() -> Markup:
    """The map library's script, packed to two fifths, with its licence in plain letters and what unpacks and runs it."""
    plain = _MAP_COMMENT.sub("", _leaflet("leaflet.js"))
    licence = _LICENCE.match(plain)
    return Markup(f"{licence[0] if licence else ''}\n{asset('unpack.js')}\n{_packed(plain)}")


@cache
def packed(*names: str) -> Markup:
    """Scripts of the templates folder, one after the other, packed; `leaflet_js` brings what unpacks them."""
    return Markup(_packed("\n".join(asset(name) for name in names)))


def _packed(script: str) -> str:
    """A call that runs the script: raw deflate (RFC 1951) in base64."""
    plain = script.encode("utf-8")
    packer = zlib.compressobj(9, zlib.DEFLATED, -zlib.MAX_WBITS, 9)
    data = packer.compress(plain) + packer.flush()
    return f'runPacked("{base64.b64encode(data).decode("ascii")}", {len(plain)});'


@cache
def leaflet_css() -> Markup:
    """The map library's style without pictures: they belong to markers and a layer button that no page has."""
    return Markup(_close_css(_URL.sub("none", _leaflet("leaflet.css"))))


def environment() -> Environment:
    """Jinja with escaping on, strict about names, and no control character let through."""
    return Environment(
        loader=PackageLoader("fellspan.report", "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
        finalize=_without_controls,
    )


def _without_controls(value: object) -> object:
    return clean(value) if isinstance(value, str) and not isinstance(value, Markup) else value
