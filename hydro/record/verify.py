"""Whether a record can be derived again: its inputs by hash, its figures by their printed digits."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from ..review import Review
from .model import SCHEMA


@dataclass(frozen=True, slots=True)
class Verdict:
    """What changed since the record was written. Both lists empty: the printed digits are the same."""

    inputs: tuple[str, ...]
    figures: tuple[str, ...]
    compared: int

    @property
    def same(self) -> bool:
        return not self.inputs and not self.figures


def read_record(folder: Path) -> dict[str, Any]:
    """record.json of a folder; ``ValueError`` where it is missing or not a record."""
    path = folder / "record.json"
    if not path.is_file():
        raise ValueError(f"{path} is not there; give the folder that `leewater record` wrote.")
    try:
        found = json.loads(path.read_text(encoding="utf-8"))
    except json.JSONDecodeError as error:
        raise ValueError(f"{path} is not JSON: {error}; restore it from a copy.") from error
    if found.get("schema") != SCHEMA:
        raise ValueError(f"{path} has schema {found.get('schema')!r}; this version reads {SCHEMA!r}.")
    return found


def verify(folder: Path, review: Review, again: Callable[[Review], dict[str, Any]]) -> Verdict:
    """Compare a record with one made again from the review.

    Parameters
    ----------
    folder : Path
        Holds record.json.
    again : callable
        Makes the record's JSON from the review.

    Returns
    -------
    Verdict
        Inputs whose hash differs come first; where an input changed the figures are compared too, so
        the list says what it did.
    """
    old = read_record(folder)
    inputs = changed_inputs(old["inputs"], review)
    try:
        new = again(review)
    except ValueError as error:
        return Verdict((*inputs, f"The record cannot be made again: {error}"), (), 0)
    before, now = old["figures"], new["figures"]
    figures = [
        f"{key}: printed {before[key]['printed']}, now {now[key]['printed']}"
        for key in before if key in now and before[key]["printed"] != now[key]["printed"]
    ]
    figures += [f"{key}: printed {before[key]['printed']}, now not made" for key in before if key not in now]
    figures += [f"{key}: new, {now[key]['printed']}" for key in now if key not in before]
    return Verdict(tuple(inputs), tuple(figures), len(before))


def changed_inputs(inputs: list[dict[str, Any]], review: Review) -> list[str]:
    """Sentences about inputs that are gone or whose bytes changed since the record was written."""
    from ..provenance import file_hash, files_hash

    out = []
    for item in inputs:
        if item["kind"] == "run":
            try:
                actual = files_hash(review.paths(review.entry(item["id"])))
            except ValueError as error:
                out.append(str(error))
                continue
        else:
            path = review.folder / item["file"]
            actual = file_hash(path) if path.is_file() else "missing"
        if actual != item["sha256"]:
            out.append(f"{item['file']}: the record was made from {item['sha256'][:12]}..., it is now {actual[:12]}...")
    return out
