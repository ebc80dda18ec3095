"""What the tests of the desk share: opening it, waiting for it, reading what it shows."""

from __future__ import annotations

import re
from pathlib import Path

from playwright.sync_api import Page

AXE = Path(__file__).with_name("vendor") / "axe.min.js"
FLOOD = "run=existing_flood"
PATIENCE = 90_000  # ms: on a busy machine the first figures may have to be compiled


def open_desk(page: Page, address: str, query: str = "") -> None:
    """Open the desk and wait until its answer and its map are drawn."""
    page.goto(f"{address}/{'?' + query if query else ''}")
    page.wait_for_selector("html[data-ready=yes]", state="attached", timeout=PATIENCE)
    settled(page)


def settled(page: Page) -> None:
    """Wait until nothing that the screen shows is still being made."""
    page.wait_for_selector("html[data-working=no]", state="attached", timeout=PATIENCE)


def answer(page: Page) -> str:
    """The sentence, with plain spaces."""
    return plain(page.inner_text("#answer"))


def plain(text: str) -> str:
    return re.sub(r"\s+", " ", text.replace("\u00a0", " ").replace("\u202f", " ")).strip()


def colours(page: Page) -> int:
    """How many colours the map's canvas holds: a blank one has one or two."""
    return page.evaluate(
        """() => {
            const find = (node) => {
                for (const child of node.querySelectorAll("*")) {
                    if (child.tagName === "CANVAS" && child.width > 100) return child;
                    const inner = child.shadowRoot && find(child.shadowRoot);
                    if (inner) return inner;
                }
                return null;
            };
            const canvas = find(document.getElementById("map"));
            if (!canvas) return 0;
            const data = canvas.getContext("2d").getImageData(0, 0, canvas.width, canvas.height).data;
            const seen = new Set();
            for (let i = 0; i < data.length; i += 4 * 7) seen.add((data[i] << 16) | (data[i + 1] << 8) | data[i + 2]);
            return seen.size;
        }"""
    )


def faults(page: Page) -> list[str]:
    """What axe-core finds, by rule and place."""
    if not page.evaluate("() => Boolean(window.axe)"):
        page.evaluate(AXE.read_text(encoding="utf-8"))
    found = page.evaluate("() => axe.run(document, { runOnly: ['wcag2a', 'wcag2aa', 'wcag21a', 'wcag21aa', 'wcag22aa', 'best-practice'] })")
    return [f"{v['id']} ({v['impact']}): {[n['target'] for n in v['nodes']][:4]}" for v in found["violations"]]
