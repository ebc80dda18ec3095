"""Where files came from: content hashes and the versions that made a figure."""

from __future__ import annotations

import hashlib
import platform
import sys
from collections.abc import Iterable
from importlib import metadata
from pathlib import Path

from . import __version__

_LIBRARIES = ("numpy", "scipy", "numba", "h5netcdf", "xarray", "pyproj", "shapely", "geopandas", "pyamg")


def file_hash(path: Path) -> str:
    """SHA-256 of a file's bytes, hexadecimal."""
    with open(path, "rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


def files_hash(paths: Iterable[Path]) -> str:
    """Identity of a run: its file's SHA-256, or the SHA-256 of its files' hashes in order."""
    hashes = [file_hash(p) for p in paths]
    return hashes[0] if len(hashes) == 1 else hashlib.sha256("\n".join(hashes).encode()).hexdigest()


def versions() -> dict[str, str]:
    """Versions of Leewater, Python and the libraries that figures pass through."""
    found = {"leewater": __version__, "python": platform.python_version()}
    for name in _LIBRARIES:
        found[name] = metadata.version(name)
    return found


def command_line() -> str:
    """The command that repeats this run of the program."""
    return " ".join(["leewater", *[f'"{a}"' if " " in a else a for a in sys.argv[1:]]])
