"""Work in a meeting: two browsers on one review, long work that can be stopped, figures that agree with the commands."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path
from urllib.parse import parse_qs, urlsplit

import numpy as np
import pytest
from PIL import Image
from playwright.sync_api import Browser, Page, expect

from hydro.review import open_review

from .conftest import ROOT, Server, running_dashboard
from .desk import PATIENCE, colours, faults, open_desk, plain, settled

pytestmark = pytest.mark.browser
COARSE = "existing_bankfull_coarse"


@pytest.fixture(scope="module")
def copy(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The sample review with its coarse run alone, to write into; its title holds a script."""
    folder = tmp_path_factory.mktemp("review")
    sample = ROOT / "sample_reach"
    head, *runs = (sample / "review.toml").read_text(encoding="utf-8").split("[[runs]]")
    rest = runs[-1][runs[-1].index("[settings]") :]
    chosen = next(r for r in runs if f'id = "{COARSE}"' in r)
    head = re.sub(r'^title = .*$', 'title = "Weir <script>document.title=1</script>"', head, flags=re.M)
    x, y = open_review(sample).reach.centre_line.at(np.array([540.0]))[0] + np.array(open_review(sample).origin)
    photograph = f'[[photograph]]\nfile = "ramp.jpg"\ncaption = "The ramp <i>(invented)</i>"\nx = {x}\ny = {y}\nbearing = 90\n'
    (folder / "review.toml").write_text(f"{head}{photograph}[[runs]]{chosen}\n{rest}", encoding="utf-8")
    (folder / "results").mkdir()
    for name in ("lines.gpkg", "plan.png", "plan.pgw"):
        shutil.copy(sample / name, folder)
    Image.new("RGB", (320, 200), (90, 120, 60)).save(folder / "ramp.jpg")
    shutil.copy(sample / "results" / f"{COARSE}.nc", folder / "results")
    return folder


@pytest.fixture(scope="module")
def mine(copy: Path, tmp_path_factory: pytest.TempPathFactory) -> Iterator[Server]:
    """The dashboard on that copy."""
    with running_dashboard(tmp_path_factory.mktemp("dashboard") / "log.txt", str(copy)) as running:
        yield running


def test_a_title_with_a_script_in_it_is_only_text(page: Page, mine: Server):
    open_desk(page, mine.address)
    assert "<script>document.title=1</script>" in page.inner_text(".title")
    assert page.title() == "Eddies \u00b7 Leewater"


def test_a_query_written_in_one_browser_shows_in_the_other(page: Page, mine: Server, copy: Path, browser: Browser):
    open_desk(page, mine.address, "question=arrival")
    other = browser.new_context(viewport={"width": 1440, "height": 900}).new_page()
    open_desk(other, mine.address, "question=arrival")
    other.fill("#ask-who", "B. Other")
    other.fill("#ask-text", "half a thought")
    page.fill("#ask-who", "A. Reviewer")
    page.fill("#ask-text", "Which roughness at the ramp? <b>bold</b>")
    page.click("form[data-send=ask] button")
    expect(other.locator(".body")).to_contain_text("Which roughness at the ramp? <b>bold</b>", timeout=10_000)
    assert other.input_value("#ask-text") == "half a thought"
    other.click("form[data-send=ask] button")
    expect(page.locator(".body")).to_contain_text("half a thought", timeout=10_000)
    written = [json.loads(line) for line in (copy / "queries.jsonl").read_text(encoding="utf-8").splitlines()]
    assert [w["who"] for w in written] == ["A. Reviewer", "B. Other"]
    other.context.close()


def test_a_finding_becomes_a_query_in_one_action_and_is_answered(page: Page, mine: Server, copy: Path):
    open_desk(page, mine.address, "question=arrival")
    finding = plain(page.locator("table tbody tr").first.locator("td").last.inner_text())
    page.locator("button[data-do=raise]").first.click()
    row = page.locator("section[data-slot=table] ~ *, .body table tbody tr").last
    expect(row).to_contain_text(finding[:40])
    number = plain(row.locator("th").inner_text())
    page.select_option("#answer-number", number)
    page.fill("#answer-who", "C. Modeller")
    page.fill("#answer-answer", "The pier was left out on purpose.")
    page.click("form[data-send=answer] button")
    expect(row).to_contain_text("The pier was left out on purpose.")
    last = [json.loads(line) for line in (copy / "queries.jsonl").read_text(encoding="utf-8").splitlines()][-1]
    assert (last["who"], last["set"]["state"]) == ("C. Modeller", "answered")


def test_a_photograph_is_opened_from_the_map_by_key(page: Page, mine: Server):
    open_desk(page, mine.address)
    page.click("button[data-do=zoom][data-value=whole]")
    settled(page)
    expect(page.locator("figcaption").first).to_contain_text("Backdrop: plan.png.")
    mark = page.locator("#map .photo")
    expect(mark).to_have_attribute("aria-label", "Photograph 1: The ramp <i>(invented)</i>, looking east (090\u00b0)")
    box, frame = mark.bounding_box(), page.locator("#map").bounding_box()
    assert box and frame
    middle = box["x"] + box["width"] / 2
    assert frame["x"] < middle < frame["x"] + frame["width"]
    mark.focus()
    page.keyboard.press("Enter")
    picture = page.locator(".photograph img")
    expect(picture).to_be_visible()
    page.wait_for_function("() => document.querySelector('.photograph img').naturalWidth === 320")
    expect(page.locator(".photograph figcaption")).to_contain_text("The ramp <i>(invented)</i>, looking east")
    assert faults(page) == []
    page.keyboard.press("Enter")  # the focus has stayed on the mark
    expect(picture).to_have_count(0)


def test_letting_logs_go_shows_how_far_it_is_and_can_be_stopped(page: Page, mine: Server):
    open_desk(page, mine.address)
    page.click("nav button[data-value=drift]:visible")
    page.wait_for_selector("button[data-do=stop]", timeout=PATIENCE)
    assert page.locator("progress").get_attribute("aria-label") == "Letting the logs go:"
    page.click("button[data-do=stop]")
    page.wait_for_function("() => document.getElementById('answer').innerText.includes('Stopped early')", timeout=PATIENCE)
    settled(page)
    assert colours(page) > 10
    assert faults(page) == []


def test_the_section_on_screen_agrees_with_the_command(page: Page, mine: Server, copy: Path):
    """The same line through `leewater section`; tolerance: the three digits that the screen prints."""
    open_desk(page, mine.address)
    box = page.locator("#end-left").bounding_box()
    assert box is not None
    x, y = box["x"] + box["width"] / 2, box["y"] + box["height"] / 2
    url = page.url
    page.mouse.move(x, y)
    page.mouse.down()
    page.mouse.move(x + 12, y + 18, steps=3)
    page.mouse.up()
    page.wait_for_function("url => location.href !== url", arg=url)
    settled(page)
    x1, y1, x2, y2 = parse_qs(urlsplit(page.url).query)["section"][0].split(",")
    shown = re.search(r"Passes ([\d.]+) m\u00b3/s by the field, ([\d.]+) m\u00b3/s by psi", plain(page.inner_text(".figures")))
    assert shown
    command = [sys.executable, "-c", "import sys; from dashboard.cli import main; sys.exit(main())", "section",
               str(copy / "results" / f"{COARSE}.nc"), "--line", f"{x1},{y1} {x2},{y2}", "--json", "-"]
    ran = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, check=True)
    (row,) = json.loads(ran.stdout)["sections"]
    assert float(shown[1]) == pytest.approx(row["discharge_m3_s"], rel=6e-3)
    assert float(shown[2]) == pytest.approx(row["discharge_psi_m3_s"], rel=6e-3)


def test_kept_views_are_walked_through_with_arrow_keys_in_the_hall(page: Page, mine: Server, copy: Path):
    open_desk(page, mine.address)
    for shade, sentence in (("speed", "First the speed."), ("depth", "Then the depth.")):
        page.select_option("#choose-shade", shade)
        page.wait_for_function("shade => shade === 'speed' || location.search.includes('depth')", arg=shade)
        settled(page)
        page.click("summary:has-text('Keep this view')")
        page.fill("#keep-sentence", sentence)
        page.click("form[data-send=keep] button")
        expect(page.locator(".asks")).to_have_text(sentence)
    page.click("button[data-do=hall]")
    expect(page.locator("html")).to_have_attribute("data-view", "hall")
    page.evaluate("document.activeElement.blur()")
    page.keyboard.press("ArrowRight")
    expect(page.locator(".asks")).to_have_text("First the speed.")
    page.keyboard.press("ArrowRight")
    expect(page.locator(".asks")).to_have_text("Then the depth.")
    expect(page.locator(".foot")).to_contain_text("Stop 2 of 2")
    expect(page.locator(".key")).to_contain_text("Depth")
    settled(page)
    assert faults(page) == []
    assert (copy / "review.toml").read_text(encoding="utf-8").count("[[views]]") == 2


def test_wood_is_let_go_from_a_line_of_ones_own_and_a_pier_shows_what_touched_it(page: Page, mine: Server):
    open_desk(page, mine.address, "question=drift&logs=200")
    page.wait_for_selector("section[data-slot=section] button[data-do=subject]", timeout=PATIENCE)
    page.select_option("#choose-release", "own")
    expect(page.locator("#answer")).to_contain_text("Drag L and R")
    page.click("button[data-do=letgo]")
    page.wait_for_function("() => location.search.includes('let_go=')")
    row = page.locator("section[data-slot=section] button[data-do=subject]").first
    row.wait_for(timeout=PATIENCE)
    expect(page.locator("#answer")).to_contain_text("of the 200 modelled logs touch")
    name = plain(row.inner_text())
    row.click()
    expect(page.locator("figcaption")).to_contain_text(f"only those that touch {name}")
    page.select_option("#choose-gone", "corridor")
    expect(page.locator(".key")).to_contain_text("Logs by time")
    assert "What fed the piers" in page.inner_text(".body")
