"""Which Chromium the browser tests drive: one that is here, else one that is installed.

Only the standard library is imported; Playwright is asked in a process of its own.
"""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from pathlib import Path
from typing import Iterator, Mapping, Sequence

from dashboard._environment import NotReady, last_line

VARIABLE = "LEEWATER_CHROMIUM"
COMMANDS = ("chromium", "chromium-browser", "google-chrome", "google-chrome-stable", "microsoft-edge")
MAC_APPLICATIONS = ("Chromium", "Google Chrome", "Microsoft Edge")
WINDOWS_PROGRAMS = (r"Chromium\Application\chrome.exe", r"Google\Chrome\Application\chrome.exe",
                    r"Microsoft\Edge\Application\msedge.exe")
ASK_PLAYWRIGHT = ("from playwright.sync_api import sync_playwright\n"
                  "with sync_playwright() as p: print(p.chromium.executable_path)")
DOWNLOAD_SECONDS, APT_SECONDS = 300, 900


def chromium(python: Path, environ: Mapping[str, str]) -> Path:
    """Path of a Chromium that starts, installing one if there is none.

    Parameters
    ----------
    python : Path
        Python of the environment that holds Playwright.
    environ : Mapping
        This process's variables; LEEWATER_CHROMIUM comes before everything else.

    Raises
    ------
    NotReady
        If LEEWATER_CHROMIUM does not start, or nothing is here and nothing could be installed.
    """
    chosen = environ.get(VARIABLE)
    if chosen:
        if not starts(Path(chosen)):
            raise NotReady(f"{VARIABLE} is {chosen}, which is not a browser that starts; "
                           "correct it, or unset it to have a Chromium found or installed.")
        return Path(chosen)
    return find(python, environ) or install(python, environ)


def find(python: Path, environ: Mapping[str, str]) -> "Path | None":
    """The first Chromium on this machine that starts: Playwright's own, then the system's."""
    return next((path for path in candidates(python, environ) if starts(path)), None)


def candidates(python: Path, environ: Mapping[str, str]) -> Iterator[Path]:
    """Places where a Chromium may be, best first."""
    asked = subprocess.run([str(python), "-c", ASK_PLAYWRIGHT], stdout=subprocess.PIPE, encoding="utf-8", check=False)
    if asked.returncode == 0:
        yield Path(asked.stdout.strip())
    yield from system_places(environ, sys.platform)


def system_places(environ: Mapping[str, str], platform: str) -> Iterator[Path]:
    """Where `platform`, named as by sys.platform, keeps Chromium, Chrome and Edge."""
    for command in COMMANDS:
        found = shutil.which(command, path=environ.get("PATH"))
        if found:
            yield Path(found)
    if platform == "darwin":
        for name in MAC_APPLICATIONS:
            yield Path("/Applications") / f"{name}.app" / "Contents" / "MacOS" / name
    if platform == "win32":
        for base in ("ProgramFiles", "ProgramFiles(x86)", "LocalAppData"):
            for program in WINDOWS_PROGRAMS:
                if environ.get(base):
                    yield Path(environ[base]) / program


def starts(path: Path) -> bool:
    """Whether the browser at `path` is there and, off Windows, tells its version.

    Ubuntu's /usr/bin/chromium-browser may be a script that only says how to install one. On Windows
    asking for the version opens a window, so being there has to do.
    """
    if not path.is_file():
        return False
    if os.name == "nt":
        return True
    return _run([str(path), "--version"], 60, os.environ).returncode == 0


def install(python: Path, environ: Mapping[str, str]) -> Path:
    """Install a Chromium: Playwright's own, else the system's package when root on a Debian kind of system.

    Playwright's download is tried before its system packages are, so that a machine that cannot reach it
    finds out in seconds.
    """
    print("Installing a Chromium for the browser tests: 1 to 3 minutes, once.", flush=True)
    root = hasattr(os, "geteuid") and os.geteuid() == 0
    playwright = [str(python), "-m", "playwright"]
    impatient = {**environ, "PLAYWRIGHT_DOWNLOAD_CONNECTION_TIMEOUT": "10000"}  # milliseconds
    steps = [_run([*playwright, "install", "chromium"], DOWNLOAD_SECONDS, impatient)]
    if steps[0].returncode == 0 and root:
        steps.append(_run([*playwright, "install", "--with-deps", "chromium"], APT_SECONDS, impatient))
    found = find(python, environ)
    if not found and root and shutil.which("apt-get"):
        quiet = {**environ, "DEBIAN_FRONTEND": "noninteractive"}
        steps.append(_run(["apt-get", "update"], APT_SECONDS, quiet))
        steps.append(_run(["apt-get", "install", "--yes", "--no-install-recommends", "chromium"], APT_SECONDS, quiet))
        found = find(python, environ)
    if not found:
        reasons = "; ".join(last_line(step.stdout) for step in steps if step.returncode != 0)
        raise NotReady(f"No Chromium is here and none could be installed ({reasons or 'none of them starts'}); "
                       f"install Chromium, Chrome or Edge, or set {VARIABLE} to one, and run this command again.")
    return found


def _run(command: Sequence[str], seconds: float, environ: Mapping[str, str]) -> "subprocess.CompletedProcess[str]":
    """Run a command for at most `seconds` and keep what it says, both streams together."""
    try:
        return subprocess.run(command, env=dict(environ), stdin=subprocess.DEVNULL, stdout=subprocess.PIPE,
                              stderr=subprocess.STDOUT, encoding="utf-8", errors="replace", timeout=seconds, check=False)
    except subprocess.TimeoutExpired:
        return subprocess.CompletedProcess(command, 1, stdout=f"{command[0]} took longer than {seconds:.0f} s")
    except OSError as error:
        return subprocess.CompletedProcess(command, 1, stdout=str(error))
