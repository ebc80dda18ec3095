"""The sample's review.toml is written by hand; here only the hashes of its runs are brought up to date."""

from __future__ import annotations

from pathlib import Path

import tomlkit

from hydro.provenance import files_hash


def fill_hashes(path: Path) -> None:
    """Set each run's sha256 in review.toml from the file beside it; comments and order stay.

    Raises ``FileNotFoundError`` when a run's file has not been made.
    """
    document = tomlkit.parse(path.read_text(encoding="utf-8"))
    for run in document["runs"]:
        run["sha256"] = files_hash([path.parent / run["file"]])
    text = tomlkit.dumps(document)
    if text != path.read_text(encoding="utf-8"):
        beside = path.with_suffix(".part")
        beside.write_text(text, encoding="utf-8")
        beside.replace(path)
