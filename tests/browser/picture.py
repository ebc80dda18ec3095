"""The README's picture of the desk, made by the code: python -m tests.browser.picture FILE [QUERY]

Starts the desk on the sample review, opens it in Chromium (LEEWATER_CHROMIUM, else the first that
starts) and writes what it shows as PNG, 1440 x 900.
"""

from __future__ import annotations

import os
import sys
import tempfile
from pathlib import Path

from playwright.sync_api import sync_playwright

from tests.chromium import VARIABLE, chromium

from .conftest import launch_options, running_dashboard
from .desk import open_desk


def make(file: Path, query: str = "", *, width: int = 1440, height: int = 900) -> None:
    """Write the picture of one view of the sample review."""
    browser_path = os.environ.get(VARIABLE) or str(chromium(Path(sys.executable), os.environ))
    with tempfile.TemporaryDirectory() as folder, running_dashboard(Path(folder) / "log.txt", "sample_reach") as server:
        with sync_playwright() as playwright:
            browser = playwright.chromium.launch(**launch_options(browser_path))
            page = browser.new_page(viewport={"width": width, "height": height})
            open_desk(page, server.address, query)
            page.evaluate("document.fonts.ready.then(() => true)")
            page.screenshot(path=file)
            browser.close()


if __name__ == "__main__":
    make(Path(sys.argv[1]), *sys.argv[2:3])
