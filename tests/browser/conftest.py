"""A real Chromium, and the dashboard as a process of its own, for the tests that drive the page.

Nothing can leave the machine: the browser resolves no name, and a test fails at its end if the page asked
for anything outside, wrote an error to its console, or made the server print a traceback.
"""

from __future__ import annotations

import contextlib
import os
import socket
import subprocess
import sys
import time
import urllib.error
import urllib.request
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from urllib.parse import urlsplit

import pytest
from playwright.sync_api import Browser, Page, sync_playwright

ROOT = Path(__file__).resolve().parents[2]
START_SECONDS = 120  # on a busy machine, with nothing compiled yet
OURS = "127.0.0.1"
LOCAL_SCHEMES = ("data", "blob", "about", "file")


@dataclass(frozen=True, slots=True)
class Server:
    """A dashboard that runs."""
    address: str  # ends without a slash
    log: Path

    def said(self, start: int = 0) -> str:
        """What the server has printed since `start`, a number of characters."""
        return self.log.read_text("utf-8", errors="replace")[start:]


@contextlib.contextmanager
def running_dashboard(log: Path, *arguments: str) -> Iterator[Server]:
    """Start `leewater open ARGUMENTS` on a free port, wait until it answers, end it on leaving.

    `log` is the file that takes all it prints. Raises AssertionError, with the log, if it does not answer.
    """
    port = free_port()
    command = [sys.executable, "-c", "import sys; from dashboard.cli import main; sys.exit(main())",
               "open", *arguments, "--port", str(port), "--no-browser"]
    with log.open("wb") as out:
        process = subprocess.Popen(command, cwd=ROOT, stdout=out, stderr=subprocess.STDOUT, stdin=subprocess.DEVNULL)
    server = Server(f"http://{OURS}:{port}", log)
    try:
        _wait_for_answer(server, process)
        yield server
    finally:
        end(process)


def end(process: subprocess.Popen[bytes]) -> None:
    """End a process that we started, politely first."""
    process.terminate()
    try:
        process.wait(timeout=10)
    except subprocess.TimeoutExpired:
        process.kill()
        process.wait()


def free_port() -> int:
    """A port that nobody listens to at this moment."""
    with socket.socket() as probe:
        probe.bind((OURS, 0))
        return int(probe.getsockname()[1])


def _wait_for_answer(server: Server, process: subprocess.Popen[bytes]) -> None:
    latest = time.monotonic() + START_SECONDS
    while time.monotonic() < latest:
        with contextlib.suppress(urllib.error.URLError, ConnectionError, TimeoutError):
            with urllib.request.urlopen(f"{server.address}/ping", timeout=5) as answer:
                if answer.status == 200:
                    return
        # Waiting for its end is the pause between two attempts, and notices at once if it dies.
        with contextlib.suppress(subprocess.TimeoutExpired):
            status = process.wait(timeout=0.1)
            raise AssertionError(f"the dashboard ended with status {status} before it answered:\n{server.said()}")
    raise AssertionError(f"the dashboard did not answer within {START_SECONDS} s:\n{server.said()}")


@pytest.fixture(scope="session")
def chromium_path() -> str:
    """The browser that `python3 -m tests` has found, from LEEWATER_CHROMIUM."""
    path = os.environ.get("LEEWATER_CHROMIUM")
    if not path:
        pytest.fail("LEEWATER_CHROMIUM does not name a Chromium; python3 -m tests finds or installs one and sets it")
    return path


def launch_options(path: str) -> dict:
    """How every browser of the tests is started; takes the path of its program."""
    as_root = hasattr(os, "geteuid") and os.geteuid() == 0
    # Chromium refuses to run its sandbox as root.
    options = [f"--host-resolver-rules=MAP * ~NOTFOUND, EXCLUDE {OURS}", *(["--no-sandbox"] if as_root else [])]
    return {"executable_path": path, "args": options}


@pytest.fixture(scope="session")
def browser(chromium_path: str) -> Iterator[Browser]:
    """One headless Chromium for the session."""
    with sync_playwright() as playwright:
        started = playwright.chromium.launch(**launch_options(chromium_path))
        yield started
        started.close()


@pytest.fixture(scope="session")
def server(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Server]:
    """The dashboard on the sample review, one for the session."""
    with running_dashboard(tmp_path_factory.mktemp("dashboard") / "log.txt", "sample_reach") as running:
        yield running


class Watch:
    """What a page has asked of other machines, and what has gone wrong in it."""

    def __init__(self) -> None:
        self.outside: list[str] = []
        self.errors: list[str] = []

    def follow(self, page: Page) -> None:
        """Note from now on what `page` does."""
        page.on("request", lambda request: self._note(request.url))
        page.on("websocket", lambda websocket: self._note(websocket.url))
        page.on("pageerror", lambda error: self.errors.append(str(error)))
        page.on("console", lambda said: self.errors.append(said.text) if said.type == "error" else None)

    def _note(self, url: str) -> None:
        parts = urlsplit(url)
        if parts.scheme not in LOCAL_SCHEMES and parts.hostname != OURS:
            self.outside.append(url)


@pytest.fixture
def watch() -> Watch:
    """The notes on `page`; a test that expects an error takes it off this list."""
    return Watch()


@pytest.fixture
def page(browser: Browser, watch: Watch, request: pytest.FixtureRequest) -> Iterator[Page]:
    """A fresh window, 1440 x 900, without service workers. Together with `server`, its log is judged too."""
    served = request.getfixturevalue("server") if "server" in request.fixturenames else None
    before = len(served.said()) if served else 0
    context = browser.new_context(service_workers="block", viewport={"width": 1440, "height": 900})
    opened = context.new_page()
    watch.follow(opened)
    yield opened
    context.close()
    assert not watch.outside, f"the page asked other machines: {watch.outside}"
    assert not watch.errors, f"the page reported errors: {watch.errors}"
    if served:
        said = served.said(before)
        print(f"the dashboard said:\n{said}")  # pytest shows it if the test failed
        assert "Traceback (most recent call last)" not in said, said
