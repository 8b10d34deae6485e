"""Makes the pictures of README and docs from the sample, with headless Chromium; run it from the repository's top.

    .venv/bin/python docs/pictures/make_pictures.py
"""

import subprocess
import sys
import tempfile
from pathlib import Path

from playwright.sync_api import Page, sync_playwright

HERE = Path(__file__).parent
CHROMIUM = "/usr/bin/chromium"
SWITCHES = (
    "--no-sandbox --disable-gpu --disable-quic --no-first-run --disable-background-networking "
    "--disable-component-update --disable-sync"
).split()


def _shoot(page: Page, url: str, name: str, part: str | None) -> None:
    page.goto(url)
    page.wait_for_timeout(500)
    target = HERE / name
    if part is None:
        page.screenshot(path=target)
    else:
        page.locator(part).first.screenshot(path=target)


def main() -> None:
    """Plan the sample and photograph the overview and one path profile."""
    with tempfile.TemporaryDirectory() as folder:
        report = Path(folder) / "report"
        plan = [sys.executable, "-m", "fellspan", "plan", "sample_terrain/tolmera.toml", "--out", str(report)]
        subprocess.run(plan, check=True, stdout=subprocess.DEVNULL)
        with sync_playwright() as playwright:
            browser = playwright.chromium.launch(executable_path=CHROMIUM, args=SWITCHES)
            page = browser.new_page(viewport={"width": 1200, "height": 750})
            _shoot(page, (report / "index.html").as_uri(), "overview.png", None)
            first = sorted(report.glob("link-01-*.html"))[0]
            _shoot(page, first.as_uri(), "path-profile.png", "figure")
            browser.close()


if __name__ == "__main__":
    main()
