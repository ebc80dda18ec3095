"""A Chromium is found wherever it may be, or installed, or asked for in one sentence."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

from dashboard._environment import NotReady
from tests import chromium
from tests.__main__ import pytest_arguments

posix_only = pytest.mark.skipif(os.name == "nt", reason="makes shell scripts")
PYTHON = Path(sys.executable)


def fake_browser(path: Path, status: int = 0) -> Path:
    """A script at `path` that answers with `status`, whatever it is asked."""
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(f"#!/bin/sh\nexit {status}\n")
    path.chmod(0o755)
    return path


@posix_only
def test_the_chosen_browser_comes_first(tmp_path):
    chosen = fake_browser(tmp_path / "mine")
    assert chromium.chromium(PYTHON, {"LEEWATER_CHROMIUM": str(chosen), "PATH": str(tmp_path)}) == chosen


@posix_only
@pytest.mark.parametrize("status", [None, 1], ids=["not there", "does not start"])
def test_a_chosen_browser_that_does_not_start_is_an_error_and_not_replaced(tmp_path, status):
    chosen = tmp_path / "mine"
    if status is not None:
        fake_browser(chosen, status)
    with pytest.raises(NotReady, match="LEEWATER_CHROMIUM is .*mine, which is not a browser that starts"):
        chromium.chromium(PYTHON, {"LEEWATER_CHROMIUM": str(chosen)})


def test_playwright_is_asked_for_its_own_browser_first():
    first = next(chromium.candidates(PYTHON, {}))
    assert first.is_absolute()
    assert "chrom" in str(first).lower()


@posix_only
def test_the_first_that_starts_is_taken(tmp_path, monkeypatch):
    """Ubuntu's chromium-browser may be a script that only tells how to install one."""
    fake_browser(tmp_path / "chromium-browser", status=1)
    chrome = fake_browser(tmp_path / "google-chrome")
    monkeypatch.setattr(chromium, "ASK_PLAYWRIGHT", "raise SystemExit(1)")
    assert chromium.find(PYTHON, {"PATH": str(tmp_path)}) == chrome


def test_windows_and_mac_keep_browsers_outside_the_path(tmp_path):
    nothing = {"PATH": str(tmp_path)}
    windows = [str(path) for path in chromium.system_places({**nothing, "ProgramFiles": "P"}, "win32")]
    assert any(path.endswith("msedge.exe") for path in windows) and any(path.endswith("chrome.exe") for path in windows)
    mac = list(chromium.system_places(nothing, "darwin"))
    assert Path("/Applications/Google Chrome.app/Contents/MacOS/Google Chrome") in mac
    assert list(chromium.system_places(nothing, "linux")) == []


def installing(monkeypatch, *, root: bool, download_works: bool, apt_works: bool, browser: Path) -> list[str]:
    """Let nothing be installed yet; the list returned fills with the commands that are run."""
    ran: list[str] = []
    present: list[Path] = []

    def run(command, seconds, environ):
        ran.append(" ".join(command[1:] if command[0] == "apt-get" else command[2:]))
        is_apt = command[0] == "apt-get"
        works = apt_works if is_apt else download_works
        if works and "install" in command:
            present.append(browser)
        return subprocess.CompletedProcess(command, 0 if works else 1, stdout="" if works else "ERROR: ENOTFOUND\n")

    monkeypatch.setattr(chromium, "_run", run)
    monkeypatch.setattr(chromium, "find", lambda python, environ: present[0] if present else None)
    monkeypatch.setattr(chromium.os, "geteuid", lambda: 0 if root else 1000, raising=False)
    monkeypatch.setattr(chromium.shutil, "which", lambda name: f"/usr/bin/{name}")
    return ran


@pytest.mark.parametrize(
    ("root", "download_works", "expected"),
    [
        (True, True, ["playwright install chromium", "playwright install --with-deps chromium"]),
        (False, True, ["playwright install chromium"]),
        (True, False, ["playwright install chromium", "update", "install --yes --no-install-recommends chromium"]),
    ],
)
def test_a_missing_browser_is_installed_by_the_first_way_that_works(
        monkeypatch, tmp_path, capsys, root, download_works, expected):
    ran = installing(monkeypatch, root=root, download_works=download_works, apt_works=True, browser=tmp_path)
    assert chromium.chromium(PYTHON, {}) == tmp_path
    assert ran == expected
    said = capsys.readouterr().out.splitlines()
    assert len(said) == 1 and "minutes" in said[0]


@pytest.mark.parametrize("root", [True, False])
def test_when_nothing_can_be_installed_the_reason_and_the_way_out_are_told(monkeypatch, tmp_path, root):
    installing(monkeypatch, root=root, download_works=False, apt_works=False, browser=tmp_path)
    with pytest.raises(NotReady, match=r"\(ERROR: ENOTFOUND.*install Chromium, Chrome or Edge, or set LEEWATER_CHROMIUM"):
        chromium.chromium(PYTHON, {})


def test_a_step_that_takes_too_long_is_given_up(tmp_path):
    slow = chromium._run([sys.executable, "-c", "import threading; threading.Event().wait()"], 0.2, os.environ)
    assert slow.returncode == 1 and "took longer than" in slow.stdout


@pytest.mark.parametrize("arguments", [["-n", "4"], ["-n0"], ["--numprocesses=1"], ["--pdb"]])
def test_a_stated_number_of_workers_is_kept(arguments):
    assert pytest_arguments(arguments) == arguments


def test_two_workers_otherwise():
    assert pytest_arguments(["-q", "tests/hydro"]) == ["-n", "2", "-q", "tests/hydro"]
    assert pytest_arguments([]) == ["-n", "2"]
