"""Chromium as the tests of pages run it: nothing gets out, and whatever a page asks or says is noted."""

from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

CHROMIUM = Path("/usr/bin/chromium")
ARGUMENTS = [
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]


@dataclass(frozen=True, kw_only=True)
class Watched:
    """A page of which every request beyond the file itself and every message is noted; requests do not get out."""

    page: object
    requests: list[str]
    messages: list[str]


@contextmanager
def watching(browser):
    """Open watched pages of a size: `watch(width, height)`."""
    contexts = []

    def opened(width=1280, height=900):
        context = browser.new_context(viewport={"width": width, "height": height})
        contexts.append(context)
        page = context.new_page()
        watched = Watched(page=page, requests=[], messages=[])

        def route(handler):
            request = handler.request
            if request.is_navigation_request() and request.url.startswith("file:"):
                handler.continue_()
            else:
                watched.requests.append(request.url)
                handler.abort()

        context.route("**/*", route)
        page.on("console", lambda message: watched.messages.append(message.text))
        page.on("pageerror", lambda error: watched.messages.append(str(error)))
        return watched

    yield opened
    for context in contexts:
        context.close()
