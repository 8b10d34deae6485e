"""Templates, styles and scripts of the pages, and the map library's own, made to need no other file."""

import re
from functools import cache
from importlib import resources
from pathlib import Path

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup

from fellspan.report.wording import clean

_URL = re.compile(r"url\([^)]*\)")
_MAP_COMMENT = re.compile(r"^//[#@] sourceMappingURL=.*$", re.MULTILINE)


@cache
def asset(name: str) -> Markup:
    """A file of the templates folder, as it stands."""
    return Markup(resources.files("fellspan.report").joinpath("templates", name).read_text(encoding="utf-8"))


def _leaflet(name: str) -> str:
    from xstatic.pkg import leaflet

    return (Path(leaflet.BASE_DIR) / name).read_text(encoding="utf-8")


@cache
def leaflet_js() -> Markup:
    """The map library's script, its licence comment kept, without the reference to its source map."""
    return Markup(_MAP_COMMENT.sub("", _leaflet("leaflet.js")).replace("</script", "<\\/script"))


@cache
def leaflet_css() -> Markup:
    """The map library's style without pictures: they belong to markers and a layer button that no page has."""
    return Markup(_URL.sub("none", _leaflet("leaflet.css")))


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
