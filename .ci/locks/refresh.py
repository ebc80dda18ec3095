"""Write .ci/locks/run.txt and .ci/locks/test.txt: the exact version of every package that both commands install.

Run it by the Python of an environment that holds the versions wanted, for example a fresh one:

    python3 -m venv fresh
    fresh/bin/python -m pip install ".[test]" setuptools colorama
    fresh/bin/python .ci/locks/refresh.py

The requirements of each installed package are followed for Linux, macOS and Windows and for each
Python in PYTHONS, so one file serves them all: a package that only some of them need carries a marker.
Nothing is asked of the network.
"""

from __future__ import annotations

import re
import sys
import tomllib
from importlib import metadata
from pathlib import Path

from packaging.markers import default_environment
from packaging.requirements import Requirement
from packaging.utils import canonicalize_name

HERE = Path(__file__).resolve().parent
PYTHONS = ("3.11", "3.12", "3.13")
SYSTEMS = {
    "linux": {"os_name": "posix", "platform_system": "Linux", "platform_machine": "x86_64"},
    "darwin": {"os_name": "posix", "platform_system": "Darwin", "platform_machine": "arm64"},
    "win32": {"os_name": "nt", "platform_system": "Windows", "platform_machine": "AMD64"},
}
BUILD_BACKEND = "setuptools"  # the project itself is installed without asking the network for its builder
HEADING = "# Made by .ci/locks/refresh.py; see there. {what}\n"


def targets() -> dict[tuple[str, str], dict[str, str]]:
    """Marker environments, one for each (system, Python)."""
    here = {key: str(value) for key, value in default_environment().items()}
    return {
        (system, python): {
            **here, **facts, "sys_platform": system, "python_version": python, "python_full_version": f"{python}.0",
        }
        for system, facts in SYSTEMS.items()
        for python in PYTHONS
    }


def closure(requirements: list[str], environment: dict[str, str]) -> set[str]:
    """Names of the packages that `requirements` need in one environment, themselves included."""
    found: set[tuple[str, str]] = set()
    waiting = [Requirement(text) for text in requirements]
    while waiting:
        requirement = waiting.pop()
        name = canonicalize_name(requirement.name)
        for extra in {"", *requirement.extras}:
            if (name, extra) in found:
                continue
            found.add((name, extra))
            for text in metadata.requires(name) or []:
                needed = Requirement(text)
                if needed.marker is None or needed.marker.evaluate({**environment, "extra": extra}):
                    waiting.append(needed)
    return {name for name, _ in found}


def needs(requirements: list[str]) -> dict[str, set[tuple[str, str]]]:
    """For each package, the (system, Python) pairs that need it."""
    table: dict[str, set[tuple[str, str]]] = {}
    for target, environment in targets().items():
        for name in closure(requirements, environment):
            table.setdefault(name, set()).add(target)
    return table


def marker(where: set[tuple[str, str]]) -> str:
    """The marker of a package that is needed at `where`, empty if everywhere.

    Systems and Pythons are marked apart; where a package is needed on some pairs only, the marker
    covers a few pairs too many, which installs a package that is not needed but never lacks one.
    """
    parts = []
    systems, pythons = {s for s, _ in where}, {p for _, p in where}
    if systems != set(SYSTEMS):
        parts.append(" or ".join(f'sys_platform == "{s}"' for s in SYSTEMS if s in systems))
    if pythons != set(PYTHONS):
        parts.append(" or ".join(f'python_version == "{p}"' for p in PYTHONS if p in pythons))
    if len(parts) == 2:
        parts = [f"({part})" for part in parts]
    return f" ; {' and '.join(parts)}" if parts else ""


def locked_lines(requirements: list[str], without: set[str]) -> list[str]:
    """Pinned lines, in alphabetical order, of all that `requirements` need and is not in `without`."""
    table = needs(requirements)
    return [f"{name}=={metadata.version(name)}{marker(table[name])}\n" for name in sorted(set(table) - without)]


def main() -> int:
    project = tomllib.loads((HERE.parent.parent / "pyproject.toml").read_text("utf-8"))["project"]
    run = [*project["dependencies"], BUILD_BACKEND]
    test = [*run, *project["optional-dependencies"]["test"]]
    try:
        run_lines = locked_lines(run, set())
        test_lines = locked_lines(test, {re.split("==", line)[0] for line in run_lines})
    except metadata.PackageNotFoundError as missing:
        print(f"{missing.name} is needed on some system and is not in this environment; "
              f"install it by pip and run again. The lock files are as before.", file=sys.stderr)
        return 2
    (HERE / "run.txt").write_text(HEADING.format(what="What Leewater runs on.") + "".join(run_lines), "utf-8")
    (HERE / "test.txt").write_text(
        HEADING.format(what="What the tests need besides run.txt.") + "".join(test_lines), "utf-8")
    print(f"locked {len(run_lines)} packages to run and {len(test_lines)} more to test")
    return 0


if __name__ == "__main__":
    sys.exit(main())
