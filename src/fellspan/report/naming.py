"""File names of pages: ASCII, lower case, the same for the same study. Knows nothing of what a page holds."""

import re
import unicodedata

SLUG_LENGTH = 48


def slug(text: str) -> str:
    """A short ASCII form of `text` that is safe in a file name and an HTML id; '' where nothing of it is ASCII."""
    plain = unicodedata.normalize("NFKD", text).encode("ascii", "ignore").decode("ascii").lower()
    return re.sub(r"[^a-z0-9]+", "-", plain)[: SLUG_LENGTH * 2].strip("-")[:SLUG_LENGTH].strip("-")


def page_name(index: int, link_name: str) -> str:
    """File name of the page of a link; `index` counts from 0 in the order of the plan and makes the name unique."""
    tail = slug(link_name)
    return f"link-{index + 1:02d}-{tail}.html" if tail else f"link-{index + 1:02d}.html"


def crew_name(index: int, link_name: str, end: str) -> str:
    """File name of the crew sheet of one end, 'a' or 'b', of a link."""
    return page_name(index, link_name).replace("link-", "crew-", 1).removesuffix(".html") + f"-{end}.html"
