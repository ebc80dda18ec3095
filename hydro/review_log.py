"""The settings log: what each change did to review.toml, so that replaying it from the first state gives the file.

Every entry of settings-log.jsonl says when, who and what. An entry that changed the file holds the lines that it took
out and put in; the first one holds the file as it was before. What somebody changed with another program is found
by the next change and kept with it, so the log never loses its place.
"""

from __future__ import annotations

import difflib
import json
import os
import time
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

NAME = "settings-log.jsonl"
_LOCK_S = 60.0  # a lock older than this was left by a program that died
Patch = list[tuple[int, list[str], list[str]]]


def change_entry(log: Sequence[dict[str, Any]], before: str, after: str) -> dict[str, Any]:
    """What an entry must hold beside who and what, so that the log leads from ``before`` to ``after``."""
    stood = replay(log)
    more: dict[str, Any] = {"patch": patch(before, after)}
    if stood is None:
        more["first"] = before
    elif stood != before:
        more["outside"] = patch(stood, before)
    return more


def replay(log: Sequence[dict[str, Any]]) -> str | None:
    """review.toml as the log leaves it; None where no entry changed it.

    Raises ``ValueError`` naming the entry whose lines do not fit the text before it.
    """
    text: str | None = None
    for number, entry in enumerate(log, 1):
        if "patch" not in entry:
            continue
        if text is None:
            if "first" not in entry:
                raise ValueError(f"{NAME}: entry {number} is a change without a first state; restore the log from a copy.")
            text = entry["first"]
        for name in ("outside", "patch"):
            try:
                text = patched(text, entry.get(name, []))
            except ValueError:
                raise ValueError(
                    f"{NAME}: entry {number} ({entry.get('what', '')}) does not fit the state before it; restore the log from a copy."
                ) from None
    return text


def check_replay(folder: Path) -> int:
    """Entries of the log, when replaying them gives review.toml to the byte.

    Raises ``ValueError`` naming the first line that differs.
    """
    log, path = read_log(folder / NAME), folder / "review.toml"
    made, there = replay(log), path.read_bytes().decode("utf-8")
    if made is None:
        raise ValueError(f"{folder / NAME} holds no change of review.toml yet; it begins with the first one made here.")
    if made != there:
        ours, theirs = made.splitlines(), there.splitlines()
        line = next((i for i, (a, b) in enumerate(zip(ours, theirs), 1) if a != b), min(len(ours), len(theirs)) + 1)
        raise ValueError(
            f"{path} differs from what its log gives, first in line {line}: it was changed with another program; "
            "the next change made here will log that too."
        )
    return len(log)


def patch(before: str, after: str) -> Patch:
    """Changed lines as (line counted from 0 in ``before``, lines out, lines in)."""
    a, b = before.splitlines(keepends=True), after.splitlines(keepends=True)
    found = difflib.SequenceMatcher(None, a, b, autojunk=False).get_opcodes()
    return [(i, a[i:j], b[k:n]) for kind, i, j, k, n in found if kind != "equal"]


def patched(text: str, changes: Patch) -> str:
    """The text with changes made; ``ValueError`` where a line to take out is another."""
    lines = text.splitlines(keepends=True)
    for at, out, put in reversed(changes):
        if lines[at : at + len(out)] != out:
            raise ValueError(f"line {at + 1} is another")
        lines[at : at + len(out)] = put
    return "".join(lines)


def lines_changed(changes: Patch) -> str:
    """Changes in one line of text: what went out and what came in; empty where nothing did."""
    parts = []
    for _, out, put in changes:
        old, new = ("; ".join(t.strip() for t in some if t.strip()) for some in (out, put))
        parts.append(f"{old or 'nothing'} became {new or 'nothing'}")
    return " | ".join(parts)


def told(log: Sequence[dict[str, Any]]) -> list[tuple[str, str, str, str]]:
    """The log for people: when, who, what, and the lines changed; changes by another program have their own row."""
    rows = []
    for entry in log:
        at, who, what = (str(entry.get(k, "")) for k in ("at", "who", "what"))
        if "outside" in entry:
            rows.append((f"before {at}", "not known", "changed with another program", lines_changed(entry["outside"])))
        rows.append((at, who, what, lines_changed(entry.get("patch", []))))
    return rows


def append_line(path: Path, entry: dict[str, Any]) -> None:
    """Add one JSON line to an append-only log, in a single synced write."""
    line = (json.dumps(entry, ensure_ascii=False) + "\n").encode("utf-8")
    handle = os.open(path, os.O_WRONLY | os.O_APPEND | os.O_CREAT, 0o644)
    try:
        os.write(handle, line)
        os.fsync(handle)
    finally:
        os.close(handle)


def read_log(path: Path) -> list[dict[str, Any]]:
    """Entries of an append-only log, oldest first; empty where there is none.

    Raises ``ValueError`` naming the line that cannot be read.
    """
    if not path.is_file():
        return []
    out = []
    for number, line in enumerate(path.read_text(encoding="utf-8").splitlines(), 1):
        try:
            out.append(json.loads(line))
        except json.JSONDecodeError as error:
            raise ValueError(f"{path}: line {number} is not a log entry; restore the file from a copy.") from error
    return out


def now() -> str:
    """This instant as ISO 8601 UTC, to the second."""
    return datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")


@contextmanager
def alone(folder: Path) -> Iterator[None]:
    """Nobody else saves the review meanwhile; ``ValueError`` when somebody is at it."""
    path = folder / ".review.lock"
    if path.exists() and time.time() - path.stat().st_mtime > _LOCK_S:
        path.unlink(missing_ok=True)
    try:
        handle = os.open(path, os.O_CREAT | os.O_EXCL | os.O_WRONLY)
    except FileExistsError:
        raise ValueError(f"{folder / 'review.toml'} is being saved by somebody else; try again in a moment.") from None
    try:
        yield
    finally:
        os.close(handle)
        path.unlink(missing_ok=True)
