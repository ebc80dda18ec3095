"""The environment both commands work in: `.venv` in the checkout, filled from the lock files.

Only the standard library is imported here, because nothing else is installed yet. The code runs on
older Pythons than the project needs, so that they too get a sentence and not a syntax error.
"""

from __future__ import annotations

import hashlib
import importlib.util
import os
import subprocess
import sys
from pathlib import Path
from typing import Mapping, NoReturn, Sequence

OLDEST_PYTHON = (3, 11)
BAD_INPUT = 2  # exit status when the machine or the call, and not Leewater, has to change
LOCKS = {"run": ("run.txt",), "test": ("run.txt", "test.txt")}
# Measured on two idle cores beside a fast index: 57 s to run, 79 s to test.
DURATIONS = {"run": "1 to 2 minutes", "test": "1 to 3 minutes"}


class NotReady(Exception):
    """The environment cannot be made; the message is one sentence that says what to do."""


class Checkout:
    """A checkout of the project and the environment that belongs to it.

    Parameters
    ----------
    root : Path
        Folder that holds pyproject.toml.
    windows : bool
        Whether paths inside the environment follow Windows.
    """

    def __init__(self, root: Path, *, windows: bool = os.name == "nt"):
        self.root = root
        self.venv = root / ".venv"
        self._scripts = self.venv / ("Scripts" if windows else "bin")
        self._suffix = ".exe" if windows else ""

    @property
    def python(self) -> Path:
        """The environment's Python."""
        return self.program("python")

    def program(self, name: str) -> Path:
        """A command installed in the environment."""
        return self._scripts / (name + self._suffix)

    def stamp(self, level: str) -> Path:
        """File that says from what the environment was filled, for `level` "run" or "test"."""
        return self.venv / f"leewater-{level}.stamp"

    def fingerprint(self, level: str) -> str:
        """What `stamp(level)` must hold: a hash of the locks, of pyproject.toml and of the place.

        The place counts because the commands inside an environment hold its path: a moved checkout
        has to be installed again.
        """
        digest = hashlib.sha256(str(self.venv).encode())
        for path in (self.root / "pyproject.toml", *self.locks(level)):
            digest.update(b"\0" + path.read_bytes().replace(b"\r\n", b"\n"))
        return digest.hexdigest()

    def locks(self, level: str) -> "list[Path]":
        """The lock files that make up `level`."""
        return [self.root / ".ci" / "locks" / name for name in LOCKS[level]]

    def is_ready(self, level: str) -> bool:
        """Whether the environment holds exactly what the lock files of `level` say."""
        try:
            return self.python.exists() and self.stamp(level).read_text("ascii") == self.fingerprint(level)
        except FileNotFoundError:
            return False


def make_ready(checkout: Checkout, level: str) -> None:
    """Make the environment and fill it, unless that has been done from these very lock files.

    Raises
    ------
    NotReady
        If Python is too old, has no venv, or the packages cannot be had.
    """
    if checkout.is_ready(level):
        return
    check_python(sys.version_info[:2])
    if not checkout.python.exists():
        check_venv_modules()
    packages = sum(1 for lock in checkout.locks(level) for line in lock.read_text("ascii").splitlines() if "==" in line)
    verb = "Updating" if checkout.python.exists() else "Making"
    print(f"{verb} the environment .venv with {packages} locked packages: {DURATIONS[level]} the first time "
          "on a fast connection, none at the next start.", flush=True)
    for name in LOCKS:
        if checkout.stamp(name).exists():
            checkout.stamp(name).unlink()  # a fill that is broken off leaves no stamp
    _make_venv(checkout)
    _fill(checkout, level)
    # The test environment holds all that the other command needs.
    for name in LOCKS if level == "test" else (level,):
        checkout.stamp(name).write_text(checkout.fingerprint(name), "ascii")


def check_python(version: Sequence[int]) -> None:
    """Raise NotReady if `version`, as (major, minor), is older than the project needs."""
    if tuple(version) < OLDEST_PYTHON:
        raise NotReady("Python {}.{} is too old for Leewater; start this command with Python {}.{} or newer.".format(
            *version, *OLDEST_PYTHON))


def check_venv_modules(find=importlib.util.find_spec) -> None:
    """Raise NotReady if this Python lacks the modules that make an environment.

    `find` answers None for a module that is missing. Debian and its kin ship Python without ensurepip.
    """
    missing = [name for name in ("venv", "ensurepip") if find(name) is None]
    if missing:
        raise NotReady(
            f"{sys.executable} cannot make an environment because its module {missing[0]} is missing; install it "
            "(on Debian or Ubuntu: apt install python3-venv) and run this command again.")


def _make_venv(checkout: Checkout) -> None:
    if not checkout.python.exists():
        made = _quiet([sys.executable, "-m", "venv", "--clear", str(checkout.venv)])
        if made.returncode != 0:
            raise NotReady(f"The environment {checkout.venv} could not be made ({last_line(made.stdout)}); "
                           "put that right and run this command again.")
    elif _quiet([str(checkout.python), "-m", "pip", "--version"]).returncode != 0:
        # An environment whose making was broken off, or that another program made without pip.
        mended = _quiet([str(checkout.python), "-m", "ensurepip"])
        if mended.returncode != 0:
            raise NotReady(f"The environment {checkout.venv} has no pip and cannot be given one; "
                           "delete that folder and run this command again.")


def _fill(checkout: Checkout, level: str) -> None:
    pip = [str(checkout.python), "-m", "pip", "install", "--quiet", "--no-input", "--retries", "2",
           "--disable-pip-version-check", "--no-warn-script-location"]
    locks = [word for lock in checkout.locks(level) for word in ("--requirement", str(lock))]
    # The locked setuptools builds the project: without isolation, pip fetches no other one.
    project = ["--no-deps", "--no-build-isolation", "--editable", str(checkout.root)]
    for step in (locks, project):
        installed = _quiet(pip + step)
        if installed.returncode != 0:
            raise NotReady(
                f"The locked packages could not be installed into .venv ({last_line(installed.stdout)}); "
                "check the network and pip's proxy or index settings, and run this command again.")


def _quiet(command: Sequence[str]) -> "subprocess.CompletedProcess[str]":
    """Run a command and keep what it says, both streams together."""
    environ = dict(os.environ, PIP_USER="0", PYTHONIOENCODING="utf-8")  # a user-wide --user setting breaks every venv
    try:
        return subprocess.run(command, env=environ, stdin=subprocess.DEVNULL, stdout=subprocess.PIPE,
                              stderr=subprocess.STDOUT, encoding="utf-8", errors="replace", check=False)
    except OSError as error:
        return subprocess.CompletedProcess(command, 1, stdout=str(error))


def last_line(text: str) -> str:
    """The last line that reports an error, else the last line that says anything, cut to a readable length."""
    lines = [line.strip() for line in text.splitlines() if line.strip()]
    errors = [line for line in lines if line.upper().startswith("ERROR")]
    line = (errors or lines or ["no reason given"])[-1]
    return line if len(line) <= 300 else line[:297] + "..."


def environment_for_children(checkout: Checkout, environ: Mapping[str, str]) -> "dict[str, str]":
    """Variables for what runs inside the environment.

    Compiled loops are kept inside .venv, which can be written, so that they need not lie beside the
    sources, which perhaps cannot. Bokeh takes its own files from this machine, whatever the user has set.
    """
    child = dict(environ)
    child.setdefault("NUMBA_CACHE_DIR", str(checkout.venv / "compiled"))
    child["BOKEH_RESOURCES"] = "server"
    return child


def hand_over(command: Sequence[str], environ: Mapping[str, str]) -> NoReturn:
    """Become `command`. It gets this process's signals and terminal, and its status is the status."""
    sys.stdout.flush()
    if os.name == "posix":
        os.execve(command[0], list(command), dict(environ))
    # Windows has no exec that keeps the console waiting; Ctrl-C reaches the child by itself.
    with subprocess.Popen(command, env=dict(environ)) as child:
        while True:
            try:
                sys.exit(child.wait())
            except KeyboardInterrupt:
                continue
