"""A mean in place of a moment, a section through time and beside another, and what the reader keeps of a screen."""

from __future__ import annotations

import csv
import re
from pathlib import Path
from xml.etree import ElementTree

import pytest
from playwright.sync_api import Page, expect

from .conftest import Server
from .desk import FLOOD, answer, open_desk, plain, settled

pytestmark = pytest.mark.browser


def kept(page: Page, word: str, folder: Path) -> Path:
    """The file behind one word of the menu."""
    if not page.is_visible(f"[data-key='save-{word}']"):
        page.click("figcaption summary:has-text('save')")
    with page.expect_download() as download:
        page.click(f"[data-key='save-{word}']")
    path = folder / word
    download.value.save_as(path)
    return path


def test_the_mean_of_a_window_is_told_bracketed_and_left_by_moving_in_time(page: Page, server: Server):
    open_desk(page, server.address, f"{FLOOD}&seconds=100")
    page.click("figcaption summary:has-text('other times')")
    page.fill("#window-from", "400")
    page.fill("#window-to", "450")
    page.click("form[data-send=window] button")
    expect(page.locator("#answer")).to_contain_text("in the mean flow from")
    expect(page.locator("#ribbon")).to_contain_text("mean over 50")
    settled(page)
    assert "window=400.00,450.00" in page.url
    assert "M1" in plain(page.inner_text(".side"))
    page.focus("#time")
    page.keyboard.press("ArrowLeft")
    expect(page.locator("#answer")).not_to_contain_text("in the mean flow from")
    assert "window" not in page.url


def test_a_window_without_frames_is_told_and_changes_nothing(page: Page, server: Server):
    open_desk(page, server.address, FLOOD)
    page.click("figcaption summary:has-text('other times')")
    page.fill("#window-from", "5000")
    page.fill("#window-to", "6000")
    page.click("form[data-send=window] button")
    expect(page.locator(".status").first).to_contain_text("no frame between 5000 s and 6000 s")
    assert "window" not in page.url


def test_a_section_is_measured_through_time_and_beside_another(page: Page, server: Server):
    open_desk(page, server.address, f"question=sections&{FLOOD}")
    page.select_option("#choose-course", "level")
    expect(page.locator("#ribbon")).to_contain_text("Level")
    page.select_option("#choose-beside", "Bridge")
    expect(page.locator("section[data-slot=section] h2")).to_have_count(2)
    expect(page.locator(".side thead")).to_contain_text("Bridge")
    assert re.search(r"From this line to Bridge: level \u2212?[\d.]+ m, head", plain(page.inner_text(".side")))


def test_typed_ends_draw_the_line(page: Page, server: Server):
    open_desk(page, server.address, "question=sections")
    before = answer(page)
    page.click("summary:has-text('Type the ends')")
    for name, value in (("x1", "52378.16"), ("y1", "31117.64"), ("x2", "52430.88"), ("y2", "31081.36")):
        page.fill(f"#ends-{name}", value)
    page.click("form[data-send=ends] button")
    page.wait_for_function("() => location.search.includes('section=52378.16,31117.64,52430.88,31081.36')")
    settled(page)
    assert answer(page) != before


def test_the_map_and_the_section_are_kept_as_drawings_with_their_cautions(page: Page, server: Server, tmp_path: Path):
    open_desk(page, server.address)
    for word in ("map.svg", "section.svg"):
        tree = ElementTree.parse(kept(page, word, tmp_path)).getroot()
        words = " ".join(t.text or "" for t in tree.iter("{http://www.w3.org/2000/svg}text"))
        assert "no vertical roller" in words and "SHA-256" in words
        assert tree.get("width", "").endswith("mm")
    picture = kept(page, "map.png", tmp_path).read_bytes()
    assert picture[:8] == b"\x89PNG\r\n\x1a\n" and len(picture) > 50_000


def test_the_stations_kept_as_numbers_add_up_to_the_discharge_on_the_screen(page: Page, server: Server, tmp_path: Path):
    """Trapezoidal sum of the saved unit discharge: exact for values linear between stations."""
    open_desk(page, server.address, "question=sections")
    shown = float(re.search(r"([\d.]+) m\u00b3/s", answer(page))[1])  # type: ignore[index]
    lines = kept(page, "stations.csv", tmp_path).read_text(encoding="utf-8").splitlines()
    assert lines[0].startswith("# run: ") and any("SHA-256" in line for line in lines[:3])
    rows = list(csv.DictReader(line for line in lines if not line.startswith("#")))
    d, q = ([float(r[name]) for r in rows] for name in ("distance_m", "unit_discharge_m2_s"))
    total = sum((d[i + 1] - d[i]) * (q[i] + q[i + 1]) / 2 for i in range(len(d) - 1))
    assert total == pytest.approx(shown, rel=0.02)
