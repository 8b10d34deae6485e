"""The drawings of a page as SVG files that stand alone: cut out of the page, so that the two are one drawing.

Each file carries the rules of style that it needs, with the light colours written out: programs that know no CSS variables
show it too. Knows nothing of what a drawing shows.
"""

import re
from functools import cache
from typing import Final

from fellspan.report import assets

FONT: Final = '"Source Sans 3","Segoe UI","Helvetica Neue","Liberation Sans",Arial,sans-serif'
LIST: Final = "<!--drawings-->"
"""Where a page names the files of its drawings, which are known once it is written."""
STYLES: Final = ("drawing.css", "polar.css", "horizon.css")
_SVG = re.compile(r'<svg class="([^"]*)"([^>]*)>(.*?)</svg>', re.DOTALL)
_MEDIA = re.compile(r"@[^{]*\{(?:[^{}]*\{[^{}]*\})*[^{}]*\}")
_RULE = re.compile(r"([^{}]+)\{([^{}]*)\}")
_OF_PAGES = re.compile(r"(?:^|;)(?:font-family:inherit|display:block|width:100%|height:auto)(?=;|$)")
_VARIABLE = re.compile(r"var\((--[\w-]+)(?:,[^)]*)?\)")
_CLASS = re.compile(r"\.([A-Za-z][\w-]*)")
_NOT_IN_XML = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f\ud800-\udfff\ufffe\uffff]")
_UID = re.compile(r'aria-labelledby="([\w-]+?)-(?:t|title)\b')
_KINDS: Final = (
    ("profile", "profile", "path profile"),
    ("antennas-azimuth", "antennas-azimuth", "antennas in azimuth"),
    ("antennas-azimuth-close", "antennas-azimuth-close", "near the boresight in azimuth"),
    ("antennas-elevation", "antennas-elevation", "antennas in elevation"),
    ("antennas-elevation-close", "antennas-elevation-close", "near the boresight in elevation"),
    ("heights", "heights", "heights"),
    ("lobing-a", "reflection-a", "level against height at A"),
    ("lobing-b", "reflection-b", "level against height at B"),
    ("horizon-a", "horizon-a", "horizon from A"),
    ("horizon-b", "horizon-b", "horizon from B"),
)
"""Id of the drawing in the page, end of the file's name, and what people call it."""


def drawing_names(page: str) -> tuple[str, ...]:
    """Names of the drawings that may stand beside the page of a link, by the name of that page."""
    return tuple(_name(page, tail) for _, tail, _ in _KINDS)


def drawing_files(page: str, text: str) -> dict[str, str]:
    """File names and texts of the drawings that the page of a link holds; `page` is its file name."""
    return {name: stand_alone(*parts) for name, parts in _found(page, text).items()}


def with_list(page: str, text: str) -> str:
    """The page of a link with the list of its drawings where `LIST` stands in it."""
    words = {_name(page, tail): word for _, tail, word in _KINDS}
    listed = ", ".join(f'<a href="{name}">{words[name]}</a>' for name in _found(page, text))
    return text.replace(LIST, f"The drawings as files (SVG): {listed}." if listed else "")


def stand_alone(classes: str, attributes: str, content: str) -> str:
    """One drawing with its style."""
    view = re.search(r'viewBox="[-\d.]+ [-\d.]+ ([\d.]+) ([\d.]+)"', attributes)
    size = f' width="{view[1]}" height="{view[2]}"' if view else ""
    plain = re.sub(r'\s+(?:xmlns|tabindex|data-[\w-]+)="[^"]*"', "", attributes)
    used = {*classes.split(), *(name for found in re.findall(r'\sclass="([^"]*)"', content) for name in found.split())}
    style = f"svg{{background:{colours()['--sheet']};font-family:{FONT}}}" + "".join(_rules_for(frozenset(used)))
    return (
        '<?xml version="1.0" encoding="UTF-8"?>\n'
        f'<svg xmlns="http://www.w3.org/2000/svg" class="{classes}"{size}{plain}>'
        f"<style>{style}</style>{_NOT_IN_XML.sub('', content)}</svg>\n"
    )


def _found(page: str, text: str) -> dict[str, tuple[str, str, str]]:
    by_uid: dict[str, tuple[str, str, str]] = {}
    for classes, attributes, content in _SVG.findall(text):
        uid = _UID.search(attributes)
        if uid:
            by_uid.setdefault(uid[1], (classes, attributes, content))
    return {_name(page, tail): by_uid[uid] for uid, tail, _ in _KINDS if uid in by_uid}


def _name(page: str, tail: str) -> str:
    return f"{page.replace('link-', 'drawing-', 1).removesuffix('.html')}-{tail}.svg"


@cache
def colours() -> dict[str, str]:
    """The light colours by their names."""
    first = re.search(r":root\s*\{([^}]*)\}", str(assets.asset("drawing.css")))
    found = dict(re.findall(r"(--[\w-]+)\s*:\s*([^;]+)", first[1] if first else ""))
    return {
        name: _VARIABLE.sub(lambda match: found.get(match[1], "inherit"), value.strip())
        for name, value in found.items()
    }


@cache
def _rules() -> tuple[tuple[tuple[tuple[str, frozenset[str]], ...], str], ...]:
    """Selectors with the classes they name, and the declarations with colours written out."""
    css = "".join(_MEDIA.sub("", str(assets.asset(name))) for name in STYLES)
    rules = []
    for heads, body in _RULE.findall(css):
        selectors = [head.strip() for head in heads.split(",")]
        fit = tuple(
            (head, frozenset(_CLASS.findall(head))) for head in selectors if _CLASS.search(head) and ":" not in head
        )
        declared = _OF_PAGES.sub("", _VARIABLE.sub(lambda match: colours().get(match[1], "inherit"), body)).strip(";")
        if fit and declared:
            rules.append((fit, declared))
    return tuple(rules)


@cache
def _rules_for(used: frozenset[str]) -> tuple[str, ...]:
    rules = []
    for selectors, declared in _rules():
        heads = [head for head, classes in selectors if classes <= used]
        if heads:
            rules.append(f"{','.join(heads)}{{{declared}}}")
    return tuple(rules)
