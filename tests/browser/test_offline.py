"""The desk is installable, says at once when its server has stopped, and comes back by itself."""

from __future__ import annotations

import contextlib
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest
from playwright.sync_api import Browser, BrowserContext, expect

from tests.dashboard.pack.reviews import small_review

from .conftest import ROOT, Server, Watch, _wait_for_answer, end, free_port, launch_options
from .desk import PATIENCE, faults, open_desk

pytestmark = pytest.mark.browser
REVIEW = "sample_reach"


class Desk:
    """A dashboard on one port that a test can stop and start again."""

    def __init__(self, log: Path, review: str = REVIEW) -> None:
        self.review = review
        self.port, self.log = free_port(), log
        self.address = f"http://127.0.0.1:{self.port}"
        self.process: subprocess.Popen[bytes] | None = None

    def start(self) -> None:
        command = [sys.executable, "-c", "import sys; from dashboard.cli import main; sys.exit(main())",
                   "open", self.review, "--port", str(self.port), "--no-browser"]
        with self.log.open("ab") as out:
            self.process = subprocess.Popen(command, cwd=ROOT, stdout=out, stderr=subprocess.STDOUT, stdin=subprocess.DEVNULL)
        _wait_for_answer(Server(self.address, self.log), self.process)

    def stop(self) -> None:
        if self.process is not None:
            end(self.process)
            self.process = None


@pytest.fixture
def desk(tmp_path: Path) -> Iterator[Desk]:
    running = Desk(tmp_path / "log.txt")
    running.start()
    yield running
    running.stop()


@pytest.fixture
def installed(browser: Browser, chromium_path: str, tmp_path: Path) -> Iterator[BrowserContext]:
    """A browser with a profile of its own, where service workers live."""
    profile = str(tmp_path / "profile")
    with contextlib.closing(browser.browser_type.launch_persistent_context(profile, **launch_options(chromium_path))) as context:
        yield context


def test_chromium_finds_no_reason_against_installing(desk: Desk, installed: BrowserContext, watch: Watch):
    page = installed.pages[0]
    watch.follow(page)
    open_desk(page, desk.address)
    page.evaluate("navigator.serviceWorker.ready.then(() => true)")
    devtools = installed.new_cdp_session(page)
    assert devtools.send("Page.getInstallabilityErrors")["installabilityErrors"] == []
    assert devtools.send("Page.getAppManifest")["errors"] == []
    assert watch.outside == [] and watch.errors == []


def test_when_the_desk_stops_the_page_says_so_and_comes_back(desk: Desk, installed: BrowserContext):
    page = installed.pages[0]
    open_desk(page, desk.address)
    page.evaluate("navigator.serviceWorker.ready.then(() => true)")
    desk.stop()
    expect(page.locator("#lost")).to_be_visible(timeout=20_000)
    page.reload()
    expect(page.locator("h1")).to_have_text("The desk has stopped.", timeout=20_000)
    desk.start()
    page.wait_for_selector("html[data-ready=yes]", state="attached", timeout=PATIENCE)
    expect(page.locator("#answer")).to_contain_text("edd", timeout=PATIENCE)


def test_an_open_page_of_a_stopped_desk_draws_itself_anew_when_it_is_back(desk: Desk, installed: BrowserContext):
    page = installed.pages[0]
    open_desk(page, desk.address)
    desk.stop()
    expect(page.locator("#lost")).to_be_visible(timeout=20_000)
    desk.start()
    expect(page.locator("#lost")).to_be_hidden(timeout=20_000)
    page.wait_for_selector("html[data-working=no]", state="attached", timeout=PATIENCE)


def test_what_was_being_typed_outlives_the_desk_s_stopping_and_coming_back(desk: Desk, installed: BrowserContext):
    page = installed.pages[0]
    open_desk(page, desk.address, "question=arrival")
    page.fill("#ask-text", "half a thought", timeout=PATIENCE)
    desk.stop()
    expect(page.locator("#lost")).to_be_visible(timeout=20_000)
    desk.start()
    expect(page.locator("#lost")).to_be_hidden(timeout=20_000)
    expect(page.locator("#ask-text")).to_have_value("half a thought", timeout=PATIENCE)


def test_panels_own_page_is_never_stored(desk: Desk, installed: BrowserContext):
    page = installed.pages[0]
    open_desk(page, desk.address)
    page.evaluate("navigator.serviceWorker.ready.then(() => true)")
    page.reload()
    stored = page.evaluate(
        "async () => (await Promise.all((await caches.keys()).map(async (n) => (await (await caches.open(n)).keys())"
        ".map((r) => new URL(r.url).pathname)))).flat()"
    )
    assert "/web/offline.html" in stored
    assert "/" not in stored


def test_a_pack_made_here_opens_when_the_desk_has_stopped(tmp_path: Path, installed: BrowserContext, watch: Watch):
    review = small_review(tmp_path / "review")
    desk = Desk(tmp_path / "log.txt", str(review.folder))
    desk.start()
    try:
        page = installed.pages[0]
        page.set_viewport_size({"width": 1440, "height": 900})
        watch.follow(page)
        open_desk(page, desk.address, "question=record")
        page.evaluate("navigator.serviceWorker.ready.then(() => true)")
        page.focus("button[data-do=pack][data-value=public]")
        page.keyboard.press("Enter")
        page.wait_for_selector("progress[aria-label='Making the pack for the public']", timeout=PATIENCE)
        made = page.locator(".body a[href='/pack/pack-public/index.html']")
        expect(made).to_be_visible(timeout=PATIENCE)
        assert faults(page) == []
        with page.expect_popup() as opening:
            made.click()
        pack = opening.value
        pack.wait_for_selector("html[data-loaded]", state="attached")
        pack.evaluate("navigator.serviceWorker.ready.then(() => true)")
        assert watch.errors == [] and watch.outside == []
    finally:
        desk.stop()
    page.bring_to_front()
    expect(page.locator("#lost")).to_contain_text("These packs are stored on this machine", timeout=20_000)
    page.reload()
    expect(page.locator("h1")).to_have_text("The desk has stopped.", timeout=20_000)
    expect(page.locator("#packs-title")).to_have_text("These packs are stored on this machine:")
    assert faults(page) == []
    page.click("#packs a")
    page.wait_for_selector("html[data-loaded]", state="attached")
    expect(page.locator("#answer")).to_contain_text("edd")
