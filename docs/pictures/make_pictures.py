"""Makes the pictures of README and docs from the sample, with headless Chromium; run it from the repository's top.

.venv/bin/python docs/pictures/make_pictures.py
"""

import io
import subprocess
import sys
import tempfile
from dataclasses import dataclass
from pathlib import Path

from PIL import Image
from playwright.sync_api import Page, sync_playwright

HERE = Path(__file__).parent
CHROMIUM = "/usr/bin/chromium"
SWITCHES = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
]
COLOURS = (256, 128, 64, 40)
MOST_BYTES = 150_000


@dataclass(frozen=True, slots=True, kw_only=True)
class Picture:
    """One picture: the page (the first of that pattern), the window, what to press, and the part shown, None for the window."""

    name: str
    page: str
    width: int = 1200
    height: int = 750
    press: str | None = None
    part: str | None = None
    medium: str = "screen"


PICTURES = (
    Picture(name="overview.png", page="index.html", press=".entry[data-link='1']"),
    Picture(name="overview-table.png", page="index.html", width=1400, part=".all-links"),
    Picture(name="path-profile.png", page="link-01-*.html", part="figure.drawing"),
    Picture(name="link-page.png", page="link-02-*.html", height=1050),
    Picture(name="crew-sheet.png", page="crew-06-*-a.html", width=794, height=1123, medium="print"),
)


def small_png(picture: bytes) -> bytes:
    """The picture with as few colours as it takes to be small."""
    image = Image.open(io.BytesIO(picture)).convert("RGB")
    for colours in COLOURS:
        buffer = io.BytesIO()
        image.quantize(colours, dither=Image.Dither.NONE).save(buffer, "PNG", optimize=True)
        if buffer.tell() < MOST_BYTES:
            break
    return buffer.getvalue()


def _shoot(page: Page, report: Path, picture: Picture) -> None:
    page.set_viewport_size({"width": picture.width, "height": picture.height})
    page.emulate_media(media=picture.medium)
    page.goto(min(report.glob(picture.page)).as_uri())
    if picture.press:
        page.click(picture.press)
    page.wait_for_timeout(500)
    shown = page.screenshot() if picture.part is None else page.locator(picture.part).first.screenshot()
    (HERE / picture.name).write_bytes(small_png(shown))


def main() -> None:
    """Plan the sample and photograph its report."""
    with tempfile.TemporaryDirectory() as folder:
        report = Path(folder) / "report"
        plan = [
            sys.executable,
            "-m",
            "fellspan",
            "plan",
            "sample_terrain/tolmera.toml",
            "--horizons",
            "--out",
            str(report),
        ]
        subprocess.run(plan, check=True, stdout=subprocess.DEVNULL)
        with sync_playwright() as playwright:
            browser = playwright.chromium.launch(executable_path=CHROMIUM, args=SWITCHES)
            page = browser.new_page()
            for picture in PICTURES:
                _shoot(page, report, picture)
            browser.close()


if __name__ == "__main__":
    main()
